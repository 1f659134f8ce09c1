//! The tide gauge: tracks laid by hand in their variants, routing of the rest, copper areas, stitching.

use super::design::{BareHole, Cut, Design, Pour, Style, VIA_PAD, Xy, length};
use super::obstacle::{CLEARANCE, contains, obstacles};
use super::parts;
use super::route::{Wish, fan_out, route};

const TOP: usize = 0;
const GROUND: usize = 1;
const SUPPLY: usize = 2;
const BOTTOM: usize = 3;

/// Width of signal tracks.
const W: f64 = 0.2;

/// Nets from which the areas on the outer layers keep three times the height over the ground plane.
const QUIET: [&str; 15] = [
    "ADC_SCK", "ADC_DOUT", "ADC_CLK", "MEM_SCK", "MEM_SI", "RTC_SCL", "RTC_SDA", "RTC_INT", "BUS_TX",
    "TEMP_IN", "SYNC", "AMP_OUT", "SIG_P", "SIG_N", "SW_NODE",
];

/// Places of the vias where `BUS_TX` changes its layer.
const CHANGES: [Xy; 2] = [(69.6, 55.3), (79.2, 60.1)];

/// A revision of the tide gauge.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Revision {
    /// With the six planted faults.
    A,
    /// Five of them mended, the track at the edge a little worse.
    B,
    /// All mended.
    Clean,
}

impl Revision {
    /// All revisions.
    pub const ALL: [Self; 3] = [Self::A, Self::B, Self::Clean];

    /// Name of the folder.
    pub fn folder(self) -> &'static str {
        match self {
            Self::A => "a",
            Self::B => "b",
            Self::Clean => "clean",
        }
    }

    fn tags(self) -> [&'static str; 6] {
        match self {
            Self::A => ["clock-a", "row-a", "change-a", "loop-a", "edge-a", "bridge-a"],
            Self::B => ["clock-c", "row-c", "change-c", "loop-c", "edge-b", "bridge-c"],
            Self::Clean => ["clock-c", "row-c", "change-c", "loop-c", "edge-c", "bridge-c"],
        }
    }
}

/// The board with the tracks of all variants at once, so that what is routed is the same in all revisions.
pub fn all_variants() -> Design {
    let mut d = Design {
        title: "Saltmarsh tide gauge".into(),
        stem: "tide-gauge".into(),
        guid: "52c1f0de-6f0a-4d7b-8a3e-1e9d4b7c2a90".into(),
        size: (100.0, 80.0),
        corner: 3.0,
        quiet: (QUIET.map(str::to_owned).to_vec(), 0.65),
        ..Design::default()
    };
    parts::place(&mut d);
    d.holes = [(4.0, 4.0), (96.0, 4.0), (4.0, 76.0), (96.0, 76.0)]
        .map(|at| BareHole { at, diameter: 3.2 })
        .to_vec();
    planes(&mut d);
    analog(&mut d);
    bus(&mut d);
    memory(&mut d);
    field_bus(&mut d);
    sync(&mut d);
    converter_loop(&mut d);
    let areas = areas();
    let inside = move |net: &str, at: Xy| {
        net == "GND" || areas.iter().any(|(name, outline)| *name == net && contains(outline, at, 0.5))
    };
    let failed = fan_out(&mut d, &["GND", "+3V3", "+3V3A", "+5V", "VIN_P"], 0.4, &inside);
    report("no room for a via at", &failed);
    let failed = route(&mut d, &wishes());
    report("no way for", &failed);
    stitch(&mut d);
    d
}

/// Problems of the layout are errors of its author: the generator stops.
fn report(what: &str, names: &[String]) {
    assert!(names.is_empty(), "{what} {names:?}");
}

/// One revision.
pub fn gauge(all: &Design, revision: Revision) -> Design {
    let mut d = all.clone();
    d.revision = match revision {
        Revision::A => "A",
        Revision::B => "B",
        Revision::Clean => "C",
    }
    .into();
    d.choose(&revision.tags());
    widen(&mut d);
    d
}

/// Supply areas of the third layer.
fn areas() -> Vec<(&'static str, Vec<Xy>)> {
    vec![
        (
            "+3V3A",
            vec![
                (0.5, 1.9),
                (1.9, 0.5),
                (34.2, 0.5),
                (34.2, 30.6),
                (37.0, 30.6),
                (37.0, 54.0),
                (31.4, 54.0),
                (31.4, 59.6),
                (37.0, 59.6),
                (37.0, 79.5),
                (1.9, 79.5),
                (0.5, 78.1),
            ],
        ),
        (
            "+5V",
            vec![
                (34.6, 0.5),
                (61.0, 0.5),
                (61.0, 9.6),
                (51.6, 9.6),
                (51.6, 13.4),
                (61.0, 13.4),
                (61.0, 26.6),
                (47.4, 26.6),
                (47.4, 34.0),
                (39.0, 34.0),
                (39.0, 30.2),
                (34.6, 30.2),
            ],
        ),
        (
            "VIN_P",
            vec![
                (61.4, 0.5),
                (98.1, 0.5),
                (99.5, 1.9),
                (99.5, 26.6),
                (61.4, 26.6),
                (61.4, 13.0),
                (52.0, 13.0),
                (52.0, 10.0),
                (61.4, 10.0),
            ],
        ),
        (
            "+3V3",
            vec![
                (47.8, 27.0),
                (99.5, 27.0),
                (99.5, 78.1),
                (98.1, 79.5),
                (37.4, 79.5),
                (37.4, 59.2),
                (31.8, 59.2),
                (31.8, 54.4),
                (37.4, 54.4),
                (37.4, 34.4),
                (47.8, 34.4),
            ],
        ),
        ("GND", vec![(67.6, 53.0), (82.6, 53.0), (82.6, 63.6), (67.6, 63.6)]),
    ]
}

fn planes(d: &mut Design) {
    let inset = |gap: f64| vec![(gap, gap), (100.0 - gap, gap), (100.0 - gap, 80.0 - gap), (gap, 80.0 - gap)];
    let pour = |net: &str, layer: usize, outline: Vec<Xy>, style: Style, clearance: f64, rank: u8| Pour {
        net: net.into(),
        layer,
        outline,
        corner: 2.5,
        style,
        clearance,
        relief: true,
        rank,
    };
    d.pours.push(pour("GND", GROUND, inset(0.3), Style::Clear, 0.3, 0));
    for (net, outline) in areas() {
        d.pours.push(pour(net, SUPPLY, outline, Style::Keyhole, 0.3, u8::from(net == "GND")));
    }
    // Corners cut at 45 degrees follow the rounded board.
    let (low, w, h) = (0.6, 99.4, 79.4);
    let c = 1.4;
    let outer = vec![
        (low + c, low),
        (w - c, low),
        (w, low + c),
        (w, h - c),
        (w - c, h),
        (low + c, h),
        (low, h - c),
        (low, low + c),
    ];
    d.pours.push(pour("GND", TOP, outer.clone(), Style::Keyhole, 0.25, 0));
    d.pours.push(pour("GND", BOTTOM, outer, Style::Keyhole, 0.25, 0));
    // The moat between the analog and the digital side, with its bridge in two places.
    let mut moat = |tag: &'static str, from: f64, to: f64| {
        d.cuts.push(Cut { layer: GROUND, path: vec![(38.0, from), (38.0, to)], width: 1.0, tag });
    };
    moat("bridge-a", 31.5, 66.0);
    moat("bridge-a", 74.0, 80.0);
    moat("bridge-c", 31.5, 45.0);
    moat("bridge-c", 59.0, 80.0);
    // A slot in the digital part.
    d.cuts.push(Cut { layer: GROUND, path: vec![(64.6, 63.5), (69.8, 63.5)], width: 1.0, tag: "" });
}

/// The temperature input: straight, or through the switching loop of the buck converter.
fn analog(d: &mut Design) {
    let (net, w) = ("TEMP_IN", 0.25);
    d.track(
        net,
        TOP,
        w,
        &[(19.5, 34.2), (18.8, 34.9), (18.8, 45.8), (18.6, 46.0), (18.6, 46.6), (20.6, 46.6)],
    );
    d.track_in("loop-c", net, TOP, w, &[(19.5, 6.0), (19.5, 34.2)]);
    let detour: &[Xy] = &[
        (19.5, 6.0),
        (22.3, 3.2),
        (44.0, 3.2),
        (46.8, 6.0),
        (46.8, 26.6),
        (44.8, 28.6),
        (25.1, 28.6),
        (19.5, 34.2),
    ];
    d.track_in("loop-a", net, TOP, w, detour);
}

/// The converter's bus, side by side across the moat.
fn bus(d: &mut Design) {
    let nets = ["ADC_SCK", "ADC_DIN", "ADC_DOUT", "ADC_CS", "ADC_DRDY", "ADC_START", "ADC_RST", "ADC_CLK"];
    for (k, net) in nets.into_iter().enumerate() {
        let (from, to) = (54.325 - 0.65 * k as f64, 54.3 - 0.5 * k as f64);
        let rise = (to - from).abs();
        d.track(net, TOP, W, &[(32.85, from), (50.0, from), (50.0 + rise, to), (57.85, to)]);
    }
}

/// The memory's clock round the slot or over it; the clock chip's bus round the socket or through its pins.
fn memory(d: &mut Design) {
    d.track("MEM_SI", TOP, W, &[(62.3, 56.25), (62.3, 66.6), (63.6, 67.9), (63.6, 69.095)]);
    let over: &[Xy] =
        &[(62.8, 56.25), (62.8, 57.4), (67.2, 61.8), (67.2, 68.4), (65.235, 70.365), (63.6, 70.365)];
    let round: &[Xy] =
        &[(62.8, 56.25), (62.8, 64.6), (65.0, 66.8), (65.0, 70.0), (64.635, 70.365), (63.6, 70.365)];
    d.track_in("clock-a", "MEM_SCK", TOP, W, over);
    d.track_in("clock-c", "MEM_SCK", TOP, W, round);
    let through: [(&str, &[Xy]); 3] = [
        (
            "RTC_INT",
            &[(66.25, 50.8), (73.2, 50.8), (73.94, 51.54), (78.2, 51.54), (79.835, 49.905), (81.3, 49.905)],
        ),
        (
            "RTC_SDA",
            &[(66.25, 50.3), (72.9, 50.3), (74.2, 49.0), (79.6, 49.0), (79.965, 48.635), (81.3, 48.635)],
        ),
        (
            "RTC_SCL",
            &[(66.25, 49.8), (71.0, 49.8), (74.34, 46.46), (78.4, 46.46), (79.305, 47.365), (81.3, 47.365)],
        ),
    ];
    for (net, path) in through {
        d.track_in("row-a", net, TOP, W, path);
    }
    // Round the socket side by side: (net, pin of the controller, left, bottom, right, pin of the clock chip).
    for (net, start, left, bottom, right, end) in [
        ("RTC_INT", 50.8, 73.6, 38.4, 78.4, 49.905),
        ("RTC_SDA", 50.3, 73.1, 37.9, 78.9, 48.635),
        ("RTC_SCL", 49.8, 72.6, 37.4, 79.4, 47.365),
    ] {
        let path = [
            (66.25, start),
            (left - 1.2, start),
            (left, start - 1.2),
            (left, bottom + 1.6),
            (left + 1.6, bottom),
            (right - 1.6, bottom),
            (right, bottom + 1.6),
            (right, end - 1.0),
            (right + 1.0, end),
            (81.3, end),
        ];
        d.track_in("row-c", net, TOP, W, &path);
    }
}

/// Transmit data of the field bus: down to the bottom layer and up again; return vias beside it or not.
fn field_bus(d: &mut Design) {
    let net = "BUS_TX";
    let [first, second] = CHANGES;
    d.track(net, TOP, W, &[(66.25, 54.3), (68.6, 54.3), first]);
    d.via(net, first);
    d.track(net, BOTTOM, W, &[first, (74.4, 60.1), second]);
    d.via(net, second);
    d.track(net, TOP, W, &[second, (81.3, 60.095)]);
    for at in [(70.5, 54.7), (79.2, 59.1)] {
        d.via("GND", at);
        if let Some(via) = d.vias.last_mut() {
            via.tag = "change-c";
        }
    }
}

/// The pulse for other instruments: well inside the board, or along its edge.
fn sync(d: &mut Design) {
    let net = "SYNC";
    d.track(net, TOP, W, &[(66.25, 54.8), (68.0, 54.8), (71.5, 58.3), (71.5, 69.6)]);
    d.track_in("edge-c", net, TOP, W, &[(71.5, 69.6), (73.5, 71.6), (89.41, 71.6), (91.81, 74.0)]);
    for (tag, y) in [("edge-a", 79.1), ("edge-b", 79.35)] {
        let path = [(71.5, 69.6), (71.5, y - 1.5), (73.0, y), (90.61, y), (91.81, y - 1.2), (91.81, 74.0)];
        d.track_in(tag, net, TOP, W, &path);
    }
}

/// The switching loop of the buck converter and its supplies.
fn converter_loop(d: &mut Design) {
    d.track("SW_NODE", TOP, 1.0, &[(55.3, 13.635), (49.2, 13.635)]);
    d.track("SW_NODE", TOP, 1.2, &[(49.2, 14.4), (48.8, 13.2), (48.8, 11.2)]);
    d.track("SW_NODE", TOP, 0.4, &[(52.4, 16.2), (52.4, 13.635)]);
    d.track("BOOT", TOP, 0.3, &[(54.0, 16.2), (55.295, 14.905)]);
    d.track("VIN_P", TOP, 0.6, &[(58.2, 12.365), (53.2, 12.365), (52.6, 11.8)]);
    d.vias("VIN_P", &[(57.2, 12.365), (58.2, 12.365)]);
    d.track("+5V", TOP, 1.2, &[(44.8, 17.9), (41.6, 17.9)]);
    d.track("+5V", TOP, 1.2, &[(44.8, 14.6), (44.8, 11.9), (41.6, 11.9)]);
    d.track("+5V", TOP, 0.8, &[(44.8, 18.6), (44.8, 20.2)]);
    d.track("+5V", TOP, 0.6, &[(44.3, 20.2), (45.3, 20.2)]);
    d.vias("+5V", &[(44.3, 20.2), (45.3, 20.2)]);
    for (net, pad, places) in [
        ("GND", (52.6, 8.8), [(52.0, 7.4), (53.2, 7.4)]),
        ("GND", (48.8, 7.2), [(48.2, 5.6), (49.4, 5.6)]),
        ("GND", (71.4, 9.9), [(70.6, 7.9), (72.2, 7.9)]),
        ("VIN_P", (71.4, 16.1), [(70.6, 18.2), (72.2, 18.2)]),
        ("VIN_P", (77.0, 17.5), [(76.4, 19.0), (77.6, 19.0)]),
    ] {
        for at in places {
            d.track(net, TOP, 0.5, &[(at.0, pad.1), at]);
            d.via(net, at);
        }
    }
}

/// What the router lays, in this order.
fn wishes() -> Vec<Wish> {
    let analog_side = ((0.0, 0.0), (38.9, 80.0));
    let other_side = ((37.1, 0.0), (100.0, 80.0));
    let loop_area = ((46.0, 6.0), (56.6, 18.8));
    let socket = ((73.0, 39.0), (78.6, 59.4));
    let mut list = Vec::new();
    let mut add = |nets: &str, width: f64, toll: [u32; 2], avoid: &[(Xy, Xy)]| {
        for net in nets.split_whitespace() {
            list.push(Wish { net: net.into(), width, toll, avoid: avoid.to_vec() });
        }
    };
    add("VIN VIN_F", 1.0, [0, 20], &[analog_side]);
    add("XTAL_1 XTAL_2", W, [0, 30], &[analog_side]);
    add("REF_P SIG_P SIG_N SIG_PF SIG_NF RG_1 RG_2 AIN_P AIN_N AIN_T", 0.25, [0, 10], &[other_side]);
    add("AMP_OUT AMP_REF REF_N CAP_P CAP_N EXC_P EXC_S EXC_N SHIELD LDO_NR", 0.25, [0, 10], &[other_side]);
    add("TEMP_IN", 0.25, [0, 10], &[other_side]);
    add("BUCK_FB BUCK_SS BUCK_EN", 0.25, [0, 6], &[analog_side, loop_area]);
    add("RTC_X1 RTC_X2", W, [0, 30], &[analog_side]);
    add("VBAT BUS_A BUS_B", 0.25, [0, 6], &[analog_side]);
    add("LINE_A LINE_B", 0.3, [0, 6], &[analog_side]);
    add("MEM_SO MEM_CS MEM_WP MEM_HOLD", W, [0, 4], &[analog_side]);
    add("BUS_RX BUS_DE", W, [2, 0], &[analog_side, socket]);
    add("EXP0 EXP1 EXP2 EXP3 EXP4 EXP5 PULSE", W, [2, 0], &[analog_side, loop_area]);
    add("DBG_IO DBG_CK RUN LED_RUN LED_BUS LED_RUN_A LED_BUS_A", W, [2, 0], &[analog_side, loop_area]);
    add("FLOAT_HI FLOAT_LO FLOAT_HI_F FLOAT_LO_F PWR_GOOD", W, [0, 0], &[analog_side, loop_area]);
    add("+3V3A", 0.4, [0, 0], &[other_side]);
    add("+3V3", 0.4, [0, 0], &[analog_side, loop_area]);
    list
}

/// Ground vias wherever all layers have room: a fence along the edge and a grid over the board.
fn stitch(d: &mut Design) {
    // Where the layer change finds a distant way between the two ground areas.
    let mut places = vec![(75.0, 62.4)];
    let fence = |n: usize, length: f64, k: usize| 2.2 + (length - 4.4) * k as f64 / (n - 1) as f64;
    for k in 0..20 {
        let x = fence(20, 100.0, k);
        places.extend([(x, 1.3), (x, 78.0)]);
    }
    for k in 1..15 {
        let y = fence(16, 80.0, k);
        places.extend([(1.3, y), (98.7, y)]);
    }
    for row in 0..13 {
        for column in 0..16 {
            let shift = if row % 2 == 0 { 0.0 } else { 3.0 };
            places.push((4.5 + 6.0 * column as f64 + shift, 5.0 + 5.8 * row as f64));
        }
    }
    // A grid point that is taken may move a little.
    let moves: Vec<Xy> = (0..41)
        .map(|k| (f64::from(k % 8), f64::from(k / 8)))
        .map(|(turn, ring)| {
            let angle = turn * std::f64::consts::FRAC_PI_4;
            (
                (libm::cos(angle) * ring * 0.4 * 10.0).round() / 10.0,
                (libm::sin(angle) * ring * 0.4 * 10.0).round() / 10.0,
            )
        })
        .collect();
    for place in places {
        let things = obstacles(d, 0, 0);
        let fits = |at: Xy| {
            let inside = at.0 > 1.0 && at.1 > 1.0 && at.0 < 99.0 && at.1 < 79.0;
            let far = CHANGES.iter().all(|change| length(change.0 - at.0, change.1 - at.1) > 4.2);
            inside
                && far
                && things.iter().all(|thing| {
                    let distance = thing.body.distance_to_bar(at, at, 0.5 * VIA_PAD);
                    let room = match thing.net.as_str() {
                        "GND" if thing.pad || thing.barrel => 0.5,
                        "GND" => 0.0,
                        net if QUIET.contains(&net) => 0.45,
                        _ => CLEARANCE + 0.08,
                    };
                    thing.net == "GND" && !thing.pad && !thing.barrel || distance > room
                })
        };
        let free = moves.iter().map(|step| (place.0 + step.0, place.1 + step.1)).find(|&at| fits(at));
        if let Some(at) = free {
            d.via("GND", (super::package::tidy(at.0), super::package::tidy(at.1)));
        }
    }
}

/// Widens tracks towards round pads with holes where there is room for it.
fn widen(d: &mut Design) {
    let things = obstacles(d, 0, 0);
    let mut rounds: Vec<(String, Xy, f64)> =
        d.vias.iter().map(|via| (via.net.clone(), via.at, 0.5 * VIA_PAD)).collect();
    for pad in d.parts.iter().flat_map(|part| &part.pads).filter(|pad| pad.drill.is_some()) {
        rounds.push((pad.net.clone(), pad.at, 0.5 * pad.shape.size().0));
    }
    let mut drops = Vec::new();
    for track in &d.tracks {
        if track.layer == BOTTOM && QUIET.contains(&track.net.as_str()) {
            continue;
        }
        for forward in [true, false] {
            let n = track.path.len();
            let (end, next) =
                if forward { (track.path[0], track.path[1]) } else { (track.path[n - 1], track.path[n - 2]) };
            let Some(round) = rounds.iter().find(|round| round.0 == track.net && round.1 == end) else {
                continue;
            };
            let (dx, dy) = (next.0 - end.0, next.1 - end.1);
            let long = length(dx, dy);
            let reach = 2.0 * round.2.min(0.5) + (round.2 - 0.5).max(0.0) + 0.2;
            if long < reach + 0.1 || track.width > 1.2 * round.2 {
                continue;
            }
            let (u, v) = (dx / long, dy / long);
            let at = |along: f64, across: f64| {
                let p = (end.0 + u * along - v * across, end.1 + v * along + u * across);
                ((p.0 * 1e4).round() / 1e4, (p.1 * 1e4).round() / 1e4)
            };
            let (base, side) = (0.45 * round.2, 0.85 * round.2);
            let corners = vec![
                at(base, -side),
                at(reach, -0.5 * track.width),
                at(reach, 0.5 * track.width),
                at(base, side),
            ];
            let clear = things
                .iter()
                .filter(|thing| thing.net != track.net && thing.layers[track.layer])
                .all(|thing| {
                    (0..4).all(|k| {
                        thing.body.distance_to_bar(corners[k], corners[(k + 1) % 4], 0.0) > CLEARANCE
                    })
                });
            if clear {
                drops.push((track.net.clone(), track.layer, corners));
            }
        }
    }
    d.drops = drops;
}
