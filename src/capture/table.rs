//! Reads the columns of numbers in one pass over the bytes.
//! Must not allocate a line or a cell, nor know what a column means.
//! Main function: [`read_columns`].

use super::{
    decimal,
    layout::{Layout, is_content},
    text::{Cell, Dialect, Lines, Separator, TOO_LARGE},
};

/// Reads every column of numbers. A cell without a finite number gives NaN, so that every column has one value a line.
pub(super) fn read_columns(bytes: &[u8], layout: &Layout) -> Vec<Vec<f64>> {
    let body = bytes.get(layout.start..).unwrap_or_default();
    let mut columns: Vec<Vec<f64>> = layout.columns.iter().map(|_| Vec::with_capacity(rows_in(body))).collect();
    let mut at = 0;
    while at < body.len() {
        at = read_line(body, at, layout, &mut columns);
    }
    columns
}

/// Bytes looked at to learn how long a line is.
const SAMPLED: usize = 1 << 16;

/// How many lines to make room for, from those at the end, a little generously: growing would copy what was read.
fn rows_in(body: &[u8]) -> usize {
    let end = body.get(body.len().saturating_sub(SAMPLED)..).unwrap_or_default();
    let lines = end.iter().filter(|&&b| b == b'\n').count().max(end.iter().filter(|&&b| b == b'\r').count()) + 1;
    let rows = lines as f64 * body.len() as f64 / end.len().max(1) as f64;
    (1.02 * rows) as usize + 16
}

fn is_end(byte: u8) -> bool {
    byte == b'\n' || byte == b'\r'
}

/// Reads one line from `at`; returns the offset of the next.
fn read_line(body: &[u8], mut at: usize, layout: &Layout, columns: &mut [Vec<f64>]) -> usize {
    let blanks = layout.dialect.separator == Separator::Blanks;
    at = skip_blanks(body, at, true);
    match body.get(at) {
        None => return at,
        Some(&b) if is_end(b) => return at + 1,
        Some(b'#') => return skip_line(body, at),
        Some(_) => {}
    }
    // With another separator than blanks a leading tab may be an empty cell.
    if layout.dialect.separator == Separator::Byte(b'\t') {
        while at > 0 && body[at - 1] == b'\t' {
            at -= 1;
        }
    }
    let mut wanted = 0;
    let mut column = 0;
    while let Some(&target) = layout.columns.get(wanted) {
        if column == target {
            let (value, end) = read_cell(body, at, layout.dialect);
            columns[wanted].push(value);
            at = end;
            wanted += 1;
        } else {
            at = cell_end(body, at, layout.dialect.separator);
        }
        if blanks {
            at = skip_blanks(body, at, true);
        }
        match body.get(at) {
            Some(&b) if !is_end(b) => at += usize::from(!blanks),
            _ => break,
        }
        column += 1;
    }
    for column in &mut columns[wanted..] {
        column.push(f64::NAN);
    }
    skip_line(body, at)
}

fn skip_blanks(body: &[u8], mut at: usize, tabs: bool) -> usize {
    while matches!(body.get(at), Some(b' ')) || (tabs && matches!(body.get(at), Some(b'\t'))) {
        at += 1;
    }
    at
}

fn skip_line(body: &[u8], at: usize) -> usize {
    let rest = body.get(at..).unwrap_or_default();
    // The line's last wanted cell usually ends it: look before searching.
    at + rest.iter().position(|&b| is_end(b)).map_or(rest.len(), |end| end + 1)
}

fn is_separator(byte: u8, separator: Separator) -> bool {
    match separator {
        Separator::Byte(separator) => byte == separator,
        Separator::Blanks => byte == b' ' || byte == b'\t',
    }
}

/// Offset of the separator or line end after `at`.
fn cell_end(body: &[u8], at: usize, separator: Separator) -> usize {
    let rest = body.get(at..).unwrap_or_default();
    at + rest.iter().position(|&b| is_separator(b, separator) || is_end(b)).unwrap_or(rest.len())
}

/// Reads the cell at `at`: its number or NaN, and the offset of the separator or line end after it.
fn read_cell(body: &[u8], at: usize, dialect: Dialect) -> (f64, usize) {
    let mark = if dialect.decimal_comma { b',' } else { b'.' };
    if let Some((value, end)) = decimal::plain(body, at, mark)
        && body.get(end).is_some_and(|&b| is_separator(b, dialect.separator) || is_end(b))
        && value.abs() < TOO_LARGE
    {
        return (value, end);
    }
    if !dialect.decimal_comma {
        let tabs = dialect.separator == Separator::Byte(b',');
        let start = skip_blanks(body, at, tabs);
        let rest = body.get(start..).unwrap_or_default();
        if let Ok((value, used)) = fast_float2::parse_partial::<f64, _>(rest) {
            let end = skip_blanks(body, start + used, tabs);
            let closed = body.get(end).is_none_or(|&b| is_separator(b, dialect.separator) || is_end(b))
                || (dialect.separator == Separator::Blanks && end > start + used);
            if closed && value.abs() < TOO_LARGE {
                return (value, if dialect.separator == Separator::Blanks { start + used } else { end });
            }
        }
    }
    let end = cell_end(body, at, dialect.separator);
    match dialect.classify(&body[at..end]) {
        Cell::Number(value) => (value, end),
        Cell::Blank | Cell::NotFinite | Cell::Text => (f64::NAN, end),
    }
}

/// Line number and text of the cell in `row` (from 0) and `column` (from 0): for errors, so it may be slow.
pub(super) fn locate(bytes: &[u8], layout: &Layout, row: usize, column: usize) -> (usize, String) {
    let body = bytes.get(layout.start..).unwrap_or_default();
    let line = Lines::new(body).filter(|line| is_content(line.text)).nth(row);
    let Some(line) = line else { return (layout.first_line, String::new()) };
    let cell = layout.dialect.cells(line.text).nth(column).unwrap_or_default();
    let text: String = String::from_utf8_lossy(cell).chars().filter(|c| !c.is_control()).take(24).collect();
    (layout.first_line + line.number - 1, text)
}
