//! Boards of several layers made of plain data, with conductors and joints laid by hand.

use crate::scene::{Scene, rectangle};
use ebbmap::board::{Board, CopperArea, CopperLayer, Dielectric, LayerRole, Net, NetId};
use ebbmap::field::{PlaneId, ReturnMap};
use ebbmap::geom::{Point, Polygon};
use ebbmap::plan::{
    ChartPlan, ConductorLayer, Conductors, End, Entry, Joint, JointKind, PathPlan, Plan, TrackLeg,
};
use num_complex::Complex64;

/// Names of the nets by number.
pub const NETS: [&str; 4] = ["AGND", "DGND", "GND", "V3"];
pub const AGND: u32 = 0;
pub const DGND: u32 = 1;
pub const GND: u32 = 2;
pub const V3: u32 = 3;

/// Layer, start, end, width, current.
pub type Run = (usize, (f64, f64), (f64, f64), f64, f64);

/// A board in mm; layers from the top.
pub struct Stacked {
    pub size: (f64, f64),
    /// Dielectrics from the top.
    pub gaps: Vec<f64>,
    /// Copper by layer: net and shape.
    pub copper: Vec<Vec<(u32, Polygon)>>,
    pub foil: f64,
    /// Track.
    pub track: Vec<Run>,
    /// Entries: layer, area, place, current.
    pub entries: Vec<(usize, usize, (f64, f64), f64)>,
    pub joints: Vec<Joint>,
    /// What the plan charts: layer, net, legs.
    pub charts: Vec<(usize, u32, std::ops::Range<usize>)>,
    pub cell: f64,
}

/// An end on an area of a layer.
pub fn on(layer: usize, area: usize, at: (f64, f64)) -> End {
    End::Copper { layer, area, at: Point::mm(at.0, at.1), radius_m: 0.3e-3 }
}

/// A joint of 1 mohm without anything else.
pub fn joint(what: &str, from: End, to: End) -> Joint {
    let End::Copper { at, .. } = from else { panic!("joints of tests start on copper") };
    Joint {
        kind: JointKind::Tie,
        what: what.into(),
        at,
        from,
        to,
        resistance_ohm: 1e-3,
        inductance_h: 0.0,
        capacitance_f: None,
        barrel_radius_m: None,
    }
}

/// A plated barrel of 0.15 mm between the first areas of two layers.
pub fn barrel(layers: (usize, usize), at: (f64, f64)) -> Joint {
    Joint {
        kind: JointKind::Barrel,
        barrel_radius_m: Some(0.15e-3),
        ..joint("via", on(layers.0, 0, at), on(layers.1, 0, at))
    }
}

impl Stacked {
    pub fn board(&self) -> Board {
        let plain = Scene { width: self.size.0, height: self.size.1, foil: self.foil, ..Scene::default() };
        let mut board = plain.board();
        let count = self.copper.len();
        let role = |index: usize| match index {
            0 => LayerRole::Top,
            last if last + 1 == count => LayerRole::Bottom,
            _ => LayerRole::Inner,
        };
        let area =
            |(net, shape): &(u32, Polygon)| CopperArea { net: Some(NetId(*net)), shape: shape.clone() };
        let layer = |(index, areas): (usize, &Vec<(u32, Polygon)>)| CopperLayer {
            role: role(index),
            areas: areas.iter().map(area).collect(),
            ..board.layers[0].clone()
        };
        board.layers = self.copper.iter().enumerate().map(layer).collect();
        board.nets = NETS.iter().map(|name| Net { name: (*name).into() }).collect();
        board.stackup.foils = vec![board.stackup.foils[0]; count];
        let like = board.stackup.dielectrics[0];
        let gap = |gap: &f64| Dielectric { thickness_m: gap * 1e-3, ..like };
        board.stackup.dielectrics = self.gaps.iter().map(gap).collect();
        board
    }

    pub fn plan(&self) -> Plan {
        let point = |(x, y): (f64, f64)| Point::mm(x, y);
        let leg = |&(layer, from, to, width, current): &(usize, (f64, f64), (f64, f64), f64, f64)| TrackLeg {
            from: point(from),
            to: point(to),
            layer,
            width_m: width * 1e-3,
            current,
        };
        let entry = |&(layer, area, at, current): &(usize, usize, (f64, f64), f64)| Entry {
            end: on(layer, area, at),
            current,
            what: format!("pin at {} {}", at.0, at.1),
        };
        let like = Scene::default().net().charts.remove(0);
        let chart = |(layer, net, legs): &(usize, u32, std::ops::Range<usize>)| {
            let own = self.track[legs.start].0;
            let (upper, lower) = (own.min(*layer), own.max(*layer));
            ChartPlan {
                plane: PlaneId { layer: *layer, net: NETS[*net as usize].into() },
                legs: legs.clone(),
                height_m: 1e-3 * self.gaps[upper..lower].iter().sum::<f64>(),
                width_m: self.track[legs.start].3 * 1e-3,
                cell_m: self.cell * 1e-3,
                voids: Vec::new(),
                ..like.clone()
            }
        };
        let path = PathPlan {
            name: "TIDE_CLK".into(),
            driver: "U1.1".into(),
            receiver: "U2.1".into(),
            track: self.track.iter().map(leg).collect(),
            entries: self.entries.iter().map(entry).collect(),
            joints: Vec::new(),
            own_areas: Vec::new(),
            valid_to_hz: 0.0,
            signal: Default::default(),
            charts: self.charts.iter().map(chart).collect(),
        };
        let layers = self.copper.iter().enumerate().filter(|(_, areas)| !areas.is_empty());
        let layer =
            |(layer, areas): (usize, &Vec<_>)| ConductorLayer { layer, areas: (0..areas.len()).collect() };
        let conductors = Conductors {
            layers: layers.map(layer).collect(),
            joints: self.joints.clone(),
            nodes: Vec::new(),
        };
        Plan { paths: vec![path], conductors, ..Plan::default() }
    }

    /// The whole board as a plane.
    pub fn whole(&self, net: u32) -> (u32, Polygon) {
        (net, rectangle(0.0, 0.0, self.size.0, self.size.1))
    }
}

/// Two planes and a track of 0.2 mm that changes from the top to the bottom layer at (12, 6).
pub fn layer_change(vias: &[(f64, f64)]) -> Stacked {
    let mut board = Stacked {
        size: (24.0, 12.0),
        gaps: vec![0.2, 0.6, 0.2],
        copper: vec![Vec::new(); 4],
        foil: 0.035,
        track: vec![(0, (4.0, 6.0), (12.0, 6.0), 0.2, 1.0), (3, (12.0, 6.0), (20.0, 6.0), 0.2, 1.0)],
        entries: vec![(2, 0, (20.0, 6.0), 1.0), (1, 0, (4.0, 6.0), -1.0)],
        joints: vias.iter().map(|&at| barrel((1, 2), at)).collect(),
        charts: vec![(1, GND, 0..1), (2, GND, 1..2)],
        cell: 0.2,
    };
    board.copper[1] = vec![board.whole(GND)];
    board.copper[2] = vec![board.whole(GND)];
    board
}

/// Current along +x through the section at `x` mm.
pub fn through(map: &ReturnMap, x: f64) -> Complex64 {
    let column = ((x * 1e-3 - map.grid.origin.x) / map.grid.cell_m).round() as usize;
    (0..map.grid.ny).map(|iy| map.jx[iy * (map.grid.nx + 1) + column]).sum()
}
