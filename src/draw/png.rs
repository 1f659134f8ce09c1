//! Renders the SVG text of a scene with its own embedded fonts, and writes PNG with size, color space and texts.

use super::scene::Scene;
use super::svg::SvgText;
use crate::style::Face;
use std::sync::Arc;
use usvg::fontdb;

/// Why a picture could not be rendered. Each of these would be a fault of the program.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct RenderFault(pub String);

impl std::fmt::Display for RenderFault {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        write!(f, "picture cannot be rendered: {}", self.0)
    }
}

impl std::error::Error for RenderFault {}

fn fault(error: impl std::fmt::Display) -> RenderFault {
    RenderFault(error.to_string())
}

/// Pixels of a picture: red, green, blue in rows from the top.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Pixels {
    /// Width in pixels.
    pub width: u32,
    /// Height in pixels.
    pub height: u32,
    /// `3 * width * height` bytes.
    pub rgb: Vec<u8>,
}

/// Renders `svg`, the text of `scene`, at the scene's size in pixels.
pub fn render(scene: &Scene, svg: &SvgText) -> Result<Pixels, RenderFault> {
    let mut options = usvg::Options { dpi: 96.0, ..usvg::Options::default() };
    let mut fonts = fontdb::Database::new();
    let mut ids: Vec<(Face, fontdb::ID)> = Vec::new();
    for (face, bytes) in &svg.fonts {
        let loaded = fonts.load_font_source(fontdb::Source::Binary(Arc::new(bytes.clone())));
        ids.extend(loaded.into_iter().map(|id| (*face, id)));
    }
    options.fontdb = Arc::new(fonts);
    options.font_resolver = usvg::FontResolver {
        select_font: Box::new(move |font, _| {
            let family = match font.families().first() {
                Some(usvg::FontFamily::Named(name)) => name.as_str(),
                _ => "",
            };
            let italic = font.style() != usvg::FontStyle::Normal;
            let matches = |face: Face| {
                face.family() == family
                    && face.italic() == italic
                    && (face.weight() > 500) == (font.weight() > 500)
            };
            ids.iter().find(|(face, _)| matches(*face)).map(|(_, id)| *id)
        }),
        select_fallback: Box::new(|_, _, _| None),
    };
    let tree = usvg::Tree::from_str(&svg.text, &options).map_err(fault)?;
    let scale = f64::from(scene.px) / f64::from(tree.size().width());
    let height = (f64::from(tree.size().height()) * scale).round() as u32;
    let Some(mut canvas) = tiny_skia::Pixmap::new(scene.px, height) else {
        return Err(fault(format!("{} x {height} pixels", scene.px)));
    };
    let transform = tiny_skia::Transform::from_scale(scale as f32, scale as f32);
    resvg::render(&tree, transform, &mut canvas.as_mut());
    // The page is opaque, so premultiplied and plain colors are the same.
    let rgb = canvas.data().chunks_exact(4).flat_map(|pixel| [pixel[0], pixel[1], pixel[2]]).collect();
    Ok(Pixels { width: scene.px, height, rgb })
}

/// Writes `pixels` of `scene` as PNG.
pub fn encode(scene: &Scene, pixels: &Pixels) -> Result<Vec<u8>, RenderFault> {
    let mut bytes = Vec::new();
    let mut encoder = png::Encoder::new(&mut bytes, pixels.width, pixels.height);
    encoder.set_color(png::ColorType::Rgb);
    encoder.set_depth(png::BitDepth::Eight);
    encoder.set_compression(png::Compression::Balanced);
    encoder.set_source_srgb(png::SrgbRenderingIntent::Perceptual);
    let per_meter = (f64::from(pixels.width) / scene.width * 1000.0).round() as u32;
    encoder.set_pixel_dims(Some(png::PixelDimensions {
        xppu: per_meter,
        yppu: per_meter,
        unit: png::Unit::Meter,
    }));
    let software = format!("ebbmap {}", env!("CARGO_PKG_VERSION"));
    let texts = [
        ("Title", scene.title.as_str()),
        ("Description", &scene.description),
        ("Software", &software),
        ("Source", &scene.number),
        ("Comment", &scene.caution),
    ];
    for (keyword, text) in texts {
        if !text.is_empty() {
            encoder.add_itxt_chunk(keyword.to_owned(), text.to_owned()).map_err(fault)?;
        }
    }
    // The facts too, each under its name: `Board`, `Net`, `Band`, `Version`, `Input hash` and so on.
    for (key, value) in &scene.facts {
        let mut keyword = key.replace('_', " ");
        if let Some(first) = keyword.get(..1).map(str::to_uppercase) {
            keyword.replace_range(..1, &first);
        }
        if !value.is_empty() {
            encoder.add_itxt_chunk(keyword, value.clone()).map_err(fault)?;
        }
    }
    let mut writer = encoder.write_header().map_err(fault)?;
    writer.write_image_data(&pixels.rgb).map_err(fault)?;
    writer.finish().map_err(fault)?;
    Ok(bytes)
}
