//! The branches of a problem: conducting faces and verticals, their nodes, and the sparse operators on them.
//!
//! A vector of branch currents holds for each sheet nx * ny x-faces (index iy * nx + ix is the face between cells
//! (ix - 1, iy) and (ix, iy)), then nx * ny y-faces (between (ix, iy - 1) and (ix, iy)), then one value for each
//! vertical, then one for each pair of facing cells of each gap. Faces that do not conduct are always zero. Currents in
//! A, positive towards rising index.
//!
//! Model: divergence (D i)_n = current that leaves node n; resistance of a face
//! Zs (1 + (d_xx - d_yy)/24) on x-faces, signs exchanged on y-faces, second differences between conducting faces only:
//! a face flux stands for the average across the face, the EMF needs the average along the dual edge.
//! Edges: on a half-plane of cells the band-limited kernel has the symbol (mu0 d/2)/|1 - z| across the edge, whose
//! Wiener-Hopf solution (1 - z)^{-1/2} puts the edge a quarter of a cell inside the copper: 4.6 % too much in the third
//! cell. A part e of mu0 d/2 added to the inductance of the outermost face changes it to (1 - z)^{-1/2} - b (1 - z)^{1/2},
//! b = e/(1 + e). e = -1/5 puts the edge on the rim at last, but leaves -4 % in the third cell; e = -1/9 halves the
//! shift and keeps every cell from the third on within 0.9 % of the mean of 1/sqrt(pi u). Smoothed along the edge by
//! 1/4, 1/2, 1/4, which keeps narrow necks positive.
//!
//! Source: resistance by Taylor expansion, edge by the Wiener-Hopf method, both derived here; checked against the
//! closed forms of the resistive sheet and of perfect strips.
//!
//! Checked by: `ground_plane_of_finite_width`, `straight_track_on_a_resistive_sheet` and `dense_direct_solve_agrees` in tests/physics.

use super::{Gap, Patch, Problem, SolveFailure, Vertical};
use crate::math::real::Real;
use num_complex::Complex;

/// Mark of a cell without copper.
pub const NO_NODE: u32 = u32::MAX;

/// Numbering of faces, verticals and nodes.
#[derive(Debug)]
pub struct Branches {
    /// Columns of the grid.
    pub nx: usize,
    /// Rows of the grid.
    pub ny: usize,
    /// Number of sheets.
    pub sheets: usize,
    /// Which faces conduct, in the order of a vector of branch currents.
    pub conducts: Vec<bool>,
    /// Node of each cell of each sheet, [`NO_NODE`] without copper.
    pub node: Vec<u32>,
    /// Number of nodes: copper cells of all sheets, then those outside the board.
    pub nodes: usize,
    /// Number of copper cells of all sheets.
    pub copper_nodes: usize,
    /// For each vertical the nodes it touches with what leaves them for 1 A.
    pub ends: Vec<Vec<(u32, f64)>>,
    /// Capacitors between facing cells: their two nodes and capacitance in F, gap by gap in rising order of cells.
    pub facing: Vec<(u32, u32, f64)>,
    /// For each gap its cells in the order of `facing`.
    pub gap_cells: Vec<Vec<u32>>,
    /// Weights of the faces' own currents in their resistive voltages.
    resistive: Vec<f64>,
    /// Symmetric edge terms: two faces and a weight, to be multiplied by [`EDGE_PART`] mu0 d/2.
    edges: Vec<(u32, u32, f64)>,
}

/// Part of mu0 d/2 by which the inductance of the outermost face along an edge differs from that of others.
pub const EDGE_PART: f64 = -1.0 / 9.0;

impl Branches {
    /// Numbers the branches of `problem`.
    pub fn new(problem: &Problem) -> Result<Self, SolveFailure> {
        let (nx, ny) = (problem.grid.nx, problem.grid.ny);
        let sheets = problem.sheets.len();
        let mut conducts = Vec::with_capacity(2 * sheets * nx * ny);
        let mut node = Vec::with_capacity(sheets * nx * ny);
        let mut nodes = 0;
        for sheet in &problem.sheets {
            let (along_x, along_y) = sheet.conducting_faces(&problem.grid);
            for iy in 0..ny {
                conducts.extend_from_slice(&along_x[iy * (nx + 1)..iy * (nx + 1) + nx]);
            }
            conducts.extend_from_slice(&along_y[..nx * ny]);
            for &copper in &sheet.copper {
                node.push(if copper { nodes } else { NO_NODE });
                nodes += u32::from(copper);
            }
        }
        let edges = edge_terms(nx, ny, &conducts);
        let resistive = own_weights(nx, ny, &conducts);
        let ends = problem.verticals.iter().flat_map(|vertical| [&vertical.from, &vertical.to]);
        let outside = ends.filter(|patch| patch.sheet == Patch::OUTSIDE).flat_map(|patch| &patch.cells);
        let copper_nodes = nodes as usize;
        let nodes = copper_nodes + outside.map(|(node, _)| node + 1).max().unwrap_or(0);
        let unknown_sheet = |gap: &Gap| gap.sheets.0.max(gap.sheets.1) >= sheets;
        if let Some(index) = problem.gaps.iter().position(unknown_sheet) {
            return Err(SolveFailure::NoCopper { index: problem.verticals.len() + index });
        }
        let (gap_cells, facing) = facing_cells(problem, &node);
        let mut branches = Self {
            nx,
            ny,
            sheets,
            conducts,
            node,
            nodes,
            copper_nodes,
            ends: Vec::new(),
            facing,
            gap_cells,
            resistive,
            edges,
        };
        let ends =
            problem.verticals.iter().enumerate().map(|(index, vertical)| branches.ends_of(vertical, index));
        branches.ends = ends.collect::<Result<_, _>>()?;
        Ok(branches)
    }

    fn ends_of(&self, vertical: &Vertical, index: usize) -> Result<Vec<(u32, f64)>, SolveFailure> {
        let mut ends = self.on_nodes(&vertical.from, index)?;
        ends.extend(self.on_nodes(&vertical.to, index)?.into_iter().map(|(node, weight)| (node, -weight)));
        Ok(ends)
    }

    /// A patch as nodes and weights that sum to 1; cells without copper are left out and the rest takes their part.
    pub fn on_nodes(&self, patch: &Patch, index: usize) -> Result<Vec<(u32, f64)>, SolveFailure> {
        let cells = self.nx * self.ny;
        if patch.sheet == Patch::OUTSIDE {
            let there = |&(node, weight): &(usize, f64)| ((self.copper_nodes + node) as u32, weight);
            let all: Vec<(u32, f64)> = patch.cells.iter().map(there).collect();
            let exists = all.iter().all(|(node, _)| (*node as usize) < self.nodes);
            return if exists && !all.is_empty() { Ok(all) } else { Err(SolveFailure::NoCopper { index }) };
        }
        let on_copper: Vec<(u32, f64)> = patch
            .cells
            .iter()
            .filter(|&&(cell, weight)| cell < cells && patch.sheet < self.sheets && weight != 0.0)
            .map(|&(cell, weight)| (self.node[patch.sheet * cells + cell], weight))
            .filter(|&(node, _)| node != NO_NODE)
            .collect();
        let sum: f64 = on_copper.iter().map(|(_, weight)| weight).sum();
        if on_copper.is_empty() || sum.is_nan() || sum <= 0.0 {
            return Err(SolveFailure::NoCopper { index });
        }
        Ok(on_copper.into_iter().map(|(node, weight)| (node, weight / sum)).collect())
    }

    /// Number of cells of the grid.
    pub fn cells(&self) -> usize {
        self.nx * self.ny
    }

    /// Number of values of all faces.
    pub fn faces(&self) -> usize {
        self.conducts.len()
    }

    /// Number of values of a vector of branch currents.
    pub fn len(&self) -> usize {
        self.faces() + self.ends.len() + self.facing.len()
    }

    /// Where the values of the verticals end and those of the gaps begin.
    pub fn first_gap(&self) -> usize {
        self.faces() + self.ends.len()
    }

    /// Range of the x-faces (direction 0) or y-faces (direction 1) of a sheet.
    pub fn plane(&self, sheet: usize, direction: usize) -> std::ops::Range<usize> {
        let first = (2 * sheet + direction) * self.cells();
        first..first + self.cells()
    }

    /// Calls `visit(branch, from node, to node)` for every conducting face in rising order.
    pub fn each_face(&self, mut visit: impl FnMut(usize, usize, usize)) {
        let cells = self.cells();
        for sheet in 0..self.sheets {
            for (direction, step) in [(0, 1), (1, self.nx)] {
                let first = self.plane(sheet, direction).start;
                for cell in 0..cells {
                    if self.conducts[first + cell] {
                        let to = sheet * cells + cell;
                        visit(first + cell, self.node[to - step] as usize, self.node[to] as usize);
                    }
                }
            }
        }
    }

    /// Current that leaves each node.
    pub fn divergence<T: Real>(&self, currents: &[Complex<T>]) -> Vec<Complex<T>> {
        let mut leaves = vec![Complex::new(T::zero(), T::zero()); self.nodes];
        self.each_face(|branch, from, to| {
            leaves[from] += currents[branch];
            leaves[to] -= currents[branch];
        });
        for (ends, current) in self.ends.iter().zip(&currents[self.faces()..]) {
            ends.iter().for_each(|&(node, weight)| leaves[node as usize] += current * T::of(weight));
        }
        for (&(from, to, _), current) in self.facing.iter().zip(&currents[self.first_gap()..]) {
            leaves[from as usize] += current;
            leaves[to as usize] -= current;
        }
        leaves
    }

    /// Subtracts from `emf` the potential differences along the branches, `emf - scale D^T potential`; `inverse_weight`
    /// multiplies those of the verticals and leaves gaps alone.
    pub fn subtract_gradient<T: Real>(
        &self,
        potential: &[Complex<T>],
        inverse_weight: Option<&[f64]>,
        emf: &mut [Complex<T>],
    ) {
        self.each_face(|branch, from, to| emf[branch] -= potential[from] - potential[to]);
        let faces = self.faces();
        for (index, ends) in self.ends.iter().enumerate() {
            let drop: Complex<T> =
                ends.iter().map(|&(node, weight)| potential[node as usize] * T::of(weight)).sum();
            emf[faces + index] -= drop * T::of(inverse_weight.map_or(1.0, |weights| weights[index]));
        }
        if inverse_weight.is_none() {
            let gaps = self.first_gap();
            for (&(from, to, _), voltage) in self.facing.iter().zip(&mut emf[gaps..]) {
                *voltage -= potential[from as usize] - potential[to as usize];
            }
        }
    }

    /// Adds the edge terms, `out += factor weight currents`; `factor` is s [`EDGE_PART`] mu0 d/2 in ohm.
    pub fn add_edges<T: Real>(&self, factor: Complex<T>, currents: &[Complex<T>], out: &mut [Complex<T>]) {
        for &(a, b, weight) in &self.edges {
            let (a, b) = (a as usize, b as usize);
            let factor = factor * T::of(weight);
            out[a] += factor * currents[b];
            if a != b {
                out[b] += factor * currents[a];
            }
        }
    }

    /// Adds the resistive voltages of one plane of faces, `out += zs (1 +- (d_xx - d_yy)/24) currents`.
    pub fn add_resistive<T: Real>(
        &self,
        sheet: usize,
        direction: usize,
        zs: Complex<T>,
        currents: &[Complex<T>],
        out: &mut [Complex<T>],
    ) {
        // faces that do not conduct carry nothing, so that only the centre's weight depends on the neighbours
        let (nx, ny) = (self.nx, self.ny);
        let centre = &self.resistive[self.plane(sheet, direction)];
        let part = zs * T::of(if direction == 0 { 1.0 } else { -1.0 } / 24.0);
        let nothing = vec![Complex::new(T::zero(), T::zero()); nx];
        for iy in 0..ny {
            let row = iy * nx..(iy + 1) * nx;
            let here = &currents[row.clone()];
            let below = if iy > 0 { &currents[row.start - nx..row.start] } else { &nothing };
            let above = if iy + 1 < ny { &currents[row.end..row.end + nx] } else { &nothing };
            let (centre, out) = (&centre[row.clone()], &mut out[row]);
            for ix in 0..nx {
                let left = if ix > 0 { here[ix - 1] } else { nothing[0] };
                let right = if ix + 1 < nx { here[ix + 1] } else { nothing[0] };
                let value = zs * here[ix] * T::of(centre[ix]) + part * (left + right - above[ix] - below[ix]);
                // zero marks a face that does not conduct
                out[ix] += if centre[ix] == 0.0 { nothing[0] } else { value };
            }
        }
    }
}

/// A capacitor of a gap: its two nodes and its capacitance in farad.
type Facing = (u32, u32, f64);

/// For each gap its cells, and the capacitors between the nodes there.
fn facing_cells(problem: &Problem, node: &[u32]) -> (Vec<Vec<u32>>, Vec<Facing>) {
    let cells = problem.grid.len();
    let area = problem.grid.cell_m * problem.grid.cell_m;
    let (mut gap_cells, mut facing) = (Vec::new(), Vec::new());
    for gap in &problem.gaps {
        let (from, to) = gap.sheets;
        let (low, high) = (problem.sheets[from].z_m, problem.sheets[to].z_m);
        let (low, high) = (low.min(high), low.max(high));
        let between: Vec<usize> = (0..problem.sheets.len())
            .filter(|&p| p != from && p != to && problem.sheets[p].z_m > low && problem.sheets[p].z_m < high)
            .collect();
        let mut here = Vec::new();
        for cell in 0..cells {
            let (a, b) = (node[from * cells + cell], node[to * cells + cell]);
            let hidden = between.iter().any(|&p| problem.sheets[p].copper[cell]);
            if a != NO_NODE && b != NO_NODE && a != b && !hidden && gap.farad_per_m2 > 0.0 {
                here.push(cell as u32);
                facing.push((a, b, gap.farad_per_m2 * area));
            }
        }
        gap_cells.push(here);
    }
    (gap_cells, facing)
}

/// Weight of a face's own current in its resistive voltage: 1 less 1/24 for each neighbour along and plus 1/24 for each
/// across the current; zero for faces that do not conduct.
fn own_weights(nx: usize, ny: usize, conducts: &[bool]) -> Vec<f64> {
    let mut weights = vec![0.0; conducts.len()];
    for (plane, (faces, weights)) in
        conducts.chunks_exact(nx * ny).zip(weights.chunks_exact_mut(nx * ny)).enumerate()
    {
        let sign = if plane % 2 == 0 { 1.0 } else { -1.0 };
        for (at, weight) in weights.iter_mut().enumerate().filter(|(at, _)| faces[*at]) {
            let (ix, iy) = (at % nx, at / nx);
            let count = |exists: bool, at: usize| f64::from(u8::from(exists && faces[at]));
            let along_x = count(ix > 0, at.wrapping_sub(1)) + count(ix + 1 < nx, at + 1);
            let along_y = count(iy > 0, at.wrapping_sub(nx)) + count(iy + 1 < ny, at + nx);
            *weight = 1.0 - sign * (along_x - along_y) / 24.0;
        }
    }
    weights
}

/// Weights of the faces along edges: 1/2 on an outermost face for each side that has no neighbour, 1/4 between two that
/// follow each other along the same edge.
fn edge_terms(nx: usize, ny: usize, conducts: &[bool]) -> Vec<(u32, u32, f64)> {
    let mut terms = Vec::new();
    for (plane, faces) in conducts.chunks_exact(nx * ny).enumerate() {
        let first = plane * nx * ny;
        let along_x = plane % 2 == 0;
        // whether a conducting face has no neighbour on one side across the current
        let outermost = |ix: usize, iy: usize, up: bool| {
            let at = iy * nx + ix;
            let (place, count, step) = if along_x { (iy, ny, nx) } else { (ix, nx, 1) };
            faces[at]
                && match up {
                    true => place + 1 == count || !faces[at + step],
                    false => place == 0 || !faces[at - step],
                }
        };
        for iy in 0..ny {
            for ix in 0..nx {
                let at = iy * nx + ix;
                for up in [false, true] {
                    if !outermost(ix, iy, up) {
                        continue;
                    }
                    terms.push(((first + at) as u32, (first + at) as u32, 0.5));
                    let (next_x, next_y) = if along_x { (ix + 1, iy) } else { (ix, iy + 1) };
                    if next_x < nx && next_y < ny && outermost(next_x, next_y, up) {
                        terms.push(((first + at) as u32, (first + next_y * nx + next_x) as u32, 0.25));
                    }
                }
            }
        }
    }
    terms
}
