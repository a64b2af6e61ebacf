//! Growth of a warming tube and the walk of its comb; and how an interferometer's body moves its own scale.
//! Must not fit anything.
//! Main functions: [`growth`], [`walk_cycles`].

use crate::quantity::{Frequency, FrequencyDifference, Length, TemperatureDifference};

/// Growth of a tube whose comb walked by a number of mode spacings: one for each half wave.
///
/// Source: geometry; the resonance condition L = N·λ/2 with N for N − 1.
pub fn growth(walk_cycles: f64, wavelength: Length) -> Length {
    Length::from_metres(walk_cycles * wavelength.metres() / 2.0)
}

/// Mode spacings that the comb walks as a tube warms: α·L·ΔT over half a wave.
///
/// * `expansion`: linear expansion of the glass, 1/K.
pub fn walk_cycles(mirror_spacing: Length, expansion: f64, warming: TemperatureDifference, wavelength: Length) -> f64 {
    expansion * mirror_spacing.metres() * warming.si() / (wavelength.metres() / 2.0)
}

/// How far an interferometer's resonances move as its body warms: ν·α·ΔT.
///
/// Source: geometry.
pub fn body_drift(light: Frequency, expansion: f64, warming: TemperatureDifference) -> FrequencyDifference {
    FrequencyDifference::from_hertz(light.si() * expansion * warming.si())
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::constants::{BOROSILICATE, RED_LINE, SPEED_OF_LIGHT};

    const WAVELENGTH: Length = Length::from_metres(RED_LINE.value);

    #[test]
    fn half_a_wave_a_cycle() {
        // 316.50 nm, five digits given.
        assert!((growth(1.0, WAVELENGTH).metres() * 1e9 - 316.50).abs() < 0.005);
    }

    #[test]
    fn cycles_of_warming_tubes() {
        let cycles = |metres: f64, kelvin: f64| {
            let warming = TemperatureDifference::from_si(kelvin);
            walk_cycles(Length::from_metres(metres), BOROSILICATE.value, warming, WAVELENGTH)
        };
        // Borosilicate, 400 mm and 50 K: 205; 150, 250, 375 mm over 20 to 60 K: 31 to 92, 51 to 154, 77 to 231. Whole
        // numbers.
        let cases = [
            (0.4, 50.0, 205.0),
            (0.15, 20.0, 31.0),
            (0.15, 60.0, 92.0),
            (0.25, 20.0, 51.0),
            (0.25, 60.0, 154.0),
            (0.375, 20.0, 77.0),
            (0.375, 60.0, 231.0),
        ];
        for (metres, kelvin, expected) in cases {
            assert!(
                (cycles(metres, kelvin) - expected).abs() < 0.51,
                "{metres} m {kelvin} K: {}",
                cycles(metres, kelvin)
            );
        }
    }

    #[test]
    fn interferometer_bodies() {
        // Handbook expansions of steel, aluminium, invar: 12.0, 23.0, 1.2 per million and kelvin; values given for 0.1
        // K.
        let light = Frequency::from_hertz(SPEED_OF_LIGHT.value / RED_LINE.value);
        for (expansion, megahertz) in [(12.0e-6, 570.0), (23.0e-6, 1090.0), (1.2e-6, 57.0)] {
            let drift = body_drift(light, expansion, TemperatureDifference::from_si(0.1)).megahertz();
            assert!((drift / megahertz - 1.0).abs() < 0.005, "{drift}");
        }
    }
}
