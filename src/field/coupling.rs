//! Transfer impedances between all paths of a plan: what 1 A in one puts into the loop of another, in volts.
//!
//! All paths are put on one and the same copper, each is solved alone, and its currents are tested with every other
//! path: EMF along its track and potential difference of its entries, by currents in the copper and directly between
//! the two tracks.
//!
//! Model: Z_AB = int_B (E of A's copper currents) + phi differences at B's entries + j w M_AB, M_AB the mutual
//! inductance of the tracks (double integral of Neumann over their legs). Z_AB = Z_BA by reciprocity.
//! Cells are twice as large as those of the maps, which costs less and is right where the paths are farther apart than
//! a cell; the figures say so.
//! Checked by: `two_tracks_over_a_plane_have_the_published_mutual_inductance`, `transfer_is_reciprocal` in
//! tests/finding.

use super::lay::Lay;
use super::source::Source;
use super::stack::Stack;
use super::stage::{View, Voids};
use super::track::mutual_inductance_h;
use super::workshop::Workshop;
use crate::diag::Diagnostic;
use crate::diag::code::field as code;
use crate::plan::PathPlan;
use crate::review::Model;
use crate::sheet::{Drive, OperatingPoint, Prepared};
use num_complex::Complex64;
use rayon::prelude::*;

/// Cells of the coupling in cells of the maps.
const COARSER: f64 = 2.0;

/// Transfer impedances at one frequency.
#[derive(Clone, Debug)]
pub struct Couplings {
    /// Frequency in Hz.
    pub frequency_hz: f64,
    /// Indices of the paths in the plan.
    pub paths: Vec<usize>,
    /// `z_ohm[a][b]` is the voltage in path `paths[b]` per ampere in path `paths[a]`, in ohm; none between two paths of
    /// which neither was asked for.
    pub z_ohm: Vec<Vec<Option<Complex64>>>,
}

/// A path on the common copper.
struct Member<'p> {
    index: usize,
    lay: Lay<'p>,
    source: Source<'p>,
}

impl Workshop<'_> {
    /// Transfer impedances between all paths of the plan at each frequency, as far as one of the two is `asked` for.
    /// Paths that cannot be charted are left out; so are all where the plan has no conductors in common or the model is
    /// not that of sheets.
    pub fn couplings(&self, asked: &[bool], frequencies_hz: &[f64]) -> Result<Vec<Couplings>, Diagnostic> {
        let conductors = &self.plan.conductors;
        if self.model != Model::Sheet || conductors.layers.is_empty() {
            return Ok(Vec::new());
        }
        let member = |index: usize| {
            let path: &PathPlan = &self.plan.paths[index];
            let lays = Lay::of_path(self.board, conductors, &self.joints, path, &path.charts);
            let lay = lays.into_iter().next().filter(|lay| !lay.single)?;
            let source = Source::new(self.board, &lay.plane_layer, lay.legs);
            Some(Member { index, lay, source })
        };
        let members: Vec<Member> = (0..self.plan.paths.len()).filter_map(member).collect();
        if members.len() < 2 {
            return Ok(Vec::new());
        }
        frequencies_hz.iter().map(|&hz| self.coupled(&members, asked, hz)).collect()
    }

    fn coupled(
        &self,
        members: &[Member],
        asked: &[bool],
        frequency_hz: f64,
    ) -> Result<Couplings, Diagnostic> {
        let failed = |what: String| Diagnostic::warning(code::COUPLING_UNSOLVED, what);
        let mut common = members[0].lay.clone();
        common.charts = members.iter().flat_map(|member| member.lay.charts.iter().cloned()).collect();
        let cell_m = COARSER * members.iter().map(|m| m.lay.cell_m).fold(f64::INFINITY, f64::min);
        // the part of the foils that counts is that of the path with the lowest track: its field is the sharpest
        let part =
            members.iter().map(|member| member.source.stack_part(frequency_hz)).fold(f64::INFINITY, f64::min);
        let stack = Stack::new(&self.board.stackup, part);
        let layers = common.layers.iter().map(|conductor| conductor.layer).collect();
        let view = View { cell_m, window: None, layers, lenient: true };
        let stage = self.stages.get(self.board, &common, &view, &stack, Voids::Kept).map_err(|misfit| {
            failed(format!(
                "copper of layer L{} must fit on cells of {:.3} mm",
                misfit.layer + 1,
                cell_m * 1e3
            ))
        })?;
        let unsolved =
            |failure| failed(format!("paths must be solved together at {frequency_hz} Hz; {failure:?}"));
        let system = stage.system().map_err(unsolved)?;
        let zs = |sheet: &super::stage::StagedSheet| members[0].source.foil(sheet.layer).zs_ohm(frequency_hz);
        let point = OperatingPoint { frequency_hz, zs_ohm: stage.sheets.iter().map(zs).collect() };
        let prepared: Vec<Option<Prepared>> = members
            .par_iter()
            .map(|member| {
                let entered = stage.wiring.enter(&member.lay, &stage.sheets).ok()?;
                let strips = member.source.strips(&stack, frequency_hz);
                system.prepare(&Drive { strips, injections: entered.injections }).ok()
            })
            .collect();
        let ready: Vec<(&Member, &Prepared)> = members
            .iter()
            .zip(&prepared)
            .filter_map(|(member, drive)| Some((member, drive.as_ref()?)))
            .collect();
        let omega = Complex64::new(0.0, std::f64::consts::TAU * frequency_hz);
        let row = |&(member, drive): &(&Member, &Prepared)| {
            if !asked[member.index] {
                return Ok(vec![None; ready.len()]);
            }
            let solution = system.solve_prepared(drive, &point, self.tolerance).map_err(unsolved)?;
            let runs = member.source.runs(&stack, frequency_hz);
            let to = |&(other, tested): &(&Member, &Prepared)| {
                let direct = mutual_inductance_h(&runs, &other.source.runs(&stack, frequency_hz));
                Some(system.transfer_ohm(&solution, frequency_hz, tested) + omega * direct)
            };
            Ok(ready.iter().map(to).collect())
        };
        let z_ohm: Result<Vec<Vec<Option<Complex64>>>, Diagnostic> = ready.par_iter().map(row).collect();
        let mut z_ohm = z_ohm?;
        // by reciprocity the other way round is the same
        let other_way: Vec<Vec<Option<Complex64>>> =
            (0..ready.len()).map(|from| z_ohm.iter().map(|row| row[from]).collect()).collect();
        for (row, other) in z_ohm.iter_mut().zip(&other_way) {
            row.iter_mut().zip(other).for_each(|(z, other)| *z = z.or(*other));
        }
        let paths = ready.iter().map(|(member, _)| member.index).collect();
        Ok(Couplings { frequency_hz, paths, z_ohm })
    }
}
