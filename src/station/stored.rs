//! Checks of reference tubes that come with a scenario: values only, no runs.
//! Must not open a file: text comes in.
//! Main function: [`stored_checks`].

use chrono::DateTime;

use crate::{
    limits::{
        Fault, nearest,
        reading::{Item, read},
    },
    measurand::{self, CATALOGUE},
    record::reference::{CheckedValue, ReferenceCheck},
};

const CHECK: &[&str] = &["station", "serial", "at", "values"];

/// Reads a file of stored checks.
///
/// * `name`: name of the file, for the faults.
///
/// Returns (station, check) in the order of the file. Errors: every fault.
pub fn stored_checks(name: &str, text: &str) -> Result<Vec<(String, ReferenceCheck)>, Vec<Fault>> {
    read(name, text, &["check"], |root| {
        root.need("check")?;
        root.list("check").iter().map(check).collect::<Vec<_>>().into_iter().collect()
    })
}

fn check(item: &Item<'_>) -> Option<(String, ReferenceCheck)> {
    let table = item.table("the check", CHECK)?;
    let station = table.need("station").and_then(|item| item.text());
    let serial = table.need("serial").and_then(|item| item.text());
    let at = table.need("at").and_then(|item| {
        let text = item.text()?;
        if DateTime::parse_from_rfc3339(text).is_err() {
            item.fault(format!("`{text}` is no time; expected such as \"2026-03-02T06:05:00+00:00\" (RFC 3339)"), None);
            return None;
        }
        Some(text)
    });
    let values = table.need("values").and_then(|item| {
        item.open_table("`values`")?
            .each()
            .iter()
            .map(value)
            .collect::<Vec<_>>()
            .into_iter()
            .collect::<Option<Vec<_>>>()
    });
    let check = ReferenceCheck {
        serial: serial?.to_owned(),
        run_id: String::new(),
        at: at?.to_owned(),
        stored: true,
        values: values?,
    };
    Some((station?.to_owned(), check))
}

fn value(item: &Item<'_>) -> Option<CheckedValue> {
    let Some(measurand) = measurand::find(&item.name) else {
        let known = CATALOGUE.iter().map(|measurand| measurand.key);
        item.key_fault(format!("unknown measurand `{}`", item.name), nearest(&item.name, known));
        return None;
    };
    let value = item.quantity(measurand.unit().dimension)?;
    Some(CheckedValue { measurand: item.name.clone(), value, sums: None })
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used)]
    use super::*;

    #[test]
    fn a_fault_has_its_place() {
        let text = "[[check]]\nstation = \"b\"\nserial = \"R\"\nat = \"06:00\"\nvalues = { powr = \"1 mW\" }\n";
        let faults = stored_checks("c.toml", text).unwrap_err();
        assert_eq!(faults.iter().map(|fault| fault.line).collect::<Vec<_>>(), [4, 5]);
        assert_eq!(faults[1].nearest.as_deref(), Some("power"));
    }
}
