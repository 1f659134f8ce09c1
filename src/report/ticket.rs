//! The ticket map of one net, plane and frequency: from plan, map and figures to a picture.

use super::Picture;
use super::current;
use super::remark::{Remarks, joint_marks, result, worst_here};
use super::words::{
    band_range, given_millimeters, hertz, hints_at_hazard, millimeters, percent, power_of_ten,
};
use crate::board::Board;
use crate::draw::density::Density;
use crate::draw::flow::Flow;
use crate::draw::map::{MapData, MapLeg, MapPin};
use crate::draw::panel::{KeyFigure, KeyRow, Panel, Section, SectionLayer};
use crate::draw::png::RenderFault;
use crate::draw::ticket::{TicketSheet, map_room, scene};
use crate::draw::{DensityScale, Scene, View, italic, plain, shortened, with_prefix};
use crate::field::{JointCurrent, ReturnMap};
use crate::figure::{Figure, Figures};
use crate::finding::Finding;
use crate::geom::{Bounds, Point, Polygon};
use crate::plan::{ChartPlan, PathPlan};
use crate::review::{Band, Model, Review};
use crate::style::{Face, Style};

/// What a ticket map is made from.
#[derive(Clone, Copy, Debug)]
pub struct TicketInput<'a> {
    /// Board.
    pub board: &'a Board,
    /// Review.
    pub review: &'a Review,
    /// Net.
    pub net: &'a PathPlan,
    /// Plane and what of the track it carries.
    pub chart: &'a ChartPlan,
    /// Band.
    pub band: &'a Band,
    /// The solved map.
    pub map: &'a ReturnMap,
    /// Its figures.
    pub figures: &'a Figures,
    /// The one scale of the set.
    pub scale: DensityScale,
    /// Findings of the net, most serious first; none when none were sought.
    pub findings: Option<&'a [Finding]>,
    /// What vias, parts and ties carry of the return.
    pub joints: &'a [JointCurrent],
    /// Style.
    pub style: &'a Style,
    /// Hash of inputs and settings, hexadecimal; the picture number comes from it.
    pub input_hash: &'a str,
    /// Number of this sheet and of all sheets.
    pub sheet: (usize, usize),
    /// Address of the contact sheet, relative to this picture.
    pub index: Option<&'a str>,
}

/// Draws a ticket map.
pub fn ticket(input: &TicketInput) -> Result<Picture, RenderFault> {
    Picture::of(&ticket_scene(input))
}

/// The scene of a ticket map, before it is written.
pub fn ticket_scene(input: &TicketInput) -> Scene {
    scene(&sheet(input), input.style)
}

/// Picture number from the input hash and what is drawn, for example `EB-C3F1-7167`.
pub(super) fn picture_number(input_hash: &str, what: &[&str]) -> String {
    let text = format!("{input_hash}\n{}", what.join("\n"));
    let hash = super::sha256_hex(text.as_bytes()).to_uppercase();
    format!("EB-{}-{}", &hash[..4], &hash[4..8])
}

/// Frequency in Hz up to which the board is shorter than a tenth of a wavelength in its dielectric.
pub(super) fn validity_limit_hz(board: &Board) -> Option<f64> {
    let bounds = board.outline.bounds();
    let diagonal_m = libm::hypot(bounds.width(), bounds.height());
    let permittivity = board.stackup.dielectrics.iter().map(|sheet| sheet.permittivity).fold(1.0, f64::max);
    let limit = crate::unit::constants::C0 / (10.0 * diagonal_m * permittivity.sqrt());
    limit.is_finite().then_some(limit)
}

/// The sentence about what the model leaves out, and where it holds.
pub(super) fn caution_text(board: &Board, model: Model, highest_hz: f64, names: &[&str]) -> String {
    let mut text = match model {
        Model::Sheet => {
            "Quasi-static sheet model: no radiation, no resonance between planes, no parts.".to_owned()
        }
        Model::Spread => {
            "Closed form over an endless plane: voids, edges, radiation and resonance are not considered."
                .to_owned()
        }
    };
    if let Some(limit) = validity_limit_hz(board) {
        let limit_text = with_prefix(limit, "Hz", 2);
        text.push_str(&format!(
            " Trust it while the board is shorter than a tenth of a wavelength (here up to {limit_text})"
        ));
        text.push_str(&if highest_hz > limit {
            format!("; {} lies above that limit: read it as a tendency only.", hertz(highest_hz))
        } else {
            ".".to_owned()
        });
    }
    if names.iter().any(|name| hints_at_hazard(name)) {
        text.push_str(
            " It says nothing about insulation or safety: for mains, medical and safety circuits follow local codes \
             and licensed practice.",
        );
    }
    text
}

/// The copper of the charted plane: what was solved, and what no return reaches.
pub(super) fn plane_copper(
    board: &Board,
    chart: &ChartPlan,
    density: &Density,
) -> (Vec<Polygon>, Vec<Polygon>) {
    let net = board.net(&chart.plane.net);
    let Some(layer) = board.layers.get(chart.plane.layer) else { return (Vec::new(), Vec::new()) };
    let areas = layer.areas.iter().filter(|area| area.net.is_some() && area.net == net);
    areas.map(|area| area.shape.clone()).partition(|shape| holds_cell(shape, density))
}

/// Whether a copper cell of the map lies on the shape.
fn holds_cell(shape: &Polygon, density: &Density) -> bool {
    let grid = &density.grid;
    let bounds = shape.bounds();
    let index = |value: f64, low: f64, count: usize| {
        (((value - low) / grid.cell_m).max(0.0) as usize).min(count.saturating_sub(1))
    };
    let (x0, x1) = (index(bounds.min.x, grid.origin.x, grid.nx), index(bounds.max.x, grid.origin.x, grid.nx));
    let (y0, y1) = (index(bounds.min.y, grid.origin.y, grid.ny), index(bounds.max.y, grid.origin.y, grid.ny));
    (y0..=y1).any(|iy| {
        (x0..=x1).any(|ix| density.copper[grid.index(ix, iy)] && shape.contains(grid.centre(ix, iy)))
    })
}

/// The map's data for drawing.
pub(super) fn map_data(
    board: &Board,
    review: &Review,
    net: &PathPlan,
    chart: &ChartPlan,
    map: &ReturnMap,
    levels: [f64; 3],
) -> MapData {
    let density = Density::of(map);
    let (plane, idle) = plane_copper(board, chart, &density);
    let legs = net.track.iter().enumerate();
    let track: Vec<MapLeg> = legs
        .map(|(index, leg)| MapLeg { from: leg.from, to: leg.to, charted: chart.legs.contains(&index) })
        .collect();
    let pin = |name: &str, at: Option<Point>| at.map(|at| MapPin { name: name.to_owned(), at });
    MapData {
        density,
        plane,
        idle,
        outline: board.outline.clone(),
        zones: review.zones.iter().map(|zone| (zone.name.clone(), zone.outline.clone())).collect(),
        driver: pin(&net.driver, track.first().map(|leg| leg.from)),
        receiver: pin(&net.receiver, track.last().map(|leg| leg.to)),
        track,
        landings: vec![chart.driver_landing.at, chart.receiver_landing.at],
        levels,
        callouts: Vec::new(),
        joints: Vec::new(),
        flow: None,
    }
}

/// The part of the board to draw: all of it, or a window round the track and 80 % of the density when the track would be
/// too small to be seen.
pub(super) fn window(board: Bounds, data: &MapData, height_m: f64, room: (f64, f64)) -> Bounds {
    let whole = board.grown(0.5e-3);
    let level = data.levels[1];
    let grid = &data.density.grid;
    let mut focus =
        Bounds::of(data.track.iter().filter(|leg| leg.charted).flat_map(|leg| [leg.from, leg.to]));
    focus = data.landings.iter().fold(focus, |all, &at| all.with(at));
    let track = focus;
    for iy in 0..grid.ny {
        for ix in 0..grid.nx {
            let index = grid.index(ix, iy);
            if data.density.copper[index] && data.density.values[index] >= level && level > 0.0 {
                focus = focus.with(grid.centre(ix, iy));
            }
        }
    }
    // Far specks of high density (tips of slots) may pull the focus apart; what the track needs is always inside.
    let reach = track.grown((0.5 * track.width().max(track.height())).max(30.0 * height_m));
    let cut = Bounds {
        min: Point::new(focus.min.x.max(reach.min.x), focus.min.y.max(reach.min.y)),
        max: Point::new(focus.max.x.min(reach.max.x), focus.max.y.min(reach.max.y)),
    };
    let wanted = cut.grown((15.0 * height_m).max(4e-3));
    let wanted = Bounds {
        min: Point::new(wanted.min.x.max(whole.min.x), wanted.min.y.max(whole.min.y)),
        max: Point::new(wanted.max.x.min(whole.max.x), wanted.max.y.min(whole.max.y)),
    };
    let scale = |window: Bounds| View::fitted(window, 0.0, 0.0, room.0, room.1).scale;
    let too_small = 3.0 * height_m * 1e3 * scale(whole) < 0.6;
    let larger = scale(wanted) / scale(whole);
    if larger >= 3.0 || (too_small && larger > 1.2) {
        widened(wanted, whole, scale(wanted), room)
    } else {
        whole
    }
}

/// The window grown to fill the room for the map at its scale, as far as there is board.
fn widened(window: Bounds, whole: Bounds, scale: f64, room: (f64, f64)) -> Bounds {
    let stretch = |low: f64, high: f64, room_mm: f64, least: f64, most: f64| {
        let size = (room_mm * 1e-3 / scale).min(most - least);
        if size <= high - low {
            return (low, high);
        }
        // Rounding may leave the last place a hair below the first.
        let start = (0.5 * (low + high - size)).min(most - size).max(least);
        (start, start + size)
    };
    let (x0, x1) = stretch(window.min.x, window.max.x, room.0, whole.min.x, whole.max.x);
    let (y0, y1) = stretch(window.min.y, window.max.y, room.1, whole.min.y, whole.max.y);
    Bounds { min: Point::new(x0, y0), max: Point::new(x1, y1) }
}

fn sheet(input: &TicketInput) -> TicketSheet {
    let TicketInput { board, review, net, chart, band, map, figures, style, .. } = *input;
    let mut data = map_data(board, review, net, chart, map, figures.contour_levels);
    let remarks = Remarks::of(input);
    data.callouts = remarks.callouts.clone();
    data.joints = joint_marks(input.joints, chart.plane.layer);
    data.flow = (map.model == Model::Sheet).then(|| Flow::of(map));
    let scale = input.scale;
    let bounds = board.outline.bounds();
    let window = window(bounds, &data, chart.height_m, map_room(style));
    let cut = window.width() < bounds.width() || window.height() < bounds.height();
    let number = picture_number(
        input.input_hash,
        &[&net.name, &chart.plane.to_string(), &band.name, &map.frequency_hz.to_string(), &style.name],
    );
    let headline = headline(input);
    let mut lead = format!(
        "Return current of {} ({} to {}) on plane {} {}. Seen from the top.",
        shortened(Face::Regular, style.font.lead, &net.name, 70.0),
        shortened(Face::Regular, style.font.lead, &net.driver, 25.0),
        shortened(Face::Regular, style.font.lead, &net.receiver, 25.0),
        shortened(Face::Regular, style.font.lead, &chart.plane.to_string(), 35.0),
        current::of_map(map, net),
    );
    let assumed = plain(&current::assumed(net));
    // Where the line has no room for it, it stands in the description.
    let room = style.ticket.width - 2.0 * style.ticket.margin[0];
    let longer = format!("{lead} {assumed}");
    if !assumed.is_empty() && crate::draw::width_mm(Face::Regular, style.font.lead, &longer) <= room {
        lead = longer;
    }
    let caution = caution_text(board, map.model, map.frequency_hz, &[&net.name, &chart.plane.net]);
    let mut panels = vec![Panel::figures(key_figures(input), style)];
    if !remarks.listed.is_empty() {
        panels.push(Panel::findings(remarks.listed.clone(), remarks.rest, style));
    }
    panels.push(Panel::section(section(board, chart, net, scale), style));
    if cut {
        panels.push(Panel::locator(board.outline.clone(), window, style));
    }
    let description = format!(
        "{}. {}{} {} {}{caution}",
        headline_text(input, &plain(&net.name)),
        plain_lead(input),
        if assumed.is_empty() { assumed } else { format!(" {assumed}") },
        figures_text(figures),
        remarks.sentences()
    );
    let residual =
        map.residual.map_or_else(|| "closed form".to_owned(), |residual| format!("{residual:.1e}"));
    TicketSheet {
        headline,
        lead,
        map: data,
        window,
        origin: review.origin,
        scale,
        words: words(input),
        panels,
        fields: fields(input, &number),
        caution,
        title: format!("{}, {}, {}", plain(&net.name), plain(&chart.plane.to_string()), plain(&band.name)),
        description,
        number,
        facts: vec![
            ("board".into(), plain(&review.title)),
            ("revision".into(), plain(&review.revision)),
            ("net".into(), plain(&net.name)),
            ("plane".into(), plain(&chart.plane.to_string())),
            ("band".into(), plain(&band.name)),
            ("frequency_hz".into(), map.frequency_hz.to_string()),
            ("height_m".into(), chart.height_m.to_string()),
            ("cell_m".into(), map.grid.cell_m.to_string()),
            ("residual".into(), residual),
            ("scale_0db_a_per_m_per_a".into(), scale.anchor().to_string()),
            ("style".into(), plain(&style.name)),
            ("version".into(), env!("CARGO_PKG_VERSION").into()),
            ("input_hash".into(), input.input_hash.into()),
        ],
        index: input.index.map(str::to_owned),
    }
}

fn has_voids(chart: &ChartPlan) -> bool {
    !chart.voids.is_empty()
}

/// The result in words, with `net` as the net's name.
fn headline_text(input: &TicketInput, net: &str) -> String {
    let band = plain(&input.band.name);
    if let Some(finding) = worst_here(input) {
        return result(finding, net, &band);
    }
    let share = input.figures.share_3h;
    let net = &match input.findings {
        Some([]) => format!("{net}: no findings"),
        _ => net.to_owned(),
    };
    let joint = if input.findings.is_some_and(<[Finding]>::is_empty) { ";" } else { ":" };
    let Some(value) = share.value else {
        return format!("{net}{joint} no stretch is straight for long enough to state a share in {band}");
    };
    let mut text =
        format!("{net}{joint} {} of the return stays within 3{} in {band}", percent(value), italic("h"));
    if input.map.model == Model::Spread {
        if has_voids(input.chart) {
            text.push_str("; voids not considered");
        }
    } else if let Some(reference) = share.without_voids
        && has_voids(input.chart)
    {
        let same = percent(reference) == percent(value);
        text.push_str(&if same {
            ", as without voids".to_owned()
        } else {
            format!(", {} without voids", percent(reference))
        });
    }
    text
}

/// The headline with the name cut so that the line fits.
fn headline(input: &TicketInput) -> String {
    let style = input.style;
    let room = style.ticket.width - 2.0 * style.ticket.margin[0];
    let size = 0.8 * style.font.headline;
    let rest = crate::draw::width_mm(Face::Bold, size, &headline_text(input, ""));
    let name = shortened(Face::Bold, size, &input.net.name, (room - rest - 2.0).max(30.0));
    headline_text(input, &name)
}

fn plain_lead(input: &TicketInput) -> String {
    format!(
        "Return current of net {} from {} to {} on plane {} {}, seen from the top.",
        plain(&input.net.name),
        plain(&input.net.driver),
        plain(&input.net.receiver),
        plain(&input.chart.plane.to_string()),
        current::of_map(input.map, input.net),
    )
}

fn reference_text(figure: &Figure, words: impl Fn(f64) -> String) -> String {
    match (figure.value, figure.without_voids) {
        (Some(_), Some(reference)) => format!("without voids {}", words(reference)),
        (None, Some(reference)) => format!("without voids {}", words(reference)),
        (_, None) => "no reference".to_owned(),
    }
}

const HALVES: [u32; 3] = [50, 80, 95];

fn key_figures(input: &TicketInput) -> Vec<KeyFigure> {
    let figures = input.figures;
    let share = &figures.share_3h;
    let mut all = vec![KeyFigure {
        name: input.style.word("Return within 3h of the track").replace("3h", &format!("3{}", italic("h"))),
        value: share.value.map_or("not stated".to_owned(), percent),
        bar: share.value,
        tick: share.without_voids,
        notes: vec![format!("{}; more is better", reference_text(share, percent))],
        ..KeyFigure::default()
    }];
    if let Some((worst, at)) = figures.worst_share_3h {
        let at = at - input.review.origin;
        let place = |meters: f64| format!("{:.1}", meters * 1e3).replace('-', "\u{2212}");
        all[0].notes.push(format!("worst place {} at ({}, {}) mm", percent(worst), place(at.x), place(at.y)));
    }
    let widths = &figures.half_width_m;
    let full = widths.iter().flat_map(|f| [f.value, f.without_voids]).flatten().fold(0.0, f64::max);
    let words = |value: Option<f64>| value.map_or("beyond the plane".to_owned(), millimeters);
    let row = |(figure, share): (&Figure, u32)| KeyRow {
        name: format!("{share} %"),
        value: words(figure.value),
        reference: figure.without_voids.map_or("\u{2013}".to_owned(), millimeters),
        bar: figure.value.map(|value| value / full),
        tick: figure.without_voids.map(|value| value / full),
    };
    all.push(KeyFigure {
        name: input.style.word("Half-width that holds").to_owned(),
        rows: widths.iter().zip(HALVES).map(row).collect(),
        aside: input.style.word("without voids").to_owned(),
        ..KeyFigure::default()
    });
    if let Some(extra) = figures.extra_path_m.and_then(|figure| figure.value) {
        all.push(KeyFigure {
            name: format!("{}, 0 is best", input.style.word("Extra path by voids")),
            value: signed(extra, millimeters),
            ..KeyFigure::default()
        });
    }
    if let Some(loop_l) = figures.loop_inductance_h
        && let Some(value) = loop_l.value
    {
        let extra = figures.extra_loop_inductance_h.and_then(|figure| figure.value);
        let henry = |value: f64| with_prefix(value, "H", 3);
        let note = match extra {
            Some(extra) => format!("of it {} caused by voids; less is better", signed(extra, henry)),
            None => "less is better".to_owned(),
        };
        all.push(KeyFigure {
            name: input.style.word("Loop inductance").to_owned(),
            value: henry(value),
            notes: vec![note],
            ..KeyFigure::default()
        });
    }
    all
}

fn signed(value: f64, words: impl Fn(f64) -> String) -> String {
    if value > 0.0 { format!("+{}", words(value)) } else { words(value) }
}

/// All figures in sentences.
fn figures_text(figures: &Figures) -> String {
    let mut text = String::new();
    if let Some(value) = figures.share_3h.value {
        let reference = reference_text(&figures.share_3h, percent);
        text.push_str(&format!("Return within 3h of the track: {} ({reference}). ", percent(value)));
    }
    for (figure, share) in figures.half_width_m.iter().zip(HALVES) {
        let words = figure.value.map_or("beyond the plane".to_owned(), millimeters);
        let reference = reference_text(figure, millimeters);
        text.push_str(&format!("Half-width that holds {share} %: {words} ({reference}). "));
    }
    if let Some(value) = figures.extra_path_m.and_then(|figure| figure.value) {
        text.push_str(&format!("Extra path caused by voids: {}. ", signed(value, millimeters)));
    }
    if let Some(value) = figures.loop_inductance_h.and_then(|figure| figure.value) {
        text.push_str(&format!("Loop inductance: {}. ", with_prefix(value, "H", 3)));
    }
    text.trim_end().to_owned()
}

fn words(input: &TicketInput) -> String {
    let h = italic("h");
    let mut text = format!(
        "A/m per A: amperes of return across each meter of plane, per ampere in the net; 20\u{a0}dB lower is a tenth. \
         {h}: gap from track to plane; 3{h} reaches {} to each side of the track. Lines enclose 50, 80 and 95\u{a0}% of \
         the density.",
        given_millimeters(3.0 * input.chart.height_m)
    );
    if let Some(residual) = input.map.residual {
        text.push_str(&format!(
            " Cell: side of the squares that were solved; their equations are met to {} (residual).",
            power_of_ten(residual).replace(' ', "\u{a0}")
        ));
    }
    text
}

fn fields(input: &TicketInput, number: &str) -> Vec<(&'static str, String)> {
    let TicketInput { board, review, net, chart, band, map, figures, .. } = *input;
    let or = |first: &str, second: &str| plain(if first.is_empty() { second } else { first });
    let model = match map.model {
        Model::Sheet => "thin sheet, quasi-static",
        Model::Spread => "closed form",
    };
    let over = match validity_limit_hz(board) {
        Some(limit) if band.to_hz.max(map.frequency_hz) > limit => {
            format!(" (limit {})", with_prefix(limit, "Hz", 2))
        }
        _ => String::new(),
    };
    let error = figures.share_3h.error * 100.0;
    let error = if error > 0.0 {
        format!("\u{b1}{} % of the return", crate::draw::significant(error, 1))
    } else {
        "none stated".to_owned()
    };
    vec![
        ("Board", or(&review.title, &board.title)),
        ("Revision", or(&review.revision, &board.revision)),
        ("Net", plain(&net.name)),
        (
            "Band",
            format!("{}, {}, at {}{over}", plain(&band.name), band_range(band), hertz(map.frequency_hz)),
        ),
        ("Plane", plain(&chart.plane.to_string())),
        ("Height h", given_millimeters(chart.height_m)),
        ("Model", model.to_owned()),
        ("Cell", given_millimeters(map.grid.cell_m)),
        ("Numerical error", error),
        ("Picture no.", number.to_owned()),
        ("Sheet", format!("{} of {}", input.sheet.0, input.sheet.1)),
    ]
}

/// Layers from one above to one below what matters.
fn section(board: &Board, chart: &ChartPlan, net: &PathPlan, scale: DensityScale) -> Section {
    let track = net.track.get(chart.legs.start).map_or(chart.plane.layer, |leg| leg.layer);
    let count = board.layers.len().max(chart.plane.layer.max(track) + 1);
    let (low, high) = (track.min(chart.plane.layer), track.max(chart.plane.layer));
    let range = low.saturating_sub(1)..(high + 2).min(count);
    let layer = |index: usize| SectionLayer {
        name: if index == track {
            format!("L{} track", index + 1)
        } else if index == chart.plane.layer {
            format!("L{} {}", index + 1, plain(&chart.plane.net))
        } else {
            format!("L{}", index + 1)
        },
        track: index == track,
        plane: index == chart.plane.layer,
    };
    Section { layers: range.map(layer).collect(), height_m: chart.height_m, width_m: chart.width_m, scale }
}
