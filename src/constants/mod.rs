//! Constants of physics and of the trade: value, unit, uncertainty, edition, source.
//! Must not compute anything.
//! Main type: [`Constant`].

/// A number with its pedigree.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Constant {
    /// Value in SI.
    pub value: f64,
    /// Standard uncertainty in SI; 0 where the value is exact by definition.
    pub u_value: f64,
    /// Unit, UCUM code.
    pub unit: &'static str,
    /// Edition or year.
    pub edition: &'static str,
    /// Where it is published, or "from memory", or "common practice".
    pub source: &'static str,
}

/// Speed of light in vacuum.
pub const SPEED_OF_LIGHT: Constant = Constant {
    value: 299_792_458.0,
    u_value: 0.0,
    unit: "m/s",
    edition: "SI 2019",
    source: "SI Brochure, 9th edition: exact",
};

/// Boltzmann constant.
pub const BOLTZMANN: Constant = Constant {
    value: 1.380_649e-23,
    u_value: 0.0,
    unit: "J/K",
    edition: "SI 2019",
    source: "SI Brochure, 9th edition: exact",
};

/// Atomic mass constant.
pub const ATOMIC_MASS: Constant = Constant {
    value: 1.660_539_068_92e-27,
    u_value: 5.2e-37,
    unit: "kg",
    edition: "CODATA 2022",
    source: "CODATA 2022 recommended values",
};

/// Relative atomic mass of neon 20.
pub const NEON_20: Constant = Constant {
    value: 19.992_440_176,
    u_value: 2e-9,
    unit: "u",
    edition: "AME 2012 and later",
    source: "atomic mass evaluation; from memory, checked against a table of isotopes",
};

/// Vacuum wavelength of the red line, unstabilized tube.
pub const RED_LINE: Constant = Constant {
    value: 632.990_8e-9,
    u_value: 632.990_8e-9 * 1.5e-6,
    unit: "m",
    edition: "CIPM Recommendation 2 (2007)",
    source: "DOI 10.59161/CIPM2007REC2E",
};

/// Refractive index of air at 633 nm, less 1.
pub const AIR_REFRACTIVITY: Constant = Constant {
    value: 2.7e-4,
    u_value: 1.5e-5,
    unit: "1",
    edition: "20 °C, sea level",
    source: "dispersion formulas of air; uncertainty for weather and the height of a plant, from memory",
};

/// Linear expansion of borosilicate glass.
pub const BOROSILICATE: Constant = Constant {
    value: 3.25e-6,
    u_value: 0.1e-6,
    unit: "/K",
    edition: "handbook",
    source: "common handbook value; uncertainty from memory",
};

/// Relative correction of a mode spacing for gain dispersion (it shrinks the comb).
pub const MODE_PULLING: Constant = Constant {
    value: 1.0e-3,
    u_value: 0.5e-3,
    unit: "1",
    edition: "2026",
    source: "size from memory; sign from gain dispersion",
};
