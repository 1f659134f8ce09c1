//! The rules that every style keeps: contrast, monotone gradients, legible sizes.
//!
//! Contrast limits: WCAG 2.2, success criteria 1.4.3 (text 4.5 : 1) and 1.4.11 (graphic objects 3 : 1).

use super::{Gradient, Rgb, Style};

/// Least CIE 1976 difference between levels a sixth of the range apart, in the worst of all visions.
const LEAST_STEP: f64 = 7.0;

/// A broken rule.
#[derive(Clone, Debug, PartialEq)]
pub struct Fault {
    /// Table and key in the style file, for example `colour.ink`.
    pub key: String,
    /// What must hold and what was got.
    pub text: String,
}

/// Broken rules of `style`, in the order of the style file's tables.
pub fn check(style: &Style) -> Vec<Fault> {
    let mut faults = Vec::new();
    sizes(style, &mut faults);
    contrasts(style, &mut faults);
    density(style, &mut faults);
    change(style, &mut faults);
    faults
}

fn fault(faults: &mut Vec<Fault>, key: &str, text: String) {
    faults.push(Fault { key: key.to_owned(), text });
}

fn sizes(style: &Style, faults: &mut Vec<Fault>) {
    let font = &style.font;
    let least = style.rules.text_size_min;
    let sizes = [
        ("headline", font.headline),
        ("lead", font.lead),
        ("body", font.body),
        ("value", font.value),
        ("tick", font.tick),
        ("label", font.label),
    ];
    for (name, size) in sizes {
        if size < least {
            let text = format!("type size `{name}` must be at least {least} mm; got {size} mm");
            fault(faults, &format!("font.{name}"), text);
        }
    }
}

fn contrasts(style: &Style, faults: &mut Vec<Fault>) {
    let color = &style.color;
    let mut need = |name: &str, ink: Rgb, ground_name: &str, ground: Rgb, least: f64| {
        let got = ink.contrast(ground);
        if got < least {
            let text = format!(
                "contrast of `{name}` {} on `{ground_name}` {} must be at least {least}; got {got:.1}",
                ink.hex(),
                ground.hex()
            );
            fault(faults, &format!("colour.{name}"), text);
        }
    };
    let (text, mark) = (style.rules.text_min, style.rules.mark_min);
    for (name, ink) in [("ink", color.ink), ("ink_soft", color.ink_soft)] {
        need(name, ink, "page", color.page, text);
        need(name, ink, "panel", color.panel, text);
    }
    for (name, ink) in
        [("mark", color.mark), ("boundary", color.boundary), ("worse", color.worse), ("better", color.better)]
    {
        need(name, ink, "page", color.page, text);
    }
    need("mark_text", color.mark_text, "mark", color.mark, text);
    let objects = [
        ("rule", color.rule),
        ("plane_edge", color.plane_edge),
        ("void_edge", color.void_edge),
        ("part", color.part),
        ("track_case", color.track_case),
    ];
    for (name, ink) in objects {
        need(name, ink, "page", color.page, mark);
    }
    need("track", color.track, "track_case", color.track_case, mark);
    for index in [0, Gradient::LEVELS - 1] {
        need("series", style.series.colors()[index], "page", color.page, mark);
    }
    // Symbols outside the map stand on the page: bars, discs, the two hues of a pair.
    need("over", color.over, "page", color.page, mark);
    // The weaker of the two inks is never used, so the better of both counts at every level of the map.
    let worst = style.density.gradient.colors().iter().map(|&ground| {
        let ink = ground.ink_of(color.on_dark, color.on_light);
        (ground.contrast(ink), ground)
    });
    let worst = worst.fold((f64::INFINITY, Rgb::default()), |a, b| if b.0 < a.0 { b } else { a });
    if worst.0 < mark {
        let text = format!(
            "one of `on_dark` and `on_light` must have contrast {mark} at every level of the map; got {:.1} at {}",
            worst.0,
            worst.1.hex()
        );
        fault(faults, "colour.on_dark", text);
    }
}

fn density(style: &Style, faults: &mut Vec<Fault>) {
    let gradient = &style.density.gradient;
    if !monotone(gradient) {
        let text = format!(
            "lightness of density map `{}` must rise or fall all the way; it turns within the part used",
            gradient.name()
        );
        fault(faults, map_key(gradient), text);
    }
    // Ten decibels of sixty, or one step, must stay apart for everybody.
    let step = super::vision::least_step(gradient, 6);
    if step < LEAST_STEP {
        let text = format!(
            "levels of density map `{}` a sixth of the range apart must differ by at least {LEAST_STEP} (CIE 1976) for \
             people with any color-vision deficiency; got {step:.1}",
            gradient.name()
        );
        fault(faults, map_key(gradient), text);
    }
    let page = style.color.page;
    let (low, high) = (page.difference(gradient.at(0.0)), page.difference(gradient.at(1.0)));
    if low < 10.0 {
        let text =
            format!("lowest density must differ from the page by at least 10 (CIE 1976); got {low:.1}");
        fault(faults, "density.clip", text);
    }
    if high < low {
        let text = format!(
            "highest density must stand out from the page more than the lowest; got differences {high:.1} and {low:.1}"
        );
        fault(faults, "density.turn_over", text);
    }
    if !(style.density.range_db > 0.0 && style.density.range_db <= 120.0) {
        let text = format!("range must be above 0 dB and at most 120 dB; got {} dB", style.density.range_db);
        fault(faults, "density.range_db", text);
    }
}

/// The key that gave the gradient.
fn map_key(gradient: &Gradient) -> &'static str {
    if gradient.name() == "stops" { "density.stops" } else { "density.map" }
}

/// Whether lightness L* rises or falls all the way. 8-bit colors jitter by up to 0.4 L* from level to level in the
/// dark, so a step may go back by 0.5 L* but not below what was reached three levels before.
pub(super) fn monotone(gradient: &Gradient) -> bool {
    let light: Vec<f64> = gradient.colors().iter().map(|color| color.lab().l).collect();
    let falls = light[light.len() - 1] < light[0];
    let ordered = |a: f64, b: f64, slack: f64| if falls { b <= a + slack } else { b >= a - slack };
    light.windows(2).all(|w| ordered(w[0], w[1], 0.5)) && light.windows(4).all(|w| ordered(w[0], w[3], 0.01))
}

fn change(style: &Style, faults: &mut Vec<Fault>) {
    let change = &style.change;
    for (index, (low, high)) in change.low.iter().zip(change.high.iter().rev()).enumerate() {
        let (a, b) = (low.lab().l, high.lab().l);
        if (a - b).abs() > 6.0 {
            let text = format!(
                "stops {} of `low` and {} of `high` must be equally light within 6 L*; got {a:.0} and {b:.0}",
                index + 1,
                3 - index
            );
            fault(faults, "change.low", text);
        }
    }
    let zero = change.zero.lab();
    if libm::hypot(zero.a, zero.b) > 8.0 {
        fault(
            faults,
            "change.zero",
            format!("color of no change must be neutral; got {}", change.zero.hex()),
        );
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn gradients_known_to_turn_are_refused_and_the_others_pass() {
        for name in super::super::gradient_names() {
            let Some(gradient) = Gradient::named(name, false, [0.02, 0.98]) else {
                panic!("{name} is missing")
            };
            assert_eq!(monotone(&gradient), name != "TURBO", "{name}");
        }
    }
}
