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
//! | Z_AB | Z_BA | Lorentz reciprocity | 1e-6 of sqrt abs(Z_AA Z_BB) | - |
//! | bits with one thread | bits with many | fixed order of sums | equal | - |

mod closed_form_edges;
mod closed_forms;
mod dc;
mod dense;
mod edges;
mod kernels;
mod patches;
mod reciprocity;
mod slot;
mod straight;
mod strip_plane;
mod support;
