//! Writes the files of a fabrication set: copper, masks, legend, parts, profile, drill files and the job file.

use super::design::{Design, N_LAYERS, Shape, Style, VIA_DRILL, VIA_PAD, Xy, length};
use super::gerber::Sheet;
use super::pour;
use std::fmt::Write;

/// Copper thickness of every layer in mm.
const FOIL: f64 = 0.035;
/// Thickness in mm, relative permittivity and name of the dielectrics from the top.
const DIELECTRICS: [(f64, f64, &str); 3] = [(0.2, 4.2, "prepreg"), (1.0, 4.4, "core"), (0.2, 4.2, "prepreg")];
/// Distance between the bare hole's edge and copper.
const BARE_GAP: f64 = 0.3;
/// Width of the gap of a thermal relief and of its spokes.
pub const RELIEF_GAP: f64 = 0.25;
/// Width of the spokes.
pub const SPOKE: f64 = 0.4;

/// All files of the set: name and text.
pub fn files(design: &Design) -> Vec<(String, String)> {
    let mut files = Vec::new();
    let mut listed = Vec::new();
    let name = |what: &str| format!("{}-{what}", design.stem);
    for layer in 0..N_LAYERS {
        let function = copper_function(layer);
        let file = name(&format!("copper-{}.gbr", layer + 1));
        files.push((file.clone(), finish(design, copper(design, layer), &function, "Positive")));
        listed.push((file, function, "Positive"));
    }
    for (what, function, sheet, polarity) in [
        ("mask-top.gbr", "Soldermask,Top", mask(design, true), "Negative"),
        ("mask-bottom.gbr", "Soldermask,Bot", mask(design, false), "Negative"),
        ("legend-top.gbr", "Legend,Top", legend(design), "Positive"),
        ("parts-top.gbr", "Component,L1,Top", parts(design), "Positive"),
        ("profile.gbr", "Profile,NP", profile(design), "Positive"),
    ] {
        let file = name(what);
        files.push((file.clone(), finish(design, sheet, function, polarity)));
        listed.push((file, function.to_owned(), polarity));
    }
    files.push((name("plated.drl"), drill(design, true)));
    files.push((name("bare.drl"), drill(design, false)));
    files.push((name("job.gbrjob"), job(design, &listed)));
    files
}

fn copper_function(layer: usize) -> String {
    let side = match layer {
        0 => "Top",
        l if l + 1 == N_LAYERS => "Bot",
        _ => "Inr",
    };
    format!("Copper,L{},{side}", layer + 1)
}

fn finish(design: &Design, sheet: Sheet, function: &str, polarity: &str) -> String {
    let project = design.title.replace(' ', "");
    sheet.finish(&[
        "TF.GenerationSoftware,Saltmarsh Instruments,board generator,1".to_owned(),
        format!("TF.ProjectId,{project},{},{}", design.guid, design.revision),
        "TF.SameCoordinates,Original".to_owned(),
        format!("TF.FileFunction,{function}"),
        format!("TF.FilePolarity,{polarity}"),
    ])
}

/// The corners of the box round an outline.
fn limits(outline: &[Xy]) -> (Xy, Xy) {
    let low = outline.iter().fold((f64::MAX, f64::MAX), |low, p| (low.0.min(p.0), low.1.min(p.1)));
    let high = outline.iter().fold((f64::MIN, f64::MIN), |high, p| (high.0.max(p.0), high.1.max(p.1)));
    (low, high)
}

fn copper(design: &Design, layer: usize) -> Sheet {
    let mut sheet = Sheet::default();
    let outer = layer == 0 || layer + 1 == N_LAYERS;
    for pour in design.pours.iter().filter(|pour| pour.layer == layer) {
        sheet.tag(&pour.net, "", "");
        match pour.style {
            Style::Keyhole => sheet.fill(&pour::contours(design, pour)),
            Style::Clear => {
                let (low, high) = limits(&pour.outline);
                sheet.fill_box(low, high, pour.corner);
                sheet.tag("", "", "");
                sheet.polarity(true);
                clearances(design, layer, &pour.net, pour.clearance, pour.relief, &mut sheet);
                sheet.polarity(false);
            }
        }
    }
    for (net, _, corners) in design.drops.iter().filter(|drop| drop.1 == layer) {
        sheet.tag(net, "", "");
        sheet.fill(std::slice::from_ref(corners));
    }
    for tie in design.ties.iter().filter(|tie| tie.layer == layer) {
        sheet.tag("", "", &tie.reference);
        sheet.fill_as("EtchedComponent", std::slice::from_ref(&tie.corners));
    }
    for track in design.tracks.iter().filter(|track| track.layer == layer) {
        sheet.tag(&track.net, "", "");
        sheet.draw(&track.path, track.width, "Conductor");
    }
    for part in &design.parts {
        for pad in &part.pads {
            if pad.drill.is_none() && layer != 0 {
                continue;
            }
            let net = if pad.net.is_empty() { "N/C" } else { &pad.net };
            let pin = if outer { format!("{},{}", part.reference, pad.number) } else { String::new() };
            sheet.tag(net, &pin, &part.reference);
            let function = if pad.drill.is_some() { "ComponentPad" } else { "SMDPad,CuDef" };
            sheet.flash(pad.shape, 0.0, pad.at, function);
        }
    }
    for via in &design.vias {
        sheet.tag(&via.net, "", "");
        sheet.flash(Shape::Round(VIA_PAD), 0.0, via.at, "ViaPad");
    }
    sheet.tag("", "", "");
    sheet
}

/// Takes away the surroundings of all that does not belong to `net`, and the reliefs of what does.
fn clearances(design: &Design, layer: usize, net: &str, gap: f64, relief: bool, sheet: &mut Sheet) {
    for track in design.tracks.iter().filter(|track| track.layer == layer && track.net != net) {
        sheet.draw(&track.path, track.width + 2.0 * gap, "");
    }
    for pad in design.parts.iter().flat_map(|part| &part.pads) {
        if pad.drill.is_none() && layer != 0 {
            continue;
        }
        if pad.net != net {
            sheet.flash(pad.shape, gap, pad.at, "");
        } else if relief && pad.drill.is_some() {
            // The ring lies outside the pad's corners.
            let (w, h) = pad.shape.size();
            let w = if matches!(pad.shape, Shape::Rect(..)) { pour::tenth(length(w, h)) } else { w };
            sheet.relief(w + 2.0 * RELIEF_GAP, w, SPOKE, pad.at);
        }
    }
    for via in design.vias.iter().filter(|via| via.net != net) {
        sheet.flash(Shape::Round(VIA_PAD), gap, via.at, "");
    }
    for hole in &design.holes {
        sheet.flash(Shape::Round(hole.diameter), BARE_GAP, hole.at, "");
    }
    for cut in design.cuts.iter().filter(|cut| cut.layer == layer) {
        sheet.draw(&cut.path, cut.width, "");
    }
}

fn mask(design: &Design, top: bool) -> Sheet {
    let mut sheet = Sheet::default();
    for pad in design.parts.iter().flat_map(|part| &part.pads) {
        if top || pad.drill.is_some() {
            sheet.flash(pad.shape, 0.05, pad.at, "Material");
        }
    }
    for hole in &design.holes {
        sheet.flash(Shape::Round(hole.diameter), 0.05, hole.at, "Material");
    }
    sheet
}

fn legend(design: &Design) -> Sheet {
    let mut sheet = Sheet::default();
    for part in design.parts.iter().filter(|part| part.package != "TEST") {
        let (x, y) = part.at;
        let (w, h) = (0.5 * part.body.0, 0.5 * part.body.1);
        sheet.tag("", "", &part.reference);
        let low = (x - w, y - h);
        let high = (x + w, y + h);
        sheet.draw(&[low, (high.0, low.1), high, (low.0, high.1), low], 0.12, "Other,Outline");
    }
    sheet.tag("", "", "");
    sheet
}

fn parts(design: &Design) -> Sheet {
    let mut sheet = Sheet::default();
    for part in &design.parts {
        sheet.tag("", "", &part.reference);
        sheet.attribute(&format!("TO.CRot,{}", u32::from(part.quarters) * 90));
        sheet.attribute(&format!("TO.CVal,{}", part.value));
        sheet.attribute(&format!("TO.CPgN,{}", part.package));
        let through = part.pads.iter().all(|pad| pad.drill.is_some());
        sheet.attribute(&format!("TO.CMnt,{}", if through { "TH" } else { "SMD" }));
        sheet.flash(Shape::Round(0.3), 0.0, part.at, "ComponentMain");
        for pad in &part.pads {
            sheet.tag("", &format!("{},{}", part.reference, pad.number), &part.reference);
            sheet.flash(Shape::Round(0.0), 0.0, pad.at, "ComponentPin");
        }
        sheet.tag("", "", "");
        sheet.attribute("TD");
    }
    sheet
}

fn profile(design: &Design) -> Sheet {
    let mut sheet = Sheet::default();
    sheet.profile(design.size, design.corner);
    sheet
}

fn drill(design: &Design, plated: bool) -> String {
    let function =
        if plated { format!("Plated,1,{N_LAYERS},PTH") } else { format!("NonPlated,1,{N_LAYERS},NPTH") };
    // Tools: diameter in micrometres, function, places.
    let mut tools: Vec<(i64, &str, Vec<Xy>)> = Vec::new();
    // Slots: diameter in micrometres, ends of the cutter's way.
    let mut slots: Vec<(i64, Xy, Xy)> = Vec::new();
    let mut add = |diameter: f64, function: &'static str, at: Xy| {
        let micrometres = (diameter * 1e3).round() as i64;
        match tools.iter_mut().find(|tool| (tool.0, tool.1) == (micrometres, function)) {
            Some(tool) => tool.2.push(at),
            None => tools.push((micrometres, function, vec![at])),
        }
    };
    if plated {
        design.vias.iter().for_each(|via| add(VIA_DRILL, "Plated,PTH,ViaDrill", via.at));
        for pad in design.parts.iter().flat_map(|part| &part.pads) {
            let Some(diameter) = pad.drill else { continue };
            if pad.slot != (0.0, 0.0) {
                let end = |side: f64| (pad.at.0 + side * pad.slot.0, pad.at.1 + side * pad.slot.1);
                slots.push(((diameter * 1e3).round() as i64, end(-1.0), end(1.0)));
            } else {
                add(diameter, "Plated,PTH,ComponentDrill", pad.at);
            }
        }
    } else {
        design.holes.iter().for_each(|hole| add(hole.diameter, "NonPlated,NPTH,MechanicalDrill", hole.at));
    }
    // A tool of its own for the slots of a width: a cutter is no drill.
    let mut cutters: Vec<i64> = slots.iter().map(|slot| slot.0).collect();
    cutters.sort_unstable();
    cutters.dedup();
    let n_drills = tools.len();
    tools.extend(cutters.into_iter().map(|width| (width, "Plated,PTH,ComponentDrill", Vec::new())));
    let mut text = format!("M48\n; #@! TF.FileFunction,{function}\nMETRIC\n");
    for (index, (micrometres, function, _)) in tools.iter().enumerate() {
        let diameter = *micrometres as f64 * 1e-3;
        let _ = writeln!(text, "; #@! TA.AperFunction,{function}\nT{:02}C{diameter:.3}\n; #@! TD", index + 1);
    }
    text.push_str("%\nG05\n");
    for (index, (width, _, places)) in tools.iter().enumerate() {
        let _ = writeln!(text, "T{:02}", index + 1);
        for at in places {
            let _ = writeln!(text, "X{:.4}Y{:.4}", at.0, at.1);
        }
        if index >= n_drills {
            for (_, from, to) in slots.iter().filter(|slot| slot.0 == *width) {
                let _ =
                    writeln!(text, "G00X{:.4}Y{:.4}\nM15\nG01X{:.4}Y{:.4}\nM16", from.0, from.1, to.0, to.1);
            }
            text.push_str("G05\n");
        }
    }
    text.push_str("M30\n");
    text
}

fn job(design: &Design, listed: &[(String, String, &str)]) -> String {
    let dielectric: f64 = DIELECTRICS.iter().map(|sheet| sheet.0).sum();
    let thickness = dielectric + FOIL * N_LAYERS as f64 + 0.04;
    let mut text = String::from("{\n  \"Header\": {\n    \"GenerationSoftware\": {\n");
    text.push_str(
        "      \"Vendor\": \"Saltmarsh Instruments\",\n      \"Application\": \"board generator\",\n",
    );
    text.push_str("      \"Version\": \"1\"\n    }\n  },\n  \"GeneralSpecs\": {\n");
    let _ = writeln!(
        text,
        "    \"ProjectId\": {{ \"Name\": \"{}\", \"GUID\": \"{}\", \"Revision\": \"{}\" }},\n    \"Size\": {{ \"X\": \
         {}, \"Y\": {} }},\n    \"LayerNumber\": {N_LAYERS},\n    \"BoardThickness\": {thickness:.3},\n    \"Finish\": \
         \"ENIG\"\n  }},\n  \"FilesAttributes\": [",
        design.title, design.guid, design.revision, design.size.0, design.size.1
    );
    for (index, (path, function, polarity)) in listed.iter().enumerate() {
        let comma = if index + 1 < listed.len() { "," } else { "" };
        let _ = writeln!(
            text,
            "    {{ \"Path\": \"{path}\", \"FileFunction\": \"{function}\", \"FilePolarity\": \"{polarity}\" }}{comma}"
        );
    }
    text.push_str("  ],\n  \"MaterialStackup\": [\n");
    text.push_str("    { \"Type\": \"SolderMask\", \"Thickness\": 0.02, \"Name\": \"top mask\" },\n");
    for layer in 0..N_LAYERS {
        let number = layer + 1;
        let _ =
            writeln!(text, "    {{ \"Type\": \"Copper\", \"Thickness\": {FOIL}, \"Name\": \"L{number}\" }},");
        if let Some((thickness, permittivity, name)) = DIELECTRICS.get(layer) {
            let _ = writeln!(
                text,
                "    {{ \"Type\": \"Dielectric\", \"Thickness\": {thickness:.1}, \"Material\": \"FR4\", \
                 \"DielectricConstant\": {permittivity}, \"LossTangent\": 0.018, \"Name\": \"{name} L{number}-L{}\" }},",
                number + 1
            );
        }
    }
    text.push_str(
        "    { \"Type\": \"SolderMask\", \"Thickness\": 0.02, \"Name\": \"bottom mask\" }\n  ]\n}\n",
    );
    text
}
