//! Lines for a terminal: words in at most three inks, cut to a width, with or without colour.
//! Must not carry a meaning by colour alone: whoever puts a role on words also says it in words, shape or place.
//! Main types: [`Line`], [`Role`], [`Look`].

use crate::phrase::Language;

/// How words stand out from the others.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Role {
    /// The terminal's own ink.
    Plain,
    /// The same, bold: values, questions.
    Strong,
    /// Axes, hints, what was said before.
    Quiet,
    /// Outside, on hold, high voltage. Bold as well, and never without a word and a shape that say it.
    Alert,
}

impl Role {
    /// Number in the fixed part of the 256-colour table; none for the terminal's own ink.
    ///
    /// Both are at least 3 : 1 against black and against white, with the red channel and without it, and differ from each
    /// other in lightness (tests below; contrast as in WCAG 2.2, 1.4.11).
    fn colour(self) -> Option<u8> {
        match self {
            Self::Plain | Self::Strong => None,
            Self::Quiet => Some(242),
            Self::Alert => Some(31),
        }
    }

    fn code(self) -> String {
        let bold = if matches!(self, Self::Strong | Self::Alert) { "1" } else { "" };
        match (self.colour(), bold) {
            (None, bold) => format!("\x1b[{bold}m"),
            (Some(colour), "") => format!("\x1b[38;5;{colour}m"),
            (Some(colour), bold) => format!("\x1b[{bold};38;5;{colour}m"),
        }
    }
}

/// What a terminal can write.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Charset {
    /// Everything.
    Unicode,
    /// Words as they are, drawings in ASCII: lines that may end in a file.
    Words,
    /// Nothing but ASCII.
    Ascii,
}

/// What a terminal can show.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Look {
    /// Columns.
    pub width: usize,
    /// Rows.
    pub height: usize,
    /// What it can write.
    pub charset: Charset,
    /// Language of what stands around rows and questions.
    pub language: Language,
    /// Roles are coloured; else nothing but the text is written.
    pub colour: bool,
}

impl Look {
    /// The one sign or, where only ASCII can be shown, the other.
    pub fn sign(&self, unicode: &'static str, ascii: &'static str) -> &'static str {
        if self.draws_unicode() { unicode } else { ascii }
    }

    /// Drawings may use more than ASCII.
    pub fn draws_unicode(&self) -> bool {
        self.charset == Charset::Unicode
    }
}

/// One line in pieces.
#[derive(Debug, Clone, PartialEq, Eq, Default)]
pub struct Line {
    pieces: Vec<(Role, String)>,
}

impl Line {
    /// A line in one ink.
    pub fn of(role: Role, text: impl Into<String>) -> Self {
        Self::default().and(role, text)
    }

    /// Goes on with more words.
    #[must_use]
    pub fn and(mut self, role: Role, text: impl Into<String>) -> Self {
        let text = text.into();
        match self.pieces.last_mut() {
            Some((last, words)) if *last == role => words.push_str(&text),
            _ => self.pieces.push((role, text)),
        }
        self
    }

    /// Goes on with another line.
    #[must_use]
    pub fn then(self, other: Self) -> Self {
        other.pieces.into_iter().fold(self, |line, (role, text)| line.and(role, text))
    }

    /// Blanks up to a column.
    #[must_use]
    pub fn to_column(self, column: usize) -> Self {
        let blanks = column.saturating_sub(self.width());
        self.and(Role::Plain, " ".repeat(blanks))
    }

    /// Columns it takes.
    pub fn width(&self) -> usize {
        self.pieces.iter().flat_map(|(_, text)| text.chars()).map(columns).sum()
    }

    /// Rows of a terminal it takes.
    pub fn rows(&self, width: usize) -> usize {
        self.width().div_ceil(width.max(1)).max(1)
    }

    /// Cut to a width. Control characters, which could move the cursor, become �.
    #[must_use]
    pub fn cut(self, width: usize) -> Self {
        let mut left = width;
        let mut line = Self::default();
        for (role, text) in self.pieces {
            let fits: String = text
                .chars()
                .take_while(|c| {
                    let fits = columns(*c) <= left;
                    left = if fits { left - columns(*c) } else { 0 };
                    fits
                })
                .collect();
            line = line.and(role, fits);
        }
        line
    }

    /// `self` and the words after it, broken at blanks to a width; the lines that follow begin as `hanging`.
    pub fn wrapped(self, text: &str, role: Role, hanging: &Self, most: usize) -> Vec<Self> {
        let most = most.max(hanging.width() + 12);
        let (mut lines, mut line, mut is_new) = (Vec::new(), self, true);
        for word in text.split_whitespace() {
            if !is_new && line.width() + 1 + Self::of(role, word).width() > most {
                lines.push(std::mem::replace(&mut line, hanging.clone()));
                is_new = true;
            }
            line = line.and(role, format!("{}{word}", if is_new { "" } else { " " }));
            is_new = false;
        }
        lines.push(line);
        lines
    }

    /// As written to the terminal.
    pub fn coded(&self, look: &Look) -> String {
        let mut coded = String::new();
        for (role, text) in &self.pieces {
            let text = harmless(text, look.charset == Charset::Ascii);
            if look.colour && *role != Role::Plain {
                coded += &format!("{}{text}\x1b[0m", role.code());
            } else {
                coded += &text;
            }
        }
        coded
    }
}

/// Text without control characters and, where only ASCII can be shown, with the nearest of it.
fn harmless(text: &str, ascii_only: bool) -> String {
    let shown = |c: char| match c {
        c if c.is_control() => {
            if ascii_only {
                '?'
            } else {
                '\u{fffd}'
            }
        }
        c if ascii_only && !c.is_ascii() => ascii(c),
        c => c,
    };
    text.chars().map(shown).collect()
}

/// The nearest of ASCII to signs that sheets use.
fn ascii(c: char) -> char {
    match c {
        '−' | '–' | '—' => '-',
        '·' | '°' => '.',
        'µ' | 'μ' => 'u',
        'Ω' => 'R',
        '×' => 'x',
        '≥' => '>',
        '≤' => '<',
        '±' => '~',
        '\u{a0}' => ' ',
        _ => '?',
    }
}

/// Columns a character takes; the wide scripts of East Asia take two (Unicode, East Asian Width, blocks taken whole).
fn columns(c: char) -> usize {
    match u32::from(c) {
        0x300..=0x36f => 0,
        0x1100..=0x115f | 0x2e80..=0xa4cf | 0xac00..=0xd7a3 | 0xf900..=0xfaff | 0xfe30..=0xfe6f | 0xff00..=0xff60 => 2,
        0xffe0..=0xffe6 | 0x1f300..=0x1faff | 0x20000..=0x3fffd => 2,
        _ => 1,
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Red, green and blue of a place in the fixed part of the 256-colour table: a cube of six steps, then greys.
    fn rgb(place: u8) -> [f64; 3] {
        let step = |n: u8| if n == 0 { 0.0 } else { 55.0 + 40.0 * f64::from(n) };
        match place {
            232.. => [8.0 + 10.0 * f64::from(place - 232); 3],
            _ => [(place - 16) / 36, (place - 16) / 6 % 6, (place - 16) % 6].map(step),
        }
    }

    /// Relative luminance (WCAG 2.2, from IEC 61966-2-1), with a share of the red channel let through.
    fn luminance(rgb: [f64; 3], red: f64) -> f64 {
        let linear = |v: f64| {
            let v = v / 255.0;
            if v <= 0.04045 { v / 12.92 } else { ((v + 0.055) / 1.055).powf(2.4) }
        };
        0.2126 * red * linear(rgb[0]) + 0.7152 * linear(rgb[1]) + 0.0722 * linear(rgb[2])
    }

    fn contrast(a: f64, b: f64) -> f64 {
        (a.max(b) + 0.05) / (a.min(b) + 0.05)
    }

    #[test]
    fn every_ink_stands_out_on_black_and_white_with_and_without_red() {
        for role in [Role::Quiet, Role::Alert] {
            let ink = rgb(role.colour().unwrap_or_default());
            for (ground, red) in [(0.0, 1.0), (255.0, 1.0), (0.0, 0.0), (255.0, 0.0)] {
                let found = contrast(luminance(ink, red), luminance([ground; 3], red));
                // WCAG 2.2, 1.4.11: graphics and states need 3 : 1.
                assert!(found >= 3.0, "{role:?} on {ground} with {red} of red: {found:.2}");
            }
        }
    }

    #[test]
    fn inks_differ_in_lightness_alone() {
        let ink = |role: Role| rgb(role.colour().unwrap_or_default());
        for red in [1.0, 0.0] {
            let found = contrast(luminance(ink(Role::Quiet), red), luminance(ink(Role::Alert), red));
            // A quarter is seen side by side; the bold of one of them and its shape say it again.
            assert!(found >= 1.25, "with {red} of red: {found:.2}");
        }
        assert!(Role::Alert.code().starts_with("\x1b[1;") && !Role::Quiet.code().contains("[1;"));
        assert!(![5, 6].iter().any(|blink| Role::Alert.code().contains(&format!("[{blink}"))), "nothing blinks");
    }

    #[test]
    fn lines_are_cut_to_columns_and_cannot_move_the_cursor() {
        let look =
            Look { width: 80, height: 24, charset: Charset::Unicode, language: Language::English, colour: false };
        let line = Line::of(Role::Plain, "tube \x1b[2J").and(Role::Alert, " 管 1");
        assert_eq!(line.width(), 14);
        assert_eq!(line.clone().cut(11).coded(&look), "tube \u{fffd}[2J ");
        assert_eq!(line.cut(12).coded(&Look { colour: true, ..look }), "tube \u{fffd}[2J\x1b[1;38;5;31m 管\x1b[0m");
        let ascii = Look { charset: Charset::Ascii, ..look };
        assert_eq!(Line::of(Role::Quiet, "75 kΩ ± 1 µm").coded(&ascii), "75 kR ~ 1 um");
    }
}
