//! Land patterns and the placing of parts.

use super::design::{Design, Pad, Part, Shape, Tie, Xy};

/// A land pattern before placing: pads (number, place, shape, drill) and the size of the body.
struct Pattern {
    pads: Vec<(String, Xy, Shape, Option<f64>)>,
    body: Xy,
    /// Half the way of the cutter along y in a slot for a flat pin; zero for round holes.
    slot: f64,
}

fn smd(number: impl ToString, x: f64, y: f64, w: f64, h: f64) -> (String, Xy, Shape, Option<f64>) {
    let radius = (0.25 * w.min(h) * 100.0).round() / 100.0;
    (number.to_string(), (x, y), Shape::Rounded(w, h, radius), None)
}

/// Two pads side by side along x.
fn two(gap: f64, w: f64, h: f64, body: Xy) -> Pattern {
    Pattern { pads: vec![smd(1, -gap, 0.0, w, h), smd(2, gap, 0.0, w, h)], body, slot: 0.0 }
}

/// Two rows along y, pin 1 at the upper left, counting counter-clockwise.
fn dual(n: usize, pitch: f64, reach: f64, w: f64, h: f64, body: Xy) -> Pattern {
    let side = n / 2;
    let y = |k: usize| (0.5 * (side as f64 - 1.0) - k as f64) * pitch;
    let mut pads: Vec<_> = (0..side).map(|k| smd(k + 1, -reach, y(k), w, h)).collect();
    pads.extend((0..side).map(|k| smd(side + k + 1, reach, y(side - 1 - k), w, h)));
    Pattern { pads, body, slot: 0.0 }
}

/// Four rows, pin 1 at the upper left of the left row, counting counter-clockwise.
fn quad(n: usize, pitch: f64, reach: f64, w: f64, h: f64, body: Xy) -> Pattern {
    let side = n / 4;
    let s = |k: usize| (0.5 * (side as f64 - 1.0) - k as f64) * pitch;
    let mut pads = Vec::new();
    pads.extend((0..side).map(|k| smd(k + 1, -reach, s(k), w, h)));
    pads.extend((0..side).map(|k| smd(side + k + 1, -s(k), -reach, h, w)));
    pads.extend((0..side).map(|k| smd(2 * side + k + 1, reach, -s(k), w, h)));
    pads.extend((0..side).map(|k| smd(3 * side + k + 1, s(k), reach, h, w)));
    Pattern { pads, body, slot: 0.0 }
}

/// Pins with holes in one row along y, pin 1 at the top with a rectangular pad.
fn row(n: usize, pitch: f64, pad: f64, drill: f64, body_width: f64) -> Pattern {
    let y = |k: usize| (0.5 * (n as f64 - 1.0) - k as f64) * pitch;
    let shape = |k: usize| if k == 0 { Shape::Rect(pad, pad) } else { Shape::Round(pad) };
    let pads = (0..n).map(|k| ((k + 1).to_string(), (0.0, y(k)), shape(k), Some(drill))).collect();
    Pattern { pads, body: (body_width, n as f64 * pitch), slot: 0.0 }
}

fn pattern(package: &str) -> Pattern {
    match package {
        "0603" => two(0.8, 0.8, 0.95, (1.6, 0.8)),
        "0805" => two(0.95, 1.0, 1.4, (2.0, 1.25)),
        "1206" => two(1.5, 1.2, 1.8, (3.2, 1.6)),
        "SMA" => two(2.0, 1.8, 1.8, (4.4, 2.6)),
        "SMB-TVS" => two(2.2, 2.0, 2.2, (4.6, 3.6)),
        "POLY-D" => two(3.1, 2.4, 2.6, (7.3, 4.3)),
        "COIL-6" => two(2.2, 1.6, 5.4, (6.2, 6.2)),
        "CRYSTAL" => Pattern {
            pads: vec![
                smd(1, -1.1, -0.85, 1.3, 1.1),
                smd(2, 1.1, -0.85, 1.3, 1.1),
                smd(3, 1.1, 0.85, 1.3, 1.1),
                smd(4, -1.1, 0.85, 1.3, 1.1),
            ],
            body: (3.2, 2.5),
            slot: 0.0,
        },
        "SOT23" => Pattern {
            pads: vec![
                smd(1, -1.0, 0.95, 1.1, 0.6),
                smd(2, -1.0, -0.95, 1.1, 0.6),
                smd(3, 1.0, 0.0, 1.1, 0.6),
            ],
            body: (1.4, 2.9),
            slot: 0.0,
        },
        "SOT23-5" => {
            let mut p = dual(6, 0.95, 1.2, 1.1, 0.6, (1.6, 2.9));
            p.pads.remove(4);
            p.pads[4].0 = "5".into();
            p
        }
        "SO8" => {
            let mut p = dual(8, 1.27, 2.7, 1.6, 0.6, (3.9, 4.9));
            p.pads.iter_mut().for_each(|pad| pad.2 = Shape::Oval(1.6, 0.6));
            p
        }
        "SO8-W" => dual(8, 1.27, 3.6, 1.6, 0.6, (5.3, 5.3)),
        "MSO8" => dual(8, 0.65, 2.2, 1.4, 0.4, (3.0, 3.0)),
        "TSSO16" => dual(16, 0.65, 2.85, 1.5, 0.4, (4.4, 5.0)),
        "TSSO20" => dual(20, 0.65, 2.85, 1.5, 0.4, (4.4, 6.5)),
        "QFP32" => quad(32, 0.8, 4.2, 1.5, 0.5, (7.0, 7.0)),
        "QFP48" => quad(48, 0.5, 4.2, 1.5, 0.3, (7.0, 7.0)),
        // Two pads that copper of the part itself joins.
        "TIE" => Pattern {
            pads: vec![
                ("1".into(), (-0.5, 0.0), Shape::Rect(0.6, 0.6), None),
                ("2".into(), (0.5, 0.0), Shape::Rect(0.6, 0.6), None),
            ],
            body: (1.6, 0.6),
            slot: 0.0,
        },
        "TEST" => Pattern {
            pads: vec![("1".into(), (0.0, 0.0), Shape::Round(1.0), None)],
            body: (1.0, 1.0),
            slot: 0.0,
        },
        "ROW4" => row(4, 2.54, 1.7, 1.0, 2.5),
        "ROW5" => row(5, 2.54, 1.7, 1.0, 2.5),
        "ROW6" => row(6, 2.54, 1.7, 1.0, 2.5),
        "ROW8" => row(8, 2.54, 1.7, 1.0, 2.5),
        "CLAMP2" => row(2, 5.0, 2.6, 1.3, 8.0),
        // Flat pins in slots of 1.0 x 1.8 mm.
        "CLAMP2-FLAT" => Pattern { slot: 0.4, ..row(2, 5.0, 2.6, 1.0, 8.0) },
        "CLAMP3" => row(3, 5.0, 2.6, 1.3, 8.0),
        "CLAMP6" => row(6, 5.0, 2.6, 1.3, 8.0),
        _ => panic!("no land pattern {package}"),
    }
}

/// A coordinate on the grid of the fabrication data, free of rounding noise.
pub fn tidy(value: f64) -> f64 {
    (value * 1e4).round() / 1e4
}

impl Design {
    /// Places a part on the top side, turned by `quarters` quarter turns; `nets` in the order of the pins, `-` for none.
    pub fn place(
        &mut self,
        reference: &str,
        package: &'static str,
        value: &str,
        at: Xy,
        quarters: u8,
        nets: &str,
    ) {
        let pattern = pattern(package);
        let nets: Vec<&str> = nets.split_whitespace().collect();
        assert_eq!(nets.len(), pattern.pads.len(), "{reference}: one net per pin");
        let way = if quarters % 2 == 1 { (pattern.slot, 0.0) } else { (0.0, pattern.slot) };
        let mut pads = Vec::new();
        for ((number, (mut x, mut y), mut shape, drill), net) in pattern.pads.into_iter().zip(nets) {
            for _ in 0..quarters {
                (x, y) = (-y, x);
                shape = shape.turned();
            }
            let net = if net == "-" { String::new() } else { net.to_owned() };
            pads.push(Pad { number, net, at: (tidy(at.0 + x), tidy(at.1 + y)), shape, drill, slot: way });
        }
        if package == "TIE" {
            let (x, y) = if quarters % 2 == 1 { (0.2, 0.3) } else { (0.3, 0.2) };
            let corners = [(-x, -y), (x, -y), (x, y), (-x, y)];
            let corners = corners.map(|(dx, dy)| (tidy(at.0 + dx), tidy(at.1 + dy))).to_vec();
            self.ties.push(Tie { reference: reference.into(), layer: 0, corners });
        }
        let (w, h) = pattern.body;
        let body = if quarters % 2 == 1 { (h, w) } else { (w, h) };
        self.parts.push(Part {
            reference: reference.into(),
            value: value.into(),
            package,
            at,
            quarters,
            body,
            pads,
        });
    }
}
