//! A fault in a file that a person wrote: where it stands, what was found, what was expected, the nearest known word.
//! Must not know what any file means.
//! Main type: [`Fault`].

use std::fmt;

/// One fault. Its `Display` is what `check` prints.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Fault {
    /// Name of the file as it was given.
    pub file: String,
    /// Line, from 1.
    pub line: usize,
    /// Column in characters, from 1.
    pub column: usize,
    /// What was found, then what was expected.
    pub message: String,
    /// The known word that looks most like the one found.
    pub nearest: Option<String>,
}

impl Fault {
    /// A fault of a file as a whole: it stands at the file's beginning.
    pub fn of_file(file: &str, message: impl Into<String>) -> Self {
        Self { file: file.to_owned(), line: 1, column: 1, message: message.into(), nearest: None }
    }
}

impl fmt::Display for Fault {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "{}:{}:{}: {}", self.file, self.line, self.column, self.message)?;
        match &self.nearest {
            Some(word) => write!(f, "\n  nearest known word: {word}"),
            None => Ok(()),
        }
    }
}

/// The known word nearest to a found one, if any is near enough to be worth saying.
///
/// Near enough: at most half of the longer word's letters differ, by [`edit_distance`]. Of equals, the first.
pub fn nearest<'w>(found: &str, known: impl IntoIterator<Item = &'w str>) -> Option<&'w str> {
    let found_lower = found.to_lowercase();
    let near = |word: &str| (edit_distance(&found_lower, &word.to_lowercase()), word.chars().count());
    let longest = found.chars().count();
    known
        .into_iter()
        .map(|word| (near(word), word))
        .filter(|((distance, length), _)| 2 * distance <= longest.max(*length))
        .min_by_key(|((distance, _), _)| *distance)
        .map(|(_, word)| word)
}

/// Letters to insert, drop, change or swap with their neighbour to turn one word into the other
/// (Levenshtein's distance with transpositions of neighbours, each letter touched once).
fn edit_distance(a: &str, b: &str) -> usize {
    let a: Vec<char> = a.chars().take(MOST_LETTERS).collect();
    let b: Vec<char> = b.chars().take(MOST_LETTERS).collect();
    let mut before = vec![0; b.len() + 1];
    let mut above: Vec<usize> = (0..=b.len()).collect();
    for i in 1..=a.len() {
        let mut row = vec![i; b.len() + 1];
        for j in 1..=b.len() {
            let change = above[j - 1] + usize::from(a[i - 1] != b[j - 1]);
            row[j] = change.min(above[j] + 1).min(row[j - 1] + 1);
            if i > 1 && j > 1 && a[i - 1] == b[j - 2] && a[i - 2] == b[j - 1] {
                row[j] = row[j].min(before[j - 2] + 1);
            }
        }
        before = std::mem::replace(&mut above, row);
    }
    above[b.len()]
}

/// Known words are shorter than this; a longer found one need not be compared to its end.
const MOST_LETTERS: usize = 80;

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn distance_counts_slips_of_the_hand() {
        for (a, b, distance) in [("power", "power", 0), ("pwoer", "power", 1), ("powr", "power", 1), ("", "abc", 3)] {
            assert_eq!(edit_distance(a, b), distance, "{a} → {b}");
        }
    }

    #[test]
    fn says_nothing_rather_than_something_far_off() {
        assert_eq!(nearest("mode_spaceing", ["mode_spacing", "mirror_spacing"]), Some("mode_spacing"));
        assert_eq!(nearest("Severity", ["severity"]), Some("severity"));
        assert_eq!(nearest("xylophone", ["power", "lower"]), None);
    }
}
