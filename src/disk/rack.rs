//! The rack: which tubes burn there since when, in one small file beside the records.
//! Must not keep a tube that was taken.
//! Main type: [`Rack`].

use std::{
    collections::BTreeMap,
    io::{Error, ErrorKind},
    path::{Path, PathBuf},
};

use super::{
    DiskError,
    atomic::{create_folder, write_atomic},
};

/// Name of the file.
const FILE: &str = "rack.json";

/// The tubes that burn in a rack.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Rack {
    path: PathBuf,
    tubes: BTreeMap<String, String>,
}

impl Rack {
    /// Reads the rack of a folder of records; empty where there is no file.
    pub fn read(reports: &Path) -> Result<Self, DiskError> {
        let path = reports.join(FILE);
        let tubes = match std::fs::read(&path) {
            Ok(bytes) => serde_json::from_slice(&bytes)
                .map_err(|error| DiskError::io("read", &path)(Error::new(ErrorKind::InvalidData, error.to_string())))?,
            Err(error) if error.kind() == ErrorKind::NotFound => BTreeMap::new(),
            Err(error) => return Err(DiskError::io("read", &path)(error)),
        };
        Ok(Self { path, tubes })
    }

    /// (serial, since when it burns: RFC 3339), in the order of the serials.
    pub fn tubes(&self) -> impl Iterator<Item = (&str, &str)> {
        self.tubes.iter().map(|(serial, since)| (serial.as_str(), since.as_str()))
    }

    /// Since when a tube burns, if it is in the rack.
    pub fn since(&self, serial: &str) -> Option<&str> {
        self.tubes.get(serial).map(String::as_str)
    }

    /// Puts tubes in and takes tubes out, and stores the rack whole or not at all.
    pub fn change(&mut self, put: &[(String, String)], take: &[String]) -> Result<(), DiskError> {
        self.tubes.extend(put.iter().cloned());
        self.tubes.retain(|serial, _| !take.contains(serial));
        let text = serde_json::to_vec_pretty(&self.tubes).map_err(|error| DiskError::Json(error.to_string()))?;
        if let Some(folder) = self.path.parent() {
            create_folder(folder)?;
        }
        write_atomic(&self.path, &text)
    }
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used)]
    use super::*;

    #[test]
    fn what_is_put_in_is_there_until_it_is_taken() {
        let folder = tempfile::tempdir().unwrap();
        let reports = folder.path().join("reports");
        let pair = |serial: &str| (serial.to_owned(), "2026-03-02T07:40:00+00:00".to_owned());
        Rack::read(&reports).unwrap().change(&[pair("a/b"), pair("c")], &[]).unwrap();
        let mut rack = Rack::read(&reports).unwrap();
        assert_eq!(rack.since("a/b"), Some("2026-03-02T07:40:00+00:00"));
        rack.change(&[], &["a/b".to_owned()]).unwrap();
        assert_eq!(Rack::read(&reports).unwrap().tubes().map(|(serial, _)| serial).collect::<Vec<_>>(), ["c"]);
        std::fs::write(reports.join(FILE), b"[]").unwrap();
        assert!(Rack::read(&reports).unwrap_err().to_string().contains("rack.json"));
    }
}
