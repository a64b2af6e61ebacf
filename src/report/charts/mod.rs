//! The three charts of a sheet, drawn from numbers in the sheet and nothing else.
//! Must not smooth, fit or leave out what was measured.
//! Main functions: [`sweep`], [`gain`], [`walk`]; main types: [`Frame`], [`Plot`].

mod bench;
mod gain;
mod sweep;
mod walk;

pub use bench::{BENCH_HEIGHT, bench};
pub use gain::gain;
pub use sweep::sweep;
pub use walk::walk;

use super::{
    scene::{Anchor, DARK, GREY, MIST, Point, Scene, Stroke, Style, corners},
    typeface::Typeface,
};
use crate::phrase::Phrase;

/// Width of a tick's label beside the upright axis: "−100" is the widest; the page's margin takes what passes the frame.
const TICK_ROOM: f64 = 18.0;
/// Height of a chart beyond its plot: title, subtitle, room for marks, ticks, name of the axis.
pub const OVERHEAD: f64 = 54.0;
const TITLES: f64 = 30.0;
const TICK: Style = Style::plain(6.6, GREY);

/// Where a chart stands.
#[derive(Debug, Clone, Copy)]
pub struct Frame {
    /// Left edge.
    pub left: f64,
    /// Top edge.
    pub top: f64,
    /// Width.
    pub width: f64,
    /// Height of the plot alone.
    pub plot: f64,
}

/// A plot with its scales.
#[derive(Debug, Clone, Copy)]
struct Plot {
    left: f64,
    right: f64,
    top: f64,
    bottom: f64,
    x: (f64, f64),
    y: (f64, f64),
}

impl Plot {
    /// Scales wide enough to divide by, whatever comes.
    fn new(frame: Frame, x: (f64, f64), y: (f64, f64)) -> Self {
        let sound =
            |(from, to): (f64, f64)| if to - from > 0.0 && (to - from).is_finite() { (from, to) } else { (0.0, 1.0) };
        let top = frame.top + TITLES;
        let (left, right) = (frame.left + 14.0, frame.left + frame.width - 2.0);
        Self { left, right, top, bottom: top + frame.plot, x: sound(x), y: sound(y) }
    }

    fn at_x(&self, x: f64) -> f64 {
        self.left + (self.right - self.left) * (x - self.x.0) / (self.x.1 - self.x.0)
    }

    /// Never above the room for marks nor below the axis.
    fn at_y(&self, y: f64) -> f64 {
        let place = self.bottom - (self.bottom - self.top) * (y - self.y.0) / (self.y.1 - self.y.0);
        place.clamp(self.top - 4.0, self.bottom + 3.0)
    }

    fn at(&self, (x, y): Point) -> Point {
        (self.at_x(x), self.at_y(y))
    }

    fn holds(&self, x: f64) -> bool {
        (self.x.0..=self.x.1).contains(&x)
    }

    /// Both axes with ticks, and the name of the horizontal one.
    fn axes(&self, scene: &mut Scene, face: &Typeface, x_name: &str, x_ticks: usize, y_ticks: usize) {
        let line = Stroke::solid(MIST, 0.7);
        scene.line(vec![(self.left, self.top), (self.left, self.bottom), (self.right, self.bottom)], line);
        let mut free_from = f64::NEG_INFINITY;
        for (value, text) in ticks(self.x, x_ticks) {
            let text = face.language.figure(&text);
            let x = self.at_x(value);
            scene.line(vec![(x, self.bottom), (x, self.bottom + 2.5)], line);
            let half = face.width(&text, TICK) / 2.0;
            if x - half > free_from && x + half < self.right + 8.0 {
                scene.text(face, (x, self.bottom + 9.5), Anchor::Middle, &text, TICK);
                free_from = x + half + 3.0;
            }
        }
        for (value, text) in ticks(self.y, y_ticks) {
            let text = face.language.figure(&text);
            let y = self.at_y(value);
            scene.line(vec![(self.left - 2.5, y), (self.left, y)], line);
            scene.fitted(face, (self.left - 4.0, y + 2.3), Anchor::End, &text, TICK, TICK_ROOM);
        }
        scene.fitted(face, (self.right, self.bottom + 18.5), Anchor::End, x_name, TICK, self.right - self.left);
    }
}

/// Title and what the vertical axis means.
fn titles(scene: &mut Scene, face: &Typeface, frame: Frame, title: &str, subtitle: &str) {
    scene.fitted(face, (frame.left, frame.top + 8.0), Anchor::Start, title, Style::bold(8.0, DARK), frame.width);
    let style = Style::plain(6.8, GREY);
    scene.fitted(face, (frame.left, frame.top + 17.0), Anchor::Start, subtitle, style, frame.width);
}

/// The place of a chart that there is none for says why.
fn missing(face: &Typeface, frame: Frame, title: &Phrase, why: &Phrase) -> Scene {
    let mut scene = Scene::default();
    titles(&mut scene, face, frame, face.word(title), "");
    let (width, height) = (frame.width - 2.0, frame.plot);
    let top = frame.top + TITLES;
    scene.outline(corners((frame.left, top), (width, height)), Stroke::dashed(MIST, 0.6, 2.0, 2.0));
    let style = Style::plain(7.4, GREY);
    let middle = (frame.left + width / 2.0, top + height / 2.0 + 2.5);
    scene.fitted(face, middle, Anchor::Middle, face.word(why), style, width - 12.0);
    scene
}

/// Round values inside a range, with their text.
fn ticks((from, to): (f64, f64), about: usize) -> Vec<(f64, String)> {
    let raw = (to - from) / about.max(1) as f64;
    let power = 10f64.powf(raw.log10().floor());
    let step = [1.0, 2.0, 5.0, 10.0].into_iter().map(|m| m * power).find(|&s| s >= raw * 0.8).unwrap_or(raw);
    if !(step.is_finite() && step > 0.0) {
        return vec![];
    }
    let decimals = (-step.log10().floor()).clamp(0.0, 9.0) as usize;
    let first = (from / step - 1e-9).ceil();
    let last = (to / step + 1e-9).floor();
    // More than a dozen would come only from a step lost in rounding.
    (0..=12)
        .map(|i| first + f64::from(i))
        .take_while(|&i| i <= last)
        .map(|i| {
            let text = format!("{:.decimals$}", i * step + 0.0);
            (i * step, text.replace('-', "−"))
        })
        .collect()
}

/// Least and greatest of the finite ones.
fn range(values: impl Iterator<Item = f64>) -> Option<(f64, f64)> {
    values.filter(|v| v.is_finite()).fold(None, |range, v| match range {
        None => Some((v, v)),
        Some((low, high)) => Some((f64::min(low, v), f64::max(high, v))),
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn ticks_are_round() {
        let texts = |from, to, n| ticks((from, to), n).into_iter().map(|(_, text)| text).collect::<Vec<_>>();
        assert_eq!(texts(0.0, 10.0, 2), ["0", "5", "10"]);
        assert_eq!(texts(-700.0, 700.0, 3), ["−500", "0", "500"]);
        assert_eq!(texts(0.0, 1.05, 2), ["0.0", "0.5", "1.0"]);
        assert!(ticks((0.0, f64::NAN), 3).is_empty());
        assert!(ticks((1e300, 1e300 * (1.0 + 1e-15)), 3).len() <= 13);
    }
}
