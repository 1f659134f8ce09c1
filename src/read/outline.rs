//! The board's outline: joins the lines of the profile to rings and fills them, cut-outs as holes.

use super::gerber::Object;
use super::log::Log;
use crate::board::CopperKind;
use crate::diag::code::read as code;
use crate::geom::boolean::{Filling, fill, union};
use crate::geom::{Point, Region, Ring};
use std::collections::BTreeMap;

/// Ends this close are the same point, in metres.
const SAME_M: f64 = 10e-6;
/// Ends this close are joined with a warning, in metres.
const JOINED_M: f64 = 0.25e-3;

/// A line of the profile: its points and its line in the file.
struct Chain {
    points: Vec<Point>,
    line: u32,
}

/// The area inside the profile; empty when the profile has no closed line.
pub fn outline(objects: &[Object], log: &mut Log) -> Region {
    let mut filled = Vec::new();
    let mut chains: Vec<Chain> = Vec::new();
    for object in objects.iter().filter(|object| object.dark) {
        match &object.kind {
            CopperKind::Draw { path, .. } => {
                let length: f64 = path.windows(2).map(|w| w[0].distance(w[1])).sum();
                if length > 1e-9 {
                    chains.push(Chain { points: path.clone(), line: object.line });
                }
            }
            CopperKind::Fill { shape } => filled.push(shape.clone()),
            CopperKind::Flash { .. } => {}
        }
    }
    drop_doubles(&mut chains);
    let (mut rings, open) = join(chains, SAME_M, false, log);
    let (more, open) = join(open, JOINED_M, true, log);
    rings.extend(more);
    for chain in &open {
        let ends = (chain.points[0], chain.points[chain.points.len() - 1]);
        let text = format!(
            "a line of the profile must be closed; got a gap of {:.3} mm from ({:.3}, {:.3}) mm; the line is left out",
            ends.0.distance(ends.1) * 1e3,
            ends.1.x * 1e3,
            ends.1.y * 1e3
        );
        let message = crate::diag::Diagnostic::warning(code::OUTLINE_OPEN, text).on_board(None, ends.1);
        log.add(chain.line, message);
    }
    let drawn = fill(&rings, Filling::EvenOdd);
    filled.push(drawn);
    union(&filled)
}

/// Removes lines that were drawn twice.
fn drop_doubles(chains: &mut Vec<Chain>) {
    let key = |point: &Point| ((point.x * 1e8).round() as i64, (point.y * 1e8).round() as i64);
    let mut seen = std::collections::BTreeSet::new();
    chains.retain(|chain| {
        let ends = (key(&chain.points[0]), key(&chain.points[chain.points.len() - 1]));
        let middle = key(&chain.points[chain.points.len() / 2]);
        let straight = chain.points.len() == 2;
        let middle = if straight { (ends.0.min(ends.1), ends.0.max(ends.1)).0 } else { middle };
        ends.0 == ends.1 || seen.insert((ends.0.min(ends.1), ends.0.max(ends.1), middle))
    });
}

/// Joins chains whose ends lie within `reach_m`, nearest ends first from each start. Gives closed rings and what stays
/// open.
fn join(chains: Vec<Chain>, reach_m: f64, warn: bool, log: &mut Log) -> (Vec<Ring>, Vec<Chain>) {
    // Ends by square of side `reach_m`: an end within reach lies in the same or a neighbouring square.
    let square = |p: Point| ((p.x / reach_m).floor() as i64, (p.y / reach_m).floor() as i64);
    let mut ends: BTreeMap<(i64, i64), Vec<(usize, bool)>> = BTreeMap::new();
    for (index, chain) in chains.iter().enumerate() {
        for (point, at_end) in [(chain.points[0], false), (chain.points[chain.points.len() - 1], true)] {
            ends.entry(square(point)).or_default().push((index, at_end));
        }
    }
    let mut chains: Vec<Option<Chain>> = chains.into_iter().map(Some).collect();
    let (mut rings, mut open) = (Vec::new(), Vec::new());
    for start in 0..chains.len() {
        let Some(mut chain) = chains[start].take() else { continue };
        let mut turned = false;
        loop {
            let tail = chain.points[chain.points.len() - 1];
            let gap_m = tail.distance(chain.points[0]);
            let mut best: Option<(f64, usize, bool)> = None;
            let (column, row) = square(tail);
            for key in (-1..=1).flat_map(|dx| (-1..=1).map(move |dy| (column + dx, row + dy))) {
                for &(index, at_end) in ends.get(&key).map_or(&[][..], Vec::as_slice) {
                    let Some(other) = &chains[index] else { continue };
                    let end = if at_end { other.points[other.points.len() - 1] } else { other.points[0] };
                    let distance = tail.distance(end);
                    let better = best.is_none_or(|(least, first, _)| (distance, index) < (least, first));
                    if distance <= reach_m && better {
                        best = Some((distance, index, at_end));
                    }
                }
            }
            let closes = gap_m <= reach_m && chain.points.len() > 2;
            match best {
                Some((distance, index, at_end)) if !closes || distance < gap_m => {
                    // The index was found in a place that holds a chain.
                    let Some(mut next) = chains[index].take() else { break };
                    if at_end {
                        next.points.reverse();
                    }
                    if warn {
                        report_gap(distance, tail, next.line, log);
                    }
                    let skip = usize::from(distance <= SAME_M);
                    chain.points.extend(next.points.into_iter().skip(skip));
                }
                _ if closes => {
                    if warn && gap_m > SAME_M {
                        report_gap(gap_m, tail, chain.line, log);
                    }
                    if gap_m <= SAME_M {
                        chain.points.pop();
                    }
                    rings.push(std::mem::take(&mut chain.points));
                    break;
                }
                _ if !turned => {
                    turned = true;
                    chain.points.reverse();
                }
                _ => break,
            }
        }
        if !chain.points.is_empty() {
            open.push(chain);
        }
    }
    rings.retain(|ring: &Ring| ring.len() > 2);
    (rings, open)
}

fn report_gap(gap_m: f64, at: Point, line: u32, log: &mut Log) {
    let text = format!("a gap of {:.3} mm in the profile is closed by a straight line", gap_m * 1e3);
    log.add(line, crate::diag::Diagnostic::warning(code::OUTLINE_GAP, text).on_board(None, at));
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::read::gerber::Tags;
    use std::sync::Arc;

    fn line(a: (f64, f64), b: (f64, f64)) -> Object {
        let path = vec![Point::mm(a.0, a.1), Point::mm(b.0, b.1)];
        let kind = CopperKind::Draw { path, width_m: 0.0 };
        Object { kind, dark: true, tags: Arc::new(Tags::default()), function: None, line: 7 }
    }

    fn frame(low: f64, high: f64, gap: f64) -> Vec<Object> {
        vec![
            line((low, low), (high, low)),
            line((high, high), (low, high)),
            line((low, low), (low, high)),
            line((high, low + gap), (high, high)),
        ]
    }

    #[test]
    fn unordered_lines_make_rings_and_inner_rings_are_cut_out() {
        let mut objects = frame(0.0, 10.0, 0.005);
        objects.extend(frame(4.0, 6.0, 0.0));
        objects.extend(frame(4.0, 6.0, 0.0));
        let mut log = Log::new("profile.gbr");
        let region = outline(&objects, &mut log);
        assert!(log.diagnostics.is_empty(), "{:?}", log.diagnostics);
        assert_eq!((region.0.len(), region.0[0].holes.len()), (1, 1));
        assert!((region.area() * 1e6 - 96.0).abs() < 1e-3);
    }

    #[test]
    fn gaps_are_told_and_wide_ones_leave_the_line_out() {
        let mut log = Log::new("profile.gbr");
        let region = outline(&frame(0.0, 10.0, 0.2), &mut log);
        assert!((region.area() * 1e6 - 100.0).abs() < 1e-6);
        assert_eq!(log.diagnostics[0].code, code::OUTLINE_GAP);
        let mut log = Log::new("profile.gbr");
        assert!(outline(&frame(0.0, 10.0, 0.3), &mut log).0.is_empty());
        assert_eq!((log.diagnostics[0].code, log.diagnostics[0].place.line), (code::OUTLINE_OPEN, Some(7)));
    }
}
