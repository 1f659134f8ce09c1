//! The maps as numbers: one NPZ file for each map and an index, for NumPy and anything else that reads them.
//!
//! A file holds `kx` and `ky` (complex, 16 bytes, `[iy, ix]`, A/m per A, mean of a cell's two face currents divided
//! by the cell) and `copper` (bool, same shape). Of a band of a drive `kx` and `ky` are the mean weighted by the power of
//! the lines, and `k_rms` (8 bytes, A/m per A of band current) is the rms density. Format: NPY version 1.0 inside a ZIP archive, as NumPy documents.
//! Checked by: tests/field/numbers.rs.

use crate::field::ReturnMap;
use crate::geom::Point;
use crate::review::Model;
use serde::Serialize;
use std::io::{Cursor, Write};
use zip::write::SimpleFileOptions;
use zip::{CompressionMethod, DateTime, ZipWriter};

/// Version of the index.
const SCHEMA: u32 = 1;

/// A map to write, or why there is none.
#[derive(Clone, Copy, Debug)]
pub enum Numbers<'a> {
    /// A map, and the name of its file without folder and ending.
    Map {
        /// Name, for example `ADC_SCK--L2-GND--HF`.
        stem: &'a str,
        /// The map.
        map: &'a ReturnMap,
    },
    /// A map that was withheld.
    Withheld {
        /// Net.
        net: &'a str,
        /// Plane: layer index from 0 and net; none where no plane was found.
        plane: Option<(usize, &'a str)>,
        /// Name of the band.
        band: &'a str,
        /// Frequency in Hz.
        frequency_hz: f64,
        /// Why.
        reason: &'a str,
    },
}

#[derive(Serialize)]
struct Index {
    schema: u32,
    time_factor: &'static str,
    maps: Vec<Entry>,
}

#[derive(Serialize)]
struct Plane {
    layer: String,
    net: String,
}

#[derive(Serialize)]
struct Entry {
    file: Option<String>,
    #[serde(skip_serializing_if = "Option::is_none")]
    reason: Option<String>,
    net: String,
    plane: Option<Plane>,
    band: String,
    frequency_hz: f64,
    #[serde(skip_serializing_if = "Option::is_none")]
    origin_m: Option<[f64; 2]>,
    #[serde(skip_serializing_if = "Option::is_none")]
    cell_m: Option<f64>,
    #[serde(skip_serializing_if = "Option::is_none")]
    shape: Option<[usize; 2]>,
    #[serde(skip_serializing_if = "Option::is_none")]
    height_m: Option<f64>,
    #[serde(skip_serializing_if = "Option::is_none")]
    width_m: Option<f64>,
    zs_ohm: Option<[f64; 2]>,
    residual: Option<f64>,
    model: Option<&'static str>,
    #[serde(skip_serializing_if = "Option::is_none")]
    band_density: Option<BandEntry>,
}

/// What stands behind the map of a band of a drive.
#[derive(Serialize)]
struct BandEntry {
    current_rms_a: Option<f64>,
    lines: u64,
    solved_hz: Vec<f64>,
    parts_of_power: Vec<f64>,
}

/// Index of the maps as JSON text; `origin` is the point of the files' coordinates that the review calls (0, 0).
pub fn index(entries: &[Numbers], origin: Point) -> String {
    let index = Index {
        schema: SCHEMA,
        time_factor: "exp(+jwt)",
        maps: entries.iter().map(|entry| described(entry, origin)).collect(),
    };
    // Plain structures with text keys and numbers: writing them to a text cannot fail.
    let mut text = serde_json::to_string_pretty(&index).unwrap_or_default();
    text.push('\n');
    text
}

fn described(entry: &Numbers, origin: Point) -> Entry {
    let plane = |layer: usize, net: &str| Plane { layer: format!("L{}", layer + 1), net: net.to_string() };
    match entry {
        Numbers::Map { stem, map } => {
            let corner = map.grid.origin - origin;
            Entry {
                file: Some(file_name(stem)),
                reason: None,
                net: map.net.clone(),
                plane: Some(plane(map.plane.layer, &map.plane.net)),
                band: map.band.clone(),
                frequency_hz: map.frequency_hz,
                origin_m: Some([corner.x, corner.y]),
                cell_m: Some(map.grid.cell_m),
                shape: Some([map.grid.ny, map.grid.nx]),
                height_m: Some(map.height_m),
                width_m: Some(map.width_m),
                zs_ohm: map.zs_ohm.map(|zs| [zs.re, zs.im]),
                residual: map.residual,
                model: Some(match map.model {
                    Model::Sheet => "sheet",
                    Model::Spread => "spread",
                }),
                band_density: map.band_density.as_ref().map(|band| BandEntry {
                    current_rms_a: band.current_rms_a,
                    lines: band.line_count,
                    solved_hz: band.solved.iter().map(|line| line.0).collect(),
                    parts_of_power: band.solved.iter().map(|line| line.1).collect(),
                }),
            }
        }
        Numbers::Withheld { net, plane: found, band, frequency_hz, reason } => Entry {
            file: None,
            reason: Some((*reason).to_string()),
            net: (*net).to_string(),
            plane: found.map(|(layer, net)| plane(layer, net)),
            band: (*band).to_string(),
            frequency_hz: *frequency_hz,
            origin_m: None,
            cell_m: None,
            shape: None,
            height_m: None,
            width_m: None,
            zs_ohm: None,
            residual: None,
            model: None,
            band_density: None,
        },
    }
}

/// Name of a map's file, relative to the index.
pub fn file_name(stem: &str) -> String {
    format!("{stem}.npz")
}

/// Bytes of a map's NPZ file. The same map gives the same bytes: the time in the archive is fixed.
pub fn npz(map: &ReturnMap) -> std::io::Result<Vec<u8>> {
    let (nx, ny) = (map.grid.nx, map.grid.ny);
    let mut kx = Vec::with_capacity(16 * map.grid.len());
    let mut ky = Vec::with_capacity(16 * map.grid.len());
    for iy in 0..ny {
        for ix in 0..nx {
            let (x, y) = map.density(ix, iy);
            for (bytes, value) in [(&mut kx, x), (&mut ky, y)] {
                bytes.extend_from_slice(&value.re.to_le_bytes());
                bytes.extend_from_slice(&value.im.to_le_bytes());
            }
        }
    }
    let copper: Vec<u8> = map.copper.iter().map(|&is| u8::from(is)).collect();
    let mut archive = ZipWriter::new(Cursor::new(Vec::new()));
    let options = SimpleFileOptions::default()
        .compression_method(CompressionMethod::Deflated)
        .compression_level(Some(1))
        .last_modified_time(DateTime::default());
    let rms: Option<Vec<u8>> =
        map.band_density.as_ref().map(|band| band.rms.iter().flat_map(|value| value.to_le_bytes()).collect());
    let always = [("kx.npy", "<c16", &kx), ("ky.npy", "<c16", &ky), ("copper.npy", "|b1", &copper)];
    let of_band = rms.iter().map(|rms| ("k_rms.npy", "<f8", rms));
    for (name, kind, bytes) in always.into_iter().chain(of_band) {
        archive.start_file(name, options)?;
        archive.write_all(&npy_header(kind, ny, nx))?;
        archive.write_all(bytes)?;
    }
    Ok(archive.finish()?.into_inner())
}

/// Header of an NPY file of version 1.0 for a C-ordered array of `rows` by `columns`.
fn npy_header(kind: &str, rows: usize, columns: usize) -> Vec<u8> {
    let mut text = format!("{{'descr': '{kind}', 'fortran_order': False, 'shape': ({rows}, {columns}), }}");
    // Magic (6), version (2), length (2) and text end on a multiple of 64.
    let length = (10 + text.len() + 1).next_multiple_of(64) - 10;
    text.extend(std::iter::repeat_n(' ', length - 1 - text.len()));
    text.push('\n');
    let mut header = b"\x93NUMPY\x01\x00".to_vec();
    header.extend_from_slice(&(length as u16).to_le_bytes());
    header.extend_from_slice(text.as_bytes());
    header
}
