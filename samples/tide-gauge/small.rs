//! The small board: converter, microcontroller and connectors on 40 x 30 mm, for quick tests.

use super::design::{BareHole, Cut, Design, Pour, Style, Xy};
use super::route::{Wish, fan_out, route};

const TOP: usize = 0;
const BOTTOM: usize = 3;

/// Width of signal tracks.
const W: f64 = 0.2;

/// The small board.
pub fn small() -> Design {
    let mut d = Design {
        title: "Saltmarsh tide gauge probe".into(),
        revision: "A".into(),
        stem: "probe".into(),
        guid: "7d3a1c52-0b64-4e0f-9a51-5b8f2f6a0c11".into(),
        size: (40.0, 30.0),
        corner: 2.0,
        ..Design::default()
    };
    parts(&mut d);
    let inset = |gap: f64| {
        let (w, h) = (40.0 - gap, 30.0 - gap);
        vec![(gap, gap), (w, gap), (w, h), (gap, h)]
    };
    for (net, layer) in [("GND", 1), ("+3V3", 2)] {
        d.pours.push(Pour {
            net: net.into(),
            layer,
            outline: inset(0.5),
            corner: 1.5,
            style: Style::Clear,
            clearance: 0.3,
            relief: true,
            rank: 0,
        });
    }
    d.cuts.push(Cut { layer: 1, path: vec![(20.3, 17.2), (20.3, 24.0)], width: 0.6, tag: "" });
    d.holes = [(3.0, 3.0), (37.0, 3.0), (3.0, 27.0), (37.0, 27.0)]
        .map(|at| BareHole { at, diameter: 2.2 })
        .to_vec();
    tracks(&mut d);
    d
}

fn parts(d: &mut Design) {
    d.place("J1", "ROW5", "bridge sensor", (3.5, 15.0), 0, "GND REF_P AIN_P AIN_N GND");
    d.place(
        "U1",
        "TSSO16",
        "24-bit converter",
        (13.5, 16.0),
        0,
        "+3V3 GND AIN_P AIN_N REF_P GND GND - GND ADC_RST ADC_DRDY ADC_CS ADC_DOUT ADC_SCK GND +3V3",
    );
    d.place(
        "U2",
        "QFP32",
        "microcontroller",
        (27.5, 16.0),
        0,
        "+3V3 GND ADC_SCK ADC_DOUT ADC_CS ADC_DRDY ADC_RST - \
         IO0 IO1 IO2 IO3 SYNC IO4 IO5 - \
         GND RXD TXD RUN - - +3V3 GND - - - - - - - -",
    );
    d.place("J2", "ROW6", "service port", (37.0, 15.0), 0, "+3V3 RUN TXD RXD - GND");
    d.place("J3", "ROW8", "expansion", (24.0, 3.0), 1, "IO0 IO1 IO2 IO3 SYNC IO4 IO5 GND");
    d.place("C1", "0603", "100nF", (10.6, 20.2), 2, "GND +3V3");
    d.place("C2", "0603", "100nF", (16.6, 20.2), 0, "+3V3 GND");
    d.place("C3", "0603", "100nF", (21.8, 20.0), 1, "GND +3V3");
    d.place("C4", "0603", "100nF", (33.4, 17.0), 3, "+3V3 GND");
    d.place("C5", "0603", "10nF", (7.6, 15.6), 1, "AIN_N AIN_P");
    d.place("R1", "0603", "1k", (9.6, 12.2), 0, "+3V3 REF_P");
}

/// Tracks laid by hand, supply pins taken down to their planes, the rest routed.
fn tracks(d: &mut Design) {
    // The clock crosses the slot, the rest of the bus passes below it.
    let clock: &[Xy] =
        &[(16.35, 16.975), (17.3, 16.975), (18.8, 18.475), (21.4, 18.475), (22.675, 17.2), (23.3, 17.2)];
    d.track("ADC_SCK", TOP, W, clock);
    d.track("ADC_DOUT", TOP, W, &[(16.35, 16.325), (23.225, 16.325), (23.3, 16.4)]);
    d.track("ADC_CS", TOP, W, &[(16.35, 15.675), (23.225, 15.675), (23.3, 15.6)]);
    d.track("ADC_DRDY", TOP, W, &[(16.35, 15.025), (23.075, 15.025), (23.3, 14.8)]);
    d.track("ADC_RST", TOP, W, &[(16.35, 14.375), (21.6, 14.375), (21.975, 14.0), (23.3, 14.0)]);
    // A row of vias whose antipads run into each other; one net passes between them on the top layer.
    let row = ["IO0", "IO1", "IO2", "IO3", "IO4", "IO5"];
    for (index, net) in row.into_iter().enumerate() {
        let pin = 24.7 + 0.8 * (index + usize::from(index > 3)) as f64;
        let via = 24.2 + 1.1 * index as f64;
        d.track(net, TOP, W, &[(pin, 11.8), (pin, 8.4 + (via - pin).abs()), (via, 8.4)]);
        d.via(net, (via, 8.4));
    }
    let sync: &[Xy] = &[(27.9, 11.8), (27.9, 9.95), (28.05, 9.8), (28.05, 6.6), (25.27, 3.82), (25.27, 3.0)];
    d.track("SYNC", TOP, W, sync);
    // The receive line of the service port runs on the bottom layer over the supply plane.
    d.track("RXD", TOP, W, &[(31.7, 14.0), (33.2, 14.0)]);
    d.via("RXD", (33.2, 14.0));
    d.track("RXD", BOTTOM, W, &[(33.2, 14.0), (33.2, 12.3), (33.8, 11.7), (34.97, 11.7), (37.0, 13.73)]);
    let planes = |_: &str, _: Xy| true;
    let failed = fan_out(d, &["GND", "+3V3"], 0.3, &planes);
    assert!(failed.is_empty(), "no room for vias: {failed:?}");
    let wish = |net: &str| Wish { net: net.into(), width: W, toll: [0, 4], avoid: Vec::new() };
    let names = ["AIN_P", "AIN_N", "REF_P", "TXD", "RUN"];
    let bus = row.into_iter().map(|net| Wish { toll: [20, 0], ..wish(net) });
    let wishes: Vec<Wish> = names.into_iter().map(wish).chain(bus).collect();
    let failed = route(d, &wishes);
    assert!(failed.is_empty(), "no way for {failed:?}");
}
