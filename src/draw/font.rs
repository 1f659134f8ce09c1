//! The bundled faces: which characters they have, how wide text is, and subsets to embed.
//!
//! Text is set without kerning and without ligatures, in both writers, so its width is the sum of the advances.

use crate::style::Face;
use allsorts::binary::read::ReadScope;
use allsorts::error::ParseError;
use allsorts::font::{Font, read_cmap_subtable};
use allsorts::font_data::FontData;
use allsorts::subset::{CmapTarget, SubsetProfile, subset};
use allsorts::tables::cmap::Cmap;
use allsorts::tables::{FontTableProvider, SfntVersion};
use allsorts::tag;
use std::borrow::Cow;
use std::collections::BTreeSet;
use std::sync::OnceLock;

/// Character to glyph and advance of one face.
struct Metrics {
    /// Character, glyph and advance in font units, sorted by character.
    glyphs: Vec<(u32, u16, u16)>,
    units_per_em: f64,
}

impl Metrics {
    fn read(face: Face) -> Result<Self, ParseError> {
        let data = ReadScope::new(face.bytes()).read::<FontData<'_>>()?;
        let provider = data.table_provider(0).map_err(|_| ParseError::BadValue)?;
        let cmap_data = provider.read_table_data(tag::CMAP)?.into_owned();
        let mut pairs = Vec::new();
        if let Some((_, subtable)) = read_cmap_subtable(&ReadScope::new(&cmap_data).read::<Cmap<'_>>()?)? {
            subtable.mappings_fn(|character, glyph| pairs.push((character, glyph)))?;
        }
        let mut font = Font::new(provider)?;
        let units_per_em = f64::from(font.head_table.units_per_em);
        let mut glyphs: Vec<(u32, u16, u16)> = pairs
            .into_iter()
            .filter(|&(_, glyph)| glyph != 0)
            .map(|(character, glyph)| (character, glyph, font.horizontal_advance(glyph).unwrap_or(0)))
            .collect();
        glyphs.sort_unstable();
        glyphs.dedup_by_key(|entry| entry.0);
        Ok(Self { glyphs, units_per_em })
    }

    fn of(face: Face) -> &'static Self {
        static ALL: [OnceLock<Metrics>; 5] = [const { OnceLock::new() }; 5];
        // An unreadable font would be a broken build, which the tests of this file find; such a face has no glyph.
        ALL[face as usize]
            .get_or_init(|| Self::read(face).unwrap_or(Self { glyphs: Vec::new(), units_per_em: 1000.0 }))
    }

    fn glyph(&self, character: char) -> Option<(u16, u16)> {
        let found = self.glyphs.binary_search_by_key(&u32::from(character), |entry| entry.0).ok()?;
        Some((self.glyphs[found].1, self.glyphs[found].2))
    }
}

/// Whether `face` can draw `character`.
pub(super) fn has(face: Face, character: char) -> bool {
    Metrics::of(face).glyph(character).is_some()
}

/// Width in mm of `text` set in `face` with type of `size` mm; characters that the face lacks have no width.
pub fn width_mm(face: Face, size: f64, text: &str) -> f64 {
    let metrics = Metrics::of(face);
    let units: u32 =
        text.chars().filter_map(|c| metrics.glyph(c)).map(|(_, advance)| u32::from(advance)).sum();
    f64::from(units) / metrics.units_per_em * size
}

/// The face cut down to `characters`, a complete TrueType font under the family name of our own; empty when the
/// face cannot be read.
pub(super) fn subset_of(face: Face, characters: &BTreeSet<char>) -> Vec<u8> {
    let metrics = Metrics::of(face);
    let glyphs: BTreeSet<u16> =
        characters.iter().filter_map(|&c| metrics.glyph(c)).map(|(glyph, _)| glyph).collect();
    let glyphs: Vec<u16> = std::iter::once(0).chain(glyphs).collect();
    let make = || -> Option<Vec<u8>> {
        let data = ReadScope::new(face.bytes()).read::<FontData<'_>>().ok()?;
        let renamed = Renamed { inner: data.table_provider(0).ok()?, names: name_table(face) };
        let mut tables =
            vec![tag::CMAP, tag::HEAD, tag::HHEA, tag::HMTX, tag::MAXP, tag::NAME, tag::OS_2, tag::POST];
        tables.extend([tag::CVT, tag::FPGM, tag::PREP]);
        subset(&renamed, &glyphs, &SubsetProfile::Custom(tables), CmapTarget::Unicode).ok()
    };
    make().unwrap_or_default()
}

/// A font with another `name` table.
struct Renamed<P> {
    inner: P,
    names: Vec<u8>,
}

impl<P: FontTableProvider> FontTableProvider for Renamed<P> {
    fn table_data(&self, table: u32) -> Result<Option<Cow<'_, [u8]>>, ParseError> {
        if table == tag::NAME { Ok(Some(Cow::Borrowed(&self.names))) } else { self.inner.table_data(table) }
    }

    fn has_table(&self, table: u32) -> bool {
        self.inner.has_table(table)
    }

    fn table_tags(&self) -> Option<Vec<u32>> {
        self.inner.table_tags()
    }
}

impl<P: SfntVersion> SfntVersion for Renamed<P> {
    fn sfnt_version(&self) -> u32 {
        self.inner.sfnt_version()
    }
}

/// A `name` table (format 0, platform 3, encoding 1, language 0x409) with copyright, family, subfamily, full name,
/// PostScript name and license. Layout: OpenType specification, chapter `name`.
fn name_table(face: Face) -> Vec<u8> {
    let subfamily = match (face.weight() > 400, face.italic()) {
        (true, _) => "SemiBold",
        (false, true) => "Italic",
        (false, false) => "Regular",
    };
    let full = format!("{} {subfamily}", face.family());
    let postscript = full.replace(' ', "-");
    let names: [(u16, &str); 6] = [
        (0, "Copyright 2017 IBM Corp. Subset, renamed as its license asks."),
        (1, face.family()),
        (2, subfamily),
        (4, &full),
        (6, &postscript),
        (13, "SIL Open Font License, Version 1.1"),
    ];
    let mut records = Vec::new();
    let mut storage: Vec<u8> = Vec::new();
    for (id, name) in names {
        let text: Vec<u8> = name.encode_utf16().flat_map(u16::to_be_bytes).collect();
        for value in [3, 1, 0x409, id, text.len() as u16, storage.len() as u16] {
            records.extend(value.to_be_bytes());
        }
        storage.extend(text);
    }
    let mut table = Vec::new();
    for value in [0, names.len() as u16, 6 + 12 * names.len() as u16] {
        table.extend(value.to_be_bytes());
    }
    table.extend(records);
    table.extend(storage);
    table
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_face_has_the_signs_of_the_trade() {
        for face in Face::ALL {
            for sign in "AZaz09 −×·±≤≥\u{b5}π√°²½–—…→%()/".chars() {
                assert!(has(face, sign), "{face:?} lacks {sign:?}");
            }
        }
        assert!(!has(Face::Regular, '漢'));
    }

    /// The font's own documentation of metrics: all digits have one advance, 600 of 1000 units in the normal width.
    #[test]
    fn digits_have_one_width() {
        for digit in '0'..='9' {
            let width = width_mm(Face::Regular, 10.0, &digit.to_string());
            assert!((width - 6.0).abs() < 1e-12, "{digit}: {width}");
        }
    }

    #[test]
    fn a_subset_is_a_small_font_with_the_same_advances() {
        for face in Face::ALL {
            let characters: BTreeSet<char> = "ADC_SCK 63 %".chars().collect();
            let bytes = subset_of(face, &characters);
            assert!(bytes.len() > 1000 && bytes.len() < 12_000, "{face:?}: {} bytes", bytes.len());
            let data = ReadScope::new(&bytes).read::<FontData<'_>>().expect("a font");
            let mut font = Font::new(data.table_provider(0).expect("tables")).expect("a font");
            for &character in &characters {
                let (glyph, _) = font.lookup_glyph_index(
                    character,
                    allsorts::font::MatchingPresentation::NotRequired,
                    None,
                );
                assert_ne!(glyph, 0, "{face:?} lost {character:?}");
                let (_, advance) = Metrics::of(face).glyph(character).expect("in the face");
                assert_eq!(font.horizontal_advance(glyph), Some(advance));
            }
        }
    }
}
