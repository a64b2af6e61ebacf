//! Which peaks are the same mode one order on: the repeat that gives the frequency scale.
//! Must not assume that the ramp is straight, nor that modes form a comb.
//! Main entry: [`find`]; main type: [`Orders`].

use super::detect::Seen;

/// A first, smooth map from sample position to order number.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Orders {
    /// Samples an order in the middle of the ramp.
    pub period: f64,
    /// Relative change of that over the whole ramp.
    pub bend: f64,
    /// Middle of the ramp, samples.
    pub middle: f64,
    /// Samples on the ramp.
    pub length: f64,
    /// Share of the peaks' height found again one order on, 0 to 1.
    pub score: f64,
}

impl Orders {
    /// Order number, with its fraction, at a sample position: ∫ dx / period(x), zero in the middle.
    pub fn phase(&self, x: f64) -> f64 {
        let z = (x - self.middle) / self.length;
        let line = self.length / self.period;
        if self.bend.abs() < 1e-6 { line * z } else { line * (1.0 + self.bend * z).max(1e-6).ln() / self.bend }
    }

    /// Samples an order at a position.
    pub fn local_period(&self, x: f64) -> f64 {
        self.period * (1.0 + self.bend * (x - self.middle) / self.length)
    }
}

/// Peaks from which candidate repeats are made.
const STRONGEST: usize = 12;
/// Bends tried: ±48 % over the ramp, in steps the matching tolerance can bridge.
const BENDS: i32 = 12;
const BEND_STEP: f64 = 0.04;
/// Share of the peaks' height that must be there to be found again.
const LEAST_TESTED: f64 = 0.2;

/// Finds the repeat of the orders.
///
/// * `peaks`: by position. `n_samples`: samples on the ramp. `width`: typical line width, samples.
/// * `spacing_over_fsr`: nominal mode spacing over the free spectral range, where known; settles ties only.
///
/// 1. Every pair of strong peaks, at every bend, proposes a period.
/// 2. Its score is the share of height that is found again one order on, at the same height, among what should be.
/// 3. The best few are improved on their matched pairs and scored again, more sharply.
///
/// Returns none if no pair repeats.
pub(super) fn find(peaks: &[Seen], n_samples: usize, width: f64, spacing_over_fsr: Option<f64>) -> Option<Orders> {
    let length = n_samples as f64;
    let middle = length / 2.0;
    let mut strong: Vec<&Seen> = peaks.iter().collect();
    strong.sort_by(|a, b| b.height.total_cmp(&a.height));
    strong.truncate(STRONGEST);
    strong.sort_by(|a, b| a.x.total_cmp(&b.x));
    let mut best: Vec<(f64, Orders)> = Vec::new();
    for (i, a) in strong.iter().enumerate() {
        for b in &strong[i + 1..] {
            let distance = b.x - a.x;
            // Less than three widths is one peak's shoulder; over nine tenths of the ramp nothing else could repeat.
            if distance < 3.0 * width
                || distance > 0.92 * length
                || b.height.min(a.height) < 0.35 * b.height.max(a.height)
            {
                continue;
            }
            for step in -BENDS..=BENDS {
                let bend = f64::from(step) * BEND_STEP;
                let here = 1.0 + bend * ((a.x + b.x) / 2.0 - middle) / length;
                let mut orders = Orders { period: distance / here, bend, middle, length, score: 0.0 };
                let tolerance = (0.7 * width / orders.period).clamp(0.025, 0.08);
                let score = score(peaks, &orders, tolerance) - penalty(&orders);
                orders.score = score;
                best.push((score, orders));
            }
        }
    }
    best.sort_by(|a, b| b.0.total_cmp(&a.0));
    best.truncate(12);
    let mut improved: Vec<Orders> = Vec::new();
    for (_, orders) in best {
        let tolerance = (0.7 * width / orders.period).clamp(0.025, 0.08);
        let mut refined = orders;
        for _ in 0..3 {
            refined = refine(peaks, refined, tolerance).unwrap_or(refined);
        }
        let sharp = (0.5 * width / refined.period).clamp(0.018, 0.08);
        let plain = score(peaks, &refined, sharp);
        let bonus = spacing_over_fsr.map_or(0.0, |ratio| 0.15 * comb_share(peaks, &refined, ratio, width));
        refined.score = plain;
        improved.push(refined);
        let last = improved.len() - 1;
        improved[last].score = plain + bonus - penalty(&refined);
    }
    let winner = improved.into_iter().max_by(|a, b| a.score.total_cmp(&b.score))?;
    let sharp = (0.5 * width / winner.period).clamp(0.018, 0.08);
    let plain = score(peaks, &winner, sharp);
    (plain > 0.0).then_some(Orders { score: plain, ..winner })
}

/// Prefers small bends and, of repeats that fit alike, the shortest.
fn penalty(orders: &Orders) -> f64 {
    0.08 * orders.bend.abs() + 0.2 * orders.period / orders.length
}

/// Order phases of the peaks, computed once for a candidate.
fn phases(peaks: &[Seen], orders: &Orders) -> Vec<f64> {
    peaks.iter().map(|p| orders.phase(p.x)).collect()
}

/// Index of the peak nearest a phase, with its distance in orders. Phases ascend with position.
fn partner(phases: &[f64], wanted: f64) -> Option<(usize, f64)> {
    let after = phases.partition_point(|phase| *phase < wanted);
    let candidates = [after.checked_sub(1), (after < phases.len()).then_some(after)];
    candidates.into_iter().flatten().map(|i| (i, (phases[i] - wanted).abs())).min_by(|a, b| a.1.total_cmp(&b.1))
}

fn score(peaks: &[Seen], orders: &Orders, tolerance: f64) -> f64 {
    let (first, last) = (orders.phase(0.0), orders.phase(orders.length));
    let all: f64 = peaks.iter().map(|p| p.height).sum();
    let phases = phases(peaks, orders);
    let (mut found, mut sought) = (0.0, 0.0);
    for (p, phase) in peaks.iter().zip(&phases) {
        for wanted in [phase + 1.0, phase - 1.0] {
            if wanted < first + tolerance || wanted > last - tolerance {
                continue;
            }
            sought += p.height;
            if let Some((i, distance)) = partner(&phases, wanted).filter(|(_, distance)| *distance < tolerance) {
                let nearness = 1.0 - (distance / tolerance).powi(2);
                let q = &peaks[i];
                found += p.height * nearness * p.height.min(q.height) / p.height.max(q.height);
            }
        }
    }
    if sought < LEAST_TESTED * all { 0.0 } else { found / sought }
}

/// Fits period and bend to matched pairs: local period against place is a straight line.
fn refine(peaks: &[Seen], orders: Orders, tolerance: f64) -> Option<Orders> {
    let (mut s0, mut s1, mut s2, mut t0, mut t1) = (0.0, 0.0, 0.0, 0.0, 0.0);
    let phases = phases(peaks, &orders);
    for (p, phase) in peaks.iter().zip(&phases) {
        let Some((i, distance)) = partner(&phases, phase + 1.0) else { continue };
        let q = &peaks[i];
        let ratio = p.height.min(q.height) / p.height.max(q.height);
        if distance > tolerance || ratio < 0.3 || q.x <= p.x {
            continue;
        }
        let weight = p.height.min(q.height) * ratio;
        let z = ((p.x + q.x) / 2.0 - orders.middle) / orders.length;
        let period = q.x - p.x;
        s0 += weight;
        s1 += weight * z;
        s2 += weight * z * z;
        t0 += weight * period;
        t1 += weight * z * period;
    }
    if s0.is_nan() || s0 <= 0.0 {
        return None;
    }
    let determinant = s0 * s2 - s1 * s1;
    let (mut period, mut slope) = (t0 / s0, orders.bend * orders.period);
    // Pairs at one place give no bend: keep the one proposed.
    if determinant > 1e-4 * s0 * s0 {
        period = (s2 * t0 - s1 * t1) / determinant;
        slope = (s0 * t1 - s1 * t0) / determinant;
    } else {
        period -= slope * s1 / s0;
    }
    let refined = Orders { period, bend: (slope / period).clamp(-0.9, 0.9), ..orders };
    (refined.period > 0.0).then_some(refined)
}

/// Share of height that stands on a comb of the nominal spacing through the strongest peak.
fn comb_share(peaks: &[Seen], orders: &Orders, ratio: f64, width: f64) -> f64 {
    let Some(strongest) = peaks.iter().max_by(|a, b| a.height.total_cmp(&b.height)) else { return 0.0 };
    let origin = orders.phase(strongest.x);
    let tolerance = (0.7 * width / orders.period).clamp(0.01, 0.2 * ratio.max(0.05));
    let (mut on, mut all) = (0.0, 0.0);
    for p in peaks {
        let d = orders.phase(p.x) - origin;
        let nearest = (-3..=3)
            .map(|k| {
                let r = d - f64::from(k);
                (r - (r / ratio).round() * ratio).abs()
            })
            .fold(f64::INFINITY, f64::min);
        all += p.height;
        if nearest < tolerance {
            on += p.height;
        }
    }
    if all > 0.0 { on / all } else { 0.0 }
}
