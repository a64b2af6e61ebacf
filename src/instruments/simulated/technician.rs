//! The bench's own technician, who answers from what is true of the tube; or somebody else at the same bench.
//! Must not measure what the program should measure itself.
//! Main type: [`Technician`].

use std::{cell::RefCell, rc::Rc};

use super::{hands, state::State};
use crate::{
    phantom::{cathode, discharge, getter, press_test},
    record::question::{Answer, Expects, Question},
    station::{Person, Trouble},
};

/// Who stands in the record as having answered.
pub const INITIALS: &str = "simulated";
/// Steps of the panel meters: 0.01 mA, 1 V; and of a stopwatch, 0.1 s.
const CURRENT_STEP: f64 = 1e-5;
const VOLTAGE_STEP: f64 = 1.0;
const TIME_STEP: f64 = 0.1;

/// Who answers at a simulated bench.
pub(super) struct Technician {
    state: Rc<RefCell<State>>,
    voice: Option<Box<dyn Person>>,
}

impl Technician {
    /// The bench's own technician, or a voice in their place.
    pub fn new(state: Rc<RefCell<State>>, voice: Option<Box<dyn Person>>) -> Self {
        Self { state, voice }
    }
}

impl Person for Technician {
    fn initials(&self) -> String {
        self.voice.as_ref().map_or_else(|| INITIALS.to_owned(), |voice| voice.initials())
    }

    fn answer(&mut self, question: &Question) -> Result<Answer, Trouble> {
        let answer = match &mut self.voice {
            Some(voice) => voice.answer(question)?,
            None => own_answer(&self.state.borrow(), question),
        };
        let mut state = self.state.borrow_mut();
        let cost = state.options.time_to_answer_ms;
        state.advance_by(cost);
        hands::carry_out(&mut state, &question.word, question.high_voltage, &answer);
        Ok(answer)
    }
}

/// What the technician says, without anything being done yet.
fn own_answer(state: &State, question: &Question) -> Answer {
    let (at, setting) = state.on_tube();
    let tube = state.world.tube();
    match (question.word.as_str(), &question.expects) {
        ("start_delay", _) => Answer::Number(stepped(tube.start_delay, TIME_STEP)),
        ("tries", Expects::Whole { highest, .. }) if tube.tries > *highest => Answer::Whole(0),
        ("tries", _) => Answer::Whole(tube.tries),
        ("start_voltage", _) => Answer::CannotSay("no high-voltage probe on this bench".to_owned()),
        ("run_voltage", _) => Answer::Number(stepped(state.world.supply_voltage(at, setting), VOLTAGE_STEP)),
        ("run_current", _) => Answer::Number(stepped(state.world.run_current(at, setting), CURRENT_STEP)),
        ("dropout_current", _) => Answer::Number(stepped(state.world.dropout_current(at), CURRENT_STEP)),
        (_, Expects::Choice(words)) => choice(state, question, words),
        (_, Expects::Done) => Answer::Done,
        (word, _) => Answer::CannotSay(format!("the simulated technician knows no `{word}`")),
    }
}

/// What is found at the tube, by the name of the look. A look that nothing of the truth answers is answered as of a sound
/// tube: clean, else the first word, which is the good one. What the recipe has no word for is not turned into another.
///
/// A tube that is dark by then was seen while it burned; only the press test needs its light.
fn choice(state: &State, question: &Question, words: &[String]) -> Answer {
    let tube = state.world.tube();
    let found = match question.step.as_str() {
        "discharge" => discharge(tube),
        "getter" => getter(tube),
        "cathode" => cathode(tube),
        "press_test" => match press_test(tube).filter(|_| state.on_tube().1.lit) {
            Some(found) => found,
            None => return Answer::CannotSay("there is no light to watch while the mount is pressed".to_owned()),
        },
        _ => match words.iter().find(|word| *word == "clean").or(words.first()) {
            Some(word) => word.as_str(),
            None => return Answer::CannotSay("no word to choose from".to_owned()),
        },
    };
    match words.iter().any(|word| word == found) {
        true => Answer::Choice(found.to_owned()),
        false => Answer::CannotSay(format!("what is seen, `{found}`, is none of {}", words.join(", "))),
    }
}

/// Rounds to the steps of a display. Dividing by a whole number of steps keeps the shortest decimal text.
fn stepped(value: f64, step: f64) -> f64 {
    let steps_in_one = (1.0 / step).round();
    (value * steps_in_one).round() / steps_in_one
}
