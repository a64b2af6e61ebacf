//! From text such as `979.3 MHz` to a number in SI, with the dimension checked.
//! Must not accept a number without its unit where a unit is due.
//! Main functions: [`parse_as`], [`parse_with_unit`].

use std::str::FromStr;

use super::{
    kinds::{Kind, Quantity},
    units::{Dimension, UNITS, Unit, units_of},
};

/// Why a text is no quantity of the wanted kind. Reads after "failed to read …: ".
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
pub enum QuantityError {
    /// The part before the unit is no finite decimal number.
    #[error("`{text}` does not start with a number; expected {wanted} such as `{example}`")]
    NotANumber {
        /// What was given.
        text: String,
        /// "a frequency".
        wanted: &'static str,
        /// One that would do.
        example: String,
    },
    /// No unit at all.
    #[error("`{text}` has no unit; expected {wanted} such as `{example}`")]
    NoUnit {
        /// What was given.
        text: String,
        /// "a frequency".
        wanted: &'static str,
        /// One that would do.
        example: String,
    },
    /// A unit that is not in the table, or of another dimension.
    #[error("`{unit}` is not a unit of {wanted}; expected one of {known}")]
    WrongUnit {
        /// The unit found.
        unit: String,
        /// "a frequency".
        wanted: &'static str,
        /// The units that would do.
        known: String,
    },
}

/// Splits `979.3 MHz` into number and unit text; the space is optional.
fn split(text: &str) -> Option<(f64, &str)> {
    let text = text.trim();
    let numeric = |c: char| c.is_ascii_digit() || matches!(c, '+' | '-' | '.' | 'e' | 'E');
    let end = text.find(|c| !numeric(c)).unwrap_or(text.len());
    // `5e` of a unit that begins with an `e` cannot occur: no unit in the table does.
    let number: f64 = text[..end].parse().ok()?;
    number.is_finite().then(|| (number, text[end..].trim()))
}

/// Reads a text with a unit of any dimension.
///
/// Returns the SI value and the unit, or `None` if the number or the unit is unknown.
pub fn parse_with_unit(text: &str) -> Option<(f64, &'static Unit)> {
    let (number, symbol) = split(text)?;
    let symbol = symbol.replace('μ', "µ");
    let unit = UNITS.iter().find(|unit| unit.symbol == symbol || unit.ascii == symbol)?;
    Some((number * unit.factor, unit))
}

/// Reads a text as a quantity of one dimension.
///
/// * `text`: number and unit, `"0.50 mW"`. A ratio may stand without a unit.
/// * `dimension`: what it must measure.
///
/// Returns the SI value. Errors say what was found, what is allowed and give an example.
pub fn parse_as(text: &str, dimension: Dimension) -> Result<f64, QuantityError> {
    let wanted = dimension.name();
    let text = text.trim();
    let example = || {
        let unit = units_of(dimension).nth(2).or_else(|| units_of(dimension).last());
        format!("1.5 {}", unit.map_or("", |unit| unit.symbol)).trim_end().to_owned()
    };
    let Some((number, symbol)) = split(text) else {
        return Err(QuantityError::NotANumber { text: text.to_owned(), wanted, example: example() });
    };
    let symbol = symbol.replace('μ', "µ");
    if let Some(unit) = units_of(dimension).find(|unit| unit.symbol == symbol || unit.ascii == symbol) {
        return Ok(number * unit.factor);
    }
    if symbol.is_empty() {
        return Err(QuantityError::NoUnit { text: text.to_owned(), wanted, example: example() });
    }
    let known = units_of(dimension).map(|unit| unit.symbol).filter(|s| !s.is_empty()).collect::<Vec<_>>().join(", ");
    Err(QuantityError::WrongUnit { unit: symbol, wanted, known })
}

impl<K: Kind> FromStr for Quantity<K> {
    type Err = QuantityError;

    fn from_str(text: &str) -> Result<Self, QuantityError> {
        parse_as(text, K::DIMENSION).map(Self::from_si)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn reads_number_and_unit() {
        let near = |a: Result<f64, QuantityError>, b: f64| (a.unwrap_or(f64::NAN) / b - 1.0).abs() < 1e-15;
        assert!(near(parse_as("979.3 MHz", Dimension::Frequency), 979.3e6));
        assert!(near(parse_as("8GHz", Dimension::Frequency), 8e9));
        assert!(near(parse_as("75 kΩ", Dimension::Resistance), 75e3));
        assert!(near(parse_as("75kohm", Dimension::Resistance), 75e3));
        assert!(near(parse_as("0.3 %", Dimension::Ratio), 0.003));
        assert!(near(parse_as("0.003", Dimension::Ratio), 0.003));
        assert!(near(parse_as("3 μm", Dimension::Length), 3e-6));
    }

    #[test]
    fn says_what_is_wrong() {
        let text = |t, d| parse_as(t, d).map_err(|e| e.to_string()).err().unwrap_or_default();
        assert!(text("12", Dimension::Power).contains("no unit"));
        assert!(text("12 mV", Dimension::Power).contains("`mV` is not a unit of a power; expected one of W, mW, µW"));
        assert!(text("much", Dimension::Power).contains("does not start with a number"));
        assert!(text("NaN mW", Dimension::Power).contains("does not start with a number"));
        assert!(text("1e999 mW", Dimension::Power).contains("does not start with a number"));
    }
}
