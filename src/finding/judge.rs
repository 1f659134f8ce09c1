//! From figures to findings: what is above its limit, where, and what causes it.
//!
//! Given the evidence of all charted paths and the limits of the review, gives findings without numbers or remedies.
//! Each void that alone adds enough inductance is a finding of its own; voids that do so only together are one.

use super::evidence::{MapEvidence, PlaneEvidence};
use super::word::{digits, hertz, quantity};
use super::{Cause, Excess, Finding, Grade, Measured, Number, Spot};
use crate::diag::Code;
use crate::diag::code::finding as code;
use crate::figure::{Figure, VoidEffect, away_m, own_voids};
use crate::geom::Point;
use crate::plan::matches;
use crate::review::limit::{LimitRequest, Limits};

/// A place this many heights from a void that a finding names already is of the same cause.
const SAME_CAUSE_HEIGHTS: f64 = 10.0;
/// Below this share within 3h without voids, in the highest band, the spread is noted.
const SPREAD_SHARE: f64 = 0.5;

/// The limits of a path: those of the last exception that matches its name.
pub fn limits_of<'r>(request: &'r LimitRequest, path: &str) -> &'r Limits {
    let found = request.paths.iter().rev().find(|entry| matches(&entry.name, path));
    found.map_or(&request.all, |entry| &entry.limits)
}

/// The grade of a value; none below the part of the limit from which on it warns.
pub fn grade(value: f64, limit: f64, warn_at: f64) -> Option<Grade> {
    match value / limit {
        ratio if ratio > 1.0 => Some(Grade::Fail),
        ratio if ratio > warn_at => Some(Grade::Warn),
        _ => None,
    }
}

/// Findings of one path on one plane.
pub fn plane(evidence: &PlaneEvidence, request: &LimitRequest) -> Vec<Finding> {
    let limits = limits_of(request, &evidence.path.name);
    let legs = &evidence.path.track[evidence.chart.legs.clone()];
    let judge = Judge { evidence, limits, own: own_voids(legs, &evidence.chart.voids) };
    let mut found = judge.detours();
    found.extend(judge.share_drop(&found));
    found.extend(judge.edge());
    found.extend(judge.strays());
    found.extend(judge.spread());
    found
}

struct Judge<'e, 'a> {
    evidence: &'e PlaneEvidence<'a>,
    limits: &'e Limits,
    /// Antipads of the path's own pins and vias, which it needs: they are no fault.
    own: Vec<usize>,
}

/// A void over all maps: where its part is largest.
struct WorstVoid<'e> {
    map: &'e MapEvidence,
    effect: &'e VoidEffect,
    inductance_h: f64,
}

impl Judge<'_, '_> {
    fn name(&self) -> &str {
        &self.evidence.path.name
    }

    /// A finding on this plane at a place of the track.
    fn finding(
        &self,
        code: Code,
        grade: Grade,
        map: &MapEvidence,
        at: Point,
        excess: Excess,
        words: (String, Cause, String),
    ) -> Finding {
        let (sentence, cause, cause_text) = words;
        Finding {
            number: Number { path: self.evidence.number, of_path: 0 },
            code,
            grade,
            path: self.name().to_owned(),
            plane: Some(self.evidence.chart.plane.clone()),
            band: Some(map.band.clone()),
            frequency_hz: Some(map.frequency_hz),
            place: Spot { at, layer: self.evidence.chart.plane.layer },
            excess,
            sentence,
            cause,
            cause_text,
            remedy: None,
            waived: None,
        }
    }

    fn grade(&self, value: f64, limit: f64) -> Option<Grade> {
        grade(value, limit, self.limits.warn_at)
    }

    /// Voids that make the loop's inductance or the return's path larger.
    fn detours(&self) -> Vec<Finding> {
        let limit = self.limits.extra_inductance_h;
        let mut found = Vec::new();
        let mut alone: Vec<String> = Vec::new();
        for worst in self.worst_voids() {
            let Some(grade) = self.grade(worst.inductance_h, limit) else { continue };
            let total = worst.map.figures.extra_loop_inductance_h;
            let error = total.map_or(0.0, |total| total.error);
            let excess = Excess {
                what: Measured::ExtraInductance,
                value: worst.inductance_h,
                error,
                limit: Some(limit),
            };
            let words = self.detour_words(worst.map, worst.effect, worst.inductance_h);
            found.push(self.finding(code::DETOUR, grade, worst.map, worst.effect.at, excess, words));
            alone.push(worst.effect.id.clone());
        }
        if found.is_empty() {
            found.extend(self.together(&alone));
        }
        found
    }

    fn detour_words(&self, map: &MapEvidence, effect: &VoidEffect, henry: f64) -> (String, Cause, String) {
        let gain = quantity(Measured::ExtraInductance, henry);
        let where_ = if effect.crossed { "crosses" } else { "passes" };
        let mut sentence = format!(
            "`{}` {where_} void `{}`, which adds {gain} to its loop at {}",
            self.name(),
            effect.id,
            hertz(map.frequency_hz)
        );
        if let Some(path) = longer(map) {
            sentence += &format!("; all voids together make the return {path} longer");
        }
        let mut text = match (effect.crossed, effect.ends) {
            (true, Some([left, right])) => format!(
                "the plane has no copper under the track there; {} of the return goes round one end of the void and {} \
                 round the other",
                percent(left.share.max(right.share)),
                percent(left.share.min(right.share))
            ),
            (true, None) => "the plane has no copper under the track there".to_owned(),
            (false, _) => format!(
                "the void lies {} mm from the track and blocks a part of the return",
                digits(effect.distance_m * 1e3)
            ),
        };
        if let Some(total) = map.figures.extra_loop_inductance_h.and_then(|figure| figure.value)
            && total > 0.0
            && henry < 0.8 * total
        {
            text += &format!(
                "; of {} by all voids it is the largest part",
                quantity(Measured::ExtraInductance, total)
            );
        }
        (sentence, Cause::Void(effect.id.clone()), text)
    }

    /// Voids that are too much only together, by inductance or by the extra path.
    fn together(&self, alone: &[String]) -> Option<Finding> {
        let candidates = self.evidence.maps.iter().flat_map(|map| {
            let inductance = map.figures.extra_loop_inductance_h.map(|figure| self.without_own(map, figure));
            let path = map.figures.extra_path_m;
            let excess = |what, figure: Option<Figure>, limit: f64| {
                let figure = figure?;
                Some((map, Excess { what, value: figure.value?, error: figure.error, limit: Some(limit) }))
            };
            [
                excess(Measured::ExtraInductance, inductance, self.limits.extra_inductance_h),
                excess(Measured::ExtraPath, path, self.limits.extra_path_m),
            ]
        });
        let (map, excess) = candidates.flatten().max_by(|a, b| a.1.ratio().total_cmp(&b.1.ratio()))?;
        let grade = self.grade(excess.value, excess.limit?)?;
        let blamed = |effect: &&VoidEffect| !alone.contains(&effect.id) && !self.own.contains(&effect.index);
        let effect = map.effects.voids.iter().find(blamed)?;
        let amount = quantity(excess.what, excess.value);
        let what = match excess.what {
            Measured::ExtraPath => format!("make its return {amount} longer"),
            _ => format!("add {amount} to its loop"),
        };
        let sentence =
            format!("voids of the plane under `{}` {what} at {}", self.name(), hertz(map.frequency_hz));
        let text = format!("void `{}` has the largest part", effect.id);
        let words = (sentence, Cause::Void(effect.id.clone()), text);
        Some(self.finding(code::DETOUR, grade, map, effect.at, excess, words))
    }

    /// The extra inductance without what the path's own antipads add.
    fn without_own(&self, map: &MapEvidence, figure: Figure) -> Figure {
        let own = map.effects.voids.iter().filter(|effect| self.own.contains(&effect.index));
        let own_h: f64 = own.filter_map(|effect| effect.extra_inductance_h).sum();
        Figure { value: figure.value.map(|value| value - own_h), ..figure }
    }

    /// Voids by their largest part over all maps, largest first.
    fn worst_voids(&self) -> Vec<WorstVoid<'_>> {
        let mut worst: Vec<WorstVoid> = Vec::new();
        for map in &self.evidence.maps {
            for effect in map.effects.voids.iter().filter(|effect| !self.own.contains(&effect.index)) {
                let Some(inductance_h) = effect.extra_inductance_h else { continue };
                match worst.iter_mut().find(|known| known.effect.index == effect.index) {
                    Some(known) if known.inductance_h >= inductance_h => {}
                    Some(known) => *known = WorstVoid { map, effect, inductance_h },
                    None => worst.push(WorstVoid { map, effect, inductance_h }),
                }
            }
        }
        worst.sort_by(|a, b| {
            b.inductance_h.total_cmp(&a.inductance_h).then(a.effect.index.cmp(&b.effect.index))
        });
        worst
    }

    /// A place where the return is pushed aside, unless a void that is found already does it.
    fn share_drop(&self, found: &[Finding]) -> Option<Finding> {
        let worst = |map: &MapEvidence| map.effects.share_drop.and_then(|drop| drop.figure.value);
        let map = self
            .evidence
            .maps
            .iter()
            .max_by(|a, b| worst(a).unwrap_or(f64::MIN).total_cmp(&worst(b).unwrap_or(f64::MIN)))?;
        let drop = map.effects.share_drop?;
        let value = drop.figure.value?;
        let grade = self.grade(value, self.limits.share_drop)?;
        let (id, distance_m) = self.nearest_void(drop.at)?;
        let near = SAME_CAUSE_HEIGHTS * self.evidence.chart.height_m;
        let same = |finding: &Finding| match &finding.cause {
            Cause::Void(known) => *known == id || finding.place.at.distance(drop.at) < near,
            _ => false,
        };
        if found.iter().any(same) {
            return None;
        }
        let excess = Excess {
            what: Measured::ShareDrop,
            value,
            error: drop.figure.error,
            limit: Some(self.limits.share_drop),
        };
        let height = digits(3e3 * self.evidence.chart.height_m);
        let sentence = format!(
            "at one place of `{}` the share of the return within {height} mm (3h) of the track is {} lower than \
             without voids, at {}",
            self.name(),
            points(value),
            hertz(map.frequency_hz)
        );
        let text = if distance_m > 0.0 {
            format!("void `{id}` lies {} mm from the track there", digits(distance_m * 1e3))
        } else {
            format!("void `{id}` lies under the track there, webs between its holes included")
        };
        let words = (sentence, Cause::Void(id), text);
        Some(self.finding(code::SHARE_DROP, grade, map, drop.at, excess, words))
    }

    /// The void nearest to a place, and its distance.
    fn nearest_void(&self, at: Point) -> Option<(String, f64)> {
        let voids = self.evidence.chart.voids.iter();
        let nearest =
            voids.map(|void| (away_m(&void.shape, at), &void.id)).min_by(|a, b| a.0.total_cmp(&b.0))?;
        Some((nearest.1.clone(), nearest.0))
    }

    fn edge(&self) -> Option<Finding> {
        let value = |map: &MapEvidence| map.effects.edge_density.and_then(|edge| edge.figure.value);
        let map = self
            .evidence
            .maps
            .iter()
            .max_by(|a, b| value(a).unwrap_or(f64::MIN).total_cmp(&value(b).unwrap_or(f64::MIN)))?;
        let edge = map.effects.edge_density?;
        let density = edge.figure.value?;
        let grade = self.grade(density, self.limits.edge_density)?;
        let excess = Excess {
            what: Measured::EdgeDensity,
            value: density,
            error: edge.figure.error,
            limit: Some(self.limits.edge_density),
        };
        let sentence = format!(
            "the return of `{}` piles up at the edge of the plane: {} of the density that lies under a track, at {}",
            self.name(),
            percent(density),
            hertz(map.frequency_hz)
        );
        let text = format!(
            "the track runs {} mm inside the edge of the plane, {} times its height over it",
            digits(edge.distance_m.unwrap_or(0.0) * 1e3),
            digits(edge.distance_m.unwrap_or(0.0) / self.evidence.chart.height_m)
        );
        Some(self.finding(code::PLANE_EDGE, grade, map, edge.at, excess, (sentence, Cause::Edge, text)))
    }

    fn strays(&self) -> Vec<Finding> {
        let mut found: Vec<(String, Finding)> = Vec::new();
        for map in &self.evidence.maps {
            for stray in map.effects.strays.iter().filter(|stray| !stray.own) {
                let (Some(share), Some(without)) = (stray.share.value, stray.share.without_voids) else {
                    continue;
                };
                let value = share - without;
                let Some(grade) = self.grade(value, self.limits.stray) else { continue };
                let excess = Excess {
                    what: Measured::Stray,
                    value,
                    error: stray.share.error,
                    limit: Some(self.limits.stray),
                };
                let sentence = format!(
                    "{} of the return of `{}` flows through zone `{}` at {}, {} without voids",
                    percent(share),
                    self.name(),
                    stray.zone,
                    hertz(map.frequency_hz),
                    percent(without)
                );
                let text = match map.effects.voids.first() {
                    Some(void) => format!("void `{}` turns the return away from the track", void.id),
                    None => "voids turn the return away from the track".to_owned(),
                };
                let cause =
                    map.effects.voids.first().map_or(Cause::Spread, |void| Cause::Void(void.id.clone()));
                let at = stray.worst.unwrap_or(self.evidence.chart.driver_landing.at);
                let finding = self.finding(code::STRAY, grade, map, at, excess, (sentence, cause, text));
                match found.iter_mut().find(|known| known.0 == stray.zone) {
                    Some(known) if known.1.excess.value >= value => {}
                    Some(known) => known.1 = finding,
                    None => found.push((stray.zone.clone(), finding)),
                }
            }
        }
        found.into_iter().map(|entry| entry.1).collect()
    }

    /// A note where even without voids little of the return stays near the track in the highest band.
    fn spread(&self) -> Option<Finding> {
        let map = self.evidence.maps.iter().max_by(|a, b| a.frequency_hz.total_cmp(&b.frequency_hz))?;
        let share = map.figures.share_3h;
        let (value, without) = (share.value?, share.without_voids?);
        if without >= SPREAD_SHARE {
            return None;
        }
        let at = map.figures.worst_share_3h.map_or(self.evidence.chart.driver_landing.at, |worst| worst.1);
        let excess = Excess { what: Measured::Share, value, error: share.error, limit: None };
        let sentence = format!(
            "{} of the return of `{}` stays within 3h of the track at {}, {} without voids",
            percent(value),
            self.name(),
            hertz(map.frequency_hz),
            percent(without)
        );
        let text = format!(
            "the track of {} mm lies {} mm over the plane; at this frequency the return spreads wide",
            digits(self.evidence.chart.width_m * 1e3),
            digits(self.evidence.chart.height_m * 1e3)
        );
        let words = (sentence, Cause::Spread, text);
        Some(self.finding(code::SPREAD_RETURN, Grade::Note, map, at, excess, words))
    }
}

fn longer(map: &MapEvidence) -> Option<String> {
    let figure = map.figures.extra_path_m?;
    let value = figure.value.filter(|value| *value > figure.error && *value > 1e-4)?;
    Some(quantity(Measured::ExtraPath, value))
}

fn percent(share: f64) -> String {
    format!("{} %", (share * 100.0).round() + 0.0)
}

/// A difference of shares in percentage points.
fn points(share: f64) -> String {
    format!("{} percentage points", (share * 100.0).round() + 0.0)
}

/// Sorts the findings of each path, worst first, and numbers them.
pub fn number(findings: &mut [Finding]) {
    findings.sort_by(|a, b| {
        let worse = |finding: &Finding| (finding.number.path, finding.grade);
        let plane = |finding: &Finding| finding.plane.clone();
        worse(a)
            .cmp(&worse(b))
            .then(b.excess.ratio().total_cmp(&a.excess.ratio()))
            .then_with(|| a.code.name.cmp(b.code.name))
            .then_with(|| plane(a).cmp(&plane(b)))
            .then_with(|| a.sentence.cmp(&b.sentence))
    });
    let mut last = (0, 0);
    for finding in findings {
        last = if finding.number.path == last.0 { (last.0, last.1 + 1) } else { (finding.number.path, 1) };
        finding.number.of_path = last.1;
    }
}
