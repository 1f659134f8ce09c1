//! Turns the images of the copper layers into the board's layers, nets, pins and parts.

use super::compose::{Group, compose, object_bounds, object_shape};
use super::gerber::{Image, NetTag, Object};
use crate::board::{
    CopperKind, CopperLayer, CopperObject, LayerRole, Net, NetId, ObjectFunction, Part, Pin, PinId,
};
use crate::diag::code::read as code;
use crate::diag::{Diagnostic, Place};
use crate::geom::boolean::union;
use crate::geom::locate::Locator;
use crate::geom::{Point, Polygon, Region};
use rayon::prelude::*;
use std::collections::{BTreeMap, BTreeSet};

/// A copper file as read.
pub struct CopperFile {
    /// Its name in the set.
    pub file: String,
    /// Its image.
    pub image: Image,
}

/// What the copper files give together.
pub struct CopperSet {
    /// Layers from the top.
    pub layers: Vec<CopperLayer>,
    /// Nets by name.
    pub nets: Vec<Net>,
    /// Pins by part and number.
    pub pins: Vec<Pin>,
    /// Parts by reference.
    pub parts: Vec<Part>,
}

/// Builds layers, nets, pins and parts. `values` are part values from other files.
pub fn build(
    files: Vec<CopperFile>,
    values: &BTreeMap<String, String>,
    messages: &mut Vec<Diagnostic>,
) -> CopperSet {
    let nets = collect_nets(&files);
    let parts = collect_parts(&files, values);
    let (pins, pin_ids) = collect_pins(&files, &nets, messages);
    let n_layers = files.len();
    let layers: Vec<CopperLayer> = files
        .into_par_iter()
        .enumerate()
        .map(|(index, file)| {
            let role = match index {
                0 => LayerRole::Top,
                _ if index + 1 == n_layers => LayerRole::Bottom,
                _ => LayerRole::Inner,
            };
            let (objects, groups) = objects(file.image.objects, &nets, &pin_ids);
            let (areas, copper) = compose(&objects, &groups);
            CopperLayer { role, objects, copper, areas }
        })
        .collect();
    CopperSet { layers, nets, pins, parts }
}

fn collect_nets(files: &[CopperFile]) -> Vec<Net> {
    let mut names: BTreeSet<&str> = BTreeSet::new();
    for object in files.iter().flat_map(|file| &file.image.objects) {
        if let NetTag::Named(name) = &object.tags.net {
            names.insert(name);
        }
    }
    names.into_iter().map(|name| Net { name: name.to_owned() }).collect()
}

fn collect_parts(files: &[CopperFile], values: &BTreeMap<String, String>) -> Vec<Part> {
    let mut found: BTreeMap<&str, Option<&str>> = BTreeMap::new();
    for object in files.iter().flat_map(|file| &file.image.objects) {
        let pin = object.tags.pin.as_ref().map(|pin| pin.0.as_str());
        for reference in object.tags.part.as_deref().into_iter().chain(pin) {
            let value = found.entry(reference).or_default();
            *value = value.or(object.tags.value.as_deref());
        }
    }
    let part = |(reference, value): (&str, Option<&str>)| Part {
        reference: reference.to_owned(),
        value: value.map(str::to_owned).or_else(|| values.get(reference).cloned()),
    };
    found.into_iter().map(part).collect()
}

fn net_id(tag: &NetTag, nets: &[Net]) -> Option<NetId> {
    let NetTag::Named(name) = tag else { return None };
    let found = nets.binary_search_by(|net| net.name.as_str().cmp(name));
    found.ok().map(|index| NetId(index as u32))
}

/// What an image object covers.
fn image_shape(object: &Object) -> Region {
    match &object.kind {
        CopperKind::Draw { path, width_m } => crate::geom::stroke::stroke(path, *width_m),
        CopperKind::Flash { shape, .. } | CopperKind::Fill { shape } => shape.clone(),
    }
}

type PinIds = BTreeMap<(String, String), PinId>;

fn collect_pins(files: &[CopperFile], nets: &[Net], messages: &mut Vec<Diagnostic>) -> (Vec<Pin>, PinIds) {
    let mut found: BTreeMap<(&str, &str), Vec<(usize, &Object)>> = BTreeMap::new();
    for (layer, file) in files.iter().enumerate() {
        for object in file.image.objects.iter().filter(|object| object.dark) {
            if let Some((part, number, _)) = &object.tags.pin {
                found.entry((part, number)).or_default().push((layer, object));
            }
        }
    }
    let (mut pins, mut ids) = (Vec::new(), PinIds::new());
    for ((part, number), pads) in found {
        let (layer, first) = pads[0];
        let net = pads.iter().find_map(|(_, object)| net_id(&object.tags.net, nets));
        for (other_layer, other) in &pads {
            let other_net = net_id(&other.tags.net, nets);
            if other_net != net && other_net.is_some() {
                let name = |id: Option<NetId>| id.map_or("none", |id| nets[id.0 as usize].name.as_str());
                let text = format!(
                    "pin `{part}.{number}` must have one net; got `{}` and `{}`; the first is used",
                    name(net),
                    name(other_net)
                );
                let place = Place {
                    file: Some(files[*other_layer].file.clone()),
                    line: Some(other.line),
                    layer: Some(other_layer + 1),
                    ..Place::default()
                };
                messages.push(Diagnostic { place, ..Diagnostic::warning(code::PIN_NETS, text) });
                break;
            }
        }
        let here: Vec<(&Object, Region)> = pads
            .iter()
            .filter(|(on, _)| *on == layer)
            .map(|(_, object)| (*object, image_shape(object)))
            .collect();
        let largest = here.iter().fold((first, f64::NEG_INFINITY), |best, (object, shape)| {
            let area = shape.area();
            if area > best.1 { (*object, area) } else { best }
        });
        let at = match &largest.0.kind {
            CopperKind::Flash { at, .. } => *at,
            _ => image_shape(largest.0).bounds().centre(),
        };
        let pad = match &here[..] {
            [(_, shape)] => shape.clone(),
            _ => union(here.iter().map(|(_, shape)| shape)),
        };
        let function = pads.iter().find_map(|(_, object)| object.tags.pin.as_ref()?.2.clone());
        ids.insert((part.to_owned(), number.to_owned()), PinId(pins.len() as u32));
        let (part, number) = (part.to_owned(), number.to_owned());
        pins.push(Pin { part, number, function, net, layer, at, pad, hole: None });
    }
    (pins, ids)
}

fn objects(drawn: Vec<Object>, nets: &[Net], pin_ids: &PinIds) -> (Vec<CopperObject>, Vec<Group>) {
    let mut groups = Vec::with_capacity(drawn.len());
    let mut objects = Vec::with_capacity(drawn.len());
    for object in drawn {
        let net = net_id(&object.tags.net, nets).filter(|_| object.dark);
        let function = function_of(&object);
        groups.push(match (net, &object.tags.net) {
            (Some(net), _) => Group::Net(net),
            (None, NetTag::Single) => Group::Single,
            _ if function == ObjectFunction::EtchedPart => Group::Etched,
            _ => Group::Loose,
        });
        let pin = object.tags.pin.as_ref().filter(|_| object.dark);
        let pin = pin.and_then(|(part, number, _)| pin_ids.get(&(part.clone(), number.clone())).copied());
        let named = object.tags.part.clone();
        let part = named.or_else(|| object.tags.pin.as_ref().map(|pin| pin.0.clone())).unwrap_or_default();
        objects.push(CopperObject {
            kind: object.kind,
            dark: object.dark,
            net,
            pin,
            part,
            function,
            line: object.line,
        });
    }
    mark_outline_strokes(&mut objects);
    mark_hatch(&mut objects);
    (objects, groups)
}

/// What an object is for, by its aperture function, else by its kind.
fn function_of(object: &Object) -> ObjectFunction {
    let by_kind = match &object.kind {
        CopperKind::Fill { .. } => ObjectFunction::Area,
        CopperKind::Draw { .. } => ObjectFunction::Track,
        CopperKind::Flash { .. } if object.tags.pin.is_some() => ObjectFunction::Pad,
        CopperKind::Flash { .. }
            if matches!(object.tags.net, NetTag::Named(_)) && object.tags.part.is_none() =>
        {
            ObjectFunction::ViaPad
        }
        CopperKind::Flash { .. } => ObjectFunction::Pad,
    };
    let Some(name) = object.function.as_deref().and_then(|function| function.split(',').next()) else {
        return by_kind;
    };
    match name {
        "EtchedComponent" => ObjectFunction::EtchedPart,
        "ViaPad" => ObjectFunction::ViaPad,
        "NonConductor" | "CopperBalancing" | "Border" | "OtherCopper" | "AntiPad" | "FiducialPad"
        | "Other" | "OtherDrill" | "Material" | "NotC" => ObjectFunction::Other,
        _ if name.ends_with("Pad") => ObjectFunction::Pad,
        _ => by_kind,
    }
}

/// Draws that run along the rim of a filled area of the same net outline that area: older exporters draw each edge of
/// a fill once more with a pen.
fn mark_outline_strokes(objects: &mut [CopperObject]) {
    /// A stroke's points lie this close to the rim that it follows, in metres.
    const ON_RIM_M: f64 = 1e-6;
    let mut fills: BTreeMap<Option<NetId>, Vec<&Polygon>> = BTreeMap::new();
    for object in objects.iter().filter(|object| object.dark && object.function == ObjectFunction::Area) {
        if let CopperKind::Fill { shape } = &object.kind {
            fills.entry(object.net).or_default().extend(&shape.0);
        }
    }
    let locators: BTreeMap<Option<NetId>, Locator> =
        fills.into_iter().map(|(net, polygons)| (net, Locator::new(polygons))).collect();
    let marked: Vec<usize> = objects
        .iter()
        .enumerate()
        .filter(|(_, object)| {
            let CopperKind::Draw { path, .. } = &object.kind else { return false };
            let Some(locator) = locators.get(&object.net) else { return false };
            let mut rims = locator.rims_near(&path[..1], ON_RIM_M);
            let middles = path.windows(2).map(|ends| (ends[0] + ends[1]) * 0.5);
            for point in path[1..].iter().copied().chain(middles) {
                if rims.is_empty() {
                    return false;
                }
                let near = locator.rims_near(&[point], ON_RIM_M);
                rims.retain(|rim| near.contains(rim));
            }
            object.dark && object.function == ObjectFunction::Track && path.len() > 1 && !rims.is_empty()
        })
        .map(|(index, _)| index)
        .collect();
    for index in marked {
        objects[index].function = ObjectFunction::AreaStroke;
    }
}

/// Many parallel draws of one net that overlap side by side fill an area: some exporters draw planes so.
fn mark_hatch(objects: &mut [CopperObject]) {
    /// Fewer strokes side by side than this are tracks.
    const LEAST_STROKES: usize = 8;
    /// Directions are compared in steps of this many radians.
    const TURN: f64 = 1e-3;
    struct Stroke {
        object: usize,
        offset_m: f64,
        from_m: f64,
        to_m: f64,
    }
    let mut groups: BTreeMap<(NetId, i64, i64), Vec<Stroke>> = BTreeMap::new();
    for (index, object) in objects.iter().enumerate() {
        let (CopperKind::Draw { path, width_m }, Some(net)) = (&object.kind, object.net) else { continue };
        if object.function != ObjectFunction::Track || path.len() != 2 || !object.dark {
            continue;
        }
        let along = path[1] - path[0];
        let turn = libm::atan2(along.y, along.x).rem_euclid(std::f64::consts::PI);
        let step = (turn / TURN).round() as i64 % (std::f64::consts::PI / TURN).round() as i64;
        let (sin, cos) = (libm::sin(step as f64 * TURN), libm::cos(step as f64 * TURN));
        let unit = Point::new(cos, sin);
        let (a, b) = (path[0].dot(unit), path[1].dot(unit));
        let offset_m = unit.cross((path[0] + path[1]) * 0.5);
        let stroke = Stroke { object: index, offset_m, from_m: a.min(b), to_m: a.max(b) };
        groups.entry((net, (width_m * 1e9).round() as i64, step)).or_default().push(stroke);
    }
    for ((_, width_nm, _), mut strokes) in groups {
        if strokes.len() < LEAST_STROKES {
            continue;
        }
        let width_m = width_nm as f64 * 1e-9;
        strokes.sort_by(|a, b| a.offset_m.total_cmp(&b.offset_m));
        // Strokes that lie side by side and overlap over half of the shorter one belong together.
        let mut leader: Vec<usize> = (0..strokes.len()).collect();
        fn root(leader: &mut [usize], mut of: usize) -> usize {
            while leader[of] != of {
                leader[of] = leader[leader[of]];
                of = leader[of];
            }
            of
        }
        for a in 0..strokes.len() {
            for b in a + 1..strokes.len() {
                let apart = strokes[b].offset_m - strokes[a].offset_m;
                if apart > width_m {
                    break;
                }
                let (one, other) = (&strokes[a], &strokes[b]);
                let shared = one.to_m.min(other.to_m) - one.from_m.max(other.from_m);
                let shorter = (one.to_m - one.from_m).min(other.to_m - other.from_m);
                if apart > 1e-9 && shared >= 0.5 * shorter {
                    let (a, b) = (root(&mut leader, a), root(&mut leader, b));
                    leader[b.max(a)] = a.min(b);
                }
            }
        }
        let mut sizes = vec![0usize; strokes.len()];
        for of in 0..strokes.len() {
            sizes[root(&mut leader, of)] += 1;
        }
        for (of, stroke) in strokes.iter().enumerate() {
            if sizes[root(&mut leader, of)] >= LEAST_STROKES {
                objects[stroke.object].function = ObjectFunction::AreaStroke;
            }
        }
    }
}

/// Middle and shape of several objects together.
pub fn joined(objects: &[&CopperObject]) -> (Point, Region) {
    let bounds =
        objects.iter().fold(crate::geom::Bounds::EMPTY, |all, object| all.union(object_bounds(object)));
    let shapes: Vec<Region> = objects.iter().map(|object| object_shape(object)).collect();
    (bounds.centre(), union(&shapes))
}
