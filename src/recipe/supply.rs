//! Keys of a supply step: the discharge at its run current and, last, where it goes out.
//! Must not switch anything.
//! Main type: [`Supply`].

use super::parse::Context;

/// Run voltage, run current, dropout.
#[derive(Debug, Clone, PartialEq)]
pub struct Supply {
    /// Lower the current until the discharge goes out. The tube is dark afterwards.
    pub dropout: bool,
}

impl Supply {
    pub(super) const KEYS: &[&str] = &["dropout"];

    pub(super) fn fills(&self) -> &'static [&'static str] {
        let all = &["run_voltage", "run_current", "dropout_current", "dropout_fraction"];
        if self.dropout { all } else { &all[..2] }
    }

    pub(super) fn read(context: &Context<'_, '_>) -> Option<Self> {
        Some(Self { dropout: context.or("dropout", false, |item| item.switch())? })
    }
}
