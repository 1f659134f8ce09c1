//! Whole pages: nothing overlaps, nothing leaves the page, contrast holds, sizes stay small, bytes stay the same.

use crate::gauge::{Gauge, Shape, gauge};
use ebbmap::draw::{DensityScale, Scene, TextBox};
use ebbmap::report::{
    ContactCell, ContactInput, ContactRow, PairInput, PairSide, Picture, TicketInput, contact_scenes,
    pair_scene, thumbnail, ticket_scene,
};
use ebbmap::review::{Band, Model};
use ebbmap::style::Style;
use num_complex::Complex64;
use std::path::PathBuf;

fn style(name: &str) -> Style {
    ebbmap::read::style::built_in(name).expect("a style of the program")
}

fn input<'a>(gauge: &'a Gauge, style: &'a Style) -> TicketInput<'a> {
    TicketInput {
        board: &gauge.board,
        review: &gauge.review,
        net: &gauge.net,
        chart: &gauge.net.charts[0],
        band: &gauge.band,
        map: &gauge.map,
        figures: &gauge.figures,
        scale: DensityScale::new(gauge.net.charts[0].height_m, style.density.range_db),
        findings: Some(&gauge.findings),
        joints: &gauge.joints,
        style,
        input_hash: "0",
        sheet: (1, 12),
        index: Some("../contact-1.svg"),
    }
}

/// Writes the page where a person can look at it, and gives the picture.
pub fn shown(name: &str, scene: &Scene) -> Picture {
    let folder = PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("target/golden/pages");
    std::fs::create_dir_all(&folder).expect("a folder");
    let start = std::time::Instant::now();
    let picture = Picture::of(scene).expect("a picture");
    println!(
        "{name}: {:?}, SVG {} kB, PNG {} kB",
        start.elapsed(),
        picture.svg.len() / 1000,
        picture.png.len() / 1000
    );
    std::fs::write(folder.join(format!("{name}.svg")), &picture.svg).expect("written");
    std::fs::write(folder.join(format!("{name}.png")), &picture.png).expect("written");
    picture
}

/// What is wrong with the text of a page.
pub fn text_faults(scene: &Scene) -> Vec<String> {
    let boxes = scene.text_boxes();
    let mut wrong = Vec::new();
    for (index, a) in boxes.iter().enumerate() {
        if a.left < 2.0 || a.top < 1.0 || a.right > scene.width - 2.0 || a.bottom > scene.height - 1.0 {
            wrong.push(format!("leaves the page: {}", words(a)));
        }
        for b in &boxes[..index] {
            if a.overlaps(b, 0.15) {
                wrong.push(format!("overlap: {} and {}", words(a), words(b)));
            }
        }
    }
    wrong
}

fn words(text: &TextBox) -> String {
    format!(
        "`{}` at ({:.1}, {:.1}) to ({:.1}, {:.1})",
        text.content, text.left, text.top, text.right, text.bottom
    )
}

fn long_name() -> String {
    "PROBE_\u{6c34}\u{4f4d}_".to_owned() + &"X".repeat(91)
}

/// Boards that stress the layout.
fn shapes() -> Vec<(&'static str, Shape)> {
    let tall = Shape {
        width: 30.0,
        height: 90.0,
        track: vec![(20.0, 80.0), (20.0, 40.0), (8.0, 28.0), (8.0, 10.0)],
        slot: Some([4.0, 49.0, 24.0, 50.0]),
        cell: 0.2,
        ..Shape::default()
    };
    let flat = Shape {
        width: 120.0,
        height: 18.0,
        track: vec![(110.0, 9.0), (60.0, 9.0), (56.0, 13.0), (10.0, 13.0)],
        slot: Some([70.0, 5.0, 70.6, 12.0]),
        pins: 0,
        cell: 0.2,
        ..Shape::default()
    };
    let small_net = Shape {
        width: 160.0,
        height: 100.0,
        track: vec![(88.0, 52.0), (84.0, 52.0), (80.0, 48.0), (76.0, 48.0)],
        slot: Some([81.0, 44.0, 81.5, 56.0]),
        cell: 0.2,
        ..Shape::default()
    };
    let named = Shape { net: long_name(), cell: 0.2, ..Shape::default() };
    let hazard = Shape { net: "MAINS_SENSE".to_owned(), cell: 0.2, frequency_hz: 3e8, ..Shape::default() };
    let spread = Shape { model: Model::Spread, cell: 0.2, zones: false, ..Shape::default() };
    vec![
        ("plain", Shape::default()),
        ("bare", Shape { marked: false, cell: 0.2, ..Shape::default() }),
        ("tall", tall),
        ("flat", flat),
        ("window", small_net),
        ("long-name", named),
        ("hazard", hazard),
        ("spread", spread),
    ]
}

#[test]
fn ticket_pages_keep_their_text_apart() {
    for (name, shape) in shapes() {
        let gauge = gauge(&shape);
        let style = style(match name {
            "tall" => "screen",
            "bare" => "mono",
            "window" => "large",
            _ => "paper",
        });
        let start = std::time::Instant::now();
        let scene = ticket_scene(&input(&gauge, &style));
        println!("{name}: scene in {:?}", start.elapsed());
        let picture = shown(&format!("ticket-{name}"), &scene);
        let wrong = text_faults(&scene);
        assert!(wrong.is_empty(), "{name}:\n{}", wrong.join("\n"));
        assert!(picture.png.len() <= 650_000, "{name}: PNG of {} bytes", picture.png.len());
        assert!(picture.svg.len() <= 900_000, "{name}: SVG of {} bytes", picture.svg.len());
        assert!(scene.text_boxes().iter().all(|text| text.size >= 3.0), "{name}: type too small");
    }
}

/// Ink of text outside the map against the page, and the named inks against their grounds (`style::check` does the
/// rest): WCAG 2.2, 4.5 : 1.
#[test]
fn text_has_contrast() {
    for (name, _) in ebbmap::read::style::BUILT_IN {
        let style = style(name);
        let gauge = gauge(&Shape { cell: 0.4, ..Shape::default() });
        let scene = ticket_scene(&input(&gauge, &style));
        let inside = ["50 %", "80 %", "95 %"];
        for text in scene.text_boxes() {
            // A number in a disc stands on the disc; `style::check` compares the two.
            if text.fill == style.color.mark_text {
                continue;
            }
            let contrast = text.fill.contrast(style.color.page);
            assert!(
                contrast >= 4.5 || inside.contains(&&*text.content),
                "{name}: `{}` {contrast:.1}",
                text.content
            );
        }
    }
}

#[test]
fn escapes_and_markup_survive_in_the_file() {
    let mut shape = Shape { cell: 0.4, ..Shape::default() };
    shape.net = "A<B>&\"C\"\u{1}".to_owned();
    let gauge = gauge(&shape);
    let style = style("paper");
    let picture = Picture::of(&ticket_scene(&input(&gauge, &style))).expect("a picture");
    assert!(picture.svg.contains("A&lt;B&gt;&amp;"));
    assert!(picture.svg.contains("\\u0001"));
    assert!(picture.description.contains("63"));
    assert!(!picture.svg.contains("\"-0\"") && !picture.svg.contains("NaN"));
}

fn bands() -> Vec<Band> {
    let band = |name: &str, at: f64| Band {
        name: name.to_owned(),
        from_hz: 0.3 * at,
        to_hz: 3.0 * at,
        at_hz: vec![at],
        explicit: false,
    };
    vec![
        band("VLF", 1e4),
        band("LF", 1e5),
        band("MF", 1e6),
        band("HF", 1e7),
        band("VHF", 1e8),
        band("UHF", 1e9),
    ]
}

fn contact_pages(style: &Style, shapes: &[Shape], bands: &[Band]) -> Vec<Scene> {
    let gauges: Vec<Gauge> = shapes.iter().map(gauge).collect();
    let rows = gauges.iter().enumerate().map(|(index, gauge)| {
        let cells = bands.iter().enumerate().map(|(column, _)| {
            if index == 1 && column == 2 {
                let reason = "landing `via of U5.20` of net `ADC_SCK` must lie on plane `L2-GND`; no copper within two cells";
                return ContactCell::Withheld(reason.to_owned());
            }
            let mut figures = gauge.figures.clone();
            let part = (column + 1) as f64 / bands.len() as f64;
            figures.share_3h.value = Some(0.634 * part);
            figures.share_3h.without_voids = Some(0.78 * part);
            if let Some(extra) = &mut figures.extra_loop_inductance_h {
                extra.value = Some(3.2e-9 * part / (index + 1) as f64);
            }
            let map = thumbnail(
                &gauge.board,
                &gauge.review,
                &gauge.net,
                &gauge.net.charts[0],
                &gauge.map,
                &figures,
                DensityScale::new(0.2e-3, 60.0),
                style,
            );
            ContactCell::Map(Box::new(map), Some(format!("maps/net-{index}-{column}.svg")))
        });
        ContactRow { net: &gauge.net, chart: &gauge.net.charts[0], cells: cells.collect(), findings: &gauge.findings }
    });
    let input = ContactInput {
        board: &gauges[0].board,
        review: &gauges[0].review,
        columns: bands.iter().map(|band| (band, band.at_hz[0])).collect(),
        rows: rows.collect(),
        scale: DensityScale::new(0.2e-3, 60.0),
        style,
        input_hash: "0",
    };
    contact_scenes(&input)
}

fn some_nets(count: usize, base: &Shape) -> Vec<Shape> {
    let mut shapes: Vec<Shape> = (0..count)
        .map(|n| {
            let mut shape = base.clone();
            shape.net = format!("LEVEL_{n}");
            for point in &mut shape.track {
                point.1 += 1.5 * n as f64;
            }
            shape
        })
        .collect();
    if count > 3 {
        shapes[3].net = long_name();
    }
    shapes
}

#[test]
fn contact_sheets_keep_their_text_apart() {
    let base = Shape { cell: 0.25, ..Shape::default() };
    let tall = Shape {
        width: 30.0,
        height: 90.0,
        track: vec![(20.0, 80.0), (20.0, 40.0), (8.0, 28.0), (8.0, 10.0)],
        slot: Some([4.0, 49.0, 24.0, 50.0]),
        ..base.clone()
    };
    for (name, base, look) in [("wide", &base, "paper"), ("tall", &tall, "screen")] {
        let style = style(look);
        let scenes = contact_pages(&style, &some_nets(6, base), &bands());
        assert_eq!(scenes.len(), 4, "six rows and six columns make two by two pages");
        for (index, scene) in scenes.iter().enumerate() {
            let wrong = text_faults(scene);
            assert!(wrong.is_empty(), "{name}, page {}:\n{}", index + 1, wrong.join("\n"));
        }
        let first = shown(&format!("contact-{name}"), &scenes[0]);
        assert!(first.svg.contains("href=\"maps/net-0-0.svg\""));
        assert!(first.description.contains("withheld"));
        shown(&format!("contact-{name}-last"), &scenes[3]);
    }
}

#[test]
fn rows_are_ordered_by_loop_inductance_then_name() {
    let base = Shape { cell: 0.5, ..Shape::default() };
    let style = style("paper");
    let scenes = contact_pages(&style, &some_nets(3, &base), &bands()[..2]);
    let names: Vec<String> = scenes[0]
        .text_boxes()
        .into_iter()
        .map(|text| text.content)
        .filter(|text| text.starts_with("LEVEL_"))
        .collect();
    assert_eq!(names, ["LEVEL_0", "LEVEL_1", "LEVEL_2"]);
}

fn side(gauge: &Gauge) -> PairSide<'_> {
    let net = &gauge.net;
    PairSide { net, chart: &net.charts[0], map: &gauge.map, figures: &gauge.figures }
}

/// A pair on one plane: overlap, impedance and noise; nothing overlaps in any style.
#[test]
fn pair_sheets_keep_their_text_apart() {
    let base = Shape { cell: 0.25, marked: false, ..Shape::default() };
    let victim = Shape {
        net: "AIN_P".to_owned(),
        track: vec![(46.0, 12.0), (30.0, 12.0), (24.0, 9.0), (12.0, 9.0)],
        ..base.clone()
    };
    let (a, b) = (gauge(&base), gauge(&victim));
    for name in ["paper", "screen", "mono", "large"] {
        let style = style(name);
        let scene = pair_scene(&PairInput {
            board: &a.board,
            review: &a.review,
            aggressor: side(&a),
            victim: side(&b),
            band: &a.band,
            mutual_ohm: Some(Complex64::new(-0.14e-3, 0.9e-3)),
            noise: Some((10e-3, 9.1e-6)),
            scale: DensityScale::new(0.2e-3, 60.0),
            style: &style,
            input_hash: "0",
            sheet: (1, 1),
        });
        let picture = shown(&format!("pair-{name}"), &scene);
        let wrong = text_faults(&scene);
        assert!(wrong.is_empty(), "{name}:\n{}", wrong.join("\n"));
        assert!(picture.svg.len() <= 900_000 && picture.png.len() <= 650_000, "{name}");
        assert!(picture.description.contains("9.1\u{a0}\u{b5}V"), "{}", picture.description);
    }
}

/// Boards of random size, track, name and findings in all styles: no text overlaps or leaves the page.
#[test]
fn random_boards_keep_their_text_apart() {
    let mut seed = 5_u64;
    let mut random = move |low: f64, high: f64| {
        seed = seed.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1);
        low + (high - low) * (seed >> 33) as f64 / f64::from(u32::MAX >> 1)
    };
    let styles: Vec<Style> = ebbmap::read::style::BUILT_IN.iter().map(|(name, _)| style(name)).collect();
    for round in 0..40 {
        let (width, height) = (random(15.0, 200.0), random(15.0, 150.0));
        let track: Vec<(f64, f64)> =
            (0..4).map(|_| (random(1.5, width - 1.5), random(1.5, height - 1.5))).collect();
        let letters = ["N", "SENSOR_A_", "\u{6c34}\u{4f4d}", "W_\u{1F600}"];
        let net: String = letters[round % 4].chars().cycle().take(1 + random(0.0, 99.0) as usize).collect();
        let slot = Some([0.4 * width, 0.3 * height, 0.4 * width + 0.8, 0.7 * height]);
        let cell = 0.004 * (width + height);
        let shape = Shape {
            width,
            height,
            track,
            net,
            slot,
            cell,
            pins: 6,
            zones: round % 3 > 0,
            ..Shape::default()
        };
        let gauge = gauge(&shape);
        let scene = ticket_scene(&input(&gauge, &styles[round % styles.len()]));
        let wrong = text_faults(&scene);
        if !wrong.is_empty() {
            shown("random", &scene);
        }
        assert!(wrong.is_empty(), "board {round}, {}:\n{}", shape.net, wrong.join("\n"));
    }
}

/// A contact sheet of 25 maps of a board with many voids stays small, and does not depend on threads.
#[test]
fn contact_sheets_are_small_and_the_same_from_threads() {
    let style = style("paper");
    let base = Shape { cell: 0.5, perforation: (12, 8), ..Shape::default() };
    let shapes = some_nets(5, &base);
    let once = |threads: usize| {
        let pool = rayon::ThreadPoolBuilder::new().num_threads(threads).build().expect("threads");
        pool.install(|| Picture::of(&contact_pages(&style, &shapes, &bands()[..5])[0]).expect("a picture"))
    };
    let first = once(1);
    assert!(first.svg.len() <= 900_000, "SVG of {} bytes", first.svg.len());
    assert!(first.svg.matches("<use ").count() >= 20, "planes are held once");
    let folder = PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("target/golden/pages");
    std::fs::write(folder.join("contact-perforated.png"), &first.png).expect("written");
    println!("perforated: SVG {} kB, PNG {} kB", first.svg.len() / 1000, first.png.len() / 1000);
    for threads in [2, 8] {
        assert_eq!(once(threads), first);
    }
}

#[test]
fn the_same_bytes_again_and_from_threads() {
    let gauge = gauge(&Shape { cell: 0.4, ..Shape::default() });
    let style = style("paper");
    let once = || Picture::of(&ticket_scene(&input(&gauge, &style))).expect("a picture");
    let first = once();
    std::thread::scope(|scope| {
        let all: Vec<_> = (0..3).map(|_| scope.spawn(once)).collect();
        for thread in all {
            assert_eq!(thread.join().expect("no panic"), first);
        }
    });
}
