//! What lies in and between the copper layers.

/// Where a value comes from.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Origin {
    /// The fabrication data.
    File,
    /// The review, which overrides the files.
    Review,
    /// Neither says: a stated default.
    Assumed,
}

/// A copper foil.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Foil {
    /// Thickness in metres.
    pub thickness_m: f64,
    /// Where the thickness comes from.
    pub origin: Origin,
}

/// The dielectric between two copper layers; several sheets of material are one entry.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Dielectric {
    /// Thickness from copper face to copper face in metres.
    pub thickness_m: f64,
    /// Where the thickness comes from.
    pub origin: Origin,
    /// Relative permittivity.
    pub permittivity: f64,
    /// Where the permittivity comes from.
    pub permittivity_origin: Origin,
}

/// The layers of the board from the top to the bottom.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Stackup {
    /// One foil for each copper layer.
    pub foils: Vec<Foil>,
    /// One dielectric below each foil but the last.
    pub dielectrics: Vec<Dielectric>,
    /// Temperature of the copper in degC.
    pub temperature_c: f64,
}

impl Stackup {
    /// Height of the upper face of foil `layer` (index from 0) below the upper face of the top foil, in metres.
    pub fn depth_m(&self, layer: usize) -> f64 {
        let copper: f64 = self.foils[..layer].iter().map(|foil| foil.thickness_m).sum();
        let between: f64 = self.dielectrics[..layer].iter().map(|sheet| sheet.thickness_m).sum();
        copper + between
    }

    /// Distance between the facing copper faces of two layers (indices from 0) in metres, foils between included.
    pub fn gap_m(&self, a: usize, b: usize) -> f64 {
        let (upper, lower) = (a.min(b), a.max(b));
        if upper == lower {
            return 0.0;
        }
        self.depth_m(lower) - self.depth_m(upper) - self.foils[upper].thickness_m
    }
}
