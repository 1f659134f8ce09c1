//! The map itself: heat, contours, what is not copper, zones, track, pins and landings, and labels on it.

use super::callout::Callout;
use super::contour::{Contour, contours, from_segment, simplified};
use super::density::{Density, heat_png};
use super::flow::{Flow, arrows};
use super::joint::{self, JointMark};
use super::path::PathData;
use super::place::{Line, Placer, Rect};
use super::scale::DensityScale;
use super::scene::{Group, Image, Item, Shape};
use super::text::{Anchor, Text};
use super::view::View;
use crate::geom::{Point, Polygon, Region, Ring};
use crate::style::{Rgb, Style};

/// Size of a pin's square in mm.
pub const PIN: f64 = 2.0;
/// Radius of a landing's ring in mm.
pub const LANDING: f64 = 1.2;
/// Halo round lines in mm, both sides together.
pub(super) const HALO: f64 = 0.5;
/// Level in dB from which on no leader may cross the map: a quarter of the density under a straight track.
const HOT_DB: f64 = -12.0;
/// Largest deviation of drawn outlines in mm.
const OUTLINE: f64 = 0.02;

/// A piece of the track.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct MapLeg {
    /// Start, towards the driver.
    pub from: Point,
    /// End, towards the receiver.
    pub to: Point,
    /// Whether this plane carries its return.
    pub charted: bool,
}

/// An end of the net.
#[derive(Clone, Debug, PartialEq)]
pub struct MapPin {
    /// Pin, as `U5.19`.
    pub name: String,
    /// Its place.
    pub at: Point,
}

/// What a map shows.
#[derive(Clone, Debug)]
pub struct MapData {
    /// Density.
    pub density: Density,
    /// Copper of the plane that was solved.
    pub plane: Vec<Polygon>,
    /// Copper of the same net on this layer that was not solved, since no return reaches it.
    pub idle: Vec<Polygon>,
    /// Outline of the board.
    pub outline: Region,
    /// Zones: name and outline.
    pub zones: Vec<(String, Ring)>,
    /// Track.
    pub track: Vec<MapLeg>,
    /// Driving pin; none when the charted part starts elsewhere.
    pub driver: Option<MapPin>,
    /// Receiving pin.
    pub receiver: Option<MapPin>,
    /// Where the return leaves and enters the plane.
    pub landings: Vec<Point>,
    /// Densities that enclose 50, 80 and 95 %.
    pub levels: [f64; 3],
    /// Findings that have a place on this plane, most serious first.
    pub callouts: Vec<Callout>,
    /// Vias, parts and ties that carry return to or from this plane.
    pub joints: Vec<JointMark>,
    /// Direction of the in-phase return; none for small maps.
    pub flow: Option<Flow>,
}

/// A drawn map.
#[derive(Clone, Debug)]
pub struct DrawnMap {
    /// Layers as named groups.
    pub group: Group,
    /// The contours; those without lines are not shown.
    pub contours: [Contour; 3],
    /// For placing more labels.
    pub placer: Placer,
}

/// How a map is drawn.
#[derive(Clone, Copy, Debug)]
pub struct MapLook<'a> {
    /// Style.
    pub style: &'a Style,
    /// Scale of the density.
    pub scale: DensityScale,
    /// Pixels of the heat image for each mm.
    pub px_per_mm: f64,
    /// Whether this is a small cell of a set: no labels, thinner lines, the 80 % contour alone.
    pub small: bool,
    /// Free room right of the map in mm, where labels may go.
    pub room_right: f64,
}

impl MapLook<'_> {
    fn weight(&self) -> f64 {
        if self.small { 0.5 } else { 1.0 }
    }

    fn symbols(&self) -> f64 {
        if self.small { 0.55 } else { 1.0 }
    }
}

/// Draws `data` in `view`.
pub fn draw_map(data: &MapData, view: &View, look: &MapLook, label: &str) -> DrawnMap {
    let mut group = Group::new("map").labeled("graphics-object", label);
    let (width, height) = (view.width(), view.height());
    group.group(heat(data, view, look, label));
    let lines: Vec<((f64, f64), (f64, f64))> =
        data.track.iter().map(|leg| (view.place(leg.from), view.place(leg.to))).collect();
    let reach = 0.5 * look.style.line.track_case * look.weight() + 0.25;
    let hidden = |at: (f64, f64)| lines.iter().any(|&(a, b)| from_segment(at, a, b) < reach);
    let levels = if look.small { [0.0, data.levels[1], 0.0] } else { data.levels };
    let contours = contours(&data.density, view, &look.scale, levels, &hidden);

    let mut vectors = Group::new("layers").clipped(view.x, view.y, width, height);
    vectors.group(contour_lines(&contours, look));
    group.group(vectors);
    group.group(cover(data, view, look));
    group.group(Group {
        items: track(data, view, look).items,
        ..Group::new("track").clipped(view.x, view.y, width, height)
    });
    group.group(joint::marks(&data.joints, view, look.symbols(), look.style).clipped(
        view.x - 2.0,
        view.y - 2.0,
        width + 4.0,
        height + 4.0,
    ));
    group.group(pins(data, view, look));
    let placer = placer(data, view, look);
    let mut drawn = DrawnMap { group, contours, placer };
    if !look.small {
        let words = super::label::labels(&mut drawn, data, view, look);
        if let Some(flow) = &data.flow {
            drawn.group.group(arrows((flow, &data.density), view, look, &lines, &drawn.placer));
        }
        drawn.group.group(words);
    }
    drawn
}

/// What is not copper, idle copper, zones and edges: the plane without its current.
pub(super) fn cover(data: &MapData, view: &View, look: &MapLook) -> Group {
    let (width, height) = (view.width(), view.height());
    let mut cover = Group::new("plane");
    // The page's color reaches over the rim of the heat image, so that none of it shows beside the board.
    cover.group(not_copper(data, view, look).clipped(view.x - 0.5, view.y - 0.5, width + 1.0, height + 1.0));
    let mut vectors = Group::new("lines").clipped(view.x, view.y, width, height);
    vectors.group(idle_copper(data, view, look));
    vectors.group(zone_lines(data, view, look));
    vectors.group(edges(data, view, look));
    cover.group(vectors);
    // The maps of a set show the same plane again and again.
    cover.shared = look.small;
    cover
}

fn heat(data: &MapData, view: &View, look: &MapLook, label: &str) -> Group {
    let pixels = |mm: f64| ((mm * look.px_per_mm).round() as usize).max(1);
    let raster = data.density.raster(view, pixels(view.width()), pixels(view.height()), &look.scale);
    let png = heat_png(&raster, &look.scale, &look.style.density.gradient, look.style.color.over);
    let mut group = Group::new("density");
    group.items.push(Item::Image(Image::filling(view, png, label)));
    group
}

/// Ink for a contour of the map: the one of two that stands out more from the level's color.
pub fn contour_ink(style: &Style, scale: &DensityScale, density: f64) -> Rgb {
    let ground = style.density.gradient.at(scale.place(scale.level_db(density)));
    ground.ink_of(style.color.on_dark, style.color.on_light)
}

fn contour_lines(contours: &[Contour; 3], look: &MapLook) -> Group {
    let mut group = Group::new("contours");
    for (rank, contour) in contours.iter().enumerate() {
        let mut path = PathData::coarse();
        for line in &contour.lines {
            path.line(line);
        }
        let ink = contour_ink(look.style, &look.scale, contour.density);
        let width = look.style.line.contour[rank] * if look.small { 0.7 } else { 1.0 };
        group.shape(Shape::stroked(path, ink, width).dashed(&look.style.line.contour_dash[rank]));
    }
    group
}

pub(super) fn ring_on_sheet(ring: &Ring, view: &View) -> Vec<(f64, f64)> {
    let mut points: Vec<(f64, f64)> = ring.iter().map(|&point| view.place(point)).collect();
    if let Some(&first) = points.first() {
        points.push(first);
        points = simplified(&points, OUTLINE);
        points.pop();
    }
    points
}

pub(super) fn in_view(ring: &Ring, view: &View) -> bool {
    crate::geom::Bounds::of(ring.iter().copied()).meets(view.window)
}

/// Everything that is not solved copper, in the color of the page.
fn not_copper(data: &MapData, view: &View, look: &MapLook) -> Group {
    let mut group = Group::new("not-copper");
    let mut rest = PathData::coarse();
    let margin = 1.0;
    rest.rect(view.x - margin, view.y - margin, view.width() + 2.0 * margin, view.height() + 2.0 * margin);
    for ring in data.plane.iter().flat_map(Polygon::rings).filter(|ring| in_view(ring, view)) {
        rest.ring(&ring_on_sheet(ring, view));
    }
    let mut shape = Shape::filled(rest, look.style.color.page);
    shape.even_odd = true;
    group.shape(shape);
    group
}

/// Copper of the plane's net that was not solved.
fn idle_copper(data: &MapData, view: &View, look: &MapLook) -> Group {
    let mut group = Group::new("idle-copper");
    let mut idle = PathData::coarse();
    for ring in data.idle.iter().flat_map(Polygon::rings).filter(|ring| in_view(ring, view)) {
        idle.ring(&ring_on_sheet(ring, view));
    }
    let mut shape = Shape::filled(idle, look.style.color.hair);
    shape.even_odd = true;
    group.shape(shape);
    group
}

/// Rims of voids and of the plane, and the board's outline.
fn edges(data: &MapData, view: &View, look: &MapLook) -> Group {
    let style = look.style;
    let mut group = Group::new("edges");
    let (mut voids, mut plane, mut board) = (PathData::coarse(), PathData::coarse(), PathData::coarse());
    for polygon in data.plane.iter().filter(|polygon| polygon.bounds().meets(view.window)) {
        plane.ring(&ring_on_sheet(&polygon.outer, view));
        for hole in polygon.holes.iter().filter(|hole| in_view(hole, view)) {
            voids.ring(&ring_on_sheet(hole, view));
        }
    }
    for ring in data.outline.0.iter().flat_map(Polygon::rings).filter(|ring| in_view(ring, view)) {
        board.ring(&ring_on_sheet(ring, view));
    }
    let weight = look.weight();
    group.shape(Shape::stroked(board, style.color.part, style.line.part));
    group.shape(Shape::stroked(voids, style.color.void_edge, style.line.void_edge * weight));
    group.shape(Shape::stroked(plane, style.color.plane_edge, style.line.plane_edge * weight));
    group
}

/// Boundaries of zones inside the board.
fn zone_lines(data: &MapData, view: &View, look: &MapLook) -> Group {
    let style = look.style;
    let mut group = Group::new("zones");
    let mut path = PathData::coarse();
    for run in zone_runs(&data.zones, &data.outline) {
        let points: Vec<(f64, f64)> = run.into_iter().map(|point| view.place(point)).collect();
        path.line(&simplified(&points, OUTLINE));
    }
    let width = style.line.boundary * if look.small { 0.7 } else { 1.0 };
    group.shape(Shape::stroked(path.clone(), style.color.page, width + HALO * look.weight()));
    group.shape(Shape::stroked(path, style.color.boundary, width).dashed(&style.line.boundary_dash));
    group
}

/// The boundaries of zones inside the board, each shared part once.
pub(super) fn zone_runs(zones: &[(String, Ring)], board: &Region) -> Vec<Vec<Point>> {
    let each = zones.iter().enumerate();
    each.flat_map(|(index, (_, outline))| inner_edges(outline, &zones[..index], board)).collect()
}

/// The parts of a zone's outline that run inside the board, each shared part once.
fn inner_edges(outline: &Ring, earlier: &[(String, Ring)], board: &Region) -> Vec<Vec<Point>> {
    const STEP_M: f64 = 0.25e-3;
    const NEAR_M: f64 = 0.3e-3;
    let near = |ring: &Ring, point: Point| {
        ring.iter()
            .zip(ring.iter().cycle().skip(1))
            .any(|(a, b)| from_segment((point.x, point.y), (a.x, a.y), (b.x, b.y)) < NEAR_M)
    };
    let shown = |point: Point| {
        board.contains(point)
            && !board.0.iter().any(|polygon| near(&polygon.outer, point))
            && !earlier.iter().any(|(_, ring)| near(ring, point))
    };
    let mut runs = Vec::new();
    for (&from, &to) in outline.iter().zip(outline.iter().cycle().skip(1)) {
        let steps = ((from.distance(to) / STEP_M).ceil() as usize).clamp(1, 4000);
        let mut run: Vec<Point> = Vec::new();
        for step in 0..=steps {
            let point = from + (to - from) * (step as f64 / steps as f64);
            if shown(point) {
                run.push(point);
            } else if run.len() > 1 {
                runs.push(std::mem::take(&mut run));
            } else {
                run.clear();
            }
        }
        if run.len() > 1 {
            runs.push(run);
        }
    }
    runs
}

/// Continuous runs of legs, charted or not.
fn runs(data: &MapData, view: &View, charted: bool) -> Vec<Vec<(f64, f64)>> {
    let mut all: Vec<Vec<(f64, f64)>> = Vec::new();
    let mut end: Option<Point> = None;
    for leg in &data.track {
        if leg.charted != charted {
            end = None;
            continue;
        }
        let joins = end.is_some_and(|end| end.distance(leg.from) < 1e-9);
        match all.last_mut() {
            Some(run) if joins => run.push(view.place(leg.to)),
            _ => all.push(vec![view.place(leg.from), view.place(leg.to)]),
        }
        end = Some(leg.to);
    }
    all
}

fn track(data: &MapData, view: &View, look: &MapLook) -> Group {
    let style = look.style;
    let mut group = Group::new("track");
    let path_of = |charted| {
        let mut path = PathData::coarse();
        for run in runs(data, view, charted) {
            path.line(&simplified(&run, 0.01));
        }
        path
    };
    let (case, core) = (style.line.track_case * look.weight(), style.line.track * look.weight());
    let other = path_of(false);
    group.shape(Shape::stroked(other.clone(), style.color.page, 0.9 * look.weight()).rounded());
    group.shape(Shape::stroked(other, style.color.track_case, 0.4 * look.weight()).dashed(&[1.2, 0.8]));
    let own = path_of(true);
    group.shape(Shape::stroked(own.clone(), style.color.track_case, case).rounded());
    group.shape(Shape::stroked(own, style.color.track, core).rounded());
    group
}

/// Square of a pin: filled for a driver, open for a receiver.
pub fn pin_shape(at: (f64, f64), filled: bool, style: &Style, size: f64) -> Vec<Shape> {
    let square = |side: f64| {
        let mut path = PathData::new();
        path.rect(at.0 - 0.5 * side, at.1 - 0.5 * side, side, side);
        path
    };
    let inner = if filled { style.color.track_case } else { style.color.track };
    vec![
        Shape::filled(square(size + 0.5), style.color.page),
        Shape::filled(square(size), style.color.track_case),
        Shape::filled(square(size - 0.7 * size / PIN), inner),
    ]
}

/// Ring with a dot where the return enters or leaves the plane.
pub fn landing_shape(at: (f64, f64), style: &Style, radius: f64) -> Vec<Shape> {
    let circle = |radius: f64| {
        let mut path = PathData::new();
        path.circle(at, radius);
        path
    };
    vec![
        Shape::filled(circle(radius + 0.25), style.color.page),
        Shape::filled(circle(radius), style.color.track_case),
        Shape::filled(circle(0.7 * radius), style.color.track),
        Shape::filled(circle(0.3 * radius), style.color.track_case),
    ]
}

fn pins(data: &MapData, view: &View, look: &MapLook) -> Group {
    let mut group =
        Group::new("pins").clipped(view.x - 2.0, view.y - 2.0, view.width() + 4.0, view.height() + 4.0);
    let factor = look.symbols();
    for &at in data.landings.iter().filter(|&&at| view.window.contains(at)) {
        for shape in landing_shape(view.place(at), look.style, LANDING * factor) {
            group.shape(shape);
        }
    }
    for (pin, filled) in [(&data.driver, true), (&data.receiver, false)] {
        let Some(pin) = pin.as_ref().filter(|pin| view.window.contains(pin.at)) else { continue };
        for shape in pin_shape(view.place(pin.at), filled, look.style, PIN * factor) {
            group.shape(shape);
        }
    }
    group
}

/// Costs of the map for labels.
pub(super) fn placer(data: &MapData, view: &View, look: &MapLook) -> Placer {
    let area = [view.x, view.y, view.x + view.width() + look.room_right, view.y + view.height()];
    let mut placer = Placer::new(area);
    let (nx, ny) = ((view.width() as usize).max(1), (view.height() as usize).max(1));
    let raster = data.density.raster(view, nx, ny, &look.scale);
    placer.add_density(&raster, view.width());
    placer.block_density(&raster, view.width(), HOT_DB);
    joint::take(&data.joints, view, &mut placer);
    for polygon in data.plane.iter().filter(|polygon| polygon.bounds().meets(view.window)) {
        let mut rim: Vec<(f64, f64)> = polygon.outer.iter().map(|&point| view.place(point)).collect();
        rim.extend(rim.first().copied());
        placer.add_line(&simplified(&rim, 0.2), 0.5, 1.5);
    }
    for charted in [true, false] {
        for run in runs(data, view, charted) {
            placer.add_line(&run, 1.0, 6.0);
            placer.block_line(&run, 1.0);
        }
    }
    for hole in data.plane.iter().flat_map(|polygon| &polygon.holes).filter(|hole| in_view(hole, view)) {
        let mut points: Vec<(f64, f64)> = hole.iter().map(|&point| view.place(point)).collect();
        points.extend(points.first().copied());
        placer.add_line(&simplified(&points, 0.2), 0.6, 1.5);
        let bounds = crate::geom::Bounds::of(hole.iter().copied());
        let ((x0, y1), (x1, y0)) = (view.place(bounds.min), view.place(bounds.max));
        placer.add_box([x0.min(x1), y0.min(y1), x0.max(x1), y0.max(y1)], 0.5);
    }
    for (_, outline) in &data.zones {
        let mut points: Vec<(f64, f64)> = outline.iter().map(|&point| view.place(point)).collect();
        points.extend(points.first().copied());
        placer.add_line(&points, 0.5, 1.0);
    }
    let spots = data.landings.iter().copied();
    let pins = [&data.driver, &data.receiver].into_iter().flatten().map(|pin| pin.at);
    for at in spots.chain(pins) {
        let (x, y) = view.place(at);
        placer.add_box([x - 1.6, y - 1.6, x + 1.6, y + 1.6], 3.0);
    }
    placer
}

/// A label in its box, baseline a quarter above the bottom.
pub fn placed(mut text: Text, rect: Rect, style: &Style) -> Text {
    text.x = rect[0];
    text.y = rect[3] - 0.2 * text.size;
    text.anchor = Anchor::Start;
    text.with_halo(style.color.page)
}

/// The leader of a label that lies apart from its spot.
pub(super) fn leader(line: Option<Line>, style: &Style) -> Group {
    let mut group = Group::new("leader");
    if let Some((from, to)) = line {
        let mut path = PathData::new();
        path.line(&[from, to]);
        group.shape(Shape::stroked(path.clone(), style.color.page, style.line.leader + HALO));
        group.shape(Shape::stroked(path, style.color.ink, style.line.leader));
    }
    group
}
