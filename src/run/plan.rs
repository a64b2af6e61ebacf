//! The plan of a run: recipe, limits and station file frozen by value.
//! Must not open a file: texts come in.
//! Main type: [`Plan`].

use crate::{
    limits::{Fault, Limits},
    recipe::Recipe,
    station::file::StationFile,
};

/// What a run is measured by, judged by and measured on.
#[derive(Debug, Clone, PartialEq)]
pub struct Plan {
    /// Steps and their keys.
    pub recipe: Recipe,
    /// Bounds and decision rule.
    pub limits: Limits,
    /// Instruments and their certificates.
    pub station: StationFile,
}

impl Plan {
    /// Reads the three texts as they are stored in the first event of a run.
    ///
    /// # Errors
    /// Every fault of the three files, recipe first.
    pub fn from_texts(recipe: &str, limits: &str, station: &str) -> Result<Self, Vec<Fault>> {
        let recipe = Recipe::parse("recipe.toml", recipe);
        let limits = Limits::parse("limits.toml", limits);
        let station = StationFile::parse("station.toml", station);
        match (recipe, limits, station) {
            (Ok(recipe), Ok(limits), Ok(station)) => Ok(Self { recipe, limits, station }),
            (recipe, limits, station) => {
                let faults = [recipe.err(), limits.err(), station.err()];
                Err(faults.into_iter().flatten().flatten().collect())
            }
        }
    }
}
