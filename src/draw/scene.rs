//! A picture as a list of placed items in millimeters on the sheet, in reading order.

use super::path::PathData;
use super::text::{Anchor, Text};
use super::view::View;
use crate::style::{Rgb, Style};

/// One picture.
#[derive(Clone, Debug, Default)]
pub struct Scene {
    /// Width of the sheet in mm.
    pub width: f64,
    /// Height of the sheet in mm.
    pub height: f64,
    /// Width of the PNG in pixels.
    pub px: u32,
    /// Color of the page.
    pub page: Rgb,
    /// Generic font family for viewers that cannot use the embedded fonts.
    pub fallback: String,
    /// Title.
    pub title: String,
    /// The result in sentences, for readers who cannot see the picture.
    pub description: String,
    /// Caution that stands on the sheet.
    pub caution: String,
    /// Picture number.
    pub number: String,
    /// Machine-readable facts, sorted by key.
    pub facts: Vec<(String, String)>,
    /// Items, painted in this order.
    pub items: Vec<Item>,
}

/// Something on the sheet.
#[derive(Clone, Debug)]
pub enum Item {
    /// A filled or stroked path.
    Shape(Shape),
    /// A line of text.
    Text(Text),
    /// A raster image.
    Image(Image),
    /// Items that belong together.
    Group(Group),
}

/// A path with its paint.
#[derive(Clone, Debug, Default)]
pub struct Shape {
    /// Outline.
    pub path: PathData,
    /// Fill.
    pub fill: Option<Rgb>,
    /// Opacity of the fill, 0 to 1.
    pub opacity: Option<f64>,
    /// Stroke: color and width in mm.
    pub stroke: Option<(Rgb, f64)>,
    /// Dashes in mm; empty for a continuous line.
    pub dash: Vec<f64>,
    /// Whether overlapping rings cut each other out.
    pub even_odd: bool,
    /// Whether line ends and corners are round.
    pub round: bool,
}

impl Shape {
    /// A filled path.
    pub fn filled(path: PathData, fill: Rgb) -> Self {
        Self { path, fill: Some(fill), ..Self::default() }
    }

    /// A stroked path.
    pub fn stroked(path: PathData, color: Rgb, width: f64) -> Self {
        Self { path, stroke: Some((color, width)), ..Self::default() }
    }

    /// The same with dashes.
    pub fn dashed(mut self, dash: &[f64]) -> Self {
        self.dash = dash.to_vec();
        self
    }

    /// The same with round ends and corners.
    pub fn rounded(mut self) -> Self {
        self.round = true;
        self
    }

    /// The same with an outline.
    pub fn outlined(mut self, color: Rgb, width: f64) -> Self {
        self.stroke = Some((color, width));
        self
    }
}

/// A raster image, stretched over a box.
#[derive(Clone, Debug)]
pub struct Image {
    /// Left edge in mm.
    pub x: f64,
    /// Upper edge in mm.
    pub y: f64,
    /// Width in mm.
    pub width: f64,
    /// Height in mm.
    pub height: f64,
    /// The file, a PNG.
    pub png: Vec<u8>,
    /// What it shows, in words.
    pub label: String,
}

impl Image {
    /// An image that fills a view.
    pub fn filling(view: &View, png: Vec<u8>, label: &str) -> Self {
        Self {
            x: view.x,
            y: view.y,
            width: view.width(),
            height: view.height(),
            png,
            label: label.to_owned(),
        }
    }
}

/// Items that belong together.
#[derive(Clone, Debug, Default)]
pub struct Group {
    /// Name of the layer or part; letters, digits and hyphens.
    pub name: String,
    /// Id in the file for links and tests; empty for none. Letters, digits, hyphens and periods.
    pub id: String,
    /// Role for assistive technology, for example `graphics-object`.
    pub role: &'static str,
    /// What it shows, in words.
    pub label: String,
    /// Whether the group occurs several times with the same content, which the file then holds once.
    pub shared: bool,
    /// Address that the group leads to, relative to the picture.
    pub link: Option<String>,
    /// Box that cuts the items off: x, y, width, height in mm.
    pub clip: Option<[f64; 4]>,
    /// Moves the items, their clip included, to the right and down, in mm.
    pub shift: Option<(f64, f64)>,
    /// Items.
    pub items: Vec<Item>,
}

impl Group {
    /// An empty group.
    pub fn new(name: &str) -> Self {
        Self { name: name.to_owned(), ..Self::default() }
    }

    /// The same group with a role and a label for assistive technology.
    pub fn labeled(mut self, role: &'static str, label: impl Into<String>) -> Self {
        self.role = role;
        self.label = label.into();
        self
    }

    /// The same group cut off by a box.
    pub fn clipped(mut self, x: f64, y: f64, width: f64, height: f64) -> Self {
        self.clip = Some([x, y, width, height]);
        self
    }

    /// The same group moved by `(x, y)` mm.
    pub fn shifted(mut self, x: f64, y: f64) -> Self {
        self.shift = Some((x, y));
        self
    }

    /// Adds a shape if it draws anything.
    pub fn shape(&mut self, shape: Shape) {
        if !shape.path.is_empty() {
            self.items.push(Item::Shape(shape));
        }
    }

    /// Adds a line of text if it has any.
    pub fn text(&mut self, text: Text) {
        if !text.spans.is_empty() {
            self.items.push(Item::Text(text));
        }
    }

    /// Adds a group if it holds anything.
    pub fn group(&mut self, group: Group) {
        if !group.items.is_empty() {
            self.items.push(Item::Group(group));
        }
    }
}

/// The box of a line of text on the sheet in mm: from ascender to descender.
#[derive(Clone, Debug, PartialEq)]
pub struct TextBox {
    /// Left edge.
    pub left: f64,
    /// Upper edge (height of capitals).
    pub top: f64,
    /// Right edge.
    pub right: f64,
    /// Lower edge.
    pub bottom: f64,
    /// Type size.
    pub size: f64,
    /// Its color.
    pub fill: Rgb,
    /// The characters.
    pub content: String,
}

impl TextBox {
    /// The box of `text`: capitals are 0.698, descenders 0.2 of the type size.
    pub fn of(text: &Text) -> Self {
        let left = text.left();
        Self {
            left,
            top: text.y - 0.698 * text.size,
            right: left + text.width(),
            bottom: text.y + 0.2 * text.size,
            size: text.size,
            fill: text.fill,
            content: text.content(),
        }
    }

    /// Whether the two boxes overlap by more than `slack` mm in both directions.
    pub fn overlaps(&self, other: &Self, slack: f64) -> bool {
        self.left.max(other.left) + slack < self.right.min(other.right)
            && self.top.max(other.top) + slack < self.bottom.min(other.bottom)
    }
}

impl Scene {
    /// A page of width and height in mm, with a PNG of `px` pixels, without words and items.
    pub fn blank((width, height): (f64, f64), px: u32, style: &Style) -> Self {
        let (page, fallback) = (style.color.page, style.font.fallback.clone());
        Self { width, height, px, page, fallback, ..Self::default() }
    }

    /// Adds a group if it holds anything.
    pub fn group(&mut self, group: Group) {
        if !group.items.is_empty() {
            self.items.push(Item::Group(group));
        }
    }

    /// All lines of text in reading order, where their groups put them before any shift.
    pub fn texts(&self) -> Vec<&Text> {
        fn collect<'a>(items: &'a [Item], all: &mut Vec<&'a Text>) {
            for item in items {
                match item {
                    Item::Text(text) => all.push(text),
                    Item::Group(group) => collect(&group.items, all),
                    Item::Shape(_) | Item::Image(_) => {}
                }
            }
        }
        let mut all = Vec::new();
        collect(&self.items, &mut all);
        all
    }

    /// Boxes of all lines of text.
    pub fn text_boxes(&self) -> Vec<TextBox> {
        fn collect(items: &[Item], (dx, dy): (f64, f64), all: &mut Vec<TextBox>) {
            for item in items {
                match item {
                    Item::Text(text) => {
                        let text = TextBox::of(text);
                        all.push(TextBox {
                            left: text.left + dx,
                            right: text.right + dx,
                            top: text.top + dy,
                            bottom: text.bottom + dy,
                            ..text
                        });
                    }
                    Item::Group(group) => {
                        let (x, y) = group.shift.unwrap_or((0.0, 0.0));
                        collect(&group.items, (dx + x, dy + y), all);
                    }
                    Item::Shape(_) | Item::Image(_) => {}
                }
            }
        }
        let mut all = Vec::new();
        collect(&self.items, (0.0, 0.0), &mut all);
        all
    }
}

/// Name of an anchor in SVG; none for the default.
pub(super) fn anchor_name(anchor: Anchor) -> Option<&'static str> {
    match anchor {
        Anchor::Start => None,
        Anchor::Middle => Some("middle"),
        Anchor::End => Some("end"),
    }
}
