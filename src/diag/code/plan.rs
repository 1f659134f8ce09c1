//! Codes raised by the room `plan`.

use super::Code;

/// A net of the review that the board lacks.
pub const NET_UNKNOWN: Code = Code {
    name: "net-unknown",
    meaning: "The review names a net, or a pattern, that fits no net of the board. Names are compared letter by \
              letter, `*` stands for any text. `ebbmap look BOARD` lists the nets.",
};

/// A reference net shall be charted.
pub const NET_IS_REFERENCE: Code = Code {
    name: "net-is-reference",
    meaning: "A net under `[reference]` carries the return of the others, so it cannot be charted as a signal. \
              Remove it from one of the two places.",
};

/// A net with fewer than two pins.
pub const NET_FEW_PINS: Code = Code {
    name: "net-few-pins",
    meaning: "A current needs a pin to start from and a pin to end at; the net has fewer than two pins in the \
              fabrication data, so there is nothing to chart.",
};

/// A driver or receiver that is not on the net.
pub const PIN_UNKNOWN: Code = Code {
    name: "pin-unknown",
    meaning: "A pin that the review names does not exist or is on another net. Pins are written as part, dot, \
              number, for example `U5.19`; the message lists those of the net.",
};

/// A net with more than two pins needs its ends named.
pub const PINS_NEEDED: Code = Code {
    name: "net-pins-needed",
    meaning: "The net has more than two pins, so where its current starts and ends must be said with `driver` and \
              `receiver`. Only a net with exactly two pins needs neither.",
};

/// A path whose parts do not follow each other.
pub const PATH_BROKEN: Code = Code {
    name: "path-broken",
    meaning: "A path must go on in one net from its driver to the first part that it passes, from the other pin of \
              each part to the next, and from the last one to its receivers. The message names the two pins that lie \
              on different nets, or a part that does not have two pins and must be given as its pins of entry and \
              exit.",
};

/// A path passes parts.
pub const PATH_THROUGH_PARTS: Code = Code {
    name: "path-through-parts",
    meaning: "Between two nets the current of a path passes a part. Its way inside the part is not in the \
              fabrication data; a straight strip from pad to pad, as wide as the narrower pad and as high as the \
              track, stands for it. The part's own resistance and inductance do not change the map and are not in \
              the loop's.",
};

/// No supply of a driver.
pub const SUPPLY_UNKNOWN: Code = Code {
    name: "supply-unknown",
    meaning: "With `landing = \"supply\"` or `\"both\"` the driver's return passes the capacitor nearest to the supply \
              pin of its part. No pin of the part is on a net with a capacitor (a part with two pins called C and a \
              number) to a reference net.",
};

/// No copper between the pins.
pub const TRACK_OPEN: Code = Code {
    name: "track-open",
    meaning: "The copper of the net does not lead from driver to receiver: a piece is missing in the fabrication \
              data, or the two are joined by a part and are two nets. The nearest gap is named.",
};

/// Part of the way crosses a pour.
pub const TRACK_ACROSS_AREA: Code = Code {
    name: "track-across-area",
    meaning: "Part of the signal's way runs across filled copper of its own net. There the current spreads; a \
              straight line across the area with the area's width stands for it, which is coarse.",
};

/// Further pins on the net.
pub const TRACK_FURTHER_PINS: Code = Code {
    name: "track-further-pins",
    meaning: "The net has more pins than driver and receiver. The whole current is taken to flow from driver to \
              receiver; what the other pins draw is not in the map.",
};

/// A pin that no copper reaches.
pub const TRACK_PIN_APART: Code = Code {
    name: "track-pin-apart",
    meaning: "A pin of the net has no copper way to the charted track in the fabrication data. The charted way is \
              not affected, but the data may be incomplete.",
};

/// An open branch.
pub const TRACK_BRANCH: Code = Code {
    name: "track-branch",
    meaning: "Copper of the net leaves the way from driver to receiver and ends open. It carries no current in \
              this map; at high frequencies its capacitance would draw some.",
};

/// A loop in the copper of the net.
pub const TRACK_LOOP: Code = Code {
    name: "track-loop",
    meaning: "The copper of the net offers a second way beside the shortest one. The current would divide between \
              them; here all of it is taken along the shortest way.",
};

/// No copper above or below.
pub const PLANE_NONE: Code = Code {
    name: "plane-none",
    meaning: "No copper area lies above or below the track on any layer, so its return has no plane to be charted \
              on. No map is drawn.",
};

/// Copper of another net lies nearer than the plane.
pub const PLANE_NOT_REFERENCE: Code = Code {
    name: "plane-not-reference",
    meaning: "Between the track and the plane that its map shows lies copper that is not of a net under \
              `[reference]`, for example a supply. The return flows on that copper first. It is solved together \
              with the planes as a sheet of its own, joined to them by what joins it on the board; if it carries \
              the return on its own account, name its net under `[reference]`.",
};

/// The plane of the review is not there.
pub const PLANE_UNKNOWN: Code = Code {
    name: "plane-unknown",
    meaning: "The plane that the review names does not exist on the board, or the track itself runs on its layer. \
              Planes are written as layer and net, for example `L2-GND`.",
};

/// The review chose another plane.
pub const PLANE_CHOSEN: Code = Code {
    name: "plane-chosen",
    meaning: "The review names a plane that is not the nearest reference copper of the track. Figures and pictures \
              are of the plane asked for; part of the return flows on the nearer one.",
};

/// The track lies between two planes.
pub const PLANE_BETWEEN: Code = Code {
    name: "plane-between",
    meaning: "Copper areas lie above and below the track at comparable distance, so they share the return. All are \
              solved together; each plane that carries at least 1 % has a map of its own.",
};

/// Reference copper beside the track.
pub const POUR_BESIDE: Code = Code {
    name: "pour-beside",
    meaning: "Reference copper on the track's own layer lies within three times the height over the plane and \
              takes a part of the return (about 45 % at a gap of one height, 24 % at 2.5). It is solved together \
              with the planes as a sheet of its own.",
};

/// No landing.
pub const LANDING_NONE: Code = Code {
    name: "landing-none",
    meaning: "Where the return enters or leaves the plane is not known: the part has no pin of the plane's net that \
              leads to the plane, and no via of it lies within 3 mm. Name a pin or a point with `driver_landing` \
              or `receiver_landing` in the net's entry.",
};

/// A landing of the review cannot be used.
pub const LANDING_BAD: Code = Code {
    name: "landing-bad",
    meaning: "The landing that the review names does not lead to the plane: the pin does not exist, is of another \
              net, or has no via to the plane, or the point is not on the plane's copper.",
};

/// A landing was found away from the part.
pub const LANDING_NEAREST_VIA: Code = Code {
    name: "landing-nearest-via",
    meaning: "The part has no reference pin of its own that leads to the plane, so the nearest via of the plane's \
              net is taken as the place where the return leaves it. Name the true place with `driver_landing` or \
              `receiver_landing` if it is another.",
};

/// The return has no way.
pub const RETURN_OPEN: Code = Code {
    name: "return-open",
    meaning: "The return enters one piece of copper and must leave another, and no via, pin, tie or part joins the \
              two, not even a capacitor. No current can flow that way, so nothing is drawn. Either the fabrication \
              data lack something that `[[part]]` or `[[tie]]` can add, or a landing is not where it is, or the \
              board has no return for this path, which is a fault to mend.",
};

/// The return passes capacitors.
pub const RETURN_THROUGH_CAPACITORS: Code = Code {
    name: "return-through-capacitors",
    meaning: "The pieces of copper at the two ends of the path are joined by capacitors only. The return flows \
              through them at high frequency; at 0 Hz there is none, so no map can be drawn there.",
};

/// A part of the review that the board lacks.
pub const PART_UNKNOWN: Code = Code {
    name: "part-unknown",
    meaning: "An entry `[[part]]` fits no part of the board: no reference is equal or fits the pattern, no part has \
              the value, or none has pins on all the nets. Parts are known from the pins that the fabrication data \
              name; values only from component data.",
};

/// A part that cannot be a joint.
pub const PART_NO_JOINT: Code = Code {
    name: "part-no-joint",
    meaning: "A part with values under `[[part]]` must have pins on two nets, between which it is a branch of \
              resistance, inductance and capacitance in series; a part with `joins` must have pins on the nets that \
              it joins. Two pins of a larger part can be tied with `[[tie]]`.",
};

/// Default values of parts.
pub const PART_VALUE_ASSUMED: Code = Code {
    name: "part-value-assumed",
    meaning: "Parts that join copper carry return, and neither the review nor the fabrication data say their value, \
              so common values were taken: capacitors 100 nF with 20 mohm and 0.5 nH in series, beads 0.1 ohm and \
              1 uH, inductors 10 uH, resistors between two reference nets as links of 1 mohm. Check them and give \
              the true ones with `[[part]]`.",
};

/// Resistors left open.
pub const PART_OPEN: Code = Code {
    name: "part-open",
    meaning: "A resistor whose value nobody says lies between copper of two nets that are not both reference nets. \
              It is left out: as a link it could join a supply to ground. `[[part]]` with `resistance` puts it in.",
};

/// A tie of the review that cannot be made.
pub const TIE_BAD: Code = Code {
    name: "tie-bad",
    meaning: "An end of a `[[tie]]` must be a place on copper that carries return: a pin that leads to it, a point on \
              it or within 3 mm, or a net with such copper there; or a node outside the board. The message says which \
              end it is not.",
};

/// Plating of barrels.
pub const PLATING_ASSUMED: Code = Code {
    name: "plating-assumed",
    meaning: "Fabrication data do not say how thick the copper in barrels is; 20 um is taken, the mean that common \
              practice asks for. It sets the resistance of vias, which matters at low frequency only. \
              `plating = \"25um\"` under `[stackup]` says otherwise.",
};

/// A band above what a path holds for.
pub const BAND_BEYOND: Code = Code {
    name: "band-beyond",
    meaning: "The maps are quasi-static: they hold while the board and the loop are shorter than a tenth of a \
              wavelength in the board's dielectric. Above that displacement current and standing waves move the \
              return; the spread across the track stays right, where it closes does not.",
};

/// The cell was enlarged for memory.
pub const CELL_ENLARGED: Code = Code {
    name: "cell-enlarged",
    meaning: "Cells as small as the height of the track would take too much memory on this board, so larger ones \
              are planned; the numerical error beside each figure grows accordingly. `cell` under `[solver]` or \
              `--cell` forces another size.",
};

/// All codes of this room.
pub const ALL: &[Code] = &[
    NET_UNKNOWN,
    NET_IS_REFERENCE,
    NET_FEW_PINS,
    PIN_UNKNOWN,
    PINS_NEEDED,
    PATH_BROKEN,
    PATH_THROUGH_PARTS,
    SUPPLY_UNKNOWN,
    TRACK_OPEN,
    TRACK_ACROSS_AREA,
    TRACK_FURTHER_PINS,
    TRACK_PIN_APART,
    TRACK_BRANCH,
    TRACK_LOOP,
    PLANE_NONE,
    PLANE_NOT_REFERENCE,
    PLANE_UNKNOWN,
    PLANE_CHOSEN,
    PLANE_BETWEEN,
    POUR_BESIDE,
    LANDING_NONE,
    LANDING_BAD,
    LANDING_NEAREST_VIA,
    RETURN_OPEN,
    PART_UNKNOWN,
    PART_NO_JOINT,
    PART_VALUE_ASSUMED,
    PART_OPEN,
    TIE_BAD,
    RETURN_THROUGH_CAPACITORS,
    PLATING_ASSUMED,
    BAND_BEYOND,
    CELL_ENLARGED,
];
