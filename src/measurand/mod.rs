//! The one catalogue of what is measured: keys, names, units, definitions. Limit keys, CSV, sheet and docs come from it.
//! Must not hold a limit or a measured value.
//! Main types: [`Measurand`], [`CATALOGUE`].

mod catalogue;

pub use catalogue::CATALOGUE;

use crate::{
    phrase::{Phrase, page},
    quantity::{UNITS, Unit},
};

/// What kind of number a measurand is; decides how its uncertainty is turned into a probability.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Shape {
    /// Any sign, uncertainty symmetric.
    Normal,
    /// Never below zero: the distribution is cut there.
    Positive,
    /// Whole number, judged exactly.
    Count,
}

/// The heading under which a row stands on the sheet, in this order.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub enum Group {
    /// Modes and interferometer.
    Optics,
    /// Axes and extinction.
    Polarization,
    /// Power and noise.
    Power,
    /// Warm-up, hops, swaps.
    Time,
    /// Discharge and supply.
    Supply,
    /// Diameter and divergence.
    Beam,
    /// Named looks.
    Visual,
}

impl Group {
    /// Heading on the sheet.
    pub fn heading(self) -> &'static Phrase {
        match self {
            Self::Optics => &page::OPTICS,
            Self::Polarization => &page::POLARIZATION,
            Self::Power => &page::POWER,
            Self::Time => &page::OVER_TIME,
            Self::Supply => &page::SUPPLY,
            Self::Beam => &page::BEAM,
            Self::Visual => &page::BY_EYE,
        }
    }
}

/// One measurand.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Measurand {
    /// Its key in limits files, records and JSON.
    pub key: &'static str,
    /// Its name on the sheet.
    pub name: Phrase,
    /// Its symbol, or empty.
    pub symbol: &'static str,
    /// UCUM code of the unit people see and the CSV holds.
    pub ucum: &'static str,
    /// Most decimals shown in that unit.
    pub decimals: usize,
    /// Kind of number.
    pub shape: Shape,
    /// Heading it stands under.
    pub group: Group,
    /// One sentence, so that two laboratories agree.
    pub definition: &'static str,
}

impl Measurand {
    /// The unit people see and the CSV holds.
    pub fn unit(&self) -> &'static Unit {
        // A test proves that every code of the catalogue is in the table; the first unit is never reached.
        UNITS.iter().find(|unit| unit.ucum == self.ucum).unwrap_or(&UNITS[0])
    }

    /// Key of its SI value in JSON: `mode_spacing_hz`.
    pub fn json_key(&self) -> String {
        format!("{}{}", self.key, self.unit().dimension.suffix())
    }

    /// From SI to the unit shown.
    pub fn shown(&self, si: f64) -> f64 {
        si / self.unit().factor
    }
}

/// The measurand with a key.
pub fn find(key: &str) -> Option<&'static Measurand> {
    CATALOGUE.iter().find(|measurand| measurand.key == key)
}

/// Place of a key in the catalogue, for sorting rows; unknown keys (looks) come last.
pub fn rank(key: &str) -> usize {
    CATALOGUE.iter().position(|measurand| measurand.key == key).unwrap_or(CATALOGUE.len())
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_unit_is_in_the_table_and_every_key_once() {
        for (i, measurand) in CATALOGUE.iter().enumerate() {
            assert!(UNITS.iter().any(|unit| unit.ucum == measurand.ucum), "{}", measurand.key);
            assert!(CATALOGUE[i + 1..].iter().all(|other| other.key != measurand.key), "{}", measurand.key);
        }
    }

    #[test]
    fn json_keys_say_the_unit() {
        assert_eq!(find("mode_spacing").map(Measurand::json_key).as_deref(), Some("mode_spacing_hz"));
        assert_eq!(find("extinction").map(Measurand::json_key).as_deref(), Some("extinction"));
    }
}
