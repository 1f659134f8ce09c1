//! One picture for each copper layer as understood: from board and, where there is one, review and plan.

use super::Picture;
use super::ticket::picture_number;
use super::words::{given_millimeters, hints_at_hazard};
use crate::board::{Board, CopperLayer, CopperObject, LayerRole, NetId, ObjectFunction, Origin, Plating};
use crate::draw::copper::{CopperData, CopperHole, CopperName, CopperUse};
use crate::draw::layer::{LayerSheet, scene};
use crate::draw::map::MapPin;
use crate::draw::panel::{KeyFigure, KeyRow, Panel};
use crate::draw::png::RenderFault;
use crate::draw::{Scene, grouped, plain, shortened};
use crate::geom::{Point, Polygon};
use crate::plan::Plan;
use crate::review::Review;
use crate::style::{Face, Style};
use std::collections::{BTreeMap, BTreeSet};

/// A connected piece of copper of this size is a plane, in square metres ...
pub(super) const PLANE_M2: f64 = 25e-6;
/// ... or of this part of the board.
pub(super) const PLANE_PART: f64 = 0.01;
/// Areas listed beside the picture.
const AREAS_SHOWN: usize = 6;

/// What the pictures of the layers are made from.
#[derive(Clone, Copy, Debug)]
pub struct LayerInput<'a> {
    /// Board.
    pub board: &'a Board,
    /// Review and plan, where there is a review.
    pub plan: Option<(&'a Review, &'a Plan)>,
    /// Style.
    pub style: &'a Style,
    /// Hash of inputs and settings, hexadecimal.
    pub input_hash: &'a str,
}

/// The pictures of all copper layers from the top.
pub fn layers(input: &LayerInput) -> Result<Vec<Picture>, RenderFault> {
    layer_scenes(input).iter().map(Picture::of).collect()
}

/// The scenes of all copper layers, before they are written.
pub fn layer_scenes(input: &LayerInput) -> Vec<Scene> {
    let uses = uses(input);
    (0..input.board.layers.len()).map(|layer| scene(&sheet(input, layer, &uses), input.style)).collect()
}

/// What each net is for.
fn uses(input: &LayerInput) -> Vec<CopperUse> {
    let board = input.board;
    let mut uses = vec![CopperUse::Other; board.nets.len()];
    for layer in &board.layers {
        // A long track is as large as a small area: only nets whose copper is drawn as areas count.
        let filled: BTreeSet<NetId> =
            layer.objects.iter().filter(|o| is_area(o)).filter_map(|o| o.net).collect();
        for (area, net) in layer.areas.iter().filter_map(|area| Some((area, area.net?))) {
            if filled.contains(&net) && area.shape.area() >= least_m2(board) {
                uses[net.0 as usize] = CopperUse::Supply;
            }
        }
    }
    let Some((review, plan)) = input.plan else { return uses };
    let mut set = |name: &str, what: CopperUse| {
        if let Some(net) = board.net(name) {
            uses[net.0 as usize] = what;
        }
    };
    plan.paths.iter().for_each(|path| set(&path.name, CopperUse::Charted));
    review.reference_nets.iter().for_each(|name| set(name, CopperUse::Reference));
    uses
}

/// Size from which a connected piece of copper is a plane, in square metres.
fn least_m2(board: &Board) -> f64 {
    PLANE_M2.min(PLANE_PART * board.outline.area())
}

fn is_area(object: &CopperObject) -> bool {
    object.dark && matches!(object.function, ObjectFunction::Area | ObjectFunction::AreaStroke)
}

/// Whether areas of this use are planes: those of charted nets and the like are wide tracks.
fn is_plane(what: CopperUse) -> bool {
    matches!(what, CopperUse::Reference | CopperUse::Supply | CopperUse::NoNet)
}

fn of_net(net: Option<NetId>, uses: &[CopperUse]) -> CopperUse {
    net.map_or(CopperUse::NoNet, |net| uses[net.0 as usize])
}

fn role(layer: &CopperLayer) -> &'static str {
    match layer.role {
        LayerRole::Top => "top layer",
        LayerRole::Inner => "inner layer",
        LayerRole::Bottom => "bottom layer",
    }
}

/// An area in square millimeters.
fn square_millimeters(square_metres: f64) -> String {
    format!("{}\u{a0}mm\u{b2}", grouped(&format!("{:.0}", square_metres * 1e6)))
}

/// The areas of a layer that are planes, by net: net, area, pieces; largest first.
fn planes(board: &Board, layer: &CopperLayer, uses: &[CopperUse]) -> Vec<(String, f64, usize)> {
    let least_m2 = least_m2(board);
    let mut by_net: BTreeMap<Option<NetId>, (f64, usize)> = BTreeMap::new();
    for area in
        layer.areas.iter().filter(|area| area.shape.area() >= least_m2 && is_plane(of_net(area.net, uses)))
    {
        let entry = by_net.entry(area.net).or_default();
        entry.0 += area.shape.area();
        entry.1 += 1;
    }
    let name = |net: Option<NetId>| net.map_or("(no net)".to_owned(), |net| plain(board.net_name(net)));
    let mut all: Vec<(String, f64, usize)> =
        by_net.into_iter().map(|(net, (area, pieces))| (name(net), area, pieces)).collect();
    all.sort_by(|a, b| b.1.total_cmp(&a.1).then_with(|| a.0.cmp(&b.0)));
    all
}

fn copper_data(input: &LayerInput, index: usize, uses: &[CopperUse]) -> CopperData {
    let board = input.board;
    let layer = &board.layers[index];
    let copper: Vec<(CopperUse, Polygon)> =
        layer.areas.iter().map(|area| (of_net(area.net, uses), area.shape.clone())).collect();
    let holes = board.holes.iter().filter(|hole| (hole.layers.0..=hole.layers.1).contains(&index));
    let holes = holes.map(|hole| CopperHole {
        path: hole.path.clone(),
        diameter_m: hole.diameter_m,
        plated: hole.plating == Plating::Plated,
    });
    let mut data = CopperData {
        outline: board.outline.clone(),
        copper,
        holes: holes.collect(),
        ties: board.ties.iter().filter(|tie| tie.layer == index).map(|tie| tie.at).collect(),
        ..CopperData::default()
    };
    if let Some((review, plan)) = input.plan {
        add_plan(&mut data, board, review, plan, index);
    }
    data.names = names(input, index, uses);
    data
}

/// Adds what the review and its plan know of a layer.
fn add_plan(data: &mut CopperData, board: &Board, review: &Review, plan: &Plan, index: usize) {
    data.zones = review.zones.iter().map(|zone| (zone.name.clone(), zone.outline.clone())).collect();
    let charts = plan.paths.iter().flat_map(|path| &path.charts).filter(|chart| chart.plane.layer == index);
    let (mut voids, mut places) = (BTreeSet::new(), BTreeSet::new());
    for chart in charts {
        for void in chart.voids.iter().filter(|void| voids.insert(void.id.clone())) {
            data.voids.push(void.shape.clone());
        }
        for landing in [&chart.driver_landing, &chart.receiver_landing] {
            // Landings of several nets at one via are one sign.
            if places.insert(((landing.at.x * 1e6).round() as i64, (landing.at.y * 1e6).round() as i64)) {
                data.landings.push(landing.at);
            }
        }
    }
    let mut shown = BTreeSet::new();
    for path in &plan.paths {
        for (name, driver) in [(&path.driver, true), (&path.receiver, false)] {
            let pin = board.pins.iter().find(|pin| pin.layer == index && pin.label() == *name);
            if let Some(pin) = pin
                && shown.insert(name.clone())
            {
                data.pins.push((MapPin { name: name.clone(), at: pin.at }, driver));
            }
        }
    }
}

/// Names of planes, ties and charted tracks.
fn names(input: &LayerInput, index: usize, uses: &[CopperUse]) -> Vec<CopperName> {
    let board = input.board;
    let layer = &board.layers[index];
    let least_m2 = least_m2(board);
    let mut areas: Vec<(usize, f64)> = layer.areas.iter().map(|area| area.shape.area()).enumerate().collect();
    areas.retain(|&(area, m2)| m2 >= least_m2 && is_plane(of_net(layer.areas[area].net, uses)));
    areas.sort_by(|a, b| b.1.total_cmp(&a.1).then(a.0.cmp(&b.0)));
    let mut all: Vec<CopperName> = Vec::new();
    for (area, _) in areas {
        let text = layer.areas[area].net.map_or("no net", |net| board.net_name(net)).to_owned();
        let spot = layer.areas[area].shape.outer.first().copied().unwrap_or_default();
        all.push(CopperName { text, area: Some(area), spot });
    }
    for tie in board.ties.iter().filter(|tie| tie.layer == index && !tie.part.is_empty()) {
        all.push(CopperName { text: tie.part.clone(), area: None, spot: tie.at });
    }
    let paths = input.plan.iter().flat_map(|(_, plan)| &plan.paths);
    for path in paths {
        let legs = path.track.iter().filter(|leg| leg.layer == index);
        let longest = legs.max_by(|a, b| a.from.distance(a.to).total_cmp(&b.from.distance(b.to)));
        if let Some(leg) = longest.filter(|leg| leg.from.distance(leg.to) > 0.5e-3) {
            let spot = Point::new(0.5 * (leg.from.x + leg.to.x), 0.5 * (leg.from.y + leg.to.y));
            all.push(CopperName { text: path.name.clone(), area: None, spot });
        }
    }
    all
}

fn sheet(input: &LayerInput, index: usize, uses: &[CopperUse]) -> LayerSheet {
    let LayerInput { board, style, .. } = *input;
    let layer = &board.layers[index];
    let name = format!("L{}", index + 1);
    let copper = copper_data(input, index, uses);
    let planes = planes(board, layer, uses);
    let area_m2: f64 = layer.copper.area();
    let part = area_m2 / board.outline.area();
    let number = picture_number(input.input_hash, &[&name, &style.name]);
    let (title, revision) = titles(input);
    let headline = headline(&name, layer, &planes, part);
    let charted = charted(input, index);
    let mut lead =
        format!("Copper of the {} as the fabrication data draw it, seen from the top.", role(layer));
    if input.plan.is_none() {
        lead.push_str(" Without a review no net is known as reference.");
    }
    let mut caution =
        "What was understood, before any solve: compare it with your layout before you trust a map."
            .to_owned();
    if board.nets.iter().any(|net| hints_at_hazard(&net.name)) {
        caution.push_str(
            " It says nothing about insulation or safety: for mains, medical and safety circuits follow local codes \
             and licensed practice.",
        );
    }
    let description = description(board, &headline, &planes, &copper, &charted, index);
    LayerSheet {
        headline,
        lead,
        window: board.outline.bounds(),
        origin: input.plan.map_or(Point::default(), |(review, _)| review.origin),
        panels: vec![Panel::figures(figures(&planes, &copper, area_m2, part, &charted), style)],
        copper,
        fields: fields(input, index, &number),
        caution,
        title: format!("{}, {name}", if title.is_empty() { "board" } else { &title }),
        description,
        facts: vec![
            ("board".into(), title),
            ("copper_area_mm2".into(), format!("{:.3}", area_m2 * 1e6)),
            ("layer".into(), name),
            ("revision".into(), revision),
            ("style".into(), plain(&style.name)),
        ],
        number,
    }
}

/// Title and revision: the review's, else those of the files.
fn titles(input: &LayerInput) -> (String, String) {
    let or = |first: &str, second: &str| plain(if first.is_empty() { second } else { first });
    match input.plan {
        Some((review, _)) => {
            (or(&review.title, &input.board.title), or(&review.revision, &input.board.revision))
        }
        None => (plain(&input.board.title), plain(&input.board.revision)),
    }
}

/// Names of the charted nets that have a track on the layer.
fn charted(input: &LayerInput, index: usize) -> Vec<String> {
    let paths = input.plan.iter().flat_map(|(_, plan)| &plan.paths);
    let here = paths.filter(|path| path.track.iter().any(|leg| leg.layer == index));
    here.map(|path| plain(&path.name)).collect()
}

fn headline(name: &str, layer: &CopperLayer, planes: &[(String, f64, usize)], part: f64) -> String {
    let percent = format!("{:.0}\u{a0}%", 100.0 * part);
    match planes.first() {
        Some((net, area, pieces)) => {
            let net = shortened(Face::Bold, 5.3, net, 70.0);
            let pieces = if *pieces == 1 { "in one piece".to_owned() } else { format!("in {pieces} pieces") };
            format!(
                "{name}, {}: {percent} copper; the largest area is {net}, {} {pieces}",
                role(layer),
                square_millimeters(*area)
            )
        }
        None => format!("{name}, {}: {percent} copper, no area of the size of a plane", role(layer)),
    }
}

fn figures(
    planes: &[(String, f64, usize)],
    copper: &CopperData,
    area_m2: f64,
    part: f64,
    charted: &[String],
) -> Vec<KeyFigure> {
    let mut all = vec![KeyFigure {
        name: "Copper before drilling".to_owned(),
        value: square_millimeters(area_m2),
        bar: Some(part),
        notes: vec![format!("{:.1}\u{a0}% of the board; full bar: all of it", 100.0 * part)],
        ..KeyFigure::default()
    }];
    if !planes.is_empty() {
        let row = |(net, area, pieces): &(String, f64, usize)| KeyRow {
            name: shortened(Face::Narrow, 3.4, net, 24.0),
            value: square_millimeters(*area),
            reference: if *pieces == 1 { "1 piece".to_owned() } else { format!("{pieces} pieces") },
            ..KeyRow::default()
        };
        let mut notes = Vec::new();
        if planes.len() > AREAS_SHOWN {
            notes.push(format!("the largest {AREAS_SHOWN} of {}", planes.len()));
        }
        all.push(KeyFigure {
            name: "Areas of the size of a plane".to_owned(),
            value: planes.iter().map(|plane| plane.2).sum::<usize>().to_string(),
            rows: planes.iter().take(AREAS_SHOWN).map(row).collect(),
            notes,
            ..KeyFigure::default()
        });
    }
    let plated = copper.holes.iter().filter(|hole| hole.plated).count();
    let slots = copper.holes.iter().filter(|hole| hole.path.len() > 1).count();
    all.push(KeyFigure {
        name: "Plated holes through it".to_owned(),
        value: plated.to_string(),
        notes: vec![format!("{} without barrel; {slots} slots", copper.holes.len() - plated)],
        ..KeyFigure::default()
    });
    if !copper.landings.is_empty() {
        all.push(KeyFigure {
            name: "Landings of returns".to_owned(),
            value: copper.landings.len().to_string(),
            notes: vec![format!("voids of charted planes: {}", copper.voids.len())],
            ..KeyFigure::default()
        });
    }
    if !charted.is_empty() {
        let names = shortened(Face::Narrow, 3.3, &charted.join(", "), 62.0);
        all.push(KeyFigure {
            name: "Charted nets with a track here".to_owned(),
            value: charted.len().to_string(),
            notes: vec![names],
            ..KeyFigure::default()
        });
    }
    all
}

/// Everything on the page in sentences.
fn description(
    board: &Board,
    headline: &str,
    planes: &[(String, f64, usize)],
    copper: &CopperData,
    charted: &[String],
    index: usize,
) -> String {
    let mut text = format!("{headline}. Seen from the top. ");
    for (net, area, pieces) in planes {
        text.push_str(&format!("Area of {net}: {} in {pieces}. ", square_millimeters(*area)));
    }
    text.push_str(&format!("Holes: {}. ", copper.holes.len()));
    if !charted.is_empty() {
        text.push_str(&format!("Charted nets with a track here: {}. ", charted.join(", ")));
    }
    if !copper.landings.is_empty() {
        let (landings, voids) = (copper.landings.len(), copper.voids.len());
        text.push_str(&format!("Landings of returns: {landings}; voids of charted planes: {voids}. "));
    }
    for tie in board.ties.iter().filter(|tie| tie.layer == index) {
        let nets: Vec<String> = tie.nets.iter().map(|&net| plain(board.net_name(net))).collect();
        let part = if tie.part.is_empty() { "Copper" } else { &tie.part };
        text.push_str(&format!("{} ties {}. ", plain(part), nets.join(" and ")));
    }
    text.trim_end().to_owned()
}

fn fields(input: &LayerInput, index: usize, number: &str) -> Vec<(&'static str, String)> {
    let stackup = &input.board.stackup;
    let source = |origin: Origin| match origin {
        Origin::File => "file",
        Origin::Review => "review",
        Origin::Assumed => "assumed",
    };
    let micrometers = |metres: f64| format!("{}\u{a0}\u{b5}m", (metres * 1e7).round() / 10.0);
    let sheet = |at: Option<usize>| match at.and_then(|at| stackup.dielectrics.get(at)) {
        Some(sheet) => format!("{} ({})", given_millimeters(sheet.thickness_m), source(sheet.origin)),
        None => "none".to_owned(),
    };
    let foil = stackup.foils.get(index);
    let (title, revision) = titles(input);
    vec![
        ("Board", title),
        ("Revision", revision),
        ("Layer", format!("L{} of {}", index + 1, input.board.layers.len())),
        (
            "Copper",
            foil.map_or("unknown".to_owned(), |foil| {
                format!("{} ({})", micrometers(foil.thickness_m), source(foil.origin))
            }),
        ),
        ("Dielectric above", sheet(index.checked_sub(1))),
        ("Dielectric below", sheet(Some(index))),
        ("Picture no.", number.to_owned()),
        ("Sheet", format!("{} of {}", index + 1, input.board.layers.len())),
    ]
}
