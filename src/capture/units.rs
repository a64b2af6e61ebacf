//! Units as digitizer exports write them, in words or signs of any case.
//! Must not know columns or files.
//! Main function: [`unit`].

/// What a column's unit says.
#[derive(Debug, Clone, PartialEq)]
pub(super) enum ColumnUnit {
    /// Seconds in one.
    Time(f64),
    /// Volts in one.
    Voltage(f64),
    /// Anything else, as written.
    Other(String),
}

const TIME: &[(&str, f64)] = &[
    ("s", 1.0),
    ("sec", 1.0),
    ("second", 1.0),
    ("seconds", 1.0),
    ("ms", 1e-3),
    ("millisecond", 1e-3),
    ("milliseconds", 1e-3),
    ("us", 1e-6),
    ("microsecond", 1e-6),
    ("microseconds", 1e-6),
    ("ns", 1e-9),
    ("nanosecond", 1e-9),
    ("nanoseconds", 1e-9),
];
const VOLTAGE: &[(&str, f64)] = &[
    ("v", 1.0),
    ("volt", 1.0),
    ("volts", 1.0),
    ("mv", 1e-3),
    ("millivolt", 1e-3),
    ("millivolts", 1e-3),
    ("uv", 1e-6),
    ("microvolt", 1e-6),
    ("microvolts", 1e-6),
    ("kv", 1e3),
];
const OTHER: &[&str] = &["a", "ma", "ua", "amp", "amps", "ampere", "amperes", "w", "mw", "uw", "watt", "db", "div"];

/// Reads a unit word; `None` if the text is none.
pub(super) fn unit(text: &str) -> Option<ColumnUnit> {
    let text = text.trim();
    let word = text.to_lowercase().replace(['µ', 'μ'], "u");
    let of = |table: &[(&str, f64)]| table.iter().find(|(known, _)| *known == word).map(|&(_, factor)| factor);
    of(TIME)
        .map(ColumnUnit::Time)
        .or_else(|| of(VOLTAGE).map(ColumnUnit::Voltage))
        .or_else(|| OTHER.contains(&word.as_str()).then(|| ColumnUnit::Other(text.to_owned())))
}

/// The unit inside a column's name: `Time (ms)`, `Sig [V]`, `ramp_mV`, `t/us`.
pub(super) fn unit_in_name(name: &str) -> Option<ColumnUnit> {
    if let Some(open) = name.rfind(['(', '[']) {
        let inside = name[open + 1..].trim_end().trim_end_matches([')', ']']).trim();
        return unit(inside).or_else(|| (!inside.is_empty()).then(|| ColumnUnit::Other(inside.to_owned())));
    }
    let (_, suffix) = name.rsplit_once(['_', '/', ' '])?;
    // `CH_A` is a name, not amperes.
    unit(suffix).filter(|unit| !matches!(unit, ColumnUnit::Other(_)))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn words_and_signs() {
        assert_eq!(unit("Volts"), Some(ColumnUnit::Voltage(1.0)));
        assert_eq!(unit("µs"), Some(ColumnUnit::Time(1e-6)));
        assert_eq!(unit("A"), Some(ColumnUnit::Other("A".into())));
        assert_eq!(unit("CH1"), None);
        assert_eq!(unit_in_name("Time (ms)"), Some(ColumnUnit::Time(1e-3)));
        assert_eq!(unit_in_name("ramp_mV"), Some(ColumnUnit::Voltage(1e-3)));
        assert_eq!(unit_in_name("CH_A"), None);
        assert_eq!(unit_in_name("Sig [V]"), Some(ColumnUnit::Voltage(1.0)));
    }
}
