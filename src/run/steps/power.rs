//! Power, its ripple and its drift over the captures of an earlier step. It wants nothing.
//! Must not read a meter: readings come with the captures.
//! Main type: [`Power`].

use super::{Given, Room, Step, Wish, comb::whole_cycles};
use crate::{
    numerics::linear,
    recipe,
    run::{
        filled::Filled,
        notebook::{DwellEnd, Notebook, Seen},
    },
    station::file::PowerMeter,
    uncertainty::{BudgetLine, Evaluation, Measured},
};

const KEYS: [&str; 3] = ["power", "power_ripple", "power_drift"];
/// Cycles near the end of the dwell over which drift is sought, and the fewest that show a scatter.
const DRIFT_CYCLES: (usize, usize) = (6, 3);

/// The step.
pub(super) struct Power {
    from: String,
    filled: Vec<Filled>,
}

impl Power {
    pub fn new(keys: &recipe::Power) -> Self {
        Self { from: keys.from.clone(), filled: Vec::new() }
    }
}

/// Averages over whole seconds: (middle of the second, W as read).
fn averages(captures: &[Seen]) -> Vec<(f64, f64)> {
    let mut seconds: Vec<(f64, f64, f64)> = Vec::new();
    for (at, power) in captures.iter().filter_map(|seen| seen.glimpse.power.map(|power| (seen.glimpse.at, power))) {
        match seconds.last_mut() {
            Some((second, sum, n)) if *second == at.floor() => (*sum, *n) = (*sum + power, *n + 1.0),
            _ => seconds.push((at.floor(), power, 1.0)),
        }
    }
    seconds.iter().map(|(second, sum, n)| (second + 0.5, sum / n)).collect()
}

fn mean(points: &[(f64, f64)]) -> Option<f64> {
    let n = points.len() as f64;
    (n > 0.0).then(|| points.iter().map(|(_, power)| power).sum::<f64>() / n)
}

/// Standard deviation of one average from differences of neighbours, √(½ mean d²): the slow ripple drops out
/// (von Neumann, Ann. Math. Stat. 12, 1941; from memory). Needs three.
fn scatter(points: &[(f64, f64)]) -> Option<f64> {
    let squares: Vec<f64> = points.windows(2).map(|pair| (pair[1].1 - pair[0].1).powi(2)).collect();
    (squares.len() >= 2).then(|| (0.5 * squares.iter().sum::<f64>() / squares.len() as f64).sqrt())
}

fn scatter_line(words: String, u: f64, n: usize) -> BudgetLine {
    // Differences of neighbours carry about two thirds as many degrees of freedom as points.
    BudgetLine::direct("scatter", &words, Evaluation::TypeA, u, (n as f64 / 1.5 - 1.0).max(1.0).floor())
}

fn power(points: &[(f64, f64)], meter: &PowerMeter) -> Filled {
    let (Some(mean), Some(scatter)) = (mean(points), scatter(points)) else {
        return Filled::absent(
            KEYS[0],
            format!("{} averages in the last whole cycle, expected 3 or more", points.len()),
        );
    };
    let n = points.len();
    let value = mean * meter.factor;
    let own =
        scatter_line(format!("scatter of {n} averages of 1 s"), scatter * meter.factor.abs() / (n as f64).sqrt(), n);
    let mut scale = meter_line(meter);
    scale.sensitivity = value;
    Filled::number(KEYS[0], &Measured { value, budget: vec![own, scale] })
}

/// The meter's relative standard uncertainty; its source is the certificate.
pub(super) fn meter_line(meter: &PowerMeter) -> BudgetLine {
    let source = meter.certificate.as_ref().map_or("power meter", |certificate| certificate.number.as_str());
    BudgetLine::direct(source, "power meter", Evaluation::TypeB, meter.u, f64::INFINITY)
}

fn ripple(points: &[(f64, f64)]) -> Filled {
    let (Some(mean), Some(scatter)) = (mean(points).filter(|mean| *mean > 0.0), scatter(points)) else {
        return Filled::absent(KEYS[1], format!("{} averages over the cycles, expected 3 or more", points.len()));
    };
    let greatest = points.iter().map(|(_, power)| *power).fold(f64::NEG_INFINITY, f64::max);
    let least = points.iter().map(|(_, power)| *power).fold(f64::INFINITY, f64::min);
    let u = scatter * std::f64::consts::SQRT_2 / mean;
    let line = scatter_line("scatter of the two extremes".into(), u, points.len());
    Filled::number(KEYS[1], &Measured::with_line((greatest - least) / mean, line))
}

/// Slope of cycle averages against time over their mean.
fn drift(cycles: &[(f64, f64)]) -> Filled {
    let few = || Filled::absent(KEYS[2], format!("{} whole cycles, expected {} or more", cycles.len(), DRIFT_CYCLES.1));
    if cycles.len() < DRIFT_CYCLES.1 {
        return few();
    }
    let (Some(middle), Some(level)) = (cycles.get(cycles.len() / 2).map(|(at, _)| *at), mean(cycles)) else {
        return few();
    };
    let design: Vec<f64> = cycles.iter().flat_map(|(at, _)| [1.0, at - middle]).collect();
    let rhs: Vec<f64> = cycles.iter().map(|(_, power)| power / level).collect();
    let fit = linear::weighted(&design, &rhs, &vec![1.0; rhs.len()]);
    match fit.ok().and_then(|fit| Some((*fit.coefficients.get(1)?, fit.standard_error(1)?, fit.degrees_of_freedom))) {
        Some((slope, u, dof)) => {
            let words = format!("scatter of {} cycle averages", cycles.len());
            let line = BudgetLine::direct("scatter", &words, Evaluation::TypeA, u, dof as f64);
            Filled::number(KEYS[2], &Measured::with_line(slope, line))
        }
        None => few(),
    }
}

/// Averages over the last whole cycles, oldest first: (middle, mean).
fn cycle_averages(book: &Notebook, from: &str, points: &[(f64, f64)]) -> Vec<(f64, f64)> {
    let Some(dwelt) = book.dwelt(from) else { return Vec::new() };
    let mut cycles = Vec::new();
    let mut end = f64::INFINITY;
    for n in 1..=DRIFT_CYCLES.0 {
        let Some((start, last)) = dwelt.warmup.last_cycles(n as f64) else { break };
        end = end.min(last);
        let inside: Vec<_> = points.iter().filter(|(at, _)| *at >= start && *at < end).copied().collect();
        let Some(mean) = mean(&inside) else { break };
        cycles.push((0.5 * (start + end), mean));
        end = start;
    }
    cycles.reverse();
    cycles
}

impl Power {
    fn rows(&self, room: &mut Room<'_>) -> Result<Vec<Filled>, String> {
        let meter = room.plan.station.power_meter.as_ref().ok_or("the station file names no power meter")?;
        let all = averages(room.book.of(&self.from));
        if all.is_empty() {
            return Err(format!("the captures of {} carry no power reading", self.from));
        }
        let noise = scatter(&all).unwrap_or(0.0) * meter.factor.abs();
        for (_, read) in &all {
            let watts = read * meter.factor;
            room.book.power_seen(watts, noise.hypot(watts * meter.u));
        }
        let dwelt = room.book.dwelt(&self.from);
        if dwelt.is_some_and(|dwelt| dwelt.end == Some(DwellEnd::SourceEnded) && !dwelt.warmup.state().settled) {
            return Err("the captures ended before the walk settled".into());
        }
        let Some(cycles) = dwelt.map(|dwelt| dwelt.cycles.max(1.0)) else {
            let at_rest = format!("{} is at rest: no walk cycle was seen", self.from);
            let row = power(&all, meter).noted("at rest, not over a walk cycle");
            return Ok(vec![row, Filled::absent(KEYS[1], at_rest.as_str()), Filled::absent(KEYS[2], at_rest)]);
        };
        let within = |cycles: f64| -> Result<Vec<(f64, f64)>, String> {
            let window = whole_cycles(room.book, &self.from, cycles)?;
            Ok(averages(room.book.of_within(&self.from, window)))
        };
        let last = within(1.0)?;
        let whole = within(cycles).or_else(|_| within(1.0))?;
        Ok(vec![power(&last, meter), ripple(&whole), drift(&cycle_averages(room.book, &self.from, &all))])
    }
}

impl Step for Power {
    fn begin(&mut self, room: &mut Room<'_>) {
        self.filled = match self.rows(room) {
            Ok(rows) => rows,
            Err(reason) => KEYS.iter().map(|key| Filled::absent(key, reason.as_str())).collect(),
        };
    }

    fn wants(&self) -> Wish {
        Wish::Nothing
    }

    fn take(&mut self, _given: Given<'_>, _room: &mut Room<'_>) {}

    fn filled(&self) -> &[Filled] {
        &self.filled
    }

    fn expected_s(&self, _book: &Notebook) -> Option<f64> {
        Some(0.0)
    }
}
