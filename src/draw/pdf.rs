//! All pictures of a run as one PDF: vectors, text that can be selected, a bookmark for each page. Needs the feature
//! `pdf`.
//!
//! The PDF library reads SVG itself, so the pages are the very files that were written; their fonts come from the files.

use super::png::RenderFault;
use base64::Engine;
use base64::engine::general_purpose::STANDARD;
use krilla::Document;
use krilla::destination::XyzDestination;
use krilla::geom::{Point, Size};
use krilla::metadata::Metadata;
use krilla::outline::{Outline, OutlineNode};
use krilla::page::PageSettings;
use krilla_svg::{SurfaceExt, SvgSettings};
use std::sync::Arc;
use usvg_for_pdf::fontdb;

/// Points of PDF for each pixel of SVG: 72 to 96 in an inch.
const POINTS: f32 = 0.75;

/// A page: its bookmark and its SVG file.
#[derive(Clone, Copy, Debug)]
pub struct PdfPage<'a> {
    /// Bookmark.
    pub title: &'a str,
    /// The file.
    pub svg: &'a str,
}

fn fault(error: impl std::fmt::Debug) -> RenderFault {
    RenderFault(format!("PDF: {error:?}"))
}

/// The fonts that a picture embeds: family, weight, whether italic, file.
fn fonts(svg: &str) -> Vec<(String, u16, bool, Vec<u8>)> {
    let value = |rule: &str, key: &str| {
        let rest = rule.split_once(key).map(|(_, rest)| rest)?;
        rest.split([';', '}', ')']).next().map(|value| value.trim_matches('"').to_owned())
    };
    let rules = svg.split("@font-face{").skip(1);
    let read = |rule: &str| {
        let bytes = STANDARD.decode(value(rule, "base64,")?).ok()?;
        let weight = value(rule, "font-weight:")?.parse().ok()?;
        Some((value(rule, "font-family:")?, weight, value(rule, "font-style:")? == "italic", bytes))
    };
    rules.filter_map(read).collect()
}

/// Parses a picture with its own fonts.
fn tree(svg: &str) -> Result<usvg_for_pdf::Tree, RenderFault> {
    let mut options = usvg_for_pdf::Options { dpi: 96.0, ..Default::default() };
    let mut database = fontdb::Database::new();
    let mut known: Vec<(String, u16, bool, fontdb::ID)> = Vec::new();
    for (family, weight, italic, bytes) in fonts(svg) {
        let ids = database.load_font_source(fontdb::Source::Binary(Arc::new(bytes)));
        known.extend(ids.into_iter().map(|id| (family.clone(), weight, italic, id)));
    }
    options.fontdb = Arc::new(database);
    options.font_resolver = usvg_for_pdf::FontResolver {
        select_font: Box::new(move |font, _| {
            let family = match font.families().first() {
                Some(usvg_for_pdf::FontFamily::Named(name)) => name.as_str(),
                _ => "",
            };
            let italic = font.style() != usvg_for_pdf::FontStyle::Normal;
            let bold = font.weight() > 500;
            let matches = |entry: &&(String, u16, bool, fontdb::ID)| {
                entry.0 == family && (entry.1 > 500) == bold && entry.2 == italic
            };
            known.iter().find(matches).map(|entry| entry.3)
        }),
        select_fallback: Box::new(|_, _, _| None),
    };
    usvg_for_pdf::Tree::from_str(svg, &options).map_err(fault)
}

/// Writes `pages` as one document.
pub fn document(title: &str, pages: &[PdfPage]) -> Result<Vec<u8>, RenderFault> {
    let mut document = Document::new();
    let creator = format!("ebbmap {}", env!("CARGO_PKG_VERSION"));
    document.set_metadata(Metadata::new().title(title.to_owned()).creator(creator));
    let mut outline = Outline::new();
    for (index, page) in pages.iter().enumerate() {
        let tree = tree(page.svg)?;
        let (width, height) = (tree.size().width() * POINTS, tree.size().height() * POINTS);
        let size = Size::from_wh(width, height).ok_or_else(|| fault("a page without size"))?;
        let mut sheet = document.start_page_with(PageSettings::new(size));
        let mut surface = sheet.surface();
        surface
            .draw_svg(&tree, size, SvgSettings::default())
            .ok_or_else(|| fault("a page cannot be drawn"))?;
        surface.finish();
        sheet.finish();
        let top = XyzDestination::new(index, Point::from_xy(0.0, 0.0));
        outline.push_child(OutlineNode::new(page.title.to_owned(), top));
    }
    document.set_outline(outline);
    document.finish().map_err(fault)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::draw::{Group, Scene, Text, svg};
    use crate::style::{Face, Rgb};

    /// Two pages become one document whose text is text: each page carries a font with a map back to characters
    /// (`ToUnicode`, PDF 32000-1, 9.10.3), and the same input gives the same bytes.
    #[test]
    fn pages_become_one_document_with_text() {
        let mut scene =
            Scene { width: 80.0, height: 40.0, px: 160, title: "a".to_owned(), ..Scene::default() };
        scene.page = Rgb(255, 255, 255);
        let mut group = Group::new("words");
        group.text(Text::new(5.0, 20.0, 5.0, Face::Bold, Rgb(0, 0, 0), "Void S1 adds 3.2 nH"));
        scene.group(group);
        let written = svg::write(&scene).text;
        let pages = [PdfPage { title: "one", svg: &written }, PdfPage { title: "two", svg: &written }];
        let made = document("Review", &pages).expect("a document");
        let text = String::from_utf8_lossy(&made);
        assert!(made.starts_with(b"%PDF-") && text.contains("/ToUnicode") && text.contains("/Count 2"));
        assert_eq!(document("Review", &pages).expect("a document"), made);
    }
}
