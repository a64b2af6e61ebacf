//! Counts of modes and off-axis light over the captures of an earlier step. It wants nothing.
//! Must not count itself: `behaviour` does.
//! Main type: [`Comb`].

use super::{Room, Step};
use crate::{
    behaviour::count_modes,
    phrase::{Saying, figure, name, reasons},
    recipe,
    record::finding::ModeFinding,
    run::{
        filled::Filled,
        notebook::{DwellEnd, Notebook, Seen},
        pool::median,
        spacing,
    },
    uncertainty::{BudgetLine, Evaluation, Measured},
};

/// The step.
pub(super) struct Comb {
    from: String,
    done: bool,
    filled: Vec<Filled>,
}

impl Comb {
    pub fn new(keys: &recipe::Comb) -> Self {
        Self { from: keys.from.clone(), done: false, filled: Vec::new() }
    }
}

/// The window of seconds since first light in which whole cycles of a step lie; all of a step that is no dwell.
///
/// Errors: why there is none, for the row.
pub(super) fn whole_cycles(book: &Notebook, from: &str, cycles: f64) -> Result<(f64, f64), Saying> {
    let Some(dwelt) = book.dwelt(from) else { return Ok((f64::NEG_INFINITY, f64::INFINITY)) };
    if dwelt.end == Some(DwellEnd::Longest) {
        return Err(reasons::DID_NOT_SETTLE.with([name(from), figure(format!("{:.0}", dwelt.longest / 60.0))]));
    }
    dwelt.warmup.last_cycles(cycles).ok_or_else(|| match book.rack {
        Some(_) => (&reasons::RACK_NO_CYCLE).into(),
        None => reasons::NO_WHOLE_CYCLES.with([name(from), figure(cycles)]),
    })
}

fn counts(room: &Room<'_>, from: &str, cycles: f64) -> [Filled; 2] {
    let keys = ["mode_count_min", "mode_count_max"];
    if room.book.dwelt(from).is_none() {
        return keys.map(|key| Filled::absent(key, reasons::STEP_AT_REST.with([name(from)])));
    }
    let captures = match whole_cycles(room.book, from, cycles).or_else(|_| whole_cycles(room.book, from, 1.0)) {
        Ok(window) => room.book.of_within(from, window),
        Err(reason) => return keys.map(|key| Filled::absent(key, reason.clone())),
    };
    let glimpses: Vec<_> = captures.iter().map(|seen| seen.glimpse.clone()).collect();
    let spacing = room.book.spacing.as_ref().map_or(room.plan.recipe.nominal_spacing, |spacing| spacing.value);
    match count_modes(&glimpses, room.plan.recipe.mode_floor, spacing) {
        Some(counts) => [
            counted(keys[0], counts.min, counts.min_doubt, counts.min_probability),
            counted(keys[1], counts.max, counts.max_doubt, counts.max_probability),
        ],
        None => keys.map(|key| Filled::absent(key, &reasons::TOO_FEW_PHASES)),
    }
}

/// A count; in doubt, the mode nearest to the floor may belong or not.
fn counted(key: &str, n: u32, doubt: bool, probability: f64) -> Filled {
    let n = u64::from(n);
    let by = u64::from(doubt);
    let row = Filled::count(key, n, n.saturating_sub(by), n + by);
    if doubt { row.noted(reasons::NEAREST_TO_FLOOR.with([figure(format!("{probability:.3}"))])) } else { row }
}

/// Highest off-axis area over highest comb area in one capture, with its standard uncertainty; without a peak off the comb
/// 0 ± the noise of a height over the highest.
fn ratio(seen: &Seen) -> Option<(f64, f64)> {
    let greatest = |peaks: &[ModeFinding]| peaks.iter().max_by(|a, b| a.area.total_cmp(&b.area)).cloned();
    let comb = greatest(&seen.finding.modes).filter(|mode| mode.area > 0.0 && mode.peak_height > 0.0)?;
    let relative = |mode: &ModeFinding| mode.u_peak_height / mode.peak_height;
    let (value, u) = match greatest(&seen.finding.off_axis).filter(|peak| peak.area > 0.0 && peak.peak_height > 0.0) {
        Some(peak) => {
            let value = peak.area / comb.area;
            (value, value * relative(&peak).hypot(relative(&comb)))
        }
        None => (0.0, relative(&comb)),
    };
    (value.is_finite() && u.is_finite()).then_some((value, u))
}

/// Largest ratio over the captures that stays for three in a row: light off the comb lasts for a stretch of the walk, a capture
/// misread once does not. Of fewer than three captures, the largest. Where no capture shows any, 0 ± the median of their
/// noises: one capture whose own peak is ill fitted must not put a sound tube in doubt.
fn off_axis(captures: &[Seen]) -> Filled {
    let ratios: Vec<(f64, f64)> = captures.iter().filter_map(ratio).collect();
    let by_value = |a: &(f64, f64), b: &(f64, f64)| a.0.total_cmp(&b.0);
    let middle = |three: &[(f64, f64)]| {
        let mut three = three.to_vec();
        three.sort_by(by_value);
        three.get(1).copied()
    };
    let lasting = if ratios.len() < 3 { ratios } else { ratios.windows(3).filter_map(middle).collect() };
    let median_u = median(lasting.iter().map(|(_, u)| *u).collect());
    match lasting.into_iter().max_by(by_value) {
        Some((value, u)) => {
            let u = if value > 0.0 { u } else { median_u };
            let words = if value > 0.0 { "scatter of both peaks" } else { "noise of a peak's height" };
            let line = BudgetLine::direct("scatter", words, Evaluation::TypeA, u, f64::INFINITY);
            let note = if value > 0.0 { Saying::none() } else { (&reasons::NO_PEAK_OFF).into() };
            Filled::number("off_axis_ratio", &Measured::with_line(value, line)).noted(note)
        }
        None => Filled::absent("off_axis_ratio", &reasons::NOT_MEASURABLE),
    }
}

impl Step for Comb {
    fn begin(&mut self, room: &mut Room<'_>) {
        self.done = true;
        let cycles = room.book.dwelt(&self.from).map_or(1.0, |dwelt| dwelt.cycles);
        let window = whole_cycles(room.book, &self.from, cycles).or_else(|_| whole_cycles(room.book, &self.from, 1.0));
        if room.book.spacing.is_none() {
            let captures = match &window {
                Ok(window) => room.book.of_within(&self.from, *window),
                Err(_) => room.book.of(&self.from),
            };
            let pooled = spacing::pooled(captures);
            self.filled.extend(
                spacing::rows(pooled, reasons::OF_STEP.with([name(self.from.as_str())]), room.book)
                    .into_iter()
                    .flatten(),
            );
        }
        self.filled.extend(counts(room, &self.from, cycles));
        self.filled.push(match window {
            Ok(window) => off_axis(room.book.of_within(&self.from, window)),
            Err(reason) => Filled::absent("off_axis_ratio", reason),
        });
    }

    fn filled(&self) -> &[Filled] {
        &self.filled
    }
}
