//! Measured peak heights against walked detuning, as points with their uncertainty.
//! Must not draw a curve through them: the points are the finding.
//! Main function: [`gain`].

use super::{Frame, Plot, missing, range, titles};
use crate::{
    phrase::{figure, page},
    record::sheet::GainChart,
    report::{
        scene::{DARK, GREY, Scene, Stroke},
        typeface::Typeface,
    },
};

const MEGAHERTZ: f64 = 1e6;
/// Coverage factor of the bars, as of every U on the sheet.
const BAR: f64 = 2.0;

/// The chart, or why there is none.
pub fn gain(chart: Option<&GainChart>, face: &Typeface, frame: Frame) -> Scene {
    let Some(chart) = chart else {
        return missing(face, frame, &page::GAIN, &page::NO_HEIGHTS);
    };
    let sound = chart.points.iter().filter(|(x, y, _)| x.is_finite() && y.is_finite());
    let Some((low, high)) = range(sound.clone().map(|point| point.0 / MEGAHERTZ)) else {
        return missing(face, frame, &page::GAIN, &page::EMPTY_HEIGHTS);
    };
    let margin = f64::max(high - low, 1.0) * 0.06;
    let top = range(sound.clone().map(|point| point.1)).map_or(1.0, |(_, high)| high.clamp(0.1, 1.5));
    let plot = Plot::new(frame, (low - margin, high + margin), (0.0, top * 1.06));
    let mut scene = Scene::default();
    let title = if chart.cycles.is_finite() && chart.cycles > 0.0 {
        face.say(&page::GAIN_CYCLES.with([figure((chart.cycles * 10.0).round() / 10.0)]))
    } else {
        face.word(&page::GAIN).to_owned()
    };
    titles(&mut scene, face, frame, &title, face.word(&page::GAIN_HEIGHT));
    for &(x, y, u) in sound {
        let x = plot.at_x(x / MEGAHERTZ);
        if u.is_finite() && u > 0.0 {
            scene.line(vec![(x, plot.at_y(y - BAR * u)), (x, plot.at_y(y + BAR * u))], Stroke::solid(GREY, 0.5));
        }
        scene.disc((x, plot.at_y(y)), 0.9, DARK);
    }
    plot.axes(&mut scene, face, face.word(&page::GAIN_AXIS), 3, 2);
    scene
}
