//! Names of capture files: their natural order, and which belong together.
//! Must not look at files.
//! Main functions: [`natural_order`], [`pair_names`].

use std::cmp::Ordering;

/// Orders names so that `c9` comes before `c10`: runs of digits by value, all else by byte.
pub fn natural_order(a: &str, b: &str) -> Ordering {
    let (mut x, mut y) = (a.as_bytes(), b.as_bytes());
    while let (Some(&p), Some(&q)) = (x.first(), y.first()) {
        let order = if p.is_ascii_digit() && q.is_ascii_digit() {
            let ((m, rest_x), (n, rest_y)) = (digits(x), digits(y));
            (x, y) = (rest_x, rest_y);
            m.len().cmp(&n.len()).then(m.cmp(n))
        } else {
            (x, y) = (&x[1..], &y[1..]);
            p.cmp(&q)
        };
        if order != Ordering::Equal {
            return order;
        }
    }
    x.len().cmp(&y.len()).then_with(|| a.cmp(b))
}

/// Leading digits without their zeros, and the rest.
fn digits(text: &[u8]) -> (&[u8], &[u8]) {
    let end = text.iter().position(|b| !b.is_ascii_digit()).unwrap_or(text.len());
    let (run, rest) = text.split_at(end);
    let zeros = run.iter().position(|&b| b != b'0').unwrap_or(run.len());
    (&run[zeros..], rest)
}

/// Groups of file names that hold channels of one capture, as indices into `names`, in the order of their first member.
///
/// Two names belong together if they differ only in the digit after `CH` (`F0001CH1.CSV`, `F0001CH2.CSV`), or in the
/// digit of a leading `C1` … `C8` that a letter follows (`C2scan.csv`, `C3scan.csv`). A name alone is a group of one.
pub fn pair_names(names: &[String]) -> Vec<Vec<usize>> {
    let mut groups: Vec<(Option<String>, Vec<usize>)> = Vec::new();
    let mut known: std::collections::HashMap<String, usize> = std::collections::HashMap::new();
    for (index, name) in names.iter().enumerate() {
        let key = key(name);
        match key.as_ref().and_then(|key| known.get(key)) {
            Some(&group) if !groups[group].1.iter().any(|&i| names[i] == *name) => groups[group].1.push(index),
            _ => {
                if let Some(key) = &key {
                    known.entry(key.clone()).or_insert(groups.len());
                }
                groups.push((key, vec![index]));
            }
        }
    }
    groups.into_iter().map(|(_, group)| group).collect()
}

/// Whether a file's name says that it holds one channel of several: `F0001CH1.CSV`, `C2scan.csv`.
pub fn is_channel_name(name: &str) -> bool {
    key(name).is_some()
}

/// The name with its channel digit starred; `None` if it has none.
fn key(name: &str) -> Option<String> {
    let base = name.rfind(['/', '\\']).map_or(0, |slash| slash + 1);
    let at = channel_digit(name.as_bytes(), base)?;
    // The digit is one ASCII byte, so both cuts are at character borders.
    Some(format!("{}*{}", name.get(..at)?, name.get(at + 1..)?))
}

/// Offset of the channel's digit.
fn channel_digit(name: &[u8], base: usize) -> Option<usize> {
    let file = name.get(base..)?;
    let digit = |at: usize| file.get(at).is_some_and(|b| (b'1'..=b'8').contains(b));
    let lone = |at: usize| digit(at) && !file.get(at + 1).is_some_and(u8::is_ascii_digit);
    let starts_word = |at: usize| match at.checked_sub(1).and_then(|before| file.get(before)) {
        None => true,
        // `research1` has no channel; `scopeCH1` has.
        Some(before) if file[at] == b'C' => !before.is_ascii_uppercase(),
        Some(before) => !before.is_ascii_alphabetic(),
    };
    let after_ch = (0..file.len().saturating_sub(2))
        .filter(|&at| matches!(&file[at..at + 2], b"CH" | b"ch" | b"Ch") && starts_word(at) && lone(at + 2))
        .map(|at| at + 2)
        .next_back();
    let after_c = || {
        let letter = file.get(2).is_some_and(|b| b.is_ascii_alphabetic() || *b == b'_' || *b == b'-');
        (file.first() == Some(&b'C') && digit(1) && letter).then_some(1)
    };
    after_ch.or_else(after_c).map(|at| base + at)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn names(list: &[&str]) -> Vec<String> {
        list.iter().map(|&name| name.to_owned()).collect()
    }

    #[test]
    fn numbers_in_names_go_by_value() {
        let mut list = names(&["c10", "c9", "c09", "b", "c1a", "c1", "c"]);
        list.sort_by(|a, b| natural_order(a, b));
        assert_eq!(list, names(&["b", "c", "c1", "c1a", "c09", "c9", "c10"]));
    }

    #[test]
    fn channels_of_one_capture_go_together() {
        let pairs = |list: &[&str]| pair_names(&names(list));
        assert_eq!(
            pairs(&["d/F1CH1.CSV", "d/F2CH1.CSV", "d/F1CH2.CSV", "e/F2CH2.CSV"]),
            [vec![0, 2], vec![1], vec![3]]
        );
        assert_eq!(pairs(&["A2CH1_raw.CSV", "A2CH1.CSV", "A2CH2_raw.CSV"]), [vec![0, 2], vec![1]]);
        assert_eq!(pairs(&["C2scan01.csv", "C3scan01.csv", "C3scan02.csv"]), [vec![0, 1], vec![2]]);
        assert_eq!(pairs(&["c00001.csv", "c00002.csv", "C1.csv", "C2.csv"]), [vec![0], vec![1], vec![2], vec![3]]);
        assert_eq!(pairs(&["research1.csv", "research2.csv", "ARCH1.csv", "ARCH2.csv"]).len(), 4);
        assert_eq!(pairs(&["CH1.csv", "CH1.csv"]), [vec![0], vec![1]], "the same name twice is no pair");
    }
}
