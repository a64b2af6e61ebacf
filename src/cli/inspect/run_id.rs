//! Run ids: UUID version 7, fixed where a seed is.
//! Must not be unique by luck alone: the number among the runs of a serial is part of it.
//! Main function: [`run_id`].

use sha2::{Digest as _, Sha256};
use uuid::Builder;

/// The id of a run.
///
/// * `started_ms`: start, ms since 1970.
/// * `earlier`: runs of this serial there are already; makes ids of one millisecond ascend (RFC 9562, 6.2, method 1).
/// * `seed`: fixes the rest; none: drawn.
pub(super) fn run_id(started_ms: i64, serial: &str, earlier: usize, seed: Option<u64>) -> String {
    let mut hash = Sha256::new();
    hash.update(seed.unwrap_or_else(drawn).to_le_bytes());
    hash.update(serial.as_bytes());
    let digest = hash.finalize();
    let mut random = [0; 10];
    for (to, from) in random.iter_mut().zip(digest.iter()) {
        *to = *from;
    }
    // The first twelve bits after the version are a counter.
    let counter = (earlier % 4096) as u16;
    [random[0], random[1]] = counter.to_be_bytes();
    Builder::from_unix_timestamp_millis(u64::try_from(started_ms).unwrap_or(0), &random).into_uuid().to_string()
}

/// A number that no two runs share: time, process and the keys that the standard library draws.
fn drawn() -> u64 {
    use std::hash::{BuildHasher as _, RandomState};
    RandomState::new().hash_one((std::process::id(), std::time::SystemTime::now()))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn fixed_by_the_seed_and_ascending() {
        let ids: Vec<String> = (0..20).map(|earlier| run_id(1_772_438_400_000, "A", earlier, Some(7))).collect();
        assert_eq!(ids[0], run_id(1_772_438_400_000, "A", 0, Some(7)));
        assert!(ids.is_sorted());
        assert!(ids.windows(2).all(|pair| pair[0] != pair[1]));
        assert_eq!((&ids[0][14..15], ids[0].len()), ("7", 36));
        assert_ne!(run_id(0, "A", 0, Some(7)), run_id(0, "B", 0, Some(7)));
        assert_ne!(run_id(0, "A", 0, None), run_id(0, "A", 0, None));
    }
}
