//! Power, its ripple and its drift over the captures of an earlier step. It wants nothing.
//! Must not read a meter: readings come with the captures; `behaviour` averages them.
//! Main type: [`Power`].

use super::{Room, Step, comb::whole_cycles};
use crate::{
    behaviour::{CyclePower, Glimpse, cycle_power, power_drift},
    phrase::{Saying, name, reasons},
    recipe,
    run::{
        filled::Filled,
        notebook::{DwellEnd, Dwelt},
    },
    station::file::PowerMeter,
    uncertainty::{BudgetLine, Evaluation},
};

const KEYS: [&str; 3] = ["power", "power_ripple", "power_drift"];
/// Most cycles near the end of the dwell over which drift is sought.
const DRIFT_CYCLES: u32 = 8;

/// The step.
pub(super) struct Power {
    from: String,
    filled: Vec<Filled>,
}

impl Power {
    pub fn new(keys: &recipe::Power) -> Self {
        Self { from: keys.from.clone(), filled: Vec::new() }
    }

    fn rows(&self, room: &mut Room<'_>) -> Result<Vec<Filled>, Saying> {
        let from = self.from.as_str();
        let meter = room.plan.station.power_meter.as_ref().ok_or(&reasons::NO_POWER_METER)?;
        let glimpses: Vec<Glimpse> = room.book.of(from).iter().map(|seen| seen.glimpse.clone()).collect();
        if glimpses.iter().all(|glimpse| glimpse.power.is_none()) {
            return Err(reasons::NO_POWER_READING.with([name(from)]));
        }
        for watts in glimpses.iter().filter_map(|glimpse| glimpse.power).map(|power| power * meter.factor) {
            room.book.power_seen(watts, (watts * meter.u).abs());
        }
        let Some(dwelt) = room.book.dwelt(from) else {
            let at_rest = reasons::STEP_AT_REST.with([name(from)]);
            let row = power(cycle_power(&glimpses, ends(&glimpses)), meter).noted(&reasons::NOT_OVER_CYCLE);
            return Ok(vec![row, Filled::absent(KEYS[1], at_rest.clone()), Filled::absent(KEYS[2], at_rest)]);
        };
        if dwelt.end == Some(DwellEnd::SourceEnded) && !dwelt.warmup.state().settled {
            return Err((&reasons::ENDED_EARLY).into());
        }
        let last = whole_cycles(room.book, from, 1.0)?;
        let whole = whole_cycles(room.book, from, dwelt.cycles.max(1.0)).unwrap_or(last);
        let ripple = match cycle_power(&glimpses, whole) {
            Some(found) => Filled::number(KEYS[1], &found.ripple),
            None => Filled::absent(KEYS[1], &reasons::FEW_READINGS_CYCLES),
        };
        Ok(vec![power(cycle_power(&glimpses, last), meter), ripple, drift(&glimpses, dwelt)])
    }
}

fn ends(glimpses: &[Glimpse]) -> (f64, f64) {
    (glimpses.first().map_or(0.0, |glimpse| glimpse.at), glimpses.last().map_or(0.0, |glimpse| glimpse.at))
}

/// True power = reading × factor.
fn power(found: Option<CyclePower>, meter: &PowerMeter) -> Filled {
    let Some(found) = found else {
        return Filled::absent(KEYS[0], &reasons::FEW_READINGS_LAST);
    };
    let mut measured = found.mean.scaled(meter.factor);
    let source = meter.certificate.as_ref().map_or("power meter", |certificate| certificate.number.as_str());
    let mut scale = BudgetLine::direct(source, "power meter", Evaluation::TypeB, meter.u, f64::INFINITY);
    scale.sensitivity = measured.value;
    measured.budget.push(scale);
    Filled::number(KEYS[0], &measured)
}

fn drift(glimpses: &[Glimpse], dwelt: &Dwelt) -> Filled {
    let mut cycles: Vec<(f64, f64)> = Vec::new();
    for n in 1..=DRIFT_CYCLES {
        let Some((start, end)) = dwelt.warmup.last_cycles(f64::from(n)) else { break };
        let end = cycles.last().map_or(end, |later| later.0);
        cycles.push((start, end));
    }
    cycles.reverse();
    match power_drift(glimpses, &cycles) {
        Some(measured) => Filled::number(KEYS[2], &measured),
        None => Filled::absent(KEYS[2], &reasons::FEW_CYCLES),
    }
}

impl Step for Power {
    fn begin(&mut self, room: &mut Room<'_>) {
        self.filled = match self.rows(room) {
            Ok(rows) => rows,
            Err(reason) => KEYS.iter().map(|key| Filled::absent(key, reason.clone())).collect(),
        };
    }

    fn filled(&self) -> &[Filled] {
        &self.filled
    }
}
