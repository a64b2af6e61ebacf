//! What an answer does to the bench: the tube burns, the polarizer turns, the beam is blocked.
//! Must not answer.
//! Main function: [`carry_out`].

use super::state::State;
use crate::record::question::Answer;

/// Word of the question that turns the polarizer, before the angle in degrees: `turn_45.0`.
const TURN: &str = "turn_";

/// Does to the bench what an answer says was done. The bench's time must be that of the answer.
pub(super) fn carry_out(state: &mut State, word: &str, high_voltage: bool, answer: &Answer) {
    let said = !matches!(answer, Answer::CannotSay(_));
    if high_voltage && said {
        state.switch_on();
    }
    let angle = word.strip_prefix(TURN).and_then(|degrees| degrees.parse::<f64>().ok()).filter(|a| a.is_finite());
    match (word, angle) {
        (_, Some(degrees)) if said => state.polarizer = Some(degrees.to_radians()),
        ("polarizer_out", _) if said => state.polarizer = None,
        ("block_beam", _) if said => state.blocked = true,
        ("open_beam", _) if said => state.blocked = false,
        ("dropout_current", _) if said => state.switch_off(),
        _ => {}
    }
}
