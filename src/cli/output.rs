//! Results to standard output, talk to standard error; a stream that is gone never panics.
//! Must not format anything; what could move a cursor (words that people typed) is made harmless.
//! Main functions: [`result`], [`talk`].

use std::borrow::Cow;
use std::io::{self, Write as _};

use super::{Ending, Failure};
use crate::disk::said;

/// One line of results.
///
/// Errors: it could not be written, a full disk say. A reader that went away (`| head`) is no error.
pub fn result(line: &str) -> Result<(), Failure> {
    let mut out = io::stdout().lock();
    match writeln!(out, "{}", harmless(line)).and_then(|()| out.flush()) {
        Err(error) if error.kind() != io::ErrorKind::BrokenPipe => {
            Err(Failure::new(Ending::Store, format!("cannot write to standard output: {}", said(&error))))
        }
        _ => Ok(()),
    }
}

/// One line of talk. If nobody can hear it there is nobody to tell.
pub fn talk(line: &str) {
    let _ = writeln!(io::stderr().lock(), "{}", harmless(line));
}

/// Control characters but line ends and tabs become �.
fn harmless(line: &str) -> Cow<'_, str> {
    let moves = |c: char| c.is_control() && !['\n', '\t'].contains(&c);
    if line.contains(moves) { Cow::Owned(line.replace(moves, "\u{fffd}")) } else { Cow::Borrowed(line) }
}
