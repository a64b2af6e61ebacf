//! One measurand of a reference tube over time: the checks between their bounds, and below them the cumulative sums.
//! Must not decide what is out of bounds.
//! Main function: [`bench`].

use super::{Frame, Plot, TICK, titles};
use crate::phrase::{day, figure, name, page, within};
use crate::report::{
    bench::BenchChart,
    scene::{Anchor, BLUE, DARK, INSIDE, Point, RUST, Scene, Stroke, Style},
    typeface::Typeface,
};

/// Height that one chart takes with its sums, pt.
pub const BENCH_HEIGHT: f64 = 226.0;
/// Height of the plot of the sums, pt.
const SUMS: f64 = 40.0;
const DAY: f64 = 86_400.0;

/// The chart, or why there is none.
pub fn bench(chart: &BenchChart, face: &Typeface, frame: Frame) -> Scene {
    let of = || [name(chart.serial.clone()), within(chart.measurand)];
    let mut scene = Scene::default();
    let (Some(first), Some(last)) = (chart.points.first(), chart.points.last()) else {
        titles(&mut scene, face, frame, &face.say(&page::BENCH_NO_CHECK.with(of())), "");
        return scene;
    };
    let days = |at: chrono::DateTime<chrono::FixedOffset>| (at - first.at).num_seconds() as f64 / DAY;
    let x = (0.0, days(last.at).max(1.0) * 1.01);
    let shown = |value: f64| figure(format!("{value:.*}", chart.decimals));
    let unit = || name(chart.unit.clone());
    let band = [shown(chart.value), shown(chart.within), unit(), shown(last.value)];
    let title = face.say(&page::BENCH_OF_TUBE.with(of()));
    titles(&mut scene, face, frame, &title, &face.say(&page::BENCH_BAND.with(band)));
    // Departures in shares of what is allowed: all charts read alike, and their ticks are short.
    let off = |value: f64| 100.0 * (value - chart.value) / chart.within;
    let far = chart.points.iter().map(|point| off(point.value).abs()).filter(|far| far.is_finite());
    let reach = far.fold(100.0, f64::max) * 1.15;
    let plot = Plot::new(frame, x, (-reach, reach));
    let (top, bottom) = (plot.at_y(100.0), plot.at_y(-100.0));
    scene.block((plot.left, top), (plot.right - plot.left, bottom - top), INSIDE);
    scene.line(vec![(plot.left, plot.at_y(0.0)), (plot.right, plot.at_y(0.0))], Stroke::dashed(BLUE, 0.7, 3.0, 2.0));
    for point in chart.points.iter().filter(|point| point.value.is_finite()) {
        let place = plot.at((days(point.at), off(point.value)));
        match point.inside {
            true => scene.disc(place, 1.3, DARK),
            false => scene.cross(place, 2.8, Stroke::solid(RUST, 1.2)),
        }
    }
    let axis = face.say(&page::BENCH_AXIS.with([day(first.at.date_naive())]));
    plot.axes(&mut scene, face, &axis, 8, 3);
    let below = Frame { top: frame.top + frame.plot + 28.0, plot: SUMS, ..frame };
    sums(&mut scene, face, (chart, x), below, &days);
    scene
}

/// Both sums with the alarm: up solid, down dashed, so that no colour is needed.
fn sums(
    scene: &mut Scene,
    face: &Typeface,
    (chart, x): (&BenchChart, (f64, f64)),
    frame: Frame,
    days: &dyn Fn(chrono::DateTime<chrono::FixedOffset>) -> f64,
) {
    let known: Vec<(f64, (f64, f64))> =
        chart.points.iter().filter_map(|point| Some((days(point.at), point.sums?))).collect();
    let plot =
        Plot::new(frame, x, (0.0, known.iter().map(|(_, (up, down))| up.max(*down)).fold(chart.alarm, f64::max)));
    let words = match known.is_empty() {
        true => (&page::BENCH_NO_SUMS).into(),
        false => page::BENCH_SUMS.with([figure(chart.alarm)]),
    };
    let words = face.say(&words);
    scene.fitted(face, (plot.left, plot.top - 5.0), Anchor::Start, &words, TICK, plot.right - plot.left);
    let alarm = plot.at_y(chart.alarm);
    scene.line(vec![(plot.left, alarm), (plot.right, alarm)], Stroke::solid(RUST, 0.6));
    let drawn = |of: fn((f64, f64)) -> f64| -> Vec<Point> {
        known.iter().map(|(at, sums)| plot.at((*at, of(*sums)))).collect()
    };
    scene.line(drawn(|sums| sums.0), Stroke::solid(DARK, 0.9));
    scene.line(drawn(|sums| sums.1), Stroke::dashed(DARK, 0.9, 2.0, 1.5));
    if known.iter().any(|(_, (up, down))| up.max(*down) > chart.alarm) {
        let style = Style { ink: RUST, ..TICK };
        scene.text(face, (plot.right, plot.top - 5.0), Anchor::End, face.word(&page::BENCH_DRIFT), style);
    }
    plot.axes(scene, face, "", 8, 2);
}
