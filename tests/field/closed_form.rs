//! The closed form on cells, and the figures of fields that are known.

use crate::scene::{Scene, solved_path};
use ebbmap::figure::{Charted, section};
use ebbmap::geom::Point;
use ebbmap::review::Model;

fn spread(scene: &Scene) -> Charted {
    solved_path(&scene.board(), &scene.plan(), Model::Spread, 1e7).planes.remove(0).unwrap()
}

#[test]
fn closed_form_integrates_to_the_strip_shares() {
    // Source: shares of a uniform strip over an endless perfect plane, w/h and n of the table of the image formula:
    // (w/h, share within 1, 2, 3, 5, 10 h).
    let table = [
        (0.5, [0.496684734, 0.703766947, 0.794768151, 0.874235854, 0.936535959]),
        (1.0, [0.486766518, 0.700511603, 0.793556364, 0.873939588, 0.936496883]),
        (2.0, [0.448682765, 0.686600854, 0.788480805, 0.872730255, 0.93633972]),
        (5.0, [0.298813593, 0.564827236, 0.739615153, 0.862988776, 0.93519937]),
    ];
    for (ratio, shares) in table {
        let scene = Scene { track_width: 0.2 * ratio, cell: 0.1, ..Scene::default() };
        let within: Vec<f64> = [1.0, 2.0, 3.0, 5.0, 10.0].iter().map(|n| n * 0.2e-3).collect();
        let map = spread(&scene).map;
        let found = section::shares(&map, Point::mm(20.0, 15.0), Point::new(1.0, 0.0), &within);
        for (found, share) in found.iter().zip(shares) {
            assert!((found - share).abs() < 1e-9, "w/h {ratio}: {found} against {share}");
        }
    }
}

#[test]
fn figures_of_the_closed_form() {
    // Filament: 79.5167 % within 3h; half-widths h tan(p pi/2) = 1, 3.0777, 12.7062 h. Cells of h/2: the ends of the
    // half-widths lie inside cells, where the flux is linear, hence 0.5 %.
    let charted = spread(&Scene { track_width: 1e-5, cell: 0.1, ..Scene::default() });
    let figures = &charted.figures;
    assert!((figures.share_3h.value.unwrap() - 0.795167235).abs() < 1e-6, "{:?}", figures.share_3h);
    for (half, exact) in figures.half_width_m.iter().zip([1.0, 3.07768354, 12.7062047]) {
        let found = half.value.unwrap() / 0.2e-3;
        assert!((found / exact - 1.0).abs() < 5e-3, "{found} against {exact}");
        assert!(half.error >= 0.0 && half.error < 0.03 * half.value.unwrap(), "{half:?}");
    }
    // |K| inside the p contour is p of the whole: K falls with distance, so the level is the density at the edge of
    // the central part, K0/(1 + (X/h)^2) with atan(X/h)/atan(15 mm/h) = p on a plane 30 mm wide.
    let all = (15.0f64 / 0.2).atan();
    for (level, part) in figures.contour_levels.iter().zip([0.5, 0.8, 0.95]) {
        let edge = (part * all).tan();
        let exact = 1.0 / (std::f64::consts::PI * 0.2e-3 * (1.0 + edge * edge));
        assert!((level / exact - 1.0).abs() < 0.1, "{level} against {exact}");
    }
    let path = figures.extra_path_m.unwrap();
    assert_eq!(path.value, Some(0.0));
}

#[test]
fn a_diagonal_track_has_the_same_figures() {
    let track = vec![(6.0, 5.0), (31.0, 24.0)];
    let charted = spread(&Scene { track, track_width: 0.4, cell: 0.1, ..Scene::default() });
    let share = charted.figures.share_3h.value.unwrap();
    assert!((share - 0.788480805).abs() < 2e-3, "{share}");
}

#[test]
fn no_current_is_lost_at_a_bend() {
    // The closed form divides nothing: what passes a section before a bend passes one behind it.
    let track = vec![(5.0, 8.0), (20.0, 8.0), (20.0, 25.0)];
    let map = spread(&Scene { track, cell: 0.1, ..Scene::default() }).map;
    let share = |x: f64, y: f64, along: Point| section::shares(&map, Point::mm(x, y), along, &[0.6e-3])[0];
    let before = share(12.0, 8.0, Point::new(1.0, 0.0));
    let behind = share(20.0, 15.0, Point::new(0.0, 1.0));
    assert!((before - behind).abs() < 1e-9);
    // Divergence of whole cells round the outer side of the bend.
    let grid = map.grid;
    for iy in 40..75 {
        for ix in 205..240 {
            let (left, low) = (iy * (grid.nx + 1) + ix, iy * grid.nx + ix);
            let out = map.jx[left + 1] - map.jx[left] + map.jy[low + grid.nx] - map.jy[low];
            assert!(out.norm() < 2e-4, "cell {ix} {iy}: {out}");
        }
    }
}

#[test]
fn a_short_track_has_no_share() {
    let charted = spread(&Scene { track: vec![(5.0, 5.0), (6.9, 5.0)], ..Scene::default() });
    assert_eq!(charted.figures.share_3h.value, None);
    assert_eq!(charted.figures.worst_share_3h, None);
}
