//! Vias, parts and ties on a map, their area in proportion to the return current that they carry.

use super::map::HALO;
use super::path::PathData;
use super::place::Placer;
use super::scene::{Group, Shape};
use super::text::{Text, shortened};
use super::view::View;
use crate::geom::Point;
use crate::style::{Face, Style};

/// Radius in mm of a via that carries all of the return.
pub const FULL: f64 = 2.6;
/// Least share of the return that is drawn.
pub const LEAST: f64 = 0.01;
/// Least share that is named, and how many names at most.
const NAMED: (f64, usize) = (0.05, 3);

/// Form of a joint's mark.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum JointForm {
    /// A circle.
    Via,
    /// A square.
    Part,
    /// A square on its corner.
    Tie,
}

/// A joint that carries return current.
#[derive(Clone, Debug, PartialEq)]
pub struct JointMark {
    /// Its place.
    pub at: Point,
    /// What it is.
    pub form: JointForm,
    /// Its name.
    pub name: String,
    /// Magnitude of its current per ampere of the net's current.
    pub current: f64,
}

/// Radius of the circle, in mm, whose area shows a current.
pub fn radius(current: f64) -> f64 {
    (FULL * current.clamp(0.0, 1.0).sqrt()).max(0.4)
}

/// Outline of a mark with the area of a circle of `radius` mm.
pub fn outline(form: JointForm, (x, y): (f64, f64), radius: f64) -> PathData {
    let mut path = PathData::new();
    // Squares of the same area: side sqrt(pi) r.
    let half = 0.886_227 * radius;
    match form {
        JointForm::Via => path.circle((x, y), radius),
        JointForm::Part => path.rect(x - half, y - half, 2.0 * half, 2.0 * half),
        JointForm::Tie => {
            let far = half * std::f64::consts::SQRT_2;
            path.ring(&[(x - far, y), (x, y - far), (x + far, y), (x, y + far)])
        }
    };
    path
}

/// A mark: halo and core.
pub fn mark(form: JointForm, at: (f64, f64), radius: f64, style: &Style) -> [Shape; 2] {
    let path = outline(form, at, radius);
    [Shape::stroked(path.clone(), style.color.page, 0.3 + HALO), Shape::filled(path, style.color.mark)]
}

/// The marks of all joints in the view that carry enough, largest first so that small ones stay visible.
pub fn marks(joints: &[JointMark], view: &View, factor: f64, style: &Style) -> Group {
    let mut group = Group::new("joints");
    for joint in shown(joints, view) {
        for shape in mark(joint.form, view.place(joint.at), factor * radius(joint.current), style) {
            group.shape(shape);
        }
    }
    group
}

/// Joints to draw, largest current first, ties by name.
fn shown<'a>(joints: &'a [JointMark], view: &View) -> Vec<&'a JointMark> {
    let mut all: Vec<&JointMark> =
        joints.iter().filter(|joint| joint.current >= LEAST && view.window.contains(joint.at)).collect();
    all.sort_by(|a, b| b.current.total_cmp(&a.current).then_with(|| a.name.cmp(&b.name)));
    all
}

/// Keeps labels off the marks.
pub fn take(joints: &[JointMark], view: &View, placer: &mut Placer) {
    for joint in shown(joints, view) {
        let half = radius(joint.current) + 0.4;
        placer.add_box(super::callout::around(view.place(joint.at), half), 4.0);
    }
}

/// Names of the joints that carry most, with their share of the return.
pub fn names(joints: &[JointMark], view: &View, placer: &mut Placer, style: &Style) -> Group {
    let mut group = Group::new("joint-names");
    let size = style.font.label;
    let named = shown(joints, view).into_iter().filter(|joint| joint.current >= NAMED.0);
    for joint in named.take(NAMED.1) {
        let name = shortened(Face::NarrowBold, size, &joint.name, 24.0);
        let words = format!("{name} {:.0}\u{a0}%", 100.0 * joint.current);
        let text = Text::new(0.0, 0.0, size, Face::NarrowBold, style.color.ink, &words);
        let spot = view.place(joint.at);
        let Some((rect, leader)) = placer.label(spot, text.width(), 0.95 * size) else { continue };
        group.group(super::map::leader(leader, style));
        group.text(super::map::placed(text, rect, style));
    }
    group
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Area in proportion to the current: a quarter of the current has half the radius.
    #[test]
    fn area_shows_the_current() {
        assert!((radius(1.0) - FULL).abs() < 1e-12);
        assert!((radius(0.25) - 0.5 * FULL).abs() < 1e-12);
        assert!((radius(0.0) - 0.4).abs() < 1e-12 && (radius(7.0) - FULL).abs() < 1e-12);
    }
}
