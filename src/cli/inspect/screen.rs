//! Arguments that say how a run is shown on a terminal.
//! Must not show anything.
//! Main type: [`ScreenArguments`].

use clap::{Args, ValueEnum};

use crate::instruments::{Colour, Screen};
use crate::phrase::Language;

/// Arguments as given.
#[derive(Debug, Clone, Args)]
pub struct ScreenArguments {
    /// Plain lines even on a terminal: nothing is drawn, no control characters
    #[arg(long)]
    plain: bool,
    /// When a terminal is written to in colour; no state rests on it. NO_COLOR counts for auto
    #[arg(long, value_enum, value_name = "WHEN", default_value = "auto")]
    color: When,
}

/// When colour is used.
#[derive(Debug, Clone, Copy, PartialEq, Eq, ValueEnum)]
enum When {
    /// Never
    Never,
    /// Unless NO_COLOR is set
    Auto,
    /// Whatever NO_COLOR says
    Always,
}

impl ScreenArguments {
    /// The terminal behind standard error, looked at.
    pub fn screen(&self, language: Language) -> Screen {
        Screen::of_stderr(
            self.plain,
            match self.color {
                When::Never => Colour::Never,
                When::Auto => Colour::Auto,
                When::Always => Colour::Always,
            },
            language,
        )
    }
}
