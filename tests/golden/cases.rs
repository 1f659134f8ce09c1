//! The golden cases: one small scene for each thing that could break.

use crate::compare::{Case, blessing, check, read_case, root};
use crate::gauge::{Shape as Board, gauge};
use ebbmap::draw::callout::Callout;
use ebbmap::draw::change::{self, ChangeRow};
use ebbmap::draw::density::Density;
use ebbmap::draw::film::{self, Curve, Frame};
use ebbmap::draw::flow::Flow;
use ebbmap::draw::frame::{LegendEntry, caution, color_scale, legend, rulers, scale_bar, title_strip};
use ebbmap::draw::joint::{JointForm, JointMark};
use ebbmap::draw::list::ListedFinding;
use ebbmap::draw::map::{MapData, MapLeg, MapLook, MapPin, draw_map};
use ebbmap::draw::pair::key;
use ebbmap::draw::panel::{KeyFigure, KeyRow, Panel, Section, SectionLayer};
use ebbmap::draw::plot::share_plot;
use ebbmap::draw::set::cell_map;
use ebbmap::draw::{DensityScale, Group, Scene, Text, View, italic, plain, raised, shortened};
use ebbmap::geom::{Bounds, Point};
use ebbmap::style::{Face, Style};
use std::collections::BTreeSet;

/// A case: folder and scene.
type Golden = (&'static str, fn() -> Scene);

const CASES: &[Golden] = &[
    ("map/paper", || map_scene("paper", false)),
    ("map/findings", marked_scene),
    ("map/mono", || map_scene("mono", false)),
    ("map/screen", || map_scene("screen", false)),
    ("map/turned", turned),
    ("frame/color-scale", scale_scene),
    ("frame/legend", legend_scene),
    ("frame/rulers", rulers_scene),
    ("frame/title-strip", strip_scene),
    ("panel/figures", figures_scene),
    ("panel/findings", findings_scene),
    ("panel/section", section_scene),
    ("change/map", change_scene),
    ("change/table", table_scene),
    ("film/strip", film_scene),
    ("pair/key", key_scene),
    ("plot/share", plot_scene),
    ("text/names", names_scene),
];

#[test]
fn golden_cases_match() {
    assert!(!CASES.is_empty());
    let wrong: Vec<String> = CASES.iter().flat_map(|(path, scene)| check(path, &scene())).collect();
    assert!(wrong.is_empty(), "\n{}", wrong.join("\n"));
    assert!(!blessing(), "references were rewritten");
}

#[test]
fn every_reference_has_its_case_and_titles_are_unique() {
    let mut found = BTreeSet::new();
    for group in
        std::fs::read_dir(root()).expect("the folder").flatten().filter(|entry| entry.path().is_dir())
    {
        for case in std::fs::read_dir(group.path()).expect("a group").flatten() {
            found.insert(format!("{}/{}", group.file_name().display(), case.file_name().display()));
        }
    }
    let known: BTreeSet<String> = CASES.iter().map(|(path, _)| (*path).to_owned()).collect();
    assert_eq!(found, known);
    let cases: Vec<Case> = CASES.iter().map(|(path, _)| read_case(path).expect("a case")).collect();
    let titles: BTreeSet<&str> = cases.iter().map(|case| case.title.as_str()).collect();
    assert_eq!(titles.len(), CASES.len(), "titles must differ");
    assert!(cases.iter().all(|case| !case.guards.is_empty() && case.large.as_deref() != Some("")));
}

fn style(name: &str) -> Style {
    ebbmap::read::style::built_in(name).expect("a style of the program")
}

/// A small sheet, 240 pixels wide at most.
fn small(style: &Style, width: f64, height: f64, group: Group) -> Scene {
    let mut scene = Scene {
        width,
        height,
        px: (width * 5.0).min(240.0) as u32,
        page: style.color.page,
        fallback: style.font.fallback.clone(),
        title: "case".to_owned(),
        ..Scene::default()
    };
    scene.group(group);
    scene
}

const SCALE: DensityScale = DensityScale::new(0.2e-3, 60.0);

fn board(shape: &Board) -> (MapData, Bounds) {
    let gauge = gauge(shape);
    let net = &gauge.net;
    let pin = |name: &str, at: Point| Some(MapPin { name: name.to_owned(), at });
    let plane = &gauge.board.layers[1].areas[0].shape;
    let data = MapData {
        density: Density::of(&gauge.map),
        plane: vec![plane.clone()],
        idle: Vec::new(),
        outline: gauge.board.outline.clone(),
        zones: gauge.review.zones.iter().map(|zone| (zone.name.clone(), zone.outline.clone())).collect(),
        track: net.track.iter().map(|leg| MapLeg { from: leg.from, to: leg.to, charted: true }).collect(),
        driver: pin("U5.19", net.track[0].from),
        receiver: pin("U2.6", net.track[net.track.len() - 1].to),
        landings: vec![net.charts[0].driver_landing.at, net.charts[0].receiver_landing.at],
        levels: gauge.figures.contour_levels,
        callouts: Vec::new(),
        joints: Vec::new(),
        flow: None,
    };
    (data, gauge.board.outline.bounds())
}

fn little() -> Board {
    Board {
        width: 30.0,
        height: 20.0,
        track: vec![(24.0, 12.0), (18.0, 12.0), (15.0, 9.0), (7.0, 9.0)],
        slot: Some([11.0, 6.0, 11.8, 15.0]),
        pins: 4,
        ..Board::default()
    }
}

fn map_scene(name: &str, small_cell: bool) -> Scene {
    let style = style(name);
    let (data, bounds) = board(&little());
    let view = View { window: bounds.grown(0.5e-3), x: 1.0, y: 1.0, scale: 1.5, turned: false };
    let look = MapLook { style: &style, scale: SCALE, px_per_mm: 4.0, small: small_cell, room_right: 0.0 };
    small(&style, 48.0, 33.0, draw_map(&data, &view, &look, "a map").group)
}

/// A map with findings, joints and the direction of the return.
fn marked_scene() -> Scene {
    let style = style("paper");
    let shape = Board { zones: false, ..little() };
    let (mut data, bounds) = board(&shape);
    let callout = |number: &str, x: f64, y: f64, words: &str| Callout {
        number: number.to_owned(),
        at: Point::mm(x, y),
        words: words.to_owned(),
    };
    data.callouts =
        vec![callout("3.1", 11.4, 9.0, "void S1: +3.4 nH"), callout("3.2", 11.4, 15.0, "slot end")];
    let joint = |x: f64, y: f64, form, name: &str, current| JointMark {
        at: Point::mm(x, y),
        form,
        name: name.to_owned(),
        current,
    };
    data.joints = vec![
        joint(21.0, 4.0, JointForm::Part, "C14", 0.31),
        joint(25.0, 16.0, JointForm::Via, "via", 0.04),
        joint(4.0, 16.0, JointForm::Tie, "NT1", 0.12),
    ];
    data.flow = Some(Flow::of(&gauge(&shape).map));
    let view = View { window: bounds.grown(0.5e-3), x: 1.0, y: 1.0, scale: 3.0, turned: false };
    let look = MapLook { style: &style, scale: SCALE, px_per_mm: 2.0, small: false, room_right: 0.0 };
    small(&style, 95.0, 65.0, draw_map(&data, &view, &look, "a map").group)
}

fn findings_scene() -> Scene {
    let style = style("paper");
    let finding = |number: &str, title: &str, note: &str, remedy: Option<&str>| ListedFinding {
        number: number.to_owned(),
        title: title.to_owned(),
        note: note.to_owned(),
        remedy: remedy.map(str::to_owned),
    };
    let listed = vec![
        finding(
            "3.1",
            "Void S1: +3.4 nH",
            "at (26.0, 18.0) mm, limit 1.0 nH",
            Some("bridge the void with copper 2.0 mm wide under the track: 3.4 nH becomes 0.2 nH"),
        ),
        finding("12.10", "12 % strays over the boundary", "at (28.8, 20.1) mm (warn)", None),
    ];
    let panel = Panel::findings(listed, 2, &style);
    small(&style, 68.0, panel.height + 3.0, panel.draw(2.0, 1.0, &style))
}

fn turned() -> Scene {
    let style = style("paper");
    let shape =
        Board { width: 20.0, height: 30.0, track: vec![(10.0, 24.0), (10.0, 8.0)], slot: None, ..little() };
    let (data, bounds) = board(&shape);
    let view = View::filling(bounds, 1.0, 1.0, 46.0, 30.0);
    let look = MapLook { style: &style, scale: SCALE, px_per_mm: 4.0, small: true, room_right: 0.0 };
    small(&style, 48.0, 32.0, draw_map(&data, &view, &look, "a map").group)
}

fn scale_scene() -> Scene {
    let style = style("paper");
    let (data, bounds) = board(&little());
    let view = View { window: bounds, x: 0.0, y: 0.0, scale: 3.0, turned: false };
    let look = MapLook { style: &style, scale: SCALE, px_per_mm: 1.0, small: false, room_right: 0.0 };
    let drawn = draw_map(&data, &view, &look, "a map");
    small(&style, 96.0, 14.0, color_scale(4.0, 5.0, 68.0, &SCALE, &drawn.contours, &style))
}

fn legend_scene() -> Scene {
    let style = style("paper");
    let entries = [
        LegendEntry::Track,
        LegendEntry::OtherTrack,
        LegendEntry::NoCopper,
        LegendEntry::IdleCopper,
        LegendEntry::Boundary,
        LegendEntry::Driver,
        LegendEntry::Receiver,
        LegendEntry::Landing,
        LegendEntry::Contour80,
        LegendEntry::Flow,
        LegendEntry::Via,
        LegendEntry::Part,
    ];
    for entry in entries {
        assert!(ebbmap::style::LABELS.contains(&entry.words()), "{} can be translated", entry.words());
    }
    small(&style, 80.0, 42.0, legend(2.0, 5.0, 76.0, &entries, &style).0)
}

fn rulers_scene() -> Scene {
    let style = style("screen");
    let window = Bounds { min: Point::mm(72.0, -31.0), max: Point::mm(108.0, -9.0) };
    let view = View { window, x: 9.0, y: 2.0, scale: 1.25, turned: false };
    let mut group = rulers(&view, Point::mm(77.2, -20.0), &style);
    group.group(scale_bar(&view, 54.0, 36.5, &style));
    small(&style, 57.0, 40.0, group)
}

fn strip_scene() -> Scene {
    let style = style("paper");
    let fields = [
        ("Board", "Saltmarsh tide gauge".to_owned()),
        ("Net", "SENSOR_".repeat(14) + "P"),
        ("Residual", format!("3.5 \u{d7} 10{}", raised("\u{2212}7"))),
    ];
    let mut group = title_strip(2.0, 2.0, 92.0, &fields, &style);
    group.group(caution(2.0, 18.0, 92.0, "Quasi-static sheet model: no radiation, no parts.", &style));
    small(&style, 96.0, 22.0, group)
}

fn figures_scene() -> Scene {
    let style = style("paper");
    let row = |name: &str, bar, tick| KeyRow {
        name: name.to_owned(),
        value: "1.17 mm".to_owned(),
        reference: "0.616 mm".to_owned(),
        bar: Some(bar),
        tick: Some(tick),
    };
    let figures = vec![
        KeyFigure {
            name: format!("Return within 3{}", italic("h")),
            value: "63 %".to_owned(),
            bar: Some(0.63),
            tick: Some(0.78),
            notes: vec!["without voids 78 %; more is better".to_owned()],
            ..KeyFigure::default()
        },
        KeyFigure {
            name: "Half-width that holds".to_owned(),
            aside: "without voids".to_owned(),
            rows: vec![row("50 %", 0.1, 0.05), row("95 %", 1.0, 0.4)],
            ..KeyFigure::default()
        },
    ];
    let panel = Panel::figures(figures, &style);
    small(&style, 68.0, panel.height + 3.0, panel.draw(2.0, 1.0, &style))
}

fn section_scene() -> Scene {
    let style = style("screen");
    let layer = |name: &str, track, plane| SectionLayer { name: name.to_owned(), track, plane };
    let section = Section {
        layers: vec![layer("L2", false, false), layer("L3 GND", false, true), layer("L4 track", true, false)],
        height_m: 0.2e-3,
        width_m: 0.4e-3,
        scale: SCALE,
    };
    let panel = Panel::section(section, &style);
    small(&style, 68.0, panel.height + 2.0, panel.draw(2.0, 1.0, &style))
}

fn change_scene() -> Scene {
    let style = style("paper");
    let (before, bounds) = board(&little());
    let (after, _) = board(&Board { track: vec![(24.0, 12.0), (18.0, 4.0), (7.0, 4.0)], ..little() });
    let view = View { window: bounds.grown(0.5e-3), x: 1.0, y: 1.0, scale: 1.5, turned: false };
    let mut group = change::map((&before.density, &after.density), &view, &SCALE, &style, "a change");
    group.group(change::scale_bar(2.0, 40.0, 78.0, &SCALE, &style));
    small(&style, 98.0, 52.0, group)
}

fn table_scene() -> Scene {
    let style = style("screen");
    let row = |name: &str, values: [&str; 3], places, better| ChangeRow {
        name: name.to_owned(),
        values: values.map(str::to_owned),
        places,
        better,
    };
    let rows = [
        row("Extra path by voids", ["16.7 mm", "0.4 mm", "\u{2212}16.3"], [1.0, 0.02], Some(true)),
        row("Track length", ["37.2 mm", "44.5 mm", "+7.3"], [0.8, 1.0], Some(false)),
        row("Loop inductance", ["8.2 nH", "8.2 nH", "0"], [0.5, 0.5], None),
    ];
    small(&style, 140.0, 24.0, change::table(3.0, 6.0, 134.0, &rows, &style))
}

fn film_scene() -> Scene {
    let style = style("paper");
    let (data, bounds) = board(&little());
    let frame = |head: &str| Frame {
        head: head.to_owned(),
        foot: "63 % within 3h".to_owned(),
        map: cell_map(&data, bounds, SCALE, &style, head),
    };
    let mut group = film::frames((2.0, 1.0, 59.5), &[frame("1 kHz"), frame("1 MHz")], &style);
    let curve = |name: &str, reach: f64, closed_form| Curve {
        name: name.to_owned(),
        points: (-40..=40)
            .map(|n| (0.25 * f64::from(n), 500.0 / (1.0 + (0.25 * f64::from(n) / reach).powi(2))))
            .collect(),
        closed_form,
    };
    let curves = [curve("1 kHz", 4.0, false), curve("1 MHz", 1.0, false), curve("closed form", 0.8, true)];
    group.group(film::cut_plot((10.0, 58.0, 108.0, 36.0), (1.0, 1000.0), &curves, &style));
    small(&style, 122.0, 102.0, group)
}

fn key_scene() -> Scene {
    let style = style("paper");
    small(&style, 70.0, 44.0, key((2.0, 2.0, 64.5, 30.0), ("MEM_SCK", "AIN_P"), &SCALE, &style))
}

fn plot_scene() -> Scene {
    let style = style("paper");
    let points = [
        (1e4, Some(0.1), Some(0.12)),
        (1e5, None, Some(0.5)),
        (1e6, Some(0.6), Some(0.76)),
        (1e7, Some(0.75), Some(0.78)),
    ];
    let words: Vec<String> = ["10 kHz", "100 kHz", "1 MHz", "10 MHz"].map(str::to_owned).to_vec();
    small(&style, 62.0, 24.0, share_plot((3.0, 2.0, 44.0, 16.0), &points, &words, &style))
}

fn names_scene() -> Scene {
    let style = style("paper");
    let mut group = Group::new("names");
    let long = "TIDE_".repeat(20);
    let ink = style.color.ink;
    let size = 3.4;
    group.text(Text::new(
        2.0,
        5.0,
        size,
        Face::NarrowBold,
        ink,
        &shortened(Face::NarrowBold, size, &long, 44.0),
    ));
    group.text(Text::new(2.0, 10.0, size, Face::Narrow, ink, &plain("水位_\u{7}<&>\"")));
    group.text(Text::new(2.0, 15.0, size, Face::Narrow, ink, "Уровень 3 m\u{3a9}"));
    let marked = format!("{} = 3.5 \u{d7} 10{} m", italic("h"), raised("\u{2212}4"));
    group.text(Text::new(2.0, 20.0, size, Face::Narrow, ink, &marked).with_halo(style.color.hair));
    small(&style, 48.0, 23.0, group)
}
