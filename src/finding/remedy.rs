//! Remedies: changes of the board that are solved, so that their gain is a computed one.
//!
//! For a finding above its limit several changes are tried on the cells of its map, in its worst band: the void filled,
//! shortened or bridged under the track, the track moved off the edge, a via for the return beside a layer change. The
//! best is named if it gains a fifth of the figure at least.
//!
//! Cautions: a remedy is a proposal for the copper alone. Clearances of mains, of patient circuits and of other safety
//! barriers are not known here; local codes and licensed practice decide on them.
//! Checked by: `a_remedy_keeps_its_promise`, `a_return_via_is_found_missing` in tests/finding.

use super::change::{add_copper, add_via, fillable, move_track};
use super::evidence::PlaneEvidence;
use super::judge::{grade, limits_of};
use super::word::{digits, place, quantity};
use super::{Cause, Excess, Finding, Grade, Measured, Number, Remedy, Spot};
use crate::board::Board;
use crate::diag::Diagnostic;
use crate::diag::code::finding as code;
use crate::field::{PlaneId, Workshop};
use crate::figure::{Charted, chart};
use crate::geom::{Point, Polygon, Region, boolean, stroke};
use crate::plan::{ChartPlan, End, JointKind, PathPlan, Plan, Void};
use crate::review::{Band, Review};

/// Clearance that copper filled into a void keeps from other nets, in metres (common practice).
const CLEARANCE_M: f64 = 0.2e-3;
/// Width of a bridge under a track in heights, and its least in metres.
const BRIDGE: (f64, f64) = (6.0, 1e-3);
/// What a bridge overlaps the plane by, in metres.
const OVERLAP_M: f64 = 0.5e-3;
/// Steps by which a track is moved off an edge, in heights.
const STEPS: [f64; 3] = [3.0, 6.0, 12.0];
/// Distances of a return via from the signal's, centre to centre, and its radius, in metres.
const VIA_AWAY_M: f64 = 0.8e-3;
const VIA_RADIUS_M: f64 = 0.15e-3;
/// A via that joins both planes within this distance of a layer change is near enough, in metres.
const VIA_NEAR_M: f64 = 1.5e-3;
/// Least part of the figure that a remedy gains.
const LEAST_GAIN: f64 = 0.2;
/// Least relative error of a gain: of the figures that it is a difference of.
const LEAST_ERROR: f64 = 0.02;

/// The board on which remedies are tried.
#[derive(Clone, Copy)]
pub struct Trials<'a> {
    /// The board.
    pub board: &'a Board,
    /// The plan of the whole review.
    pub plan: &'a Plan,
    /// The review.
    pub review: &'a Review,
    /// Index of the path in the plan.
    pub path: usize,
    /// What is charted of the path.
    pub charts: &'a [ChartPlan],
}

/// A change with its figure.
struct Tried {
    action: String,
    spot: Spot,
    copper: Vec<Polygon>,
    after: f64,
    error: f64,
}

impl Trials<'_> {
    fn path(&self) -> &PathPlan {
        &self.plan.paths[self.path]
    }

    fn chart_on(&self, plane: &PlaneId) -> Option<&ChartPlan> {
        self.charts.iter().find(|chart| chart.plane == *plane)
    }

    /// Solves the path on a changed board in one band at one frequency.
    fn solve(&self, board: &Board, plan: &Plan, band: &str, hz: f64) -> Result<Vec<Charted>, Diagnostic> {
        let known = self.plan.bands.iter().find(|known| known.name == band);
        let band = Band { at_hz: vec![hz], ..known.cloned().unwrap_or_default() };
        let workshop = Workshop::new(board, plan, self.review.solver.model);
        let bench = workshop.bench(&plan.paths[self.path]);
        chart(&bench, &plan.paths[self.path], &band, hz).planes.into_iter().collect()
    }

    /// The best remedy for a finding above its limit, and what could not be tried.
    pub fn best(&self, evidence: &[PlaneEvidence], finding: &Finding) -> (Option<Remedy>, Vec<Diagnostic>) {
        let mut messages = Vec::new();
        let (Some(plane), Some(band), Some(hz)) = (&finding.plane, &finding.band, finding.frequency_hz)
        else {
            return (None, messages);
        };
        let Some(chart) = self.chart_on(plane) else { return (None, messages) };
        let maps = evidence.iter().filter(|evidence| evidence.chart.plane == *plane);
        let mut maps = maps.flat_map(|evidence| &evidence.maps);
        let Some(map) = maps.find(|map| map.band == *band && map.frequency_hz == hz) else {
            return (None, messages);
        };
        let Some((before, before_error)) = measured(finding.excess.what, &map.figures, &map.effects) else {
            return (None, messages);
        };
        let changes = match &finding.cause {
            Cause::Void(id) => match chart.voids.iter().find(|void| void.id == *id) {
                Some(void) => self.void_changes(chart, void, finding.place.at),
                None => Vec::new(),
            },
            Cause::Edge => self.edge_changes(chart, finding.place.at),
            Cause::LayerChange | Cause::Path(_) | Cause::Spread => Vec::new(),
        };
        let mut tried: Vec<Tried> = Vec::new();
        for (action, spot, copper, board, plan) in changes {
            let board = board.as_ref().unwrap_or(self.board);
            let solved = self.solve(board, plan.as_ref().unwrap_or(self.plan), band, hz);
            let charted = solved.map(|all| all.into_iter().find(|charted| charted.map.plane == *plane));
            match charted {
                Ok(Some(charted)) => {
                    if let Some((after, error)) =
                        measured(finding.excess.what, &charted.figures, &charted.effects)
                    {
                        tried.push(Tried { action, spot, copper, after, error });
                    }
                }
                Ok(None) => {}
                Err(reason) => {
                    let text = format!("remedy `{action}` could not be tried: {}", reason.text);
                    messages.push(
                        Diagnostic::note(code::REMEDY_UNTRIED, text).on_board(Some(spot.layer + 1), spot.at),
                    );
                }
            }
        }
        (chosen(before, before_error, tried), messages)
    }

    /// Void filled, shortened, bridged: action, place, copper, changed board and plan.
    fn void_changes(&self, chart: &ChartPlan, void: &Void, at: Point) -> Vec<Change> {
        let plane = &chart.plane;
        let free = fillable(self.board, plane, &void.shape, CLEARANCE_M);
        let mut changes = Vec::new();
        let mut offer = |action: String, place: Point, copper: Region| {
            // a rim shared with the plane must overlap it by more than rounding
            let grown = boolean::offset(&copper, 2e-6);
            if copper.area() <= 0.0 {
                return;
            }
            if let Some((board, plan)) = add_copper(self.board, self.plan, plane, &grown) {
                let spot = Spot { at: place, layer: plane.layer };
                changes.push((action, spot, copper.0, Some(board), Some(plan)));
            }
        };
        let whole = free.area() > 0.9 * void.shape.area();
        let name = &void.id;
        offer(
            if whole {
                format!("fill void `{name}` of plane `{plane}` with its copper")
            } else {
                format!(
                    "fill void `{name}` of plane `{plane}` up to {} mm from other copper and holes",
                    digits(CLEARANCE_M * 1e3)
                )
            },
            at,
            free.clone(),
        );
        let Some(along) = self.direction_at(at) else { return changes };
        if !void.shape.contains(at) || !whole {
            return changes;
        }
        let width_m = (BRIDGE.0 * chart.height_m).max(BRIDGE.1);
        let across = reach(&void.shape, at, along);
        let ends = (at - along * (across.1 + OVERLAP_M), at + along * (across.0 + OVERLAP_M));
        let bridge = Region(vec![Polygon { outer: stroke::capsule(ends.0, ends.1, width_m), holes: vec![] }]);
        offer(
            format!(
                "bridge void `{name}` of plane `{plane}` under the track with copper {} mm wide",
                digits(width_m * 1e3)
            ),
            at,
            boolean::intersection(&bridge, &boolean::offset(&free, OVERLAP_M)),
        );
        // shortened from the nearer end to beyond the track
        let out = Point::new(-along.y, along.x);
        let sides = reach(&void.shape, at, out);
        let out = if sides.0 < sides.1 { out } else { out * -1.0 };
        let beyond = 5.0 * chart.height_m;
        let half = half_plane(&void.shape, at - out * beyond, out);
        offer(
            format!(
                "shorten void `{name}` of plane `{plane}` so that it ends {} mm beside the track",
                digits(beyond * 1e3)
            ),
            at,
            boolean::intersection(&free, &half),
        );
        changes
    }

    /// Track moved off the edge by several distances.
    fn edge_changes(&self, chart: &ChartPlan, at: Point) -> Vec<Change> {
        let Some(along) = self.direction_at(at) else { return Vec::new() };
        let normal = Point::new(-along.y, along.x);
        let areas = self.board.layers[chart.plane.layer].areas.iter();
        let copper: Vec<&Polygon> = areas
            .filter(|area| area.net.is_some_and(|net| self.board.net_name(net) == chart.plane.net))
            .map(|area| &area.shape)
            .collect();
        // inward is where the plane goes on
        let goes_on = |out: Point| {
            let far = (1..=200).take_while(|&k| {
                let place = at + out * (f64::from(k) * 0.25 * chart.height_m);
                copper.iter().any(|shape| shape.contains(place))
            });
            far.count()
        };
        let inward = if goes_on(normal) > goes_on(normal * -1.0) { normal } else { normal * -1.0 };
        let run = 0.75 * chart.height_m;
        let legs = &self.path().track[chart.legs.clone()];
        let ends =
            [self.path().track.first().map(|leg| leg.from), self.path().track.last().map(|leg| leg.to)];
        let beside = |point: Point| {
            // what lies as near to the edge as the place itself, but not the ends at the pins
            let off = (point - at).dot(inward);
            off.abs() < run
                && !ends.contains(&Some(point))
                && legs.iter().any(|leg| leg.from == point || leg.to == point)
        };
        STEPS
            .iter()
            .map(|&heights| {
                let step = inward * (heights * chart.height_m);
                let plan = move_track(self.plan, self.path, |p| if beside(p) { p + step } else { p });
                let action = format!(
                    "move the track `{}` by {} mm away from the edge of the plane",
                    self.path().name,
                    digits(heights * chart.height_m * 1e3)
                );
                (action, Spot { at, layer: chart.plane.layer }, Vec::new(), None, Some(plan))
            })
            .collect()
    }

    /// Unit vector along the track at a place on it.
    fn direction_at(&self, at: Point) -> Option<Point> {
        let legs = self.path().track.iter().filter(|leg| leg.from != leg.to);
        let distance = |leg: &&crate::plan::TrackLeg| {
            crate::geom::locate::point_segment_distance(at, (leg.from, leg.to))
        };
        let leg = legs.min_by(|a, b| distance(a).total_cmp(&distance(b)))?;
        Some((leg.to - leg.from) * (1.0 / leg.from.distance(leg.to)))
    }

    /// Layer changes between planes that no via joins near by, with the via that mends each: the figure is what a via
    /// at the best of several places takes off the loop's inductance.
    pub fn layer_changes(&self, evidence: &[PlaneEvidence]) -> (Vec<Finding>, Vec<Diagnostic>) {
        let mut found = Vec::new();
        let mut messages = Vec::new();
        let planned = &self.path().charts;
        for pair in planned.windows(2) {
            let [from, to] = pair else { continue };
            let Some(leg) = from.legs.end.checked_sub(1).and_then(|leg| self.path().track.get(leg)) else {
                continue;
            };
            if from.plane == to.plane || self.has_via(from, to, leg.to) {
                continue;
            }
            match self.change_at(evidence, [&from.plane, &to.plane], leg.to) {
                Ok(finding) => found.extend(finding),
                Err(reason) => {
                    let text = format!(
                        "a via for the return of `{}` beside its layer change could not be tried: {}",
                        self.path().name,
                        reason.text
                    );
                    let message = Diagnostic::note(code::REMEDY_UNTRIED, text);
                    messages.push(message.on_board(Some(from.plane.layer + 1), leg.to));
                }
            }
        }
        (found, messages)
    }

    /// Whether a barrel near the place joins the planes.
    fn has_via(&self, from: &ChartPlan, to: &ChartPlan, at: Point) -> bool {
        let layers = [from.plane.layer, to.plane.layer];
        let (upper, lower) = (layers[0].min(layers[1]), layers[0].max(layers[1]));
        let net = self.board.net(&from.plane.net);
        self.board.holes.iter().any(|hole| {
            hole.plating == crate::board::Plating::Plated
                && hole.net.is_some()
                && hole.net == net
                && hole.layers.0 <= upper
                && lower <= hole.layers.1
                && hole.centre().distance(at) <= VIA_NEAR_M
        }) || self.plan.conductors.joints.iter().any(|joint| {
            let ends = [&joint.from, &joint.to].map(|end| match end {
                End::Copper { layer, .. } => Some(*layer),
                End::Node(_) => None,
            });
            let joins = ends == [Some(upper), Some(lower)] || ends == [Some(lower), Some(upper)];
            joint.kind == JointKind::Part && joins && joint.at.distance(at) <= VIA_NEAR_M
        })
    }

    fn change_at(
        &self,
        evidence: &[PlaneEvidence],
        planes: [&PlaneId; 2],
        at: Point,
    ) -> Result<Option<Finding>, Diagnostic> {
        let limits = limits_of(&self.review.limits, &self.path().name);
        let Some(of_plane) = evidence.iter().find(|evidence| evidence.chart.plane == *planes[0]) else {
            return Ok(None);
        };
        // at the highest frequency the detour is worst for what drives it; inductance is nearly the same above 1 MHz
        let Some(map) = of_plane.maps.iter().max_by(|a, b| a.frequency_hz.total_cmp(&b.frequency_hz)) else {
            return Ok(None);
        };
        let Some((before, error)) = map.figures.loop_inductance_h.and_then(|l| Some((l.value?, l.error)))
        else {
            return Ok(None);
        };
        let mut tried: Vec<Tried> = Vec::new();
        for quarter in 0..4 {
            let angle = f64::from(quarter) * std::f64::consts::FRAC_PI_2;
            let spot = at + Point::new(libm::cos(angle), libm::sin(angle)) * VIA_AWAY_M;
            let Some(plan) = add_via(self.board, self.plan, planes, spot, VIA_RADIUS_M) else { continue };
            let solved = self.solve(self.board, &plan, &map.band, map.frequency_hz)?;
            let loop_h = solved.iter().find(|charted| charted.map.plane == *planes[0]);
            let Some(after) = loop_h.and_then(|charted| charted.figures.loop_inductance_h) else { continue };
            let action = format!(
                "add a via of `{}` at {} that joins L{} and L{}",
                planes[0].net,
                place(spot, self.review.origin),
                planes[0].layer + 1,
                planes[1].layer + 1
            );
            let copper = Vec::new();
            let Some(value) = after.value else { continue };
            tried.push(Tried {
                action,
                spot: Spot { at: spot, layer: planes[0].layer },
                copper,
                after: value,
                error: after.error,
            });
        }
        let Some(least) = tried.iter().map(|tried| tried.after).min_by(f64::total_cmp) else {
            return Ok(None);
        };
        let excess_h = before - least;
        let Some(grade) = grade(excess_h, limits.extra_inductance_h, limits.warn_at) else { return Ok(None) };
        // the figure is what the best via gains, so that it takes off all of it
        tried.iter_mut().for_each(|tried| tried.after -= least);
        let remedy = chosen(excess_h, error, tried).filter(|_| grade == Grade::Fail);
        Ok(Some(Finding {
            number: Number { path: self.path + 1, of_path: 0 },
            code: code::RETURN_VIA,
            grade,
            path: self.path().name.clone(),
            plane: Some(planes[0].clone()),
            band: Some(map.band.clone()),
            frequency_hz: Some(map.frequency_hz),
            place: Spot { at, layer: planes[0].layer },
            excess: Excess {
                what: Measured::ExtraInductance,
                value: excess_h,
                error: LEAST_ERROR * before,
                limit: Some(limits.extra_inductance_h),
            },
            sentence: format!(
                "`{}` changes from plane `{}` to `{}` without a via for its return, which adds {} to its loop",
                self.path().name,
                planes[0],
                planes[1],
                quantity(Measured::ExtraInductance, excess_h)
            ),
            cause: Cause::LayerChange,
            cause_text: format!(
                "no via within {} mm of the change joins the two planes",
                digits(VIA_NEAR_M * 1e3)
            ),
            remedy,
            waived: None,
        }))
    }
}

/// Action, place, copper added, changed board and changed plan.
type Change = (String, Spot, Vec<Polygon>, Option<Board>, Option<Plan>);

/// The figure that a remedy is measured by: of the whole plane, in its worst band.
fn measured(
    what: Measured,
    figures: &crate::figure::Figures,
    effects: &crate::figure::Effects,
) -> Option<(f64, f64)> {
    let figure = match what {
        Measured::ExtraInductance => figures.extra_loop_inductance_h?,
        Measured::ExtraPath => figures.extra_path_m?,
        Measured::ShareDrop => effects.share_drop?.figure,
        Measured::EdgeDensity => {
            // no edge near any more is as good as nothing there
            let Some(edge) = effects.edge_density else { return Some((0.0, 0.0)) };
            edge.figure
        }
        Measured::Stray | Measured::Noise | Measured::Transfer | Measured::Share => return None,
    };
    Some((figure.value?, figure.error))
}

/// The best of what was tried, if it gains enough.
fn chosen(before: f64, before_error: f64, mut tried: Vec<Tried>) -> Option<Remedy> {
    tried.sort_by(|a, b| a.after.total_cmp(&b.after).then_with(|| a.action.cmp(&b.action)));
    let list: Vec<(String, f64)> =
        tried.iter().map(|tried| (tried.action.clone(), before - tried.after)).collect();
    let best = tried.into_iter().next()?;
    let gain = before - best.after;
    (gain >= LEAST_GAIN * before).then(|| Remedy {
        action: best.action,
        place: best.spot,
        copper: best.copper,
        before,
        after: best.after,
        error: (before_error - best.error).abs().max(LEAST_ERROR * gain.abs()),
        tried: list,
    })
}

/// How far a shape reaches from a place inside it, forward and backward along a direction, in metres.
fn reach(shape: &Polygon, at: Point, along: Point) -> (f64, f64) {
    const STEP_M: f64 = 20e-6;
    let bounds = shape.bounds();
    let most = ((bounds.width() + bounds.height()) / STEP_M) as usize + 1;
    let one = |along: Point| {
        let inside = (1..=most).take_while(|&k| shape.contains(at + along * (k as f64 * STEP_M)));
        inside.count() as f64 * STEP_M
    };
    (one(along), one(along * -1.0))
}

/// A large rectangle beyond a line through `at`, on the side of `out`.
fn half_plane(shape: &Polygon, at: Point, out: Point) -> Region {
    let bounds = shape.bounds();
    let size = 2.0 * (bounds.width() + bounds.height()) + at.distance(bounds.centre());
    let side = Point::new(-out.y, out.x);
    let corners =
        [at - side * size, at + side * size, at + side * size + out * size, at - side * size + out * size];
    let ring: Vec<Point> = corners.into();
    boolean::fill([&ring], boolean::Filling::NonZero)
}
