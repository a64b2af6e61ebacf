//! The samples of one ramp as a fit takes them: means of bins, fine near the lines and coarse between them.
//! Must not fit.
//! Main type: [`Samples`].

/// Bins of one ramp. White noise loses nothing by it: each bin is weighted by its samples.
#[derive(Debug, Clone)]
pub(super) struct Samples {
    /// Middle of each bin, sample positions.
    pub x: Vec<f64>,
    /// Mean of each bin, V.
    pub signal: Vec<f64>,
    /// Root of the number of samples in each bin; 0 where one of them may not be fitted.
    pub root: Vec<f64>,
    /// (n² − 1)/24: what the mean of a bin of n samples adds to its middle, times the second derivative by sample.
    pub bow: Vec<f64>,
    /// First sample of each bin, and one past the last of all.
    pub bounds: Vec<usize>,
    /// Samples of a bin on a line.
    pub finest: usize,
    /// Samples on the ramp.
    pub n: usize,
}

/// Bins across a line's full width at half maximum.
const ACROSS: f64 = 12.0;
/// Fine bins reach this many widths from a centre; from there on bins grow with the distance.
const CORE: f64 = 2.5;
/// Growth of a bin with distance from the core.
const GROWTH: f64 = 0.1;
/// Bins are never coarser than this share of the width: a line that nobody saw yet must still show.
const COARSEST: f64 = 1.0 / 3.0;

impl Samples {
    /// * `centres`: where lines are thought to be, sample positions, any order. `width`: of a line, samples.
    pub fn new(signal: &[f64], usable: &[bool], centres: &[f64], width: f64) -> Self {
        let mut sorted = centres.to_vec();
        sorted.sort_by(f64::total_cmp);
        let size = |distance: f64| {
            let wanted = width / ACROSS + GROWTH * (distance - CORE * width).max(0.0);
            (wanted.min(COARSEST * width) as usize).max(1)
        };
        let mut bounds = vec![0];
        let (mut at, mut next) = (0, 0);
        while at < signal.len() {
            let here = at as f64;
            while next + 1 < sorted.len() && sorted[next + 1] - here < here - sorted[next] {
                next += 1;
            }
            let nearest = |k: Option<&f64>| k.map_or(f64::INFINITY, |c| (c - here).abs());
            let distance = nearest(sorted.get(next)).min(nearest(sorted.get(next + 1)));
            at = (at + size(distance)).min(signal.len());
            bounds.push(at);
        }
        let mut samples = Self {
            x: bounds.windows(2).map(|b| (b[0] + b[1] - 1) as f64 / 2.0).collect(),
            signal: Vec::new(),
            bow: bounds.windows(2).map(|b| (((b[1] - b[0]) as f64).powi(2) - 1.0) / 24.0).collect(),
            root: Vec::with_capacity(bounds.len()),
            finest: size(0.0),
            n: signal.len(),
            bounds,
        };
        samples.signal = samples.means(signal);
        for b in samples.bounds.windows(2) {
            let whole = usable[b[0]..b[1]].iter().all(|u| *u);
            samples.root.push(if whole { ((b[1] - b[0]) as f64).sqrt() } else { 0.0 });
        }
        samples
    }

    /// Means of another signal of the same ramp over the same bins.
    pub fn means(&self, signal: &[f64]) -> Vec<f64> {
        self.bounds.windows(2).map(|b| signal[b[0]..b[1]].iter().sum::<f64>() / (b[1] - b[0]) as f64).collect()
    }

    /// Bins that may be fitted.
    pub fn n_used(&self) -> usize {
        self.root.iter().filter(|root| **root > 0.0).count()
    }

    /// Values of the bins on an even grid of the finest bins.
    pub fn spread(&self, values: &[f64]) -> Vec<f64> {
        let mut even = Vec::with_capacity(self.n / self.finest + 1);
        let mut bin = 0;
        for at in (0..self.n).step_by(self.finest) {
            while self.bounds[bin + 1] <= at {
                bin += 1;
            }
            even.push(values[bin]);
        }
        even
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn bins_are_fine_on_lines_and_hold_every_sample_once() {
        let signal: Vec<f64> = (0..3000).map(f64::from).collect();
        let samples = Samples::new(&signal, &vec![true; 3000], &[2000.0, 500.0], 60.0);
        assert_eq!((samples.bounds[0], samples.bounds.last()), (0, Some(&3000)));
        for (i, b) in samples.bounds.windows(2).enumerate() {
            let near = [500.0, 2000.0].iter().any(|c: &f64| (c - samples.x[i]).abs() < 140.0);
            let size = b[1] - b[0];
            assert!(size <= 20 && (!near || size == 5 || b[1] == 3000), "{b:?}");
            // The mean of a straight line is its middle.
            assert!((samples.signal[i] - samples.x[i]).abs() < 1e-9);
        }
        assert!(samples.x.len() < 300, "{}", samples.x.len());
        assert_eq!(samples.spread(&samples.x).len(), 600);
    }
}
