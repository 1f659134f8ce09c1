//! The five bundled font faces and their license text.

/// A bundled font face.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub enum Face {
    /// Normal width, regular.
    Regular,
    /// Normal width, semi-bold.
    Bold,
    /// Narrow, regular.
    Narrow,
    /// Narrow, semi-bold.
    NarrowBold,
    /// Narrow, italic: symbols of quantities.
    NarrowItalic,
}

impl Face {
    /// All faces, in the order of their files in pictures.
    pub const ALL: [Self; 5] =
        [Self::Regular, Self::Bold, Self::Narrow, Self::NarrowBold, Self::NarrowItalic];

    /// The font file.
    pub fn bytes(self) -> &'static [u8] {
        match self {
            Self::Regular => include_bytes!("../../styles/fonts/IBMPlexSans-Regular.ttf"),
            Self::Bold => include_bytes!("../../styles/fonts/IBMPlexSans-SemiBold.ttf"),
            Self::Narrow => include_bytes!("../../styles/fonts/IBMPlexSansCondensed-Regular.ttf"),
            Self::NarrowBold => include_bytes!("../../styles/fonts/IBMPlexSansCondensed-SemiBold.ttf"),
            Self::NarrowItalic => include_bytes!("../../styles/fonts/IBMPlexSansCondensed-Italic.ttf"),
        }
    }

    /// Family name under which a subset of the face is embedded. The font's license reserves the original name for
    /// unchanged fonts, so subsets carry names of our own.
    pub fn family(self) -> &'static str {
        match self {
            Self::Regular | Self::Bold => "Ebbmap Sans",
            Self::Narrow | Self::NarrowBold | Self::NarrowItalic => "Ebbmap Narrow",
        }
    }

    /// Weight as CSS counts it.
    pub fn weight(self) -> u16 {
        match self {
            Self::Bold | Self::NarrowBold => 600,
            Self::Regular | Self::Narrow | Self::NarrowItalic => 400,
        }
    }

    /// Whether the face slants.
    pub fn italic(self) -> bool {
        self == Self::NarrowItalic
    }
}

/// The license of the fonts (SIL Open Font License 1.1).
pub fn font_license() -> &'static str {
    include_str!("../../styles/fonts/LICENSE-OFL.txt")
}
