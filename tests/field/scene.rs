//! A small board made of plain data: a plane on the second layer and a track on the first.

use ebbmap::board::{
    Board, CopperArea, CopperLayer, Dielectric, Foil, LayerRole, Net, NetId, Origin, Stackup,
};
use ebbmap::field::{PlaneId, Workshop};
use ebbmap::figure::{ChartedPath, chart};
use ebbmap::geom::{Point, Polygon, Region};
use ebbmap::plan::{ChartPlan, Landing, PathPlan, Plan, TrackLeg, Void};
use ebbmap::review::{Band, Model};

/// What a test wants of its board, in mm.
#[derive(Clone)]
pub struct Scene {
    pub width: f64,
    pub height: f64,
    /// Corners of the track.
    pub track: Vec<(f64, f64)>,
    pub track_width: f64,
    /// Dielectric between track and plane.
    pub gap: f64,
    pub cell: f64,
    /// Voids of the plane.
    pub voids: Vec<Polygon>,
    pub landing_radius: f64,
    /// Foil of the plane and of the track.
    pub foil: f64,
}

impl Default for Scene {
    fn default() -> Self {
        Self {
            width: 40.0,
            height: 30.0,
            track: vec![(5.0, 15.0), (35.0, 15.0)],
            track_width: 0.2,
            gap: 0.2,
            cell: 0.2,
            voids: vec![],
            landing_radius: 0.3,
            foil: 0.035,
        }
    }
}

pub fn rectangle(x0: f64, y0: f64, x1: f64, y1: f64) -> Polygon {
    let outer = vec![Point::mm(x0, y0), Point::mm(x1, y0), Point::mm(x1, y1), Point::mm(x0, y1)];
    Polygon { outer, holes: vec![] }
}

pub fn disc(x: f64, y: f64, radius: f64) -> Polygon {
    let corner = |i: usize| {
        let angle = std::f64::consts::TAU * i as f64 / 48.0;
        Point::mm(x + radius * angle.cos(), y + radius * angle.sin())
    };
    Polygon { outer: (0..48).map(corner).collect(), holes: vec![] }
}

impl Scene {
    pub fn board(&self) -> Board {
        let mut plane = rectangle(0.0, 0.0, self.width, self.height);
        for void in &self.voids {
            let mut ring = void.outer.clone();
            ring.reverse();
            plane.holes.push(ring);
        }
        let layer = |role, areas| CopperLayer { role, objects: vec![], copper: Region::default(), areas };
        let areas = vec![CopperArea { net: Some(NetId(0)), shape: plane }];
        let foil = Foil { thickness_m: self.foil * 1e-3, origin: Origin::Review };
        let dielectric = Dielectric {
            thickness_m: self.gap * 1e-3,
            origin: Origin::Review,
            permittivity: 4.2,
            permittivity_origin: Origin::Review,
        };
        Board {
            outline: Region(vec![rectangle(0.0, 0.0, self.width, self.height)]),
            layers: vec![layer(LayerRole::Top, vec![]), layer(LayerRole::Bottom, areas)],
            stackup: Stackup { foils: vec![foil, foil], dielectrics: vec![dielectric], temperature_c: 20.0 },
            nets: vec![Net { name: "GND".into() }, Net { name: "TIDE_CLK".into() }],
            ..Board::default()
        }
    }

    /// A plan of the one path, without conductors.
    pub fn plan(&self) -> Plan {
        Plan { paths: vec![self.net()], ..Plan::default() }
    }

    pub fn net(&self) -> PathPlan {
        let point = |&(x, y): &(f64, f64)| Point::mm(x, y);
        let leg = |ends: &[(f64, f64)]| TrackLeg {
            from: point(&ends[0]),
            to: point(&ends[1]),
            layer: 0,
            width_m: self.track_width * 1e-3,
            current: 1.0,
        };
        let legs: Vec<TrackLeg> = self.track.windows(2).map(leg).collect();
        let landing = |at: &(f64, f64), what: &str| Landing {
            at: point(at),
            radius_m: self.landing_radius * 1e-3,
            what: what.into(),
        };
        let chart = ChartPlan {
            plane: PlaneId { layer: 1, net: "GND".into() },
            legs: 0..legs.len(),
            driver_landing: landing(&self.track[0], "via of U1.2"),
            receiver_landing: landing(&self.track[self.track.len() - 1], "via of U2.2"),
            height_m: self.gap * 1e-3,
            width_m: self.track_width * 1e-3,
            voids: self
                .voids
                .iter()
                .enumerate()
                .map(|(i, shape)| Void { id: format!("void {i}"), shape: shape.clone() })
                .collect(),
            cell_m: self.cell * 1e-3,
            unknowns: 0,
            memory_bytes: 0,
            withheld: None,
        };
        PathPlan {
            name: "TIDE_CLK".into(),
            driver: "U1.1".into(),
            receiver: "U2.1".into(),
            track: legs,
            charts: vec![chart],
            ..PathPlan::default()
        }
    }
}

/// The first path of a plan at one frequency.
pub fn solved_path(board: &Board, plan: &Plan, model: Model, hertz: f64) -> ChartedPath {
    let workshop = Workshop::new(board, plan, model);
    let bench = workshop.bench(&plan.paths[0]);
    chart(&bench, &plan.paths[0], &band(hertz), hertz)
}

pub fn band(hertz: f64) -> Band {
    Band {
        name: format!("{hertz}Hz"),
        from_hz: 0.5 * hertz,
        to_hz: 2.0 * hertz,
        at_hz: vec![hertz],
        explicit: false,
    }
}
