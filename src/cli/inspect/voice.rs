//! A sheet that a person or an answer file began is not finished by the simulated technician.
//! Must not answer anything.
//! Main function: [`same`].

use std::path::Path;

use super::inputs::Inputs;
use crate::cli::Failure;
use crate::record::event::{Event, Happening, Identity};

/// Refuses to let the bench's own technician go on with a sheet that somebody else began.
///
/// * `events`: of the run so far.
/// * `folder`: where it is, for the sentence.
pub(super) fn same(inputs: &Inputs, identity: &Identity, events: &[Event], folder: &Path) -> Result<(), Failure> {
    let named = inputs.ask || inputs.answers.is_some();
    let Some(scenario) = inputs.scenario.as_ref().filter(|_| !named) else { return Ok(()) };
    let of_another = |event: &Event| match &event.what {
        Happening::Answered { by, .. } if by != crate::instruments::SIMULATED_INITIALS => Some(by.clone()),
        _ => None,
    };
    let by = events.iter().find_map(of_another);
    // Before the first answer the initials on the sheet tell.
    let by = by.or_else(|| Some(identity.technician.clone()).filter(|initials| *initials != scenario.technician));
    match by {
        None => Ok(()),
        Some(by) => Err(Failure::unusable(format!(
            "the sheet in `{}` was begun by {by}, and the simulated technician does not finish it: \
             give `--answers FILE` or `--ask` as before, or end it with `--stop \"why\"`",
            folder.display()
        ))),
    }
}
