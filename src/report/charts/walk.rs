//! The walk of the modes over time, measured, with its prediction, the time constant, ready, hops and swaps.
//! Must not draw a prediction where none was made.
//! Main function: [`walk`].

use super::{Frame, Plot, TICK, missing, range, titles};
use crate::{
    measurand,
    record::sheet::WalkChart,
    report::{
        scene::{Anchor, BLUE, DARK, Point, RUST, Scene, Stroke, Style},
        text::spread_text,
        typeface::Typeface,
    },
    uncertainty::joint,
};

const MINUTE: f64 = 60.0;

/// The chart, or why there is none.
pub fn walk(chart: Option<&WalkChart>, face: &Typeface, frame: Frame) -> Scene {
    const TITLE: &str = "Walk";
    let Some(chart) = chart else {
        return missing(face, frame, TITLE, "no walk was followed");
    };
    let everything = || chart.points.iter().chain(&chart.prediction).filter(|(t, n)| t.is_finite() && n.is_finite());
    let Some((_, last)) = range(everything().map(|point| point.0 / MINUTE)) else {
        return missing(face, frame, TITLE, "the walk showed no modes");
    };
    let (low, high) = range(everything().map(|point| point.1)).unwrap_or((0.0, 1.0));
    let plot = Plot::new(frame, (0.0, last * 1.02), (low.min(0.0), high.max(1.0) * 1.08));
    let mut scene = Scene::default();
    titles(&mut scene, face, frame, TITLE, "mode spacings walked; dashed: fitted and predicted");
    let drawn = |points: &[Point]| {
        let sound = points.iter().filter(|(t, n)| t.is_finite() && n.is_finite());
        sound.map(|&(t, n)| plot.at((t / MINUTE, n))).collect::<Vec<_>>()
    };
    drawn(&chart.points).into_iter().for_each(|point| scene.disc(point, 0.8, DARK));
    scene.line(drawn(&chart.prediction), Stroke::dashed(BLUE, 0.9, 3.0, 2.0));
    if let Some(end) = chart.dwell_end.map(|t| t / MINUTE).filter(|&t| plot.holds(t)) {
        let x = plot.at_x(end);
        scene.line(vec![(x, plot.top), (x, plot.bottom)], Stroke::dashed(BLUE, 0.7, 1.5, 1.5));
    }
    for &(t, _) in &chart.hops {
        if let Some(point) = on_curve(chart, t, &plot) {
            scene.cross(point, 2.6, Stroke::solid(RUST, 1.1));
        }
    }
    for &t in &chart.swaps {
        if let Some((x, y)) = on_curve(chart, t, &plot) {
            let diamond = vec![(x, y - 3.2), (x + 3.2, y), (x, y + 3.2), (x - 3.2, y)];
            scene.outline(diamond, Stroke::solid(RUST, 0.9));
        }
    }
    plot.axes(&mut scene, face, "minutes since first light", 3, 3);
    sayings(&mut scene, face, chart, &plot);
    scene
}

/// Where the walk stood at a time: on the measured points, straight between neighbours.
fn on_curve(chart: &WalkChart, t: f64, plot: &Plot) -> Option<Point> {
    if !plot.holds(t / MINUTE) {
        return None;
    }
    let after = chart.points.iter().position(|point| point.0 >= t);
    let n = match after {
        Some(0) => chart.points.first()?.1,
        Some(i) => {
            let ((t0, n0), (t1, n1)) = (*chart.points.get(i - 1)?, *chart.points.get(i)?);
            if t1 > t0 { n0 + (n1 - n0) * (t - t0) / (t1 - t0) } else { n1 }
        }
        None => chart.points.last()?.1,
    };
    Some(plot.at((t / MINUTE, n)))
}

/// Time constant, ready, and what the marks mean, where the walk leaves room: low at the right.
fn sayings(scene: &mut Scene, face: &Typeface, chart: &WalkChart, plot: &Plot) {
    let minutes = |key: &str, (value, expanded): (f64, f64)| {
        let most = measurand::find(key).map_or(2, |m| m.decimals);
        let (value, expanded) = joint(value / MINUTE, expanded / MINUTE, most);
        format!("{value} {} min", spread_text(&expanded))
    };
    let sound = |pair: &(f64, f64)| pair.0.is_finite() && pair.1.is_finite();
    let plural = |n: usize, one: &str, many: &str| format!("{n} {}", if n == 1 { one } else { many });
    let mut lines = Vec::new();
    lines.extend(chart.tau.filter(sound).map(|tau| (format!("τ {}", minutes("warmup_tau", tau)), TICK)));
    lines.extend(
        chart
            .ready
            .filter(sound)
            .map(|ready| (format!("ready {}", minutes("warmup_ready", ready)), Style { ink: BLUE, ..TICK })),
    );
    lines.extend(
        chart
            .dwell_end
            .filter(|end| end.is_finite())
            .map(|end| (format!("dwell ended at {:.1} min", end / MINUTE), TICK)),
    );
    let rust = Style { ink: RUST, ..TICK };
    if !chart.hops.is_empty() {
        lines.push((format!("{} (cross)", plural(chart.hops.len(), "hop", "hops")), rust));
    }
    if !chart.swaps.is_empty() {
        lines.push((format!("{} (diamond)", plural(chart.swaps.len(), "swap", "swaps")), rust));
    }
    let end = chart.dwell_end.map(|t| plot.at_x(t / MINUTE) - 4.0);
    let right = end.filter(|x| (plot.left + 80.0..plot.right).contains(x)).unwrap_or(plot.right - 4.0);
    let first = plot.bottom - 6.0 - 9.0 * (lines.len() as f64 - 1.0);
    for (i, (text, style)) in lines.iter().enumerate() {
        let at = (right, first + 9.0 * i as f64);
        scene.fitted(face, at, Anchor::End, text, *style, right - plot.left - 4.0);
    }
}
