//! What each void adds to the impedance of a loop: the difference of two solutions, divided among the voids exactly.
//!
//! Given the solution i1 on copper with voids and i0 on the same copper with them filled (same grid, same drive), gives
//! Z1 - Z0 as a sum over labels of the filled cells.
//!
//! Model: with Z and e the operator and the EMF of the filled copper, v1 = Z i1 + e is a potential difference D^T phi1
//! on every face that conducts in both, so that
//! Z1 - Z0 = i0^T (D^T phi1 - v1) = - sum over the faces in voids of i0 (v1 - D^T phi1):
//! the field across the void times the current that would flow there. Potentials inside the voids are free, since i0
//! conserves current; they are zero here. The part of one void is the first-order gain of filling it alone.
//!
//! Source: reaction of two fields, V. H. Rumsey, Phys. Rev. 94, 1954 (from memory); derived from the symmetry of Z.
//!
//! Holds when: both solutions are of one drive on one grid; a vertical that one of them lacks counts to the rest.
//!
//! Checked by: `parts_of_the_voids_add_up_to_the_extra_impedance`.

use super::operator::Impedance;
use super::{OperatingPoint, Prepared, Solution, SolveFailure, System};
use num_complex::Complex64;

/// Mark of a cell without a label.
pub const NO_LABEL: u32 = u32::MAX;

/// Which void each filled cell belongs to, and which verticals are the same.
#[derive(Clone, Copy, Debug)]
pub struct Labels<'a> {
    /// For each sheet and cell a label smaller than `count`, or [`NO_LABEL`].
    pub of_cells: &'a [Vec<u32>],
    /// Number of labels.
    pub count: usize,
    /// For each vertical of the filled system the same vertical of that with voids; none where that has none.
    pub same_vertical: &'a [Option<usize>],
}

impl System {
    /// Parts of Z1 - Z0 in ohm by label of cells; the last of the `count + 1` parts is what belongs to no label. This
    /// system is that with filled voids; `with_voids` is i1, `filled` is i0 and `drive` its drive.
    pub fn extra_impedance_parts(
        &self,
        with_voids: &Solution,
        filled: &Solution,
        drive: &Prepared,
        point: &OperatingPoint,
        labels: &Labels<'_>,
    ) -> Result<Vec<Complex64>, SolveFailure> {
        let branches = &self.branches;
        let s = Complex64::new(0.0, 2.0 * std::f64::consts::PI * point.frequency_hz);
        let projector = self.projector_at(s, &point.zs_ohm)?;
        let mut law = Impedance::bare(&self.problem, branches, &self.coupling, &projector, s, &point.zs_ohm);
        let Labels { of_cells, count, same_vertical } = *labels;
        let (mut one, zero) = (self.currents_of(with_voids), self.currents_of(filled));
        one.truncate(branches.faces());
        let currents = |vertical: &Option<usize>| vertical.map_or(0.0.into(), |v| with_voids.verticals[v]);
        one.extend(same_vertical.iter().map(currents));
        let mut voltage = vec![Complex64::default(); branches.len()];
        law.apply(&one, &mut voltage);
        voltage.iter_mut().zip(self.emf(drive, s)).for_each(|(v, e)| *v += e);
        let potential = self.potential_of(with_voids);
        branches.subtract_gradient(&potential, None, &mut voltage);
        let mut parts = vec![Complex64::default(); count + 1];
        let cells = branches.cells();
        for (sheet, of_sheet) in of_cells.iter().enumerate().take(branches.sheets) {
            for (direction, step) in [(0, 1), (1, branches.nx)] {
                let first = branches.plane(sheet, direction).start;
                for cell in 0..cells {
                    let face = first + cell;
                    if !branches.conducts[face] {
                        continue;
                    }
                    let label = |cell: usize| of_sheet[cell] as usize;
                    let part = label(cell).min(label(cell - step)).min(count);
                    parts[part] -= zero[face] * voltage[face];
                }
            }
        }
        for (v, i) in voltage.iter().zip(&zero).skip(branches.faces()) {
            parts[count] -= v * i;
        }
        Ok(parts)
    }

    /// Potentials of another system's solution on the nodes of this one, zero where that has no copper.
    fn potential_of(&self, solution: &Solution) -> Vec<Complex64> {
        let branches = &self.branches;
        let mut potential = vec![Complex64::default(); branches.nodes];
        for (sheet, values) in solution.potential_v.iter().enumerate() {
            let nodes = &branches.node[sheet * branches.cells()..(sheet + 1) * branches.cells()];
            for (&node, &value) in nodes.iter().zip(values) {
                if node != super::branches::NO_NODE {
                    potential[node as usize] = value;
                }
            }
        }
        // a node that the other system lacks keeps zero: what its verticals then show sums to nothing
        let outside = potential[branches.copper_nodes..].iter_mut().zip(&solution.outside_v);
        outside.for_each(|(to, &from)| *to = from);
        potential
    }
}
