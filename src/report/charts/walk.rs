//! The walk of the modes over time, measured, with its prediction, the time constant, ready, hops and swaps.
//! Must not draw a prediction where none was made.
//! Main function: [`walk`].

use super::{Frame, Plot, TICK, missing, range, titles};
use crate::{
    measurand,
    phrase::{Language, Phrase, Piece, figure, name, page},
    record::sheet::{Row, WalkChart},
    report::{
        scene::{Anchor, BLUE, DARK, Point, RUST, Scene, Stroke, Style},
        text::{spread_text, value_text},
        typeface::Typeface,
    },
    uncertainty::joint,
};

const MINUTE: f64 = 60.0;

/// The chart, or why there is none.
///
/// * `rows`: of the sheet; what is written in the chart of time constant and ready is theirs.
pub fn walk(chart: Option<&WalkChart>, rows: &[Row], face: &Typeface, frame: Frame) -> Scene {
    let Some(chart) = chart else {
        return missing(face, frame, &page::WALK, &page::NO_WALK);
    };
    let everything = || chart.points.iter().chain(&chart.prediction).filter(|(t, n)| t.is_finite() && n.is_finite());
    let Some((first, last)) = range(everything().map(|point| point.0 / MINUTE)) else {
        return missing(face, frame, &page::WALK, &page::EMPTY_WALK);
    };
    let (low, high) = range(everything().map(|point| point.1)).unwrap_or((0.0, 1.0));
    // Of a tube from the rack nothing is known of the time before.
    let first = if chart.prediction.is_empty() && chart.tau.is_none() { first } else { 0.0 };
    let plot = Plot::new(frame, (first, last + 0.02 * (last - first)), (low.min(0.0), high.max(1.0) * 1.08));
    let mut scene = Scene::default();
    titles(&mut scene, face, frame, face.word(&page::WALK), face.word(&page::WALK_SPACINGS));
    let drawn = |points: &[Point]| {
        let sound = points.iter().filter(|(t, n)| t.is_finite() && n.is_finite());
        sound.map(|&(t, n)| plot.at((t / MINUTE, n))).collect::<Vec<_>>()
    };
    // Beneath the points: where it can be seen at all, measured and fitted part.
    scene.line(drawn(&chart.prediction), Stroke::dashed(BLUE, 0.9, 3.0, 2.0));
    drawn(&chart.points).into_iter().for_each(|point| scene.disc(point, 0.8, DARK));
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
    plot.axes(&mut scene, face, face.word(&page::WALK_AXIS), 3, 3);
    sayings(&mut scene, face, (chart, rows), &plot);
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

/// A time in minutes with its expanded uncertainty: as the row has it, so that a sheet never says two things; as the
/// chart has it where there is no such row.
fn timing(rows: &[Row], key: &str, of_chart: Option<(f64, f64)>, language: Language) -> Option<Piece> {
    if let Some(row) = rows.iter().find(|row| row.measurand == key) {
        let text = value_text(row, language);
        return text.absent.is_empty().then(|| name([text.value, text.spread, text.unit].join(" ")));
    }
    let (value, expanded) = of_chart.filter(|(value, expanded)| value.is_finite() && expanded.is_finite())?;
    let most = measurand::find(key).map_or(2, |m| m.decimals);
    let (value, expanded) = joint(value / MINUTE, expanded / MINUTE, most);
    Some(name(format!("{} {} min", language.figure(&value), spread_text(&expanded, language))))
}

/// Time constant, ready, and what the marks mean, where the walk leaves room: low at the right.
fn sayings(scene: &mut Scene, face: &Typeface, (chart, rows): (&WalkChart, &[Row]), plot: &Plot) {
    let timing = |key, of_chart| timing(rows, key, of_chart, face.language);
    let counted = |n: usize, one: &'static Phrase, many: &'static Phrase| {
        let phrase = if n == 1 { one } else { many };
        phrase.with([figure(n)])
    };
    let mut lines = Vec::new();
    lines.extend(timing("warmup_tau", chart.tau).map(|tau| (page::TAU.with([tau]), TICK)));
    let blue = Style { ink: BLUE, ..TICK };
    lines.extend(timing("warmup_ready", chart.ready).map(|ready| (page::READY.with([ready]), blue)));
    lines.extend(
        chart
            .dwell_end
            .filter(|end| end.is_finite())
            .map(|end| (page::DWELL_ENDED.with([figure(format!("{:.1}", end / MINUTE))]), TICK)),
    );
    let rust = Style { ink: RUST, ..TICK };
    if !chart.hops.is_empty() {
        lines.push((counted(chart.hops.len(), &page::ONE_HOP, &page::HOPS), rust));
    }
    if !chart.swaps.is_empty() {
        lines.push((counted(chart.swaps.len(), &page::ONE_SWAP, &page::SWAPS), rust));
    }
    let end = chart.dwell_end.map(|t| plot.at_x(t / MINUTE) - 4.0);
    let right = end.filter(|x| (plot.left + 80.0..plot.right).contains(x)).unwrap_or(plot.right - 4.0);
    let first = plot.bottom - 6.0 - 9.0 * (lines.len() as f64 - 1.0);
    for (i, (text, style)) in lines.iter().enumerate() {
        let at = (right, first + 9.0 * i as f64);
        scene.fitted(face, at, Anchor::End, &face.say(text), *style, right - plot.left - 4.0);
    }
}
