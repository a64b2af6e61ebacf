//! Reads back what a frozen record says: the numbers of `record.csv`.
//! Must not judge them.
//! Main type: [`RecordLine`]; main function: [`read_record`].

use std::{
    io::{Error, ErrorKind},
    path::Path,
};

use super::{DiskError, folder::RECORD};

/// One line of `record.csv`.
#[derive(Debug, Clone, PartialEq)]
pub struct RecordLine {
    /// Measurand's key; `tube` on the first line.
    pub measurand: String,
    /// Value in the unit of the catalogue; none where it is empty or a word.
    pub value: Option<f64>,
    /// Verdict, as a word.
    pub verdict: String,
}

/// The lines of a run's `record.csv`, the tube's first.
///
/// Errors: it cannot be read, or has no such columns.
pub fn read_record(run: &Path) -> Result<Vec<RecordLine>, DiskError> {
    let path = run.join(RECORD);
    let bytes = std::fs::read(&path).map_err(DiskError::io("read", &path))?;
    lines(&bytes).map_err(|what| DiskError::io("read", &path)(Error::new(ErrorKind::InvalidData, what)))
}

fn lines(bytes: &[u8]) -> Result<Vec<RecordLine>, String> {
    let mut reader = csv::Reader::from_reader(bytes);
    let head = reader.headers().map_err(|error| error.to_string())?.clone();
    let column = |name: &str| head.iter().position(|column| column == name).ok_or(format!("it has no column `{name}`"));
    let (measurand, value, verdict) = (column("measurand")?, column("value")?, column("verdict")?);
    let line = |record: csv::Result<csv::StringRecord>| {
        let record = record.map_err(|error| error.to_string())?;
        let cell = |index: usize| record.get(index).unwrap_or_default();
        Ok(RecordLine {
            measurand: cell(measurand).to_owned(),
            value: cell(value).parse().ok().filter(|value: &f64| value.is_finite()),
            verdict: cell(verdict).to_owned(),
        })
    };
    reader.records().map(line).collect()
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used)]
    use super::*;

    #[test]
    fn numbers_words_and_what_is_no_record() {
        let text =
            b"run_id,measurand,value,verdict\r\nr,tube,,pass\r\nr,power,0.91,pass\r\nr,visual.getter,bright,\r\n";
        let read = lines(text).unwrap();
        let values: Vec<_> = read.iter().map(|line| (line.measurand.as_str(), line.value)).collect();
        assert_eq!(values, [("tube", None), ("power", Some(0.91)), ("visual.getter", None)]);
        assert_eq!(read[0].verdict, "pass");
        assert!(lines(b"a,b\n1,2\n").unwrap_err().contains("no column `measurand`"));
        assert!(lines(b"measurand,value,verdict\n1,2\n").is_err(), "a torn line");
    }
}
