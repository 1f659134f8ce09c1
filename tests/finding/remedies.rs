//! Remedies keep what they promise when the board is changed by hand and solved afresh on smaller cells.

use crate::scene::{Scene, band, rectangle, solved_path};
use ebbmap::field::Workshop;
use ebbmap::figure::chart;
use ebbmap::finding::{Cause, Finding, Grade, MapEvidence, Measured, PlaneEvidence, Trials, of_path};
use ebbmap::geom::Point;
use ebbmap::plan::Plan;
use ebbmap::review::limit::Limits;
use ebbmap::review::{Model, Review};

/// The findings of a scene's path in one band, remedies tried.
fn findings(scene: &Scene, hertz: f64, limits: Limits) -> Vec<Finding> {
    let board = scene.board();
    let plan = Plan { paths: vec![scene.net()], bands: vec![band(hertz)], ..Plan::default() };
    let mut review = Review::default();
    review.limits.all = limits;
    let workshop = Workshop::new(&board, &plan, Model::Sheet);
    let bench = workshop.bench(&plan.paths[0]);
    let charted = chart(&bench, &plan.paths[0], &band(hertz), hertz).planes.remove(0).unwrap();
    let map = MapEvidence {
        band: charted.band.clone(),
        frequency_hz: hertz,
        figures: charted.figures.clone(),
        effects: charted.effects.clone(),
    };
    let evidence =
        [PlaneEvidence { number: 1, path: &plan.paths[0], chart: &bench.charts()[0], maps: vec![map] }];
    let trials = Trials { board: &board, plan: &plan, review: &review, path: 0, charts: bench.charts() };
    let judged = of_path(&evidence, Vec::new(), &trials);
    assert_eq!(judged.messages, []);
    judged.findings
}

fn slotted(cell: f64) -> Scene {
    Scene { voids: vec![rectangle(19.6, 10.0, 20.4, 18.0)], cell, ..Scene::default() }
}

fn extra_inductance_h(scene: &Scene, hertz: f64) -> f64 {
    let plan = Plan { paths: vec![scene.net()], ..Plan::default() };
    let charted = solved_path(&scene.board(), &plan, Model::Sheet, hertz).planes.remove(0).unwrap();
    charted.figures.extra_loop_inductance_h.unwrap().value.unwrap()
}

#[test]
fn a_remedy_keeps_its_promise() {
    let limits = Limits { extra_inductance_h: 0.5e-9, ..Limits::default() };
    let found = findings(&slotted(0.4), 1e7, limits);
    let finding = &found[0];
    println!("{}\n{}\n{:?}", finding.sentence, finding.cause_text, finding.remedy);
    assert_eq!((finding.code.name, finding.grade), ("return-detour", Grade::Fail));
    assert_eq!(finding.cause, Cause::Void("void 0".into()));
    assert!(finding.place.at.distance(Point::mm(20.0, 15.0)) < 1e-3);
    let remedy = finding.remedy.as_ref().unwrap();
    assert_eq!(remedy.tried.len(), 3, "filled, bridged and shortened: {:?}", remedy.tried);
    assert!(remedy.action.starts_with("fill void `void 0`"), "{}", remedy.action);
    // by hand: the board without the slot against that with it, on cells of half the size
    let gain = extra_inductance_h(&slotted(0.2), 1e7)
        - extra_inductance_h(&Scene { voids: vec![], ..slotted(0.2) }, 1e7);
    println!("promised {}, afresh {gain}", remedy.gain());
    assert!((remedy.gain() / gain - 1.0).abs() < 0.1, "promised {}, afresh {gain}", remedy.gain());
    // the bridge: the slot in two pieces with copper 1.2 mm wide (6h) between them
    let (_, promised) = remedy.tried.iter().find(|tried| tried.0.starts_with("bridge")).unwrap();
    let halves = vec![rectangle(19.6, 10.0, 20.4, 14.4), rectangle(19.6, 15.6, 20.4, 18.0)];
    let gain = extra_inductance_h(&slotted(0.2), 1e7)
        - extra_inductance_h(&Scene { voids: halves, ..slotted(0.2) }, 1e7);
    println!("bridge: promised {promised}, afresh {gain}");
    assert!((promised / gain - 1.0).abs() < 0.1, "promised {promised}, afresh {gain}");
}

#[test]
fn a_track_is_moved_off_the_edge() {
    let y = 29.7;
    let track = vec![(5.0, 24.0), (8.0, y), (32.0, y), (35.0, 24.0)];
    let scene = Scene { track, cell: 0.2, ..Scene::default() };
    let found = findings(&scene, 1e8, Limits::default());
    let finding = found.iter().find(|finding| finding.code.name == "plane-edge").unwrap();
    println!("{}\n{}\n{:?}", finding.sentence, finding.cause_text, finding.remedy);
    assert_eq!((finding.grade, finding.excess.what), (Grade::Fail, Measured::EdgeDensity));
    assert!((finding.place.at.y * 1e3 - y).abs() < 1e-6 && (finding.place.at.x * 1e3 - 20.0).abs() < 8.0);
    let remedy = finding.remedy.as_ref().unwrap();
    assert!(remedy.action.contains("2.4 mm"), "the largest of the steps gains most: {}", remedy.action);
    assert!(remedy.after < 0.1 * remedy.before);
    assert_eq!(remedy.tried.len(), 3);
}

#[test]
fn within_the_limits_nothing_is_tried() {
    let limits =
        Limits { extra_inductance_h: 1e-6, extra_path_m: 1.0, share_drop: 10.0, ..Limits::default() };
    assert_eq!(findings(&slotted(0.4), 1e7, limits), []);
}
