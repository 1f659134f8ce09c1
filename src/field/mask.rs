//! Puts a plane's copper on cells: which cells conduct, which faces between them do not, and which islands result.
//!
//! A cell is copper when at least half of it is; it stands for its largest piece. A face between two copper cells
//! conducts when their pieces touch there, so a slot narrower than a cell cuts faces and no cell. Where a neck is
//! narrower than that, cells with less copper are added along it until every piece of copper that is connected on
//! the board is connected on the cells. Nothing is joined that the copper does not join.
//! Where a cell would have to stand for two pieces at once, the cell is too large, and that is said.
//! Checked by: `islands_of_the_mask_are_those_of_the_copper`, `a_slot_thinner_than_a_cell_cuts_faces` and
//! `a_neck_thinner_than_a_cell_is_kept` in tests/field.rs.

use super::pieces::{Copper, NONE, Pieces};
use crate::geom::{Grid, Point};
use std::collections::{BTreeMap, VecDeque};

/// Islands of at most this many cells are dropped rather than refused when a cell cannot hold their connection.
const CRUMB_CELLS: usize = 3;

/// A plane's copper on cells.
#[derive(Clone, Debug, PartialEq)]
pub struct Mask {
    /// Cells.
    pub grid: Grid,
    /// Whether a cell is copper.
    pub copper: Vec<bool>,
    /// Vertical faces between copper cells that do not conduct, rising.
    pub cut_x: Vec<usize>,
    /// Horizontal faces between copper cells that do not conduct, rising.
    pub cut_y: Vec<usize>,
    /// Island of each copper cell, from 0, in the order of their first cells; [`NO_ISLAND`] elsewhere.
    pub island: Vec<u32>,
    /// Number of islands.
    pub islands: usize,
    /// Group (of those that make the copper) of each copper cell; [`NO_ISLAND`] elsewhere.
    pub group: Vec<u32>,
    /// Cells that are copper by less than half, added to keep necks.
    pub neck_cells: usize,
    /// Pieces of copper too small for a cell, left out.
    pub crumbs: usize,
    /// Connections that the cells could not keep; always 0 for [`Mask::new`].
    pub severed: usize,
}

/// No island.
pub const NO_ISLAND: u32 = u32::MAX;

/// A place where a cell would have to stand for two pieces of copper at once.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct TooCoarse {
    /// The place.
    pub at: Point,
    /// The cell that was too large, in metres.
    pub cell_m: f64,
}

impl Mask {
    /// Puts `copper` on `grid`.
    pub fn new(copper: &Copper, grid: &Grid) -> Result<Self, TooCoarse> {
        let pieces = Pieces::find(copper, grid);
        let mut choice = Choice::by_half(&pieces, grid);
        let crumbs = choice.link(&pieces, grid, Err)?;
        Ok(choice.into_mask(&pieces, grid, crumbs, 0))
    }

    /// The same where connections that the cells cannot keep may be lost; they are counted. Nothing is joined that
    /// the copper does not join.
    pub fn lenient(copper: &Copper, grid: &Grid) -> Self {
        let pieces = Pieces::find(copper, grid);
        let mut choice = Choice::by_half(&pieces, grid);
        let mut severed = 0;
        let count = |_| {
            severed += 1;
            Ok(())
        };
        // every place is counted and none refused, so there is no error
        let crumbs = choice.link(&pieces, grid, count).unwrap_or(0);
        choice.into_mask(&pieces, grid, crumbs, severed)
    }
}

/// The piece that each cell stands for.
struct Choice {
    chosen: Vec<u32>,
    neck_cells: usize,
}

impl Choice {
    fn by_half(pieces: &Pieces, grid: &Grid) -> Self {
        let largest = |cell: usize| {
            let mut best = NONE;
            for piece in pieces.of_cell(cell) {
                if best == NONE || pieces.area[piece as usize] > pieces.area[best as usize] {
                    best = piece;
                }
            }
            best
        };
        // A board edge or a void edge on the middle of cells must fall the same way along its whole length.
        const HALF: f64 = 0.5 - 1e-9;
        let chosen = (0..grid.len()).map(|c| if pieces.coverage[c] >= HALF { largest(c) } else { NONE });
        Self { chosen: chosen.collect(), neck_cells: 0 }
    }

    fn stands_for(&self, pieces: &Pieces, piece: u32) -> bool {
        self.chosen[pieces.cell[piece as usize] as usize] == piece
    }

    /// Adds cells until connected copper is connected, or `refuse` bears that it is not; gives the number of crumbs
    /// left out.
    fn link(
        &mut self,
        pieces: &Pieces,
        grid: &Grid,
        mut refuse: impl FnMut(TooCoarse) -> Result<(), TooCoarse>,
    ) -> Result<usize, TooCoarse> {
        let mut whole = Sets::new(pieces.len());
        let mut parts = Sets::new(pieces.len());
        for &(a, b) in &pieces.contacts {
            whole.join(a, b);
            if self.stands_for(pieces, a) && self.stands_for(pieces, b) {
                parts.join(a, b);
            }
        }
        // Pieces of the islands on the cells, by island of the copper.
        let mut by_whole: BTreeMap<u32, BTreeMap<u32, Vec<u32>>> = BTreeMap::new();
        let mut all = 0;
        for piece in 0..pieces.len() as u32 {
            let island = whole.find(piece);
            all += usize::from(island == piece);
            if self.stands_for(pieces, piece) {
                by_whole.entry(island).or_default().entry(parts.find(piece)).or_default().push(piece);
            }
        }
        let mut crumbs = all - by_whole.len();
        if by_whole.values().all(|islands| islands.len() == 1) {
            return Ok(crumbs);
        }
        let neighbours = Neighbours::of(pieces);
        for islands in by_whole.into_values().filter(|islands| islands.len() > 1) {
            let mut order: Vec<(u32, Vec<u32>)> = islands.into_iter().collect();
            order.sort_by_key(|(part, members)| (members.len(), *part));
            let Some((largest, _)) = order.pop() else { continue };
            for (part, members) in order {
                if parts.find(part) == parts.find(largest) {
                    continue;
                }
                match self.path_to_other(pieces, &neighbours, &mut parts, &members) {
                    Some(path) => self.take(pieces, &neighbours, &mut parts, &path),
                    None if members.len() <= CRUMB_CELLS => {
                        members
                            .iter()
                            .for_each(|&piece| self.chosen[pieces.cell[piece as usize] as usize] = NONE);
                        crumbs += 1;
                    }
                    None => {
                        let cell = pieces.cell[members[0] as usize] as usize;
                        let at = grid.centre(cell % grid.nx, cell / grid.nx);
                        refuse(TooCoarse { at, cell_m: grid.cell_m })?;
                    }
                }
            }
        }
        Ok(crumbs)
    }

    /// Pieces on the shortest way from the island that holds `members` to another one of the same copper, over cells
    /// that stand for nothing yet.
    fn path_to_other(
        &self,
        pieces: &Pieces,
        neighbours: &Neighbours,
        parts: &mut Sets,
        members: &[u32],
    ) -> Option<Vec<u32>> {
        let home = parts.find(members[0]);
        // Pieces reached, with the piece before; pieces of the island itself have none.
        let mut reached: BTreeMap<u32, Option<u32>> = members.iter().map(|&piece| (piece, None)).collect();
        let mut queue: VecDeque<u32> = members.iter().copied().collect();
        while let Some(piece) = queue.pop_front() {
            for &next in neighbours.of_piece(piece) {
                if reached.contains_key(&next) {
                    continue;
                }
                if self.stands_for(pieces, next) {
                    if parts.find(next) != home {
                        return Some(way_to(&reached, piece));
                    }
                    reached.insert(next, None);
                    queue.push_back(next);
                    continue;
                }
                // Two pieces of one cell cannot both be on the way, since a cell stands for one.
                let cell = pieces.cell[next as usize];
                let free = self.chosen[cell as usize] == NONE
                    && !way_to(&reached, piece).iter().any(|&on_way| pieces.cell[on_way as usize] == cell);
                if free {
                    reached.insert(next, Some(piece));
                    queue.push_back(next);
                }
            }
        }
        None
    }

    fn take(&mut self, pieces: &Pieces, neighbours: &Neighbours, parts: &mut Sets, path: &[u32]) {
        for &piece in path {
            self.chosen[pieces.cell[piece as usize] as usize] = piece;
            self.neck_cells += 1;
        }
        for &piece in path {
            for &next in neighbours.of_piece(piece) {
                if self.stands_for(pieces, next) {
                    parts.join(piece, next);
                }
            }
        }
    }

    fn into_mask(self, pieces: &Pieces, grid: &Grid, crumbs: usize, severed: usize) -> Mask {
        let (nx, ny) = (grid.nx, grid.ny);
        let copper: Vec<bool> = self.chosen.iter().map(|&piece| piece != NONE).collect();
        let mut open_x = vec![false; (nx + 1) * ny];
        let mut open_y = vec![false; nx * (ny + 1)];
        let mut sets = Sets::new(grid.len());
        for &(a, b) in &pieces.contacts {
            if !(self.stands_for(pieces, a) && self.stands_for(pieces, b)) {
                continue;
            }
            let (from, to) = (pieces.cell[a as usize] as usize, pieces.cell[b as usize] as usize);
            sets.join(from as u32, to as u32);
            if to == from + 1 {
                open_x[(to / nx) * (nx + 1) + to % nx] = true;
            } else {
                open_y[to] = true;
            }
        }
        let group = self.chosen.iter().map(|&piece| match piece {
            NONE => NO_ISLAND,
            piece => pieces.group[piece as usize],
        });
        let group = group.collect();
        let mut cut_x = Vec::new();
        let mut cut_y = Vec::new();
        for cell in 0..grid.len() {
            let (ix, iy) = (cell % nx, cell / nx);
            if !copper[cell] {
                continue;
            }
            let face = iy * (nx + 1) + ix;
            if ix > 0 && copper[cell - 1] && !open_x[face] {
                cut_x.push(face);
            }
            if iy > 0 && copper[cell - nx] && !open_y[cell] {
                cut_y.push(cell);
            }
        }
        let mut number = vec![NO_ISLAND; grid.len()];
        let mut island = vec![NO_ISLAND; grid.len()];
        let mut islands = 0;
        for cell in (0..grid.len()).filter(|&cell| copper[cell]) {
            let root = sets.find(cell as u32) as usize;
            if number[root] == NO_ISLAND {
                number[root] = islands;
                islands += 1;
            }
            island[cell] = number[root];
        }
        Mask {
            grid: *grid,
            copper,
            cut_x,
            cut_y,
            island,
            islands: islands as usize,
            group,
            neck_cells: self.neck_cells,
            crumbs,
            severed,
        }
    }
}

/// The pieces on the way to `piece`, itself included, back to the island where the way began.
fn way_to(reached: &BTreeMap<u32, Option<u32>>, piece: u32) -> Vec<u32> {
    let mut way = Vec::new();
    let mut at = piece;
    while let Some(&Some(before)) = reached.get(&at) {
        way.push(at);
        at = before;
    }
    way
}

/// Contacts of each piece.
struct Neighbours {
    first: Vec<u32>,
    list: Vec<u32>,
}

impl Neighbours {
    fn of(pieces: &Pieces) -> Self {
        let mut first = vec![0u32; pieces.len() + 1];
        for &(a, b) in &pieces.contacts {
            first[a as usize + 1] += 1;
            first[b as usize + 1] += 1;
        }
        for at in 1..first.len() {
            first[at] += first[at - 1];
        }
        let mut next = first.clone();
        let mut list = vec![0; 2 * pieces.contacts.len()];
        for &(a, b) in &pieces.contacts {
            for (from, to) in [(a, b), (b, a)] {
                list[next[from as usize] as usize] = to;
                next[from as usize] += 1;
            }
        }
        Self { first, list }
    }

    fn of_piece(&self, piece: u32) -> &[u32] {
        &self.list[self.first[piece as usize] as usize..self.first[piece as usize + 1] as usize]
    }
}

/// Disjoint sets with path halving; the smaller number is the root, so results do not depend on the order.
struct Sets(Vec<u32>);

impl Sets {
    fn new(len: usize) -> Self {
        Self((0..len as u32).collect())
    }

    fn find(&mut self, mut at: u32) -> u32 {
        while self.0[at as usize] != at {
            self.0[at as usize] = self.0[self.0[at as usize] as usize];
            at = self.0[at as usize];
        }
        at
    }

    fn join(&mut self, a: u32, b: u32) {
        let (a, b) = (self.find(a), self.find(b));
        self.0[a.max(b) as usize] = a.min(b);
    }
}
