//! The keys of a recipe file that all steps share, and the table of kinds.
//! Must not know the keys of one kind.
//! Main function: [`recipe`].

use super::{Comb, Dwell, Look, Noise, Polarizer, Power, Recipe, Step, StepKind, Strike, Supply, Sweep, Watch};
use crate::{
    limits::{
        Fault, nearest,
        reading::{Item, Table, read, sha256_hex},
    },
    quantity::Dimension,
};

const TOP: &[&str] = &["revision", "nominal_spacing", "wavelength", "mode_floor", "retests", "step"];
/// Kinds of a later version: known words, not yet steps.
const LATER: &[&str] = &["envelope", "beam"];

/// Stands for the kind of a step whose kind could not be read.
const UNREAD: &str = "";

type Build = fn(&Context<'_, '_>) -> Option<StepKind>;

/// The kinds: word, keys beside `name` and `do`, reader.
const KINDS: &[(&str, &[&str], Build)] = &[
    ("strike", Strike::KEYS, |c| Strike::read(c).map(StepKind::Strike)),
    ("dwell", Dwell::KEYS, |c| Dwell::read(c).map(StepKind::Dwell)),
    ("sweep", Sweep::KEYS, |c| Sweep::read(c).map(StepKind::Sweep)),
    ("comb", Comb::KEYS, |c| Comb::read(c).map(StepKind::Comb)),
    ("polarizer", Polarizer::KEYS, |c| Polarizer::read(c).map(StepKind::Polarizer)),
    ("watch", Watch::KEYS, |c| Watch::read(c).map(StepKind::Watch)),
    ("power", Power::KEYS, |c| Power::read(c).map(StepKind::Power)),
    ("noise", Noise::KEYS, |c| Noise::read(c).map(StepKind::Noise)),
    ("supply", Supply::KEYS, |c| Supply::read(c).map(StepKind::Supply)),
    ("look", Look::KEYS, |c| Look::read(c).map(StepKind::Look)),
];

/// What a kind's reader sees: its own table and the steps before.
pub struct Context<'a, 'b> {
    /// The step's table.
    pub table: &'b Table<'a>,
    /// (name, word of the kind) of each earlier step.
    pub before: &'b [(String, &'static str)],
}

impl<'a> Context<'a, '_> {
    /// The value of a key read by `reader`, or a default where the key is absent.
    pub fn or<T>(&self, key: &str, default: T, reader: impl FnOnce(&Item<'a>) -> Option<T>) -> Option<T> {
        self.table.get(key).map_or(Some(default), |item| reader(&item))
    }

    /// A time above zero, s, or a default.
    pub fn seconds_or(&self, key: &str, default: f64) -> Option<f64> {
        self.or(key, default, |item| item.quantity_within(Dimension::Time, (1e-3, 1e6), "a time of at least 1 ms"))
    }

    /// `from =`: an earlier step of one of some kinds. `None` if it is absent, `Some(None)` if it is wrong.
    pub fn from(&self, kinds: &[&str]) -> Option<Option<String>> {
        let item = self.table.get("from")?;
        let Some(name) = item.text() else { return Some(None) };
        let fits = |kind: &str| kind == UNREAD || kinds.contains(&kind);
        let expected = kinds.join(" or ");
        match self.before.iter().find(|(before, _)| before == name) {
            Some((_, kind)) if fits(kind) => return Some(Some(name.to_owned())),
            Some((_, kind)) => {
                let message = format!("`from` names `{name}`, a {kind} step; expected an earlier {expected} step");
                item.fault(message, self.before.iter().find(|(_, kind)| fits(kind)).map(|(name, _)| name.as_str()));
            }
            None => {
                let message = format!("`from` names `{name}`, no earlier step; expected an earlier {expected} step");
                item.fault(message, nearest(name, self.before.iter().map(|(name, _)| name.as_str())));
            }
        }
        Some(None)
    }

    /// `from =`, required.
    pub fn need_from(&self, kinds: &[&str]) -> Option<String> {
        self.table.need("from")?;
        self.from(kinds).flatten()
    }
}

/// Reads a recipe file.
pub fn recipe(name: &str, text: &str) -> Result<Recipe, Vec<Fault>> {
    read(name, text, TOP, |root| {
        let revision = root.need("revision").and_then(|item| item.whole(1, 1_000_000));
        let nominal_spacing = root.need("nominal_spacing").and_then(|item| item.positive(Dimension::Frequency));
        let wavelength = root.need("wavelength").and_then(|item| item.positive(Dimension::Length));
        let share = |item: &Item<'_>| item.quantity_within(Dimension::Ratio, (1e-6, 0.5), "a share up to 50 %");
        let mode_floor = root.get("mode_floor").map_or(Some(0.02), |item| share(&item));
        let retests = root.get("retests").map_or(Some(1), |item| item.whole(0, 10));
        let mut before: Vec<(String, &'static str)> = Vec::new();
        let steps = root.need("step").map(|_| {
            let list = root.list("step");
            list.iter().enumerate().map(|(index, item)| step(item, index + 1, &mut before)).collect::<Vec<_>>()
        });
        if steps.as_ref().is_some_and(Vec::is_empty) {
            root.fault("the recipe has no step; expected at least one `[[step]]`", None);
        }
        Some(Recipe {
            revision: revision?,
            sha256: sha256_hex(text),
            nominal_spacing: nominal_spacing?,
            wavelength: wavelength?,
            mode_floor: mode_floor?,
            // Bounded by 10 above, so that it fits.
            retests: u32::try_from(retests?).unwrap_or(0),
            steps: steps?.into_iter().collect::<Option<Vec<_>>>()?,
        })
    })
}

fn step(item: &Item<'_>, number: usize, before: &mut Vec<(String, &'static str)>) -> Option<Step> {
    let mut what = format!("step {number}");
    // Looked at first without reporting: which keys are known depends on the kind.
    let open = item.open_table(&what)?;
    let kind = open.need("do").and_then(|item| kind(&item));
    let name = open.need("name");
    let name = name.as_ref().and_then(|item| step_name(item, before));
    if let Some(name) = &name {
        what = format!("step `{name}`");
    }
    let Some((word, keys, build)) = kind else {
        // A kind misspelt must not turn every `from` that names the step into a fault as well.
        before.extend(name.map(|name| (name, UNREAD)));
        return None;
    };
    let known: Vec<&str> = ["name", "do"].into_iter().chain(keys.iter().copied()).collect();
    let table = item.table(&what, &known)?;
    let kind = build(&Context { table: &table, before });
    before.extend(name.clone().map(|name| (name, *word)));
    Some(Step { name: name?, kind: kind? })
}

fn kind(item: &Item<'_>) -> Option<&'static (&'static str, &'static [&'static str], Build)> {
    let word = item.text()?;
    let found = KINDS.iter().find(|(known, _, _)| *known == word);
    if found.is_none() {
        let known = || KINDS.iter().map(|(word, _, _)| *word);
        let list = known().collect::<Vec<_>>().join(", ");
        if LATER.contains(&word) {
            item.fault(format!("`{word}` is a step of a later version; expected one of {list}"), None);
        } else {
            item.fault(format!("unknown step `{word}`; expected one of {list}"), nearest(word, known()));
        }
    }
    found
}

fn step_name(item: &Item<'_>, before: &[(String, &'static str)]) -> Option<String> {
    let name = item.text()?;
    let plain = |c: char| c.is_ascii_lowercase() || c.is_ascii_digit() || c == '_' || c == '-';
    if !name.chars().all(plain) || name.len() > 64 {
        item.fault(format!("`{name}` is no step name; expected up to 64 of a–z, 0–9, `_`, `-`"), None);
        return None;
    }
    if before.iter().any(|(earlier, _)| earlier == name) {
        item.fault(format!("two steps are named `{name}`; expected each name once"), None);
    }
    Some(name.to_owned())
}
