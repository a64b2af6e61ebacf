//! The gain line as the run itself shows it: mode height against place on the scan axis.
//! Must not follow the comb.
//! Main type: [`Line`].

use super::glimpse::{Glimpse, GlimpseMode};
use super::track::{Track, TrackPoint};

/// Bins across the line; each is a few tens of megahertz wide.
const BINS: usize = 60;

/// Modes that a bin must hold to be used.
const LEAST_IN_BIN: usize = 3;

/// Least relative uncertainty of a height against the profile: competition between modes moves heights by some per cent
/// depending on the neighbours (size from memory).
pub(crate) const LEAST_U_HEIGHT: f64 = 0.05;

/// Height of a line outside the bins that were filled, relative to its greatest: a mode there is as good as absent.
const OUTSIDE: f64 = 0.01;

/// A mode placed under the line.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct Placed {
    /// Point of the track.
    pub point: usize,
    /// Number on the comb.
    pub comb_index: i64,
    /// Place on the scan axis, displacements of the interferometer taken out, Hz from the origin of the track.
    pub place: f64,
    /// The mode.
    pub mode: GlimpseMode,
}

/// Mode height against place.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct Line {
    low: f64,
    width: f64,
    /// Mean relative height of each bin, where enough modes were in it.
    heights: Vec<Option<f64>>,
    /// Centroid of the profile, Hz from the origin of the track.
    pub middle: f64,
}

/// Places every mode of a track; `shift(point)` is the displacement of the interferometer so far, Hz.
pub(crate) fn place_modes(track: &Track, glimpses: &[Glimpse], shift: impl Fn(usize) -> f64) -> Vec<Placed> {
    let of_point = |(index, point): (usize, &TrackPoint)| {
        let glimpse = &glimpses[point.index];
        let moved = shift(index);
        let place = |mode: &GlimpseMode| Placed {
            point: index,
            comb_index: track.comb_index(point, mode, glimpse.free_spectral_range),
            place: track.unfolded(point, mode, glimpse.free_spectral_range) - moved,
            mode: *mode,
        };
        glimpse.modes.iter().filter(|m| m.is_usable()).map(place).collect::<Vec<_>>()
    };
    track.points.iter().enumerate().flat_map(of_point).collect()
}

impl Line {
    /// Profile of the modes placed, or `None` with too few of them.
    pub fn of(placed: &[Placed]) -> Option<Self> {
        let low = placed.iter().map(|p| p.place).fold(f64::INFINITY, f64::min);
        let high = placed.iter().map(|p| p.place).fold(f64::NEG_INFINITY, f64::max);
        let width = (high - low) / BINS as f64;
        if placed.len() < LEAST_IN_BIN * 4 || !(width.is_finite() && width > 0.0) {
            return None;
        }
        let mut sums = vec![(0.0, 0usize); BINS];
        for p in placed {
            let bin = (((p.place - low) / width) as usize).min(BINS - 1);
            sums[bin].0 += p.mode.total_height();
            sums[bin].1 += 1;
        }
        let heights: Vec<Option<f64>> =
            sums.iter().map(|(sum, n)| (*n >= LEAST_IN_BIN).then(|| sum / *n as f64)).collect();
        let greatest = heights.iter().flatten().copied().fold(0.0, f64::max);
        if greatest <= 0.0 {
            return None;
        }
        let heights: Vec<Option<f64>> = heights.into_iter().map(|h| h.map(|h| h / greatest)).collect();
        let (mut sum, mut moment) = (0.0, 0.0);
        for (bin, height) in heights.iter().enumerate() {
            let height = height.unwrap_or(0.0);
            sum += height;
            moment += height * (low + (bin as f64 + 0.5) * width);
        }
        Some(Self { low, width, heights, middle: moment / sum })
    }

    /// Relative height at a place: between the middles of bins by a straight line, [`OUTSIDE`] beyond them.
    pub fn height(&self, place: f64) -> f64 {
        let x = (place - self.low) / self.width - 0.5;
        let at = |bin: f64| {
            let inside = bin >= 0.0 && (bin as usize) < self.heights.len();
            if inside { self.heights[bin as usize].unwrap_or(OUTSIDE) } else { OUTSIDE }
        };
        let (left, share) = (x.floor(), x - x.floor());
        (at(left) * (1.0 - share) + at(left + 1.0) * share).max(OUTSIDE)
    }

    /// Extent of the bins, Hz.
    pub fn extent(&self) -> f64 {
        self.width * BINS as f64
    }

    /// Misfit χ² of one glimpse's modes with the line displaced by `offset`, the scale of all heights left free.
    pub fn misfit(&self, modes: &[Placed], offset: f64) -> f64 {
        let terms: Vec<(f64, f64)> = modes
            .iter()
            .map(|p| {
                let expected = self.height(p.place - offset);
                let found = p.mode.total_height();
                let relative = (p.mode.u_total_height() / found).hypot(LEAST_U_HEIGHT);
                // A place 10 MHz off on the flank moves the height too; the flank itself is known to the bin's width.
                let flank = (self.height(p.place - offset + 0.5 * self.width)
                    / self.height(p.place - offset - 0.5 * self.width))
                .ln()
                .abs();
                ((found / expected).ln(), 1.0 / (relative.powi(2) + (0.3 * flank).powi(2)))
            })
            .filter(|(ratio, _)| ratio.is_finite())
            .collect();
        let weight: f64 = terms.iter().map(|t| t.1).sum();
        let mean = terms.iter().map(|t| t.0 * t.1).sum::<f64>() / weight.max(f64::MIN_POSITIVE);
        terms.iter().map(|t| t.1 * (t.0 - mean).powi(2)).sum()
    }
}
