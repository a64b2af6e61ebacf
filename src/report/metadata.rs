//! record.csv-metadata.json: the columns of record.csv and budget.csv in the words of W3C CSV on the Web.
//! Must not hold a measured value: it describes, and carries what of the run fits no column.
//! Main function: [`csv_metadata`].

use serde_json::{Value as Json, json};

use crate::{
    phrase::{Saying, page::SIMULATED},
    record::sheet::{Instrument, Sheet},
};

/// How cells of text columns are escaped, for whoever reads the files with a program.
const ESCAPING: &str = "in columns of datatype string, text that begins (after any blanks) with one of = + - @, their full-width \
     forms, tab, carriage return, line feed or ' carries one ' in front; take one leading ' away to get the text back; numbers are never touched";

/// Name, datatype and meaning of each column of record.csv.
const RECORD: [(&str, &str, &str); 25] = [
    ("run_id", "string", "UUID version 7 of the run"),
    ("serial", "string", "serial number as scanned"),
    ("tube_type", "string", "name of the tube type"),
    ("grade", "string", "grade tried; empty: the bounds hold for all; first line: best grade left"),
    ("lot", "string", "lot"),
    ("station", "string", "name of the station"),
    ("technician", "string", "initials"),
    ("started_at", "dateTime", "start of the run, RFC 3339 with offset"),
    ("step", "string", "step of the recipe"),
    ("measurand", "string", "key of the measurand; `tube` in the first line: the verdict of the run"),
    ("value", "string", "number in `unit`; a word for looks; empty: see `note`"),
    ("unit", "string", "UCUM code of value, expanded_uncertainty, lower and upper; 1 for counts; empty for words"),
    ("expanded_uncertainty", "double", "for a coverage of 95.45 %"),
    ("coverage_factor", "double", "expanded over standard uncertainty"),
    ("lower", "double", "lower bound, the bound itself is inside"),
    ("upper", "double", "upper bound, the bound itself is inside"),
    ("wanted", "string", "words allowed, parted by |"),
    ("rule", "string", "decision rule: shared, guarded, or a least probability"),
    ("conformance_probability", "double", "probability that the true value is inside; empty where not computed"),
    ("verdict", "string", "first line: pass, fail, hold, stopped, open; else pass, fail, hold, not judged"),
    ("reject_code", "string", "reject code of a fail"),
    ("recipe_revision", "integer", "revision of the recipe"),
    ("limits_revision", "integer", "revision of the limits"),
    ("program_version", "string", "version of the program that opened the run"),
    ("note", "string", "reason for an absent value, remarks, doubts"),
];

/// Name, datatype and meaning of each column of budget.csv.
const BUDGET: [(&str, &str, &str); 8] = [
    ("measurand", "string", "key of the measurand"),
    ("source_id", "string", "lines that share it, in any measurand, run or tube, are fully correlated"),
    ("line", "string", "what it is"),
    ("type", "string", "A: from scatter; B: from anything else"),
    ("standard_uncertainty", "double", "of the input, in its own SI unit"),
    ("dof", "double", "degrees of freedom; empty: unlimited"),
    ("sensitivity", "double", "change of the result, SI, over change of the input, SI"),
    ("note", "string", "more words"),
];

/// The metadata, as indented JSON.
///
/// * `budget_sha256`, `record_sha256`: hashes of budget.csv and record.csv, hexadecimal.
pub fn csv_metadata(sheet: &Sheet, budget_sha256: &str, record_sha256: &str) -> Vec<u8> {
    let table = |url: &str, columns: &[(&str, &str, &str)], sha256: &str| {
        json!({
            "url": url,
            "tableSchema": { "columns": columns.iter().map(column).collect::<Vec<_>>() },
            "notes": [{ "sha256": sha256, "escaping": ESCAPING }],
        })
    };
    let whole = json!({
        "@context": ["http://www.w3.org/ns/csvw", { "@language": "en" }],
        "dc:title": format!("Record of tube {}", sheet.identity.serial),
        "dialect": { "encoding": "utf-8", "header": true, "delimiter": ",", "quoteChar": "\"", "doubleQuote": true,
            "lineTerminators": ["\r\n"] },
        "tables": [table("record.csv", &RECORD, record_sha256), table("budget.csv", &BUDGET, budget_sha256)],
        "notes": [run_notes(sheet)],
    });
    // Serializing plain JSON values cannot fail; an empty object would be seen at once.
    let mut text = serde_json::to_string_pretty(&whole).unwrap_or_else(|_| "{}".to_owned());
    text.push('\n');
    text.into_bytes()
}

fn column((name, datatype, meaning): &(&str, &str, &str)) -> Json {
    let mut column = json!({ "name": name, "titles": name, "dc:description": meaning, "datatype": datatype });
    if *datatype == "dateTime" {
        column["datatype"] = json!({ "base": "dateTime" });
    }
    if *datatype != "string" {
        column["null"] = json!("");
    }
    column
}

/// What of the run fits no column.
fn run_notes(sheet: &Sheet) -> Json {
    let who = &sheet.identity;
    let mut notes = json!({
        "run_id": who.run_id,
        "serial": who.serial,
        "title": sheet.title.english(),
        "supplier": who.supplier,
        "condition": who.condition,
        "received": who.received,
        "time_zone": who.time_zone,
        "simulated": who.simulated,
        "simulated_note": if who.simulated { SIMULATED.en } else { "" },
        "from_captures": who.from_captures,
        "ended_at": sheet.ended_at.map(|at| at.to_rfc3339()),
        "dwell_s": sheet.dwell.filter(|s| s.is_finite()),
        "recipe": { "revision": sheet.recipe.revision, "sha256": sheet.recipe.sha256 },
        "limits": { "revision": sheet.limits.revision, "sha256": sheet.limits.sha256 },
        "station_file": { "sha256": sheet.station_file.sha256 },
        "verdict": { "sentence": sheet.verdict.sentence.english(), "reason": sheet.verdict.reason.english() },
        "caution": sheet.caution.english(),
        "remarks": sheet.remarks.iter().map(Saying::english).collect::<Vec<_>>(),
        "measured_by": sheet.measured_by.as_ref().map(|by| json!({
            "initials": by.initials, "at": by.at.to_rfc3339(), "meaning": by.meaning.english() })),
        "instruments": sheet.instruments.iter().map(instrument).collect::<Vec<_>>(),
    });
    if let Some(repeat) = &who.repeats {
        notes["repeats"] = json!({ "run_id": repeat.run_id, "reason": repeat.reason });
    }
    notes
}

fn instrument(instrument: &Instrument) -> Json {
    json!({
        "role": instrument.role.english(),
        "what": instrument.what.english(),
        "certificate": instrument.certificate,
        "due": instrument.due.map(|day| day.to_string()),
        "overdue": instrument.overdue,
    })
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::report::{BUDGET_COLUMNS, RECORD_COLUMNS};

    #[test]
    fn describes_the_columns_that_are_written() {
        assert!(RECORD.iter().map(|(name, ..)| *name).eq(RECORD_COLUMNS));
        assert!(BUDGET.iter().map(|(name, ..)| *name).eq(BUDGET_COLUMNS));
    }
}
