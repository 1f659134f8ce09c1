//! Projection of branch currents on those that conserve current, by one sparse Cholesky factor.
//!
//! Model: with D the divergence and W positive weights of the branches (1 on faces), the graph Laplacian
//! Lap = D W^-1 D^T of all sheets and verticals together is factored once. P i = i - W^-1 D^T Lap^-1 D i conserves
//! current; its transpose takes the potential differences out of voltages. One node of each connected piece of copper
//! is held at zero, which changes nothing as the net current of a piece is zero.
//! Gaps between facing sheets have a vanishing W^-1, for their impedance is far above that of copper: what islands of
//! copper have too much goes through the gaps by capacitance, one unknown for each island, and only the rest is spread
//! by the factor, which so does not depend on gaps.
//!
//! Source: null-space projection for constrained conjugate gradients (Gould, Hribar and Nocedal, SIAM J. Sci. Comput.
//! 23, 2001, from memory); factor by `faer` on one thread, so that the bits do not depend on the number of threads.
//!
//! Checked by: `current_is_conserved_and_power_is_dissipated` and `dense_direct_solve_agrees` in tests/physics.

use super::SolveFailure;
use super::branches::Branches;
use crate::math::real::{Real, complex_double};
use faer::dyn_stack::{MemBuffer, MemStack};
use faer::sparse::linalg::SupernodalThreshold;
use faer::sparse::linalg::cholesky::{
    CholeskySymbolicParams, SymbolicCholesky, SymbolicCholeskyRaw, SymmetricOrdering,
    factorize_symbolic_cholesky, supernodal::SymbolicSupernodalCholesky,
};
use faer::sparse::{SparseColMat, Triplet};
use faer::{Par, Side};
use num_complex::Complex;
use std::sync::Arc;

/// Mark of a place that is held at zero.
const HELD: u32 = u32::MAX;

/// Union-find with path halving.
pub fn root(parent: &mut [u32], mut node: u32) -> u32 {
    while parent[node as usize] != node {
        parent[node as usize] = parent[parent[node as usize] as usize];
        node = parent[node as usize];
    }
    node
}

/// Joins the sets of two places; the lowest place of a set is its root.
fn join(parent: &mut [u32], a: u32, b: u32) {
    let (a, b) = (root(parent, a), root(parent, b));
    parent[a.max(b) as usize] = a.min(b);
}

/// A factored graph Laplacian, the lowest place of each connected set held at zero.
pub struct Laplacian {
    /// Unknown of each place, [`HELD`] for one place of each set.
    unknown: Vec<u32>,
    unknowns: usize,
    /// None where every set is a single place.
    symbolic: Option<SymbolicCholesky<u32>>,
    values: Vec<f64>,
    /// The same in single precision, for iterations.
    single: Vec<f32>,
}

/// A precision in which a factor is kept.
pub trait Precision: Real {
    /// Values of the factor.
    #[doc(hidden)]
    fn values(factor: &Laplacian) -> &[Self];
}

impl Precision for f64 {
    fn values(factor: &Laplacian) -> &[f64] {
        &factor.values
    }
}

impl Precision for f32 {
    fn values(factor: &Laplacian) -> &[f32] {
        &factor.single
    }
}

impl Laplacian {
    /// Factors; `sets` gives the lowest place of each place's set, `fill` calls back with entries of the lower triangle
    /// and the diagonal, which are summed.
    fn new(sets: &[u32], fill: impl FnOnce(&mut dyn FnMut(usize, usize, f64))) -> Result<Self, SolveFailure> {
        let mut unknown = vec![HELD; sets.len()];
        let mut unknowns = 0;
        for (place, &lowest) in sets.iter().enumerate() {
            if lowest as usize != place {
                unknown[place] = unknowns as u32;
                unknowns += 1;
            }
        }
        if unknowns == 0 {
            return Ok(Self { unknown, unknowns, symbolic: None, values: Vec::new(), single: Vec::new() });
        }
        let mut diagonal = vec![0.0; unknowns];
        let mut entries = Vec::with_capacity(3 * unknowns);
        fill(&mut |a, b, value| {
            let (a, b) = (unknown[a], unknown[b]);
            if a == HELD || b == HELD {
                return;
            }
            if a == b {
                diagonal[a as usize] += value;
            } else {
                entries.push(Triplet::new(a.max(b), a.min(b), value));
            }
        });
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
        let single = values.iter().map(|&value| value as f32).collect();
        Ok(Self { unknown, unknowns, symbolic: Some(symbolic), values, single })
    }

    /// Potentials of all places for currents that enter them.
    fn solve<T: Precision>(&self, current: &[Complex<T>]) -> Vec<Complex<T>> {
        let zero = Complex::new(T::zero(), T::zero());
        let mut rhs = vec![zero; self.unknowns];
        for (&value, &unknown) in current.iter().zip(&self.unknown).filter(|(_, u)| **u != HELD) {
            rhs[unknown as usize] = value;
        }
        if let Some(symbolic) = &self.symbolic {
            let solve = |x: &mut [Complex<T>]| match symbolic.raw() {
                SymbolicCholeskyRaw::Supernodal(nodes) => substitute(nodes, T::values(self), x),
                SymbolicCholeskyRaw::Simplicial(columns) => {
                    substitute_columns(columns.col_ptr(), columns.row_idx(), T::values(self), x)
                }
            };
            match symbolic.perm() {
                None => solve(&mut rhs),
                Some(order) => {
                    let (forward, _) = order.arrays();
                    let mut permuted: Vec<Complex<T>> =
                        forward.iter().map(|&from| rhs[from as usize]).collect();
                    solve(&mut permuted);
                    permuted.iter().zip(forward).for_each(|(&from, &to)| rhs[to as usize] = from);
                }
            }
        }
        let value = |&unknown: &u32| if unknown == HELD { zero } else { rhs[unknown as usize] };
        self.unknown.iter().map(value).collect()
    }
}

/// Pieces of copper as places, joined by the capacitance between facing sheets.
struct Islands {
    /// Island of each node; pieces that face no other have one as well.
    of_node: Vec<u32>,
    /// Lowest island of each island's set.
    sets: Vec<u32>,
    /// Weight of each capacitor between facing cells against the largest.
    weight: Vec<f64>,
    laplacian: Laplacian,
}

impl Islands {
    fn new(branches: &Branches, piece: &[u32]) -> Result<Self, SolveFailure> {
        let mut number = vec![HELD; branches.nodes];
        let mut count = 0;
        for (node, &lowest) in piece.iter().enumerate() {
            if lowest as usize == node {
                number[node] = count;
                count += 1;
            }
        }
        let of_node: Vec<u32> = piece.iter().map(|&lowest| number[lowest as usize]).collect();
        let most = branches.facing.iter().map(|(_, _, c)| *c).fold(0.0, f64::max);
        let weight: Vec<f64> = branches.facing.iter().map(|(_, _, c)| c / most).collect();
        let mut parent: Vec<u32> = (0..count).collect();
        let ends = |&(a, b, _): &(u32, u32, f64)| (of_node[a as usize], of_node[b as usize]);
        branches.facing.iter().map(ends).for_each(|(a, b)| join(&mut parent, a, b));
        let sets: Vec<u32> = (0..count).map(|island| root(&mut parent, island)).collect();
        let laplacian = Laplacian::new(&sets, |add| {
            for ((a, b), &g) in branches.facing.iter().map(ends).zip(&weight).filter(|((a, b), _)| a != b) {
                add(a as usize, a as usize, g);
                add(b as usize, b as usize, g);
                add(a as usize, b as usize, -g);
            }
        })?;
        Ok(Self { of_node, sets, weight, laplacian })
    }

    /// Potentials of the islands that make up for `leaves`, the current that leaves each node.
    fn potential<T: Precision>(&self, leaves: &[Complex<T>]) -> Vec<Complex<T>> {
        let mut net = vec![Complex::new(T::zero(), T::zero()); self.sets.len()];
        leaves.iter().zip(&self.of_node).for_each(|(leaves, &island)| net[island as usize] += leaves);
        self.laplacian.solve(&net)
    }
}

/// A factored graph Laplacian with its weights.
#[derive(Clone)]
pub struct Projector {
    /// Inverse weight of each vertical; zero takes it out of the circuit.
    pub conductance: Vec<f64>,
    /// Connected piece of each node, gaps not counted.
    pub piece: Arc<Vec<u32>>,
    /// Factor for currents within pieces.
    laplacian: Arc<Laplacian>,
    /// Islands that gaps join; none where gaps are open or there are none.
    islands: Option<Arc<Islands>>,
}

impl std::fmt::Debug for Projector {
    fn fmt(&self, out: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        let (unknowns, values) = (self.laplacian.unknowns, self.laplacian.values.len());
        write!(out, "Projector with {unknowns} unknowns, {values} values")
    }
}

impl Projector {
    /// Factors the Laplacian with the given inverse weights of the verticals.
    pub fn new(branches: &Branches, conductance: Vec<f64>) -> Result<Self, SolveFailure> {
        let mut parent: Vec<u32> = (0..branches.nodes as u32).collect();
        branches.each_face(|_, from, to| join(&mut parent, from as u32, to as u32));
        for (ends, _) in branches.ends.iter().zip(&conductance).filter(|(_, g)| **g > 0.0) {
            ends.windows(2).for_each(|pair| join(&mut parent, pair[0].0, pair[1].0));
        }
        let piece: Vec<u32> = (0..branches.nodes as u32).map(|node| root(&mut parent, node)).collect();
        let laplacian = Laplacian::new(&piece, |add| {
            branches.each_face(|_, from, to| {
                add(from, from, 1.0);
                add(to, to, 1.0);
                add(from, to, -1.0);
            });
            for (ends, &g) in branches.ends.iter().zip(&conductance).filter(|(_, g)| **g > 0.0) {
                for (index, &(a, wa)) in ends.iter().enumerate() {
                    for (other, &(b, wb)) in ends[..=index].iter().enumerate() {
                        // a node that both ends share counts in both orders
                        let times = if a == b && other < index { 2.0 } else { 1.0 };
                        add(a as usize, b as usize, times * g * wa * wb);
                    }
                }
            }
        })?;
        let joined = !branches.facing.is_empty();
        let islands = if joined { Some(Arc::new(Islands::new(branches, &piece)?)) } else { None };
        Ok(Self { conductance, piece: Arc::new(piece), laplacian: Arc::new(laplacian), islands })
    }

    /// The same with open gaps, for DC.
    pub fn with_open_gaps(&self) -> Self {
        Self { islands: None, ..self.clone() }
    }

    /// Whether gaps carry current.
    pub fn joins_gaps(&self) -> bool {
        self.islands.is_some()
    }

    /// Mark of the copper that conductors and gaps join to `node`, below the number of nodes.
    pub fn joined(&self, node: usize) -> u32 {
        match &self.islands {
            None => self.piece[node],
            Some(islands) => islands.sets[islands.of_node[node] as usize],
        }
    }

    /// Size of voltages, those of verticals by the root of their inverse weight: in a branch of high impedance a
    /// rounding error of the current alone is a large voltage. Gaps count by `gap_weight` for each farad.
    pub fn size<T: Real>(&self, branches: &Branches, voltages: &[Complex<T>], gap_weight: f64) -> f64 {
        let (faces, others) = voltages.split_at(branches.faces());
        let (verticals, gaps) = others.split_at(branches.ends.len());
        let square = |v: &Complex<T>| complex_double(*v).norm_sqr();
        let plain: f64 = faces.iter().map(square).sum();
        let weighted: f64 = verticals.iter().zip(&self.conductance).map(|(v, g)| g * square(v)).sum();
        let facing: f64 = gaps.iter().zip(&branches.facing).map(|(v, (_, _, c))| c * square(v)).sum();
        libm::sqrt(plain + weighted + gap_weight * facing)
    }

    /// Bytes of the factor.
    pub fn bytes(&self) -> usize {
        12 * self.laplacian.values.len()
    }

    /// Makes `currents` conserve current: P i.
    pub fn conserve<T: Precision>(&self, branches: &Branches, currents: &mut [Complex<T>]) {
        self.take_up(branches, &branches.divergence(currents), currents);
    }

    /// Subtracts currents that leave the nodes as `leaves` says: what islands have too much through the gaps, the rest
    /// as potential flow.
    pub fn take_up<T: Precision>(
        &self,
        branches: &Branches,
        leaves: &[Complex<T>],
        currents: &mut [Complex<T>],
    ) {
        let mut leaves = std::borrow::Cow::Borrowed(leaves);
        if let Some(islands) = &self.islands {
            let potential = islands.potential(&leaves);
            let gaps = branches.first_gap();
            let left = leaves.to_mut();
            for ((&(a, b, _), g), current) in
                branches.facing.iter().zip(&islands.weight).zip(&mut currents[gaps..])
            {
                let at = |node: u32| potential[islands.of_node[node as usize] as usize];
                let part = (at(a) - at(b)) * T::of(*g);
                *current -= part;
                left[a as usize] -= part;
                left[b as usize] += part;
            }
        }
        let potential = self.laplacian.solve(&leaves);
        branches.subtract_gradient(&potential, Some(&self.conductance), currents);
    }

    /// Takes the potential differences out of `emf`, P^T v, and returns the potentials.
    pub fn take_out_potential<T: Precision>(
        &self,
        branches: &Branches,
        emf: &mut [Complex<T>],
    ) -> Vec<Complex<T>> {
        let (faces, gaps) = (branches.faces(), branches.first_gap());
        let zero = Complex::new(T::zero(), T::zero());
        // W^-1 v on the verticals while the divergence is taken
        let kept = emf[faces..].to_vec();
        emf[faces..gaps].iter_mut().zip(&self.conductance).for_each(|(v, g)| *v *= T::of(*g));
        emf[gaps..].fill(zero);
        let mut potential = self.laplacian.solve(&branches.divergence(emf));
        emf[faces..].copy_from_slice(&kept);
        branches.subtract_gradient(&potential, None, emf);
        for (v, _) in emf[faces..].iter_mut().zip(&self.conductance).filter(|(_, g)| **g == 0.0) {
            *v = zero;
        }
        let Some(islands) = &self.islands else {
            emf[gaps..].fill(zero);
            return potential;
        };
        let mut net = vec![zero; islands.sets.len()];
        for ((&(a, b, _), g), voltage) in branches.facing.iter().zip(&islands.weight).zip(&emf[gaps..]) {
            net[islands.of_node[a as usize] as usize] += voltage * T::of(*g);
            net[islands.of_node[b as usize] as usize] -= voltage * T::of(*g);
        }
        let of_islands = islands.laplacian.solve(&net);
        for (&(a, b, _), voltage) in branches.facing.iter().zip(&mut emf[gaps..]) {
            let at = |node: u32| of_islands[islands.of_node[node as usize] as usize];
            *voltage -= at(a) - at(b);
        }
        for (value, &island) in potential.iter_mut().zip(&islands.of_node) {
            *value += of_islands[island as usize];
        }
        potential
    }
}

/// Forward and back substitution with a factor in single columns, the diagonal first in each.
fn substitute_columns<T: Real>(columns: &[u32], rows: &[u32], values: &[T], x: &mut [Complex<T>]) {
    let range = |j: usize| columns[j] as usize..columns[j + 1] as usize;
    for j in 0..x.len() {
        let (rows, values) = (&rows[range(j)], &values[range(j)]);
        let value = x[j] / values[0];
        x[j] = value;
        rows[1..].iter().zip(&values[1..]).for_each(|(&row, &l)| x[row as usize] -= value * l);
    }
    for j in (0..x.len()).rev() {
        let (rows, values) = (&rows[range(j)], &values[range(j)]);
        let mut sum = x[j];
        rows[1..].iter().zip(&values[1..]).for_each(|(&row, &l)| sum -= x[row as usize] * l);
        x[j] = sum / values[0];
    }
}

/// Columns of a supernode that are taken together.
const TOGETHER: usize = 4;

/// Forward and back substitution with a supernodal factor. The library's own is made for many right-hand sides; with
/// the two real ones of a complex vector this one takes a third of the time.
fn substitute<T: Real>(nodes: &SymbolicSupernodalCholesky<u32>, values: &[T], x: &mut [Complex<T>]) {
    let zero = Complex::new(T::zero(), T::zero());
    let count = nodes.n_supernodes();
    let (begin, end, first) = (nodes.supernode_begin(), nodes.supernode_end(), nodes.col_ptr_for_val());
    let mut below: Vec<Complex<T>> = Vec::new();
    for index in 0..count {
        let (start, columns) = (begin[index] as usize, (end[index] - begin[index]) as usize);
        let pattern = nodes.supernode(index).pattern();
        let length = columns + pattern.len();
        let block = &values[first[index] as usize..][..length * columns];
        let head = &mut x[start..start + columns];
        for j in 0..columns {
            let column = &block[j * length..j * length + columns];
            let value = head[j] / column[j];
            head[j] = value;
            for (to, &l) in head[j + 1..].iter_mut().zip(&column[j + 1..]) {
                *to -= value * l;
            }
        }
        if columns == 1 {
            let value = head[0];
            pattern.iter().zip(&block[1..]).for_each(|(&row, &l)| x[row as usize] -= value * l);
            continue;
        }
        below.clear();
        below.resize(pattern.len(), zero);
        let mut four = head.chunks_exact(TOGETHER);
        for (group, v) in four.by_ref().enumerate() {
            let outside = |k: usize| &block[(TOGETHER * group + k) * length + columns..][..pattern.len()];
            let (a, b, c, d) = (outside(0), outside(1), outside(2), outside(3));
            for (row, to) in below.iter_mut().enumerate() {
                *to += v[0] * a[row] + v[1] * b[row] + (v[2] * c[row] + v[3] * d[row]);
            }
        }
        let done = columns - columns % TOGETHER;
        for (k, &v) in four.remainder().iter().enumerate() {
            let outside = &block[(done + k) * length + columns..][..pattern.len()];
            below.iter_mut().zip(outside).for_each(|(to, &l)| *to += v * l);
        }
        for (&row, &change) in pattern.iter().zip(&below) {
            x[row as usize] -= change;
        }
    }
    for index in (0..count).rev() {
        let (start, columns) = (begin[index] as usize, (end[index] - begin[index]) as usize);
        let pattern = nodes.supernode(index).pattern();
        let length = columns + pattern.len();
        let block = &values[first[index] as usize..][..length * columns];
        below.clear();
        below.extend(pattern.iter().map(|&row| x[row as usize]));
        let head = &mut x[start..start + columns];
        let done = columns - columns % TOGETHER;
        for group in (0..done).step_by(TOGETHER) {
            let outside = |k: usize| &block[(group + k) * length + columns..][..below.len()];
            let (a, b, c, d) = (outside(0), outside(1), outside(2), outside(3));
            let mut sums = [zero; TOGETHER];
            for (row, from) in below.iter().enumerate() {
                sums[0] += from * a[row];
                sums[1] += from * b[row];
                sums[2] += from * c[row];
                sums[3] += from * d[row];
            }
            head[group..].iter_mut().zip(sums).for_each(|(to, sum)| *to -= sum);
        }
        for j in done..columns {
            let outside = &block[j * length + columns..][..below.len()];
            let mut sum = zero;
            below.iter().zip(outside).for_each(|(from, &l)| sum += from * l);
            head[j] -= sum;
        }
        for j in (0..columns).rev() {
            let column = &block[j * length..j * length + columns];
            let mut sum = head[j];
            for (from, &l) in head[j + 1..].iter().zip(&column[j + 1..]) {
                sum -= from * l;
            }
            head[j] = sum / column[j];
        }
    }
}
