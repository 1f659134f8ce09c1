//! Changes of the board that a remedy tries: copper added to a plane, the track moved, a via for the return added.
//!
//! Given board and plan, gives changed copies; nothing else of them changes, so that a trial differs from the map by
//! this change alone. Voids stay in the plan's charts, so that what is without voids stays the same too.

use crate::board::Board;
use crate::field::PlaneId;
use crate::geom::{Point, Polygon, Region, boolean};
use crate::plan::{End, Joint, JointKind, Plan};

/// Adds `copper` to the areas of a plane that it touches and joins those; none if it touches none.
pub fn add_copper(board: &Board, plan: &Plan, plane: &PlaneId, copper: &Region) -> Option<(Board, Plan)> {
    let areas = &board.layers[plane.layer].areas;
    let of_plane = |&index: &usize| areas[index].net.is_some_and(|net| board.net_name(net) == plane.net);
    let shape = |index: usize| Region(vec![areas[index].shape.clone()]);
    let meets = |index: &usize| {
        let (bounds, region) = (areas[*index].shape.bounds(), copper.bounds());
        bounds.meets(region) && boolean::union([&shape(*index), copper]).0.len() < 1 + copper.0.len()
    };
    let touched: Vec<usize> = (0..areas.len()).filter(of_plane).filter(meets).collect();
    let &first = touched.first()?;
    let joined: Vec<Region> = touched.iter().map(|&index| shape(index)).collect();
    let whole = boolean::union(joined.iter().chain([copper]));
    let largest = whole.0.into_iter().max_by(|a, b| a.area().total_cmp(&b.area()))?;
    let (mut board, mut plan) = (board.clone(), plan.clone());
    board.layers[plane.layer].areas[first].shape = largest;
    // what ended on a piece that is joined now ends on the whole
    let gone = &touched[1..];
    for layer in plan.conductors.layers.iter_mut().filter(|layer| layer.layer == plane.layer) {
        layer.areas.retain(|area| !gone.contains(area));
    }
    let lead = |end: &mut End| match end {
        End::Copper { layer, area, .. } if *layer == plane.layer && gone.contains(area) => *area = first,
        _ => {}
    };
    let joints = plan.conductors.joints.iter_mut().chain(plan.paths.iter_mut().flat_map(|p| &mut p.joints));
    joints.for_each(|joint| {
        lead(&mut joint.from);
        lead(&mut joint.to);
    });
    plan.paths.iter_mut().flat_map(|path| &mut path.entries).for_each(|entry| lead(&mut entry.end));
    Some((board, plan))
}

/// What of a void can be copper of the plane: all but other copper and holes with `clearance_m` round them.
pub fn fillable(board: &Board, plane: &PlaneId, void: &Polygon, clearance_m: f64) -> Region {
    let bounds = void.bounds().grown(clearance_m);
    let others = board.layers[plane.layer].areas.iter().filter(|area| {
        let own = area.net.is_some_and(|net| board.net_name(net) == plane.net);
        !own && area.shape.bounds().meets(bounds)
    });
    let copper = Region(others.map(|area| area.shape.clone()).collect());
    let own = board.net(&plane.net);
    let holes = board.holes.iter().filter(|hole| {
        (hole.layers.0..=hole.layers.1).contains(&plane.layer)
            && (own.is_none() || hole.net != own)
            && bounds.contains(hole.centre())
    });
    let grown = boolean::offset(&copper, clearance_m);
    let mut kept_off = vec![grown];
    for hole in holes {
        let width_m = hole.diameter_m + 2.0 * clearance_m;
        kept_off.push(boolean::union_with([], &crate::geom::stroke::capsules(&hole.path, width_m)));
    }
    boolean::difference(&Region(vec![void.clone()]), &boolean::union(&kept_off))
}

/// The plan with the points of a path's track that lie within `reach_m` of `from` moved by `step`.
pub fn move_track(plan: &Plan, path: usize, moved: impl Fn(Point) -> Point) -> Plan {
    let mut plan = plan.clone();
    for leg in &mut plan.paths[path].track {
        leg.from = moved(leg.from);
        leg.to = moved(leg.to);
    }
    plan
}

/// The plan with a via at `at` that joins two planes; none where one of them has no copper round that place.
pub fn add_via(board: &Board, plan: &Plan, planes: [&PlaneId; 2], at: Point, radius_m: f64) -> Option<Plan> {
    /// Resistance of a plated barrel in ohm: about 1 mm long, 0.3 mm wide, plating of 20 to 25 um (common practice).
    const BARREL_OHM: f64 = 1e-3;
    let end = |plane: &PlaneId| {
        let areas = board.layers[plane.layer].areas.iter();
        let ring = [(1.0, 0.0), (0.0, 1.0), (-1.0, 0.0), (0.0, -1.0)];
        let holds = |shape: &Polygon| {
            shape.contains(at)
                && ring.iter().all(|&(x, y)| shape.contains(at + Point::new(x, y) * (2.0 * radius_m)))
        };
        let area = areas.enumerate().position(|(_, area)| {
            area.net.is_some_and(|net| board.net_name(net) == plane.net) && holds(&area.shape)
        })?;
        Some(End::Copper { layer: plane.layer, area, at, radius_m })
    };
    let joint = Joint {
        kind: JointKind::Barrel,
        what: "added via".to_owned(),
        at,
        from: end(planes[0])?,
        to: end(planes[1])?,
        resistance_ohm: BARREL_OHM,
        inductance_h: 0.0,
        capacitance_f: None,
        barrel_radius_m: Some(radius_m),
    };
    let mut plan = plan.clone();
    plan.conductors.joints.push(joint);
    Some(plan)
}
