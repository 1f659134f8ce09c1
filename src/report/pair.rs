//! The pair map: where the returns of an aggressor and a victim share a plane, and what that costs the victim.

use super::Picture;
use super::ticket::{caution_text, map_data, picture_number, window};
use super::words::{band_range, given_millimeters, hertz, percent};
use crate::board::Board;
use crate::draw::pair::overlap;
use crate::draw::pairsheet::{PairFigure, PairNet, PairSheet, scene};
use crate::draw::png::RenderFault;
use crate::draw::ticket::map_room;
use crate::draw::{DensityScale, Scene, plain, shortened, with_prefix};
use crate::field::ReturnMap;
use crate::figure::Figures;
use crate::plan::{ChartPlan, PathPlan};
use crate::review::{Band, Review};
use crate::style::{Face, Style};
use num_complex::Complex64;

/// One net of a pair.
#[derive(Clone, Copy, Debug)]
pub struct PairSide<'a> {
    /// Net.
    pub net: &'a PathPlan,
    /// Its chart on the plane.
    pub chart: &'a ChartPlan,
    /// Its map.
    pub map: &'a ReturnMap,
    /// Its figures.
    pub figures: &'a Figures,
}

/// What a pair map is made from.
#[derive(Clone, Copy, Debug)]
pub struct PairInput<'a> {
    /// Board.
    pub board: &'a Board,
    /// Review.
    pub review: &'a Review,
    /// The aggressor.
    pub aggressor: PairSide<'a>,
    /// The victim.
    pub victim: PairSide<'a>,
    /// Band of both maps.
    pub band: &'a Band,
    /// Mutual impedance: voltage round the victim's loop per ampere of the aggressor, in ohm.
    pub mutual_ohm: Option<Complex64>,
    /// Current of the aggressor in ampere, rms, and the noise in volts, rms, that it makes in the victim's loop.
    pub noise: Option<(f64, f64)>,
    /// The one scale of the set.
    pub scale: DensityScale,
    /// Style.
    pub style: &'a Style,
    /// Hash of inputs and settings, hexadecimal.
    pub input_hash: &'a str,
    /// Number of this sheet and of all sheets.
    pub sheet: (usize, usize),
}

/// Draws a pair map.
pub fn pair(input: &PairInput) -> Result<Picture, RenderFault> {
    Picture::of(&pair_scene(input))
}

/// The scene of a pair map, before it is written.
pub fn pair_scene(input: &PairInput) -> Scene {
    scene(&sheet(input), input.style)
}

fn sheet(input: &PairInput) -> PairSheet {
    let PairInput { board, review, aggressor, victim, band, style, .. } = *input;
    let data =
        |side: PairSide| map_data(board, review, side.net, side.chart, side.map, side.figures.contour_levels);
    let (a, b) = (data(aggressor), data(victim));
    let room = map_room(style);
    let (first, second) = (
        window(board.outline.bounds(), &a, aggressor.chart.height_m, room),
        window(board.outline.bounds(), &b, victim.chart.height_m, room),
    );
    let shares = (
        overlap(&a.density, &b.density, victim.figures.contour_levels[1]),
        overlap(&b.density, &a.density, aggressor.figures.contour_levels[1]),
    );
    let names = [aggressor.net, victim.net].map(|net| plain(&net.name));
    let short = |name: &str, room: f64| shortened(Face::Narrow, style.font.label, name, room);
    let plane = plain(&victim.chart.plane.to_string());
    let number = picture_number(
        input.input_hash,
        &[
            "pair",
            &names[0],
            &names[1],
            &plane,
            &band.name,
            &input.aggressor.map.frequency_hz.to_string(),
            &style.name,
        ],
    );
    let frequency = hertz(aggressor.map.frequency_hz);
    let headline = headline(input, &names, shares.0);
    let lead = format!(
        "Return currents of {} (aggressor) and {} (victim) on plane {plane} at {frequency}, each per ampere of its own \
         net. Seen from the top.",
        short(&names[0], 50.0),
        short(&names[1], 50.0)
    );
    let caution = format!(
        "{} Directions are not shown: shared copper can add to a voltage or cancel it; the impedance has the phase.",
        caution_text(board, aggressor.map.model, aggressor.map.frequency_hz, &[&names[0], &names[1]])
    );
    let figures = figures(input, [&short(&names[0], 22.0), &short(&names[1], 22.0)], shares);
    let told: Vec<String> =
        figures.iter().map(|figure| format!("{} {}", figure.value, figure.lines.join(" "))).collect();
    PairSheet {
        description: format!("{headline}. {lead} {}. {caution}", told.join("; ")),
        headline,
        lead,
        a: PairNet { name: names[0].clone(), map: a },
        b: PairNet { name: names[1].clone(), map: b },
        window: first.union(second),
        origin: review.origin,
        scale: input.scale,
        figures,
        words: "A/m per A: amperes of return across each meter of plane, per ampere in the net. Densities are sizes: the \
                overlap is of copper used, not of current shared. Impedance: volts round the victim's loop per ampere \
                in the aggressor, resistance and induction together. Less is better in all figures."
            .to_owned(),
        fields: vec![
            ("Board", plain(if review.title.is_empty() { &board.title } else { &review.title })),
            ("Revision", plain(if review.revision.is_empty() { &board.revision } else { &review.revision })),
            ("Nets", format!("{}, {}", names[0], names[1])),
            ("Band", format!("{}, {}, at {frequency}", plain(&band.name), band_range(band))),
            ("Plane", plane.clone()),
            ("Height h", given_millimeters(victim.chart.height_m)),
            ("Cell", given_millimeters(victim.map.grid.cell_m)),
            ("Picture no.", number.clone()),
            ("Sheet", format!("{} of {}", input.sheet.0, input.sheet.1)),
        ],
        caution,
        title: format!("{} and {}, {plane}, {}", names[0], names[1], plain(&band.name)),
        facts: vec![
            ("board".into(), plain(&review.title)),
            ("aggressor".into(), names[0].clone()),
            ("victim".into(), names[1].clone()),
            ("plane".into(), plane),
            ("band".into(), plain(&band.name)),
            ("frequency_hz".into(), aggressor.map.frequency_hz.to_string()),
            ("scale_0db_a_per_m_per_a".into(), input.scale.anchor().to_string()),
            ("style".into(), plain(&style.name)),
            ("version".into(), env!("CARGO_PKG_VERSION").into()),
            ("input_hash".into(), input.input_hash.into()),
        ],
        number,
    }
}

fn headline(input: &PairInput, names: &[String; 2], share: Option<f64>) -> String {
    let short = |name: &str| shortened(Face::Bold, 5.6, name, 70.0);
    let band = plain(&input.band.name);
    match (input.noise, share) {
        (Some((_, volts)), _) => {
            format!(
                "{} puts {} of noise on {} in {band}",
                short(&names[0]),
                with_prefix(volts, "V", 2),
                short(&names[1])
            )
        }
        (None, Some(share)) => format!(
            "{} of the return density of {} lies on copper of {} in {band}",
            percent(share),
            short(&names[0]),
            short(&names[1])
        ),
        (None, None) => format!("{} and {} in {band}", short(&names[0]), short(&names[1])),
    }
}

fn figures(input: &PairInput, names: [&str; 2], shares: (Option<f64>, Option<f64>)) -> Vec<PairFigure> {
    let share = |value: Option<f64>, of: &str, on: &str| PairFigure {
        value: value.map_or("not stated".to_owned(), percent),
        lines: [format!("of the density of {of}"), format!("lies in the 80\u{a0}% area of {on}")],
    };
    let mut all = vec![share(shares.0, names[0], names[1]), share(shares.1, names[1], names[0])];
    if let Some(mutual) = input.mutual_ohm {
        all.push(PairFigure {
            value: with_prefix(mutual.norm(), "\u{3a9}", 2),
            lines: [
                "mutual impedance;".to_owned(),
                format!("its resistance {}", with_prefix(mutual.re, "\u{3a9}", 2)),
            ],
        });
    }
    if let Some((ampere, volt)) = input.noise {
        all.push(PairFigure {
            value: with_prefix(volt, "V", 2),
            lines: [
                format!("in the loop of {} for {}", names[1], with_prefix(ampere, "A", 2)),
                format!("in {}, both rms", names[0]),
            ],
        });
    }
    all
}
