//! The `[[zone]]` entries of a review.

use super::desk::Desk;
use crate::diag::code::review as code;
use crate::geom::locate::segment_distance;
use crate::geom::polygon::ring_area;
use crate::geom::{Point, Ring};
use crate::review::Zone;
use toml::de::DeTable;

/// All zones in the order of the file, moved by `origin`.
pub fn read(desk: &mut Desk<'_>, root: &DeTable<'_>, origin: Point) -> Vec<Zone> {
    let mut zones: Vec<Zone> = Vec::new();
    for (table, span) in desk.tables(root, "zone") {
        desk.only(table, "zone", &["name", "outline"]);
        let start = span.start..span.end.min(span.start + 1);
        for key in ["name", "outline"] {
            if table.get(key).is_none() {
                desk.error(
                    code::REVIEW_MISSING_KEY,
                    start.clone(),
                    format!("zone must have the key `{key}`"),
                );
            }
        }
        let name = desk.filled_text(table, "name").unwrap_or_default();
        let outline = outline(desk, table, origin).unwrap_or_default();
        if zones.iter().any(|zone| !name.is_empty() && zone.name == name) {
            let at = table.get("name").map_or(start, toml::Spanned::span);
            desk.error(code::REVIEW_DUPLICATE, at, format!("zone `{name}` must stand only once"));
        }
        zones.push(Zone { name: name.into(), outline });
    }
    zones
}

fn outline(desk: &mut Desk<'_>, table: &DeTable<'_>, origin: Point) -> Option<Ring> {
    let value = table.get("outline")?;
    let corners = desk.as_list(value, "outline", "points, each two lengths")?;
    let mut ring: Ring = Vec::new();
    for corner in corners {
        if let Some(point) = desk.point(corner, "outline") {
            ring.push(origin + point);
        }
    }
    if ring.first() == ring.last() && ring.len() > 1 {
        ring.pop();
    }
    let fault = if ring.len() < 3 {
        Some("must have three corners at least")
    } else if crosses_itself(&ring) {
        Some("must not cross or touch itself")
    } else {
        None
    };
    if let Some(fault) = fault {
        desk.error(code::REVIEW_BAD_VALUE, value.span(), format!("outline of a zone {fault}"));
        return None;
    }
    if ring_area(&ring) < 0.0 {
        ring.reverse();
    }
    Some(ring)
}

fn crosses_itself(ring: &[Point]) -> bool {
    let n = ring.len();
    let side = |i: usize| (ring[i], ring[(i + 1) % n]);
    (0..n).any(|i| {
        let zero = side(i).0 == side(i).1;
        zero || (i + 2..n).any(|j| (j + 1) % n != i && segment_distance(side(i), side(j)) <= 0.0)
    })
}
