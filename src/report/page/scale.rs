//! The scale drawing of a row: brackets for bounds, a dot for the value, a bar for its expanded uncertainty.
//! Must not let meaning rest on colour: a value outside is a cross, one off the scale an arrow.
//! Main items: [`draw`], [`RowScale`].

use super::{
    super::{
        scene::{Anchor, BEST, DARK, GREY, INSIDE, RULE, RUST, Scene, Stroke, Style},
        text::bound_text,
        typeface::{SMALLEST, Typeface},
    },
    rows,
};
use crate::{
    measurand::{self, Measurand, Shape},
    phrase::Language,
    record::sheet::{Judged, Row, RowVerdict, Value, Zone},
};

/// Left end of the axis.
pub const LEFT_END: f64 = 320.0;
/// Right end of the axis.
const RIGHT_END: f64 = 480.0;
/// Left end of what may be written before the axis.
pub const LABEL_LEFT: f64 = 284.0;
/// Right end of what may be written after the axis.
const LABEL_RIGHT: f64 = 520.0;
/// Two crossing lines for what lies outside.
pub const CROSS: Stroke = Stroke::solid(RUST, 1.5);
/// How far, in spans of the bounds, a value may lie outside and still be drawn to scale.
const FARTHEST: f64 = 3.0;

/// The drawing of a row before it is drawn, on paper or on a terminal.
pub struct RowScale {
    axis: Axis,
    /// Bounds of each grade that has any, best grade first, open ends at infinity; SI.
    pub bounds: Vec<(f64, f64)>,
    /// Value, SI.
    pub value: f64,
    /// Expanded uncertainty, SI; 0 where there is none.
    pub expanded: f64,
    /// The value is a lower bound.
    pub open: bool,
    /// Outside, or not conforming for the least demanding grade.
    pub crossed: bool,
    /// Lower bounds in figures, best grade first.
    pub lower_text: String,
    /// Upper bounds in figures.
    pub upper_text: String,
}

impl RowScale {
    /// None where nothing is limited or nothing can be drawn to scale.
    pub fn of(row: &Row, language: Language) -> Option<Self> {
        let (value, expanded, open) = match row.value {
            Value::Number { value, .. } if !value.is_finite() => return None,
            Value::Number { value, expanded, .. } => (value, if expanded.is_finite() { expanded } else { 0.0 }, false),
            Value::AtLeast(least) => (least, 0.0, true),
            _ => return None,
        };
        let bounds: Vec<(f64, f64)> = row.judged.iter().filter_map(bounds_of).collect();
        if bounds.is_empty() {
            return None;
        }
        let known = measurand::find(&row.measurand);
        // To scale around the bounds that tell most: those of another grade would squeeze a doubt into a dot.
        let telling: Vec<(f64, f64)> = rows::telling(row).and_then(bounds_of).into_iter().collect();
        let axis = Axis::around(if telling.is_empty() { &bounds } else { &telling }, value, expanded, known);
        let (lower_text, upper_text) = (
            figures(row, known, language, |judged| judged.lower),
            figures(row, known, language, |judged| judged.upper),
        );
        Some(Self { axis, bounds, value, expanded, open, crossed: crossed(row), lower_text, upper_text })
    }

    /// Place of a value on the axis, 0 at its left end, 1 at its right; beyond the ends, the end.
    pub fn part(&self, value: f64) -> f64 {
        self.axis.part(value)
    }

    /// The axis reaches a value.
    pub fn reaches(&self, value: f64) -> bool {
        (self.axis.from..=self.axis.to).contains(&value)
    }
}

/// The drawing, its axis at `y`; nothing where nothing is limited.
pub fn draw(scene: &mut Scene, face: &Typeface, row: &Row, y: f64, pitch: f64) {
    let Some(scale) = RowScale::of(row, face.language) else { return };
    let (axis, bounds) = (&scale.axis, &scale.bounds);
    let half = pitch * 0.235;
    scene.line(vec![(LEFT_END, y), (RIGHT_END, y)], Stroke::solid(RULE, 0.5));
    let widest = bounds.iter().fold((f64::INFINITY, f64::NEG_INFINITY), |a, b| (a.0.min(b.0), a.1.max(b.1)));
    let tightest = bounds.iter().fold((f64::NEG_INFINITY, f64::INFINITY), |a, b| (a.0.max(b.0), a.1.min(b.1)));
    let grades = if widest == tightest { vec![(widest, BEST)] } else { vec![(widest, INSIDE), (tightest, BEST)] };
    for ((lower, upper), ink) in grades {
        let (from, to) = (axis.place(lower), axis.place(upper));
        if to > from {
            scene.block((from, y - half), (to - from, 2.0 * half), ink);
        }
    }
    for &(lower, upper) in bounds {
        bracket(scene, axis.inside(lower), 2.2, y, half + 1.4);
        bracket(scene, axis.inside(upper), -2.2, y, half + 1.4);
    }
    numbers(scene, face, &scale, y);
    mark(scene, axis, (scale.value, scale.expanded), y, scale.crossed, scale.open);
}

/// Bounds with open ends at infinity; none if there is no bound at all.
fn bounds_of(judged: &Judged) -> Option<(f64, f64)> {
    let (lower, upper) = (judged.lower.filter(|b| b.is_finite()), judged.upper.filter(|b| b.is_finite()));
    (lower.is_some() || upper.is_some()).then(|| (lower.unwrap_or(f64::NEG_INFINITY), upper.unwrap_or(f64::INFINITY)))
}

/// Outside, or not conforming for the least demanding grade.
fn crossed(row: &Row) -> bool {
    row.judged.last().is_some_and(|judged| {
        judged.verdict == RowVerdict::Fail || matches!(judged.zone, Some(Zone::Outside | Zone::OutsideByU))
    })
}

/// From value to place.
struct Axis {
    from: f64,
    to: f64,
}

impl Axis {
    /// Holds every bound, the value with its uncertainty, and zero where that is where the measurand begins.
    fn around(bounds: &[(f64, f64)], value: f64, expanded: f64, known: Option<&Measurand>) -> Self {
        let ends: Vec<f64> = bounds.iter().flat_map(|&(a, b)| [a, b]).filter(|b| b.is_finite()).collect();
        let (low, high) = ends.iter().fold((f64::INFINITY, f64::NEG_INFINITY), |a, &b| (a.0.min(b), a.1.max(b)));
        let upper_only = bounds.iter().all(|(lower, _)| lower.is_infinite());
        let positive = known.is_some_and(|m| m.shape == Shape::Positive) || value >= 0.0;
        let span = match high - low {
            span if span > 0.0 => span,
            _ => high.abs().max(2.0 * expanded).max(f64::MIN_POSITIVE),
        };
        let (mut from, mut to) = (low.min(value - expanded), high.max(value + expanded));
        from = from.max(low - FARTHEST * span);
        to = to.min(high + FARTHEST * span);
        let starts_at_zero = upper_only && positive && low > 0.0;
        if starts_at_zero {
            from = 0.0;
        }
        let margin = ((to - from) * 0.14).max(span * 0.02);
        Self { from: if starts_at_zero { 0.0 } else { from - margin }, to: to + margin }
    }

    /// Place on the page, if the axis reaches that far.
    fn inside(&self, value: f64) -> Option<f64> {
        (self.from..=self.to).contains(&value).then(|| self.place(value))
    }

    /// Place on the page; beyond the ends, the end.
    fn place(&self, value: f64) -> f64 {
        LEFT_END + (RIGHT_END - LEFT_END) * self.part(value)
    }

    /// The same as a part of the axis.
    fn part(&self, value: f64) -> f64 {
        let part = (value - self.from) / (self.to - self.from);
        if part.is_nan() { 0.5 } else { part.clamp(0.0, 1.0) }
    }
}

/// `[` with positive `serif`, `]` with negative.
fn bracket(scene: &mut Scene, x: Option<f64>, serif: f64, y: f64, half: f64) {
    if let Some(x) = x {
        let points = vec![(x + serif, y - half), (x, y - half), (x, y + half), (x + serif, y + half)];
        scene.line(points, Stroke::solid(GREY, 0.9));
    }
}

/// Bounds in figures, best grade first, each once.
fn figures(
    row: &Row,
    known: Option<&'static Measurand>,
    language: Language,
    bound: fn(&Judged) -> Option<f64>,
) -> String {
    let mut texts: Vec<String> = Vec::new();
    for text in row.judged.iter().filter_map(bound).map(|b| bound_text(known, b, language)) {
        if !texts.contains(&text) {
            texts.push(text);
        }
    }
    texts.join(" · ")
}

/// The bounds in figures at the ends of the axis.
fn numbers(scene: &mut Scene, face: &Typeface, scale: &RowScale, y: f64) {
    let style = Style::plain(SMALLEST, GREY);
    let baseline = y + style.size * 0.35;
    let room = |from: f64, to: f64| to - from - 5.0;
    let (lower, upper) = (&scale.lower_text, &scale.upper_text);
    scene.fitted(face, (LEFT_END - 4.0, baseline), Anchor::End, lower, style, room(LABEL_LEFT, LEFT_END));
    scene.fitted(face, (RIGHT_END + 4.0, baseline), Anchor::Start, upper, style, room(RIGHT_END, LABEL_RIGHT));
}

/// Value and uncertainty: a dot, a cross outside, an arrow off the scale or for "at least".
fn mark(scene: &mut Scene, axis: &Axis, (value, expanded): (f64, f64), y: f64, crossed: bool, open: bool) {
    let x = axis.place(value);
    let ink = if crossed { RUST } else { DARK };
    let bar = Stroke::solid(ink, 1.5);
    let to = if open { RIGHT_END } else { axis.place(value + expanded) };
    scene.line(vec![(axis.place(value - expanded), y), (to, y)], bar);
    let arrow = |scene: &mut Scene, tip: f64, back: f64| {
        scene.line(vec![(tip + back, y - 2.6), (tip, y), (tip + back, y + 2.6)], bar);
    };
    if open {
        arrow(scene, RIGHT_END, -3.2);
    }
    if value > axis.to {
        arrow(scene, RIGHT_END, -3.2);
        arrow(scene, RIGHT_END - 3.0, -3.2);
    } else if value < axis.from {
        arrow(scene, LEFT_END, 3.2);
        arrow(scene, LEFT_END + 3.0, 3.2);
    } else if crossed {
        scene.cross((x, y), 3.0, CROSS);
    } else {
        scene.disc((x, y), 2.3, DARK);
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn bounds_and_value_stand_in_order_on_the_axis() {
        let axis = Axis::around(&[(979.3, 1019.3)], 998.7, 3.0, None);
        let places = [979.3, 995.7, 998.7, 1001.7, 1019.3].map(|v| axis.place(v));
        assert!(places.windows(2).all(|pair| pair[0] < pair[1]));
        assert!(places[0] > LEFT_END + 10.0 && places[4] < RIGHT_END - 10.0);
    }

    #[test]
    fn zero_begins_the_axis_of_an_upper_bound() {
        let axis = Axis::around(&[(f64::NEG_INFINITY, 2.0)], 0.4, 0.2, None);
        assert_eq!(axis.place(0.0), LEFT_END);
        assert_eq!(axis.place(f64::NEG_INFINITY), LEFT_END);
    }

    #[test]
    fn odd_values_stay_on_the_page() {
        for (bounds, value, expanded) in [
            ((0.0, 0.0), 0.0, 0.0),
            ((1.0, 2.0), 1e300, 1e300),
            ((1.0, 2.0), -1e300, 0.0),
            ((1e308, f64::INFINITY), -1e308, 1e308),
        ] {
            let x = Axis::around(&[bounds], value, expanded, None).place(value);
            assert!((LEFT_END..=RIGHT_END).contains(&x), "{bounds:?} {value}: {x}");
        }
    }
}
