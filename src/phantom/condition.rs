//! In what condition gas, bore, mirror and cathode of a tube are: what a fault has changed besides light and volts.
//! Must not hold the name of a fault, nor what a sound tube is.
//! Main type: [`Condition`].

/// Share of air that halves the gain: molecules quench helium's metastable atoms and cool the electrons. A figure of
/// the model: a few per cent of air end the laser (common practice).
const HALVING_AIR: f64 = 0.02;
/// Share of the air that is in the gas at first light; the rest comes off walls and electrodes as they warm.
const AIR_AT_START: f64 = 0.5;
/// Time constant of its coming, s: power peaks and falls within minutes (common practice).
const OUTGASSING_TIME: f64 = 480.0;
/// Greatest relative change of the run voltage by air, and the share of air at which it is two thirds of that: 100–200 V
/// low in some tubes of 0.9–1 kV, more than 200 V high in others (tables of fault signatures, common practice).
const AIR_VOLTAGE: f64 = 0.25;
const AIR_OF_VOLTAGE: f64 = 0.01;
/// Tilt of one mirror that doubles the loss of the cavity, rad. A figure of the model: tenths of a milliradian decide
/// whether such tubes lase (common practice).
const DOUBLING_TILT: f64 = 0.5e-3;

/// The condition of one tube. A new sound one is the default.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Condition {
    /// Helium over that of the fill.
    pub helium: f64,
    /// Air in the warm gas, as a share of it.
    pub air: f64,
    /// Relative change of the run voltage by that air: up in some tubes, down in others; drawn from the seed where none.
    pub air_voltage: Option<f64>,
    /// Diameter of the bore over its design.
    pub bore: f64,
    /// Tilt of one mirror from where the loss is least, rad.
    pub mirror_tilt: f64,
    /// Share of the cathode's oxide that is spent.
    pub cathode_spent: f64,
}

impl Default for Condition {
    fn default() -> Self {
        Self { helium: 1.0, air: 0.0, air_voltage: None, bore: 1.0, mirror_tilt: 0.0, cathode_spent: 0.0 }
    }
}

impl Condition {
    /// Gain over that of clean gas, at a time since first light, s.
    ///
    /// 1/(1 + a(t)/a½) with a(t) = a·[½ + ½(1 − e^(−t/τ))²] (a figure of the model: quenching in proportion to air, and
    /// outgassing that begins slowly, so that power rises before it falls).
    pub fn gain_in_air(&self, seconds: f64) -> f64 {
        let come = -(-seconds.max(0.0) / OUTGASSING_TIME).exp_m1();
        let share = AIR_AT_START + (1.0 - AIR_AT_START) * come * come;
        1.0 / (1.0 + self.air * share / HALVING_AIR)
    }

    /// Gain over that of clean gas when all the air has come.
    pub fn gain_in_all_air(&self) -> f64 {
        1.0 / (1.0 + self.air / HALVING_AIR)
    }

    /// Relative change of the run voltage by the air: its size follows the air, its sign is one draw, 0–1.
    pub fn voltage_change(&self, draw: f64) -> f64 {
        let size = AIR_VOLTAGE * -(-self.air / AIR_OF_VOLTAGE).exp_m1();
        if draw < 0.5 { -size } else { size }
    }

    /// Loss of the cavity over that without tilt, with the mirror pushed by an angle, rad, from where it stands.
    ///
    /// 1 + (θ/θ₂)²: the mode moves off the bore's axis in proportion to the tilt, and its loss grows with the square (for
    /// small tilts, any text on resonators, e.g. Siegman, *Lasers*).
    pub fn tilt_loss(&self, push: f64) -> f64 {
        1.0 + ((self.mirror_tilt + push) / DOUBLING_TILT).powi(2)
    }
}
