//! `findings.json`: the findings, the figures of every map, what was withheld or skipped and why, and all messages.
//!
//! Quantities are in SI units with the unit in the member's name; coordinates are in millimetres from the review's
//! origin. A member that does not apply is `null`.

use super::finding::{
    self, EffectsEntry, FigureEntry, FindingEntry, JointEntry, NoiseEntry, PlaneEntry, TransferEntry, figure,
};
use crate::diag::Diagnostic;
use crate::field::{Couplings, JointCurrent, LoopCurve, PlaneId, ReturnMap};
use crate::figure::{Effects, Figures};
use crate::finding::Finding;
use crate::finding::noise::Noise;
use crate::geom::Point;
use crate::plan::{ChartPlan, PathPlan};
use crate::review::Model;
use serde::Serialize;

/// The JSON Schema (draft 2020-12) of the document.
pub const FINDINGS_SCHEMA: &str = include_str!("findings.schema.json");

/// Version of the document.
const SCHEMA: u32 = 1;

/// The document.
#[derive(Clone, Debug, Serialize)]
pub struct Findings {
    schema: u32,
    board: BoardEntry,
    findings: Vec<FindingEntry>,
    maps: Vec<MapEntry>,
    joints: Vec<JointsEntry>,
    transfer: Vec<TransferEntry>,
    noise: Vec<NoiseEntry>,
    loops: Vec<LoopEntry>,
    overlaps: Vec<OverlapEntry>,
    skipped: Vec<MessageEntry>,
    messages: Vec<MessageEntry>,
    #[serde(skip)]
    origin: Point,
}

/// The loop of a path against frequency.
#[derive(Clone, Debug, Serialize)]
struct LoopEntry {
    net: String,
    frequency_hz: Vec<f64>,
    resistance_ohm: Vec<f64>,
    inductance_h: Vec<f64>,
}

/// Current and lines of a band of a drive.
#[derive(Clone, Debug, Serialize)]
struct DriveEntry {
    drive: String,
    /// Current of the band, rms; null where only the shape of the spectrum is known.
    current_rms_a: Option<f64>,
    lines: u64,
    solved_hz: Vec<f64>,
}

#[derive(Clone, Debug, Serialize)]
struct BoardEntry {
    title: String,
    revision: String,
}

#[derive(Clone, Debug, Serialize)]
struct MapEntry {
    net: String,
    driver: String,
    receiver: String,
    plane: PlaneEntry,
    band: String,
    frequency_hz: f64,
    /// Pictures, relative to the folder; null when withheld.
    svg: Option<String>,
    png: Option<String>,
    withheld: Option<MessageEntry>,
    model: Option<&'static str>,
    height_m: f64,
    track_width_m: f64,
    cell_m: Option<f64>,
    residual: Option<f64>,
    /// Of a band map: what stands behind it; null for a map of 1 A at one frequency.
    band_of_drive: Option<DriveEntry>,
    /// What was assumed of current and return.
    remarks: Vec<String>,
    driver_landing: LandingEntry,
    receiver_landing: LandingEntry,
    figures: Option<FiguresEntry>,
    effects: Option<EffectsEntry>,
}

/// Where two paths use the same copper, at the highest frequency.
#[derive(Clone, Debug, Serialize)]
struct OverlapEntry {
    paths: [String; 2],
    plane: PlaneEntry,
    area_m2: f64,
}

/// What joints carry of a path's return at one frequency.
#[derive(Clone, Debug, Serialize)]
struct JointsEntry {
    path: String,
    band: String,
    frequency_hz: f64,
    joints: Vec<JointEntry>,
}

#[derive(Clone, Debug, Serialize)]
struct LandingEntry {
    what: String,
    x_mm: f64,
    y_mm: f64,
    radius_m: f64,
}

#[derive(Clone, Debug, Serialize)]
struct WorstEntry {
    value: f64,
    x_mm: f64,
    y_mm: f64,
}

#[derive(Clone, Debug, Serialize)]
struct FiguresEntry {
    share_3h: FigureEntry,
    worst_share_3h: Option<WorstEntry>,
    half_width_50_m: FigureEntry,
    half_width_80_m: FigureEntry,
    half_width_95_m: FigureEntry,
    contour_levels_a_per_m: [f64; 3],
    extra_path_m: Option<FigureEntry>,
    loop_resistance_ohm: Option<FigureEntry>,
    loop_inductance_h: Option<FigureEntry>,
    extra_loop_resistance_ohm: Option<FigureEntry>,
    extra_loop_inductance_h: Option<FigureEntry>,
}

#[derive(Clone, Debug, Serialize)]
struct MessageEntry {
    severity: &'static str,
    code: &'static str,
    text: String,
    file: Option<String>,
    line: Option<u32>,
    layer: Option<String>,
    x_mm: Option<f64>,
    y_mm: Option<f64>,
    hints: Vec<String>,
}

/// Which map an entry is about.
#[derive(Clone, Copy, Debug)]
pub struct Subject<'a> {
    /// The net.
    pub net: &'a PathPlan,
    /// The plane's chart.
    pub chart: &'a ChartPlan,
    /// Name of the band.
    pub band: &'a str,
    /// Frequency in Hz.
    pub frequency_hz: f64,
}

impl Findings {
    /// A document without maps; `origin` is the point of the files' coordinates that the review calls (0, 0).
    pub fn new(title: &str, revision: &str, origin: Point) -> Self {
        let board = BoardEntry { title: title.to_owned(), revision: revision.to_owned() };
        Self {
            schema: SCHEMA,
            board,
            findings: Vec::new(),
            maps: Vec::new(),
            joints: Vec::new(),
            transfer: Vec::new(),
            noise: Vec::new(),
            loops: Vec::new(),
            overlaps: Vec::new(),
            skipped: Vec::new(),
            messages: Vec::new(),
            origin,
        }
    }

    /// Adds a map with its figures and effects; `stem` names its pictures, if there are any.
    pub fn add_map(
        &mut self,
        subject: Subject,
        stem: Option<&str>,
        map: &ReturnMap,
        figures: &Figures,
        effects: &Effects,
    ) {
        let mut entry = self.entry(subject);
        entry.svg = stem.map(|stem| format!("maps/{stem}.svg"));
        entry.png = stem.map(|stem| format!("maps/{stem}.png"));
        entry.model = Some(match map.model {
            Model::Sheet => "sheet",
            Model::Spread => "spread",
        });
        entry.cell_m = Some(map.grid.cell_m);
        entry.residual = map.residual;
        entry.band_of_drive = map.band_density.as_ref().map(|band| DriveEntry {
            drive: subject.net.signal.drive.clone(),
            current_rms_a: band.current_rms_a,
            lines: band.line_count,
            solved_hz: band.solved.iter().map(|line| line.0).collect(),
        });
        entry.figures = Some(self.figures(figures));
        entry.effects = Some(finding::effects(effects, self.origin));
        self.maps.push(entry);
    }

    /// Adds a finding.
    pub fn add_finding(&mut self, finding: &Finding) {
        self.findings.push(finding::finding(finding, self.origin));
    }

    /// Adds the transfer impedances between all paths at a frequency; `name` gives the name of a path.
    pub fn add_couplings<'n>(&mut self, couplings: &Couplings, name: impl Fn(usize) -> &'n str) {
        for (from, row) in couplings.paths.iter().zip(&couplings.z_ohm) {
            for (to, z) in couplings.paths.iter().zip(row).filter(|(to, _)| *to != from) {
                let Some(z) = *z else { continue };
                self.transfer.push(finding::transfer(name(*from), name(*to), couplings.frequency_hz, z));
            }
        }
    }

    /// Adds the noise in a path.
    pub fn add_noise(&mut self, noise: &Noise) {
        self.noise.push(finding::noise(noise));
    }

    /// Adds the area of a plane where the densities of two paths both lie inside their 80 % contours.
    pub fn add_overlap(&mut self, paths: [&str; 2], of: &PlaneId, area_m2: f64) {
        let paths = paths.map(str::to_owned);
        self.overlaps.push(OverlapEntry { paths, plane: plane(of), area_m2 });
    }

    /// Adds what joints carry of a path's return at a frequency, if they carry any.
    pub fn add_joints(&mut self, path: &str, band: &str, frequency_hz: f64, joints: &[JointCurrent]) {
        if !joints.is_empty() {
            let joints = joints.iter().map(|joint| finding::joint(joint, self.origin)).collect();
            self.joints.push(JointsEntry {
                path: path.to_owned(),
                band: band.to_owned(),
                frequency_hz,
                joints,
            });
        }
    }

    /// Adds the loop of a path against frequency.
    pub fn add_loop(&mut self, net: &str, curve: &LoopCurve) {
        self.loops.push(LoopEntry {
            net: net.to_owned(),
            frequency_hz: curve.frequency_hz.clone(),
            resistance_ohm: curve.resistance_ohm.clone(),
            inductance_h: curve.inductance_h.clone(),
        });
    }

    /// Adds a map that was withheld, with the reason.
    pub fn add_withheld(&mut self, subject: Subject, reason: &Diagnostic) {
        let mut entry = self.entry(subject);
        entry.withheld = Some(self.message(reason));
        self.maps.push(entry);
    }

    /// Adds the reason why a net of the review has no map at all.
    pub fn add_skipped(&mut self, reason: &Diagnostic) {
        let reason = self.message(reason);
        self.skipped.push(reason);
    }

    /// Adds a message.
    pub fn add_message(&mut self, message: &Diagnostic) {
        let message = self.message(message);
        self.messages.push(message);
    }

    fn entry(&self, subject: Subject) -> MapEntry {
        let Subject { net, chart, band, frequency_hz } = subject;
        let landing = |landing: &crate::plan::Landing| {
            let (x_mm, y_mm) = self.millimetres(landing.at);
            LandingEntry { what: landing.what.clone(), x_mm, y_mm, radius_m: landing.radius_m }
        };
        MapEntry {
            net: net.name.clone(),
            driver: net.driver.clone(),
            receiver: net.receiver.clone(),
            plane: plane(&chart.plane),
            band: band.to_owned(),
            frequency_hz,
            svg: None,
            png: None,
            withheld: None,
            model: None,
            height_m: chart.height_m,
            track_width_m: chart.width_m,
            cell_m: None,
            residual: None,
            band_of_drive: None,
            remarks: net.signal.remarks.clone(),
            driver_landing: landing(&chart.driver_landing),
            receiver_landing: landing(&chart.receiver_landing),
            figures: None,
            effects: None,
        }
    }

    fn figures(&self, figures: &Figures) -> FiguresEntry {
        FiguresEntry {
            share_3h: figure(figures.share_3h),
            worst_share_3h: figures.worst_share_3h.map(|(value, at)| {
                let (x_mm, y_mm) = self.millimetres(at);
                WorstEntry { value, x_mm, y_mm }
            }),
            half_width_50_m: figure(figures.half_width_m[0]),
            half_width_80_m: figure(figures.half_width_m[1]),
            half_width_95_m: figure(figures.half_width_m[2]),
            contour_levels_a_per_m: figures.contour_levels,
            extra_path_m: figures.extra_path_m.map(figure),
            loop_resistance_ohm: figures.loop_resistance_ohm.map(figure),
            loop_inductance_h: figures.loop_inductance_h.map(figure),
            extra_loop_resistance_ohm: figures.extra_loop_resistance_ohm.map(figure),
            extra_loop_inductance_h: figures.extra_loop_inductance_h.map(figure),
        }
    }

    fn message(&self, message: &Diagnostic) -> MessageEntry {
        let at = message.place.at.map(|at| self.millimetres(at));
        MessageEntry {
            severity: message.severity.name(),
            code: message.code.name,
            text: message.text.clone(),
            file: message.place.file.clone(),
            line: message.place.line,
            layer: message.place.layer.map(|layer| format!("L{layer}")),
            x_mm: at.map(|at| at.0),
            y_mm: at.map(|at| at.1),
            hints: message.hints.clone(),
        }
    }

    fn millimetres(&self, at: Point) -> (f64, f64) {
        finding::millimetres(at, self.origin)
    }
}

fn plane(plane: &PlaneId) -> PlaneEntry {
    PlaneEntry { layer: format!("L{}", plane.layer + 1), net: plane.net.clone() }
}
