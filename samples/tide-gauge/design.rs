//! The description of a board from which its fabrication data are written: parts, nets, copper, holes. Millimetres, y up.

/// A point in millimetres.
pub type Xy = (f64, f64);

/// Length of a vector; only operations that are exact to the last digit on every machine.
pub fn length(x: f64, y: f64) -> f64 {
    (x * x + y * y).sqrt()
}

/// Number of copper layers.
pub const N_LAYERS: usize = 4;

/// Shape of a pad, centred on its place; widths run along x.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Shape {
    /// Circle: diameter.
    Round(f64),
    /// Rectangle: width and height.
    Rect(f64, f64),
    /// Rectangle with rounded corners: width, height, radius.
    Rounded(f64, f64, f64),
    /// Rectangle with round ends.
    Oval(f64, f64),
}

impl Shape {
    /// Width and height.
    pub fn size(self) -> Xy {
        match self {
            Shape::Round(d) => (d, d),
            Shape::Rect(w, h) | Shape::Rounded(w, h, _) | Shape::Oval(w, h) => (w, h),
        }
    }

    /// The shape turned by 90 degrees.
    pub fn turned(self) -> Self {
        match self {
            Shape::Round(d) => Shape::Round(d),
            Shape::Rect(w, h) => Shape::Rect(h, w),
            Shape::Rounded(w, h, r) => Shape::Rounded(h, w, r),
            Shape::Oval(w, h) => Shape::Oval(h, w),
        }
    }
}

/// A pad of a part, in place.
#[derive(Clone, Debug)]
pub struct Pad {
    /// Number of the pin.
    pub number: String,
    /// Its net; empty where the pin is not connected.
    pub net: String,
    /// Centre.
    pub at: Xy,
    /// Shape in place.
    pub shape: Shape,
    /// Diameter of the plated hole; none for a pad on the top layer alone.
    pub drill: Option<f64>,
    /// From the middle of the hole to the centre of each round end of a routed slot; zero for a round hole.
    pub slot: Xy,
}

/// A part, in place on the top side.
#[derive(Clone, Debug)]
pub struct Part {
    /// Reference, for example `U3`.
    pub reference: String,
    /// Value, for example `100nF`.
    pub value: String,
    /// Name of the land pattern.
    pub package: &'static str,
    /// Centre.
    pub at: Xy,
    /// Turned by so many quarter turns, counter-clockwise.
    pub quarters: u8,
    /// Width and height of the body in place.
    pub body: Xy,
    /// Pads in the order of their numbers.
    pub pads: Vec<Pad>,
}

/// A track on one layer.
#[derive(Clone, Debug, PartialEq)]
pub struct Track {
    /// Its net.
    pub net: String,
    /// Layer, from 0 at the top.
    pub layer: usize,
    /// Width.
    pub width: f64,
    /// Corners, at least two.
    pub path: Vec<Xy>,
    /// The variant of the board that has it; empty for all.
    pub tag: &'static str,
}

/// A via through all layers.
#[derive(Clone, Debug, PartialEq)]
pub struct Via {
    /// Its net.
    pub net: String,
    /// Place.
    pub at: Xy,
    /// The variant of the board that has it; empty for all.
    pub tag: &'static str,
}

/// Drill diameter of every via.
pub const VIA_DRILL: f64 = 0.3;
/// Pad diameter of every via.
pub const VIA_PAD: f64 = 0.6;

/// How a copper area is written.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Style {
    /// Contours with cut-ins round every hole.
    Keyhole,
    /// A dark area, clear objects for the clearances, then the rest of the layer in dark again.
    Clear,
}

/// A copper area with clearances round what does not belong to it.
#[derive(Clone, Debug)]
pub struct Pour {
    /// Its net.
    pub net: String,
    /// Layer, from 0 at the top.
    pub layer: usize,
    /// Its limits, counter-clockwise.
    pub outline: Vec<Xy>,
    /// Radius of the outline's convex corners (only with [`Style::Clear`]).
    pub corner: f64,
    /// How it is written.
    pub style: Style,
    /// Distance to other copper.
    pub clearance: f64,
    /// Whether pads with holes are joined by four spokes.
    pub relief: bool,
    /// Areas of a higher rank take their place from those of a lower one.
    pub rank: u8,
}

/// A slot in a copper area, drawn with a round pen.
#[derive(Clone, Debug)]
pub struct Cut {
    /// Layer, from 0 at the top.
    pub layer: usize,
    /// Centre line.
    pub path: Vec<Xy>,
    /// Width.
    pub width: f64,
    /// The variant of the board that has it; empty for all.
    pub tag: &'static str,
}

/// Copper of a part that ties two nets together: no net of its own.
#[derive(Clone, Debug)]
pub struct Tie {
    /// Reference of the part.
    pub reference: String,
    /// Layer, from 0 at the top.
    pub layer: usize,
    /// Corners.
    pub corners: Vec<Xy>,
}

/// A hole without barrel.
#[derive(Clone, Copy, Debug)]
pub struct BareHole {
    /// Centre.
    pub at: Xy,
    /// Diameter.
    pub diameter: f64,
}

/// A board.
#[derive(Clone, Debug, Default)]
pub struct Design {
    /// Title of the project.
    pub title: String,
    /// Revision.
    pub revision: String,
    /// Stem of the file names.
    pub stem: String,
    /// Identifier of the project in the form that the Gerber format asks for.
    pub guid: String,
    /// Width and height; the lower left corner is (0, 0).
    pub size: Xy,
    /// Radius of the board's corners.
    pub corner: f64,
    /// Parts.
    pub parts: Vec<Part>,
    /// Tracks.
    pub tracks: Vec<Track>,
    /// Vias.
    pub vias: Vec<Via>,
    /// Copper areas.
    pub pours: Vec<Pour>,
    /// Slots in copper areas.
    pub cuts: Vec<Cut>,
    /// Holes without barrel.
    pub holes: Vec<BareHole>,
    /// Filled triangles and the like that widen a track towards a pad: net, layer, corners.
    pub drops: Vec<(String, usize, Vec<Xy>)>,
    /// Copper that ties nets together.
    pub ties: Vec<Tie>,
    /// Nets from which areas on the same layer keep a wider distance, and that distance.
    pub quiet: (Vec<String>, f64),
}

impl Design {
    /// Lays a track.
    pub fn track(&mut self, net: &str, layer: usize, width: f64, path: &[Xy]) {
        self.tracks.push(Track { net: net.into(), layer, width, path: path.to_vec(), tag: "" });
    }

    /// Sets a via.
    pub fn via(&mut self, net: &str, at: Xy) {
        self.vias.push(Via { net: net.into(), at, tag: "" });
    }

    /// Lays a track that only one variant of the board has.
    pub fn track_in(&mut self, tag: &'static str, net: &str, layer: usize, width: f64, path: &[Xy]) {
        self.tracks.push(Track { net: net.into(), layer, width, path: path.to_vec(), tag });
    }

    /// Keeps what all variants have and what the named ones have.
    pub fn choose(&mut self, tags: &[&str]) {
        let kept = |tag: &str| tag.is_empty() || tags.contains(&tag);
        self.tracks.retain(|track| kept(track.tag));
        self.vias.retain(|via| kept(via.tag));
        self.cuts.retain(|cut| kept(cut.tag));
    }

    /// Sets vias of one net.
    pub fn vias(&mut self, net: &str, places: &[Xy]) {
        for &at in places {
            self.via(net, at);
        }
    }
}
