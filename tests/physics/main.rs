//! The solver against closed forms, other methods and itself. One row per test; every comparison prints both numbers.
//!
//! | left | right | why they agree | tolerance | source |
//! |---|---|---|---|---|
//! | closed forms in `spread` | the same formulas in 30 digits | same formula | 1e-9 | named in each file |
//! | straight track, sheet solve | filament over an endless resistive sheet | plane of 400 (h + 1/lambda) | d = h/2: 1 %, h: 2 %, 2h: 6 % (band limit) | receding images |
//! | straight track, sheet solve | one-dimensional integral equation of an endless strip plane | same problem in its section | 1 % at d = h/2 | derived here |
//! | strip at DC | R = Rs L/W | uniform flow | 0.5 % | Ohm |
//! | round hole in a strip | 1 + a^2/y^2 | potential flow round a cylinder | 2 % two cells off | Lamb, Hydrodynamics |
//! | square, contacts at corners | Rs ln 2/pi | van der Pauw's theorem | 0.2 % | van der Pauw 1958 |
//! | two pads | R(D2) - R(D1) = (Rs/pi) ln(D2/D1) | two-point flow | 0.5 % | image method |
//! | divergence of a solution | its injections | Kirchhoff's current law | 1e-9 | - |
//! | port voltage times current | resistive loss | Poynting's theorem | 1e-6 | - |
//! | strip ground, edge of a wide plane at 1 GHz | conformal maps | perfect conductor | 2 % two cells off the edge | `spread::edge` |
//! | solve by projection | dense LU of branch currents and potentials | same discrete system | 1e-6 | faer |
//! | route by loops | route by projection | same discrete system | 1e-6 | - |
//! | operator by FFT | direct sum | same kernel | 1e-12 | - |
//! | band-limited kernel | square patches | both tend to 1/r | order 2 in 1/r | Hoer and Love 1965 |
//! | patch kernel | direct quadrature in 16 digits | same integral | 1e-9 | Ruehli 1972 |
//! | diagonal track over slot and antipads, cells h, 2h | cells h/4 | same problem | 3 %, 12 % (second order) | - |
//! | two sheets, shares at the middle of a track | limit k -> 0 of the pair of sheets | bonded at the ends | 0.01 of I | `spread::pair` |
//! | stripline at 1 GHz | image series | perfect planes | 0.01 of I, 2 % | Cohn 1954 |
//! | via pair, ring of vias | (mu0 s/pi) acosh(D/2a), geometric mean distance | images in two planes | 5 % | Paul 2010, Grover 1946 |
//! | bridges over a split | divider of 1 ohm and 1 nF | Kirchhoff | 2 % | - |
//! | steps with 2, 100, 400 vias, d and d/2 | each other | preconditioner | 1/4, 1/3 | - |
//! | densities on two sheets from 1 MHz | 2 x 2 system in wave numbers | bonded at the ends | 2 % + 0.2 % of the peak | derived here |
//! | loop inductance of a strip, edge-crowded | Hammerstad and Jensen L' | perfect plane | 2 % (even: 2.6 to 5.9 % more) | `spread::microstrip` |
//! | displacement between two plates | eps A/d, lambda/2 resonance | plate capacitor, parallel plates | 1e-4, 4 % | textbook |
//! | U-shaped track, share beyond the middle | endless resistive sheet | plane of five times the loop | 0.03 of I | derived, see `lines` |
//! | reduced basis | direct solves at 40 frequencies | same system | its bound, 1e-3 | reduced basis method |
//! | sums over spectral lines from a Gram matrix | explicit sum, lines solved directly | linear algebra | 1e-12, 1e-3 | - |
//! | Z_AB | Z_BA | Lorentz reciprocity | 1e-6 of sqrt abs(Z_AA Z_BB) | - |
//! | mutual inductance of strips | parallel, meeting, skew filaments; minus the image over a plane | Neumann's integral | 1e-6 (strips 1e-5) | Grover 1946; derived here |
//! | real part of a matrix of ten paths | positive | passivity | 1e-9 of the largest eigenvalue | - |
//! | bits with one thread | bits with many | fixed order of sums | equal | - |

#![allow(clippy::unwrap_used)] // a failed step of a test is a failed test
#![allow(clippy::needless_range_loop)] // indices are places on the grid

mod closed_form_edges;
// tables hold printed digits, some of which happen to be 1/pi
#[allow(clippy::approx_constant)]
mod closed_forms;
mod dc;
mod dense;
mod edges;
mod family;
mod gaps;
mod kernels;
mod lines;
mod mutual;
mod patches;
mod reciprocity;
mod sheets;
mod slot;
mod straight;
mod strip_plane;
mod support;
