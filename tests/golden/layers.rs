//! Pages of copper layers: every kind of copper and sign is there, text stays apart, the bytes stay the same.

use crate::gauge::{Gauge, Shape, gauge};
use crate::pages::{shown, text_faults};
use ebbmap::board::{CopperArea, Hole, NetId, Pin, Plating, Tie, TieKind};
use ebbmap::draw::{Group, Item, Scene};
use ebbmap::geom::{Point, Polygon, Region};
use ebbmap::plan::Plan;
use ebbmap::report::{LayerInput, Picture, layer_scenes};
use ebbmap::style::Style;

fn style(name: &str) -> Style {
    ebbmap::read::style::built_in(name).expect("a style of the program")
}

fn square(x: f64, y: f64, side: f64) -> Polygon {
    let outer = [(x, y), (x + side, y), (x + side, y + side), (x, y + side)];
    Polygon { outer: outer.map(|(x, y)| Point::mm(x, y)).to_vec(), holes: Vec::new() }
}

/// A board with all five uses of copper on its top layer, a tie, a slot and a bare hole.
fn full(shape: &Shape) -> Gauge {
    let mut gauge = gauge(shape);
    let board = &mut gauge.board;
    for name in ["+3V3", "RESET"] {
        board.nets.push(ebbmap::board::Net { name: name.to_owned() });
    }
    let ground = board.layers[1].areas[0].shape.clone();
    board.nets.sort_by(|a, b| a.name.cmp(&b.name));
    let net = |name: &str| board.net(name);
    let (w, h) = (shape.width, shape.height);
    let areas = [
        (net("GND"), square(1.0, 1.0, 0.3 * h)),
        (net("+3V3"), square(1.0, 0.5 * h, 0.3 * h)),
        (net(&shape.net), square(0.5 * w, 0.5 * h, 1.0)),
        (net("RESET"), square(0.5 * w, 0.2 * h, 1.0)),
        (None, square(0.7 * w, 0.2 * h, 1.0)),
    ];
    board.layers[1].areas[0] = CopperArea { net: net("GND"), shape: ground };
    let layer = &mut board.layers[0];
    let shapes: Vec<Polygon> = areas.iter().map(|area| area.1.clone()).collect();
    layer.objects = areas.iter().map(|(net, shape)| fill(*net, shape)).collect();
    layer.areas = areas.into_iter().map(|(net, shape)| CopperArea { net, shape }).collect();
    layer.copper = Region(shapes);
    board.layers[1].copper = Region(vec![board.layers[1].areas[0].shape.clone()]);
    let hole = |path: Vec<Point>, plating| Hole {
        path,
        diameter_m: 1e-3,
        plating,
        layers: (0, 3),
        via: false,
        contacts: Vec::new(),
        net: None,
    };
    board.holes = vec![
        hole(vec![Point::mm(0.8 * w, 0.5 * h)], Plating::Plated),
        hole(vec![Point::mm(0.8 * w, 0.6 * h)], Plating::NonPlated),
        hole(vec![Point::mm(0.8 * w, 0.7 * h), Point::mm(0.8 * w, 0.7 * h + 2.0)], Plating::Plated),
    ];
    board.ties = vec![Tie {
        part: "NT1".to_owned(),
        kind: TieKind::EtchedCopper,
        nets: vec![NetId(0), NetId(1)],
        layer: 0,
        at: Point::mm(0.6 * w, 0.4 * h),
        shape: Region::default(),
    }];
    for (part, number, leg) in [("U2", "6", gauge.net.track.len() - 1), ("U5", "19", 0)] {
        let leg = &gauge.net.track[leg];
        board.pins.push(Pin {
            part: part.to_owned(),
            number: number.to_owned(),
            function: None,
            net: None,
            layer: 0,
            at: if part == "U5" { leg.from } else { leg.to },
            pad: Region::default(),
            hole: None,
        });
    }
    gauge.review.reference_nets = vec!["GND".to_owned()];
    gauge
}

fn fill(net: Option<NetId>, shape: &Polygon) -> ebbmap::board::CopperObject {
    ebbmap::board::CopperObject {
        kind: ebbmap::board::CopperKind::Fill { shape: Region(vec![shape.clone()]) },
        dark: true,
        net,
        pin: None,
        part: String::new(),
        function: ebbmap::board::ObjectFunction::Area,
        line: 1,
    }
}

fn scenes(gauge: &Gauge, style: &Style, with_review: bool) -> Vec<Scene> {
    let plan = Plan { paths: vec![gauge.net.clone()], ..Plan::default() };
    let plan = with_review.then_some((&gauge.review, &plan));
    layer_scenes(&LayerInput { board: &gauge.board, plan, style, input_hash: "0" })
}

/// Names of all groups of a scene.
fn groups(scene: &Scene) -> Vec<String> {
    fn collect(items: &[Item], all: &mut Vec<String>) {
        for item in items {
            if let Item::Group(Group { name, items, .. }) = item {
                all.push(name.clone());
                collect(items, all);
            }
        }
    }
    let mut all = Vec::new();
    collect(&scene.items, &mut all);
    all
}

fn shapes() -> Vec<(&'static str, Shape)> {
    let base = Shape { cell: 0.5, ..Shape::default() };
    let tall = Shape {
        width: 30.0,
        height: 90.0,
        track: vec![(20.0, 80.0), (20.0, 40.0), (8.0, 28.0), (8.0, 10.0)],
        slot: Some([4.0, 49.0, 24.0, 50.0]),
        ..base.clone()
    };
    let long = Shape { net: "PROBE_\u{6c34}\u{4f4d}_".to_owned() + &"X".repeat(91), ..base.clone() };
    vec![("wide", base), ("tall", tall), ("long-name", long)]
}

#[test]
fn layers_show_everything_without_overlap() {
    for (name, shape) in shapes() {
        let gauge = full(&shape);
        for look in ["paper", "screen"] {
            let style = style(look);
            let scenes = scenes(&gauge, &style, true);
            assert_eq!(scenes.len(), 4, "one page for each layer");
            for (index, scene) in scenes.iter().enumerate() {
                let wrong = text_faults(scene);
                assert!(wrong.is_empty(), "{name}, {look}, L{}:\n{}", index + 1, wrong.join("\n"));
                for text in scene.text_boxes() {
                    assert!(text.fill.contrast(style.color.page) >= 4.5, "{look}: `{}`", text.content);
                }
            }
            let names = groups(&scenes[0]);
            for wanted in [
                "reference-copper",
                "supply-copper",
                "charted-copper",
                "other-copper",
                "copper-without-net",
                "holes",
                "zones",
                "outline",
                "signs",
                "labels",
                "rulers",
                "scale-bar",
                "legend",
                "key-figures",
                "title-strip",
                "caution",
            ] {
                assert!(names.iter().any(|name| name == wanted), "{name}: no `{wanted}` in {names:?}");
            }
            assert!(groups(&scenes[1]).iter().any(|name| name == "voids"));
            let texts: Vec<String> = scenes[0].text_boxes().into_iter().map(|text| text.content).collect();
            for wanted in ["GND", "+3V3", "NT1", "ANALOG", "DIGITAL", "driver", "receiver", "tie of nets"] {
                assert!(texts.iter().any(|text| text == wanted), "{name}: no `{wanted}` in {texts:?}");
            }
            let picture = shown(&format!("layer-{name}-{look}"), &scenes[0]);
            assert!(picture.png.len() <= 650_000 && picture.svg.len() <= 900_000);
        }
    }
}

/// Hatching and rims tell the kinds of copper apart without color.
#[test]
fn kinds_of_copper_differ_by_more_than_color() {
    let gauge = full(&shapes()[0].1);
    let scene = &scenes(&gauge, &style("paper"), true)[0];
    fn find<'a>(items: &'a [Item], name: &str) -> Option<&'a Group> {
        items.iter().find_map(|item| match item {
            Item::Group(group) if group.name == name => Some(group),
            Item::Group(group) => find(&group.items, name),
            _ => None,
        })
    }
    let shapes = |name: &str| find(&scene.items, name).expect(name).items.len();
    assert_eq!((shapes("reference-copper"), shapes("supply-copper")), (1, 2), "supply copper is hatched");
    let Item::Shape(rim) = &find(&scene.items, "copper-without-net").expect("a group").items[0] else {
        panic!()
    };
    assert!(!rim.dash.is_empty());
}

#[test]
fn without_a_review_no_net_is_reference() {
    let gauge = full(&shapes()[0].1);
    let scenes = scenes(&gauge, &style("paper"), false);
    let names = groups(&scenes[0]);
    assert!(names.iter().any(|name| name == "supply-copper"), "{names:?}");
    for absent in ["reference-copper", "charted-copper", "zones"] {
        assert!(!names.iter().any(|name| name == absent), "{absent}");
    }
}

#[test]
fn layers_are_the_same_bytes_again() {
    let gauge = full(&shapes()[0].1);
    let once =
        || scenes(&gauge, &style("paper"), true).iter().map(|s| Picture::of(s).expect("a picture")).collect();
    let (first, second): (Vec<Picture>, Vec<Picture>) = (once(), once());
    assert!(first == second);
    assert_eq!(first.iter().map(|p| &p.number).collect::<std::collections::BTreeSet<_>>().len(), 4);
}
