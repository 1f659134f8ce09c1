//! Codes raised by the room `read`.

use super::Code;

/// Text that breaks the rules of the Gerber format.
pub const GERBER_SYNTAX: Code = Code {
    name: "gerber-syntax",
    meaning: "A command of a Gerber file breaks the rules of the format or is not supported. Nothing is guessed: a \
              file with such an error is not used. Export the file again, or correct the line named.",
};
/// A Gerber file without its end.
pub const GERBER_CUT_OFF: Code = Code {
    name: "gerber-cut-off",
    meaning: "A Gerber file ends without its end command M02, as happens when a transfer or an unpacking stops half \
              way. What is missing cannot be known, so the file is not used. Export or unpack it again.",
};
/// An attribute that cannot be used.
pub const GERBER_ATTRIBUTE: Code = Code {
    name: "gerber-attribute",
    meaning: "An attribute (net, pin, part, function) is not complete and was left out. The copper that carries it \
              may be without a net or a pin.",
};
/// Draws with a pen that is not round.
pub const GERBER_PEN: Code = Code {
    name: "gerber-pen",
    meaning: "Copper is drawn with a rectangle or another shape that is not round. It counts as an area with the exact \
              outline, not as a track.",
};
/// A contour that does not close.
pub const GERBER_CONTOUR: Code = Code {
    name: "gerber-contour",
    meaning: "A contour of a filled area does not end where it began. The gap was closed by a straight line.",
};

/// A file that cannot be read.
pub const FILE_UNREADABLE: Code = Code {
    name: "file-unreadable",
    meaning: "A file or folder does not exist, may not be read, or is larger than the tool accepts.",
};
/// An archive that cannot be used.
pub const FILE_ARCHIVE: Code = Code {
    name: "file-archive",
    meaning: "The file given is no ZIP archive, or holds names that lead out of the archive (absolute or with `..`). \
              Unpack it by other means, look at what is inside, and give the folder.",
};
/// A file that is not used.
pub const FILE_IGNORED: Code = Code {
    name: "file-ignored",
    meaning: "A file of the folder or archive is not used, for the reason given.",
};
/// Text that breaks the rules of drill files.
pub const DRILL_SYNTAX: Code = Code {
    name: "drill-syntax",
    meaning: "A line of a drill file breaks the rules of the format or is not supported. Nothing is guessed: a file \
              with such an error is not used. Export the file again, or correct the line named.",
};
/// A drill file without its end.
pub const DRILL_CUT_OFF: Code = Code {
    name: "drill-cut-off",
    meaning: "A drill file ends without its end command M30, as happens when a transfer or an unpacking stops half \
              way. Export or unpack it again.",
};
/// A job file that cannot be used.
pub const JOB_UNREADABLE: Code = Code {
    name: "job-unreadable",
    meaning: "The job file is not JSON and was left out: title and stackup must come from the review.",
};

/// A copper layer in negative polarity.
pub const GERBER_NEGATIVE: Code = Code {
    name: "gerber-negative",
    meaning: "A copper layer is exported as a negative (what is drawn is removed). Its net is not stated \
              anywhere then. Export the layer as a positive.",
};
/// Two files that say they are the same.
pub const SET_DUPLICATE: Code = Code {
    name: "set-duplicate",
    meaning: "Two files of the set say that they are the same layer or drill set, as stale files do that \
              an earlier export left behind. The newest by creation date was used. Remove the other one.",
};
/// A file that does not say what it is.
pub const SET_FUNCTION: Code = Code {
    name: "set-function",
    meaning: "A file has no usable FileFunction attribute. File names are never trusted alone; the job \
              file's word is taken where it has one, else the file is not used.",
};
/// Missing copper layers.
pub const SET_COPPER: Code = Code {
    name: "set-copper",
    meaning: "The set lacks a copper layer, or has none that says which layer it is. Export all copper \
              layers as Gerber X2.",
};
/// Copper without nets.
pub const SET_NETS: Code = Code {
    name: "set-nets",
    meaning: "No copper object carries a net. The tool needs nets: export Gerber X2 with net attributes.",
};
/// The job file contradicts a file.
pub const JOB_CONTRADICTS: Code = Code {
    name: "job-contradicts",
    meaning: "The job file and a file's own attribute disagree on what the file is. The file's own word \
              was taken, since layer numbers in job files are known to be wrong at times.",
};
/// An open line in the profile.
pub const OUTLINE_OPEN: Code =
    Code { name: "outline-open", meaning: "A line of the board's profile does not close and was left out." };
/// A gap in the profile.
pub const OUTLINE_GAP: Code = Code {
    name: "outline-gap",
    meaning: "Lines of the board's profile end up to 0.25 mm apart and were joined by a straight line.",
};
/// No usable profile.
pub const OUTLINE_MISSING: Code = Code {
    name: "outline-missing",
    meaning: "The set has no profile, or one without a closed line. The board was taken to be the box \
              round all of its copper.",
};
/// Assumed thickness or permittivity.
pub const STACKUP_ASSUMED: Code = Code {
    name: "stackup-assumed",
    meaning: "The files do not give a thickness or permittivity and it was assumed as stated: copper 35 \
              um, permittivity 4.3, board 1.6 mm, dielectrics an even split. The height over the plane \
              decides the width of the return current: give the real stackup in the review.",
};
/// A stackup that looks like a default.
pub const STACKUP_DEFAULT: Code = Code {
    name: "stackup-default",
    meaning: "All dielectrics have the same thickness. Programs write that when nobody entered the real \
              stackup.",
};
/// A pin with two nets.
pub const PIN_NETS: Code =
    Code { name: "pin-nets", meaning: "Pads of the same pin carry different nets. The first was used." };
/// Copper without a net that touches nets.
pub const NET_TOUCH: Code = Code {
    name: "net-touch",
    meaning: "Copper without a net touches copper of two or more nets and is not marked as part of a net \
              tie. It joins these nets in the made board, but not in the maps.",
};
/// A barrel that touches two nets.
pub const HOLE_NETS: Code = Code {
    name: "hole-nets",
    meaning: "A plated hole touches copper of different nets. Its barrel joins nothing in the maps.",
};
/// Layers that do not exist.
pub const DRILL_SPAN: Code = Code {
    name: "drill-span",
    meaning: "A drill file names a span of layers that the board does not have, so its barrels cannot be placed. \
                  Compare the file's `TF.FileFunction` with the number of copper layers.",
};
/// Holes of unknown plating.
pub const DRILL_PLATING: Code = Code {
    name: "drill-plating",
    meaning: "A drill file does not say which holes are plated. Those that lie in a pad were taken as \
              plated.",
};
/// No drill file.
pub const DRILL_MISSING: Code = Code {
    name: "drill-missing",
    meaning: "The set has no drill file, so no layers are joined and landings cannot be found through \
              vias.",
};

/// All codes of this room.
pub const ALL: &[Code] = &[
    GERBER_SYNTAX,
    GERBER_CUT_OFF,
    GERBER_ATTRIBUTE,
    GERBER_PEN,
    GERBER_CONTOUR,
    FILE_UNREADABLE,
    FILE_ARCHIVE,
    FILE_IGNORED,
    DRILL_SYNTAX,
    DRILL_CUT_OFF,
    JOB_UNREADABLE,
    GERBER_NEGATIVE,
    SET_DUPLICATE,
    SET_FUNCTION,
    SET_COPPER,
    SET_NETS,
    JOB_CONTRADICTS,
    OUTLINE_OPEN,
    OUTLINE_GAP,
    OUTLINE_MISSING,
    STACKUP_ASSUMED,
    STACKUP_DEFAULT,
    PIN_NETS,
    NET_TOUCH,
    HOLE_NETS,
    DRILL_SPAN,
    DRILL_PLATING,
    DRILL_MISSING,
];
