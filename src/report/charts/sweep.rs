//! One sweep on a hertz axis: the measured trace, over it the curve of the fitted modes.
//! Must not draw a fit from anything but the sheet's modes.
//! Main function: [`sweep`].

use chrono::{DateTime, FixedOffset};

use super::{Frame, Plot, missing, range, titles};
use crate::{
    phrase::{name, page},
    record::sheet::{ChartMode, SweepChart},
    report::{
        scene::{Anchor, BLUE, DARK, MIST, Point, Scene, Stroke, Style},
        typeface::Typeface,
    },
};

const GIGAHERTZ: f64 = 1e9;

/// The chart, or why there is none.
pub fn sweep(chart: Option<&SweepChart>, face: &Typeface, frame: Frame) -> Scene {
    let Some(chart) = chart else {
        return missing(face, frame, &page::SWEEP, &page::NO_SWEEP);
    };
    let Some((from, to)) = range(chart.trace.detuning.iter().copied()).filter(|(from, to)| to > from) else {
        return missing(face, frame, &page::SWEEP, &page::EMPTY_SWEEP);
    };
    let strongest = strongest(chart);
    let lowest = range(chart.trace.low.iter().copied()).map_or(0.0, |(low, _)| (low / strongest).clamp(-0.2, 0.0));
    // Counted from the left end of the trace: the scan has no zero of its own.
    let plot = Plot::new(frame, (0.0, (to - from) / GIGAHERTZ), (lowest, 1.06));
    let shifted = |detuning: f64| (detuning - from) / GIGAHERTZ;
    let mut scene = Scene::default();
    let at = |at: DateTime<FixedOffset>| page::SWEEP_AT.with([name(at.format("%H:%M:%S").to_string())]);
    let title = face.say(&chart.taken_at.map_or_else(|| (&page::SWEEP).into(), at));
    titles(&mut scene, face, frame, &title, face.word(&page::SWEEP_SIGNAL));
    let columns = chart.trace.detuning.iter().zip(chart.trace.low.iter().zip(&chart.trace.high));
    let measured: Vec<Point> = columns
        .filter(|(x, (low, high))| x.is_finite() && low.is_finite() && high.is_finite())
        .flat_map(|(&x, (&low, &high))| [(x, low), (x, high)])
        .map(|(x, signal)| plot.at((shifted(x), signal / strongest)))
        .collect();
    scene.line(measured, Stroke::solid(MIST, 1.5));
    let fitted = fitted_curve(chart, (from, to));
    let fitted = fitted.into_iter().map(|(x, signal)| plot.at((shifted(x), signal / strongest))).collect();
    scene.line(fitted, Stroke::solid(DARK, 0.6));
    plot.axes(&mut scene, face, face.word(&page::SWEEP_AXIS), 4, 2);
    names(&mut scene, face, chart, &plot, &shifted);
    scene
}

/// Greatest fitted height, or of the trace where no mode was fitted; never 0.
fn strongest(chart: &SweepChart) -> f64 {
    let fitted = range(chart.modes.iter().map(|mode| mode.peak_height)).map_or(0.0, |(_, high)| high);
    let seen = range(chart.trace.high.iter().copied()).map_or(0.0, |(_, high)| high);
    [fitted, seen].into_iter().find(|height| *height > 0.0).unwrap_or(1.0)
}

/// Sum of the fitted lines over every order shown and the next beyond either end, whose flanks may reach in; sampled
/// evenly and closer around each line.
fn fitted_curve(chart: &SweepChart, (from, to): (f64, f64)) -> Vec<Point> {
    let lines: Vec<(f64, &ChartMode)> = marks_and_beyond(chart, (from, to))
        .into_iter()
        .filter_map(|(index, at)| chart.modes.get(index).map(|mode| (at, mode)))
        .filter(|(at, mode)| at.is_finite() && mode.fwhm > 0.0 && mode.fwhm.is_finite() && mode.peak_height.is_finite())
        .collect();
    if lines.is_empty() {
        return vec![];
    }
    let mut places: Vec<f64> = (0..=200).map(|i| from + (to - from) * f64::from(i) / 200.0).collect();
    for (at, mode) in &lines {
        places.extend((-24..=24).map(|i| at + mode.fwhm * f64::from(i) / 8.0).filter(|x| (from..=to).contains(x)));
    }
    places.sort_by(f64::total_cmp);
    // A Lorentzian of full width at half maximum w: h / (1 + (2 (x − x₀) / w)²).
    let height = |x: f64| {
        let one = |(at, mode): &(f64, &ChartMode)| mode.peak_height / (1.0 + (2.0 * (x - at) / mode.fwhm).powi(2));
        lines.iter().map(one).sum::<f64>()
    };
    places.into_iter().map(|x| (x, height(x))).collect()
}

/// The marked lines, and those of the orders just outside the trace.
fn marks_and_beyond(chart: &SweepChart, (from, to): (f64, f64)) -> Vec<(usize, f64)> {
    let mut marks = chart.trace.marks.clone();
    for index in 0..chart.modes.len() {
        let of_mode = chart.trace.marks.iter().filter(|mark| mark.0 == index).map(|mark| mark.1);
        if let Some((first, last)) = range(of_mode) {
            let beyond = [first - chart.free_spectral_range, last + chart.free_spectral_range];
            marks.extend(beyond.into_iter().filter(|at| *at < from || *at > to).map(|at| (index, at)));
        }
    }
    marks
}

/// A triangle and a letter over each fitted mode, every order; an open triangle off the comb.
fn names(scene: &mut Scene, face: &Typeface, chart: &SweepChart, plot: &Plot, shifted: &dyn Fn(f64) -> f64) {
    let style = Style::bold(6.8, BLUE);
    let tip = plot.top + 1.0;
    let mut marks = chart.trace.marks.clone();
    marks.sort_by(|a, b| a.1.total_cmp(&b.1));
    let mut labels: Vec<Label> = Vec::new();
    for (index, at) in marks {
        let (Some(mode), x) = (chart.modes.get(index), shifted(at)) else { continue };
        if !plot.holds(x) {
            continue;
        }
        let x = plot.at_x(x);
        let triangle = vec![(x - TRIANGLE, tip - 4.4), (x + TRIANGLE, tip - 4.4), (x, tip)];
        if mode.off_axis {
            scene.outline(triangle, Stroke::solid(BLUE, 0.7));
        } else {
            scene.area(triangle, BLUE);
        }
        let name = face.shorten(&face.printable(&mode.name), style, 20.0);
        let mut label = Label { half: face.width(&name, style) / 2.0, name, from: x, to: x };
        while labels.last().is_some_and(|before| before.middle() + before.half + 1.0 > label.middle() - label.half) {
            if let Some(before) = labels.pop() {
                label = before.joined(&label, face, style);
            }
        }
        labels.push(label);
    }
    for label in labels {
        let middle = label.middle().clamp(plot.left, plot.right);
        scene.fitted(face, (middle, tip - 6.0), Anchor::Middle, &label.name, style, 40.0);
    }
}

/// Half the width of a mark's triangle, pt.
const TRIANGLE: f64 = 1.9;

/// One letter, or the letters of neighbours too close to be named apart, in their order.
struct Label {
    name: String,
    from: f64,
    to: f64,
    half: f64,
}

impl Label {
    fn middle(&self) -> f64 {
        (self.from + self.to) / 2.0
    }

    fn joined(&self, after: &Self, face: &Typeface, style: Style) -> Self {
        let name = format!("{}{}", self.name, after.name);
        Self { half: face.width(&name, style) / 2.0, name, from: self.from, to: after.to }
    }
}
