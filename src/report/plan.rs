//! The plan of a review, as text for people and as JSON for scripts: what will be solved, before any solve.
//!
//! Coordinates are in mm from the review's origin, as in the pictures; thicknesses and cells in metres in the JSON.

use super::conductors::{ConductorAccount, EntryEntry};
use crate::board::Board;
use crate::diag::Diagnostic;
use crate::geom::Point;
use crate::plan::{ChartPlan, Landing, PathPlan, Plan, TrackLeg};
use crate::review::{Model, Review};
use crate::unit::{length_text, quantity_text};
use serde::Serialize;
use std::fmt::Write as _;

/// Version of the document.
const SCHEMA: u32 = 1;

/// What is planned.
#[derive(Clone, Debug, Serialize)]
pub struct PlanAccount {
    schema: u32,
    model: &'static str,
    bands: Vec<BandEntry>,
    conductors: ConductorAccount,
    nets: Vec<NetEntry>,
    charts: usize,
    withheld: usize,
    warnings: Vec<MessageEntry>,
}

#[derive(Clone, Debug, Serialize)]
struct BandEntry {
    name: String,
    from_hz: f64,
    to_hz: f64,
    at_hz: Vec<f64>,
}

#[derive(Clone, Debug, Serialize)]
struct NetEntry {
    name: String,
    driver: String,
    receiver: String,
    length_mm: f64,
    layers: Vec<String>,
    legs: usize,
    width_mm: f64,
    entries: Vec<EntryEntry>,
    valid_to_hz: f64,
    /// The drive in words; null without one, then maps are of 1 A.
    drive: Option<String>,
    /// Current of the drive in each band in amperes, rms, in the order of the bands; empty without an absolute drive.
    band_current_rms_a: Vec<f64>,
    /// What was assumed of current and return.
    remarks: Vec<String>,
    charts: Vec<ChartEntry>,
}

#[derive(Clone, Debug, Serialize)]
struct ChartEntry {
    plane: String,
    length_mm: f64,
    height_m: f64,
    width_m: f64,
    driver_landing: Option<LandingEntry>,
    receiver_landing: Option<LandingEntry>,
    voids: usize,
    cell_m: Option<f64>,
    unknowns: Option<usize>,
    memory_bytes: Option<usize>,
    withheld: Option<MessageEntry>,
}

#[derive(Clone, Debug, Serialize)]
struct LandingEntry {
    at_mm: [f64; 2],
    radius_mm: f64,
    what: String,
}

#[derive(Clone, Debug, Serialize)]
struct MessageEntry {
    severity: &'static str,
    code: &'static str,
    text: String,
    hints: Vec<String>,
    layer: Option<usize>,
    x_mm: Option<f64>,
    y_mm: Option<f64>,
}

impl PlanAccount {
    /// The account of `plan`, which was made for `review` on `board`.
    pub fn new(plan: &Plan, review: &Review, board: &Board) -> Self {
        let origin = review.origin;
        let entries = |net| ConductorAccount::entries(net, &plan.conductors, board);
        let nets: Vec<NetEntry> = plan.paths.iter().map(|net| net_entry(net, entries(net), origin)).collect();
        let charts = nets.iter().map(|net| net.charts.len()).sum();
        let withheld =
            nets.iter().flat_map(|net| &net.charts).filter(|chart| chart.withheld.is_some()).count();
        let band = |band: &crate::review::Band| BandEntry {
            name: band.name.clone(),
            from_hz: band.from_hz,
            to_hz: band.to_hz,
            at_hz: band.at_hz.clone(),
        };
        Self {
            schema: SCHEMA,
            model: match review.solver.model {
                Model::Sheet => "sheet",
                Model::Spread => "spread",
            },
            bands: plan.bands.iter().map(band).collect(),
            conductors: ConductorAccount::new(&plan.conductors, board, origin),
            nets,
            charts,
            withheld,
            warnings: plan.messages.iter().map(|message| message_entry(message, origin)).collect(),
        }
    }

    /// The account as text; messages are left to the writer of messages.
    pub fn text(&self) -> String {
        let mut text = String::new();
        let bands: Vec<String> = self
            .bands
            .iter()
            .map(|band| {
                let at: Vec<String> = band.at_hz.iter().map(|&hertz| quantity_text(hertz, "Hz")).collect();
                format!("{} at {}", band.name, at.join(", "))
            })
            .collect();
        // Writing to a string cannot fail, here and below.
        let _ = writeln!(text, "model {}; bands {}", self.model, bands.join("; "));
        self.conductors.write(&mut text);
        for net in &self.nets {
            net.write(&mut text);
        }
        let maps: usize = self.bands.iter().map(|band| band.at_hz.len()).sum();
        let _ = writeln!(
            text,
            "\n{} of {} to be solved at {}, {} withheld",
            counted(self.charts - self.withheld, "chart"),
            self.charts,
            counted(maps, "frequency"),
            self.withheld
        );
        text
    }
}

fn counted(count: usize, what: &str) -> String {
    match (count, what.strip_suffix('y')) {
        (1, _) => format!("1 {what}"),
        (_, Some(stem)) => format!("{count} {stem}ies"),
        (_, None) => format!("{count} {what}s"),
    }
}

impl NetEntry {
    fn write(&self, text: &mut String) {
        let _ = writeln!(text, "\nnet {}: {} to {}", self.name, self.driver, self.receiver);
        let _ = writeln!(
            text,
            "  track     {} on {}, {}, width {}",
            length_text(self.length_mm * 1e-3),
            self.layers.join(", "),
            counted(self.legs, "leg"),
            length_text(self.width_mm * 1e-3)
        );
        for entry in &self.entries {
            let _ = writeln!(text, "  return    {}", entry.in_words());
        }
        let _ = writeln!(text, "  holds     up to {}", quantity_text(self.valid_to_hz, "Hz"));
        if let Some(drive) = &self.drive {
            let currents: Vec<String> =
                self.band_current_rms_a.iter().map(|&current| quantity_text(current, "A")).collect();
            let in_bands = if currents.is_empty() {
                String::new()
            } else {
                format!("; in the bands {}", currents.join(", "))
            };
            let _ = writeln!(text, "  drive     {drive}{in_bands}");
        }
        for remark in &self.remarks {
            let _ = writeln!(text, "  assumed   {remark}");
        }
        for chart in &self.charts {
            chart.write(text);
        }
    }
}

impl ChartEntry {
    fn write(&self, text: &mut String) {
        let _ = writeln!(
            text,
            "  plane     {}, {} below {} of track",
            self.plane,
            length_text(self.height_m),
            length_text(self.length_mm * 1e-3)
        );
        for (end, landing) in [("driver", &self.driver_landing), ("receiver", &self.receiver_landing)] {
            if let Some(landing) = landing {
                let _ = writeln!(
                    text,
                    "  landing   {end}: {} at {:.2}, {:.2} mm, radius {}",
                    landing.what,
                    landing.at_mm[0],
                    landing.at_mm[1],
                    length_text(landing.radius_mm * 1e-3)
                );
            }
        }
        if let (Some(cell_m), Some(unknowns), Some(bytes)) = (self.cell_m, self.unknowns, self.memory_bytes) {
            let _ = writeln!(
                text,
                "  cells     {}, {} unknowns, about {} MB, {}",
                length_text(cell_m),
                unknowns,
                bytes.div_ceil(1_000_000),
                counted(self.voids, "void")
            );
        }
        if let Some(reason) = &self.withheld {
            let _ = writeln!(text, "  WITHHELD  {} [{}]", reason.text, reason.code);
            for hint in &reason.hints {
                let _ = writeln!(text, "            {hint}");
            }
        }
    }
}

fn net_entry(net: &PathPlan, entries: Vec<EntryEntry>, origin: Point) -> NetEntry {
    let mut layers: Vec<String> = Vec::new();
    for leg in &net.track {
        let name = format!("L{}", leg.layer + 1);
        if layers.last() != Some(&name) {
            layers.push(name);
        }
    }
    let spectra = net.signal.spectra.iter().filter(|_| net.signal.is_absolute);
    // Three digits: the exact value stands with each map.
    let rounded = |current: f64| format!("{current:.2e}").parse().unwrap_or(current);
    let currents = spectra.map(|band| rounded(band.current_rms_a)).collect();
    NetEntry {
        name: net.name.clone(),
        driver: net.driver.clone(),
        receiver: net.receiver.clone(),
        length_mm: length_m(&net.track) * 1e3,
        drive: (!net.signal.drive.is_empty()).then(|| net.signal.drive.clone()),
        band_current_rms_a: currents,
        remarks: net.signal.remarks.clone(),
        layers,
        legs: net.track.len(),
        width_mm: width_m(&net.track) * 1e3,
        entries,
        valid_to_hz: net.valid_to_hz,
        charts: net.charts.iter().map(|chart| chart_entry(net, chart, origin)).collect(),
    }
}

fn chart_entry(net: &PathPlan, chart: &ChartPlan, origin: Point) -> ChartEntry {
    let landing = |landing: &Landing| {
        let at = (landing.at - origin) * 1e3;
        (landing.radius_m > 0.0).then(|| LandingEntry {
            at_mm: [at.x, at.y],
            radius_mm: landing.radius_m * 1e3,
            what: landing.what.clone(),
        })
    };
    let planned = chart.cell_m > 0.0;
    ChartEntry {
        plane: chart.plane.to_string(),
        length_mm: length_m(&net.track[chart.legs.clone()]) * 1e3,
        height_m: chart.height_m,
        width_m: chart.width_m,
        driver_landing: landing(&chart.driver_landing),
        receiver_landing: landing(&chart.receiver_landing),
        voids: chart.voids.len(),
        cell_m: planned.then_some(chart.cell_m),
        unknowns: planned.then_some(chart.unknowns),
        memory_bytes: planned.then_some(chart.memory_bytes),
        withheld: chart.withheld.as_ref().map(|message| message_entry(message, origin)),
    }
}

fn message_entry(message: &Diagnostic, origin: Point) -> MessageEntry {
    let at = message.place.at.map(|at| (at - origin) * 1e3);
    MessageEntry {
        severity: message.severity.name(),
        code: message.code.name,
        text: message.text.clone(),
        hints: message.hints.clone(),
        layer: message.place.layer,
        x_mm: at.map(|at| at.x),
        y_mm: at.map(|at| at.y),
    }
}

fn length_m(legs: &[TrackLeg]) -> f64 {
    legs.iter().map(|leg| leg.from.distance(leg.to)).sum()
}

fn width_m(legs: &[TrackLeg]) -> f64 {
    let weighted: f64 = legs.iter().map(|leg| leg.from.distance(leg.to) * leg.width_m).sum();
    weighted / length_m(legs).max(1e-12)
}
