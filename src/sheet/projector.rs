//! Projection of branch currents on those that conserve current, by one sparse Cholesky factor.
//!
//! Model: with D the divergence and W positive weights of the branches (1 on faces), the graph Laplacian
//! Lap = D W^-1 D^T of all sheets and verticals together is factored once. P i = i - W^-1 D^T Lap^-1 D i conserves
//! current; its transpose takes the potential differences out of voltages. One node of each connected piece of copper
//! is held at zero, which changes nothing as the net current of a piece is zero.
//!
//! Source: null-space projection for constrained conjugate gradients (Gould, Hribar and Nocedal, SIAM J. Sci. Comput.
//! 23, 2001, from memory); factor by `faer` on one thread, so that the bits do not depend on the number of threads.
//!
//! Checked by: `current_is_conserved_and_power_is_dissipated` and `dense_direct_solve_agrees` in tests/physics.

use super::SolveFailure;
use super::branches::Branches;
use faer::dyn_stack::{MemBuffer, MemStack};
use faer::sparse::linalg::SupernodalThreshold;
use faer::sparse::linalg::cholesky::{
    CholeskySymbolicParams, SymbolicCholesky, SymbolicCholeskyRaw, SymmetricOrdering,
    factorize_symbolic_cholesky, supernodal::SupernodalLltRef,
};
use faer::sparse::{SparseColMat, Triplet};
use faer::{Par, Side};
use num_complex::Complex64;

/// Mark of a node that is held at zero.
const HELD: u32 = u32::MAX;

/// A factored graph Laplacian with its weights.
pub struct Projector {
    /// Inverse weight of each vertical; zero takes it out of the circuit.
    pub conductance: Vec<f64>,
    /// Connected piece of each node.
    pub piece: Vec<u32>,
    /// Unknown of each node, [`HELD`] for one node of each piece.
    unknown: Vec<u32>,
    unknowns: usize,
    /// None where every piece is a single cell.
    symbolic: Option<SymbolicCholesky<u32>>,
    values: Vec<f64>,
}

impl std::fmt::Debug for Projector {
    fn fmt(&self, out: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        write!(out, "Projector with {} unknowns, {} values", self.unknowns, self.values.len())
    }
}

/// Union-find with path halving.
pub fn root(parent: &mut [u32], mut node: u32) -> u32 {
    while parent[node as usize] != node {
        parent[node as usize] = parent[parent[node as usize] as usize];
        node = parent[node as usize];
    }
    node
}

impl Projector {
    /// Factors the Laplacian with the given inverse weights of the verticals.
    pub fn new(branches: &Branches, conductance: Vec<f64>) -> Result<Self, SolveFailure> {
        let mut parent: Vec<u32> = (0..branches.nodes as u32).collect();
        let mut join = |a: u32, b: u32| {
            let (a, b) = (root(&mut parent, a), root(&mut parent, b));
            let (low, high) = (a.min(b), a.max(b));
            parent[high as usize] = low;
        };
        branches.each_face(|_, from, to| join(from as u32, to as u32));
        for (ends, _) in branches.ends.iter().zip(&conductance).filter(|(_, g)| **g > 0.0) {
            ends.windows(2).for_each(|pair| join(pair[0].0, pair[1].0));
        }
        let piece: Vec<u32> = (0..branches.nodes as u32).map(|node| root(&mut parent, node)).collect();
        let mut unknown = vec![HELD; branches.nodes];
        let mut unknowns = 0;
        for node in 0..branches.nodes {
            // the root is the lowest node of its piece
            if piece[node] as usize != node {
                unknown[node] = unknowns as u32;
                unknowns += 1;
            }
        }
        if unknowns == 0 {
            return Ok(Self { conductance, piece, unknown, unknowns, symbolic: None, values: Vec::new() });
        }
        let mut diagonal = vec![0.0; unknowns];
        let mut entries = Vec::with_capacity(3 * unknowns);
        branches.each_face(|_, from, to| {
            let (from, to) = (unknown[from], unknown[to]);
            [from, to].into_iter().filter(|&u| u != HELD).for_each(|u| diagonal[u as usize] += 1.0);
            if from != HELD && to != HELD {
                entries.push(Triplet::new(from.max(to), from.min(to), -1.0));
            }
        });
        for (ends, &g) in branches.ends.iter().zip(&conductance).filter(|(_, g)| **g > 0.0) {
            for &(a, wa) in ends {
                for &(b, wb) in ends {
                    let (a, b) = (unknown[a as usize], unknown[b as usize]);
                    if a != HELD && b != HELD && a >= b {
                        entries.push(Triplet::new(a, b, g * wa * wb));
                    }
                }
            }
        }
        entries
            .extend(diagonal.iter().enumerate().map(|(u, &value)| Triplet::new(u as u32, u as u32, value)));
        let failed = || SolveFailure::Factor { unknowns };
        let matrix = SparseColMat::<u32, f64>::try_new_from_triplets(unknowns, unknowns, &entries)
            .map_err(|_| failed())?;
        drop(entries);
        let symbolic = factorize_symbolic_cholesky(
            matrix.symbolic(),
            Side::Lower,
            SymmetricOrdering::Amd,
            CholeskySymbolicParams {
                supernodal_flop_ratio_threshold: SupernodalThreshold::FORCE_SUPERNODAL,
                ..Default::default()
            },
        )
        .map_err(|_| failed())?;
        let mut values = vec![0.0; symbolic.len_val()];
        let need = symbolic.factorize_numeric_llt_scratch::<f64>(Par::Seq, Default::default());
        let mut memory = MemBuffer::try_new(need).map_err(|_| failed())?;
        symbolic
            .factorize_numeric_llt(
                &mut values,
                matrix.as_ref(),
                Side::Lower,
                Default::default(),
                Par::Seq,
                MemStack::new(&mut memory),
                Default::default(),
            )
            .map_err(|_| failed())?;
        Ok(Self { conductance, piece, unknown, unknowns, symbolic: Some(symbolic), values })
    }

    /// Size of voltages, those of verticals by the root of their inverse weight: in a branch of high impedance a
    /// rounding error of the current alone is a large voltage.
    pub fn size(&self, branches: &Branches, voltages: &[Complex64]) -> f64 {
        let (faces, verticals) = voltages.split_at(branches.faces());
        let plain: f64 = faces.iter().map(Complex64::norm_sqr).sum();
        let weighted: f64 = verticals.iter().zip(&self.conductance).map(|(v, g)| g * v.norm_sqr()).sum();
        libm::sqrt(plain + weighted)
    }

    /// Bytes of the factor.
    pub fn bytes(&self) -> usize {
        8 * self.values.len()
    }

    /// Potentials of all nodes for currents that enter them: Lap potential = current.
    pub fn potential(&self, current: &[Complex64]) -> Vec<Complex64> {
        let zero = Complex64::default();
        let mut rhs = vec![zero; self.unknowns];
        for (&value, &unknown) in current.iter().zip(&self.unknown).filter(|(_, u)| **u != HELD) {
            rhs[unknown as usize] = value;
        }
        if let Some(SymbolicCholeskyRaw::Supernodal(symbolic)) =
            self.symbolic.as_ref().map(SymbolicCholesky::raw)
        {
            let factor = SupernodalLltRef::new(symbolic, &self.values);
            match self.symbolic.as_ref().and_then(SymbolicCholesky::perm) {
                None => substitute(factor, &mut rhs),
                Some(order) => {
                    let (forward, _) = order.arrays();
                    let mut permuted: Vec<Complex64> =
                        forward.iter().map(|&from| rhs[from as usize]).collect();
                    substitute(factor, &mut permuted);
                    permuted.iter().zip(forward).for_each(|(&from, &to)| rhs[to as usize] = from);
                }
            }
        }
        let value = |&unknown: &u32| if unknown == HELD { zero } else { rhs[unknown as usize] };
        self.unknown.iter().map(value).collect()
    }

    /// Makes `currents` conserve current: P i.
    pub fn conserve(&self, branches: &Branches, currents: &mut [Complex64]) {
        let potential = self.potential(&branches.divergence(currents));
        branches.subtract_gradient(&potential, Some(&self.conductance), currents);
    }

    /// Takes the potential differences out of `emf`, P^T v, and returns the potentials.
    pub fn take_out_potential(&self, branches: &Branches, emf: &mut [Complex64]) -> Vec<Complex64> {
        let faces = branches.faces();
        // W^-1 v on the verticals while the divergence is taken
        let kept = emf[faces..].to_vec();
        emf[faces..].iter_mut().zip(&self.conductance).for_each(|(v, g)| *v *= g);
        let potential = self.potential(&branches.divergence(emf));
        emf[faces..].copy_from_slice(&kept);
        branches.subtract_gradient(&potential, None, emf);
        for (v, _) in emf[faces..].iter_mut().zip(&self.conductance).filter(|(_, g)| **g == 0.0) {
            *v = Complex64::default();
        }
        potential
    }
}

/// Forward and back substitution with a supernodal factor. The library's own is made for many right-hand sides; with
/// the two real ones of a complex vector this one takes a third of the time.
fn substitute(factor: SupernodalLltRef<'_, u32, f64>, x: &mut [Complex64]) {
    let count = factor.symbolic().n_supernodes();
    let mut below: Vec<Complex64> = Vec::new();
    for index in 0..count {
        let node = factor.supernode(index);
        let (start, pattern, block) = (node.start(), node.pattern(), node.val());
        let columns = block.ncols();
        below.clear();
        below.resize(pattern.len(), Complex64::default());
        for j in 0..columns {
            let Some(column) = block.col(j).try_as_col_major() else { return };
            let column = column.as_slice();
            let value = x[start + j] / column[j];
            x[start + j] = value;
            let (inside, outside) = column.split_at(columns);
            for (to, l) in x[start + j + 1..start + columns].iter_mut().zip(&inside[j + 1..]) {
                *to -= value * l;
            }
            for (to, l) in below.iter_mut().zip(outside) {
                *to += value * l;
            }
        }
        for (&row, change) in pattern.iter().zip(&below) {
            x[row as usize] -= change;
        }
    }
    for index in (0..count).rev() {
        let node = factor.supernode(index);
        let (start, pattern, block) = (node.start(), node.pattern(), node.val());
        let columns = block.ncols();
        below.clear();
        below.extend(pattern.iter().map(|&row| x[row as usize]));
        for j in (0..columns).rev() {
            let Some(column) = block.col(j).try_as_col_major() else { return };
            let column = column.as_slice();
            let (inside, outside) = column.split_at(columns);
            let mut sum = x[start + j];
            for (from, l) in x[start + j + 1..start + columns].iter().zip(&inside[j + 1..]) {
                sum -= from * l;
            }
            for (from, l) in below.iter().zip(outside) {
                sum -= from * l;
            }
            x[start + j] = sum / column[j];
        }
    }
}
