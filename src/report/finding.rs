//! Findings, effects and joints as members of `findings.json`.

use crate::field::JointCurrent;
use crate::figure::{Effects, Figure, Placed};
use crate::finding::noise::{Noise, NoisePart, TRANSFER_ERROR};
use crate::finding::{Finding, Spot};
use crate::geom::Point;
use crate::plan::JointKind;
use num_complex::Complex64;
use serde::Serialize;

/// Millimetres from the review's origin, to a nanometre, so that sums of coordinates leave no digits of rounding.
pub(super) fn millimetres(at: Point, origin: Point) -> (f64, f64) {
    let round = |metres: f64| (metres * 1e9).round() / 1e6 + 0.0;
    (round(at.x - origin.x), round(at.y - origin.y))
}

/// A figure.
#[derive(Clone, Copy, Debug, Serialize)]
pub(super) struct FigureEntry {
    value: Option<f64>,
    without_voids: Option<f64>,
    error: f64,
}

/// A figure as an entry.
pub(super) fn figure(figure: Figure) -> FigureEntry {
    FigureEntry { value: figure.value, without_voids: figure.without_voids, error: figure.error }
}

/// A plane.
#[derive(Clone, Debug, Serialize)]
pub(super) struct PlaneEntry {
    pub layer: String,
    pub net: String,
}

/// A place.
#[derive(Clone, Debug, Serialize)]
struct SpotEntry {
    x_mm: f64,
    y_mm: f64,
    layer: String,
}

fn spot(spot: Spot, origin: Point) -> SpotEntry {
    let (x_mm, y_mm) = millimetres(spot.at, origin);
    SpotEntry { x_mm, y_mm, layer: format!("L{}", spot.layer + 1) }
}

#[derive(Clone, Debug, Serialize)]
struct CauseEntry {
    kind: &'static str,
    name: Option<String>,
    text: String,
}

#[derive(Clone, Debug, Serialize)]
struct RemedyEntry {
    action: String,
    place: SpotEntry,
    before: f64,
    after: f64,
    gain: f64,
    error: f64,
    tried: Vec<TrialEntry>,
}

#[derive(Clone, Debug, Serialize)]
struct TrialEntry {
    action: String,
    gain: f64,
}

#[derive(Clone, Debug, Serialize)]
struct WaivedEntry {
    reason: String,
    expires: String,
}

#[derive(Clone, Debug, Serialize)]
struct MeasureEntry {
    name: &'static str,
    unit: &'static str,
    value: f64,
    error: f64,
    limit: Option<f64>,
}

/// A finding.
#[derive(Clone, Debug, Serialize)]
pub(super) struct FindingEntry {
    number: String,
    code: &'static str,
    severity: &'static str,
    path: String,
    plane: Option<PlaneEntry>,
    band: Option<String>,
    frequency_hz: Option<f64>,
    place: SpotEntry,
    figure: MeasureEntry,
    text: String,
    cause: CauseEntry,
    remedy: Option<RemedyEntry>,
    waived: Option<WaivedEntry>,
}

/// A finding as an entry; places count from `origin`.
pub(super) fn finding(finding: &Finding, origin: Point) -> FindingEntry {
    let excess = &finding.excess;
    let measure = MeasureEntry {
        name: excess.what.name(),
        unit: excess.what.unit(),
        value: excess.value,
        error: excess.error,
        limit: excess.limit,
    };
    FindingEntry {
        number: finding.number.to_string(),
        code: finding.code.name,
        severity: finding.grade.name(),
        path: finding.path.clone(),
        plane: finding
            .plane
            .as_ref()
            .map(|plane| PlaneEntry { layer: format!("L{}", plane.layer + 1), net: plane.net.clone() }),
        band: finding.band.clone(),
        frequency_hz: finding.frequency_hz,
        place: spot(finding.place, origin),
        figure: measure,
        text: finding.sentence.clone(),
        cause: CauseEntry {
            kind: finding.cause.kind(),
            name: finding.cause.name().map(str::to_owned),
            text: finding.cause_text.clone(),
        },
        remedy: finding.remedy.as_ref().map(|remedy| RemedyEntry {
            action: remedy.action.clone(),
            place: spot(remedy.place, origin),
            before: remedy.before,
            after: remedy.after,
            gain: remedy.gain(),
            error: remedy.error,
            tried: remedy
                .tried
                .iter()
                .map(|(action, gain)| TrialEntry { action: action.clone(), gain: *gain })
                .collect(),
        }),
        waived: finding
            .waived
            .as_ref()
            .map(|waived| WaivedEntry { reason: waived.reason.clone(), expires: waived.expires.clone() }),
    }
}

#[derive(Clone, Debug, Serialize)]
struct PlacedEntry {
    value: Option<f64>,
    without_voids: Option<f64>,
    error: f64,
    x_mm: f64,
    y_mm: f64,
    distance_m: Option<f64>,
}

#[derive(Clone, Debug, Serialize)]
struct EndEntry {
    x_mm: f64,
    y_mm: f64,
    share: f64,
}

#[derive(Clone, Debug, Serialize)]
struct VoidEntry {
    id: String,
    x_mm: f64,
    y_mm: f64,
    crossed: bool,
    distance_m: f64,
    extra_loop_resistance_ohm: Option<f64>,
    extra_loop_inductance_h: Option<f64>,
    ends: Option<[EndEntry; 2]>,
}

#[derive(Clone, Debug, Serialize)]
struct StrayEntry {
    zone: String,
    own: bool,
    share: FigureEntry,
    profile: Vec<[f64; 3]>,
}

/// What voids, edges and boundaries do on a map.
#[derive(Clone, Debug, Serialize)]
pub(super) struct EffectsEntry {
    share_drop: Option<PlacedEntry>,
    edge_density: Option<PlacedEntry>,
    voids: Vec<VoidEntry>,
    strays: Vec<StrayEntry>,
}

/// Effects as an entry.
pub(super) fn effects(effects: &Effects, origin: Point) -> EffectsEntry {
    let placed = |placed: &Placed| {
        let (x_mm, y_mm) = millimetres(placed.at, origin);
        let Figure { value, without_voids, error } = placed.figure;
        PlacedEntry { value, without_voids, error, x_mm, y_mm, distance_m: placed.distance_m }
    };
    let void = |void: &crate::figure::VoidEffect| {
        let (x_mm, y_mm) = millimetres(void.at, origin);
        VoidEntry {
            id: void.id.clone(),
            x_mm,
            y_mm,
            crossed: void.crossed,
            distance_m: void.distance_m,
            extra_loop_resistance_ohm: void.extra_resistance_ohm,
            extra_loop_inductance_h: void.extra_inductance_h,
            ends: void.ends.map(|ends| {
                ends.map(|end| {
                    let (x_mm, y_mm) = millimetres(end.at, origin);
                    EndEntry { x_mm, y_mm, share: end.share }
                })
            }),
        }
    };
    let stray = |stray: &crate::figure::Stray| StrayEntry {
        zone: stray.zone.clone(),
        own: stray.own,
        share: figure(stray.share),
        profile: stray
            .profile
            .iter()
            .map(|&(at, density)| {
                let (x_mm, y_mm) = millimetres(at, origin);
                [x_mm, y_mm, density]
            })
            .collect(),
    };
    EffectsEntry {
        share_drop: effects.share_drop.as_ref().map(placed),
        edge_density: effects.edge_density.as_ref().map(placed),
        voids: effects.voids.iter().map(void).collect(),
        strays: effects.strays.iter().map(stray).collect(),
    }
}

/// What a joint carries.
#[derive(Clone, Debug, Serialize)]
pub(super) struct JointEntry {
    what: String,
    kind: &'static str,
    x_mm: f64,
    y_mm: f64,
    layers: [Option<String>; 2],
    current: [f64; 2],
}

/// A joint as an entry; its current per ampere of the driver's, real and imaginary part.
pub(super) fn joint(joint: &JointCurrent, origin: Point) -> JointEntry {
    let (x_mm, y_mm) = millimetres(joint.at, origin);
    JointEntry {
        what: joint.what.clone(),
        kind: match joint.kind {
            JointKind::Barrel => "barrel",
            JointKind::Part => "part",
            JointKind::Tie => "tie",
            JointKind::Inside => "inside",
        },
        x_mm,
        y_mm,
        layers: joint.layers.map(|layer| layer.map(|layer| format!("L{}", layer + 1))),
        current: [joint.current.re, joint.current.im],
    }
}

/// A transfer impedance.
#[derive(Clone, Debug, Serialize)]
pub(super) struct TransferEntry {
    from: String,
    to: String,
    frequency_hz: f64,
    ohm: [f64; 2],
    magnitude_ohm: f64,
    phase_deg: f64,
    error_ohm: f64,
}

/// A transfer impedance as an entry.
pub(super) fn transfer(from: &str, to: &str, frequency_hz: f64, z: Complex64) -> TransferEntry {
    TransferEntry {
        from: from.to_owned(),
        to: to.to_owned(),
        frequency_hz,
        ohm: [z.re, z.im],
        magnitude_ohm: z.norm(),
        phase_deg: libm::atan2(z.im, z.re).to_degrees(),
        error_ohm: TRANSFER_ERROR * z.norm(),
    }
}

#[derive(Clone, Debug, Serialize)]
struct PartEntry {
    from: String,
    volts_rms: f64,
}

/// Noise in a path.
#[derive(Clone, Debug, Serialize)]
pub(super) struct NoiseEntry {
    path: String,
    band: Option<String>,
    volts_rms: f64,
    lsb: Option<f64>,
    budget_v: Option<f64>,
    parts: Vec<PartEntry>,
}

/// Noise as an entry.
pub(super) fn noise(noise: &Noise) -> NoiseEntry {
    let part = |part: &NoisePart| PartEntry { from: part.from.clone(), volts_rms: part.volts_rms };
    NoiseEntry {
        path: noise.path.clone(),
        band: noise.band.clone(),
        volts_rms: noise.volts_rms,
        lsb: noise.lsb,
        budget_v: noise.budget_v,
        parts: noise.parts.iter().map(part).collect(),
    }
}
