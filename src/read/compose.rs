//! Composes the image of a copper layer: dark and clear objects in their order, copper by net and as a whole.
//!
//! Objects are given levels, even for dark, odd for clear, so that an object comes after all earlier ones of the other
//! polarity that it may touch. Taking the levels in turn gives the image of the file's order with few operations.

use crate::board::{CopperArea, CopperKind, CopperObject, NetId};
use crate::geom::boolean::{difference, union, union_with};
use crate::geom::stroke::capsules;
use crate::geom::{Bounds, Region, Ring};
use rayon::prelude::*;
use rstar::primitives::{GeomWithData, Rectangle};
use rstar::{AABB, RTree};
use std::collections::BTreeMap;

/// An object's box with its level.
type Placed = GeomWithData<Rectangle<[f64; 2]>, u32>;

/// Copper of one net is composed together; copper without a net in three kinds that are kept apart.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub enum Group {
    /// Copper of a net.
    Net(NetId),
    /// Pads that are nets of their own.
    Single,
    /// Copper that makes up parts such as net ties.
    Etched,
    /// Any other copper without a net.
    Loose,
}

impl Group {
    /// The net, if it is one.
    fn net(self) -> Option<NetId> {
        match self {
            Self::Net(net) => Some(net),
            _ => None,
        }
    }
}

/// The smallest box round an object.
pub fn object_bounds(object: &CopperObject) -> Bounds {
    match &object.kind {
        CopperKind::Draw { path, width_m } => Bounds::of(path.iter().copied()).grown(0.5 * width_m),
        CopperKind::Flash { shape, .. } | CopperKind::Fill { shape } => shape.bounds(),
    }
}

/// What an object covers.
pub fn object_shape(object: &CopperObject) -> Region {
    match &object.kind {
        CopperKind::Draw { path, width_m } if *width_m > 0.0 => union_with([], &capsules(path, *width_m)),
        CopperKind::Draw { .. } => Region::default(),
        CopperKind::Flash { shape, .. } | CopperKind::Fill { shape } => shape.clone(),
    }
}

fn shapes<'a>(objects: impl Iterator<Item = &'a CopperObject>) -> (Vec<&'a Region>, Vec<Ring>) {
    let (mut regions, mut rings) = (Vec::new(), Vec::new());
    for object in objects {
        match &object.kind {
            CopperKind::Draw { path, width_m } if *width_m > 0.0 => rings.extend(capsules(path, *width_m)),
            CopperKind::Draw { .. } => {}
            CopperKind::Flash { shape, .. } | CopperKind::Fill { shape } => regions.push(shape),
        }
    }
    (regions, rings)
}

fn levels(objects: &[CopperObject]) -> Vec<u32> {
    if objects.iter().all(|object| object.dark) {
        return vec![0; objects.len()];
    }
    let mut trees: [RTree<Placed>; 2] = [RTree::new(), RTree::new()];
    let mut levels = Vec::with_capacity(objects.len());
    for object in objects {
        let bounds = object_bounds(object);
        let (parity, other) = if object.dark { (0, 1) } else { (1, 0) };
        if bounds.is_empty() {
            levels.push(parity as u32);
            continue;
        }
        let corners = ([bounds.min.x, bounds.min.y], [bounds.max.x, bounds.max.y]);
        let met = trees[other].locate_in_envelope_intersecting(AABB::from_corners(corners.0, corners.1));
        // The other polarity's levels have the other parity, so one more is of the right one.
        let level = met.map(|placed| placed.data + 1).max().unwrap_or(parity as u32);
        trees[parity].insert(Placed::new(Rectangle::from_corners(corners.0, corners.1), level));
        levels.push(level);
    }
    levels
}

/// The copper areas of a layer, sorted by net, and the whole composed image. `groups` goes with `objects`.
pub fn compose(objects: &[CopperObject], groups: &[Group]) -> (Vec<CopperArea>, Region) {
    let levels = levels(objects);
    let mut dark: BTreeMap<Group, Vec<usize>> = BTreeMap::new();
    let mut clear: BTreeMap<u32, Vec<(usize, Bounds)>> = BTreeMap::new();
    for (index, object) in objects.iter().enumerate() {
        if object.dark {
            dark.entry(groups[index]).or_default().push(index);
        } else {
            clear.entry(levels[index]).or_default().push((index, object_bounds(object)));
        }
    }
    let dark: Vec<(Group, Vec<usize>)> = dark.into_iter().collect();
    let composed: Vec<(Group, Region)> = dark
        .into_par_iter()
        .map(|(group, members)| (group, compose_group(objects, &levels, &members, &clear)))
        .collect();
    let copper = union(composed.iter().map(|(_, region)| region));
    let areas = composed.into_iter().flat_map(|(group, region)| {
        region.0.into_iter().map(move |shape| CopperArea { net: group.net(), shape })
    });
    (areas.collect(), copper)
}

fn compose_group(
    objects: &[CopperObject],
    levels: &[u32],
    members: &[usize],
    clear: &BTreeMap<u32, Vec<(usize, Bounds)>>,
) -> Region {
    let mut by_level: BTreeMap<u32, Vec<usize>> = BTreeMap::new();
    for &member in members {
        by_level.entry(levels[member]).or_default().push(member);
    }
    let mut steps: Vec<u32> = by_level.keys().chain(clear.keys()).copied().collect();
    steps.sort_unstable();
    steps.dedup();
    let mut image = Region::default();
    for level in steps {
        if level % 2 == 0 {
            let (mut regions, rings) = shapes(by_level[&level].iter().map(|&member| &objects[member]));
            regions.push(&image);
            image = union_with(regions, &rings);
        } else {
            let bounds = image.bounds();
            let near = clear[&level].iter().filter(|(_, of)| !image.0.is_empty() && of.meets(bounds));
            let (regions, rings) = shapes(near.map(|&(index, _)| &objects[index]));
            if !(regions.is_empty() && rings.is_empty()) {
                image = difference(&image, &union_with(regions, &rings));
            }
        }
    }
    image
}
