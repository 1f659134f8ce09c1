//! What is solved together for a path: its track, the copper by layer, the joints, and where its current enters.
//!
//! With conductors in the plan a path is one lay over all of them. A plan without makes a lay of one layer for each of
//! its charts: the areas of the plane's net, and the landings as entries.

use crate::board::Board;
use crate::geom::locate::point_segment_distance;
use crate::geom::{Point, Polygon};
use crate::plan::{ChartPlan, ConductorLayer, Conductors, End, Entry, Joint, Landing, PathPlan, TrackLeg};

/// Conductors and the path over them.
#[derive(Clone, Debug)]
pub struct Lay<'p> {
    /// Name of the path.
    pub name: &'p str,
    /// The track, or the stretch that is solved alone.
    pub legs: &'p [TrackLeg],
    /// Index of the first of them in the path's track.
    pub first_leg: usize,
    /// For each leg the layer of the plane that it is charted on, or of the nearest leg that is.
    pub plane_layer: Vec<usize>,
    /// Copper by layer; each is a sheet.
    pub layers: Vec<ConductorLayer>,
    /// What joins copper.
    pub joints: Vec<Joint>,
    /// Currents into the copper; they sum to zero.
    pub entries: Vec<Entry>,
    /// What is charted, by index of the bench's charts.
    pub charts: Vec<(usize, ChartPlan)>,
    /// Smallest cell that a chart asks for, in metres.
    pub cell_m: f64,
    /// Whether it holds one layer made from a chart.
    pub single: bool,
}

impl<'p> Lay<'p> {
    /// The lays of a path, with the charts of `charts` that each serves; joints are those of the plan and `joints`.
    pub fn of_path(
        board: &Board,
        conductors: &Conductors,
        joints: &[Joint],
        path: &'p PathPlan,
        charts: &[ChartPlan],
    ) -> Vec<Self> {
        let ready = || charts.iter().enumerate().filter(|(_, chart)| chart.withheld.is_none());
        if conductors.layers.is_empty() {
            return ready().map(|(index, chart)| Self::of_chart(board, path, index, chart)).collect();
        }
        let charts: Vec<(usize, ChartPlan)> = ready().map(|(index, chart)| (index, chart.clone())).collect();
        let cell_m = charts.iter().map(|(_, chart)| chart.cell_m).fold(f64::INFINITY, f64::min);
        if charts.is_empty() {
            return Vec::new();
        }
        vec![Self {
            name: &path.name,
            legs: &path.track,
            first_leg: 0,
            plane_layer: plane_layers(path, 0..path.track.len()),
            layers: sheets_for(conductors, path),
            joints: joints.to_vec(),
            entries: path.entries.clone(),
            charts,
            cell_m,
            single: false,
        }]
    }

    fn of_chart(board: &Board, path: &'p PathPlan, index: usize, chart: &ChartPlan) -> Self {
        let layer = chart.plane.layer;
        let of_plane = |area: &usize| {
            let net = board.layers[layer].areas[*area].net;
            net.is_some_and(|net| board.net_name(net) == chart.plane.net)
        };
        let areas: Vec<usize> = (0..board.layers[layer].areas.len()).filter(of_plane).collect();
        let entry = |landing: &Landing, current| {
            let shape = |area: usize| &board.layers[layer].areas[area].shape;
            let nearest = areas.iter().copied().min_by(|&a, &b| {
                distance_m(shape(a), landing.at).total_cmp(&distance_m(shape(b), landing.at))
            });
            let end = End::Copper {
                layer,
                area: nearest.unwrap_or(usize::MAX),
                at: landing.at,
                radius_m: landing.radius_m,
            };
            Entry { end, current, what: landing.what.clone() }
        };
        // The return enters the plane at the receiver and leaves it at the driver, against the track's current.
        let ends = [(&chart.receiver_landing, 1.0), (&chart.driver_landing, -1.0)];
        let ends = ends.into_iter().filter(|end| end.0.radius_m > 0.0);
        let entries = ends.map(|(landing, current)| entry(landing, current)).collect();
        Self {
            name: &path.name,
            legs: &path.track[chart.legs.clone()],
            first_leg: chart.legs.start,
            plane_layer: plane_layers(path, chart.legs.clone()),
            layers: vec![ConductorLayer { layer, areas }],
            joints: Vec::new(),
            entries,
            charts: vec![(index, chart.clone())],
            cell_m: chart.cell_m,
            single: true,
        }
    }
}

/// The conductors of a path: those of the plan without copper of the path's own nets.
fn sheets_for(conductors: &Conductors, path: &PathPlan) -> Vec<ConductorLayer> {
    let kept = conductors.layers.iter().map(|layer| {
        let others = layer.areas.iter().filter(|&&area| !path.own_areas.contains(&(layer.layer, area)));
        ConductorLayer { layer: layer.layer, areas: others.copied().collect() }
    });
    kept.filter(|layer| !layer.areas.is_empty()).collect()
}

/// Distance of a point from an area, zero inside.
fn distance_m(shape: &Polygon, point: Point) -> f64 {
    if shape.contains(point) {
        return 0.0;
    }
    let edges = shape.rings().flat_map(|ring| (0..ring.len()).map(|i| (ring[i], ring[(i + 1) % ring.len()])));
    edges.map(|ends| point_segment_distance(point, ends)).fold(f64::INFINITY, f64::min)
}

/// For each leg of a range the layer of the plane that charts it, or of the nearest charted leg on the same layer, or
/// of any.
fn plane_layers(path: &PathPlan, legs: std::ops::Range<usize>) -> Vec<usize> {
    let charted = |leg: usize| path.charts.iter().find(|chart| chart.legs.contains(&leg));
    let nearest = |leg: usize| {
        let away = |other: &usize| (path.track[*other].layer != path.track[leg].layer, other.abs_diff(leg));
        let known = (0..path.track.len()).filter(|&other| charted(other).is_some());
        known.min_by_key(away).and_then(charted)
    };
    legs.map(|leg| charted(leg).or_else(|| nearest(leg)).map_or(0, |chart| chart.plane.layer)).collect()
}
