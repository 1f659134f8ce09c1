//! The copper of one layer by what its nets are for, with holes, voids, landings, ties and names on it.
//!
//! Nothing is told by color alone: supply copper is hatched, copper without a net has a dashed rim, charted copper a dark
//! one. Checked by: `layers_show_everything_without_overlap`.

use super::contour::simplified;
use super::label::zone_boxes;
use super::map::{
    HALO, LANDING, MapPin, PIN, in_view, landing_shape, leader, pin_shape, placed, ring_on_sheet, zone_runs,
};
use super::path::PathData;
use super::place::{Placer, Rect};
use super::scene::{Group, Shape};
use super::text::{Text, shortened};
use super::view::View;
use crate::geom::{Point, Polygon, Region, Ring};
use crate::style::{Face, Rgb, Style};

/// What the net of a piece of copper is for.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub enum CopperUse {
    /// It carries returns.
    Reference,
    /// Another net with copper areas: a supply in most cases.
    Supply,
    /// The review charts it.
    Charted,
    /// Any other net.
    Other,
    /// The files give it no net.
    NoNet,
}

/// A drilled or routed hole.
#[derive(Clone, Debug, PartialEq)]
pub struct CopperHole {
    /// Centre, or centre line of a slot.
    pub path: Vec<Point>,
    /// Diameter of the tool in meters.
    pub diameter_m: f64,
    /// Whether it has a barrel.
    pub plated: bool,
}

/// A name that is written on the copper.
#[derive(Clone, Debug, PartialEq)]
pub struct CopperName {
    /// The name.
    pub text: String,
    /// Index of the area that it belongs to, in [`CopperData::copper`]; none for a name at a spot.
    pub area: Option<usize>,
    /// Where the name's leader starts if it stands apart.
    pub spot: Point,
}

/// What is drawn of a layer.
#[derive(Clone, Debug, Default)]
pub struct CopperData {
    /// Outline of the board.
    pub outline: Region,
    /// Copper, connected pieces.
    pub copper: Vec<(CopperUse, Polygon)>,
    /// Holes that pass the layer.
    pub holes: Vec<CopperHole>,
    /// Voids of the charted planes on this layer.
    pub voids: Vec<Polygon>,
    /// Where a return enters or leaves this layer.
    pub landings: Vec<Point>,
    /// Ends of charted nets on this layer; true for a driver.
    pub pins: Vec<(MapPin, bool)>,
    /// Ties of nets: middle.
    pub ties: Vec<Point>,
    /// Zones: name and outline.
    pub zones: Vec<(String, Ring)>,
    /// Names of areas, tracks and ties, most important first.
    pub names: Vec<CopperName>,
}

/// Distance of the hatching lines in mm.
const HATCH: f64 = 2.4;
/// Half the size of a tie's sign in mm.
const TIE: f64 = 1.5;

/// Color of copper, and of its rim.
pub fn copper_colors(what: CopperUse, style: &Style) -> (Rgb, Rgb) {
    let color = style.color;
    match what {
        CopperUse::Reference => (color.hair, color.ink_soft),
        CopperUse::Supply => (color.page.mixed(style.change.high[1], 0.2), style.change.high[1]),
        CopperUse::Charted => (color.track, color.track_case),
        CopperUse::Other => (color.rule, color.rule),
        CopperUse::NoNet => (color.page, color.part),
    }
}

/// Draws the layer in `view`.
pub fn draw_copper(data: &CopperData, view: &View, style: &Style, label: &str) -> Group {
    let mut group = Group::new("layer").labeled("graphics-object", label);
    let mut all = Group::new("layers").clipped(view.x, view.y, view.width(), view.height());
    const ORDER: [(CopperUse, &str); 5] = [
        (CopperUse::Reference, "reference-copper"),
        (CopperUse::Supply, "supply-copper"),
        (CopperUse::NoNet, "copper-without-net"),
        (CopperUse::Other, "other-copper"),
        (CopperUse::Charted, "charted-copper"),
    ];
    for (what, name) in ORDER {
        all.group(copper(data, what, view, style, name));
    }
    all.group(voids(data, view, style));
    all.group(holes(data, view, style));
    all.group(zones(data, view, style));
    let mut board = PathData::coarse();
    for ring in data.outline.0.iter().flat_map(Polygon::rings) {
        board.ring(&ring_on_sheet(ring, view));
    }
    let mut rim = Group::new("outline");
    rim.shape(Shape::stroked(board, style.color.ink, style.line.plane_edge));
    all.group(rim);
    group.group(all);
    let mut signs = Group::new("signs");
    for &at in &data.landings {
        landing_shape(view.place(at), style, 0.75 * LANDING).into_iter().for_each(|shape| signs.shape(shape));
    }
    for (pin, driver) in &data.pins {
        pin_shape(view.place(pin.at), *driver, style, 0.75 * PIN)
            .into_iter()
            .for_each(|shape| signs.shape(shape));
    }
    for &at in &data.ties {
        tie_shape(view.place(at), style).into_iter().for_each(|shape| signs.shape(shape));
    }
    group.group(signs);
    group.group(names(data, view, style));
    group
}

fn copper(data: &CopperData, what: CopperUse, view: &View, style: &Style, name: &str) -> Group {
    let mut group = Group::new(name);
    let mut path = PathData::coarse();
    let mut hatch = PathData::coarse();
    for (_, polygon) in data.copper.iter().filter(|(kind, _)| *kind == what) {
        let rings: Vec<Vec<(f64, f64)>> = polygon.rings().map(|ring| ring_on_sheet(ring, view)).collect();
        for ring in &rings {
            path.ring(ring);
        }
        if what == CopperUse::Supply {
            hatched(&mut hatch, &rings);
        }
    }
    let (fill, rim) = copper_colors(what, style);
    let width = match what {
        CopperUse::Charted => 0.25,
        CopperUse::Other => 0.1,
        _ => 0.18,
    };
    let mut shape = Shape::filled(path, fill).outlined(rim, width);
    shape.even_odd = true;
    if what == CopperUse::NoNet {
        shape = shape.dashed(&[0.8, 0.6]);
    }
    group.shape(shape);
    group.shape(Shape::stroked(hatch, rim, 0.13));
    group
}

/// Lines that rise by 45 degrees over the inside of rings (even-odd rule).
fn hatched(path: &mut PathData, rings: &[Vec<(f64, f64)>]) {
    let mut crossings: Vec<(i64, f64)> = Vec::new();
    for ring in rings {
        for (a, b) in ring.iter().zip(ring.iter().cycle().skip(1)) {
            // s counts the lines, t runs along them.
            let (sa, sb) = ((a.0 + a.1) / HATCH, (b.0 + b.1) / HATCH);
            let (low, high) = (sa.min(sb).ceil() as i64, sa.max(sb).ceil() as i64);
            for line in low..high {
                let part = (line as f64 - sa) / (sb - sa);
                crossings.push((line, (a.0 - a.1) + part * ((b.0 - b.1) - (a.0 - a.1))));
            }
        }
    }
    crossings.sort_by(|a, b| a.0.cmp(&b.0).then(a.1.total_cmp(&b.1)));
    for pair in crossings.chunks_exact(2).filter(|pair| pair[1].1 - pair[0].1 > 0.3) {
        let s = pair[0].0 as f64 * HATCH;
        let point = |t: f64| (0.5 * (s + t), 0.5 * (s - t));
        path.line(&[point(pair[0].1), point(pair[1].1)]);
    }
}

fn voids(data: &CopperData, view: &View, style: &Style) -> Group {
    let mut group = Group::new("voids");
    let mut path = PathData::coarse();
    for ring in data.voids.iter().map(|void| &void.outer).filter(|ring| in_view(ring, view)) {
        path.ring(&ring_on_sheet(ring, view));
    }
    group.shape(Shape::stroked(path, style.color.mark, 0.35));
    group
}

fn holes(data: &CopperData, view: &View, style: &Style) -> Group {
    let mut group = Group::new("holes");
    let (mut round, mut slots, mut bare) = (PathData::coarse(), Vec::new(), PathData::coarse());
    for hole in &data.holes {
        let radius = 0.5 * view.length(hole.diameter_m);
        if hole.path.len() > 1 {
            let mut path = PathData::coarse();
            path.line(&hole.path.iter().map(|&point| view.place(point)).collect::<Vec<_>>());
            slots.push((path, 2.0 * radius));
            continue;
        }
        let Some(&at) = hole.path.first() else { continue };
        let at = view.place(at);
        round.circle(at, radius);
        if !hole.plated {
            let reach = 0.7 * radius;
            bare.line(&[(at.0 - reach, at.1 - reach), (at.0 + reach, at.1 + reach)]);
            bare.line(&[(at.0 - reach, at.1 + reach), (at.0 + reach, at.1 - reach)]);
        }
    }
    group.shape(Shape::filled(round, style.color.page).outlined(style.color.ink, 0.13));
    for (path, width) in slots {
        group.shape(Shape::stroked(path.clone(), style.color.ink, width).rounded());
        group.shape(Shape::stroked(path, style.color.page, (width - 0.26).max(0.1)).rounded());
    }
    group.shape(Shape::stroked(bare, style.color.ink, 0.18));
    group
}

fn zones(data: &CopperData, view: &View, style: &Style) -> Group {
    let mut group = Group::new("zones");
    let mut path = PathData::coarse();
    for run in zone_runs(&data.zones, &data.outline) {
        let points: Vec<(f64, f64)> = run.into_iter().map(|point| view.place(point)).collect();
        path.line(&simplified(&points, 0.02));
    }
    group.shape(Shape::stroked(path.clone(), style.color.page, style.line.boundary + HALO));
    let line = Shape::stroked(path, style.color.boundary, style.line.boundary);
    group.shape(line.dashed(&style.line.boundary_dash));
    group
}

/// Two triangles that touch, where copper ties nets together.
pub fn tie_shape((x, y): (f64, f64), style: &Style) -> Vec<Shape> {
    let bow = |reach: f64| {
        let mut path = PathData::new();
        path.ring(&[(x - reach, y - 0.7 * reach), (x, y), (x - reach, y + 0.7 * reach)]);
        path.ring(&[(x + reach, y - 0.7 * reach), (x, y), (x + reach, y + 0.7 * reach)]);
        path
    };
    vec![
        Shape::stroked(bow(TIE), style.color.page, 1.0).rounded(),
        Shape::filled(bow(TIE), style.color.mark).outlined(style.color.ink, 0.2),
    ]
}

/// Names of zones, areas, tracks and ties.
fn names(data: &CopperData, view: &View, style: &Style) -> Group {
    let size = style.font.label;
    let mut group = Group::new("labels");
    let mut placer = costs(data, view);
    for (name, outline) in &data.zones {
        let name = shortened(Face::NarrowBold, size, &name.to_uppercase(), 50.0);
        let text = Text::new(0.0, 0.0, size, Face::NarrowBold, style.color.boundary, &name);
        if let Some(rect) = placer.cheapest(zone_boxes(outline, view, text.width(), 0.95 * size)) {
            group.text(placed(text, rect, style));
        }
    }
    for name in &data.names {
        let words = shortened(Face::NarrowBold, size, &name.text, 40.0);
        let text = Text::new(0.0, 0.0, size, Face::NarrowBold, style.color.ink, &words);
        let (width, height) = (text.width(), 0.95 * size);
        let inside = name
            .area
            .and_then(|area| data.copper.get(area))
            .and_then(|(_, polygon)| placer.cheapest(area_boxes(polygon, view, width, height)));
        let found = inside.map(|rect| (rect, None));
        let Some((rect, line)) = found.or_else(|| placer.label(view.place(name.spot), width, height)) else {
            continue;
        };
        group.group(leader(line, style));
        group.text(placed(text, rect, style));
    }
    group
}

/// What names should keep clear of.
fn costs(data: &CopperData, view: &View) -> Placer {
    let mut placer = Placer::new([view.x, view.y, view.x + view.width(), view.y + view.height()]);
    for hole in &data.holes {
        for &at in &hole.path {
            let (x, y) = view.place(at);
            let reach = 0.5 * view.length(hole.diameter_m) + 0.3;
            placer.add_box([x - reach, y - reach, x + reach, y + reach], 2.0);
        }
    }
    for (what, polygon) in &data.copper {
        let cost = match what {
            CopperUse::Charted => 4.0,
            CopperUse::Other | CopperUse::NoNet => 1.0,
            CopperUse::Reference | CopperUse::Supply => 0.5,
        };
        for ring in polygon.rings() {
            let mut points = ring_on_sheet(ring, view);
            points.extend(points.first().copied());
            placer.add_line(&simplified(&points, 0.2), 0.5, cost);
        }
    }
    for ring in data.outline.0.iter().flat_map(Polygon::rings) {
        let mut points = ring_on_sheet(ring, view);
        points.extend(points.first().copied());
        placer.add_line(&points, 0.6, 3.0);
    }
    let signs = data.landings.iter().chain(&data.ties).copied().chain(data.pins.iter().map(|pin| pin.0.at));
    for at in signs {
        let (x, y) = view.place(at);
        placer.add_box([x - 1.6, y - 1.2, x + 1.6, y + 1.2], 8.0);
    }
    for run in zone_runs(&data.zones, &data.outline) {
        let points: Vec<(f64, f64)> = run.into_iter().map(|point| view.place(point)).collect();
        placer.add_line(&points, 0.5, 2.0);
    }
    placer
}

/// Boxes inside an area, nearer to its middle cheaper.
fn area_boxes(polygon: &Polygon, view: &View, width: f64, height: f64) -> Vec<(Rect, f64)> {
    let bounds = polygon.bounds();
    let (low, high) = (view.place(bounds.min), view.place(bounds.max));
    let (x0, x1) = (low.0.min(high.0), low.0.max(high.0));
    let (y0, y1) = (low.1.min(high.1), low.1.max(high.1));
    let (mx, my) = (0.5 * (x0 + x1), 0.5 * (y0 + y1));
    // At most 30 rows and columns: each box asks the polygon five times.
    let (dx, dy) = ((0.033 * (x1 - x0)).max(1.0), (0.033 * (y1 - y0)).max(1.0));
    let mut boxes = Vec::new();
    let mut y = y0 + 0.5;
    while y + height < y1 {
        let mut x = x0 + 0.5;
        while x + width < x1 {
            let (cx, cy) = (x + 0.5 * width, y + 0.5 * height);
            let spots = [(cx, cy), (x, y), (x + width, y), (x, y + height), (x + width, y + height)];
            if spots.iter().all(|&spot| polygon.contains(view.back(spot))) {
                boxes.push(([x, y, x + width, y + height], 0.01 * (libm::hypot(cx - mx, cy - my))));
            }
            x += dx;
        }
        y += dy;
    }
    boxes
}
