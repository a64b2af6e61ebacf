//! Home as arguments and environment name it.
//! Must not read what is in it.
//! Main function: [`find`].

use std::path::PathBuf;

use super::{Ending, Failure};
use crate::disk::Home;

/// `--home`, else `TUBEWRIGHT_HOME`, else the nearest parent with `limits/`, else the types compiled in.
pub(super) fn find(named: Option<PathBuf>, reports: Option<PathBuf>) -> Result<Home, Failure> {
    let named = named.or_else(|| std::env::var_os("TUBEWRIGHT_HOME").filter(|home| !home.is_empty()).map(Into::into));
    let current = std::env::current_dir()
        .map_err(|error| Failure::new(Ending::Store, format!("cannot tell the current folder: {error}")))?;
    Ok(Home::find(named, reports, &current))
}
