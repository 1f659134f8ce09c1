//! From a board and a review to the plan: each path's way, planes, sheets, landings, voids and cells.

use super::chart::Ground;
use super::course::{self, Course};
use super::route::Port;
use super::terrain::Terrain;
use super::{ChartPlan, PathPlan, Plan, conductors, signal, stretch};
use crate::board::Board;
use crate::diag::Diagnostic;
use crate::diag::code::plan as code;
use crate::field::PlaneId;
use crate::review::Review;
use std::collections::BTreeMap;

/// Plans all nets, paths and pairs of a review on a board. Call [`super::apply_review`] before, so that the board has
/// the review's stackup.
pub fn build(board: &Board, review: &Review) -> Plan {
    let mut planner = Planner::new(board, review);
    let mut drafts = Vec::new();
    for course in course::courses(board, review, &mut planner.messages) {
        match planner.path(course) {
            Ok(draft) => drafts.push(draft),
            Err(message) => planner.messages.push(message),
        }
    }
    let (paths, conductors) = conductors::finish(&mut planner, drafts);
    Plan { paths, conductors, bands: review.bands.clone(), messages: planner.messages }
}

/// A path whose way and charts are known, before the sheets that carry its return are.
pub(super) struct Draft<'r> {
    /// What the review asks for.
    pub course: Course<'r>,
    /// The path, without entries.
    pub path: PathPlan,
    /// Where its way meets the conductors.
    pub ports: Vec<Port>,
}

/// What is known while a plan is made.
pub(super) struct Planner<'b> {
    pub(super) terrain: Terrain<'b>,
    pub(super) review: &'b Review,
    pub(super) grounds: BTreeMap<PlaneId, Ground>,
    pub(super) messages: Vec<Diagnostic>,
}

impl<'b> Planner<'b> {
    fn new(board: &'b Board, review: &'b Review) -> Self {
        let mut messages = Vec::new();
        for name in &review.reference_nets {
            if board.net(name).is_none() {
                let text = format!("reference net `{name}` must be a net of the board; it is not");
                let near = crate::diag::nearest(name, board.nets.iter().map(|net| net.name.as_str()));
                let message = Diagnostic::error(code::NET_UNKNOWN, text);
                messages.push(match near {
                    Some(near) => message.hint(format!("did you mean `{near}`?")),
                    None => message,
                });
            }
        }
        let mut terrain = Terrain::new(board, &review.reference_nets);
        terrain.plating_m = review.stackup.plating_m.unwrap_or(terrain.plating_m);
        Self { terrain, review, grounds: BTreeMap::new(), messages }
    }

    fn path<'r>(&mut self, course: Course<'r>) -> Result<Draft<'r>, Diagnostic> {
        let board = self.terrain.board;
        let (mut way, signal) =
            signal::signal(&self.terrain, &course, &self.review.bands, self.review.origin)?;
        let (legs, stretches) = match course.plane {
            None => stretch::divide(&self.terrain, &course.own_nets(&self.terrain), &way.legs),
            Some(plane) => self.on_plane(plane, &course, std::mem::take(&mut way.legs))?,
        };
        self.messages.append(&mut way.notes);
        let mut charts: Vec<ChartPlan> = Vec::new();
        for stretch in &stretches {
            charts.push(self.chart(&course.who, &legs, stretch));
        }
        self.place(&course, &legs, &mut charts);
        let label = |pin: crate::board::PinId| board.pins[pin.0 as usize].label();
        let path = PathPlan {
            name: course.name.clone(),
            driver: label(course.lines[0].driver),
            receiver: label(course.lines[0].receiver()),
            track: legs,
            charts,
            signal,
            ..PathPlan::default()
        };
        Ok(Draft { course, path, ports: way.ports })
    }
}
