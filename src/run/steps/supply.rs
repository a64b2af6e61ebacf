//! Current and voltage of the running tube, and where the discharge goes out.
//! Must not switch anything itself.
//! Main type: [`Supply`].

use super::{Given, Room, Step, Wish, strike::absent};
use crate::{
    phrase::{Saying, figure, questions, reasons},
    recipe,
    record::question::Answer,
    run::{filled::Filled, notebook::Notebook},
    station::{
        ReadingKind,
        file::{self, Source},
    },
    uncertainty::{BudgetLine, Evaluation, Measured},
};

/// Standard uncertainty of a current read from a display with steps of 0.01 mA, A: half a step, rectangular.
const U_READING: f64 = 0.005e-3 / 1.732_050_8;

/// The step.
pub(super) struct Supply {
    dropout: bool,
    station: Option<file::Supply>,
    stage: usize,
    last: usize,
    current: Option<f64>,
    filled: Vec<Filled>,
}

impl Supply {
    pub fn new(keys: &recipe::Supply) -> Self {
        Self { dropout: keys.dropout, station: None, stage: 0, last: 0, current: None, filled: Vec::new() }
    }

    fn run_current(&mut self, found: Result<f64, Filled>) {
        self.filled.push(match (found, &self.station) {
            (Ok(current), Some(supply)) => {
                self.current = Some(current);
                Filled::number("run_current", &current_measured(current, supply))
            }
            (Ok(_), None) => Filled::absent("run_current", &reasons::NO_SUPPLY),
            (Err(absent), _) => absent,
        });
    }

    /// V_tube = V − I·R; the voltage's and the current's scale are different lines of one certificate.
    fn run_voltage(&mut self, found: Result<f64, Filled>) {
        let row = match (found, self.current, &self.station) {
            (Ok(voltage), Some(current), Some(supply)) => {
                let tube = voltage - current * supply.ballast;
                let mut volts = scale_line(&voltage_source(Some(supply)), "supply voltage", supply.u);
                volts.sensitivity = voltage;
                let mut amperes = scale_line(&current_source(supply), "current through the ballast", supply.u);
                amperes.sensitivity = -current * supply.ballast;
                let mut reading = reading_line();
                reading.sensitivity = -supply.ballast;
                let measured = Measured { value: tube, budget: vec![volts, amperes, reading] };
                let ballast = crate::quantity::Resistance::from_si(supply.ballast);
                let distance = crate::quantity::Length::from_si(supply.ballast_distance);
                Filled::number("run_voltage", &measured)
                    .noted(reasons::LESS_DROP.with([figure(ballast), figure(distance)]))
            }
            (Ok(_), None, _) => Filled::absent("run_voltage", &reasons::DROP_UNKNOWN),
            (Ok(_), _, None) => Filled::absent("run_voltage", &reasons::NO_SUPPLY),
            (Err(absent), ..) => absent,
        };
        self.filled.push(row);
    }

    fn dropout_current(&mut self, found: Result<f64, Filled>) {
        match (found, &self.station) {
            (Ok(dropout), Some(supply)) => {
                let row = Filled::number("dropout_current", &current_measured(dropout, supply));
                let ballast = crate::quantity::Resistance::from_si(supply.ballast);
                self.filled.push(row.noted(reasons::WITH_BALLAST.with([figure(ballast)])));
                self.filled.push(self.fraction(dropout));
            }
            (Ok(_), None) => self.filled.push(Filled::absent("dropout_current", &reasons::NO_SUPPLY)),
            (Err(absent), _) => {
                self.filled.push(absent);
                self.filled.push(Filled::absent("dropout_fraction", &reasons::NO_DROPOUT));
            }
        }
    }

    /// The same meter reads both currents: its scale cancels, its steps do not.
    fn fraction(&self, dropout: f64) -> Filled {
        match self.current {
            Some(current) if current > 0.0 => {
                let mut upper = reading_line();
                upper.sensitivity = 1.0 / current;
                let mut lower = reading_line();
                lower.line = "steps of the display, run current".into();
                lower.source_id = "display, run current".into();
                lower.sensitivity = -dropout / current.powi(2);
                Filled::number("dropout_fraction", &Measured { value: dropout / current, budget: vec![upper, lower] })
            }
            _ => Filled::absent("dropout_fraction", &reasons::NO_RUN_CURRENT),
        }
    }
}

/// Source id of the supply's voltage scale: correlated with every voltage under the same certificate, not with currents.
pub(super) fn voltage_source(supply: Option<&file::Supply>) -> String {
    match supply.and_then(|supply| supply.certificate.as_ref()) {
        Some(certificate) => format!("{}/voltage", certificate.number),
        None => "supply/voltage".into(),
    }
}

fn current_source(supply: &file::Supply) -> String {
    let number = supply.certificate.as_ref().map_or("supply", |certificate| &certificate.number);
    format!("{number}/current")
}

fn scale_line(source: &str, words: &str, u: f64) -> BudgetLine {
    BudgetLine::direct(source, words, Evaluation::TypeB, u, f64::INFINITY)
}

fn reading_line() -> BudgetLine {
    BudgetLine::direct("display", "steps of the display", Evaluation::TypeB, U_READING, f64::INFINITY)
}

fn current_measured(current: f64, supply: &file::Supply) -> Measured {
    let mut scale = scale_line(&current_source(supply), "current reading", supply.u);
    scale.sensitivity = current;
    Measured { value: current, budget: vec![scale, reading_line()] }
}

impl Step for Supply {
    fn begin(&mut self, room: &mut Room<'_>) {
        self.station = room.plan.station.supply.clone();
        self.last = if self.dropout { 3 } else { 2 };
        if self.station.is_none() {
            let keys = ["run_current", "run_voltage", "dropout_current", "dropout_fraction"];
            let wanted = if self.dropout { 4 } else { 2 };
            let reason = &reasons::NO_SUPPLY;
            self.filled = keys.iter().take(wanted).map(|key| Filled::absent(key, reason)).collect();
            self.stage = self.last;
        }
    }

    fn wants(&self) -> Wish {
        let read = self.station.as_ref().is_some_and(|supply| matches!(supply.source, Source::Profile(_)));
        match (self.stage, read) {
            (stage, _) if stage >= self.last => Wish::Nothing,
            (0, true) => Wish::Reading(ReadingKind::RunCurrent),
            (0, false) => Wish::number("run_current", &questions::RUN_CURRENT, "mA", 0.0, 0.1),
            (1, true) => Wish::Reading(ReadingKind::RunVoltage),
            (1, false) => Wish::number("run_voltage", &questions::RUN_VOLTAGE, "kV", 0.0, 20e3),
            _ => Wish::number("dropout_current", &questions::DROPOUT, "mA", 0.0, 0.1),
        }
    }

    fn take(&mut self, given: Given<'_>, _room: &mut Room<'_>) {
        let key = ["run_current", "run_voltage", "dropout_current"].get(self.stage).copied().unwrap_or_default();
        let found = match given {
            Given::Answer(Answer::Number(value)) => Ok(*value),
            Given::Reading(Ok(value)) => Ok(value),
            Given::Answer(answer) => Err(absent(key, answer)),
            Given::Reading(Err(reason)) => Err(Filled::absent(key, Saying::outside(reason))),
            _ => return,
        };
        match self.stage {
            0 => self.run_current(found),
            1 => self.run_voltage(found),
            _ => self.dropout_current(found),
        }
        self.stage += 1;
    }

    fn filled(&self) -> &[Filled] {
        &self.filled
    }

    fn expected_s(&self, _book: &Notebook) -> Option<f64> {
        Some(5.0 * (if self.dropout { 3_usize } else { 2 }).saturating_sub(self.stage) as f64)
    }
}
