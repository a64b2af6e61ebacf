//! Keys of a look: a question answered by eye with one of some words.
//! Must not ask.
//! Main type: [`Look`].

use super::parse::Context;

/// A look by eye.
#[derive(Debug, Clone, PartialEq)]
pub struct Look {
    /// What the technician reads.
    pub ask: String,
    /// The words to choose from, at least two.
    pub choices: Vec<String>,
}

impl Look {
    pub(super) const KEYS: &[&str] = &["ask", "choices"];

    pub(super) fn read(context: &Context<'_, '_>) -> Option<Self> {
        let ask = context.table.need("ask").and_then(|item| item.text().map(str::to_owned));
        let item = context.table.need("choices");
        let choices = item.as_ref().and_then(|item| item.texts());
        if let (Some(item), Some(choices)) = (&item, &choices)
            && choices.len() < 2
        {
            item.fault("`choices` has one word; expected at least two to choose from", None);
        }
        Some(Self { ask: ask?, choices: choices? })
    }
}
