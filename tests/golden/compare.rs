//! Compares a scene with its references: SVG as text, PNG by pixels.

use ebbmap::draw::png::{Pixels, encode, render};
use ebbmap::draw::{Scene, svg};
use serde::Deserialize;
use std::fs;
use std::path::{Path, PathBuf};

/// `case.toml`.
#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Case {
    /// Title, unique.
    pub title: String,
    /// What breaks when this case fails.
    pub guards: String,
    /// Pixels that may differ by more than 1 in a channel.
    #[serde(default)]
    pub pixels: usize,
    /// Why the PNG may be larger than 20 KiB.
    #[serde(default)]
    pub large: Option<String>,
}

/// Folder of the cases.
pub fn root() -> PathBuf {
    PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("tests/golden")
}

/// Whether references are rewritten.
pub fn blessing() -> bool {
    std::env::var_os("EBBMAP_BLESS").is_some_and(|value| value == "1")
}

/// Reads `case.toml` of a case.
pub fn read_case(path: &str) -> Result<Case, String> {
    let file = root().join(path).join("case.toml");
    let text = fs::read_to_string(&file).map_err(|error| format!("{path}/case.toml: {error}"))?;
    toml::from_str(&text).map_err(|error| format!("{path}/case.toml: {}", error.message()))
}

/// The SVG with rasters and fonts replaced by what must stay the same.
pub fn comparable(svg: &str) -> String {
    let mut out = String::new();
    let mut rest = svg;
    while let Some(at) = rest.find("base64,") {
        let (before, after) = rest.split_at(at + "base64,".len());
        let end = after.find(['"', ')']).unwrap_or(after.len());
        out.push_str(before);
        let bytes = decode64(&after[..end]);
        match image::load_from_memory(&bytes) {
            Ok(picture) => {
                let pixels = picture.to_rgb8();
                let (width, height) = pixels.dimensions();
                out.push_str(&format!(
                    "[{width} x {height}, {}]",
                    ebbmap::report::sha256_hex(pixels.as_raw())
                ));
            }
            Err(_) => out.push_str(&format!("[font, {}]", &ebbmap::report::sha256_hex(&bytes)[..16])),
        }
        rest = &after[end..];
    }
    out.push_str(rest);
    out
}

fn decode64(text: &str) -> Vec<u8> {
    use base64::Engine;
    base64::engine::general_purpose::STANDARD.decode(text).expect("base64")
}

/// Compares; gives what is wrong in words.
pub fn check(path: &str, scene: &Scene) -> Vec<String> {
    let case = match read_case(path) {
        Ok(case) => case,
        Err(fault) => return vec![fault],
    };
    let folder = root().join(path);
    let written = svg::write(scene);
    let text = comparable(&written.text);
    let pixels = render(scene, &written).expect("rendered");
    if blessing() {
        fs::write(folder.join("expect.svg"), &text).expect("written");
        fs::write(folder.join("expect.png"), encode(scene, &pixels).expect("encoded")).expect("written");
        return vec![format!("{path}: references rewritten")];
    }
    let mut wrong = Vec::new();
    match fs::read_to_string(folder.join("expect.svg")) {
        Ok(expected) if expected == text => {}
        Ok(expected) => {
            let line = expected.lines().zip(text.lines()).position(|(a, b)| a != b);
            let line = line.unwrap_or_else(|| expected.lines().count().min(text.lines().count()));
            let show =
                |text: &str| text.lines().nth(line).unwrap_or("(end)").chars().take(300).collect::<String>();
            wrong.push(format!("{path}: SVG line {}:\n  {}\n  {}", line + 1, show(&expected), show(&text)));
        }
        Err(error) => wrong.push(format!("{path}/expect.svg: {error}")),
    }
    match image::open(folder.join("expect.png")) {
        Ok(expected) => wrong.extend(compare_pixels(path, &case, &expected.to_rgb8(), &pixels)),
        Err(error) => wrong.push(format!("{path}/expect.png: {error}")),
    }
    if !wrong.is_empty() {
        let name = path.replace('/', "-");
        let target = Path::new(env!("CARGO_MANIFEST_DIR")).join("target/golden");
        fs::create_dir_all(&target).expect("a folder");
        fs::write(target.join(format!("{name}.svg")), &written.text).expect("written");
    }
    wrong
}

/// Writes expected | difference | actual when they differ.
fn compare_pixels(path: &str, case: &Case, expected: &image::RgbImage, actual: &Pixels) -> Option<String> {
    let (width, height) = expected.dimensions();
    if (width, height) != (actual.width, actual.height) {
        return Some(format!(
            "{path}: {} x {} pixels instead of {width} x {height}",
            actual.width, actual.height
        ));
    }
    let differs = |a: &[u8], b: &[u8]| a.iter().zip(b).any(|(a, b)| a.abs_diff(*b) > 1);
    let pairs = expected.as_raw().chunks_exact(3).zip(actual.rgb.chunks_exact(3));
    let marks: Vec<bool> = pairs.map(|(a, b)| differs(a, b)).collect();
    let count = marks.iter().filter(|mark| **mark).count();
    if count <= case.pixels {
        return None;
    }
    let mut panels = image::RgbImage::new(3 * width, height);
    for (x, y, pixel) in expected.enumerate_pixels() {
        let index = (y * width + x) as usize;
        panels.put_pixel(x, y, *pixel);
        let gray = ((u16::from(pixel.0[0]) + u16::from(pixel.0[1]) + u16::from(pixel.0[2])) / 6 + 120)
            .min(255) as u8;
        let mark = if marks[index] { image::Rgb([220, 0, 60]) } else { image::Rgb([gray; 3]) };
        panels.put_pixel(width + x, y, mark);
        let rgb = &actual.rgb[3 * index..3 * index + 3];
        panels.put_pixel(2 * width + x, y, image::Rgb([rgb[0], rgb[1], rgb[2]]));
    }
    let target = Path::new(env!("CARGO_MANIFEST_DIR")).join("target/golden");
    fs::create_dir_all(&target).expect("a folder");
    let file = target.join(format!("{}.png", path.replace('/', "-")));
    panels.save(&file).expect("written");
    Some(format!("{path}: {count} pixels differ, {} may; see target/golden", case.pixels))
}
