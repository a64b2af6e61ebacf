//! A sheet turned into what leaves the house: record.csv, budget.csv with their metadata, and record.pdf.
//! Must not open a file, read a clock or decide anything: every verdict comes in with the sheet.
//! Main functions: [`record_csv`], [`budget_csv`], [`csv_metadata`], [`record_pdf`], [`value_text`].

mod bench;
mod charts;
mod csv;
mod escape;
mod metadata;
mod page;
mod pdf;
mod read;
mod reason;
pub mod scene;
mod text;
mod typeface;

pub use self::bench::{BenchChart, BenchPoint, BenchTitle, bench_csv, bench_pdf};
pub use self::csv::{BUDGET_COLUMNS, RECORD_COLUMNS, budget_csv, record_csv};
pub use self::escape::{neutralise, restore};
pub use self::metadata::csv_metadata;
pub use self::page::{CountBox, InBox, Page, Part, RowScale, boxes, telling};
pub use self::pdf::PdfError;
pub use self::read::{ReadRecord, ReadValue, hashes_in, read_record};
pub use self::text::{ValueText, bound_text, probability_text, row_line, value_text};

use self::typeface::Typeface;
use crate::{
    phrase::{Saying, name, page as phrases},
    record::sheet::Sheet,
};

/// The remarks that say more than that the bench is simulated, which has its own place in every paper.
fn remarks(sheet: &Sheet) -> impl Iterator<Item = &Saying> {
    sheet.remarks.iter().filter(|remark| remark.english().trim_end_matches('.') != phrases::SIMULATED.en)
}

/// The sheet laid out, page by page and part by part, before it becomes a PDF or anything else.
///
/// * `record_sha256`: SHA-256 of record.csv, hexadecimal; shown at the foot.
///
/// Errors only if the program's own typeface is damaged.
pub fn sheet_pages(sheet: &Sheet, record_sha256: &str) -> Result<Vec<Page>, PdfError> {
    Ok(page::pages(sheet, &Typeface::embedded(sheet.language()).ok_or(PdfError::Typeface)?, record_sha256))
}

/// record.pdf: the sheet on A4 with record.csv inside it; the same sheet gives the same bytes.
///
/// * `record_sha256`: SHA-256 of record.csv, hexadecimal; shown at the foot, and the id of the document.
pub fn record_pdf(sheet: &Sheet, record_sha256: &str) -> Result<Vec<u8>, PdfError> {
    let language = sheet.language();
    let face = &Typeface::embedded(language).ok_or(PdfError::Typeface)?;
    let scenes: Vec<_> = page::pages(sheet, face, record_sha256).iter().map(Page::scene).collect();
    let who = &sheet.identity;
    let title = phrases::RECORD_OF.with([name(who.serial.as_str())]).text(language);
    let about = pdf::About {
        language: language.code(),
        title: if who.simulated { format!("{title}. {}", phrases::SIMULATED.of(language)) } else { title },
        program: format!("tubewright {}", who.program_version),
        date: sheet.ended_at.or(sheet.started_at),
        id: document_id(record_sha256, &who.run_id),
        attached: ("record.csv", "text/csv", record_csv(sheet)),
    };
    pdf::write(&scenes, face, about)
}

/// Sixteen bytes from the hash of the record, or from the run's id where there is no hash.
fn document_id(record_sha256: &str, run_id: &str) -> Vec<u8> {
    let bytes = |text: &str| text.bytes().filter(u8::is_ascii_hexdigit).take(32).collect::<Vec<u8>>();
    let digits = if record_sha256.len() >= 32 { bytes(record_sha256) } else { bytes(run_id) };
    let value = |digit: u8| (digit as char).to_digit(16).unwrap_or(0) as u8;
    let mut id: Vec<u8> =
        digits.chunks(2).map(|pair| pair.iter().fold(0, |byte, &digit| byte << 4 | value(digit))).collect();
    id.resize(16, 0);
    id
}
