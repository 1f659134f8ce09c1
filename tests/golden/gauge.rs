//! A small invented board, the Saltmarsh tide gauge, with closed-form fields: input of the drawing cases.

use ebbmap::board::{Board, CopperArea, CopperLayer, Dielectric, Foil, LayerRole, Net, Origin, Stackup};
use ebbmap::field::spread::{SpreadLeg, face_currents};
use ebbmap::field::{JointCurrent, PlaneId, ReturnMap};
use ebbmap::figure::{Figure, Figures};
use ebbmap::finding::{Cause, Excess, Finding, Grade, Measured, Number, Remedy, Spot};
use ebbmap::geom::{Grid, Point, Polygon, Region, Ring};
use ebbmap::plan::{ChartPlan, JointKind, Landing, PathPlan, TrackLeg, Void};
use ebbmap::review::{Band, Model, Review, Zone};
use num_complex::Complex64;
use std::f64::consts::PI;

/// Board, review, and one net with its map and figures.
pub struct Gauge {
    pub board: Board,
    pub review: Review,
    pub net: PathPlan,
    pub band: Band,
    pub map: ReturnMap,
    pub figures: Figures,
    pub findings: Vec<Finding>,
    pub joints: Vec<JointCurrent>,
}

/// What differs from case to case; lengths in mm.
#[derive(Clone)]
pub struct Shape {
    pub width: f64,
    pub height: f64,
    pub cell: f64,
    pub gap: f64,
    pub net: String,
    pub track: Vec<(f64, f64)>,
    pub slot: Option<[f64; 4]>,
    pub pins: usize,
    /// Small round voids in columns and rows.
    pub perforation: (usize, usize),
    pub zones: bool,
    pub model: Model,
    pub frequency_hz: f64,
    /// Whether there are findings and joints.
    pub marked: bool,
}

impl Default for Shape {
    fn default() -> Self {
        Self {
            width: 60.0,
            height: 40.0,
            cell: 0.1,
            gap: 0.2,
            net: "ADC_SCK".to_owned(),
            track: vec![(44.0, 22.0), (38.0, 22.0), (34.0, 18.0), (18.0, 18.0), (14.0, 22.0)],
            slot: Some([25.5, 12.0, 26.5, 30.0]),
            pins: 12,
            perforation: (0, 0),
            zones: true,
            model: Model::Sheet,
            frequency_hz: 1e7,
            marked: true,
        }
    }
}

fn rect(x0: f64, y0: f64, x1: f64, y1: f64) -> Ring {
    vec![Point::mm(x0, y0), Point::mm(x1, y0), Point::mm(x1, y1), Point::mm(x0, y1)]
}

fn circle(x: f64, y: f64, radius: f64) -> Ring {
    (0..48)
        .map(|n| f64::from(n) * PI / 24.0)
        .map(|angle| Point::mm(x + radius * libm::cos(angle), y + radius * libm::sin(angle)))
        .collect()
}

fn reversed(mut ring: Ring) -> Ring {
    ring.reverse();
    ring
}

/// Builds the case.
pub fn gauge(shape: &Shape) -> Gauge {
    let (w, h) = (shape.width, shape.height);
    let outline = Polygon { outer: rect(0.0, 0.0, w, h), holes: Vec::new() };
    let mut voids: Vec<Ring> = vec![circle(3.5, 3.5, 1.7), circle(w - 3.5, h - 3.5, 1.7)];
    voids.extend(
        (0..shape.pins).map(|n| circle(w - 5.0 - 2.54 * (n / 6) as f64, 6.0 + 2.54 * (n % 6) as f64, 0.9)),
    );
    let (columns, rows) = shape.perforation;
    for n in 0..columns * rows {
        let (ix, iy) = ((n % columns) as f64, (n / columns) as f64);
        let at = (w * (ix + 0.75) / columns as f64, h * (iy + 0.75) / rows as f64);
        if at.0 < w - 1.0 && at.1 < h - 1.0 {
            voids.push(circle(at.0, at.1, 0.25));
        }
    }
    voids.extend(shape.slot.map(|[x0, y0, x1, y1]| rect(x0, y0, x1, y1)));
    let plane = Polygon {
        outer: rect(0.5, 0.5, w - 0.5, h - 0.5),
        holes: voids.iter().cloned().map(reversed).collect(),
    };
    let legs: Vec<TrackLeg> = shape
        .track
        .windows(2)
        .map(|pair| TrackLeg {
            from: Point::mm(pair[0].0, pair[0].1),
            to: Point::mm(pair[1].0, pair[1].1),
            layer: 0,
            width_m: 0.2e-3,
            current: 1.0,
        })
        .collect();
    let grid = Grid {
        origin: Point::new(0.0, 0.0),
        cell_m: shape.cell * 1e-3,
        nx: (w / shape.cell).round() as usize,
        ny: (h / shape.cell).round() as usize,
    };
    let copper: Vec<bool> =
        (0..grid.len()).map(|i| plane.contains(grid.centre(i % grid.nx, i / grid.nx))).collect();
    let spread: Vec<SpreadLeg> = legs
        .iter()
        .map(|leg| SpreadLeg {
            from: leg.from,
            to: leg.to,
            width_m: leg.width_m,
            height_m: shape.gap * 1e-3,
            current: leg.current,
        })
        .collect();
    let (jx, jy) = face_currents(&spread, &grid);
    let ends = (shape.track[0], shape.track[shape.track.len() - 1]);
    let landing = |(x, y): (f64, f64), what: &str| Landing {
        at: Point::mm(x, y - 1.5),
        radius_m: 0.15e-3,
        what: what.to_owned(),
    };
    let plane_id = PlaneId { layer: 1, net: "GND".to_owned() };
    let chart = ChartPlan {
        plane: plane_id.clone(),
        legs: 0..legs.len(),
        driver_landing: landing(ends.0, "via of U5.20"),
        receiver_landing: landing(ends.1, "via of U2.7"),
        height_m: shape.gap * 1e-3,
        width_m: 0.2e-3,
        voids: voids
            .into_iter()
            .enumerate()
            .map(|(n, outer)| Void { id: format!("L2-{n}"), shape: Polygon { outer, holes: Vec::new() } })
            .collect(),
        cell_m: shape.cell * 1e-3,
        unknowns: 2 * grid.len(),
        memory_bytes: 1 << 20,
        withheld: None,
    };
    let map = ReturnMap {
        net: shape.net.clone(),
        plane: plane_id,
        band: "HF".to_owned(),
        frequency_hz: shape.frequency_hz,
        grid,
        copper,
        jx,
        jy,
        model: shape.model,
        height_m: shape.gap * 1e-3,
        width_m: 0.2e-3,
        zs_ohm: None,
        residual: (shape.model == Model::Sheet).then_some(3.5e-7),
        loop_impedance_ohm: None,
        band_density: None,
    };
    let figures = figures(&map, shape.gap * 1e-3);
    let layer = |role, areas| CopperLayer { role, objects: Vec::new(), copper: Region::default(), areas };
    let ground = ebbmap::board::NetId(1);
    let board = Board {
        title: "Saltmarsh tide gauge".to_owned(),
        revision: "A".to_owned(),
        outline: Region(vec![outline]),
        layers: vec![
            layer(LayerRole::Top, Vec::new()),
            layer(LayerRole::Inner, vec![CopperArea { net: Some(ground), shape: plane }]),
            layer(LayerRole::Inner, Vec::new()),
            layer(LayerRole::Bottom, Vec::new()),
        ],
        stackup: Stackup {
            foils: vec![Foil { thickness_m: 35e-6, origin: Origin::File }; 4],
            dielectrics: vec![
                Dielectric {
                    thickness_m: shape.gap * 1e-3,
                    origin: Origin::File,
                    permittivity: 4.3,
                    permittivity_origin: Origin::File,
                };
                3
            ],
            temperature_c: 20.0,
        },
        nets: vec![Net { name: shape.net.clone() }, Net { name: "GND".to_owned() }],
        ..Board::default()
    };
    let mut board = board;
    board.nets.sort_by(|a, b| a.name.cmp(&b.name));
    let ground = board.net("GND");
    board.layers[1].areas[0].net = ground;
    let zones = if shape.zones {
        let middle = 0.48 * w;
        vec![
            Zone { name: "analog".to_owned(), outline: rect(0.0, 0.0, middle, h) },
            Zone { name: "digital".to_owned(), outline: rect(middle, 0.0, w, h) },
        ]
    } else {
        Vec::new()
    };
    let review = Review {
        title: "Saltmarsh tide gauge".to_owned(),
        revision: "A".to_owned(),
        zones,
        ..Review::default()
    };
    let net = PathPlan {
        name: shape.net.clone(),
        driver: "U5.19".to_owned(),
        receiver: "U2.6".to_owned(),
        track: legs,
        charts: vec![chart],
        ..PathPlan::default()
    };
    let band = Band {
        name: "HF".to_owned(),
        from_hz: 3e6,
        to_hz: 3e7,
        at_hz: vec![shape.frequency_hz],
        explicit: false,
    };
    let (findings, joints) = if shape.marked { remarks(shape) } else { (Vec::new(), Vec::new()) };
    Gauge { board, review, net, band, map, figures, findings, joints }
}

/// Findings where the track crosses the slot and at its far landing, and two joints.
fn remarks(shape: &Shape) -> (Vec<Finding>, Vec<JointCurrent>) {
    let plane = PlaneId { layer: 1, net: "GND".to_owned() };
    let middle = shape.track[shape.track.len() / 2];
    let finding = |of_path: usize, (x, y): (f64, f64), what, value, limit, cause| Finding {
        number: Number { path: 3, of_path },
        code: ebbmap::diag::code::finding::DETOUR,
        grade: Grade::Fail,
        path: shape.net.clone(),
        plane: Some(plane.clone()),
        band: Some("HF".to_owned()),
        frequency_hz: Some(shape.frequency_hz),
        place: Spot { at: Point::mm(x, y), layer: 1 },
        excess: Excess { what, value, error: 0.0, limit: Some(limit) },
        sentence: format!("{} has a loop larger than its limit", shape.net),
        cause,
        cause_text: "the void lies under the track".to_owned(),
        remedy: None,
        waived: None,
    };
    let slot = shape.slot.map_or(middle, |[x0, y0, x1, _]| (0.5 * (x0 + x1), y0));
    let void = || Cause::Void("S1".to_owned());
    let mut first = finding(1, middle, Measured::ExtraInductance, 3.2e-9, 1e-9, void());
    first.remedy = Some(Remedy {
        action: "Bridge void S1 under the track with copper 2.0 mm wide".to_owned(),
        place: first.place,
        copper: Vec::new(),
        before: 3.2e-9,
        after: 0.21e-9,
        error: 1e-11,
        tried: Vec::new(),
    });
    let second = finding(2, slot, Measured::ShareDrop, 0.43, 0.1, void());
    let third = finding(3, shape.track[0], Measured::Stray, 0.12, 0.05, Cause::Spread);
    let joint = |what: &str, kind, x: f64, y: f64, current: f64| JointCurrent {
        what: what.to_owned(),
        kind,
        at: Point::mm(x, y),
        layers: [Some(1), Some(2)],
        current: Complex64::new(current, -0.1 * current),
    };
    let (w, h) = (shape.width, shape.height);
    let joints = vec![
        joint("C14", JointKind::Part, 0.7 * w, 0.25 * h, 0.31),
        joint("via", JointKind::Barrel, 0.25 * w, 0.8 * h, 0.04),
    ];
    (vec![first, second, third], joints)
}

/// Figures from the closed form of a thin strip, and contour levels from the cells.
fn figures(map: &ReturnMap, height_m: f64) -> Figures {
    let mut values: Vec<f64> = (0..map.grid.len())
        .filter(|&index| map.copper[index])
        .map(|index| map.magnitude(index % map.grid.nx, index / map.grid.nx))
        .collect();
    values.sort_by(|a, b| b.total_cmp(a));
    let total: f64 = values.iter().sum();
    let level = |share: f64| {
        let mut sum = 0.0;
        let found = values.iter().find(|&&value| {
            sum += value;
            sum >= share * total
        });
        found.copied().unwrap_or(0.0)
    };
    let width = |share: f64| height_m * libm::tan(0.5 * PI * share);
    let figure = |value: f64, reference: f64, error: f64| Figure {
        value: Some(value),
        without_voids: Some(reference),
        error,
    };
    Figures {
        share_3h: figure(0.634, 0.782, 0.004),
        worst_share_3h: Some((0.12, Point::mm(26.0, 18.0))),
        half_width_m: [
            figure(1.3 * width(0.5), width(0.5), 1e-5),
            figure(1.9 * width(0.8), width(0.8), 1e-5),
            figure(2.4 * width(0.95), width(0.95), 1e-5),
        ],
        contour_levels: [level(0.5), level(0.8), level(0.95)],
        extra_path_m: Some(figure(0.914e-3, 0.0, 1e-5)),
        loop_resistance_ohm: Some(figure(0.083, 0.08, 1e-4)),
        loop_inductance_h: Some(figure(11.4e-9, 8.2e-9, 1e-11)),
        extra_loop_resistance_ohm: Some(figure(0.003, 0.0, 1e-5)),
        extra_loop_inductance_h: Some(figure(3.2e-9, 0.0, 1e-11)),
    }
}
