//! The table of units: symbol for people, code for machines (UCUM), factor to SI.
//! Must not hold anything that is not a unit.
//! Main types: [`Unit`], [`Dimension`].

/// What a number measures. Two units convert into each other only inside one dimension.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
pub enum Dimension {
    /// Hertz. A frequency difference has the same units.
    Frequency,
    /// Metre.
    Length,
    /// Second.
    Time,
    /// Volt.
    Voltage,
    /// Ampere.
    Current,
    /// Watt.
    Power,
    /// Ohm.
    Resistance,
    /// Radian.
    Angle,
    /// Kelvin.
    Temperature,
    /// Hertz a second.
    FrequencyRate,
    /// One a second (a relative drift).
    Rate,
    /// A plain number; percent is a unit of it.
    Ratio,
}

impl Dimension {
    /// Name for sentences: "a frequency".
    pub fn name(self) -> &'static str {
        match self {
            Self::Frequency => "a frequency",
            Self::Length => "a length",
            Self::Time => "a time",
            Self::Voltage => "a voltage",
            Self::Current => "a current",
            Self::Power => "a power",
            Self::Resistance => "a resistance",
            Self::Angle => "an angle",
            Self::Temperature => "a temperature",
            Self::FrequencyRate => "a frequency rate",
            Self::Rate => "a relative rate",
            Self::Ratio => "a ratio",
        }
    }

    /// Suffix of JSON keys that hold the SI value (`_hz`); empty for plain numbers.
    pub fn suffix(self) -> &'static str {
        match self {
            Self::Frequency => "_hz",
            Self::Length => "_m",
            Self::Time => "_s",
            Self::Voltage => "_v",
            Self::Current => "_a",
            Self::Power => "_w",
            Self::Resistance => "_ohm",
            Self::Angle => "_rad",
            Self::Temperature => "_k",
            Self::FrequencyRate => "_hz_per_s",
            Self::Rate => "_per_s",
            Self::Ratio => "",
        }
    }
}

/// A unit of one dimension.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Unit {
    /// As people write it: `MHz`, `µm`, `%`. Empty for a plain number.
    pub symbol: &'static str,
    /// Second spelling that is read too, for keyboards without the sign: `um`, `kohm`.
    pub ascii: &'static str,
    /// UCUM code (Unified Code for Units of Measure, version 2.1; from memory): `MHz`, `um`, `%`, `1`.
    pub ucum: &'static str,
    /// What it measures.
    pub dimension: Dimension,
    /// SI value of one unit.
    pub factor: f64,
}

const fn unit(
    symbol: &'static str,
    ascii: &'static str,
    ucum: &'static str,
    dimension: Dimension,
    factor: f64,
) -> Unit {
    Unit { symbol, ascii, ucum, dimension, factor }
}

/// Every unit the program reads or writes.
pub const UNITS: &[Unit] = &[
    unit("Hz", "Hz", "Hz", Dimension::Frequency, 1.0),
    unit("kHz", "kHz", "kHz", Dimension::Frequency, 1e3),
    unit("MHz", "MHz", "MHz", Dimension::Frequency, 1e6),
    unit("GHz", "GHz", "GHz", Dimension::Frequency, 1e9),
    unit("THz", "THz", "THz", Dimension::Frequency, 1e12),
    unit("m", "m", "m", Dimension::Length, 1.0),
    unit("mm", "mm", "mm", Dimension::Length, 1e-3),
    unit("µm", "um", "um", Dimension::Length, 1e-6),
    unit("nm", "nm", "nm", Dimension::Length, 1e-9),
    unit("cm", "cm", "cm", Dimension::Length, 1e-2),
    unit("s", "s", "s", Dimension::Time, 1.0),
    unit("ms", "ms", "ms", Dimension::Time, 1e-3),
    unit("µs", "us", "us", Dimension::Time, 1e-6),
    unit("min", "min", "min", Dimension::Time, 60.0),
    unit("h", "h", "h", Dimension::Time, 3600.0),
    unit("V", "V", "V", Dimension::Voltage, 1.0),
    unit("mV", "mV", "mV", Dimension::Voltage, 1e-3),
    unit("kV", "kV", "kV", Dimension::Voltage, 1e3),
    unit("A", "A", "A", Dimension::Current, 1.0),
    unit("mA", "mA", "mA", Dimension::Current, 1e-3),
    unit("W", "W", "W", Dimension::Power, 1.0),
    unit("mW", "mW", "mW", Dimension::Power, 1e-3),
    unit("µW", "uW", "uW", Dimension::Power, 1e-6),
    unit("Ω", "ohm", "Ohm", Dimension::Resistance, 1.0),
    unit("kΩ", "kohm", "kOhm", Dimension::Resistance, 1e3),
    unit("rad", "rad", "rad", Dimension::Angle, 1.0),
    unit("mrad", "mrad", "mrad", Dimension::Angle, 1e-3),
    unit("°", "deg", "deg", Dimension::Angle, std::f64::consts::PI / 180.0),
    unit("K", "K", "K", Dimension::Temperature, 1.0),
    unit("MHz/min", "MHz/min", "MHz/min", Dimension::FrequencyRate, 1e6 / 60.0),
    unit("%/h", "%/h", "%/h", Dimension::Rate, 1e-2 / 3600.0),
    unit("", "", "1", Dimension::Ratio, 1.0),
    unit("%", "%", "%", Dimension::Ratio, 1e-2),
];

/// The units of one dimension, in the order of [`UNITS`].
pub fn units_of(dimension: Dimension) -> impl Iterator<Item = &'static Unit> {
    UNITS.iter().filter(move |unit| unit.dimension == dimension)
}
