//! What a serial number may be.
//! Must not make a path of it: `disk` does.
//! Main function: [`check`].

use crate::cli::Failure;

/// Most characters of a serial.
const CHARACTERS: usize = 64;
/// Most bytes of a serial.
const BYTES: usize = 200;

/// A serial is what the scanner sends: 1 to 64 printable characters, at most 200 bytes. `/` and `..` are allowed.
pub(in crate::cli) fn check(serial: &str) -> Result<(), Failure> {
    let wrong = |found: String| {
        let expected = format!("expected 1 to {CHARACTERS} printable characters and at most {BYTES} bytes");
        Err(Failure::unusable(format!("the serial number cannot be used: {found}; {expected}: scan it again")))
    };
    let count = serial.chars().count();
    if serial.trim().is_empty() {
        return wrong("it is empty".to_owned());
    }
    if let Some((index, found)) = serial.chars().enumerate().find(|(_, c)| !is_printable(*c)) {
        return wrong(format!("character {} is U+{:04X}, which cannot be printed", index + 1, u32::from(found)));
    }
    if count > CHARACTERS {
        return wrong(format!("it has {count} characters"));
    }
    if serial.len() > BYTES {
        return wrong(format!("it has {} bytes", serial.len()));
    }
    Ok(())
}

/// Not a control character, and none that is invisible or turns the writing direction.
fn is_printable(c: char) -> bool {
    let invisible = matches!(c,
        '\u{ad}' | '\u{61c}' | '\u{180e}' | '\u{200b}'..='\u{200f}' | '\u{2028}'..='\u{202e}'
        | '\u{2060}'..='\u{206f}' | '\u{feff}' | '\u{fff0}'..='\u{fffb}' | '\u{e0000}'..='\u{e0fff}');
    !c.is_control() && !invisible
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn what_a_scanner_sends_is_allowed() {
        for serial in ["DEMO-0001", "a/b", "..", "../../etc/passwd", "Röhre 7", &"x".repeat(64), &"🔬".repeat(50)] {
            assert_eq!(check(serial), Ok(()), "{serial}");
        }
    }

    #[test]
    fn what_cannot_be_a_serial_is_refused_with_the_reason() {
        let cases = [
            (String::new(), "empty"),
            ("  ".to_owned(), "empty"),
            ("a\u{7}b".to_owned(), "character 2 is U+0007"),
            ("a\nb".to_owned(), "U+000A"),
            ("a\u{202e}b".to_owned(), "U+202E"),
            ("x".repeat(65), "65 characters"),
            ("🔬".repeat(64), "256 bytes"),
        ];
        for (serial, why) in cases {
            let message = check(&serial).err().map(|failure| failure.message).unwrap_or_default();
            assert!(message.contains(why), "{serial:?}: {message}");
        }
    }
}
