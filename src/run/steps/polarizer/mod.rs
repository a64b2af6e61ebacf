//! The polarizer: extinction of one axis, or the axes of neighbouring modes.
//! Must not turn anything itself: a person does.
//! Main function: [`step_of`].

mod linear;
mod neighbours;
mod random;

use super::{Step, Wish};
use crate::{
    phrase::{figure, questions},
    recipe::{Polarization, Polarizer},
};

/// The step for the polarization that the recipe expects.
pub(super) fn step_of(keys: &Polarizer) -> Box<dyn Step> {
    match keys.polarization {
        Polarization::Linear => Box::new(linear::Linear::new(keys)),
        Polarization::Random => Box::new(random::Random::new(keys)),
    }
}

/// The angle that a person can set, 0.1° steps in [0°, 180°), and what is asked.
fn turn(angle: f64) -> (f64, Wish) {
    let degrees = (angle.to_degrees().rem_euclid(180.0) * 10.0).round() / 10.0;
    let degrees = if degrees >= 180.0 { 0.0 } else { degrees };
    let text = questions::TURN.with([figure(format!("{degrees:.1}"))]);
    (degrees.to_radians(), Wish::done(format!("turn_{degrees:.1}"), text))
}

/// Taking it out again.
fn take_out() -> Wish {
    Wish::done("polarizer_out", &questions::POLARIZER_OUT)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn words_name_the_angle_that_can_be_set() {
        let word = |degrees: f64| match turn(degrees.to_radians()).1 {
            Wish::Ask { word, .. } => word,
            _ => String::new(),
        };
        assert_eq!(word(45.0), "turn_45.0");
        assert_eq!(word(-0.5), "turn_179.5");
        assert_eq!(word(179.98), "turn_0.0");
    }
}
