//! Codes raised by the room `field`.

use super::Code;

/// The landings of a net lie on copper that is not connected.
pub const LANDINGS_APART: Code = Code {
    name: "landings-apart",
    meaning: "The return of the net would have to enter the plane on one island and leave it on another. No current \
              on this plane alone does that, so no map is drawn. Join the islands on the board, name landings on \
              one island with `driver_landing` and `receiver_landing`, or name another plane.",
};

/// The return finds no way between the places where it enters the copper.
pub const RETURN_OPEN: Code = Code {
    name: "return-does-not-close",
    meaning: "The current enters copper that no copper, via, tie or part joins to where it must leave, at the \
              frequency of the band (a capacitor joins nothing at DC). No current does that, so no map is drawn. Join \
              the copper on the board, or tell of what joins it.",
};

/// A landing is nowhere near the plane's copper.
pub const LANDING_OFF_COPPER: Code = Code {
    name: "landing-off-copper",
    meaning: "The circle over which the return would enter the plane covers none of its copper, nor does a ring of \
              two cells round it. Name a landing on the plane with `driver_landing` or `receiver_landing`.",
};

/// A cell holds copper that must stay apart.
pub const CELL_TOO_LARGE: Code = Code {
    name: "cell-too-large",
    meaning: "Two pieces of copper that are not connected, or two necks, pass through one cell, so cells of this \
              size cannot stand for the plane. The cell is halved up to two times; where that is not enough, no map \
              is drawn. Set a smaller `cell` under `[solver]`.",
};

/// The cell was halved.
pub const CELL_HALVED: Code = Code {
    name: "cell-halved",
    meaning: "Cells of the size asked for cannot stand for the plane: two pieces of copper pass through one cell. \
              The map is solved on smaller cells.",
};

/// Cells show the plane with small changes.
pub const PLANE_ON_CELLS: Code = Code {
    name: "plane-on-cells",
    meaning: "Necks narrower than a cell are kept a cell wide, so that what is connected stays connected; their \
              resistance comes out too low. Loose pieces of copper smaller than half a cell are left out. Set a \
              smaller `cell` under `[solver]` where such a neck carries the return.",
};

/// The iteration did not converge.
pub const NOT_CONVERGED: Code = Code {
    name: "solve-not-converged",
    meaning: "The iteration did not reach the tolerance. A map is never drawn from such a solution.",
};

/// The plane could not be prepared.
pub const NOT_FACTORED: Code = Code {
    name: "plane-not-factored",
    meaning: "The network of the plane's cells could not be factored, most likely because memory ran out. No map is \
              drawn. Set a larger `cell` under `[solver]`.",
};

/// Paths could not be solved together.
pub const COUPLING_UNSOLVED: Code = Code {
    name: "coupling-unsolved",
    meaning: "Transfer impedances between paths need all paths on the same copper and cells, twice as large as those of \
              the maps; that could not be solved, so nothing is said of noise. The maps and all other findings stand. \
              Smaller cells under `[solver]` may help.",
};

/// A band without a line of the drive.
pub const BAND_SILENT: Code = Code {
    name: "band-silent",
    meaning: "The drive of the net or path has no spectral line in this band, so it carries no current there and there \
              is no map. Nothing is wrong; a clock for example has nothing below its own frequency.",
};

/// All codes of this room.
pub const ALL: &[Code] = &[
    LANDINGS_APART,
    RETURN_OPEN,
    LANDING_OFF_COPPER,
    CELL_TOO_LARGE,
    CELL_HALVED,
    PLANE_ON_CELLS,
    NOT_CONVERGED,
    NOT_FACTORED,
    COUPLING_UNSOLVED,
    BAND_SILENT,
];
