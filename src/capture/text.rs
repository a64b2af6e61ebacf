//! Lines, cells and numbers of a text of any line end, separator and decimal mark.
//! Must not know what a column means.
//! Main types: [`Lines`], [`Dialect`], [`Cell`].

/// A line without its end.
#[derive(Debug, Clone, Copy)]
pub(super) struct Line<'a> {
    /// From 1.
    pub number: usize,
    /// Byte offset of its first byte.
    pub start: usize,
    pub text: &'a [u8],
}

/// Lines of bytes; `\n`, `\r\n` and a lone `\r` all end one.
#[derive(Debug, Clone)]
pub(super) struct Lines<'a> {
    bytes: &'a [u8],
    at: usize,
    number: usize,
}

impl<'a> Lines<'a> {
    pub fn new(bytes: &'a [u8]) -> Self {
        Self { bytes, at: 0, number: 0 }
    }
}

impl<'a> Iterator for Lines<'a> {
    type Item = Line<'a>;

    fn next(&mut self) -> Option<Line<'a>> {
        let rest = self.bytes.get(self.at..).filter(|rest| !rest.is_empty())?;
        let length = rest.iter().position(|&b| b == b'\n' || b == b'\r').unwrap_or(rest.len());
        let start = self.at;
        self.number += 1;
        self.at += length + line_end(&rest[length..]);
        Some(Line { number: self.number, start, text: &rest[..length] })
    }
}

/// Bytes of the line end that `rest` begins with.
fn line_end(rest: &[u8]) -> usize {
    match rest {
        [b'\r', b'\n', ..] => 2,
        [b'\r' | b'\n', ..] => 1,
        _ => 0,
    }
}

/// What stands between cells.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Separator {
    Byte(u8),
    /// Any run of spaces and tabs.
    Blanks,
}

/// How cells and numbers are written.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) struct Dialect {
    pub separator: Separator,
    pub decimal_comma: bool,
}

impl Dialect {
    /// The cells of a line, trimmed.
    pub fn cells(self, line: &[u8]) -> impl Iterator<Item = &[u8]> {
        let blanks = self.separator == Separator::Blanks;
        let line = if blanks { line.trim_ascii() } else { line };
        line.split(move |&b| match self.separator {
            Separator::Byte(separator) => b == separator,
            Separator::Blanks => b == b' ' || b == b'\t',
        })
        .filter(move |cell| !blanks || !cell.is_empty())
        .map(unquoted)
    }

    /// What a cell holds.
    pub fn classify(self, cell: &[u8]) -> Cell {
        let cell = unquoted(cell);
        if cell.is_empty() {
            return Cell::Blank;
        }
        match number(cell, self.decimal_comma) {
            Some(value) if value.abs() < TOO_LARGE => Cell::Number(value),
            Some(_) => Cell::NotFinite,
            None if is_not_finite_word(cell) => Cell::NotFinite,
            None => Cell::Text,
        }
    }
}

/// Digitizers mark an invalid sample by 9.9e37 (SCPI 1999, volume 1, 7.2.1; from memory); no volt or second is that large.
pub(super) const TOO_LARGE: f64 = 1e30;

/// What a cell holds.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) enum Cell {
    Number(f64),
    Blank,
    /// `nan`, `inf`, or [`TOO_LARGE`].
    NotFinite,
    Text,
}

/// A cell without blanks and one pair of quotes around it.
fn unquoted(cell: &[u8]) -> &[u8] {
    let cell = cell.trim_ascii();
    match cell {
        [b'"', inner @ .., b'"'] => inner.trim_ascii(),
        _ => cell,
    }
}

fn is_not_finite_word(cell: &[u8]) -> bool {
    let word = cell.strip_prefix(b"-").or(cell.strip_prefix(b"+")).unwrap_or(cell);
    ["nan", "inf", "infinity"].iter().any(|known| word.eq_ignore_ascii_case(known.as_bytes()))
}

/// A decimal number that fills the whole cell; with `decimal_comma` one comma may stand for the point.
pub(super) fn number(cell: &[u8], decimal_comma: bool) -> Option<f64> {
    let digits = cell.strip_prefix(b"+").unwrap_or(cell);
    // `inf` and `nan` are words here, not numbers; a second sign is none either.
    let first = digits.strip_prefix(b"-").unwrap_or(digits).first()?;
    if !(first.is_ascii_digit() || *first == b'.' || (decimal_comma && *first == b',')) {
        return None;
    }
    if digits.len() < cell.len() && digits.first() == Some(&b'-') {
        return None;
    }
    if !decimal_comma {
        return fast_float2::parse(digits).ok();
    }
    // A comma that ends the cell is a separator left over, not a decimal mark.
    if digits.ends_with(b",") {
        return None;
    }
    let mut copy = [0_u8; 48];
    let copy = copy.get_mut(..digits.len())?;
    copy.copy_from_slice(digits);
    for byte in copy.iter_mut() {
        match byte {
            b',' => *byte = b'.',
            b'.' => return None,
            _ => {}
        }
    }
    fast_float2::parse(&*copy).ok()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn any_line_end_ends_a_line() {
        let lines: Vec<_> = Lines::new(b"a\nb\r\nc\rd\n\ne").map(|l| (l.number, l.text.to_vec())).collect();
        let want: Vec<(usize, Vec<u8>)> =
            [(1, "a"), (2, "b"), (3, "c"), (4, "d"), (5, ""), (6, "e")].map(|(n, t)| (n, t.into())).to_vec();
        assert_eq!(lines, want);
    }

    #[test]
    fn numbers_as_exports_write_them() {
        let plain = |t: &str| number(t.as_bytes(), false);
        assert_eq!(plain("+11.5E-03"), Some(0.0115));
        assert_eq!(plain("-00.0086"), Some(-0.0086));
        assert_eq!(plain("12,5"), None);
        assert_eq!(plain("+-1"), None);
        assert_eq!(plain("nan"), None);
        assert_eq!(plain("1.0X"), None);
        assert_eq!(number(b"-12,5e-1", true), Some(-1.25));
        assert_eq!(number(b",5", true), Some(0.5));
        assert_eq!(number(&[b'1'; 400], true), None, "longer than any number an export writes");
    }

    #[test]
    fn cells_by_each_separator() {
        let cells = |s, line: &str| {
            Dialect { separator: s, decimal_comma: false }
                .cells(line.as_bytes())
                .map(|c| String::from_utf8_lossy(c).into_owned())
                .collect::<Vec<_>>()
        };
        assert_eq!(cells(Separator::Byte(b','), "a, \"b\" ,,"), ["a", "b", "", ""]);
        assert_eq!(cells(Separator::Blanks, "  1   2\t3 "), ["1", "2", "3"]);
    }
}
