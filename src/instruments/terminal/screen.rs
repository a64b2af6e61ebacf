//! The terminal behind standard error: what it can show, and the rows at its foot that are drawn again and again.
//! Must not know what is drawn. It leaves no mode behind: whatever ends the process, the terminal is as it was.
//! Main type: [`Screen`].

use std::cell::RefCell;
use std::env;
use std::io::{self, IsTerminal as _, Write as _};
use std::rc::Rc;

use crate::phrase::Language;

use super::ink::{Charset, Line, Look, Role};

/// When colour is used.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum Colour {
    /// Never.
    Never,
    /// On a terminal, unless `NO_COLOR` is set.
    #[default]
    Auto,
    /// On a terminal, whatever `NO_COLOR` says.
    Always,
}

/// The foot of a terminal. Clones share it: one draws, another asks below.
#[derive(Debug, Clone)]
pub struct Screen {
    is_live: bool,
    colour: bool,
    charset: Charset,
    is_keyboard: bool,
    language: Language,
    foot: Rc<RefCell<Foot>>,
}

impl Default for Screen {
    fn default() -> Self {
        Self::plain()
    }
}

/// What stands at the foot now.
#[derive(Debug, Default)]
struct Foot {
    /// Rows between its top and the cursor.
    below: usize,
    /// Widths of its lines, for a terminal that is made narrower meanwhile.
    widths: Vec<usize>,
    /// The cursor stands at the end of its last line.
    is_open: bool,
    /// Columns of the prompt that somebody types behind.
    prompt: usize,
}

impl Screen {
    /// Looks at standard error and the environment.
    ///
    /// * `plain`: nothing but lines, even on a terminal.
    pub fn of_stderr(plain: bool, colour: Colour, language: Language) -> Self {
        let set = |name: &str| env::var_os(name).map(|value| value.to_string_lossy().into_owned());
        let is_keyboard = io::stdin().is_terminal();
        Self { is_keyboard, language, ..Self::of(io::stderr().is_terminal() && !plain, colour, set) }
    }

    /// By what the environment says of the terminal, if it is one.
    fn of(is_terminal: bool, colour: Colour, set: impl Fn(&str) -> Option<String>) -> Self {
        let set = |name: &str| set(name).filter(|value| !value.is_empty());
        let is_live = is_terminal && set("TERM").is_some_and(|term| term != "dumb");
        let colour = match colour {
            Colour::Never => false,
            // The convention of no-color.org: any value but an empty one.
            Colour::Auto => set("NO_COLOR").is_none(),
            Colour::Always => true,
        };
        let locale = ["LC_ALL", "LC_CTYPE", "LANG"].into_iter().find_map(set).unwrap_or_default().to_ascii_lowercase();
        let charset = match locale.contains("utf-8") || locale.contains("utf8") {
            _ if !is_live => Charset::Words,
            true => Charset::Unicode,
            false => Charset::Ascii,
        };
        Self { is_live, colour: is_live && colour, charset, ..Self::plain() }
    }

    /// Nothing but lines.
    pub fn plain() -> Self {
        Self {
            is_live: false,
            colour: false,
            charset: Charset::Words,
            is_keyboard: false,
            language: Language::English,
            foot: Rc::default(),
        }
    }

    /// Lines can be drawn again in place.
    pub fn is_live(&self) -> bool {
        self.is_live
    }

    /// Answers are typed by hand, not read from a pipe.
    pub fn is_keyboard(&self) -> bool {
        self.is_keyboard
    }

    /// What it can show now; a terminal may change its size at any time.
    pub fn look(&self) -> Look {
        let size = if self.is_live { terminal_size::terminal_size_of(io::stderr()) } else { None };
        let (width, height) = size.map_or((80, 24), |(width, height)| (usize::from(width.0), usize::from(height.0)));
        Look {
            width: width.max(1),
            height: height.max(1),
            charset: self.charset,
            language: self.language,
            colour: self.colour,
        }
    }

    /// Puts `lasting` lines above the foot, where they scroll away, and draws the foot anew.
    pub fn draw(&self, look: &Look, lasting: &[Line], foot: Vec<Line>) {
        write(&self.drawn(look, lasting, foot));
    }

    /// What `draw` writes.
    fn drawn(&self, look: &Look, lasting: &[Line], foot: Vec<Line>) -> String {
        let foot: Vec<Line> = foot.into_iter().map(|line| line.cut(look.width.saturating_sub(1))).collect();
        let mut text = self.back_to_top(look);
        for line in lasting {
            text += &format!("{}\x1b[K\r\n", line.coded(look));
        }
        let coded: Vec<String> = foot.iter().map(|line| format!("{}\x1b[K", line.coded(look))).collect();
        text += &coded.join("\r\n");
        text += "\x1b[J";
        let widths = foot.iter().map(Line::width).collect();
        self.foot.replace(Foot { below: foot.len().saturating_sub(1), widths, is_open: !foot.is_empty(), prompt: 0 });
        text
    }

    /// Takes the foot away; the cursor stands where it began.
    pub fn clear(&self) {
        if self.is_live {
            write(&(self.back_to_top(&self.look()) + "\x1b[J"));
        }
    }

    /// The stop key went to a line of its own below the foot, by itself.
    pub fn interrupted(&self) {
        let mut foot = self.foot.borrow_mut();
        foot.below += usize::from(std::mem::take(&mut foot.is_open));
    }

    /// Leaves the foot where it is, for a question below it: the cursor goes to a line of its own, unless it is there.
    pub fn step_below(&self) {
        let mut foot = self.foot.borrow_mut();
        if std::mem::take(&mut foot.is_open) {
            foot.below += 1;
            write("\r\n");
        }
    }

    /// Somebody wrote that many whole rows below the foot; they go with it when it is drawn again.
    pub fn wrote(&self, rows: usize) {
        self.foot.borrow_mut().below += rows;
    }

    /// A line that somebody types on begins, after a prompt of so many columns.
    pub fn typed_on(&self, prompt: usize) {
        self.foot.borrow_mut().prompt = prompt;
    }

    /// It was ended by Enter, with these words on it.
    pub fn typed(&self, words: &str) {
        let width = self.look().width;
        let mut foot = self.foot.borrow_mut();
        let columns = std::mem::take(&mut foot.prompt) + Line::of(Role::Plain, words).width();
        foot.below += columns / width + 1;
    }

    /// Moves the cursor to the first row of the foot, which is forgotten.
    fn back_to_top(&self, look: &Look) -> String {
        let foot = self.foot.take();
        // Lines that a narrower terminal has wrapped since take more rows than they were drawn in.
        let wrapped: usize = foot.widths.iter().map(|width| width.saturating_sub(1) / look.width).sum();
        match (foot.below + wrapped).min(look.height.saturating_sub(1)) {
            0 => "\r".to_owned(),
            up => format!("\r\x1b[{up}A"),
        }
    }
}

/// One write: a terminal shows it at once. If nobody can see it there is nobody to tell.
fn write(text: &str) {
    let mut err = io::stderr().lock();
    let _ = err.write_all(text.as_bytes()).and_then(|()| err.flush());
}

#[cfg(test)]
mod tests {
    use super::*;

    /// A terminal as far as `draw` needs one: wraps, scrolls, moves up, clears.
    struct Glass {
        width: usize,
        height: usize,
        /// All rows ever, those scrolled away first.
        rows: Vec<Vec<char>>,
        at: (usize, usize),
    }

    impl Glass {
        fn new(width: usize, height: usize) -> Self {
            Self { width, height, rows: vec![Vec::new()], at: (0, 0) }
        }

        fn down(&mut self) {
            self.at.0 += 1;
            if self.at.0 == self.rows.len() {
                self.rows.push(Vec::new());
            }
        }

        fn put(&mut self, c: char) {
            if self.at.1 == self.width {
                self.down();
                self.at.1 = 0;
            }
            let row = &mut self.rows[self.at.0];
            row.resize(row.len().max(self.at.1 + 1), ' ');
            row[self.at.1] = c;
            self.at.1 += 1;
        }

        fn show(&mut self, text: &str) {
            let mut chars = text.chars();
            while let Some(c) = chars.next() {
                match c {
                    '\r' => self.at.1 = 0,
                    '\n' => self.down(),
                    '\x1b' => {
                        let code: String = chars.by_ref().skip(1).take_while_inclusive(|c| !c.is_ascii_alphabetic());
                        match code.split_at(code.len() - 1) {
                            (up, "A") => {
                                let top = self.rows.len().saturating_sub(self.height);
                                self.at.0 = self.at.0.saturating_sub(up.parse().unwrap_or(1)).max(top);
                            }
                            (_, "K") => self.rows[self.at.0].truncate(self.at.1),
                            (_, "J") => {
                                self.rows[self.at.0].truncate(self.at.1);
                                self.rows.truncate(self.at.0 + 1);
                            }
                            _ => assert!(code.ends_with('m'), "{code}"),
                        }
                    }
                    c => self.put(c),
                }
            }
        }

        fn lines(&self) -> Vec<String> {
            self.rows.iter().map(|row| row.iter().collect::<String>().trim_end().to_owned()).collect()
        }
    }

    trait TakeWhileInclusive: Iterator<Item = char> {
        fn take_while_inclusive(&mut self, goes_on: impl Fn(&char) -> bool) -> String {
            let mut taken = String::new();
            for c in self {
                taken.push(c);
                if !goes_on(&c) {
                    break;
                }
            }
            taken
        }
    }

    impl<I: Iterator<Item = char>> TakeWhileInclusive for I {}

    fn look(width: usize, height: usize) -> Look {
        Look { width, height, charset: Charset::Unicode, language: Language::English, colour: true }
    }

    fn lines(texts: &[&str]) -> Vec<Line> {
        texts.iter().map(|text| Line::of(Role::Alert, *text)).collect()
    }

    fn live() -> Screen {
        Screen { is_live: true, ..Screen::plain() }
    }

    #[test]
    fn what_lasts_stands_once_above_one_foot() {
        let (screen, look, mut glass) = (live(), look(20, 6), Glass::new(20, 6));
        for n in 0..9 {
            let lasting = if n % 3 == 0 { lines(&[&format!("row {n}")]) } else { Vec::new() };
            let foot = lines(&[&format!("step {n}"), "a line that is longer than the glass is wide", "end"]);
            glass.show(&screen.drawn(&look, &lasting, foot[n % 2..].to_vec()));
        }
        assert_eq!(glass.lines(), ["row 0", "row 3", "row 6", "step 8", "a line that is long", "end"]);
    }

    #[test]
    fn a_question_below_goes_with_the_foot() {
        let (screen, look, mut glass) = (live(), look(20, 12), Glass::new(20, 12));
        glass.show(&screen.drawn(&look, &[], lines(&["step", "end"])));
        screen.step_below();
        screen.step_below();
        screen.wrote(1);
        screen.typed_on(3);
        screen.typed("twenty columns of words");
        glass.show("\r\nquestion\r\n?> twenty columns of words\r\n");
        // `typed` asks the real terminal for its width, which no test has: 80 columns, one row where the glass took two.
        screen.wrote(1);
        glass.show(&screen.drawn(&look, &lines(&["answered"]), lines(&["step", "end"])));
        assert_eq!(glass.lines(), ["answered", "step", "end"]);
    }

    #[test]
    fn a_narrower_terminal_is_cleaned_as_well() {
        let (screen, mut glass) = (live(), Glass::new(20, 12));
        glass.show(&screen.drawn(&look(20, 12), &[], lines(&["eighteen columns..", "end"])));
        let mut narrow = Glass::new(10, 12);
        narrow.show("eighteen columns..\r\nend");
        narrow.show(&screen.drawn(&look(10, 12), &[], lines(&["step", "end"])));
        assert_eq!(narrow.lines(), ["step", "end"]);
    }

    #[test]
    fn the_environment_says_what_can_be_shown() {
        let of = |is_terminal: bool, colour: Colour, set: &[(&str, &str)]| {
            let get = |name: &str| set.iter().find(|(key, _)| *key == name).map(|(_, value)| (*value).to_owned());
            let screen = Screen::of(is_terminal, colour, get);
            (screen.is_live, screen.colour, screen.charset)
        };
        let (term, utf8) = (("TERM", "xterm"), ("LANG", "de_DE.UTF-8"));
        assert_eq!(of(true, Colour::Auto, &[term, utf8]), (true, true, Charset::Unicode));
        assert_eq!(of(true, Colour::Auto, &[term, utf8, ("NO_COLOR", "1")]), (true, false, Charset::Unicode));
        assert_eq!(of(true, Colour::Auto, &[term, utf8, ("NO_COLOR", "")]), (true, true, Charset::Unicode));
        assert_eq!(of(true, Colour::Always, &[term, utf8, ("NO_COLOR", "1")]), (true, true, Charset::Unicode));
        assert_eq!(of(true, Colour::Never, &[term, utf8]), (true, false, Charset::Unicode));
        assert_eq!(of(true, Colour::Auto, &[term, utf8, ("LC_ALL", "C")]), (true, true, Charset::Ascii));
        for (is_terminal, set) in [(false, vec![term, utf8]), (true, vec![("TERM", "dumb"), utf8]), (true, vec![utf8])]
        {
            assert_eq!(of(is_terminal, Colour::Always, &set), (false, false, Charset::Words));
        }
    }
}
