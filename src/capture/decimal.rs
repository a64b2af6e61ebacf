//! Plain decimal numbers, read eight digits at a time where the result is certain to be the nearest double.
//! Must not guess: what it cannot read exactly it leaves to the general parser.
//! Main function: [`plain`].

/// Every byte `0`.
const ZEROS: u64 = 0x3030_3030_3030_3030;
/// Powers of ten that are exact doubles.
const POWERS: [f64; 23] = [
    1e0, 1e1, 1e2, 1e3, 1e4, 1e5, 1e6, 1e7, 1e8, 1e9, 1e10, 1e11, 1e12, 1e13, 1e14, 1e15, 1e16, 1e17, 1e18, 1e19, 1e20,
    1e21, 1e22,
];
/// The same as integers, as far as eight digits need them.
const SHIFTS: [u64; 9] = [1, 10, 100, 1_000, 10_000, 100_000, 1_000_000, 10_000_000, 100_000_000];
/// Whole numbers below this are exact doubles.
const EXACT: u64 = 1 << 53;

/// Reads `[-+]digits[mark digits][e[-+]digits]` at `at`.
///
/// * `mark`: the decimal mark, `.` or `,`.
///
/// Returns the value and the offset after it; `None` where the text has another form, too many digits, or is near the
/// end of `body`. A whole number below 2⁵³ over or times an exact power of ten is one rounding, hence the nearest
/// double (Clinger, *How to read floating point numbers accurately*, 1990).
pub(super) fn plain(body: &[u8], at: usize, mark: u8) -> Option<(f64, usize)> {
    let sign = *body.get(at)?;
    let mut number = Digits { at: at + usize::from(sign == b'-' || sign == b'+'), value: 0, count: 0 };
    number.read(body)?;
    let whole = number.count;
    if whole == 0 {
        return None;
    }
    if *body.get(number.at)? == mark {
        number.at += 1;
        number.read(body)?;
        if number.count == whole {
            return None;
        }
    }
    let mut power = whole as i32 - number.count as i32;
    let mut end = number.at;
    if matches!(body.get(end), Some(b'e' | b'E')) {
        let (exponent, after) = exponent(body, end + 1)?;
        power += exponent;
        end = after;
    }
    let scale = POWERS.get(power.unsigned_abs() as usize)?;
    if number.value >= EXACT {
        return None;
    }
    let value = number.value as f64;
    let value = if power < 0 { value / scale } else { value * scale };
    Some((if sign == b'-' { -value } else { value }, end))
}

/// Digits read so far.
struct Digits {
    at: usize,
    value: u64,
    count: usize,
}

impl Digits {
    /// Reads on while there are digits; `None` beyond eighteen of them or near the end of the text.
    #[inline]
    fn read(&mut self, body: &[u8]) -> Option<()> {
        loop {
            let bytes = body.get(self.at..self.at + 8)?;
            let word = u64::from_le_bytes(bytes.try_into().ok()?) ^ ZEROS;
            // A byte above nine, or one with its high bit set, is no digit; a carry only spoils bytes after such a one.
            let others = (word.wrapping_add(0x7676_7676_7676_7676) | word) & 0x8080_8080_8080_8080;
            let count = (others.trailing_zeros() / 8) as usize;
            self.count += count;
            if self.count > 18 {
                return None;
            }
            if count == 0 {
                return Some(());
            }
            // The digits moved to the end of the word: zeros stand before them.
            self.value = self.value * SHIFTS[count] + eight_digits(word << (8 * (8 - count)));
            self.at += count;
            if count < 8 {
                return Some(());
            }
        }
    }
}

/// Eight digits, first in the lowest byte, as a number: pairs, then fours, then all.
#[inline]
fn eight_digits(word: u64) -> u64 {
    let pairs = (word.wrapping_mul(10).wrapping_add(word >> 8)) & 0x00FF_00FF_00FF_00FF;
    let fours = (pairs.wrapping_mul(100).wrapping_add(pairs >> 16)) & 0x0000_FFFF_0000_FFFF;
    (fours.wrapping_mul(10_000).wrapping_add(fours >> 32)) & 0xFFFF_FFFF
}

/// An exponent of up to three digits and the offset after it.
fn exponent(body: &[u8], mut at: usize) -> Option<(i32, usize)> {
    let sign = *body.get(at)?;
    at += usize::from(sign == b'-' || sign == b'+');
    let first = at;
    let mut value = 0;
    while let Some(digit) = body.get(at).filter(|b| b.is_ascii_digit()) {
        value = 10 * value + i32::from(digit - b'0');
        at += 1;
        if at - first > 3 {
            return None;
        }
    }
    (at > first).then_some((if sign == b'-' { -value } else { value }, at))
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used)]
    use super::*;
    use rand_chacha::ChaCha8Rng;
    use rand_core::{RngCore, SeedableRng};

    /// With room behind, as in a file.
    fn read(text: &str) -> Option<(f64, usize)> {
        plain(format!("{text},        ").as_bytes(), 0, b'.')
    }

    #[test]
    fn forms_by_hand() {
        assert_eq!(read("0"), Some((0.0, 1)));
        assert_eq!(read("-12.5"), Some((-12.5, 5)));
        assert_eq!(read("+1.5E-03"), Some((0.0015, 8)));
        assert_eq!(read("123456789.25"), Some((123_456_789.25, 12)));
        assert_eq!(read("1e22"), Some((1e22, 4)));
        for left in ["", ".5", "5.", "-", "nan", "1e", "1e+", "1e30", "12345678901234567890", "9007199254740993"] {
            assert_eq!(read(left), None, "{left}");
        }
        assert!(read("-0.0").is_some_and(|(value, _)| value.to_bits() == (-0.0_f64).to_bits()));
        assert_eq!(plain(b"1,5;0,25;;;;;", 0, b','), Some((1.5, 3)));
    }

    #[test]
    fn every_number_is_the_nearest_double() {
        let mut rng = ChaCha8Rng::seed_from_u64(11);
        let mut read_here = 0;
        for round in 0..50_000_u32 {
            let value = f64::from(rng.next_u32()) / f64::from(u32::MAX) * 10_f64.powi((round % 24) as i32 - 12);
            let decimals = (rng.next_u32() % 16) as usize;
            let text = if round % 2 == 0 { format!("{value:.decimals$}") } else { format!("{value:.decimals$e}") };
            let Some((found, end)) = read(&text) else { continue };
            read_here += 1;
            assert_eq!((found.to_bits(), end), (text.parse::<f64>().unwrap().to_bits(), text.len()), "{text}");
        }
        assert!(read_here > 35_000, "only {read_here} were read here");
    }
}
