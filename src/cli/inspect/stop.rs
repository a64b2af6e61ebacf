//! Stopping a run: Ctrl-C asks why, a second one leaves at once; `--stop` ends a run that nobody drives.
//! Must not stop a run without a reason: what has none is an interruption, and the same command goes on from there.
//! Main types: [`StopKey`], [`Lines`]; main functions: [`listen`], [`from_outside`].

use std::io::{self, BufRead, IsTerminal as _, Read, Write as _};
use std::process;
use std::sync::atomic::{AtomicU8, Ordering};

use crate::cli::{Ending, output};
use crate::instruments::Screen;
use crate::station::{Interlock, Trouble};

/// Nothing can be stopped: Ctrl-C leaves at once.
const IDLE: u8 = 0;
/// A run goes on; Ctrl-C asks why it is to end.
const RUNNING: u8 = 1;
/// The question why was put; the next line that is typed is its answer.
const ASKED: u8 = 2;

/// Where the one stop key of the process stands. A signal comes to the process, not to a run: hence static.
static KEY: AtomicU8 = AtomicU8::new(IDLE);

const WHY: &str = "\r\x1b[2K\nStop: why? (Enter alone goes on, Ctrl-C again leaves at once) ";
const LEFT: &str = "Left at once, nothing stopped: a sheet that was opened stays open, and the same command goes on from there. \
                    The tube may still be lit: look, and switch the supply off if nobody goes on.";

/// Hears Ctrl-C and a request to end from now on. Without a terminal nobody can be asked why: the process leaves at once.
pub(super) fn listen() {
    let on_terminal = io::stdin().is_terminal() && io::stderr().is_terminal();
    // A second call finds the handler there; without one Ctrl-C kills, which loses nothing either.
    let _ =
        ctrlc::set_handler(move || match KEY.compare_exchange(RUNNING, ASKED, Ordering::SeqCst, Ordering::SeqCst) {
            Ok(_) if on_terminal => {
                let mut err = io::stderr().lock();
                let _ = write!(err, "{WHY}").and_then(|()| err.flush());
            }
            _ => {
                output::talk(&format!("\ntubewright: {LEFT}"));
                process::exit(i32::from(Ending::Unfinished.status()));
            }
        });
}

/// While it lives, Ctrl-C asks why instead of leaving.
pub(super) struct Armed;

impl Armed {
    pub fn new() -> Self {
        KEY.store(RUNNING, Ordering::SeqCst);
        Self
    }
}

impl Drop for Armed {
    fn drop(&mut self) {
        KEY.store(IDLE, Ordering::SeqCst);
    }
}

/// Whether the question why is open; it is closed then.
fn was_asked() -> bool {
    KEY.compare_exchange(ASKED, RUNNING, Ordering::SeqCst, Ordering::SeqCst).is_ok()
}

/// An interlock that also hears the stop key.
pub(super) struct StopKey {
    pub inner: Box<dyn Interlock>,
    /// Where the question why is put.
    pub screen: Screen,
}

impl Interlock for StopKey {
    fn make_safe(&mut self) -> Result<(), Trouble> {
        self.inner.make_safe()
    }

    fn stop_key(&mut self) -> Result<(), Trouble> {
        if KEY.load(Ordering::SeqCst) != ASKED {
            return Ok(());
        }
        // What was shown meanwhile may stand over the question.
        let mut err = io::stderr().lock();
        let _ = write!(err, "\r\x1b[2KStop: why? ").and_then(|()| err.flush());
        drop(err);
        self.screen.interrupted();
        let line = read_line(&mut io::stdin().lock());
        self.screen.wrote(1);
        was_asked();
        why(line)
    }
}

/// What was typed after "why?": nothing goes on, words stop, the end of the input leaves the sheet open.
fn why(line: Option<String>) -> Result<(), Trouble> {
    let Some(line) = line else { return Err(Trouble::NoAnswer("the input ended where a reason was asked for".into())) };
    match reason(&line) {
        "" => Ok(()),
        reason => Err(Trouble::Stopped(reason.to_owned())),
    }
}

/// The reason alone, whether or not `stop:` was typed before it.
fn reason(line: &str) -> &str {
    let line = line.trim();
    line.strip_prefix("stop:").unwrap_or(line).trim()
}

/// One line without its end; none at the end of the input.
fn read_line(input: &mut dyn BufRead) -> Option<String> {
    let mut line = Vec::new();
    match input.read_until(b'\n', &mut line) {
        Ok(0) | Err(_) => None,
        Ok(_) => Some(String::from_utf8_lossy(&line).trim_end_matches(['\n', '\r']).to_owned()),
    }
}

/// Lines of standard input, held no longer than one takes to read, so that a question and the stop key share it.
///
/// A line that is typed after "why?" becomes `stop: …`, which every question understands.
#[derive(Default)]
pub(super) struct Lines {
    line: Vec<u8>,
    at: usize,
    screen: Screen,
}

impl Lines {
    /// Typed below what stands at the foot of a terminal.
    pub fn over(screen: Screen) -> Self {
        Self { screen, ..Self::default() }
    }

    fn next(&mut self, input: &mut dyn BufRead) {
        self.at = 0;
        self.line.clear();
        while let Some(line) = read_line(input) {
            let text = match (was_asked(), reason(&line)) {
                (false, _) => line,
                (true, "") => {
                    // What the stop key said, what was typed, and what is said now.
                    self.screen.wrote(3);
                    output::talk("Going on: the question above still waits for its answer.");
                    continue;
                }
                (true, reason) => format!("stop: {reason}"),
            };
            self.line = (text + "\n").into_bytes();
            return;
        }
    }
}

impl Read for Lines {
    fn read(&mut self, into: &mut [u8]) -> io::Result<usize> {
        let n = self.fill_buf()?.read(into)?;
        self.consume(n);
        Ok(n)
    }
}

impl BufRead for Lines {
    fn fill_buf(&mut self) -> io::Result<&[u8]> {
        if self.at >= self.line.len() {
            self.next(&mut io::stdin().lock());
        }
        Ok(self.line.get(self.at..).unwrap_or_default())
    }

    fn consume(&mut self, n: usize) {
        self.at += n;
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_line_typed_after_the_stop_key_stops_and_enter_alone_goes_on() {
        // One test for all: the key is one for the process.
        let mut typed: &[u8] = b"4.0 mA\n\n980 V\nfire drill\nlast";
        let mut lines = Lines::default();
        let mut next = |key: u8| {
            KEY.store(key, Ordering::SeqCst);
            lines.next(&mut typed);
            String::from_utf8_lossy(&lines.line).into_owned()
        };
        assert_eq!(next(RUNNING), "4.0 mA\n");
        assert_eq!(next(ASKED), "980 V\n", "Enter alone went on, and the next line is an answer again");
        assert_eq!(next(ASKED), "stop: fire drill\n");
        assert_eq!(next(RUNNING), "last\n");
        assert_eq!(next(ASKED), "", "the end of the input");
        KEY.store(IDLE, Ordering::SeqCst);
        assert_eq!(why(Some(String::new())), Ok(()));
        assert_eq!(why(Some("stop: smoke".into())), Err(Trouble::Stopped("smoke".into())));
        assert!(matches!(why(None), Err(Trouble::NoAnswer(_))));
    }
}
