//! A serial number as the name of a folder: one serial one name, never a path.
//! Must not touch the disk.
//! Main function: [`folder_name`].

use std::fmt::Write as _;

use sha2::{Digest as _, Sha256};

/// Longest folder name made here, bytes. File systems allow 255; room is left for endings such as `.lock`.
const LONGEST: usize = 200;
/// Hexadecimal digits of SHA-256 that tell long serials apart.
const DIGITS: usize = 32;

/// Name of the folder of a serial.
///
/// Every byte outside `A–Z a–z 0–9 . _ -`, and a leading dot, becomes `%XX`; so `/`, `..` and blanks never act as a path.
/// A name that would be longer than 200 bytes is cut and ends in `%~` and 32 digits of the serial's SHA-256:
/// `%~` occurs nowhere else, so two serials never share a name.
pub fn folder_name(serial: &str) -> String {
    let mut name = String::with_capacity(serial.len());
    for (index, &byte) in serial.as_bytes().iter().enumerate() {
        let plain = byte.is_ascii_alphanumeric() || matches!(byte, b'_' | b'-') || (byte == b'.' && index > 0);
        if plain {
            name.push(char::from(byte));
        } else {
            // Writing to a String cannot fail.
            let _ = write!(name, "%{byte:02X}");
        }
    }
    if name.len() <= LONGEST {
        return name;
    }
    let mut cut = LONGEST - DIGITS - 2;
    // Do not cut a `%XX` in two.
    while name.as_bytes()[cut.saturating_sub(2)..cut].contains(&b'%') {
        cut -= 1;
    }
    let digest = hex(&Sha256::digest(serial.as_bytes()));
    format!("{}%~{}", &name[..cut], &digest[..DIGITS])
}

/// Whether a text can be a folder of `limits/` or a run: plain characters alone, no leading dot.
pub fn is_folder_name(text: &str) -> bool {
    !text.is_empty() && text.len() <= LONGEST && folder_name(text) == text
}

/// Bytes as lower-case hexadecimal digits.
pub(crate) fn hex(bytes: &[u8]) -> String {
    bytes.iter().fold(String::with_capacity(2 * bytes.len()), |mut text, byte| {
        let _ = write!(text, "{byte:02x}");
        text
    })
}

/// SHA-256 of bytes as hexadecimal digits.
pub(crate) fn sha256_hex(bytes: &[u8]) -> String {
    hex(&Sha256::digest(bytes))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn plain_serials_stay_and_paths_are_tamed() {
        assert_eq!(folder_name("DEMO-0001"), "DEMO-0001");
        assert_eq!(folder_name(".."), "%2E.");
        assert_eq!(folder_name("../../etc"), "%2E.%2F..%2Fetc");
        assert_eq!(folder_name("a b%2F"), "a%20b%252F");
        assert_eq!(folder_name("é"), "%C3%A9");
    }

    #[test]
    fn long_serials_fit_and_stay_apart() {
        // 200 bytes is the longest serial: each byte may become three.
        for serial in ["🔬".repeat(50), "é".repeat(64), "%".repeat(64)] {
            let name = folder_name(&serial);
            assert!(name.len() <= LONGEST, "{} bytes", name.len());
            assert!(!name.contains('/'));
        }
        let one = "🔬".repeat(49) + "a";
        let two = "🔬".repeat(49) + "b";
        assert_ne!(folder_name(&one), folder_name(&two));
    }

    #[test]
    fn no_two_short_serials_share_a_name() {
        let alphabet = ['a', 'A', '.', '/', '%', '~', ' ', '2', 'F', 'é'];
        let mut seen = std::collections::HashMap::new();
        for a in alphabet {
            for b in alphabet {
                for c in alphabet {
                    let serial: String = [a, b, c].iter().collect();
                    if let Some(other) = seen.insert(folder_name(&serial), serial.clone()) {
                        unreachable!("`{other}` and `{serial}` share a name");
                    }
                }
            }
        }
    }

    #[test]
    fn types_are_plain_names() {
        assert!(is_folder_name("twin-150"));
        for bad in ["", "..", ".hidden", "a/b", "a b", "a\u{0}"] {
            assert!(!is_folder_name(bad), "{bad:?}");
        }
    }
}
