//! Panels beside a map: key figures, findings, section at the track, locator. Distances between lines follow the
//! style's type size.

use super::list::ListedFinding;
use super::number::coordinate;
use super::path::PathData;
use super::scale::DensityScale;
use super::scene::{Group, Shape};
use super::text::{Anchor, Text, italic, marked_width, shortened};
use super::view::View;
use crate::geom::{Bounds, Polygon, Region};
use crate::style::{Face, Style};

/// Width of a panel in mm.
pub fn width(style: &Style) -> f64 {
    64.5 * style.font.pitch()
}

/// A panel drawn from (0, 0) is placed by its caller.
#[derive(Clone, Debug)]
pub struct Panel {
    /// Height in mm.
    pub height: f64,
    /// Draws it with its upper left corner at a point.
    pub kind: PanelKind,
}

/// What a panel shows.
#[derive(Clone, Debug)]
pub enum PanelKind {
    /// Key figures.
    Figures(Vec<KeyFigure>),
    /// Findings, and how many more there are.
    Findings(Vec<ListedFinding>, usize),
    /// Section through the stackup at the track.
    Section(Section),
    /// The whole board with the window of the map.
    Locator {
        /// Board.
        outline: Region,
        /// Window of the map.
        window: Bounds,
    },
}

/// A figure as a panel shows it. Texts may carry marks.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct KeyFigure {
    /// Its name.
    pub name: String,
    /// Value with unit.
    pub value: String,
    /// Length of the bar, 0 to 1; none for a figure without a bar.
    pub bar: Option<f64>,
    /// Tick of the reference, 0 to 1.
    pub tick: Option<f64>,
    /// Lines below: reference in figures, which way is good.
    pub notes: Vec<String>,
    /// What stands at the right of its name in small type where there is no value: the head of the last column.
    pub aside: String,
    /// Rows of a small table: name, bar, tick, value, reference.
    pub rows: Vec<KeyRow>,
}

/// A row of a small table.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct KeyRow {
    /// Its name.
    pub name: String,
    /// Value with unit.
    pub value: String,
    /// Reference with unit.
    pub reference: String,
    /// Length of the bar, 0 to 1.
    pub bar: Option<f64>,
    /// Tick of the reference, 0 to 1.
    pub tick: Option<f64>,
}

/// A copper layer in a section.
#[derive(Clone, Debug, PartialEq)]
pub struct SectionLayer {
    /// Name, as `L2 GND`.
    pub name: String,
    /// Whether the net's track lies on it.
    pub track: bool,
    /// Whether it is the charted plane.
    pub plane: bool,
}

/// A section through the board at the track.
#[derive(Clone, Debug, PartialEq)]
pub struct Section {
    /// Layers shown, from the top.
    pub layers: Vec<SectionLayer>,
    /// Height of the track over the plane in meters.
    pub height_m: f64,
    /// Width of the track in meters.
    pub width_m: f64,
    /// Scale of the density, for the colors of the spread.
    pub scale: DensityScale,
}

const HEAD: f64 = 6.6;
const NOTE: f64 = 4.0;

impl Panel {
    /// Key figures.
    pub fn figures(figures: Vec<KeyFigure>, style: &Style) -> Self {
        let heights = figures.iter().map(figure_height).sum::<f64>();
        Self { height: (HEAD + heights) * style.font.pitch(), kind: PanelKind::Figures(figures) }
    }

    /// Findings; `rest` more are counted.
    pub fn findings(findings: Vec<ListedFinding>, rest: usize, style: &Style) -> Self {
        let height = super::list::height(&findings, rest, width(style), style);
        Self { height, kind: PanelKind::Findings(findings, rest) }
    }

    /// A section.
    pub fn section(section: Section, style: &Style) -> Self {
        let last = rows(&section).last().copied().unwrap_or(0.0);
        Self { height: (HEAD + 4.4 + last) * style.font.pitch(), kind: PanelKind::Section(section) }
    }

    /// A locator.
    pub fn locator(outline: Region, window: Bounds, style: &Style) -> Self {
        let board = outline.bounds();
        let view = View::filling(board, 0.0, 0.0, 40.0, 30.0);
        let height = if view.turned { 30.0 } else { view.height() };
        let height = HEAD * style.font.pitch() + height + 3.0;
        Self { height, kind: PanelKind::Locator { outline, window } }
    }

    /// The same with one finding less, the last, which is counted instead; none for other panels or a single finding.
    pub fn shorter(&self, style: &Style) -> Option<Self> {
        match &self.kind {
            PanelKind::Findings(findings, rest) if findings.len() > 1 => {
                Some(Self::findings(findings[..findings.len() - 1].to_vec(), rest + 1, style))
            }
            _ => None,
        }
    }

    /// Draws the panel.
    pub fn draw(&self, x: f64, y: f64, style: &Style) -> Group {
        match &self.kind {
            PanelKind::Figures(figures) => draw_figures(x, y, figures, style),
            PanelKind::Findings(findings, rest) => {
                super::list::draw(x, y, width(style), findings, *rest, style)
            }
            PanelKind::Section(section) => draw_section(x, y, section, style),
            PanelKind::Locator { outline, window } => draw_locator(x, y, outline, *window, style),
        }
    }
}

/// Heading of a panel with a rule below.
pub(super) fn heading(group: &mut Group, (x, y, width): (f64, f64, f64), text: &str, style: &Style) {
    let pitch = style.font.pitch();
    let text = shortened(Face::Bold, style.font.body, text, width);
    group.text(Text::new(x, y + 3.0 * pitch, style.font.body, Face::Bold, style.color.ink, &text));
    let mut rule = PathData::new();
    rule.line(&[(x, y + 4.6 * pitch), (x + width, y + 4.6 * pitch)]);
    group.shape(Shape::stroked(rule, style.color.rule, style.line.rule));
}

fn figure_height(figure: &KeyFigure) -> f64 {
    let bar = match (figure.bar.is_some() || figure.tick.is_some(), figure.notes.is_empty()) {
        (true, _) => 3.0,
        (false, noted) => {
            if noted {
                0.0
            } else {
                0.6
            }
        }
    };
    let rows = if figure.rows.is_empty() { 0.0 } else { 4.9 * figure.rows.len() as f64 };
    5.2 + bar + NOTE * figure.notes.len() as f64 + rows + 2.0
}

fn bar(
    group: &mut Group,
    (x, y, width): (f64, f64, f64),
    value: Option<f64>,
    tick: Option<f64>,
    style: &Style,
) {
    let mut ground = PathData::new();
    ground.rect(x, y, width, 1.8);
    group.shape(Shape::filled(ground, style.color.hair));
    if let Some(value) = value {
        let mut path = PathData::new();
        path.rect(x, y, width * value.clamp(0.0, 1.0), 1.8);
        group.shape(Shape::filled(path, style.color.mark));
    }
    if let Some(tick) = tick {
        let at = x + width * tick.clamp(0.0, 1.0);
        let mut path = PathData::new();
        path.line(&[(at, y - 0.8), (at, y + 2.6)]);
        group.shape(Shape::stroked(path.clone(), style.color.page, 1.3));
        group.shape(Shape::stroked(path, style.color.ink, 0.6));
    }
}

fn draw_figures(x: f64, y: f64, figures: &[KeyFigure], style: &Style) -> Group {
    let (pitch, full) = (style.font.pitch(), width(style));
    let mut group = Group::new("key-figures").labeled("group", "key figures");
    heading(&mut group, (x, y, full), style.word("Key figures"), style);
    let color = style.color;
    let mut top = y + HEAD * pitch;
    for figure in figures {
        let base = top + 4.0 * pitch;
        group.text(Text::new(x, base, style.font.body, Face::Narrow, color.ink, &figure.name));
        let taken = marked_width(Face::Narrow, style.font.body, &figure.name) + 2.0;
        let wanted = marked_width(Face::Bold, style.font.value, &figure.value).max(0.1);
        let size = style.font.value * ((full - taken) / wanted).clamp(0.6, 1.0);
        let value = Text::new(x + full, base, size, Face::Bold, color.ink, &figure.value);
        group.text(value.anchored(Anchor::End));
        let aside = Text::new(x + full, base, style.font.tick, Face::Narrow, color.ink_soft, &figure.aside);
        group.text(aside.anchored(Anchor::End));
        let mut row = top + 5.2 * pitch;
        if figure.bar.is_some() || figure.tick.is_some() {
            bar(&mut group, (x, row + 0.5, full), figure.bar, figure.tick, style);
            row += 3.0 * pitch;
        } else if !figure.notes.is_empty() {
            row += 0.6 * pitch;
        }
        for note in &figure.notes {
            row += NOTE * pitch;
            group.text(Text::new(x, row - 0.2, style.font.tick, Face::Narrow, color.ink_soft, note));
        }
        for entry in &figure.rows {
            row += 4.9 * pitch;
            let base = row - 1.0 * pitch;
            group.text(Text::new(x, base, style.font.label, Face::Narrow, color.ink, &entry.name));
            if entry.bar.is_some() {
                bar(&mut group, (x + 9.0 * pitch, base - 2.0, 20.0 * pitch), entry.bar, entry.tick, style);
            }
            let size = style.font.label;
            let value = Text::new(x + 46.0 * pitch, base, size, Face::NarrowBold, color.ink, &entry.value);
            group.text(value.anchored(Anchor::End));
            let reference =
                Text::new(x + full, base, style.font.tick, Face::Narrow, color.ink_soft, &entry.reference);
            group.text(reference.anchored(Anchor::End));
        }
        top += figure_height(figure) * pitch;
    }
    group
}

fn draw_locator(x: f64, y: f64, outline: &Region, window: Bounds, style: &Style) -> Group {
    let mut group = Group::new("locator").labeled("graphics-object", "place of the map on the board");
    heading(&mut group, (x, y, width(style)), style.word("Place on the board"), style);
    let top = y + HEAD * style.font.pitch() + 1.0;
    let mut view = View::filling(outline.bounds(), x, top, 40.0, 30.0);
    view = View { x, y: top, turned: false, ..view };
    let fit = (40.0 / view.width()).min(30.0 / view.height());
    view.scale *= fit;
    let mut board = PathData::coarse();
    for ring in outline.0.iter().flat_map(Polygon::rings) {
        let points: Vec<(f64, f64)> = ring.iter().map(|&point| view.place(point)).collect();
        board.ring(&super::contour::simplified(&points, 0.05));
    }
    let mut shape = Shape::filled(board, style.color.panel).outlined(style.color.rule, 0.25);
    shape.even_odd = true;
    group.shape(shape);
    let (a, b) = (view.place(window.min), view.place(window.max));
    let mut path = PathData::new();
    path.rect(a.0.min(b.0), a.1.min(b.1), (b.0 - a.0).abs(), (b.1 - a.1).abs());
    group.shape(Shape::stroked(path, style.color.mark, 0.6));
    group
}

/// Places of the layers below the first, in mm at the normal type size: wide between track and plane, where the spread
/// is drawn.
fn rows(section: &Section) -> Vec<f64> {
    let pitch = if section.layers.len() > 4 { 4.6 } else { 5.2 };
    let mut at = 0.0;
    let mut all = Vec::with_capacity(section.layers.len());
    for (index, layer) in section.layers.iter().enumerate() {
        if index > 0 {
            let above = &section.layers[index - 1];
            let pair = (layer.track && above.plane) || (layer.plane && above.track);
            at += if pair { 1.8 * pitch } else { pitch };
        }
        all.push(at);
    }
    all
}

/// Profile of a uniform strip over an endless plane relative to the peak of a thin track: (h/w)[atan((u + w/2)/h) -
/// atan((u - w/2)/h)] (textbook image result).
fn spread(u: f64, width: f64, height: f64) -> f64 {
    if width < 1e-3 * height {
        return 1.0 / (1.0 + (u / height) * (u / height));
    }
    height / width * (libm::atan((u + 0.5 * width) / height) - libm::atan((u - 0.5 * width) / height))
}

fn draw_section(x: f64, y: f64, section: &Section, style: &Style) -> Group {
    let (k, full) = (style.font.pitch(), width(style));
    let height_mm = coordinate(section.height_m * 1e3);
    let label = format!("section at the track, height {height_mm} mm");
    let mut group = Group::new("section").labeled("graphics-object", label);
    heading(&mut group, (x, y, full), style.word("Section at the track, not to scale"), style);
    let color = style.color;
    let (left, right) = (x + 17.0 * k, x + 43.5 * k);
    let middle = 0.5 * (left + right);
    let places: Vec<f64> = rows(section).into_iter().map(|at| y + (HEAD + 2.4 + at) * k).collect();
    let (Some(&first), Some(&last)) = (places.first(), places.last()) else { return group };
    let mut ground = PathData::new();
    ground.rect(left, first - 0.9, right - left, last - first + 1.8);
    group.shape(Shape::filled(ground, color.panel));
    let track = section.layers.iter().position(|layer| layer.track);
    let plane = section.layers.iter().position(|layer| layer.plane);
    if let (Some(track), Some(plane)) = (track, plane) {
        let up = if track < plane { -1.0 } else { 1.0 };
        let gap = (places[plane] - places[track]).abs();
        spread_shape(&mut group, section, (left, right, places[plane] + 0.6 * up), up * (gap - 2.2), style);
    }
    for (layer, &at) in section.layers.iter().zip(&places) {
        let mut path = PathData::new();
        if layer.track {
            path.rect(middle - 2.2, at - 0.6, 4.4, 1.2);
        } else {
            let half = if layer.plane { 0.6 } else { 0.35 };
            path.rect(left, at - half, right - left, 2.0 * half);
        }
        let main = layer.track || layer.plane;
        group.shape(Shape::filled(path, if main { color.ink } else { color.rule }));
        let (face, ink) = if main { (Face::NarrowBold, color.ink) } else { (Face::Narrow, color.ink_soft) };
        let name = shortened(face, style.font.tick, &layer.name, left - x - 1.4);
        group.text(Text::new(x, at + 1.15 * k, style.font.tick, face, ink, &name));
    }
    if let (Some(track), Some(plane)) = (track, plane) {
        let (a, b) = (places[track.min(plane)] + 0.6, places[track.max(plane)] - 0.6);
        let at = right + 2.4;
        let mut path = PathData::new();
        path.line(&[(right + 0.6, a), (at + 1.2, a)])
            .line(&[(right + 0.6, b), (at + 1.2, b)])
            .line(&[(at, a), (at, b)]);
        group.shape(Shape::stroked(path, color.ink, 0.25));
        let text = format!("{} = {height_mm}\u{a0}mm", italic("h"));
        group.text(Text::new(at + 2.0, 0.5 * (a + b) + 1.2, style.font.tick, Face::Narrow, color.ink, &text));
    }
    group
}

/// The spread of the return drawn on the plane: slices in the colors of the scale. `rise` is the height of the peak in
/// mm, negative upwards.
fn spread_shape(
    group: &mut Group,
    section: &Section,
    (left, right, base): (f64, f64, f64),
    rise: f64,
    style: &Style,
) {
    const SLICES: usize = 96;
    let reach = 6.0 * section.height_m;
    let peak = spread(0.0, section.width_m, section.height_m);
    let step = (right - left) / SLICES as f64;
    let anchor = 1.0 / (std::f64::consts::PI * section.height_m);
    let mut rim = Vec::with_capacity(SLICES);
    for slice in 0..SLICES {
        let u = ((slice as f64 + 0.5) / SLICES as f64 * 2.0 - 1.0) * reach;
        let value = spread(u, section.width_m, section.height_m);
        let color = style.density.gradient.at(section.scale.place(section.scale.level_db(value * anchor)));
        let high = rise * value / peak;
        let mut path = PathData::coarse();
        // Slices overlap, so that no seam shows; the last one keeps to the right edge.
        let wide = if slice + 1 == SLICES { step } else { step + 0.1 };
        path.rect(left + slice as f64 * step, base.min(base + high), wide, high.abs());
        group.shape(Shape::filled(path, color));
        rim.push((left + (slice as f64 + 0.5) * step, base + high));
    }
    let mut outline = PathData::coarse();
    outline.line(&super::contour::simplified(&rim, 0.02));
    group.shape(Shape::stroked(outline, style.color.ink, 0.25));
}
