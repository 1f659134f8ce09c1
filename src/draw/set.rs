//! The contact sheet: rows of nets and planes, columns of bands, one scale, on A3 drawing sheets.

use super::callout::{disc, disc_size};
use super::frame::{LegendEntry, color_scale, fields_row, legend};
use super::map::{MapData, MapLook, draw_map};
use super::path::PathData;
use super::plot::{SharePoint, share_plot};
use super::scale::DensityScale;
use super::scene::{Group, Scene, Shape};
use super::text::{Anchor, Text, italic, marked_width, shortened, wrapped};
use super::view::View;
use crate::geom::Bounds;
use crate::style::{Face, Style};

/// Columns and rows of a page.
pub const COLUMNS: usize = 5;
/// Rows of a page.
pub const ROWS: usize = 5;
/// Size of a cell's map in mm.
pub const CELL: (f64, f64) = (57.8, 36.1);
/// Pixels per mm of a cell's heat image: fields are smooth, and a sheet holds 25 of them.
const CELL_PX_PER_MM: f64 = 4.0;
/// Most type that the sheet's cells leave room for, relative to the normal size.
const TYPE: f64 = 1.03;
const FRAME: [f64; 4] = [20.0, 10.0, 410.0, 287.0];
const LEFT: f64 = 26.0;
const CELL_X: f64 = 92.5;
const CELL_Y: f64 = 49.4;
const PITCH: (f64, f64) = (62.9, 43.2);

/// Frame and numbers of a cell with findings, in the box (x, y, width, height) of its map.
fn flag_group(flags: &[String], (x, y, width, height): (f64, f64, f64, f64), style: &Style) -> Group {
    const MOST: usize = 3;
    let mut group = Group::new("flags");
    if flags.is_empty() {
        return group;
    }
    group = group.labeled("graphics-symbol", format!("findings {}", flags.join(", ")));
    let mut path = PathData::new();
    path.rect(x - 0.45, y - 0.45, width + 0.9, height + 0.9);
    group.shape(Shape::stroked(path, style.color.mark, 0.9));
    let mut left = x + 1.0;
    for flag in flags.iter().take(MOST) {
        let (half_wide, half_high) = disc_size(flag, style);
        disc(&mut group, (left + half_wide, y + 1.0 + half_high), flag, style);
        left += 2.0 * half_wide + 0.8;
    }
    if flags.len() > MOST {
        let words = format!("+{}", flags.len() - MOST);
        let text = Text::new(left, y + 4.2, style.font.label, Face::NarrowBold, style.color.ink, &words);
        group.text(text.with_halo(style.color.page));
    }
    group
}

/// A map drawn once in the size of a cell, its upper left corner at (0, 0).
#[derive(Clone, Debug)]
pub struct CellMap {
    /// The map.
    pub group: Group,
    /// Whether the board is turned by 90 degrees.
    pub turned: bool,
    /// Width of the map in mm.
    pub width: f64,
    /// Height of the map in mm; it stands on the cell's lower edge.
    pub height: f64,
}

/// Draws a map in the size of a cell.
pub fn cell_map(data: &MapData, board: Bounds, scale: DensityScale, style: &Style, label: &str) -> CellMap {
    // At the lower left of the cell, so that captions stand right under the map and column heads above its edge.
    let mut view = View::filling(board, 0.0, 0.0, CELL.0, CELL.1);
    (view.x, view.y) = (0.0, CELL.1 - view.height());
    let look = MapLook { style, scale, px_per_mm: CELL_PX_PER_MM, small: true, room_right: 0.0 };
    CellMap {
        group: draw_map(data, &view, &look, label).group,
        turned: view.turned,
        width: view.width(),
        height: view.height(),
    }
}

/// A cell of the sheet.
#[derive(Clone, Debug)]
pub enum SetCell {
    /// A map.
    Map {
        /// The drawing.
        map: Box<CellMap>,
        /// Left caption.
        left: String,
        /// Right caption.
        right: String,
        /// Address of the ticket map, relative to the sheet.
        link: Option<String>,
        /// Numbers of findings.
        flags: Vec<String>,
    },
    /// No map, and why.
    Withheld {
        /// The reason.
        reason: String,
    },
}

/// A row of the sheet.
#[derive(Clone, Debug)]
pub struct SetRow {
    /// Number of the row in the set, from 1.
    pub number: usize,
    /// Net.
    pub name: String,
    /// Lines below the name.
    pub lines: Vec<String>,
    /// Share within 3h for each column.
    pub shares: Vec<SharePoint>,
    /// A cell for each column.
    pub cells: Vec<SetCell>,
}

/// A column of the sheet.
#[derive(Clone, Debug, PartialEq)]
pub struct SetColumn {
    /// Name of the band.
    pub name: String,
    /// Its limits.
    pub range: String,
    /// Frequency that was solved.
    pub solved: String,
    /// Frequency for the plots.
    pub frequency: String,
}

/// One page.
#[derive(Clone, Debug)]
pub struct SetPage<'a> {
    /// The result in one line.
    pub headline: String,
    /// What is drawn, and what the captions are; one or two lines.
    pub lead: Vec<String>,
    /// Columns of this page, at most [`COLUMNS`].
    pub columns: &'a [SetColumn],
    /// All columns of the set, for the plots.
    pub frequencies: Vec<String>,
    /// Rows of this page, at most [`ROWS`], and the first of their cells that belongs to this page.
    pub rows: &'a [SetRow],
    /// First column of this page.
    pub first_column: usize,
    /// Scale of the set.
    pub scale: DensityScale,
    /// Whether a partition boundary is drawn.
    pub zones: bool,
    /// Fields of the title block: upper and lower row.
    pub fields: [Vec<(&'static str, String)>; 2],
    /// Caution in one line.
    pub caution: String,
    /// The result in sentences.
    pub description: String,
    /// Title of the file.
    pub title: String,
    /// Picture number.
    pub number: String,
    /// Machine-readable facts.
    pub facts: Vec<(String, String)>,
}

/// The scene of a page.
pub fn scene(page: &SetPage, style: &Style) -> Scene {
    let style = &Style { font: style.font.at_most(TYPE), ..style.clone() };
    let sheet = style.set;
    let mut scene = Scene {
        title: page.title.clone(),
        description: page.description.clone(),
        caution: page.caution.clone(),
        number: page.number.clone(),
        facts: page.facts.clone(),
        ..Scene::blank((sheet.width, sheet.height), sheet.px, style)
    };
    scene.group(frame(style));
    scene.group(head(page, style));
    for (index, row) in page.rows.iter().enumerate() {
        scene.group(row_group(page, row, CELL_Y + PITCH.1 * index as f64, style));
    }
    let escaped = scene.texts().iter().any(|text| text.escaped);
    scene.group(foot(page, escaped, style));
    scene.group(title_block(page, style));
    scene
}

/// Frame, centering marks and reference fields of a drawing sheet (ISO 5457).
fn frame(style: &Style) -> Group {
    let mut group = Group::new("frame");
    let (color, size) = (style.color, style.font.tick);
    let [x0, y0, x1, y1] = FRAME;
    let mut path = PathData::new();
    path.rect(x0, y0, x1 - x0, y1 - y0);
    group.shape(Shape::stroked(path, color.ink, style.line.frame));
    let (mx, my) = (0.5 * (x0 + x1), 0.5 * (y0 + y1));
    let mut marks = PathData::new();
    marks.line(&[(mx, y0 - 5.0), (mx, y0 + 5.0)]).line(&[(mx, y1 - 5.0), (mx, y1 + 5.0)]);
    marks.line(&[(x0 - 5.0, my), (x0 + 5.0, my)]).line(&[(x1 - 5.0, my), (x1 + 5.0, my)]);
    group.shape(Shape::stroked(marks, color.ink, style.line.frame));
    let mut ticks = PathData::new();
    let fields = |low: f64, high: f64| {
        let count = ((high - low) / 50.0).round() as usize;
        let wide = (high - low) / count as f64;
        (0..count).map(move |n| (n, low + wide * n as f64, low + wide * (n as f64 + 0.5)))
    };
    for (n, from, middle) in fields(x0, x1) {
        for (tick, base) in [([y0 - 5.0, y0], y0 - 1.8), ([y1, y1 + 5.0], y1 + 4.2)] {
            if n > 0 {
                ticks.line(&[(from, tick[0]), (from, tick[1])]);
            }
            let text = Text::new(middle, base, size, Face::Narrow, color.ink_soft, &(n + 1).to_string());
            group.text(text.anchored(Anchor::Middle));
        }
    }
    for (n, from, middle) in fields(y0, y1) {
        let letter = char::from(b'A' + n as u8).to_string();
        for (tick, x) in [([x0 - 5.0, x0], x0 - 2.6), ([x1, x1 + 5.0], x1 + 2.6)] {
            if n > 0 {
                ticks.line(&[(tick[0], from), (tick[1], from)]);
            }
            let text = Text::new(x, middle + 1.2, size, Face::Narrow, color.ink_soft, &letter);
            group.text(text.anchored(Anchor::Middle));
        }
    }
    group.shape(Shape::stroked(ticks, color.rule, 0.25));
    group
}

fn head(page: &SetPage, style: &Style) -> Group {
    let mut group = Group::new("headline");
    let color = style.color;
    let width = FRAME[2] - 6.0 - LEFT;
    let wanted = marked_width(Face::Bold, 8.0, &page.headline);
    let size = 8.0 * (width / wanted).clamp(0.7, 1.0);
    group.text(Text::new(LEFT, 23.6, size, Face::Bold, color.ink, &page.headline));
    for (row, line) in page.lead.iter().enumerate() {
        let y = 30.4 + 4.6 * row as f64;
        group.text(Text::new(LEFT, y, style.font.lead, Face::Regular, color.ink_soft, line));
    }
    group.text(Text::new(LEFT, 42.0, 4.6, Face::Bold, color.ink, "Net"));
    let note = &format!("plot: return within 3{}; dashed: no voids", italic("h"));
    group.text(Text::new(LEFT, 46.0, style.font.tick, Face::Narrow, color.ink_soft, note));
    for (index, column) in page.columns.iter().enumerate() {
        let x = CELL_X + PITCH.0 * index as f64;
        let name = shortened(Face::Bold, 4.6, &column.name, 30.0);
        let after = x + marked_width(Face::Bold, 4.6, &name) + 2.2;
        group.text(Text::new(x, 42.0, 4.6, Face::Bold, color.ink, &name));
        group.text(Text::new(after, 42.0, style.font.label, Face::Narrow, color.ink_soft, &column.range));
        group.text(Text::new(x, 46.0, style.font.tick, Face::Narrow, color.ink_soft, &column.solved));
    }
    let mut rule = PathData::new();
    rule.line(&[(LEFT, 47.2), (FRAME[2] - 5.0, 47.2)]);
    group.shape(Shape::stroked(rule, color.rule, style.line.rule));
    group
}

fn row_group(page: &SetPage, row: &SetRow, y: f64, style: &Style) -> Group {
    let mut group = Group::new("row").labeled("group", row.name.clone());
    group.id = format!("row-{}", row.number);
    let color = style.color;
    let width = CELL_X - LEFT - 4.0;
    let name = shortened(Face::Bold, 5.0, &row.name, width);
    group.text(Text::new(LEFT, y + 4.0, 5.0, Face::Bold, color.ink, &name));
    for (index, line) in row.lines.iter().take(2).enumerate() {
        let line = shortened(Face::Narrow, style.font.label, line, width);
        let base = y + 8.6 + 4.2 * index as f64;
        group.text(Text::new(LEFT, base, style.font.label, Face::Narrow, color.ink_soft, &line));
    }
    if row.shares.iter().any(|point| point.1.is_some() || point.2.is_some()) {
        group.group(share_plot((LEFT, y + 16.2, 44.0, 16.0), &row.shares, &page.frequencies, style));
    }
    let cells = row.cells.iter().skip(page.first_column).take(page.columns.len());
    for (index, cell) in cells.enumerate() {
        group.group(cell_group(cell, (CELL_X + PITCH.0 * index as f64, y), row.number, style));
    }
    group
}

fn cell_group(cell: &SetCell, (x, y): (f64, f64), row: usize, style: &Style) -> Group {
    let color = style.color;
    let mut group = Group::new("cell");
    match cell {
        SetCell::Map { map, left, right, link, flags } => {
            group.link.clone_from(link);
            let column = ((x - CELL_X) / PITCH.0).round() as usize + 1;
            group.id = format!("cell-{row}-{column}");
            group.group(map.group.clone().shifted(x, y));
            group.group(flag_group(flags, (x, y + CELL.1 - map.height, map.width, map.height), style));
            let base = y + CELL.1 + 4.3;
            group.text(Text::new(x, base, style.font.label, Face::NarrowBold, color.ink, left));
            let right = Text::new(
                x + map.width.max(44.0),
                base,
                style.font.label,
                Face::Narrow,
                color.ink_soft,
                right,
            );
            group.text(right.anchored(Anchor::End));
        }
        SetCell::Withheld { reason } => {
            let mut path = PathData::new();
            path.rect(x, y, CELL.0, CELL.1);
            group.shape(Shape::filled(path, color.panel).outlined(color.rule, style.line.rule));
            group.text(Text::new(x + 3.0, y + 6.4, style.font.body, Face::NarrowBold, color.ink, "withheld"));
            let lines = wrapped(Face::Narrow, style.font.tick, reason, CELL.0 - 6.0);
            let cut = lines.len() > 6;
            for (index, line) in lines.into_iter().take(6).enumerate() {
                let line = if cut && index == 5 { format!("{line} \u{2026}") } else { line };
                let base = y + 11.4 + 4.1 * index as f64;
                group.text(Text::new(x + 3.0, base, style.font.tick, Face::Narrow, color.ink_soft, &line));
            }
        }
    }
    group
}

fn foot(page: &SetPage, escaped: bool, style: &Style) -> Group {
    let mut group = Group::new("foot");
    group.group(color_scale(LEFT, 269.2, 92.0, &page.scale, &[], style));
    let mut entries = vec![LegendEntry::Track, LegendEntry::Contour80, LegendEntry::NoCopper];
    if page.zones {
        entries.push(LegendEntry::Boundary);
    }
    group.group(legend(141.0, 269.4, 86.0, &entries, style).0);
    let anchor = super::number::significant(page.scale.anchor(), 3);
    let mut note = format!("0\u{a0}dB is {anchor} A/m per A on all sheets");
    if escaped {
        note.push_str("; \\uXXXX: not in the font");
    }
    group.text(Text::new(141.0, 278.6, style.font.tick, Face::Narrow, style.color.ink_soft, &note));
    let lines = wrapped(Face::Narrow, style.font.tick, &page.caution, 201.0);
    for (row, line) in lines.iter().take(2).enumerate() {
        let y = 285.4 - 3.7 * (lines.len().min(2) - 1 - row) as f64;
        group.text(Text::new(LEFT, y, style.font.tick, Face::Narrow, style.color.ink, line));
    }
    group
}

fn title_block(page: &SetPage, style: &Style) -> Group {
    let mut group = Group::new("title-block").labeled("group", "title block");
    let (x, y, width, height) = (FRAME[2] - 180.0, FRAME[3] - 20.4, 180.0, 10.2);
    let mut path = PathData::new();
    path.rect(x, y, width, 2.0 * height).line(&[(x, y + height), (x + width, y + height)]);
    group.shape(Shape::filled(path.clone(), style.color.page).outlined(style.color.ink, 0.35));
    for (index, fields) in page.fields.iter().enumerate() {
        fields_row(&mut group, (x, y + height * index as f64, width, height), 1.6, fields, style);
    }
    group
}
