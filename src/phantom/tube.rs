//! What is true of one simulated tube: physical quantities, never the name of a fault.
//! Must not compute what the tube does: `gain`, `walk` and `comb` do.
//! Main types: [`TubeTruth`], [`Incident`].

use super::condition::Condition;

/// The truth about one tube. Every number is SI.
#[derive(Debug, Clone, PartialEq)]
pub struct TubeTruth {
    /// Distance of the mirrors, m.
    pub mirror_spacing: f64,
    /// Peak unsaturated gain over loss, η; at 1 or below there is no light.
    pub gain_ratio: f64,
    /// Gas temperature in the bore, K: sets the Doppler width.
    pub gas_temperature: f64,
    /// Homogeneous half width γ of the line, Hz: width of the central dip.
    pub homogeneous_half_width: f64,
    /// Output, mean over a walk cycle, warm, W.
    pub power: f64,
    /// Output at switch-on over `power`.
    pub power_at_start: f64,
    /// Time constant of the rise of output, s.
    pub power_tau: f64,
    /// Walk of the comb in mode spacings from cold to rest, N∞.
    pub walk_cycles: f64,
    /// Its time constant τ, s.
    pub warmup_tau: f64,
    /// Walk of a fast part, in mode spacings (the bore and the mirror mounts warm first).
    pub fast_cycles: f64,
    /// Time constant of the fast part, s.
    pub fast_tau: f64,
    /// Amplitude of a wandering temperature (draught), in mode spacings.
    pub draught_cycles: f64,
    /// Period of that wandering, s.
    pub draught_period: f64,
    /// Place of the cold comb under the gain line, 0–1 spacings; drawn from the seed where none.
    pub comb_phase: Option<f64>,
    /// All modes in one polarization (a Brewster window or plate).
    pub single_axis: bool,
    /// Azimuth of the strong axis on the bench, rad.
    pub azimuth: f64,
    /// Angle from the strong axis to the other family's, rad.
    pub orthogonality: f64,
    /// P_max/P_min of each mode alone.
    pub extinction: f64,
    /// Detuning at which the families exchange axes in every cycle, Hz from line centre.
    pub swap_detuning: Option<f64>,
    /// Height of a transverse mode over that of the axial mode it belongs to.
    pub off_axis_share: f64,
    /// Frequency of the transverse mode less that of its axial mode, Hz.
    pub off_axis_offset: f64,
    /// Nominal tube current, A.
    pub run_current: f64,
    /// Voltage at the tube at that current, V.
    pub run_voltage: f64,
    /// b in V ∝ I^−b.
    pub voltage_exponent: f64,
    /// Current below which the discharge goes out with the bench's ballast, A.
    pub dropout_current: f64,
    /// Time from high voltage to first light, s.
    pub start_delay: f64,
    /// Strikes until it ran.
    pub tries: u64,
    /// Ripple of the light at twice the mains frequency, rms over mean.
    pub line_ripple: f64,
    /// In what condition gas, bore, mirror and cathode are.
    pub condition: Condition,
    /// Noise of the discharge in the light, 10 Hz to 1 MHz, rms over mean.
    pub discharge_noise: f64,
    /// A tone of the discharge in the light, rms over mean.
    pub tone_level: f64,
    /// Its frequency, Hz.
    pub tone_frequency: f64,
    /// Each beat of three neighbouring modes in the light, rms over mean.
    pub beat_level: f64,
    /// What happens to it on the bench.
    pub incidents: Vec<Incident>,
}

/// Something sudden. `at` is in seconds since first light.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Incident {
    /// The comb is displaced at once, for good.
    Hop {
        /// When, s.
        at: f64,
        /// By how much, Hz.
        size: f64,
    },
    /// Both families exchange axes, for good.
    Swap {
        /// When, s.
        at: f64,
    },
    /// The alignment into the interferometer is knocked and comes back.
    Knock {
        /// When, s.
        at: f64,
        /// Height over undisturbed height while it lasts.
        to: f64,
        /// How long, s.
        lasts: f64,
    },
    /// Captures begun in this time are lost.
    Lost {
        /// When, s.
        at: f64,
        /// How long, s.
        lasts: f64,
    },
    /// The interferometer jumps, not the tube.
    Jump {
        /// When, s.
        at: f64,
        /// By how much, Hz.
        size: f64,
    },
}

impl Default for TubeTruth {
    /// A sound tube with mirrors 375 mm apart, random polarization; sizes are common practice.
    fn default() -> Self {
        Self {
            mirror_spacing: 0.375,
            gain_ratio: 2.0,
            gas_temperature: 400.0,
            // Between the natural half width and the pressure-broadened one of a 3 torr fill; from memory.
            homogeneous_half_width: 120e6,
            power: 7e-3,
            power_at_start: 0.8,
            power_tau: 240.0,
            walk_cycles: 150.0,
            warmup_tau: 600.0,
            fast_cycles: 0.0,
            fast_tau: 60.0,
            draught_cycles: 0.0,
            draught_period: 420.0,
            comb_phase: None,
            single_axis: false,
            azimuth: 0.0,
            orthogonality: std::f64::consts::FRAC_PI_2,
            extinction: 3000.0,
            swap_detuning: None,
            off_axis_share: 0.0,
            off_axis_offset: 130e6,
            run_current: 6e-3,
            run_voltage: 1900.0,
            voltage_exponent: 0.12,
            dropout_current: 3.6e-3,
            start_delay: 0.6,
            tries: 1,
            line_ripple: 0.0,
            condition: Condition::default(),
            // Ordinary tubes: 0.1–0.3 % (from memory).
            discharge_noise: 2e-3,
            tone_level: 0.0,
            tone_frequency: 50e3,
            beat_level: 0.0,
            incidents: Vec::new(),
        }
    }
}
