//! Round numbers for an axis: its step, and the figures below it.
//! Must not draw dots.
//! Main functions: [`round_up`], [`figures`].

/// The next of 1, 2, 5, 10 … that is no smaller; 1 for what is no positive number.
pub(super) fn round_up(value: f64) -> f64 {
    if !(value.is_finite() && value > 0.0) {
        return 1.0;
    }
    let power = 10f64.powf(value.log10().floor());
    let step = [1.0, 2.0, 5.0, 10.0].into_iter().map(|n| n * power).find(|step| *step >= value * (1.0 - 1e-9));
    step.unwrap_or(value)
}

/// Figures of an axis from 0 to `end` under `columns` characters, about a figure every `every` characters, the unit after the last.
pub(super) fn figures(end: f64, unit: &str, columns: usize, every: usize) -> String {
    let mut line = String::new();
    if !(end.is_finite() && end > 0.0) || columns == 0 {
        return line;
    }
    let step = round_up(end * every as f64 / columns as f64);
    let ticks = (end / step).floor() as usize;
    // A figure stands below its place, the first at the very left; the last one, with the unit, in any case.
    let place = |n: usize, width: usize| {
        let value = n as f64 * step;
        let middle = (value / end * columns as f64) as usize;
        middle.saturating_sub(short(value).len() / 2).min(columns.saturating_sub(width))
    };
    let last = format!("{} {unit}", short(ticks as f64 * step));
    let last_at = place(ticks, last.chars().count());
    for n in 0..ticks {
        let text = short(n as f64 * step);
        let at = place(n, text.len());
        if at + text.len() < last_at && (at > line.len() || n == 0) {
            line += &" ".repeat(at.saturating_sub(line.len()));
            line += &text;
        }
    }
    let blanks = " ".repeat(last_at.saturating_sub(line.len()));
    line + &blanks + &last
}

/// No more digits than it needs.
pub(super) fn short(value: f64) -> String {
    let rounded: f64 = format!("{value:.2e}").parse().unwrap_or(value);
    format!("{rounded}")
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn steps_are_round() {
        assert_eq!([0.3, 1.0, 1.1, 3.0, 7.0, 40.0].map(round_up), [0.5, 1.0, 2.0, 5.0, 10.0, 50.0]);
        assert_eq!([0.0, -1.0, f64::NAN, f64::INFINITY].map(round_up), [1.0; 4]);
    }

    #[test]
    fn figures_stand_at_their_place() {
        assert_eq!(figures(16.0, "GHz", 40, 12), "0           5           10        15 GHz");
        assert_eq!(figures(f64::NAN, "GHz", 40, 12), "");
        assert_eq!(figures(3.0, "min", 6, 10), "0 min");
        assert_eq!(figures(21.0, "min", 79, 14).trim_end().rsplit_once("  ").map(|(_, last)| last), Some("20 min"));
    }
}
