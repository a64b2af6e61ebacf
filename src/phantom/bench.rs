//! What is true of one simulated bench: interferometer, ramp, detectors, digitizer, meters, supply.
//! Must not compute what the bench does: `ramp`, `trace` and `world` do.
//! Main type: [`BenchTruth`].

/// The truth about one bench. Every number is SI.
#[derive(Debug, Clone, PartialEq)]
pub struct BenchTruth {
    /// Free spectral range of the scanning interferometer, Hz.
    pub free_spectral_range: f64,
    /// Its finesse, before the detector's pole.
    pub finesse: f64,
    /// Orders swept by one ramp.
    pub orders: f64,
    /// Period of the ramp, s; one capture is one period.
    pub ramp_period: f64,
    /// Share of the period in which the ramp rises: 0.5 is a triangle, 0.95 a sawtooth with a short flyback.
    pub rising_share: f64,
    /// Lowest ramp voltage, V.
    pub ramp_low: f64,
    /// Highest ramp voltage, V.
    pub ramp_high: f64,
    /// Relative change of the piezo's slope over one ramp.
    pub ramp_curvature: f64,
    /// Opening of the loop between rising and falling ramp, as a share of the curvature: 0 none, 1 mirror images.
    pub ramp_loop: f64,
    /// A rising ramp meets falling frequencies.
    pub ramp_reversed: bool,
    /// Time constant of the photodiode amplifiers (single pole), s.
    pub detector_time: f64,
    /// Standard deviation of white noise over the height of the highest peak.
    pub noise: f64,
    /// Bits of the digitizer.
    pub bits: u32,
    /// Level without light, V.
    pub dark_level: f64,
    /// Angle from the tube's strong axis to the splitting polarizer ahead of the two photodiodes, rad; none: one
    /// photodiode that sees all light.
    pub analyser: Option<f64>,
    /// Extinction of the splitting polarizer and of the one ahead of the power meter.
    pub polarizer_extinction: f64,
    /// Drift of the interferometer, Hz/s.
    pub drift: f64,
    /// True power over meter reading.
    pub meter_factor: f64,
    /// Standard deviation of a one-second meter reading, relative.
    pub meter_noise: f64,
    /// Reading in the dark, W.
    pub meter_dark: f64,
    /// Ballast between supply and tube, Ω.
    pub ballast: f64,
    /// Mains frequency, Hz.
    pub mains: f64,
    /// Ripple of an ordinary supply in the light, rms of all mains harmonics over mean.
    pub supply_ripple: f64,
    /// White noise of the light detector in 1 MHz, over the level of the warm tube.
    pub light_noise: f64,
    /// Where the light detector's response has fallen by 3 dB, Hz.
    pub light_bandwidth: f64,
}

impl Default for BenchTruth {
    /// An ordinary bench: 6.4 GHz, finesse 150, sawtooth over 2.5 orders in 25 ms, 12 bits.
    fn default() -> Self {
        Self {
            free_spectral_range: 6.4e9,
            finesse: 150.0,
            orders: 2.5,
            ramp_period: 0.025,
            rising_share: 0.95,
            ramp_low: 1.0,
            ramp_high: 9.0,
            ramp_curvature: 0.12,
            ramp_loop: 0.6,
            ramp_reversed: false,
            detector_time: 2e-6,
            noise: 0.004,
            bits: 12,
            dark_level: 0.02,
            analyser: Some(30_f64.to_radians()),
            polarizer_extinction: 1e5,
            drift: 5e3,
            meter_factor: 1.0,
            meter_noise: 5e-4,
            meter_dark: 4e-7,
            ballast: 75e3,
            mains: 50.0,
            supply_ripple: 5e-4,
            light_noise: 3e-4,
            light_bandwidth: 3e6,
        }
    }
}
