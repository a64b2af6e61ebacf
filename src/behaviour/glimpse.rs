//! What one capture said about the tube, as far as its behaviour over time is concerned.
//! Must not hold samples.
//! Main types: [`Glimpse`], [`GlimpseMode`].

/// One capture seen from afar.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Glimpse {
    /// Seconds since first light.
    pub at: f64,
    /// Axial modes; empty where the capture was dark or refused.
    pub modes: Vec<GlimpseMode>,
    /// Free spectral range of the interferometer, Hz.
    pub free_spectral_range: f64,
    /// Mode spacing measured in this capture, Hz.
    pub mode_spacing: Option<f64>,
    /// Power at that moment, W.
    pub power: Option<f64>,
}

/// One axial mode of a glimpse.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct GlimpseMode {
    /// Position on the scan axis against a fixed ramp voltage, folded into [0, free spectral range), Hz.
    pub position: f64,
    /// Its standard uncertainty, Hz.
    pub u_position: f64,
    /// Peak height, V.
    pub height: f64,
    /// Its standard uncertainty, V.
    pub u_height: f64,
    /// Height in the crossed photodiode, V, where the bench has one.
    pub crossed: Option<f64>,
}

impl GlimpseMode {
    /// Height over both photodiodes, V: free of the axis of polarization where both see half of the light each.
    pub fn total_height(&self) -> f64 {
        self.height + self.crossed.unwrap_or(0.0)
    }

    /// Standard uncertainty of [`Self::total_height`], V; the crossed photodiode is taken to be as noisy as the first.
    pub fn u_total_height(&self) -> f64 {
        if self.crossed.is_some() { self.u_height * std::f64::consts::SQRT_2 } else { self.u_height }
    }

    /// Whether every number in it can be used.
    pub(crate) fn is_usable(&self) -> bool {
        self.position.is_finite()
            && self.u_position.is_finite()
            && self.u_position >= 0.0
            && self.total_height().is_finite()
            && self.total_height() > 0.0
    }
}

impl Glimpse {
    /// Whether time and scale can be used and there is at least one mode.
    pub(crate) fn is_usable(&self) -> bool {
        self.at.is_finite()
            && self.free_spectral_range.is_finite()
            && self.free_spectral_range > 0.0
            && self.modes.iter().any(GlimpseMode::is_usable)
    }
}
