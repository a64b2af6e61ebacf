//! One type for each kind of quantity, in SI inside; the unit is said at the door.
//! Must not parse text.
//! Main type: [`Quantity`].

use std::{fmt, marker::PhantomData, ops};

use super::units::{Dimension, Unit, units_of};

/// Marks what a [`Quantity`] measures.
pub trait Kind: Copy + fmt::Debug + PartialEq {
    /// Its dimension.
    const DIMENSION: Dimension;
}

/// A number in SI of one kind. `Display` picks the unit that leaves 1–999 before the point.
#[derive(Debug, Clone, Copy, PartialEq, PartialOrd)]
pub struct Quantity<K: Kind> {
    si: f64,
    kind: PhantomData<K>,
}

impl<K: Kind> Quantity<K> {
    /// From the SI value.
    pub const fn from_si(si: f64) -> Self {
        Self { si, kind: PhantomData }
    }

    /// The SI value.
    pub const fn si(self) -> f64 {
        self.si
    }

    /// Ratio of two of a kind.
    pub fn ratio_to(self, other: Self) -> f64 {
        self.si / other.si
    }
}

impl<K: Kind> fmt::Display for Quantity<K> {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let fits = |unit: &&Unit| (1.0..1000.0).contains(&(self.si / unit.factor).abs());
        let first = units_of(K::DIMENSION).find(|unit| unit.factor == 1.0);
        match units_of(K::DIMENSION).find(fits).or(first) {
            Some(unit) if unit.symbol.is_empty() => write!(f, "{}", trimmed(self.si)),
            Some(unit) => write!(f, "{} {}", trimmed(self.si / unit.factor), unit.symbol),
            None => write!(f, "{}", trimmed(self.si)),
        }
    }
}

/// Shortest decimal text that is right to nine significant digits.
fn trimmed(value: f64) -> f64 {
    format!("{value:.8e}").parse().unwrap_or(value)
}

macro_rules! kind {
    ($(#[$doc:meta])* $name:ident, $marker:ident, $dimension:ident) => {
        #[doc(hidden)]
        #[derive(Debug, Clone, Copy, PartialEq, PartialOrd)]
        pub struct $marker;
        impl Kind for $marker {
            const DIMENSION: Dimension = Dimension::$dimension;
        }
        $(#[$doc])*
        pub type $name = Quantity<$marker>;
    };
}

kind!(/// An optical or radio frequency, a level.
    Frequency, FrequencyKind, Frequency);
kind!(/// A difference of two frequencies: spacing, detuning, width.
    FrequencyDifference, FrequencyDifferenceKind, Frequency);
kind!(/// A length.
    Length, LengthKind, Length);
kind!(/// A span of time.
    Seconds, TimeKind, Time);
kind!(/// A voltage.
    Voltage, VoltageKind, Voltage);
kind!(/// A current.
    Current, CurrentKind, Current);
kind!(/// An optical or electrical power.
    Power, PowerKind, Power);
kind!(/// A resistance.
    Resistance, ResistanceKind, Resistance);
kind!(/// An angle.
    Angle, AngleKind, Angle);
kind!(/// A temperature, a level on the kelvin scale.
    Temperature, TemperatureKind, Temperature);
kind!(/// A difference of two temperatures.
    TemperatureDifference, TemperatureDifferenceKind, Temperature);
kind!(/// A plain number or a percentage.
    Ratio, RatioKind, Ratio);

impl Frequency {
    /// From a value in hertz.
    pub const fn from_hertz(value: f64) -> Self {
        Self::from_si(value)
    }
}

impl FrequencyDifference {
    /// From a value in hertz.
    pub const fn from_hertz(value: f64) -> Self {
        Self::from_si(value)
    }
    /// From a value in megahertz.
    pub const fn from_megahertz(value: f64) -> Self {
        Self::from_si(value * 1e6)
    }
    /// In hertz.
    pub const fn hertz(self) -> f64 {
        self.si()
    }
    /// In megahertz.
    pub const fn megahertz(self) -> f64 {
        self.si() / 1e6
    }
}

impl Length {
    /// From a value in metres.
    pub const fn from_metres(value: f64) -> Self {
        Self::from_si(value)
    }
    /// In metres.
    pub const fn metres(self) -> f64 {
        self.si()
    }
}

impl Seconds {
    /// From a value in seconds.
    pub const fn from_seconds(value: f64) -> Self {
        Self::from_si(value)
    }
    /// In seconds.
    pub const fn seconds(self) -> f64 {
        self.si()
    }
}

impl ops::Sub for Frequency {
    type Output = FrequencyDifference;
    fn sub(self, other: Self) -> FrequencyDifference {
        FrequencyDifference::from_si(self.si - other.si)
    }
}

impl ops::Add<FrequencyDifference> for Frequency {
    type Output = Self;
    fn add(self, difference: FrequencyDifference) -> Self {
        Self::from_si(self.si + difference.si)
    }
}

impl ops::Sub for Temperature {
    type Output = TemperatureDifference;
    fn sub(self, other: Self) -> TemperatureDifference {
        TemperatureDifference::from_si(self.si - other.si)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn prints_in_the_unit_people_use() {
        assert_eq!(FrequencyDifference::from_hertz(399.7e6).to_string(), "399.7 MHz");
        assert_eq!(FrequencyDifference::from_hertz(6.4e9).to_string(), "6.4 GHz");
        assert_eq!(Length::from_metres(0.0).to_string(), "0 m");
        assert_eq!(Seconds::from_seconds(0.2).to_string(), "200 ms");
    }

    #[test]
    fn a_difference_of_levels_is_a_difference() {
        let beat = Frequency::from_hertz(473.612e12) - Frequency::from_hertz(473.611e12);
        assert!((beat.megahertz() - 1000.0).abs() < 0.1, "one part in 1e4: the operands have 1e-16 of 4.7e14");
    }
}
