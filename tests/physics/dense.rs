//! The whole discrete system written out and solved densely: branch currents and potentials together.
use crate::support::*;
use ebbmap::geom::Point;
use ebbmap::math::quadrature::legendre;
use ebbmap::sheet::{
    Drive, Gap, OperatingPoint, Patch, Problem, Sheet, Solution, SolveFailure, SourceStrip, System, Vertical,
    kernel,
};
use faer::Mat;
use faer::prelude::Solve;
use num_complex::Complex64;

/// A face of a sheet with its end cells.
struct Face {
    sheet: usize,
    along_y: bool,
    ix: usize,
    iy: usize,
}

/// Line integral of a filament's vector potential along a dual edge, 24 Gauss points.
fn flux(strip: &SourceStrip, middle: Point, towards: Point, d: f64, z: f64) -> f64 {
    let whole = strip.to - strip.from;
    let (l, dz) = (whole.length(), strip.z_m - z);
    let u = whole * (1.0 / l);
    let potential = |p: Point| {
        let o = p - strip.from;
        let (a, rho) = (o.dot(u), o.cross(u).hypot(dz));
        1e-7 * (((l - a) / rho).asinh() + (a / rho).asinh())
    };
    let points = legendre(24);
    u.dot(towards)
        * points.iter().map(|&(x, w)| w * d / 2.0 * potential(middle + towards * (x * d / 2.0))).sum::<f64>()
}

/// Largest difference of the solver's currents from the dense solution, relative to the largest current.
pub fn difference(problem: &Problem, drive: &Drive, point: &OperatingPoint, solution: &Solution) -> f64 {
    let (nx, ny, d) = (problem.grid.nx, problem.grid.ny, problem.grid.cell_m);
    let s = Complex64::new(0.0, 2.0 * std::f64::consts::PI * point.frequency_hz);
    let mut faces = Vec::new();
    for (sheet, data) in problem.sheets.iter().enumerate() {
        let copper = |ix: usize, iy: usize| data.copper[iy * nx + ix];
        for iy in 0..ny {
            for ix in 0..nx {
                if ix > 0
                    && copper(ix, iy)
                    && copper(ix - 1, iy)
                    && !data.cut_x.contains(&(iy * (nx + 1) + ix))
                {
                    faces.push(Face { sheet, along_y: false, ix, iy });
                }
                if iy > 0 && copper(ix, iy) && copper(ix, iy - 1) && !data.cut_y.contains(&(iy * nx + ix)) {
                    faces.push(Face { sheet, along_y: true, ix, iy });
                }
            }
        }
    }
    let (nf, nv, cells) = (faces.len(), problem.verticals.len(), problem.sheets.len() * nx * ny);
    // cells that face each other over a gap, none of the problems has a third sheet between
    let per_sheet = nx * ny;
    let facing: Vec<(usize, usize, usize, f64)> = problem
        .gaps
        .iter()
        .flat_map(|gap| {
            (0..per_sheet).map(move |cell| (gap.sheets.0, gap.sheets.1, cell, gap.farad_per_m2 * d * d))
        })
        .filter(|&(p, q, cell, _)| problem.sheets[p].copper[cell] && problem.sheets[q].copper[cell])
        .collect();
    let first = nf + nv + facing.len();
    // one node outside the board at most
    let n = first + cells + 1;
    let node_of = |sheet: usize, cell: usize| {
        first + if sheet == Patch::OUTSIDE { cells + cell } else { sheet * nx * ny + cell }
    };
    let whole: f64 = facing.iter().map(|f| f.3).sum();
    let leak = if facing.is_empty() || s.norm() == 0.0 { 1e-9 } else { 1e-9f64.min(1e-9 * s.norm() * whole) };
    let mut matrix = Mat::<Complex64>::zeros(n, n);
    let tables: Vec<Vec<Vec<f64>>> = problem
        .sheets
        .iter()
        .map(|p| problem.sheets.iter().map(|q| kernel::offsets(nx, ny, (p.z_m - q.z_m).abs() / d)).collect())
        .collect();
    for (a, p) in faces.iter().enumerate() {
        let zs = point.zs_ohm[p.sheet];
        matrix[(a, a)] += zs;
        for (b, q) in faces.iter().enumerate().filter(|(_, q)| q.along_y == p.along_y) {
            let (dx, dy) = (p.ix.abs_diff(q.ix), p.iy.abs_diff(q.iy));
            matrix[(a, b)] += s * (1e-7 * d * tables[p.sheet][q.sheet][dy * nx + dx]);
            if p.sheet == q.sheet && dx + dy == 1 {
                // neighbours along the current add, across subtract
                let along = (dx == 1) != p.along_y;
                let part = if along { zs / 24.0 } else { -zs / 24.0 };
                matrix[(a, b)] += part;
                matrix[(a, a)] -= part;
            }
        }
        // edges: -1/9 of mu0 d/2 where a side across the current has no neighbour, spread 1/4, 1/2, 1/4 along the edge
        let beside = |f: &Face, along: usize, side: i64| {
            let (x, y) =
                if f.along_y { (f.ix as i64 + side, f.iy + along) } else { ((f.ix + along) as i64, f.iy) };
            let y = if f.along_y { y as i64 } else { y as i64 + side };
            faces.iter().position(|g| {
                g.sheet == f.sheet && g.along_y == f.along_y && g.ix as i64 == x && g.iy as i64 == y
            })
        };
        let edge = s * (-1.0 / 9.0 * 2e-7 * std::f64::consts::PI * d);
        for side in [-1, 1] {
            if beside(p, 0, side).is_some() {
                continue;
            }
            matrix[(a, a)] += edge * 0.5;
            if let (Some(next), None) = (beside(p, 1, 0), beside(p, 1, side)) {
                matrix[(a, next)] += edge * 0.25;
                matrix[(next, a)] += edge * 0.25;
            }
        }
        let to = first + p.sheet * nx * ny + p.iy * nx + p.ix;
        let from = if p.along_y { to - nx } else { to - 1 };
        for (node, sign) in [(from, 1.0), (to, -1.0)] {
            matrix[(a, node)] -= sign;
            matrix[(node, a)] += sign;
        }
    }
    for (k, vertical) in problem.verticals.iter().enumerate() {
        let a = nf + k;
        let mut z = vertical.resistance_ohm + s * vertical.inductance_h;
        match vertical.capacitance_f {
            Some(farad) if point.frequency_hz > 0.0 => z += 1.0 / (s * farad),
            Some(_) => {
                matrix[(a, a)] = Complex64::new(1.0, 0.0);
                continue;
            }
            None => {}
        }
        matrix[(a, a)] = z;
        for (patch, sign) in [(&vertical.from, 1.0), (&vertical.to, -1.0)] {
            for &(cell, weight) in &patch.cells {
                let node = node_of(patch.sheet, cell);
                matrix[(a, node)] -= sign * weight;
                matrix[(node, a)] += sign * weight;
            }
        }
    }
    for (k, &(p, q, cell, farad)) in facing.iter().enumerate() {
        // admittance form, which holds at DC as well
        let a = nf + nv + k;
        matrix[(a, a)] = Complex64::new(-1.0, 0.0);
        for (sheet, sign) in [(p, 1.0), (q, -1.0)] {
            matrix[(a, node_of(sheet, cell))] += s * farad * sign;
            matrix[(node_of(sheet, cell), a)] += sign;
        }
    }
    let mut rhs = Mat::<Complex64>::zeros(n, 1);
    for (a, p) in faces.iter().enumerate() {
        let towards = if p.along_y { Point::new(0.0, 1.0) } else { Point::new(1.0, 0.0) };
        let middle = problem.grid.centre(p.ix, p.iy) - towards * (d / 2.0);
        let z = problem.sheets[p.sheet].z_m;
        rhs[(a, 0)] = -s * drive.strips.iter().map(|strip| flux(strip, middle, towards, d, z)).sum::<f64>();
    }
    for injection in &drive.injections {
        for &(cell, weight) in &injection.patch.cells {
            rhs[(node_of(injection.patch.sheet, cell), 0)] += weight * injection.current_a;
        }
    }
    // potentials are free by a constant on each piece: a tiny leak to ground from every cell holds them without
    // changing the currents, and cells without copper are held by it alone
    for node in first..n {
        matrix[(node, node)] += leak;
    }
    // islands that only gaps join have potentials far above the others': the leak must be far below the gaps
    let exact = matrix.partial_piv_lu().solve(&rhs);
    let mut worst: f64 = 0.0;
    let mut most: f64 = 0.0;
    for (a, p) in faces.iter().enumerate() {
        let got = if p.along_y {
            solution.jy[p.sheet][p.iy * nx + p.ix]
        } else {
            solution.jx[p.sheet][p.iy * (nx + 1) + p.ix]
        };
        worst = worst.max((got - exact[(a, 0)]).norm());
        most = most.max(exact[(a, 0)].norm());
    }
    for k in 0..nv {
        worst = worst.max((solution.verticals[k] - exact[(nf + k, 0)]).norm());
    }
    let mut through = vec![Complex64::default(); facing.len()];
    let displaced = solution.displacement.iter().enumerate().flat_map(|(gap, all)| {
        let (p, q) = problem.gaps[gap].sheets;
        let both = move |cell: &usize| problem.sheets[p].copper[*cell] && problem.sheets[q].copper[*cell];
        (0..all.len()).filter(both).map(|cell| all[cell])
    });
    through.iter_mut().zip(displaced).for_each(|(to, from)| *to = from);
    for (k, got) in through.iter().enumerate() {
        worst = worst.max((got - exact[(nf + nv + k, 0)]).norm());
    }
    worst / most
}

/// Two sheets with voids, a slot, a cut, an island of two sheets joined by verticals, a capacitor and a resistor.
fn board() -> (Problem, Drive) {
    let mut problem = plate(15, 13, 0.25e-3);
    problem.sheets.push(Sheet::new(vec![true; 15 * 13], -0.4e-3));
    cut_out(&mut problem, 0, |p| p.distance(Point::mm(0.9, 2.2)) < 0.4e-3);
    cut_out(&mut problem, 0, |p| (p.x - 1.9e-3).abs() < 0.2e-3 && p.y > 0.8e-3);
    cut_out(&mut problem, 1, |p| p.distance(Point::mm(2.6, 1.1)) < 0.5e-3);
    // the lower sheet is split all the way: two islands
    cut_out(&mut problem, 1, |p| (p.y - 2.1e-3).abs() < 0.13e-3);
    problem.sheets[0].cut_x = vec![3 * 16 + 5, 4 * 16 + 5, 5 * 16 + 5];
    problem.sheets[0].cut_y = vec![2 * 15 + 9, 2 * 15 + 10];
    let via = |at: Point, r: f64, l: f64, c: Option<f64>, problem: &Problem| Vertical {
        from: disc(problem, 0, at, 0.3e-3),
        to: disc(problem, 1, at, 0.3e-3),
        resistance_ohm: r,
        inductance_h: l,
        capacitance_f: c,
    };
    problem.verticals = vec![
        via(Point::mm(0.6, 0.6), 1e-3, 1e-10, None, &problem),
        via(Point::mm(3.2, 2.8), 2e-3, 1.5e-10, None, &problem),
        via(Point::mm(1.3, 2.8), 1e-3, 1e-10, None, &problem),
        via(Point::mm(1.4, 1.2), 5e-3, 5e-10, Some(10e-9), &problem),
    ];
    // a bridging part over the split of the lower sheet
    problem.verticals.push(Vertical {
        from: disc(&problem, 1, Point::mm(0.5, 1.7), 0.2e-3),
        to: disc(&problem, 1, Point::mm(0.5, 2.5), 0.2e-3),
        resistance_ohm: 1.0,
        inductance_h: 1e-9,
        capacitance_f: None,
    });
    let strips = vec![
        filament(Point::mm(0.4, 1.3), Point::mm(2.2, 1.6), 0.2e-3),
        filament(Point::mm(2.2, 1.6), Point::mm(3.3, 2.9), 0.2e-3),
    ];
    let injections = landings(
        disc(&problem, 0, Point::mm(0.4, 1.3), 0.25e-3),
        disc(&problem, 1, Point::mm(3.3, 2.9), 0.25e-3),
    );
    (problem, Drive { strips, injections })
}

#[test]
fn dense_direct_solve_agrees() {
    let (problem, drive) = board();
    let system = System::new(problem.clone()).unwrap();
    for f in [0.0, 1e3, 1e5, 1e7, 1e9] {
        let zs = vec![Complex64::new(0.5e-3, 0.1e-3 * f / 1e9), Complex64::new(1.0e-3, 0.3e-3 * f / 1e9)];
        let point = OperatingPoint { frequency_hz: f, zs_ohm: zs };
        let solution = solve(&system, &drive, &point, 1e-9);
        let off = difference(&problem, &drive, &point, &solution);
        println!("f {f:e}: {} steps, largest difference {off:.1e}", solution.steps);
        assert!(off < 1e-6, "f {f:e}: {off}");
    }
}

/// The same with the split sheet as a power plane that only a capacitor, a tie and the gap join.
#[test]
fn dense_direct_solve_agrees_with_plane_capacitance() {
    let (mut problem, mut drive) = board();
    problem.gaps = vec![Gap { sheets: (0, 1), farad_per_m2: 1.9e-7 }];
    // the upper island loses its barrels: only the bridge and the gap are left
    problem.verticals.remove(2);
    problem.verticals.remove(1);
    let power = disc(&problem, 1, Point::mm(3.3, 2.9), 0.25e-3);
    for bridge in [true, false] {
        if !bridge {
            // nothing conducts to the island any more, and the drive ends on it; at low frequency its potential is so
            // far above the others' that rounding spoils the dense solution
            problem.verticals.pop();
            drive.injections[0].patch = power.clone();
        }
        let system = System::new(problem.clone()).unwrap();
        for f in if bridge { vec![0.0, 1e4, 1e7, 1e9] } else { vec![1e8, 1e9] } {
            let point = at(f, Complex64::new(0.5e-3, 0.1e-3 * f / 1e9), 2);
            let solution = solve(&system, &drive, &point, 1e-9);
            let off = difference(&problem, &drive, &point, &solution);
            let displaced: Complex64 = solution.displacement[0].iter().sum();
            println!(
                "bridge {bridge}, f {f:e}: {} steps, off {off:.1e}, displaced {displaced:.6}",
                solution.steps
            );
            assert!(off < 1e-6, "f {f:e}: {off}");
            if bridge && f == 0.0 {
                assert_eq!(displaced.norm(), 0.0);
            }
        }
    }
    let system = System::new(problem).unwrap();
    let refused = system.solve(&drive, &at(0.0, Complex64::new(5e-4, 0.0), 2), 1e-6);
    assert!(matches!(refused, Err(SolveFailure::Unbalanced { .. })), "{refused:?}");
}

#[test]
fn landings_on_separate_copper_are_refused() {
    let mut problem = plate(20, 10, 0.2e-3);
    cut_out(&mut problem, 0, |p| (p.x - 2.1e-3).abs() < 0.15e-3);
    let system = System::new(problem.clone()).unwrap();
    let drive =
        Drive { strips: Vec::new(), injections: landings(cell(&problem, 0, 2, 3), cell(&problem, 0, 17, 3)) };
    match system.solve(&drive, &at(1e6, Complex64::new(5e-4, 0.0), 1), 1e-6) {
        Err(SolveFailure::Unbalanced { cells, current_a }) => {
            let islands = [cells.0 % 20 < 10, cells.1 % 20 < 10];
            assert!(islands[0] != islands[1], "{cells:?}");
            assert!((current_a.abs() - 1.0).abs() < 1e-12);
        }
        other => panic!("must be refused, got {other:?}"),
    }
    // copper in single cells only: nothing to factor, nothing to solve, no panic
    let mut crumbs = plate(9, 9, 0.2e-3);
    crumbs.sheets[0].copper = (0..81).map(|i| i % 9 % 2 == 0 && i / 9 % 2 == 0).collect();
    let apart = landings(cell(&crumbs, 0, 0, 0), cell(&crumbs, 0, 4, 4));
    let crumbs = System::new(crumbs).unwrap();
    let refused = crumbs.solve(
        &Drive { strips: Vec::new(), injections: apart },
        &at(1e6, Complex64::new(5e-4, 0.0), 1),
        1e-6,
    );
    assert!(matches!(refused, Err(SolveFailure::Unbalanced { .. })));
    // a landing on a void
    let drive = Drive {
        strips: Vec::new(),
        injections: landings(cell(&problem, 0, 10, 3), cell(&problem, 0, 17, 3)),
    };
    let refused = system.solve(&drive, &at(1e6, Complex64::new(5e-4, 0.0), 1), 1e-6);
    assert_eq!(refused.unwrap_err(), SolveFailure::NoCopper { index: 1 });
}

#[test]
fn source_flux_against_plain_quadrature() {
    let problem = plate(60, 50, 0.2e-3);
    let strips = [
        filament(Point::mm(2.0, 3.03), Point::mm(9.0, 6.5), 0.15e-3),
        filament(Point::mm(9.0, 6.5), Point::mm(9.0, 2.0), 0.15e-3),
    ];
    let got = ebbmap::sheet::source::flux(&problem, &strips);
    let (d, cells) = (0.2e-3, 60 * 50);
    let most = got.iter().fold(0.0, |m: f64, v| m.max(v.abs()));
    let mut worst: f64 = 0.0;
    for iy in 1..50 {
        for ix in 1..60 {
            for (direction, towards) in [Point::new(1.0, 0.0), Point::new(0.0, 1.0)].into_iter().enumerate() {
                let middle = problem.grid.centre(ix, iy) - towards * (d / 2.0);
                let exact: f64 = strips.iter().map(|s| flux(s, middle, towards, d, 0.0)).sum();
                worst = worst.max((got[direction * cells + iy * 60 + ix] - exact).abs() / most);
            }
        }
    }
    println!("largest difference {worst:.1e} of the largest flux");
    assert!(worst < 1e-6);
}

/// The route by loops (no verticals) against the route by projection (the same with one hopeless vertical).
#[test]
fn both_routes_agree() {
    let (mut problem, _) = board();
    problem.verticals.clear();
    let strips = vec![filament(Point::mm(0.4, 1.3), Point::mm(3.3, 0.6), 0.2e-3)];
    let landing = |at: Point| disc(&problem, 0, at, 0.25e-3);
    let drive =
        Drive { strips, injections: landings(landing(Point::mm(0.4, 1.3)), landing(Point::mm(3.3, 0.6))) };
    let loops = System::new(problem.clone()).unwrap();
    let nothing = Vertical {
        from: cell(&problem, 0, 14, 12),
        to: cell(&problem, 1, 14, 12),
        resistance_ohm: 1e5,
        inductance_h: 0.0,
        capacitance_f: None,
    };
    problem.verticals.push(nothing);
    let projection = System::new(problem.clone()).unwrap();
    // high enough for loops to be chosen
    for f in [1e6, 1e7, 1e9] {
        let point = at(f, Complex64::new(0.5e-3, 0.0), 2);
        let (a, b) = (solve(&loops, &drive, &point, 1e-9), solve(&projection, &drive, &point, 1e-9));
        let pairs = a.jx.iter().zip(&b.jx).chain(a.jy.iter().zip(&b.jy)).flat_map(|(a, b)| a.iter().zip(b));
        let worst = pairs.map(|(a, b)| (a - b).norm()).fold(0.0, f64::max);
        let impedance = (a.sheet_impedance_ohm - b.sheet_impedance_ohm).norm() / a.sheet_impedance_ohm.norm();
        println!(
            "f {f:e}: {} and {} steps, currents {worst:.1e}, impedance {impedance:.1e}",
            a.steps, b.steps
        );
        assert!(worst < 1e-6 && impedance < 1e-6);
    }
}
