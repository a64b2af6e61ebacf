//! A finished sheet becomes the four files of its record.
//! Must not change the sheet.
//! Main function: [`freeze`].

use sha2::{Digest as _, Sha256};

use crate::cli::{Ending, Failure};
use crate::disk::{Frozen, RunFolder};
use crate::record::sheet::Sheet;
use crate::report;

/// Makes all four files before the first is written, so that a failure of one leaves none.
pub(super) fn freeze(folder: &mut RunFolder, sheet: &Sheet) -> Result<(), Failure> {
    let record_csv = report::record_csv(sheet);
    let budget_csv = report::budget_csv(sheet);
    let record_sha256 = sha256_hex(&record_csv);
    let metadata_json = report::csv_metadata(sheet, &sha256_hex(&budget_csv), &record_sha256);
    let record_pdf = report::record_pdf(sheet, &record_sha256)
        .map_err(|error| Failure::new(Ending::Store, format!("failed to make the PDF of the record: {error}")))?;
    let frozen = Frozen { record_csv, budget_csv, metadata_json, record_pdf };
    folder.freeze(&frozen).map_err(|error| Failure::store(&error))
}

fn sha256_hex(bytes: &[u8]) -> String {
    Sha256::digest(bytes).iter().map(|byte| format!("{byte:02x}")).collect()
}
