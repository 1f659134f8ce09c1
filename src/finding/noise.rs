//! Noise that paths put into each other: transfer impedances times the spectra of the drives.
//!
//! Given transfer impedances at the frequencies of the bands and the drives of the review, gives the rms voltage in each
//! path by band, by source and in total, and the findings against budgets.
//!
//! | symbol | meaning | unit |
//! |---|---|---|
//! | Z_AB(f) | volts in B's loop per ampere in A, see [`Couplings`] | ohm |
//! | I_A(f_k) | rms current of a line of A's drive | A |
//! | V_AB = sqrt(sum_k abs(Z_AB(f_k))^2 I_A(f_k)^2) | over the lines of a band | V |
//! | V_B = sqrt(sum_A sum_bands V_AB^2) | drives are independent of each other | V |
//!
//! Between solved frequencies abs(Z) follows a power of f, below the lowest it stays, above the highest it grows as f.
//! Source: sum of powers of independent sources; H. W. Ott, Electromagnetic Compatibility Engineering, 2009 (memory).
//! Checked by: `noise_of_a_worked_example`, `powers_between_frequencies` in tests/finding.

use super::judge::{grade, limits_of};
use super::word::{digits, quantity};
use super::{Cause, Excess, Finding, Grade, Measured, Number, Spot};
use crate::diag::code::finding as code;
use crate::field::Couplings;
use crate::geom::Point;
use crate::geom::locate::point_segment_distance;
use crate::plan::{PathPlan, Plan, TrackLeg, matches};
use crate::review::drive::{Budget, Drive, SignalRequest};
use crate::review::{Band, Review};
use crate::signal::converter::{budget_v, in_lsb};
use crate::signal::load::admittance;
use crate::signal::spectrum::{Limits, band_spectrum};
use num_complex::Complex64;

/// Relative error of a transfer impedance on cells twice as large as those of the maps.
/// Checked by: `two_tracks_over_a_plane_have_the_published_mutual_inductance` in tests/finding.
pub const TRANSFER_ERROR: f64 = 0.06;
/// Relative error to which a spectrum is condensed.
const CONDENSED: f64 = 1e-3;
/// Part of the geometric mean of two loops' impedances from which on a transfer impedance is noted.
const NOTED_PART: f64 = 0.1;

/// A voltage by the path that causes it.
#[derive(Clone, Debug, PartialEq)]
pub struct NoisePart {
    /// Name of the path.
    pub from: String,
    /// Voltage, rms.
    pub volts_rms: f64,
}

/// Noise in a path, in a band or in all.
#[derive(Clone, Debug, PartialEq)]
pub struct Noise {
    /// Name of the path.
    pub path: String,
    /// Name of the band; none for all together.
    pub band: Option<String>,
    /// Voltage, rms.
    pub volts_rms: f64,
    /// The same in steps of the converter behind the path, where the review names one.
    pub lsb: Option<f64>,
    /// What the path bears, in volts rms, where the review says.
    pub budget_v: Option<f64>,
    /// By source, largest first.
    pub parts: Vec<NoisePart>,
}

/// Drive, load and budget of a path, from the entry of the review that it belongs to.
pub fn signal_of<'r>(review: &'r Review, name: &str) -> Option<&'r SignalRequest> {
    let path = review.paths.iter().find(|path| path.name == name).map(|path| &path.signal);
    let pair = || review.pairs.iter().find(|pair| pair.name == name).map(|pair| &pair.signal);
    let net = || review.nets.iter().find(|net| matches(&net.name, name)).map(|net| &net.signal);
    path.or_else(pair).or_else(net)
}

/// Magnitude of a transfer impedance at a frequency from those at solved frequencies (rising), in ohm.
pub fn magnitude_at(solved: &[(f64, f64)], frequency_hz: f64) -> f64 {
    let (Some(&(low, first)), Some(&(high, last))) = (solved.first(), solved.last()) else { return 0.0 };
    if frequency_hz <= low {
        return first;
    }
    if frequency_hz >= high {
        return if high > 0.0 { last * frequency_hz / high } else { last };
    }
    let after = solved.iter().position(|&(hz, _)| hz > frequency_hz).unwrap_or(solved.len() - 1);
    let ((a, za), (b, zb)) = (solved[after - 1], solved[after]);
    if a <= 0.0 || za <= 0.0 || zb <= 0.0 {
        return za + (zb - za) * (frequency_hz - a) / (b - a);
    }
    let part = libm::log(frequency_hz / a) / libm::log(b / a);
    za * libm::exp(part * libm::log(zb / za))
}

/// Voltage in V rms that a drive puts into another path within a band, for transfer magnitudes at solved frequencies.
pub fn band_volts(signal: &SignalRequest, band: &Band, solved: &[(f64, f64)]) -> f64 {
    let Some(drive) = signal.drive.as_ref().filter(|drive| drive.is_absolute()) else { return 0.0 };
    let flow = |hz: f64| signal.load.as_ref().and_then(|load| admittance(load, hz)).unwrap_or_default();
    let spectrum = band_spectrum(drive, Limits::from(band), &flow, CONDENSED);
    let volts =
        spectrum.points.iter().map(|line| line.current_rms_a * magnitude_at(solved, line.frequency_hz));
    libm::sqrt(volts.map(|volts| volts * volts).sum())
}

/// Noise of all paths that others drive: first those with a budget, then the rest; of each the total, then its bands.
pub fn noise(couplings: &[Couplings], plan: &Plan, review: &Review) -> Vec<Noise> {
    let Some(first) = couplings.first() else { return Vec::new() };
    let mut victims = Vec::new();
    // only a path that was solved itself knows all that others put into it
    for &to in first.paths.iter().filter(|&&path| transfer(first, path, path).is_some()) {
        let name = &plan.paths[to].name;
        let budget = signal_of(review, name).and_then(|signal| signal.budget);
        let mut bands: Vec<Noise> = Vec::new();
        for band in &plan.bands {
            let part = |&from: &usize| {
                let signal = signal_of(review, &plan.paths[from].name).filter(|_| from != to)?;
                let volts_rms = band_volts(signal, band, &magnitudes(couplings, from, to));
                (volts_rms > 0.0).then(|| NoisePart { from: plan.paths[from].name.clone(), volts_rms })
            };
            let parts: Vec<NoisePart> = first.paths.iter().filter_map(part).collect();
            bands.push(entry(name, Some(&band.name), parts, budget.as_ref()));
        }
        let mut parts: Vec<NoisePart> = Vec::new();
        for part in bands.iter().flat_map(|band| &band.parts) {
            match parts.iter_mut().find(|known| known.from == part.from) {
                Some(known) => known.volts_rms = libm::hypot(known.volts_rms, part.volts_rms),
                None => parts.push(part.clone()),
            }
        }
        if !parts.is_empty() {
            let total = entry(name, None, parts, budget.as_ref());
            bands.retain(|band| !band.parts.is_empty());
            victims.push((budget.is_none(), std::iter::once(total).chain(bands)));
        }
    }
    victims.sort_by_key(|victim| victim.0);
    victims.into_iter().flat_map(|victim| victim.1).collect()
}

fn entry(path: &str, band: Option<&str>, mut parts: Vec<NoisePart>, budget: Option<&Budget>) -> Noise {
    parts.sort_by(|a, b| b.volts_rms.total_cmp(&a.volts_rms).then_with(|| a.from.cmp(&b.from)));
    let volts_rms = libm::sqrt(parts.iter().map(|part| part.volts_rms * part.volts_rms).sum());
    Noise {
        path: path.to_owned(),
        band: band.map(str::to_owned),
        volts_rms,
        lsb: budget.and_then(|budget| in_lsb(budget, volts_rms)),
        budget_v: budget.map(budget_v),
        parts,
    }
}

/// Frequencies and magnitudes of a transfer impedance, frequencies rising.
fn magnitudes(couplings: &[Couplings], from: usize, to: usize) -> Vec<(f64, f64)> {
    let mut found: Vec<(f64, f64)> =
        couplings.iter().filter_map(|at| Some((at.frequency_hz, transfer(at, from, to)?.norm()))).collect();
    found.sort_by(|a, b| a.0.total_cmp(&b.0));
    found.dedup_by(|a, b| a.0 == b.0);
    found
}

/// The transfer impedance from one path of the plan to another.
pub fn transfer(couplings: &Couplings, from: usize, to: usize) -> Option<Complex64> {
    let at = |path: usize| couplings.paths.iter().position(|&known| known == path);
    couplings.z_ohm[at(from)?][at(to)?]
}

/// Findings of one path (index in the plan) that rest on other paths: noise above its budget, and a return that it
/// shares with another.
pub fn of_others(
    index: usize,
    couplings: &[Couplings],
    noise: &[Noise],
    plan: &Plan,
    review: &Review,
) -> Vec<Finding> {
    let path = &plan.paths[index];
    let mut found = Vec::new();
    found.extend(over_budget(index, path, noise, plan, review));
    if found.is_empty() {
        found.extend(common(index, path, couplings, plan));
    }
    found
}

fn finding(index: usize, path: &PathPlan, other: &PathPlan) -> Option<Finding> {
    let (at, layer) = nearest(path, other)?;
    Some(Finding {
        number: Number { path: index + 1, of_path: 0 },
        code: code::NOISE,
        grade: Grade::Note,
        path: path.name.clone(),
        plane: None,
        band: None,
        frequency_hz: None,
        place: Spot { at, layer },
        excess: Excess { what: Measured::Noise, value: 0.0, error: 0.0, limit: None },
        sentence: String::new(),
        cause: Cause::Path(other.name.clone()),
        cause_text: String::new(),
        remedy: None,
        waived: None,
    })
}

fn over_budget(
    index: usize,
    path: &PathPlan,
    noise: &[Noise],
    plan: &Plan,
    review: &Review,
) -> Option<Finding> {
    let of_path = || noise.iter().filter(|noise| noise.path == path.name);
    let total = of_path().find(|noise| noise.band.is_none())?;
    let budget_v = total.budget_v?;
    let grade = grade(total.volts_rms, budget_v, limits_of(&review.limits, &path.name).warn_at)?;
    let largest = total.parts.first()?;
    let other = plan.paths.iter().find(|other| other.name == largest.from)?;
    let worst = of_path().filter(|noise| noise.band.is_some());
    let worst = worst.max_by(|a, b| a.volts_rms.total_cmp(&b.volts_rms))?;
    let volts = |volts: f64| quantity(Measured::Noise, volts);
    let lsb = |lsb: Option<f64>| lsb.map(|lsb| format!(" ({} LSB)", digits(lsb))).unwrap_or_default();
    let kind = signal_of(review, &other.name).and_then(|signal| signal.drive.as_ref()).map(Drive::kind);
    let mut found = finding(index, path, other)?;
    found.grade = grade;
    found.band = worst.band.clone();
    found.excess = Excess {
        what: Measured::Noise,
        value: total.volts_rms,
        error: TRANSFER_ERROR * total.volts_rms,
        limit: Some(budget_v),
    };
    found.sentence = format!(
        "other paths put {}{} of noise into `{}`, most of it in band {}; it bears {}",
        volts(total.volts_rms),
        lsb(total.lsb),
        path.name,
        worst.band.as_deref().unwrap_or_default(),
        volts(budget_v)
    );
    found.cause_text = format!(
        "`{}`{} puts {} there by common copper and by induction; the two come nearest at the place marked",
        other.name,
        kind.map(|kind| format!(" ({kind})")).unwrap_or_default(),
        volts(largest.volts_rms)
    );
    Some(found)
}

/// A note on the path with which the coupling at the highest frequency is closest.
fn common(index: usize, path: &PathPlan, couplings: &[Couplings], plan: &Plan) -> Option<Finding> {
    let at = couplings.iter().max_by(|a, b| a.frequency_hz.total_cmp(&b.frequency_hz))?;
    let own = transfer(at, index, index)?.norm();
    let close = |&other: &usize| {
        let between = transfer(at, index, other)?.norm();
        let part = between / libm::sqrt(own * transfer(at, other, other)?.norm());
        Some((part, between, other))
    };
    let others = at.paths.iter().filter(|&&other| other != index);
    let (part, between, other) = others.filter_map(close).max_by(|a, b| a.0.total_cmp(&b.0))?;
    if part < NOTED_PART {
        return None;
    }
    let mut found = finding(index, path, &plan.paths[other])?;
    found.code = code::COMMON_RETURN;
    found.frequency_hz = Some(at.frequency_hz);
    found.excess =
        Excess { what: Measured::Transfer, value: between, error: TRANSFER_ERROR * between, limit: None };
    found.sentence = format!(
        "the loops of `{}` and `{}` share {} % of their impedance at {}: {} from one to the other",
        path.name,
        plan.paths[other].name,
        digits(100.0 * part),
        super::word::hertz(at.frequency_hz),
        quantity(Measured::Transfer, between)
    );
    found.cause_text = "their tracks or their returns lie side by side at the place marked".to_owned();
    Some(found)
}

/// The place of `path` nearest to `other`, and its layer.
fn nearest(path: &PathPlan, other: &PathPlan) -> Option<(Point, usize)> {
    const STEP_M: f64 = 0.2e-3;
    let mut best: Option<(f64, Point, usize)> = None;
    let away = |at: Point| {
        let distance = |leg: &TrackLeg| point_segment_distance(at, (leg.from, leg.to));
        other.track.iter().map(distance).fold(f64::INFINITY, f64::min)
    };
    for leg in &path.track {
        let count = (leg.from.distance(leg.to) / STEP_M).ceil().max(1.0) as usize;
        for k in 0..=count {
            let at = leg.from + (leg.to - leg.from) * (k as f64 / count as f64);
            let distance = away(at);
            if best.is_none_or(|best| distance < best.0) {
                best = Some((distance, at, leg.layer));
            }
        }
    }
    best.map(|best| (best.1, best.2))
}
