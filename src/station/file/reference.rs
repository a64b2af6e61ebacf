//! The reference tubes of a station file: which they are, what they read when the bench is in order, how far they may stray.
//! Must not judge a check.
//! Main types: [`Reference`], [`ReferenceValue`], [`BeatNote`].

use chrono::{NaiveDate, NaiveTime};

use crate::{
    limits::{
        nearest,
        reading::{Item, Table},
    },
    measurand::{self, CATALOGUE, Measurand, Shape},
    quantity::{Dimension, parse_as},
};

/// A tube that stays at the bench and shows whether the bench still reads what it read.
#[derive(Debug, Clone, PartialEq)]
pub struct Reference {
    /// Serial number.
    pub serial: String,
    /// Its type: a folder below `limits/`, whose recipe measures it.
    pub tube_type: String,
    /// Day on which its values were assigned: earlier checks do not count. None counts all.
    pub since: Option<NaiveDate>,
    /// Its values on this bench, in the order of the file; at least one.
    pub values: Vec<ReferenceValue>,
    /// Its mode spacing by a counter: this alone says something on accuracy, the values only on stability.
    pub beat_note: Option<BeatNote>,
}

/// What a reference tube reads on a bench that is in order.
#[derive(Debug, Clone, PartialEq)]
pub struct ReferenceValue {
    /// Measurand's key.
    pub measurand: String,
    /// Value, SI.
    pub value: f64,
    /// A check may be this far off, SI.
    pub within: f64,
    /// Standard deviation of one check, SI; none: it is found from the first checks.
    pub sd: Option<f64>,
}

/// Frequency between neighbouring modes on a fast photodiode, by a counter.
#[derive(Debug, Clone, PartialEq)]
pub struct BeatNote {
    /// Hz.
    pub value: f64,
    /// Standard uncertainty, Hz.
    pub u: f64,
    /// Who measured it, when, by what.
    pub source: String,
}

const REFERENCE: &[&str] = &["serial", "type", "since", "values", "beat_note"];
const VALUE: &[&str] = &["value", "within", "sd"];
const BEAT_NOTE: &[&str] = &["value", "u", "source"];

/// Every `[[reference]]`; `shifts` of the same file, where they could be read.
pub(super) fn references(root: &Table<'_>, shifts: Option<&[NaiveTime]>) -> Option<Vec<Reference>> {
    let items = root.list("reference");
    if root.get("reference").is_some() && items.is_empty() {
        root.get("reference")?.fault("expected reference tubes as `[[reference]]`", None);
        return None;
    }
    if shifts.is_some_and(<[_]>::is_empty)
        && let Some(first) = root.get("reference")
    {
        first.key_fault("`[[reference]]` without `shifts`; expected when checks are due: `shifts = [\"06:00\"]`", None);
        return None;
    }
    let mut tubes: Vec<Reference> = Vec::new();
    let mut whole = true;
    for item in &items {
        let Some(tube) = reference(item) else {
            whole = false;
            continue;
        };
        if tubes.iter().any(|other| other.serial == tube.serial) {
            item.fault(format!("`{}` is a reference tube twice; expected it once", tube.serial), None);
        }
        tubes.push(tube);
    }
    whole.then_some(tubes)
}

fn reference(item: &Item<'_>) -> Option<Reference> {
    let table = item.table("the reference tube", REFERENCE)?;
    let serial = table.need("serial").and_then(|item| item.text());
    let tube_type = table.need("type").and_then(|item| item.text());
    let since = table.get("since").map_or(Some(None), |item| item.day().map(Some));
    let beat_note = table.get("beat_note").map_or(Some(None), |item| beat_note(&item).map(Some));
    let values = table.need("values").and_then(|item| values(&item));
    Some(Reference {
        serial: serial?.trim().to_owned(),
        tube_type: tube_type?.to_owned(),
        since: since?,
        values: values?,
        beat_note: beat_note?,
    })
}

fn values(item: &Item<'_>) -> Option<Vec<ReferenceValue>> {
    let all = item.open_table("`values`")?.each();
    if all.is_empty() {
        item.fault("`values` is empty; expected at least one measurand", None);
        return None;
    }
    all.iter().map(value).collect::<Vec<_>>().into_iter().collect()
}

fn value(item: &Item<'_>) -> Option<ReferenceValue> {
    let Some(measurand) = measurand::find(&item.name).filter(|measurand| measurand.shape != Shape::Count) else {
        let known = CATALOGUE.iter().filter(|m| m.shape != Shape::Count).map(|m| m.key);
        let message = format!("unknown measurand `{}`; expected a number of the catalogue", item.name);
        item.key_fault(message, nearest(&item.name, known));
        return None;
    };
    let table = item.table(&format!("`{}`", item.name), VALUE)?;
    let value = table.need("value").and_then(|item| item.quantity(measurand.unit().dimension));
    let within = table.need("within").and_then(|item| spread(&item, measurand, value?));
    let sd = table.get("sd").map_or(Some(None), |item| spread(&item, measurand, value?).map(Some));
    Some(ReferenceValue { measurand: item.name.clone(), value: value?, within: within?, sd: sd? })
}

/// A distance from a value, SI: in the measurand's unit, or as a share of the value where that has a unit of its own.
fn spread(item: &Item<'_>, measurand: &Measurand, value: f64) -> Option<f64> {
    let text = item.text()?;
    let dimension = measurand.unit().dimension;
    let share = || parse_as(text, Dimension::Ratio).ok().map(|share| share * value.abs());
    let spread = parse_as(text, dimension).ok().or_else(share).filter(|spread| spread.is_finite() && *spread > 0.0);
    if spread.is_none() {
        let unit = measurand.unit().symbol;
        item.fault(format!("`{}` is `{text}`; expected above zero, in {unit} or as a share: `3 %`", item.name), None);
    }
    spread
}

fn beat_note(item: &Item<'_>) -> Option<BeatNote> {
    let table = item.table("the beat note", BEAT_NOTE)?;
    let value = table.need("value").and_then(|item| item.positive(Dimension::Frequency));
    let u = table.need("u").and_then(|item| item.positive(Dimension::Frequency));
    let source = table.need("source").and_then(|item| item.text());
    Some(BeatNote { value: value?, u: u?, source: source?.to_owned() })
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used)]
    use crate::station::file::StationFile;

    const HEAD: &str = "station = \"b\"\ntime_zone = \"Europe/Lisbon\"\n";

    fn faults(rest: &str) -> String {
        let faults = StationFile::parse("s.toml", &format!("{HEAD}{rest}")).unwrap_err();
        faults.iter().map(ToString::to_string).collect::<Vec<_>>().join("\n")
    }

    #[test]
    fn values_are_read_with_bounds_in_either_form() {
        let text = "shifts = [\"06:00\"]\n[[reference]]\nserial = \"REF-A\"\ntype = \"twin-150\"\nsince = 2026-01-12\n\
                    beat_note = { value = \"999.2 MHz\", u = \"20 kHz\", source = \"counter\" }\n[reference.values]\n\
                    mode_spacing = { value = \"1 GHz\", within = \"5 MHz\" }\n\
                    power = { value = \"0.9 mW\", within = \"3 %\", sd = \"1 %\" }\n";
        let file = StationFile::parse("s.toml", &format!("{HEAD}{text}")).unwrap();
        let tube = file.reference("REF-A").unwrap();
        assert_eq!((tube.values[0].within, tube.values[0].sd), (5e6, None));
        assert!((tube.values[1].within - 0.027e-3).abs() < 1e-12);
        assert!((tube.values[1].sd.unwrap() - 0.009e-3).abs() < 1e-12);
        assert_eq!(tube.beat_note.as_ref().unwrap().u, 20e3);
    }

    #[test]
    fn each_fault_names_what_is_expected() {
        let one = "[[reference]]\nserial = \"A\"\ntype = \"t\"\n";
        let power = "values = { power = { value = \"1 mW\", within = \"3 %\" } }\n";
        let cases = [
            ("shifts = [\"14:00\", \"06:00\"]\n".to_owned(), "`shifts` has 06:00 after 14:00"),
            ("shifts = [\"06:00\", \"06:00\"]\n".to_owned(), "expected each start once"),
            (format!("{one}{power}"), "`[[reference]]` without `shifts`"),
            (format!("shifts = [\"06:00\"]\n{one}"), "has no `values`"),
            (format!("shifts = [\"06:00\"]\n{one}values = {{}}\n"), "`values` is empty"),
            (format!("shifts = [\"06:00\"]\n{one}values = {{ powr = {{ value = \"1 mW\" }} }}"), "nearest"),
            (format!("shifts = [\"06:00\"]\n{one}values = {{ power = {{ value = \"1 mW\" }} }}"), "has no `within`"),
            (
                format!("shifts = [\"06:00\"]\n{one}values = {{ power = {{ value = \"1 mW\", within = \"3 m\" }} }}"),
                "expected above zero, in mW or as a share",
            ),
            (format!("shifts = [\"06:00\"]\n{one}{power}{one}{power}"), "a reference tube twice"),
            (format!("shifts = [\"06:00\"]\n{one}serail = \"B\"\n{power}"), "unknown key `serail`"),
        ];
        for (text, words) in cases {
            assert!(faults(&text).contains(words), "{text}\n{}", faults(&text));
        }
    }
}
