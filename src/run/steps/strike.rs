//! The strike: supply on, time to first light, tries, start voltage.
//! Must not switch anything itself: a person does, and high voltage is asked for by name.
//! Main type: [`Strike`].

use super::{Given, Room, Step, Wish};
use crate::{
    phrase::{Saying, figure, questions, reasons},
    recipe,
    record::question::{Answer, Expects},
    run::{filled::Filled, notebook::Notebook},
    uncertainty::{BudgetLine, Evaluation, Measured},
};

/// Standard uncertainty of a time taken by hand, s (two reactions of a person; from memory).
const U_BY_HAND: f64 = 0.05;
/// Relative standard uncertainty of a start voltage from an instrument that no certificate names (from memory).
const U_NO_CERTIFICATE: f64 = 0.05;

/// Questions it puts.
const STAGES: usize = 3;

/// The step.
pub(super) struct Strike {
    tries_at_most: u64,
    stage: usize,
    filled: Vec<Filled>,
}

impl Strike {
    pub fn new(keys: &recipe::Strike) -> Self {
        Self { tries_at_most: keys.tries_at_most.max(1), stage: 0, filled: Vec::new() }
    }

    fn start_delay(&mut self, answer: &Answer, room: &mut Room<'_>) {
        room.book.first_light_ms = Some(room.now_ms);
        self.filled.push(match answer {
            Answer::Number(delay) => {
                let line =
                    BudgetLine::direct("by hand", "time taken by hand", Evaluation::TypeB, U_BY_HAND, f64::INFINITY);
                Filled::number("start_delay", &Measured::with_line(*delay, line))
            }
            answer => absent("start_delay", answer),
        });
    }

    fn tries(&mut self, answer: &Answer, room: &mut Room<'_>) {
        self.filled.push(match answer {
            Answer::Whole(0) => {
                room.book.dark = Some(reasons::NO_LIGHT_AFTER.with([figure(self.tries_at_most)]));
                Filled::absent("start_tries", &reasons::NOT_LIT)
            }
            Answer::Whole(tries) => Filled::count("start_tries", *tries, *tries, *tries),
            answer => absent("start_tries", answer),
        });
    }

    fn start_voltage(&mut self, answer: &Answer, room: &Room<'_>) {
        self.filled.push(match answer {
            Answer::Number(voltage) => {
                let supply = room.plan.station.supply.as_ref();
                let u = supply.map_or(U_NO_CERTIFICATE, |supply| supply.u);
                let source = super::supply::voltage_source(supply);
                let mut line = BudgetLine::direct(&source, "voltage reading", Evaluation::TypeB, u, f64::INFINITY);
                line.sensitivity = *voltage;
                Filled::number("start_voltage", &Measured::with_line(*voltage, line))
            }
            answer => absent("start_voltage", answer),
        });
    }
}

/// A row that an answer leaves empty.
pub(super) fn absent(key: &str, answer: &Answer) -> Filled {
    match answer {
        Answer::CannotSay(reason) => Filled::absent(key, Saying::outside(reason)),
        _ => Filled::absent(key, &reasons::NO_ANSWER),
    }
}

impl Step for Strike {
    fn begin(&mut self, room: &mut Room<'_>) {
        if let Some(rack) = &room.book.rack {
            let keys = ["start_delay", "start_tries", "start_voltage"];
            self.filled = keys.map(|key| Filled::absent(key, rack.reason())).to_vec();
            self.stage = STAGES;
        }
    }

    fn wants(&self) -> Wish {
        match self.stage {
            0 => Wish::Ask {
                word: "start_delay".into(),
                text: (&questions::SWITCH_ON).into(),
                expects: Expects::Number { ucum: "s".into(), lowest: 0.0, highest: 600.0 },
                high_voltage: true,
            },
            1 => Wish::Ask {
                word: "tries".into(),
                text: questions::TRIES.with([figure(self.tries_at_most)]),
                expects: Expects::Whole { lowest: 0, highest: self.tries_at_most },
                high_voltage: false,
            },
            2 => Wish::number("start_voltage", &questions::START_VOLTAGE, "kV", 0.0, 30e3),
            _ => Wish::Nothing,
        }
    }

    fn take(&mut self, given: Given<'_>, room: &mut Room<'_>) {
        let Given::Answer(answer) = given else { return };
        match self.stage {
            0 => self.start_delay(answer, room),
            1 => self.tries(answer, room),
            _ => self.start_voltage(answer, room),
        }
        self.stage += 1;
    }

    fn filled(&self) -> &[Filled] {
        &self.filled
    }

    fn expected_s(&self, _book: &Notebook) -> Option<f64> {
        Some(5.0 * STAGES.saturating_sub(self.stage) as f64)
    }
}
