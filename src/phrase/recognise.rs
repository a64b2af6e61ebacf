//! Finds an English sentence of stored events again in the table, so that it can be said in another language.
//! Must not change what it says: in English a recognised sentence reads as it came, letter by letter.
//! Main function: [`known`].

use super::{Phrase, Piece, Saying, figure, outside, said};

/// The first phrase of the table of words from outside that reads like this text, with its places filled from it.
pub(super) fn known(text: &str) -> Option<Saying> {
    outside::ALL.iter().find_map(|(_, phrase)| Some(Saying::new(phrase, pieces(phrase, text)?)))
}

/// What stands in the places of a phrase; none if the text does not read so. Places stand in their order in English.
fn pieces(phrase: &'static Phrase, text: &str) -> Option<Vec<Piece>> {
    let mut parts = phrase.en.split('{').map(|part| part.split_once('}').map_or(part, |(_, words)| words));
    let mut rest = text.strip_prefix(parts.next()?)?;
    let parts: Vec<&str> = parts.collect();
    let mut found = Vec::new();
    for (i, words) in parts.iter().enumerate() {
        let end = if i + 1 == parts.len() {
            rest.len().checked_sub(words.len()).filter(|at| rest.is_char_boundary(*at) && rest[*at..] == **words)?
        } else {
            rest.find(words)?
        };
        found.push(piece(&rest[..end]));
        rest = &rest[end + words.len()..];
    }
    rest.is_empty().then_some(found)
}

/// A figure, or words that may be known in turn; those are shorter than what they were found in.
fn piece(text: &str) -> Piece {
    if text.starts_with(|c: char| c.is_ascii_digit() || "-−+".contains(c)) {
        figure(text)
    } else {
        said(Saying::outside(text))
    }
}
