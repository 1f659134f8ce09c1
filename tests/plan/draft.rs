//! Boards drafted in a few lines of code, in mm: composed copper and barrel contacts follow from the objects.

use ebbmap::board::{
    Board, CopperArea, CopperKind, CopperLayer, CopperObject, Dielectric, Foil, Hole, LayerRole, Net, NetId,
    ObjectFunction, Origin, Pin, PinId, Plating, Stackup,
};
use ebbmap::geom::locate::Locator;
use ebbmap::geom::{Point, Polygon, Region, boolean, stroke};
use std::collections::BTreeMap;

pub fn rectangle(x0: f64, y0: f64, x1: f64, y1: f64) -> Region {
    let outer = vec![Point::mm(x0, y0), Point::mm(x1, y0), Point::mm(x1, y1), Point::mm(x0, y1)];
    Region(vec![Polygon { outer, holes: vec![] }])
}

pub fn disc(x: f64, y: f64, diameter: f64) -> Region {
    let outer = stroke::circle(Point::mm(x, y), diameter * 1e-3);
    Region(vec![Polygon { outer, holes: vec![] }])
}

/// A board under construction.
pub struct Draft {
    width: f64,
    height: f64,
    dielectric: Vec<f64>,
    objects: Vec<Vec<(String, CopperObject, Option<String>)>>,
    holes: Vec<(Hole, String)>,
    pins: Vec<(Pin, String)>,
}

impl Draft {
    /// A board of `width` by `height` with the given dielectrics between its layers, all in mm.
    pub fn new(width: f64, height: f64, dielectric: &[f64]) -> Self {
        Self {
            width,
            height,
            dielectric: dielectric.to_vec(),
            objects: (0..=dielectric.len()).map(|_| Vec::new()).collect(),
            holes: Vec::new(),
            pins: Vec::new(),
        }
    }

    fn add(
        &mut self,
        layer: usize,
        net: &str,
        kind: CopperKind,
        function: ObjectFunction,
        pin: Option<String>,
    ) {
        let object =
            CopperObject { kind, dark: true, net: None, pin: None, part: String::new(), function, line: 1 };
        self.objects[layer].push((net.into(), object, pin));
    }

    pub fn track(&mut self, layer: usize, net: &str, corners: &[(f64, f64)], width: f64) {
        let path: Vec<Point> = corners.iter().map(|&(x, y)| Point::mm(x, y)).collect();
        let kind = CopperKind::Draw { path, width_m: width * 1e-3 };
        self.add(layer, net, kind, ObjectFunction::Track, None);
    }

    /// A square pad of a pin such as `U1.2`.
    pub fn pad(&mut self, layer: usize, pin: &str, net: &str, (x, y): (f64, f64), side: f64) {
        let half = 0.5 * side;
        let shape = rectangle(x - half, y - half, x + half, y + half);
        let at = Point::mm(x, y);
        let (part, number) = pin.split_once('.').unwrap();
        let entry = Pin {
            part: part.into(),
            number: number.into(),
            function: None,
            net: None,
            layer,
            at,
            pad: shape.clone(),
            hole: None,
        };
        self.pins.push((entry, net.into()));
        self.add(layer, net, CopperKind::Flash { at, shape }, ObjectFunction::Pad, Some(pin.into()));
    }

    pub fn via(&mut self, net: &str, (x, y): (f64, f64), drill: f64) {
        let last = self.objects.len() - 1;
        for layer in [0, last] {
            let kind = CopperKind::Flash { at: Point::mm(x, y), shape: disc(x, y, 2.0 * drill) };
            self.add(layer, net, kind, ObjectFunction::ViaPad, None);
        }
        self.hole((x, y), drill, Plating::Plated, net);
    }

    pub fn hole(&mut self, (x, y): (f64, f64), drill: f64, plating: Plating, net: &str) {
        let layers = (0, self.objects.len() - 1);
        let hole = Hole {
            path: vec![Point::mm(x, y)],
            diameter_m: drill * 1e-3,
            plating,
            layers,
            via: true,
            contacts: vec![],
            net: None,
        };
        self.holes.push((hole, net.into()));
    }

    pub fn fill(&mut self, layer: usize, net: &str, shape: Region) {
        self.add(layer, net, CopperKind::Fill { shape }, ObjectFunction::Area, None);
    }

    /// A plane of the whole layer, 0.5 mm away from the outline, without `voids`.
    pub fn plane(&mut self, layer: usize, net: &str, voids: &[Region]) {
        let whole = rectangle(0.5, 0.5, self.width - 0.5, self.height - 0.5);
        self.fill(layer, net, boolean::difference(&whole, &boolean::union(voids)));
    }

    pub fn board(self) -> Board {
        let all = self.objects.iter().flatten().map(|entry| &entry.0);
        let mut names: Vec<String> = all.chain(self.pins.iter().map(|pin| &pin.1)).cloned().collect();
        names.sort();
        names.dedup();
        let id = |name: &String| names.binary_search(name).ok().map(|index| NetId(index as u32));
        let mut pins: Vec<Pin> =
            self.pins.iter().map(|(pin, net)| Pin { net: id(net), ..pin.clone() }).collect();
        pins.sort_by_key(Pin::label);
        let n_layers = self.objects.len();
        let mut layers = Vec::new();
        for (index, entries) in self.objects.into_iter().enumerate() {
            let mut by_net: BTreeMap<Option<NetId>, Vec<Region>> = BTreeMap::new();
            let mut objects = Vec::new();
            for (net, mut object, pin) in entries {
                object.net = id(&net);
                let label = |pin: &String| pins.iter().position(|known| known.label() == *pin);
                object.pin = pin.as_ref().and_then(label).map(|at| PinId(at as u32));
                by_net.entry(object.net).or_default().push(match &object.kind {
                    CopperKind::Draw { path, width_m } => stroke::stroke(path, *width_m),
                    CopperKind::Flash { shape, .. } | CopperKind::Fill { shape } => shape.clone(),
                });
                objects.push(object);
            }
            let mut areas = Vec::new();
            for (net, shapes) in by_net {
                areas.extend(boolean::union(&shapes).0.into_iter().map(|shape| CopperArea { net, shape }));
            }
            let role = match index {
                0 => LayerRole::Top,
                last if last + 1 == n_layers => LayerRole::Bottom,
                _ => LayerRole::Inner,
            };
            let copper = Region(areas.iter().map(|area| area.shape.clone()).collect());
            layers.push(CopperLayer { role, objects, copper, areas });
        }
        let locators: Vec<Locator> =
            layers.iter().map(|layer| Locator::new(layer.areas.iter().map(|area| &area.shape))).collect();
        let holes = self.holes.into_iter().map(|(mut hole, net)| {
            hole.net = id(&net);
            for (layer, locator) in locators.iter().enumerate() {
                let found = locator.touching(&hole.path, 0.5 * hole.diameter_m);
                let own = found.into_iter().filter(|&at| layers[layer].areas[at].net == hole.net);
                hole.contacts.extend(own.map(|at| (layer, at)));
            }
            hole
        });
        let foil = Foil { thickness_m: 35e-6, origin: Origin::File };
        let sheet = |&thickness: &f64| Dielectric {
            thickness_m: thickness * 1e-3,
            origin: Origin::File,
            permittivity: 4.2,
            permittivity_origin: Origin::File,
        };
        Board {
            title: "Saltmarsh tide gauge".into(),
            outline: rectangle(0.0, 0.0, self.width, self.height),
            stackup: Stackup {
                foils: vec![foil; n_layers],
                dielectrics: self.dielectric.iter().map(sheet).collect(),
                temperature_c: 20.0,
            },
            holes: holes.collect(),
            nets: names.into_iter().map(|name| Net { name }).collect(),
            layers,
            pins,
            ..Board::default()
        }
    }
}

/// A board of 40 x 30 mm with a ground plane below the top layer.
pub fn plain() -> Draft {
    let mut draft = Draft::new(40.0, 30.0, &[0.2, 1.0, 0.2]);
    draft.plane(1, "GND", &[]);
    draft
}

/// A ground pin beside a via.
pub fn ground(draft: &mut Draft, pin: &str, (x, y): (f64, f64)) {
    draft.pad(0, pin, "GND", (x, y), 0.6);
    draft.track(0, "GND", &[(x, y), (x, y + 1.0)], 0.3);
    draft.via("GND", (x, y + 1.0), 0.3);
}

/// The same copper from U1.1 to U2.1: as one net, or in three nets with two parts between their pads.
pub fn row(parts: bool) -> Draft {
    let mut draft = plain();
    ground(&mut draft, "U1.2", (5.0, 16.0));
    ground(&mut draft, "U2.2", (35.0, 16.0));
    let names = if parts { ["OUT", "MID", "TIDE"] } else { ["TIDE"; 3] };
    draft.pad(0, "U1.1", names[0], (5.0, 15.0), 0.6);
    draft.pad(0, "U2.1", names[2], (35.0, 15.0), 0.6);
    draft.track(0, names[0], &[(5.0, 15.0), (14.0, 15.0)], 0.2);
    draft.track(0, names[1], &[(16.0, 15.0), (20.0, 12.0), (24.0, 12.0)], 0.2);
    draft.track(0, names[2], &[(26.0, 12.0), (31.0, 15.0), (35.0, 15.0)], 0.2);
    let ends = [(14.0, 15.0), (16.0, 15.0), (24.0, 12.0), (26.0, 12.0)];
    let own = [names[0], names[1], names[1], names[2]];
    for ((pin, at), net) in ["R1.1", "R1.2", "R2.2", "R2.1"].into_iter().zip(ends).zip(own) {
        if parts {
            draft.pad(0, pin, net, at, 0.6);
        }
    }
    if !parts {
        draft.track(0, "TIDE", &ends[..2], 0.6);
        draft.track(0, "TIDE", &ends[2..], 0.6);
    }
    draft
}
