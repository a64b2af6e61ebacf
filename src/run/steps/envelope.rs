//! The envelope of the gain line over the last whole cycles of a dwell. It wants nothing.
//! Must not fit: `behaviour` does.
//! Main type: [`Envelope`].

use super::{Room, Step, comb::whole_cycles, dwell::U_DRIFT};
use crate::{
    behaviour::{Glimpse, envelope, gain_points, line_drift},
    phrase::{Saying, figure, reasons},
    recipe,
    run::filled::Filled,
    tube::measured_gain_ratio,
    uncertainty::{BudgetLine, Evaluation, Measured},
};

const KEYS: [&str; 4] = ["lasing_span", "envelope_fwhm", "dip_depth", "gain_ratio"];

/// The step.
pub(super) struct Envelope {
    from: String,
    filled: Vec<Filled>,
}

impl Envelope {
    pub fn new(keys: &recipe::Envelope) -> Self {
        Self { from: keys.from.clone(), filled: Vec::new() }
    }

    fn rows(&self, room: &Room<'_>) -> Result<Vec<Filled>, Saying> {
        let (book, from) = (&room.book, self.from.as_str());
        let cycles = book.dwelt(from).map_or(1.0, |dwelt| dwelt.cycles.max(1.0));
        let window = whole_cycles(book, from, cycles).or_else(|_| whole_cycles(book, from, 1.0))?;
        let glimpses: Vec<Glimpse> = book.of_within(from, window).iter().map(|seen| seen.glimpse.clone()).collect();
        let spacing = room.plan.recipe.nominal_spacing;
        let points = gain_points(&glimpses, spacing);
        let found = envelope(&points).map_err(|why| Saying::outside(&why))?;
        let scale = |measured: Measured| self.on_scale(measured, room, &glimpses, (window.1 - window.0) / cycles);
        let span = scale(found.span);
        let (seen, places) = found.filled;
        let note = reasons::MODES_IN_PLACES.with([figure(points.len()), figure(seen), figure(places)]);
        let gain = match measured_gain_ratio(&span) {
            Some(gain) => Filled::number(KEYS[3], &gain).noted(&reasons::GAS_AT),
            None => Filled::absent(KEYS[3], &reasons::SPAN_NOT_POSITIVE),
        };
        let dip = Filled::number(KEYS[2], &found.dip);
        let dip = if found.dip.value == 0.0 { dip.noted(&reasons::NO_DIP) } else { dip };
        Ok(vec![Filled::number(KEYS[0], &span).noted(note), Filled::number(KEYS[1], &scale(found.fwhm)), dip, gain])
    }

    /// A distance on the frequency axis: with the scale's certificate, and with what a drift of the interferometer adds.
    ///
    /// A mode is at one flank half a cycle before the other at most, over whole cycles.
    fn on_scale(&self, mut measured: Measured, room: &Room<'_>, glimpses: &[Glimpse], cycle_s: f64) -> Measured {
        if let Some(interferometer) = &room.plan.station.interferometer {
            let source = interferometer.certificate.as_ref().map_or("fsr", |certificate| certificate.number.as_str());
            let words = "free spectral range";
            let mut line = BudgetLine::direct(source, words, Evaluation::TypeB, interferometer.fsr_u, f64::INFINITY);
            line.sensitivity = measured.value;
            measured.budget.push(line);
        }
        let seen = line_drift(glimpses, room.plan.recipe.nominal_spacing).map(|drift| drift.value.hypot(drift.u()));
        let u = seen.filter(|u| *u < U_DRIFT).unwrap_or(U_DRIFT);
        let words = "drift of the interferometer";
        let mut line = BudgetLine::direct("interferometer drift", words, Evaluation::TypeB, u, f64::INFINITY);
        line.sensitivity = 0.5 * cycle_s;
        measured.budget.push(line);
        measured
    }
}

impl Step for Envelope {
    fn begin(&mut self, room: &mut Room<'_>) {
        self.filled = match self.rows(room) {
            Ok(rows) => rows,
            Err(why) => KEYS.iter().map(|key| Filled::absent(key, why.clone())).collect(),
        };
    }

    fn filled(&self) -> &[Filled] {
        &self.filled
    }
}
