//! What carries the return, in the account of a plan: sheets by layer and what joins them, as text and for JSON.

use crate::board::Board;
use crate::geom::Point;
use crate::plan::{Conductors, End, Joint, JointKind, PathPlan};
use crate::unit::quantity_text;
use serde::Serialize;
use std::collections::BTreeMap;
use std::fmt::Write as _;

/// Most parts of equal values that a line of the text names.
const NAMED: usize = 10;

/// Sheets and joints common to all paths.
#[derive(Clone, Debug, Serialize)]
pub struct ConductorAccount {
    sheets: Vec<SheetEntry>,
    barrels: usize,
    joints: Vec<JointEntry>,
    nodes: Vec<String>,
}

/// Copper of a net on a layer.
#[derive(Clone, Debug, Serialize)]
struct SheetEntry {
    layer: String,
    net: String,
    areas: usize,
    area_mm2: f64,
}

/// A part, a tie or the inside of a part.
#[derive(Clone, Debug, Serialize)]
struct JointEntry {
    kind: &'static str,
    what: String,
    from: String,
    to: String,
    resistance_ohm: f64,
    inductance_h: f64,
    capacitance_f: Option<f64>,
    x_mm: f64,
    y_mm: f64,
}

/// Where a path's return enters (positive) or leaves the sheets.
#[derive(Clone, Debug, Serialize)]
pub struct EntryEntry {
    what: String,
    on: String,
    current: f64,
    joints: usize,
}

/// Words and places for ends of joints.
struct Names<'b> {
    board: &'b Board,
    nodes: &'b [String],
}

impl Names<'_> {
    fn end(&self, end: &End) -> String {
        match *end {
            End::Copper { layer, area, .. } => format!("L{}-{}", layer + 1, self.net(layer, area)),
            End::Node(node) => self.nodes.get(node).cloned().unwrap_or_default(),
        }
    }

    fn net(&self, layer: usize, area: usize) -> String {
        let net = self.board.layers[layer].areas[area].net;
        net.map_or_else(|| "(no net)".to_owned(), |net| self.board.net_name(net).to_owned())
    }
}

impl ConductorAccount {
    /// The account of the conductors of a plan for `board`; places are from `origin`.
    pub fn new(conductors: &Conductors, board: &Board, origin: Point) -> Self {
        let names = Names { board, nodes: &conductors.nodes };
        let mut sheets = Vec::new();
        for layer in &conductors.layers {
            let mut by_net: BTreeMap<String, (usize, f64)> = BTreeMap::new();
            for &area in &layer.areas {
                let known = by_net.entry(names.net(layer.layer, area)).or_default();
                known.0 += 1;
                known.1 += board.layers[layer.layer].areas[area].shape.area();
            }
            let mut nets: Vec<(String, (usize, f64))> = by_net.into_iter().collect();
            nets.sort_by(|a, b| b.1.1.total_cmp(&a.1.1).then(a.0.cmp(&b.0)));
            sheets.extend(nets.into_iter().map(|(net, (areas, area_m2))| SheetEntry {
                layer: format!("L{}", layer.layer + 1),
                net,
                areas,
                area_mm2: area_m2 * 1e6,
            }));
        }
        let barrel = |joint: &&Joint| joint.kind == JointKind::Barrel;
        let others = conductors.joints.iter().filter(|joint| !barrel(joint));
        Self {
            sheets,
            barrels: conductors.joints.iter().filter(barrel).count(),
            joints: others.map(|joint| joint_entry(&names, joint, origin)).collect(),
            nodes: conductors.nodes.clone(),
        }
    }

    /// The entries of a path.
    pub fn entries(path: &PathPlan, conductors: &Conductors, board: &Board) -> Vec<EntryEntry> {
        let names = Names { board, nodes: &conductors.nodes };
        let entry = |entry: &crate::plan::Entry| EntryEntry {
            what: entry.what.clone(),
            on: names.end(&entry.end),
            current: entry.current,
            joints: match entry.end {
                End::Node(_) => path.joints.iter().filter(|joint| joint.from == entry.end).count(),
                End::Copper { .. } => 0,
            },
        };
        path.entries.iter().map(entry).collect()
    }

    /// Adds the account as text.
    pub fn write(&self, text: &mut String) {
        if self.sheets.is_empty() {
            return;
        }
        // Writing to a string cannot fail, here and below.
        let _ = writeln!(text, "\nsheets    copper that carries return, solved together");
        let mut layer = "";
        for sheet in &self.sheets {
            let first = if sheet.layer == layer { "" } else { sheet.layer.as_str() };
            layer = &sheet.layer;
            let pieces = if sheet.areas == 1 { "1 piece".into() } else { format!("{} pieces", sheet.areas) };
            let _ = writeln!(text, "  {first:<7} {:<28} {:>10.1} mm2  {pieces}", sheet.net, sheet.area_mm2);
        }
        let _ = writeln!(text, "joints    {} barrels between sheets", self.barrels);
        let mut groups: Vec<(String, String, Vec<&str>)> = Vec::new();
        for joint in &self.joints {
            let mut between = [joint.from.as_str(), joint.to.as_str()];
            between.sort_unstable();
            let key = format!("{} - {}", between[0], between[1]);
            let value = joint.value();
            match groups.iter_mut().find(|group| group.0 == key && group.1 == value) {
                Some(group) => group.2.push(&joint.what),
                None => groups.push((key, value, vec![&joint.what])),
            }
        }
        for (between, value, parts) in groups {
            let more = if parts.len() > NAMED {
                format!(" and {} more", parts.len() - NAMED)
            } else {
                String::new()
            };
            let shown = parts[..parts.len().min(NAMED)].join(" ");
            let _ = writeln!(text, "  {between}: {value}  {shown}{more}");
        }
    }
}

impl JointEntry {
    fn value(&self) -> String {
        let mut words: Vec<String> =
            self.capacitance_f.map(|farad| quantity_text(farad, "F")).into_iter().collect();
        words.push(quantity_text(self.resistance_ohm, "ohm"));
        if self.inductance_h > 0.0 {
            words.push(quantity_text(self.inductance_h, "H"));
        }
        words.join(", ")
    }
}

impl EntryEntry {
    /// The entry in words, for example `0.75 into pin J7.2 on L2-GND`.
    pub fn in_words(&self) -> String {
        let through =
            if self.joints > 0 { format!(", {} joints", self.joints) } else { format!(" on {}", self.on) };
        let direction = if self.current > 0.0 { "enters" } else { "leaves" };
        let part = if (self.current.abs() - 1.0).abs() < 1e-9 {
            String::new()
        } else {
            format!(" {:.3} A/A", self.current.abs())
        };
        format!("{direction}{part}: {}{through}", self.what)
    }
}

fn joint_entry(names: &Names<'_>, joint: &Joint, origin: Point) -> JointEntry {
    let at = (joint.at - origin) * 1e3;
    JointEntry {
        kind: match joint.kind {
            JointKind::Barrel => "barrel",
            JointKind::Part => "part",
            JointKind::Tie => "tie",
            JointKind::Inside => "inside",
        },
        what: joint.what.clone(),
        from: names.end(&joint.from),
        to: names.end(&joint.to),
        resistance_ohm: joint.resistance_ohm,
        inductance_h: joint.inductance_h,
        capacitance_f: joint.capacitance_f,
        x_mm: at.x,
        y_mm: at.y,
    }
}
