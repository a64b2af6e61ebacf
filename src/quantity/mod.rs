//! Physical quantities in SI that parse and print with their unit; a level and a difference are different types.
//! Must not know lasers, files or tables of measurands.
//! Main types: [`Quantity`], [`Unit`], [`Dimension`].

mod kinds;
mod parse;
mod units;

pub use kinds::{
    Angle, Current, Frequency, FrequencyDifference, Kind, Length, Power, Quantity, Ratio, Resistance, Seconds,
    Temperature, TemperatureDifference, Voltage,
};
pub use parse::{QuantityError, parse_as, parse_with_unit};
pub use units::{Dimension, UNITS, Unit, units_of};
