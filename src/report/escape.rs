//! Neutralises text that a spreadsheet would run as a formula, and takes it back.
//! Must not touch numbers: only text columns go through here.
//! Main functions: [`neutralise`], [`restore`].

/// Starts that make common spreadsheets read a cell as a formula (common practice), full-width forms included; and the
/// apostrophe itself, so that [`restore`] needs no guess.
const STARTS: &[char] = &['=', '+', '-', '@', '\t', '\r', '\n', '\'', '＝', '＋', '－', '＠'];

/// Puts an apostrophe before text that starts, after any blanks, like a formula.
///
/// Reversible: a cell that begins with `'` always lost nothing but that one character, see [`restore`].
pub fn neutralise(text: &str) -> String {
    let first = text.chars().next();
    let first_visible = text.trim_start().chars().next();
    if [first, first_visible].into_iter().flatten().any(|c| STARTS.contains(&c)) {
        format!("'{text}")
    } else {
        text.to_owned()
    }
}

/// The inverse of [`neutralise`]: takes one leading apostrophe away.
pub fn restore(cell: &str) -> &str {
    cell.strip_prefix('\'').unwrap_or(cell)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn formula_starts_are_marked_and_come_back() {
        for text in ["=1+1", "+1", "-1", "@x", "\tx", "\rx", "\nx", "'x", "''x", "'=x", "  =x", "＝x", " 'x"] {
            let cell = neutralise(text);
            assert!(cell.starts_with('\''), "{text:?}");
            assert_eq!(restore(&cell), text);
        }
    }

    #[test]
    fn plain_text_is_left_alone() {
        for text in ["", "DEMO-0001", "a=b", "KT", "µm", " x", "«»", "x'"] {
            assert_eq!(neutralise(text), text);
            assert_eq!(restore(text), text);
        }
    }
}
