//! Which column is which channel, as a person says it.
//! Must not look at data.
//! Main type: [`Columns`].

use std::str::FromStr;

use super::error::CaptureError;

/// One column, from 1, perhaps in a file of its own.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Place {
    /// The file's name, its last part, or the end of that without its extension (`CH2` for `F0001CH2.CSV`); `None`: the
    /// first file.
    pub file: Option<String>,
    /// From 1.
    pub column: usize,
}

/// Which column is which channel: `time=1,ramp=2,photodiode=3,crossed=4`, or `ramp=FILE:2`.
///
/// Any may be absent but the photodiode. Where the time is absent it comes from the header, else from the first column
/// that runs as time does.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Columns {
    /// Time stamps.
    pub time: Option<Place>,
    /// Ramp volts.
    pub ramp: Option<Place>,
    /// Photodiode volts.
    pub photodiode: Place,
    /// Volts of the second photodiode, behind the crossed polarizer.
    pub crossed: Option<Place>,
}

impl FromStr for Columns {
    type Err = CaptureError;

    fn from_str(text: &str) -> Result<Self, CaptureError> {
        let fault = |fault: String| CaptureError::Columns { text: text.to_owned(), fault };
        let (mut time, mut ramp, mut photodiode, mut crossed) = (None, None, None, None);
        for part in text.split(',') {
            let (role, place) = part.split_once('=').ok_or_else(|| fault(format!("`{}` has no `=`", part.trim())))?;
            let slot = match role.trim() {
                "time" => &mut time,
                "ramp" => &mut ramp,
                "photodiode" => &mut photodiode,
                "crossed" => &mut crossed,
                other => return Err(fault(format!("`{other}` is no channel"))),
            };
            if slot.is_some() {
                return Err(fault(format!("`{}` is named twice", role.trim())));
            }
            *slot = Some(place_of(place.trim()).ok_or_else(|| fault(format!("`{}` is no column", place.trim())))?);
        }
        let photodiode = photodiode.ok_or_else(|| fault("the photodiode is not named".to_owned()))?;
        Ok(Self { time, ramp, photodiode, crossed })
    }
}

fn place_of(text: &str) -> Option<Place> {
    let (file, column) = match text.rsplit_once(':') {
        Some((file, column)) => (Some(file.trim()), column.trim()),
        None => (None, text),
    };
    if file.is_some_and(str::is_empty) {
        return None;
    }
    let column = column.parse().ok().filter(|&column| column >= 1)?;
    Some(Place { file: file.map(str::to_owned), column })
}

impl Place {
    /// Index of the file meant among `names`.
    pub(super) fn file_index(&self, names: &[&str], role: &'static str) -> Result<usize, CaptureError> {
        let Some(wanted) = &self.file else { return Ok(0) };
        let last = |name: &str| name.rsplit(['/', '\\']).next().unwrap_or_default().to_lowercase();
        let (part, whole) = (last(wanted), wanted.as_str());
        let stem_ends = |name: &str| {
            let last = last(name);
            last.rsplit_once('.').map_or(last.as_str(), |(stem, _)| stem).ends_with(&part)
        };
        (names.iter().position(|name| *name == whole))
            .or_else(|| names.iter().position(|name| last(name) == part))
            .or_else(|| names.iter().position(|name| !part.is_empty() && stem_ends(name)))
            .ok_or_else(|| CaptureError::NoSuchFile { wanted: wanted.clone(), role, there: names.join(", ") })
    }
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used)]
    use super::*;

    #[test]
    fn reads_columns() {
        let columns: Columns = "time=1, ramp=a.csv:2,photodiode=3".parse().unwrap();
        assert_eq!(columns.ramp, Some(Place { file: Some("a.csv".into()), column: 2 }));
        assert_eq!((columns.photodiode.column, columns.crossed), (3, None));
        for (bad, why) in [
            ("time=1", "photodiode is not named"),
            ("photodiode", "has no `=`"),
            ("photodiode=0", "`0` is no column"),
            ("photodiode=:2", "is no column"),
            ("photodiode=1,photodiode=2", "named twice"),
            ("photodiode=1,light=2", "`light` is no channel"),
        ] {
            let text = bad.parse::<Columns>().unwrap_err().to_string();
            assert!(text.contains(why), "{bad}: {text}");
        }
    }

    #[test]
    fn finds_the_file_meant() {
        let place = |file: &str| Place { file: Some(file.into()), column: 1 };
        let names = ["in/F0001CH1.CSV", "in/F0001CH2.CSV"];
        assert_eq!(place("CH2").file_index(&names, "ramp"), Ok(1));
        assert_eq!(place("F0001CH1.CSV").file_index(&names, "ramp"), Ok(0));
        assert_eq!(place("in/F0001CH2.CSV").file_index(&names, "ramp"), Ok(1));
        assert!(place("CH3").file_index(&names, "ramp").is_err());
    }
}
