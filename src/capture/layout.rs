//! Finds where the samples are: separator, columns of numbers, first line of samples.
//! Must not read the samples themselves.
//! Main type: [`Layout`].

use super::{
    error::CaptureError,
    text::{Cell, Dialect, Line, Lines, Separator},
};

/// Lines looked at to learn the dialect. Enough that a few odd ones do not matter.
const PROBES: usize = 64;
/// Successive lines of numbers that make the start of the samples; a header holds at most two (found in real exports).
const RUN: usize = 3;

/// Where the samples are.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Layout {
    pub dialect: Dialect,
    /// Columns that hold numbers, from 0, ascending.
    pub columns: Vec<usize>,
    /// Cells in the longest line looked at.
    pub width: usize,
    /// Byte offset of the first line of samples.
    pub start: usize,
    /// Its number, from 1.
    pub first_line: usize,
}

/// Finds the layout of an export.
///
/// Method:
/// 1. Take up to 64 lines evenly from the last three quarters of the bytes, where headers are over.
/// 2. Of tab, semicolon, comma, blanks take the separator that leaves the largest part of the cells as numbers.
/// 3. A column is one of numbers if at least half of these lines have a number there.
/// 4. Samples start at the first line that, with the two after it, has numbers and no text in those columns.
pub(super) fn find(bytes: &[u8]) -> Result<Layout, CaptureError> {
    if bytes.trim_ascii().is_empty() {
        return Err(CaptureError::Empty);
    }
    if bytes.starts_with(&[0xFF, 0xFE]) || bytes.starts_with(&[0xFE, 0xFF]) {
        return Err(CaptureError::Utf16);
    }
    let none = || CaptureError::NoNumbers { lines: Lines::new(bytes).count() };
    let probes = probes(bytes);
    let dialect = dialect(&probes).ok_or_else(none)?;
    let (columns, width) = numeric_columns(&probes, dialect);
    if columns.is_empty() {
        return Err(none());
    }
    let first = first_sample(bytes, dialect, &columns).ok_or_else(none)?;
    Ok(Layout { dialect, columns, width, start: first.start, first_line: first.number })
}

/// Whole lines taken evenly from the last three quarters.
fn probes(bytes: &[u8]) -> Vec<&[u8]> {
    let from = bytes.len() / 4;
    let mut probes: Vec<Line<'_>> = Vec::with_capacity(PROBES);
    for k in 0..PROBES {
        let at = from + (bytes.len() - from) * k / PROBES;
        // The first line from here is a fragment unless it starts the text.
        let skip = usize::from(at > 0);
        let lines = Lines::new(&bytes[at..]).skip(skip).filter(|line| is_content(line.text));
        if let Some(line) = lines.map(|line| Line { start: line.start + at, ..line }).next()
            && probes.last().is_none_or(|last| last.start != line.start)
        {
            probes.push(line);
        }
    }
    if probes.is_empty() {
        probes.extend(Lines::new(bytes).filter(|line| is_content(line.text)).take(1));
    }
    probes.iter().map(|line| line.text).collect()
}

/// Neither blank nor a comment.
pub(super) fn is_content(line: &[u8]) -> bool {
    line.iter().find(|&&b| b != b' ' && b != b'\t').is_some_and(|&b| b != b'#')
}

fn dialect(probes: &[&[u8]]) -> Option<Dialect> {
    let candidates = [
        (Separator::Byte(b'\t'), true),
        (Separator::Byte(b';'), true),
        (Separator::Byte(b','), false),
        (Separator::Blanks, true),
    ];
    let mut best: Option<(f64, Dialect)> = None;
    for (separator, may_be_comma) in candidates {
        for decimal_comma in [false, true] {
            let dialect = Dialect { separator, decimal_comma };
            if (decimal_comma && !may_be_comma) || !occurs(probes, separator) {
                continue;
            }
            let score = score(probes, dialect);
            if score > best.map_or(0.0, |(best, _)| best) {
                best = Some((score, dialect));
            }
        }
    }
    best.map(|(_, dialect)| dialect)
}

/// Whether at least half the lines have the separator; blanks may be absent where there is one column alone.
fn occurs(probes: &[&[u8]], separator: Separator) -> bool {
    match separator {
        Separator::Byte(byte) => 2 * probes.iter().filter(|line| line.contains(&byte)).count() >= probes.len(),
        Separator::Blanks => true,
    }
}

/// Part of the cells that are numbers, blanks left out; 0 without any number.
fn score(probes: &[&[u8]], dialect: Dialect) -> f64 {
    let (mut numbers, mut others) = (0_usize, 0_usize);
    for cell in probes.iter().flat_map(|line| dialect.cells(line)) {
        match dialect.classify(cell) {
            Cell::Number(_) => numbers += 1,
            Cell::Blank => {}
            Cell::NotFinite | Cell::Text => others += 1,
        }
    }
    numbers as f64 / (numbers + others).max(1) as f64
}

fn numeric_columns(probes: &[&[u8]], dialect: Dialect) -> (Vec<usize>, usize) {
    let mut counts: Vec<usize> = Vec::new();
    for line in probes {
        for (column, cell) in dialect.cells(line).enumerate() {
            if counts.len() <= column {
                counts.resize(column + 1, 0);
            }
            counts[column] += usize::from(matches!(dialect.classify(cell), Cell::Number(_)));
        }
    }
    let enough = |count: usize| count > 0 && 2 * count >= probes.len();
    let columns = counts.iter().enumerate().filter(|&(_, &count)| enough(count)).map(|(column, _)| column).collect();
    (columns, counts.len())
}

/// The first of three successive lines with numbers and no text in the columns of numbers.
fn first_sample<'a>(bytes: &'a [u8], dialect: Dialect, columns: &[usize]) -> Option<Line<'a>> {
    let mut run: Option<(Line<'a>, usize)> = None;
    for line in Lines::new(bytes).filter(|line| is_content(line.text)) {
        run = match (is_sample(line.text, dialect, columns), run) {
            (true, Some((first, count))) => Some((first, count + 1)),
            (true, None) => Some((line, 1)),
            (false, _) => None,
        };
        if let Some((first, RUN)) = run {
            return Some(first);
        }
    }
    None
}

fn is_sample(line: &[u8], dialect: Dialect, columns: &[usize]) -> bool {
    let mut any = false;
    for (column, cell) in dialect.cells(line).enumerate() {
        if columns.binary_search(&column).is_ok() {
            match dialect.classify(cell) {
                Cell::Text => return false,
                Cell::Number(_) => any = true,
                Cell::Blank | Cell::NotFinite => {}
            }
        }
    }
    any
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used)]
    use super::*;

    #[test]
    fn decimal_comma_with_semicolons() {
        let layout = find(b"t;u\n0,1;1,5\n0,2;2,5\n0,3;3,5\n0,4;4,5\n").unwrap();
        assert_eq!(layout.dialect, Dialect { separator: Separator::Byte(b';'), decimal_comma: true });
        assert_eq!((layout.columns, layout.first_line), (vec![0, 1], 2));
    }

    #[test]
    fn keys_beside_the_samples_are_no_column() {
        let mut text = String::from("Length,40,,0.0,1.5\nInterval,1e-3,s,0.1,1.5\n");
        for k in 2..40 {
            text += &format!(",,,0.{k},1.5\n");
        }
        let layout = find(text.as_bytes()).unwrap();
        assert_eq!((layout.columns, layout.first_line), (vec![3, 4], 1));
    }
}
