//! The closed-form kernel of square patches: a second implementation of the magnetic coupling, for comparison only.
//!
//! G(i, j, z) = four-fold integral of 1/r over two unit squares, second differences of F with F_xxyy = 1/r.
//! Source: Hoer and Love, J. Res. NBS 69C, 1965; Ruehli, IBM J. Res. Dev. 16, 1972 (from memory).

fn f(x: f64, y: f64, z: f64) -> f64 {
    let r = (x * x + y * y + z * z).sqrt();
    let part = |u: f64, v: f64| {
        let root = u.hypot(z);
        // u^2 - z^2 vanishes faster than asinh grows where both are zero
        if root == 0.0 || v == 0.0 { 0.0 } else { 0.5 * v * (u * u - z * z) * (v / root).asinh() }
    };
    let angle = if z == 0.0 { 0.0 } else { x * y * z * (x * y / (z * r)).atan() };
    part(y, x) + part(x, y) - r / 6.0 * (x * x + y * y - 2.0 * z * z) - angle
}

/// Kernel between unit squares (i, j) apart in the plane and z apart in height, in cells.
pub fn patch(i: f64, j: f64, z: f64) -> f64 {
    let r2 = i * i + j * j;
    let r = (r2 + z * z).sqrt();
    if r > 20.0 {
        let flat = 1.0 / (120.0 * r.powi(5)) + 7.0 / 48.0 * i * i * j * j / r.powi(9);
        return 1.0 / r
            + (1.0 / r.powi(3) - 3.0 * z * z / r.powi(5)) / 12.0
            + if z == 0.0 { flat } else { 0.0 };
    }
    let mut sum = 0.0;
    for (a, wa) in [(-1.0, 1.0), (0.0, -2.0), (1.0, 1.0)] {
        for (b, wb) in [(-1.0, 1.0), (0.0, -2.0), (1.0, 1.0)] {
            sum += wa * wb * f(i + a, j + b, z);
        }
    }
    sum
}

#[test]
fn patch_kernel_values() {
    // direct two-dimensional quadrature of the same integral in 30 digits
    let table = [
        (0.0, 0.0, 0.0, 2.97320959824738),
        (1.0, 0.0, 0.0, 1.11212868984901),
        (1.0, 1.0, 0.0, 0.748952218549366),
        (2.0, 1.0, 0.0, 0.455294927661925),
        (3.0, 3.0, 0.0, 0.236827059493424),
        (0.0, 0.0, 0.5, 1.41522456699333),
        (1.0, 2.0, 0.5, 0.4426815838557),
        (0.0, 0.0, 1.0, 0.878814495854183),
        (3.0, 2.0, 1.0, 0.268538584831409),
        (0.0, 0.0, 2.0, 0.48109532348896),
        (3.0, 3.0, 2.0, 0.213567696177144),
    ];
    for (i, j, z, expected) in table {
        crate::support::close(&format!("patches {i} {j} {z}"), patch(i, j, z), expected, 1e-9);
    }
    let own = 4.0 * (1.0 + 2f64.sqrt()).ln() - 4.0 / 3.0 * (2f64.sqrt() - 1.0);
    crate::support::close("own", patch(0.0, 0.0, 0.0), own, 1e-13);
    // where the far form takes over both must agree
    for (i, j) in [(20.0, 3.0), (15.0, 15.0), (20.0, 0.5)] {
        let near = {
            let mut sum = 0.0;
            for (a, wa) in [(-1.0, 1.0), (0.0, -2.0), (1.0, 1.0)] {
                for (b, wb) in [(-1.0, 1.0), (0.0, -2.0), (1.0, 1.0)] {
                    sum += wa * wb * f(i + a, j + b, 0.0);
                }
            }
            sum
        };
        crate::support::close("far form", patch(i, j, 0.0), near, 1e-9);
    }
}
