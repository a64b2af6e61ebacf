//! What eyes and a hand at the tube would find: derived from what is true of it, in the words of the trade.
//! Must not know which questions are asked.
//! Main functions: [`discharge`], [`getter`], [`cathode`], [`press_test`].

use super::{gain::output_ratio, tube::TubeTruth};

/// Helium left below which the discharge looks deeper red-orange. This and the shares below are figures of the model;
/// colours and their order are common practice.
const HELIUM_POOR: f64 = 0.75;
/// Air from which it looks pinkish, bluish, white.
const PINKISH_AIR: f64 = 0.002;
const BLUISH_AIR: f64 = 0.01;
const WHITE_AIR: f64 = 0.05;
/// Air from which the getter looks milky, brown.
const MILKY_AIR: f64 = 0.003;
const BROWN_AIR: f64 = 0.02;
/// Share of the cathode spent from which metal shines on the glass near it; from which the discharge looks pinkish.
const FILM_SPENT: f64 = 0.4;
const PINKISH_SPENT: f64 = 0.9;
/// Tilt of a mirror by a light push with an insulated tool, rad, and the change of power that is noticed. Figures of the
/// model.
const PUSH: f64 = 0.05e-3;
const NOTICED: f64 = 0.05;

/// Colour of the discharge, seen from the side.
pub fn discharge(tube: &TubeTruth) -> &'static str {
    let condition = &tube.condition;
    match condition.air {
        air if air >= WHITE_AIR => "white",
        air if air >= BLUISH_AIR => "bluish",
        air if air >= PINKISH_AIR => "pinkish",
        _ if condition.helium <= HELIUM_POOR => "deep red-orange",
        _ if condition.cathode_spent >= PINKISH_SPENT => "pinkish",
        _ => "salmon",
    }
}

/// The getter's patch.
pub fn getter(tube: &TubeTruth) -> &'static str {
    match tube.condition.air {
        air if air >= BROWN_AIR => "brown",
        air if air >= MILKY_AIR => "milky",
        _ => "bright",
    }
}

/// The glass near the cathode.
pub fn cathode(tube: &TubeTruth) -> &'static str {
    if tube.condition.cathode_spent >= FILM_SPENT { "film" } else { "clean" }
}

/// What power does while the mount of a mirror is pressed, one way and then the other.
///
/// Returns none where there is no light.
pub fn press_test(tube: &TubeTruth) -> Option<&'static str> {
    if tube.power <= 0.0 || tube.gain_ratio <= 1.0 {
        return None;
    }
    let best = pressed_output(tube, PUSH).max(pressed_output(tube, -PUSH));
    Some(match best {
        best if best >= 1.0 + NOTICED => "rises",
        best if best <= 1.0 - NOTICED => "falls",
        _ => "steady",
    })
}

/// Output with a mirror pushed by an angle, rad, over output without.
fn pressed_output(tube: &TubeTruth, push: f64) -> f64 {
    let eased = tube.condition.tilt_loss(0.0) / tube.condition.tilt_loss(push);
    output_ratio(tube.gain_ratio, tube.gain_ratio * eased)
}
