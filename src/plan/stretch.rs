//! Which plane serves which part of a track.
//!
//! At samples along the track the nearest copper area of a reference net above and below is looked up, by the
//! dielectric between the facing copper; only where no reference copper lies above or below any of the track, areas of
//! any net count. Where there is none (a void), and where an area on the same layer or farther away shows for a while
//! between two stretches over the same plane, the plane of the run stays: an island, or a slot through which another
//! layer is seen, is a void of the plane. A reference area nearer than the plane hides it and is a stretch of its own.
//! Copper of other nets between track and plane is noted; it is solved as a sheet.

use super::TrackLeg;
use super::terrain::Terrain;
use super::touch::point_at;
use crate::field::PlaneId;
use std::ops::Range;

/// Distance between samples in metres.
const STEP_M: f64 = 0.2e-3;
/// A change of plane must last this many heights, ...
const SHORT_HEIGHTS: f64 = 3.0;
/// ... and at least this long, in metres.
const SHORT_M: f64 = 1e-3;
/// A second area within this many times the nearest's distance shares the return.
const SHARES: f64 = 3.0;

/// A part of the track over one plane.
#[derive(Clone, Debug, PartialEq)]
pub struct Stretch {
    /// The plane; none where no area lies above or below.
    pub plane: Option<PlaneId>,
    /// Legs of the divided track.
    pub legs: Range<usize>,
    /// The area on the other side that shares the return over most of the length.
    pub between: Option<PlaneId>,
    /// The area of another net that lies nearer than the plane over the longest part, and that length in metres.
    pub nearer: Option<(PlaneId, f64)>,
}

struct Sample {
    leg: usize,
    parts: (f64, f64),
    length_m: f64,
    plane: Option<PlaneId>,
    other: Option<PlaneId>,
    nearer: Option<PlaneId>,
}

/// Samples of one track layer with the same plane.
struct Block {
    samples: Range<usize>,
    plane: Option<PlaneId>,
    length_m: f64,
}

/// Divides a track of the nets `own` by the planes that serve it: the legs, divided where the plane changes, and the
/// stretches. Copper of the nets themselves, such as a plated pin's pads on other layers, carries no return.
pub fn divide(terrain: &Terrain<'_>, own: &[&str], legs: &[TrackLeg]) -> (Vec<TrackLeg>, Vec<Stretch>) {
    let mut samples = samples(terrain, own, legs, true);
    if samples.iter().all(|sample| sample.plane.is_none()) {
        samples = self::samples(terrain, own, legs, false);
    }
    let mut blocks: Vec<Block> = Vec::new();
    let mut start = 0;
    while start < samples.len() {
        let layer = legs[samples[start].leg].layer;
        let run = samples[start..].iter().take_while(|sample| legs[sample.leg].layer == layer).count();
        blocks.extend(run_blocks(terrain, layer, &samples, start..start + run));
        start += run;
    }
    // Runs on two layers over the same plane are one stretch.
    let mut joined: Vec<Block> = Vec::new();
    for block in blocks {
        match joined.last_mut() {
            Some(last) if last.plane == block.plane => last.samples.end = block.samples.end,
            _ => joined.push(block),
        }
    }
    let mut divided: Vec<TrackLeg> = Vec::new();
    let mut stretches = Vec::new();
    for block in joined {
        let first = divided.len();
        let mut at = block.samples.start;
        while at < block.samples.end {
            let leg = samples[at].leg;
            let mut end = at + 1;
            while end < block.samples.end && samples[end].leg == leg {
                end += 1;
            }
            let whole = (legs[leg].from, legs[leg].to);
            divided.push(TrackLeg {
                from: point_at(whole, samples[at].parts.0),
                to: point_at(whole, samples[end - 1].parts.1),
                ..legs[leg]
            });
            at = end;
        }
        let own = &samples[block.samples.clone()];
        let total: f64 = own.iter().map(|sample| sample.length_m).sum();
        let between = longest(own, block.plane.as_ref(), |sample| sample.other.as_ref());
        let between = between.filter(|(_, length_m)| *length_m > 0.5 * total).map(|(plane, _)| plane);
        let gap_m = |sample: &Sample, plane: &PlaneId| {
            terrain.board.stackup.gap_m(legs[sample.leg].layer, plane.layer)
        };
        let nearer = longest(own, block.plane.as_ref(), |sample| {
            let plane = block.plane.as_ref()?;
            sample.nearer.as_ref().filter(|nearer| gap_m(sample, nearer) < gap_m(sample, plane))
        });
        stretches.push(Stretch { plane: block.plane, legs: first..divided.len(), between, nearer });
    }
    (divided, stretches)
}

/// Samples along the track; planes are of reference nets only where `reference` asks it.
fn samples(terrain: &Terrain<'_>, own: &[&str], legs: &[TrackLeg], reference: bool) -> Vec<Sample> {
    let mut samples = Vec::new();
    for (index, leg) in legs.iter().enumerate() {
        let length = leg.from.distance(leg.to);
        let n = (length / STEP_M).ceil().max(1.0) as usize;
        for k in 0..n {
            let parts = (k as f64 / n as f64, (k + 1) as f64 / n as f64);
            let at = point_at((leg.from, leg.to), 0.5 * (parts.0 + parts.1));
            let (plane, other) = nearest(terrain, own, leg.layer, at, reference);
            let nearer = if reference { nearest(terrain, own, leg.layer, at, false).0 } else { None };
            samples.push(Sample { leg: index, parts, length_m: length / n as f64, plane, other, nearer });
        }
    }
    samples
}

/// The nearest area above or below a point of a layer, and the one on the other side where it is near enough to share
/// the return.
fn nearest(
    terrain: &Terrain<'_>,
    own: &[&str],
    layer: usize,
    at: crate::geom::Point,
    reference: bool,
) -> (Option<PlaneId>, Option<PlaneId>) {
    let look = |other: usize| {
        let area = terrain.area_at(other, at)?;
        let net = terrain.net_of(other, area);
        if reference && !terrain.is_reference(net) {
            return None;
        }
        let net = terrain.net_name(net).to_owned();
        if own.contains(&net.as_str()) {
            return None;
        }
        let gap_m = terrain.board.stackup.gap_m(layer, other);
        Some((gap_m, PlaneId { layer: other, net }))
    };
    let above = (0..layer).rev().find_map(look);
    let below = (layer + 1..terrain.board.layers.len()).find_map(look);
    match (above, below) {
        (Some(above), Some(below)) => {
            let (near, far) = if above.0 < below.0 { (above, below) } else { (below, above) };
            let shares = far.0 <= SHARES * near.0;
            (Some(near.1), shares.then_some(far.1))
        }
        (one, None) | (None, one) => (one.map(|found| found.1), None),
    }
}

/// The area among those that `pick` gives, other than the plane itself, that shows over the longest part.
fn longest<'s>(
    samples: &'s [Sample],
    plane: Option<&PlaneId>,
    pick: impl Fn(&'s Sample) -> Option<&'s PlaneId>,
) -> Option<(PlaneId, f64)> {
    let mut lengths: std::collections::BTreeMap<&PlaneId, f64> = std::collections::BTreeMap::new();
    for sample in samples {
        if let Some(other) = pick(sample).filter(|other| Some(*other) != plane) {
            *lengths.entry(other).or_default() += sample.length_m;
        }
    }
    let (longest, length_m) = lengths.into_iter().max_by(|a, b| a.1.total_cmp(&b.1))?;
    Some((longest.clone(), length_m))
}

/// Blocks of one run of track on a layer, voids and short intrusions taken in.
fn run_blocks(terrain: &Terrain<'_>, layer: usize, samples: &[Sample], run: Range<usize>) -> Vec<Block> {
    let mut blocks: Vec<Block> = Vec::new();
    for at in run {
        let sample = &samples[at];
        match blocks.last_mut() {
            Some(last) if last.plane == sample.plane => {
                last.samples.end = at + 1;
                last.length_m += sample.length_m;
            }
            _ => blocks.push(Block {
                samples: at..at + 1,
                plane: sample.plane.clone(),
                length_m: sample.length_m,
            }),
        }
    }
    // Voids keep the plane before them, or the one after.
    for at in 0..blocks.len() {
        if blocks[at].plane.is_none() {
            let before = at.checked_sub(1).and_then(|before| blocks[before].plane.clone());
            blocks[at].plane = before.or_else(|| blocks[at..].iter().find_map(|block| block.plane.clone()));
        }
    }
    merge(&mut blocks);
    let gap_m = |block: &Block| {
        block.plane.as_ref().map_or(0.0, |plane| terrain.board.stackup.gap_m(layer, plane.layer))
    };
    // What shows for a while between two stretches of one plane belongs to it, the shortest first.
    loop {
        let between = (1..blocks.len().saturating_sub(1)).filter(|&at| {
            blocks[at - 1].plane == blocks[at + 1].plane
                && gap_m(&blocks[at]) >= gap_m(&blocks[at - 1])
                && blocks[at].length_m <= blocks[at - 1].length_m + blocks[at + 1].length_m
        });
        let Some(at) = between.min_by(|&a, &b| blocks[a].length_m.total_cmp(&blocks[b].length_m)) else {
            break;
        };
        blocks[at].plane = blocks[at - 1].plane.clone();
        merge(&mut blocks);
    }
    // What is too short to matter goes to its longer neighbour.
    loop {
        let short = |block: &Block| block.length_m < SHORT_M.max(SHORT_HEIGHTS * gap_m(block));
        let shorts = (0..blocks.len()).filter(|&at| blocks.len() > 1 && short(&blocks[at]));
        let Some(at) = shorts.min_by(|&a, &b| blocks[a].length_m.total_cmp(&blocks[b].length_m)) else {
            break;
        };
        let length =
            |at: Option<usize>| at.and_then(|at| blocks.get(at)).map_or(-1.0, |block| block.length_m);
        let (before, after) = (at.checked_sub(1), Some(at + 1));
        let neighbour = if length(before) >= length(after) { at - 1 } else { at + 1 };
        blocks[at].plane = blocks[neighbour].plane.clone();
        merge(&mut blocks);
    }
    blocks
}

fn merge(blocks: &mut Vec<Block>) {
    blocks.dedup_by(|next, kept| {
        let same = next.plane == kept.plane;
        if same {
            kept.samples.end = next.samples.end;
            kept.length_m += next.length_m;
        }
        same
    });
}
