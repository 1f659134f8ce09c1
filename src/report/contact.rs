//! The contact sheet of a review: every net and plane in every band, one scale, the worst first.

use super::Picture;
use super::ticket::{map_data, picture_number, validity_limit_hz};
use super::words::{band_range, given_millimeters, hertz, hints_at_hazard, millimeters, percent};
use crate::board::Board;
use crate::draw::png::RenderFault;
use crate::draw::set::{COLUMNS, CellMap, ROWS, SetCell, SetColumn, SetPage, SetRow, cell_map, scene};
use crate::draw::{DensityScale, Scene, italic, plain, with_prefix};
use crate::field::ReturnMap;
use crate::figure::Figures;
use crate::finding::{Finding, Grade};
use crate::plan::{ChartPlan, PathPlan};
use crate::review::{Band, Model, Review};
use crate::style::Style;
use std::collections::BTreeSet;

/// A map reduced to what the contact sheet needs, so that maps need not be kept.
#[derive(Clone, Debug)]
pub struct Thumbnail {
    map: CellMap,
    figures: Figures,
    residual: Option<f64>,
    model: Model,
    cell_m: f64,
}

/// Reduces a map.
#[allow(clippy::too_many_arguments)] // One argument for each plain hand-over type; a struct would only repeat them.
pub fn thumbnail(
    board: &Board,
    review: &Review,
    net: &PathPlan,
    chart: &ChartPlan,
    map: &ReturnMap,
    figures: &Figures,
    scale: DensityScale,
    style: &Style,
) -> Thumbnail {
    let data = map_data(board, review, net, chart, map, figures.contour_levels);
    let label =
        format!("{} on {} at {}", plain(&net.name), plain(&chart.plane.to_string()), hertz(map.frequency_hz));
    Thumbnail {
        map: cell_map(&data, board.outline.bounds(), scale, style, &label),
        figures: figures.clone(),
        residual: map.residual,
        model: map.model,
        cell_m: map.grid.cell_m,
    }
}

/// A cell of the contact sheet.
#[derive(Clone, Debug)]
pub enum ContactCell {
    /// A map, and the address of its ticket map relative to the sheet.
    Map(Box<Thumbnail>, Option<String>),
    /// Why there is none, in one sentence.
    Withheld(String),
}

/// A net on a plane.
#[derive(Clone, Debug)]
pub struct ContactRow<'a> {
    /// Net.
    pub net: &'a PathPlan,
    /// Plane.
    pub chart: &'a ChartPlan,
    /// One cell for each column.
    pub cells: Vec<ContactCell>,
    /// Findings of the net.
    pub findings: &'a [Finding],
}

/// What a contact sheet is made from.
#[derive(Clone, Debug)]
pub struct ContactInput<'a> {
    /// Board.
    pub board: &'a Board,
    /// Review.
    pub review: &'a Review,
    /// Columns: band and frequency in Hz.
    pub columns: Vec<(&'a Band, f64)>,
    /// Rows in any order.
    pub rows: Vec<ContactRow<'a>>,
    /// The one scale of the set.
    pub scale: DensityScale,
    /// Style.
    pub style: &'a Style,
    /// Hash of inputs and settings, hexadecimal.
    pub input_hash: &'a str,
}

/// Draws all pages.
pub fn contact(input: &ContactInput) -> Result<Vec<Picture>, RenderFault> {
    contact_scenes(input).iter().map(Picture::of).collect()
}

fn thumbnails<'r>(row: &'r ContactRow) -> impl Iterator<Item = &'r Thumbnail> {
    row.cells.iter().filter_map(|cell| match cell {
        ContactCell::Map(map, _) => Some(&**map),
        ContactCell::Withheld(_) => None,
    })
}

fn extra_inductance(figures: &Figures) -> Option<f64> {
    figures.extra_loop_inductance_h.and_then(|figure| figure.value)
}

/// The largest extra loop inductance of a row over its bands.
fn worst(row: &ContactRow) -> Option<f64> {
    thumbnails(row).filter_map(|map| extra_inductance(&map.figures)).max_by(f64::total_cmp)
}

/// The scenes of all pages, before they are written.
pub fn contact_scenes(input: &ContactInput) -> Vec<Scene> {
    let mut order: Vec<&ContactRow> = input.rows.iter().collect();
    order.sort_by(|a, b| {
        let by_worst = match (worst(a), worst(b)) {
            (Some(a), Some(b)) => b.total_cmp(&a),
            (a, b) => b.is_some().cmp(&a.is_some()),
        };
        by_worst.then_with(|| a.net.name.cmp(&b.net.name)).then_with(|| a.chart.plane.cmp(&b.chart.plane))
    });
    let rows: Vec<SetRow> = order.iter().zip(1..).map(|(row, number)| set_row(row, number, input)).collect();
    let columns: Vec<SetColumn> =
        input.columns.iter().map(|&(band, hz)| set_column(band, hz, input.board)).collect();
    let count = rows.len().div_ceil(ROWS).max(1) * columns.len().div_ceil(COLUMNS).max(1);
    let description = description(&order, input);
    let mut scenes = Vec::with_capacity(count);
    for page_rows in rows.chunks(ROWS) {
        for (index, page_columns) in columns.chunks(COLUMNS).enumerate() {
            let sheet = scenes.len() + 1;
            let number =
                picture_number(input.input_hash, &["contact", &sheet.to_string(), &input.style.name]);
            let page = SetPage {
                headline: headline(&order, input),
                lead: lead(&order),
                columns: page_columns,
                frequencies: columns.iter().map(|column| column.frequency.clone()).collect(),
                rows: page_rows,
                first_column: index * COLUMNS,
                scale: input.scale,
                zones: !input.review.zones.is_empty(),
                fields: fields(&order, input, (sheet, count), &number),
                caution: page_caution(&order, input),
                description: description.clone(),
                title: format!("Return currents, contact sheet {sheet} of {count}"),
                number,
                facts: vec![
                    ("board".into(), plain(&input.review.title)),
                    ("revision".into(), plain(&input.review.revision)),
                    ("sheet".into(), format!("{sheet} of {count}")),
                    ("style".into(), plain(&input.style.name)),
                    ("version".into(), env!("CARGO_PKG_VERSION").into()),
                    ("input_hash".into(), input.input_hash.into()),
                ],
            };
            scenes.push(scene(&page, input.style));
        }
    }
    scenes
}

fn set_column(band: &Band, frequency_hz: f64, board: &Board) -> SetColumn {
    let limit = validity_limit_hz(board).filter(|&limit| band.to_hz.max(frequency_hz) > limit);
    let over =
        limit.map_or(String::new(), |limit| format!("; model holds to {}", with_prefix(limit, "Hz", 2)));
    SetColumn {
        name: plain(&band.name),
        range: band_range(band),
        solved: format!("solved at {}{over}", hertz(frequency_hz)),
        frequency: hertz(frequency_hz),
    }
}

/// Numbers of the findings of a plane in a band; notes are not flagged.
fn flags(row: &ContactRow, band: &Band) -> Vec<String> {
    let here = |finding: &&Finding| {
        finding.grade != Grade::Note
            && finding.plane.as_ref().is_none_or(|plane| *plane == row.chart.plane)
            && finding.band.as_ref() == Some(&band.name)
    };
    row.findings.iter().filter(here).map(|finding| finding.number.to_string()).collect()
}

fn set_row(row: &ContactRow, number: usize, input: &ContactInput) -> SetRow {
    let length: f64 = row.net.track[row.chart.legs.clone()].iter().map(|leg| leg.from.distance(leg.to)).sum();
    let shares = row.cells.iter().zip(&input.columns).map(|(cell, &(_, hz))| match cell {
        ContactCell::Map(map, _) => (hz, map.figures.share_3h.value, map.figures.share_3h.without_voids),
        ContactCell::Withheld(_) => (hz, None, None),
    });
    let cells = row.cells.iter().zip(&input.columns).map(|(cell, (band, _))| match cell {
        ContactCell::Map(map, link) => SetCell::Map {
            map: Box::new(map.map.clone()),
            left: extra_inductance(&map.figures).map_or(String::new(), signed_henry),
            right: map
                .figures
                .share_3h
                .value
                .map_or(String::new(), |share| format!("{} within 3{}", percent(share), italic("h"))),
            link: link.clone(),
            flags: flags(row, band),
        },
        ContactCell::Withheld(reason) => SetCell::Withheld { reason: plain(reason) },
    });
    SetRow {
        number,
        name: plain(&row.net.name),
        lines: vec![
            format!(
                "on {}, {} to {}",
                plain(&row.chart.plane.to_string()),
                plain(&row.net.driver),
                plain(&row.net.receiver)
            ),
            format!("track {}, h {}", millimeters(length), given_millimeters(row.chart.height_m)),
        ],
        shares: shares.collect(),
        cells: cells.collect(),
    }
}

fn signed_henry(value: f64) -> String {
    let text = with_prefix(value, "H", 3);
    if value > 0.0 { format!("+{text}") } else { text }
}

fn model(order: &[&ContactRow]) -> Option<Model> {
    order.iter().flat_map(|row| thumbnails(row)).map(|map| map.model).next()
}

fn headline(order: &[&ContactRow], input: &ContactInput) -> String {
    match model(order) {
        None => return "All maps are withheld; each cell says why".to_owned(),
        Some(Model::Spread) => return "Return currents in closed form; voids not considered".to_owned(),
        Some(Model::Sheet) => {}
    }
    let top = order.first().and_then(|row| {
        let found = row.cells.iter().zip(&input.columns).filter_map(|(cell, (band, _))| match cell {
            ContactCell::Map(map, _) => extra_inductance(&map.figures).map(|extra| (extra, *band)),
            ContactCell::Withheld(_) => None,
        });
        found.max_by(|a, b| a.0.total_cmp(&b.0)).map(|(extra, band)| (row, extra, band))
    });
    match top {
        Some((row, extra, band)) if extra > 0.0 => {
            let name = crate::draw::shortened(crate::style::Face::Bold, 8.0, &row.net.name, 130.0);
            format!(
                "Voids cost {name} the most: {} of loop inductance in {}",
                signed_henry(extra),
                plain(&band.name)
            )
        }
        Some(_) => "Voids add no loop inductance to any net".to_owned(),
        None => "Return currents of all nets of the review".to_owned(),
    }
}

fn lead(order: &[&ContactRow]) -> Vec<String> {
    let maps: usize = order.iter().map(|row| thumbnails(row).count()).sum();
    let all: usize = order.iter().map(|row| row.cells.len()).sum();
    let turned = order.iter().flat_map(|row| thumbnails(row)).any(|map| map.map.turned);
    let mut first = format!(
        "Return-current density per ampere in the net, seen from the top. One scale for all {maps} maps"
    );
    if all > maps {
        first.push_str(&format!("; {} withheld", all - maps));
    }
    first.push('.');
    if turned {
        first.push_str(" The board is turned clockwise by 90\u{b0}.");
    }
    let mut second =
        "Under each map: left, loop inductance caused by voids (worst net first); right, share of the return."
            .to_owned();
    let flagged = order.iter().map(|row| {
        let bands: BTreeSet<Option<&String>> = row
            .findings
            .iter()
            .filter(|finding| finding.grade != Grade::Note)
            .map(|finding| finding.band.as_ref())
            .collect();
        usize::from(!bands.is_empty())
    });
    let flagged: usize = flagged.sum();
    if flagged > 0 {
        let nets = if flagged == 1 { "row has" } else { "rows have" };
        second.push_str(&format!(" {flagged} {nets} findings, framed and numbered where they are worst."));
    }
    vec![first, second]
}

fn page_caution(order: &[&ContactRow], input: &ContactInput) -> String {
    let highest = input.columns.iter().map(|&(_, hz)| hz).fold(0.0, f64::max);
    let mut text = match model(order).unwrap_or_default() {
        Model::Sheet => "Quasi-static sheet model: no radiation, no plane resonance, no parts".to_owned(),
        Model::Spread => "Closed form over an endless plane: no voids, no edges, no radiation".to_owned(),
    };
    if let Some(limit) = validity_limit_hz(input.board) {
        let side = if highest > limit { "a tendency only above" } else { "trust it up to" };
        text.push_str(&format!("; {side} {} (board a tenth of a wavelength)", with_prefix(limit, "Hz", 2)));
    }
    text.push('.');
    if order.iter().any(|row| hints_at_hazard(&row.net.name)) {
        text.push_str(
            " It says nothing about insulation or safety: for mains, medical and safety circuits follow local codes \
             and licensed practice.",
        );
    }
    text
}

fn fields(
    order: &[&ContactRow],
    input: &ContactInput,
    (sheet, count): (usize, usize),
    number: &str,
) -> [Vec<(&'static str, String)>; 2] {
    let or = |first: &str, second: &str| plain(if first.is_empty() { second } else { first });
    let maps = || order.iter().flat_map(|row| thumbnails(row));
    let residual = maps().filter_map(|map| map.residual).max_by(f64::total_cmp);
    let cells: Vec<f64> = maps().map(|map| map.cell_m).collect();
    let (low, high) = cells.iter().fold((f64::INFINITY, 0.0_f64), |(a, b), &c| (a.min(c), b.max(c)));
    let cell = match cells.len() {
        0 => "none".to_owned(),
        _ if high - low < 1e-9 => given_millimeters(low),
        _ => format!("{} to {}", given_millimeters(low), given_millimeters(high)),
    };
    let model = match model(order) {
        Some(Model::Sheet) => "thin sheet, quasi-static",
        Some(Model::Spread) => "closed form",
        None => "none",
    };
    [
        vec![
            ("Title", "Return currents, contact sheet".to_owned()),
            ("Board", or(&input.review.title, &input.board.title)),
            ("Revision", or(&input.review.revision, &input.board.revision)),
            ("Sheet", format!("{sheet} of {count}")),
        ],
        vec![
            ("Model", model.to_owned()),
            ("Cell", cell),
            ("Largest residual", residual.map_or("none".to_owned(), super::words::power_of_ten)),
            ("Smallest height h", given_millimeters(input.scale.height_m)),
            ("Picture no.", number.to_owned()),
        ],
    ]
}

fn description(order: &[&ContactRow], input: &ContactInput) -> String {
    let mut text = format!("{}. {}", headline(order, input), lead(order).join(" "));
    for row in order {
        for (cell, (band, hz)) in row.cells.iter().zip(&input.columns) {
            let place = format!(
                "{} on {} in {} at {}",
                plain(&row.net.name),
                plain(&row.chart.plane.to_string()),
                plain(&band.name),
                hertz(*hz)
            );
            match cell {
                ContactCell::Map(map, _) => {
                    let share = map.figures.share_3h.value.map_or("not stated".to_owned(), percent);
                    let extra = extra_inductance(&map.figures).map_or("not stated".to_owned(), signed_henry);
                    text.push_str(&format!(
                        " {place}: {share} within 3h, loop inductance caused by voids {extra}."
                    ));
                }
                ContactCell::Withheld(reason) => {
                    text.push_str(&format!(" {place}: withheld, {}.", plain(reason)))
                }
            }
        }
    }
    text
}
