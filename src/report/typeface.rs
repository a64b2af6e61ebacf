//! The embedded typeface, set in one language: widths of text, wrapping, shortening, decimal signs.
//! Must not shape: no ligatures, no kerning, one glyph a character.
//! Main type: [`Typeface`].

use std::sync::LazyLock;

use printpdf::ParsedFont;

use super::scene::Style;
use crate::phrase::{Language, Phrase, Saying};

/// Smallest size at which text is set, pt.
pub const SMALLEST: f64 = 6.5;
/// Stands for every character that has no glyph.
const MISSING: char = '□';

/// Regular and bold weight, and the language that is set in them.
#[derive(Clone, Copy)]
pub struct Typeface {
    /// Regular weight.
    pub regular: &'static ParsedFont,
    /// Bold weight.
    pub bold: &'static ParsedFont,
    /// Language of the page.
    pub language: Language,
}

/// Regular and bold weight as they were read.
static EMBEDDED: LazyLock<Option<(ParsedFont, ParsedFont)>> = LazyLock::new(|| {
    let read = |bytes: &[u8], name: &str| {
        let mut font = ParsedFont::from_bytes(bytes, 0, &mut Vec::new())?;
        font.font_name = Some(name.to_owned());
        Some(font)
    };
    Some((
        read(include_bytes!("font/TubewrightSans-Regular.ttf"), "TubewrightSans-Regular")?,
        read(include_bytes!("font/TubewrightSans-Bold.ttf"), "TubewrightSans-Bold")?,
    ))
});

impl Typeface {
    /// The typeface in the program; none only if its bytes were damaged when it was built.
    pub fn embedded(language: Language) -> Option<Self> {
        EMBEDDED.as_ref().map(|(regular, bold)| Self { regular, bold, language })
    }

    /// A saying in the language of the page.
    pub fn say(&self, saying: &Saying) -> String {
        saying.text(self.language)
    }

    /// A phrase without places in the language of the page.
    pub fn word(&self, phrase: &Phrase) -> &'static str {
        phrase.of(self.language)
    }

    /// Text with every character that cannot be shown replaced by `□`, blanks of any kind by a space.
    pub fn printable(&self, text: &str) -> String {
        let shown = |c: char| match c {
            '\u{a0}' => c,
            c if c.is_whitespace() => ' ',
            c if c != MISSING && self.regular.lookup_glyph_index(c as u32).is_none_or(|glyph| glyph == 0) => MISSING,
            c => c,
        };
        text.chars().map(shown).collect()
    }

    /// Width of a text, pt; the same whole thousandths of an em that the PDF declares.
    pub fn width(&self, text: &str, style: Style) -> f64 {
        let font = if style.bold { self.bold } else { self.regular };
        let per_em = f64::from(font.units_per_em.max(1));
        let advance = |c: char| {
            let glyph = font.lookup_glyph_index(c as u32).unwrap_or(0);
            (f64::from(font.get_glyph_width(glyph).unwrap_or(0)) * 1000.0 / per_em).floor() / 1000.0
        };
        text.chars().map(|c| advance(c) * style.size + style.spacing).sum()
    }

    /// Text and style that fit into a width: down to three quarters of the size or [`SMALLEST`], then shortened with `…`.
    pub fn fit(&self, text: &str, style: Style, most: f64) -> (String, Style) {
        let text = self.printable(text);
        let width = self.width(&text, style);
        if width <= most {
            return (text, style);
        }
        let style = style.sized((style.size * most / width).max(style.size * 0.75).max(SMALLEST.min(style.size)));
        (self.shorten(&text, style, most), style)
    }

    /// The longest beginning of a text that fits into a width with `…` after it; the text itself if it fits.
    pub fn shorten(&self, text: &str, style: Style, most: f64) -> String {
        // One thousandth of a point: sums in another order may differ in their last bits.
        if self.width(text, style) <= most + 1e-3 {
            return text.to_owned();
        }
        let mut room = most - self.width("…", style);
        let mut kept = String::new();
        for c in text.chars() {
            room -= self.width(c.encode_utf8(&mut [0; 4]), style);
            if room < 0.0 {
                break;
            }
            kept.push(c);
        }
        format!("{}…", kept.trim_end())
    }

    /// Lines no wider than a width, broken at blanks, inside words only where a word is wider than a line.
    ///
    /// * `lines`: most lines; what is left over ends in `…`.
    pub fn wrap(&self, text: &str, style: Style, most: f64, lines: usize) -> Vec<String> {
        let text = self.printable(text);
        let mut done: Vec<String> = Vec::new();
        let mut line = String::new();
        for word in text.split(' ').filter(|word| !word.is_empty()) {
            let joined = if line.is_empty() { word.to_owned() } else { format!("{line} {word}") };
            if self.width(&joined, style) <= most {
                line = joined;
                continue;
            }
            if !line.is_empty() {
                done.push(std::mem::take(&mut line));
            }
            for c in word.chars() {
                line.push(c);
                if line.chars().count() > 1 && self.width(&line, style) > most {
                    line.pop();
                    done.push(std::mem::replace(&mut line, c.to_string()));
                }
            }
        }
        if !line.is_empty() {
            done.push(line);
        }
        if done.len() > lines {
            let rest = done.split_off(lines.saturating_sub(1)).join(" ");
            done.push(self.shorten(&rest, style, most));
        }
        done
    }
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used)]
    use super::*;
    use crate::report::scene::DARK;

    const STYLE: Style = Style::plain(8.0, DARK);

    #[test]
    fn has_every_sign_of_the_trade() {
        let face = Typeface::embedded(Language::English).unwrap();
        let signs = "µμ±λσ°ΔντηΩ−…·×≥≤≈äöüÄÖÜßéłž²³–—′″‰";
        assert_eq!(face.printable(signs), signs);
        assert!(signs.chars().all(|c| face.bold.lookup_glyph_index(c as u32).is_some()));
        assert_eq!(face.printable("a\u{1F4A1}\u{7}\tb"), "a□□ b");
        assert_eq!(face.width("0123456789", STYLE), 10.0 * face.width("0", STYLE), "figures line up in columns");
    }

    #[test]
    fn wrapped_lines_fit_and_lose_nothing() {
        let face = Typeface::embedded(Language::English).unwrap();
        let text = "a few words, then-one-that-is-much-longer-than-any-line-could-be, and a few more";
        let lines = face.wrap(text, STYLE, 60.0, 99);
        assert!(lines.len() > 3 && lines.iter().all(|line| face.width(line, STYLE) <= 60.0));
        assert_eq!(lines.concat().replace(' ', ""), text.replace(' ', ""));
        let short = face.wrap(text, STYLE, 60.0, 2);
        assert_eq!(short.len(), 2);
        assert!(short[1].ends_with('…') && face.width(&short[1], STYLE) <= 60.001);
    }

    #[test]
    fn a_width_too_small_for_one_letter_ends() {
        let face = Typeface::embedded(Language::English).unwrap();
        assert_eq!(face.wrap("ab", STYLE, 0.1, 9), ["a", "b"]);
        assert_eq!(face.shorten("ab", STYLE, 0.1), "…");
    }
}
