//! Codes of findings, and of messages about limits and waivers.

use super::Code;

/// Voids make the return longer.
pub const DETOUR: Code = Code {
    name: "return-detour",
    meaning: "Voids of the plane make the return of this path go round. Figure: loop inductance of track and plane less \
              that of the same path over the plane with all voids filled, L(Z) - L(Z0), or the extra path \
              int (|Re K| - |Re K0|) dA / I, whichever is the larger part of its limit, in the band where it is worst. \
              Extra inductance turns fast current into voltage along the reference: v = L di/dt. The cause is the void \
              whose share of Z - Z0 is largest; the place is where the track passes it. Usual remedies, each tried by \
              the solver where it applies: fill or shorten the void, bridge it with copper right under the track, \
              move the track past its end. Cautions: a moat may be there on purpose; do not bridge, narrow or fill one \
              that keeps mains, patients or other hazards apart. Local codes, the standards for creepage and clearance \
              and a licensed practitioner decide there, not this figure.",
};

/// A part of the return is pushed away from the track.
pub const SHARE_DROP: Code = Code {
    name: "share-drop",
    meaning: "At one place of the track much less of the return flows within three heights of it than without voids: \
              antipads in a row, a slot or a notch squeeze it aside. Figure: share within 3h without voids less share \
              within 3h at the same station, at the worst station farther than 5h from landings and bends. Tracks \
              that squeeze through the same web share its copper, so they couple by resistance and inductance. Usual \
              remedies: smaller antipads or a wider pitch, so that the webs between them become wider than 2h; a \
              track that passes round the row. Cautions: antipads keep a clearance; where the hole belongs to mains or \
              to a safety barrier, local codes and licensed practice set it and not this figure.",
};

/// The track runs near the plane's edge.
pub const PLANE_EDGE: Code = Code {
    name: "plane-edge",
    meaning: "The track runs so near to the edge of its plane that the return piles up there. Figure: in-phase density \
              along the track within h of the plane's edge, in units of 1/(pi h), at the worst station. A filament 2h \
              inside the edge gives about 0.5, 5h inside 0.1, 10h inside 0.03 (half-plane, exact solution of a \
              filament over a perfect half-plane). Fields of the edge reach other boards, cables and the chassis. \
              Usual remedy: move the track inside by several heights; the tool tries distances and says what is \
              gained. Cautions: at a board's edge clearances to mains, chassis and live parts may apply: see local \
              codes and let licensed practice decide.",
};

/// No via for the return near a layer change.
pub const RETURN_VIA: Code = Code {
    name: "return-via",
    meaning: "The track changes its layer, and with it the plane that carries the return, but no via joins the two planes \
              near by. Figure: loop inductance of the path less that of the same path with a return via beside each \
              change, in the band where it is worst. Where no via within 3 mm (common practice) joins the planes at \
              all, the figure is the inductance of the cavity between signal via and nearest joining via, (mu0 s/2 pi) \
              ln(D/a), an estimate for one via of radius a at distance D between planes s apart. Usual remedies: a via \
              of the reference beside the signal via, at the best of several places tried; or the same plane all along. \
              Cautions: never join planes that a safety barrier keeps apart, whatever the figure; local codes and \
              licensed practice come first.",
};

/// Return of one zone flows through another.
pub const STRAY: Code = Code {
    name: "stray-return",
    meaning: "Return current of this path flows through a zone to which neither of its ends belongs. Figure: half of \
              int |Re K_n| dl / I along the outline of the zone inside the board, less 1/2 for each time that the track \
              itself crosses it; the excess over the same figure without voids is compared with the limit. Usual \
              remedies: keep the track away from the boundary by several heights, open the way that the return would \
              take without voids. A moat rarely helps: what crosses it makes the return longer. Cautions: zones of \
              mains or of patient circuits follow local codes and licensed practice, not this figure.",
};

/// Noise above the budget of a path.
pub const NOISE: Code = Code {
    name: "noise-over-budget",
    meaning: "Other paths put more noise into this one than its budget bears. Figure: root of the sum over all paths, bands \
              and lines of |Z_AB(f) I_A(f)|^2, where Z_AB is the transfer impedance by shared copper and by induction \
              (the direct mutual inductance of the two tracks included) and I_A the rms current of path A's drive; \
              drives are taken as independent of each other. The largest contributor is named; the place is where it \
              comes nearest. Usual remedies: more distance between the two tracks, the switching loop made smaller or \
              turned, a plane without voids under both, another plane for one of them. Cautions: the noise at the \
              path's end in an open circuit is no proof for the finished instrument.",
};

/// Two paths use the same copper.
pub const COMMON_RETURN: Code = Code {
    name: "common-return",
    meaning: "The returns of two paths use the same copper of a plane to a large part. Figure: |Z_AB| at the frequency where \
              it is largest; the area where both densities lie above the level that encloses 80 % of each is given \
              beside it. It is a note: whether it matters depends on the currents and on what the other path bears; give \
              `drive` and `budget` in the review to have the noise in volts.",
};

/// The return keeps no company with the track.
pub const SPREAD_RETURN: Code = Code {
    name: "spread-return",
    meaning: "Even without voids only a small part of the return flows within three heights of the track in the highest \
              band: the track lies high above its plane for its width, runs near an edge, or the frequency is low. It is \
              a note and never more: an absolute share is no measure of a fault. A plane nearer to the track, which the \
              stackup decides, raises it.",
};

/// A waiver that is over.
pub const WAIVER_EXPIRED: Code = Code {
    name: "waiver-expired",
    meaning: "A waiver of the review names the revision with which it ends, and the board has reached it, or the two cannot \
              be compared. The finding counts again. Mend it, or decide anew and give the waiver a later revision. \
              Revisions compare letter groups by length and then by the alphabet, numbers by value: 9 comes before \
              10, B before AA.",
};

/// A waiver for which there is no finding.
pub const WAIVER_UNUSED: Code = Code {
    name: "waiver-unused",
    meaning: "A waiver of the review fits no finding of this run: the fault is mended, or the name of the path is mistyped. \
              Remove it, so that it does not hide a later finding of the same kind.",
};

/// A remedy could not be tried.
pub const REMEDY_UNTRIED: Code = Code {
    name: "remedy-untried",
    meaning: "A change that might mend a finding could not be solved, so nothing is said of it: the changed board has no \
              solution on these cells. The finding itself stands. Smaller cells under `[solver]` may help.",
};

/// Codes that a finding can have, and that a waiver can name.
pub const FINDINGS: &[Code] =
    &[DETOUR, SHARE_DROP, PLANE_EDGE, RETURN_VIA, STRAY, NOISE, COMMON_RETURN, SPREAD_RETURN];

/// All codes of this room.
pub const ALL: &[Code] = &[
    DETOUR,
    SHARE_DROP,
    PLANE_EDGE,
    RETURN_VIA,
    STRAY,
    NOISE,
    COMMON_RETURN,
    SPREAD_RETURN,
    WAIVER_EXPIRED,
    WAIVER_UNUSED,
    REMEDY_UNTRIED,
];
