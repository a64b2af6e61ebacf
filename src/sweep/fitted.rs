//! The lines of one ramp, fitted: with the detector's pole if it shows, and with lines the first look missed.
//! Must not know orders beyond the local speed of the ramp, nor combs.
//! Main entry: [`fit_lines`]; main type: [`Fitted`].

use super::{
    detect::{Look, Seen},
    lines::{self, LineFit, Start},
    orders::Orders,
    samples::Samples,
    segment::Segment,
};
use crate::numerics::smoothing;

/// The pole must improve the sum of squares by this chi-square (1 parameter at far below 0.1 %) to be believed.
const POLE_CHI_SQUARE: f64 = 30.0;

/// A pole below this share of the width is well away from where a second minimum was ever seen.
const SHORT_POLE: f64 = 0.3;

/// Lines nearer than this share of their width have slid onto each other.
const COLLAPSED: f64 = 0.5;

/// Lines as fitted, with and without the detector's pole.
pub(super) struct Fitted {
    /// The fit, with the detector's pole where the data ask for it.
    pub fit: LineFit,
    /// Common width without the pole, samples.
    pub apparent_width: f64,
    /// Width of each line over the common width.
    pub stretch: Vec<f64>,
    /// What was fitted.
    pub samples: Samples,
}

/// Fits the lines of one ramp; lines that the first look missed are added from the residuals, twice at most.
pub(super) fn fit_lines(segment: &Segment, look: &Look, orders: &Orders) -> Option<Fitted> {
    let binned = |centres: &[f64], width: f64| Samples::new(&segment.signal, &segment.usable, centres, width);
    let stretch_of = |x: f64| (orders.local_period(x) / orders.period).clamp(0.2, 5.0);
    let mut seen: Vec<Seen> = look.peaks.clone();
    let mut start = Start {
        centres: seen.iter().map(|p| p.x).collect(),
        heights: seen.iter().map(|p| p.height).collect(),
        stretch: seen.iter().map(|p| stretch_of(p.x)).collect(),
        width: look.width,
        pole: None,
        baseline: look.baseline,
    };
    let mut samples = binned(&start.centres, look.width);
    let mut plain = lines::fit(&samples, &start)?;
    let mut fit = plain.clone();
    for round in 0..3 {
        // Where the plain lines leave nothing but noise there is no pole to be found.
        let clean = plain.residual < 1.03 * segment.noise;
        fit = if clean { None } else { with_pole(&samples, &start, &plain) }.unwrap_or_else(|| plain.clone());
        if let Some(surplus) = collapsed(&fit, &start.heights) {
            start.centres.remove(surplus);
            start.heights.remove(surplus);
            start.stretch.remove(surplus);
            let Some(better) = lines::fit(&samples, &start) else { break };
            plain = better;
            fit = with_pole(&samples, &start, &plain).unwrap_or_else(|| plain.clone());
        }
        if round == 2 {
            break;
        }
        let more = hidden(&samples, &fit, look);
        if more.is_empty() {
            break;
        }
        seen =
            fit.centres.iter().zip(&fit.heights).map(|(x, h)| Seen { x: *x, height: *h, width: fit.width }).collect();
        seen.extend(more);
        seen.retain(|p| {
            p.height > 0.0 && p.x > -0.5 * fit.width && p.x < segment.signal.len() as f64 + 0.5 * fit.width
        });
        seen.sort_by(|a, b| a.x.total_cmp(&b.x));
        let next = Start {
            centres: seen.iter().map(|p| p.x).collect(),
            heights: seen.iter().map(|p| p.height).collect(),
            stretch: seen.iter().map(|p| stretch_of(p.x)).collect(),
            width: fit.width,
            pole: None,
            baseline: fit.baseline.0,
        };
        let finer = binned(&next.centres, next.width);
        let Some(better) = lines::fit(&finer, &next) else { break };
        start = next;
        plain = better;
        samples = finer;
    }
    Some(Fitted { apparent_width: plain.width, fit, stretch: start.stretch, samples })
}

/// Two lines that slid onto each other are one seen twice: the one that was lower at first is surplus.
fn collapsed(fit: &LineFit, first: &[f64]) -> Option<usize> {
    (1..fit.centres.len())
        .find(|&i| (fit.centres[i] - fit.centres[i - 1]).abs() < COLLAPSED * fit.width)
        .map(|i| if first[i] < first[i - 1] { i } else { i - 1 })
}

/// The fit with the detector's pole, if the data ask for it.
fn with_pole(samples: &Samples, start: &Start, plain: &LineFit) -> Option<LineFit> {
    let mut best: Option<LineFit> = None;
    for share in [0.15, 0.6] {
        let pole = share * plain.width;
        let trial = Start {
            centres: plain.centres.iter().map(|x| x - pole.min(plain.width)).collect(),
            heights: plain.heights.clone(),
            width: plain.width / (1.0 + share),
            pole: Some(pole),
            baseline: plain.baseline.0,
            stretch: start.stretch.clone(),
        };
        if let Some(fit) = lines::fit(samples, &trial)
            && best.as_ref().is_none_or(|b| fit.sum_of_squares < b.sum_of_squares)
        {
            best = Some(fit);
        }
        // A short pole found from a short one is the only one; a long one may have a better far away.
        if best.as_ref().and_then(|fit| fit.pole.map(|pole| pole < SHORT_POLE * fit.width)) == Some(true) {
            break;
        }
    }
    let best = best?;
    let gain = (plain.sum_of_squares - best.sum_of_squares) / (best.sum_of_squares / best.dof);
    (gain > POLE_CHI_SQUARE).then_some(best)
}

/// Lines that the first look missed: what stands out of the residuals.
fn hidden(samples: &Samples, fit: &LineFit, look: &Look) -> Vec<Seen> {
    let bin = samples.finest as f64;
    let half = (fit.width / bin / 6.0).round().max(0.0) as usize;
    let plain: Vec<f64> =
        fit.residuals.iter().zip(&samples.root).map(|(r, root)| if *root > 0.0 { r / root } else { 0.0 }).collect();
    let smoothed = smoothing::moving_mean(&samples.spread(&plain), half);
    let top = look.peaks.iter().map(|p| p.height).fold(0.0, f64::max);
    let noise = fit.residual / bin.sqrt();
    let threshold = (6.0 * noise / (2.0 * half as f64 + 1.0).sqrt()).max(0.01 * top);
    let options = crate::numerics::peaks::Options {
        min_height: Some(threshold),
        min_prominence: Some(threshold),
        min_distance: (fit.width / bin).ceil().max(1.0) as usize,
    };
    let found = crate::numerics::peaks::find(&smoothed, &options);
    // A misfit top leaves residuals on the line itself: only what stands clear of every line is new.
    let clear = |x: f64| fit.centres.iter().all(|c| (c - x).abs() > 0.7 * fit.width);
    found
        .into_iter()
        .map(|p| Seen { x: p.index as f64 * bin + (bin - 1.0) / 2.0, height: p.height, width: fit.width })
        .filter(|p| clear(p.x))
        .take(12)
        .collect()
}
