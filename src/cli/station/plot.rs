//! The chart of one measurand as plain text: shape says all, no colour.
//! Must not decide what is out of bounds.
//! Main function: [`plot`].

use crate::report::BenchChart;

/// Checks shown: the latest.
const COLUMNS: usize = 72;
/// Lines from one bound to the middle.
const HALF: i32 = 3;

/// Lines from the upper bound down to the lower: `o` a check, `X` one out of bounds, which stands at or beyond its bound.
pub(super) fn plot(chart: &BenchChart) -> Vec<String> {
    let from = chart.points.len().saturating_sub(COLUMNS);
    let shown = chart.points.get(from..).unwrap_or(&[]);
    if shown.is_empty() {
        return Vec::new();
    }
    let row = |value: f64| {
        let place = (value - chart.value) / chart.within * f64::from(HALF);
        if place.is_finite() { place.round().clamp(f64::from(-HALF - 1), f64::from(HALF + 1)) as i32 } else { HALF + 1 }
    };
    let ground = |line: i32| if line.abs() == HALF { '-' } else { ' ' };
    let text = |line: i32| -> String {
        let cell = |point: &crate::report::BenchPoint| match (row(point.value) == line, point.inside) {
            (true, true) => 'o',
            (true, false) => 'X',
            _ => ground(line),
        };
        let label = match line {
            HALF => format!("+{:.*}", chart.decimals, chart.within),
            0 => format!("{:.*}", chart.decimals, chart.value),
            line if line == -HALF => format!("-{:.*}", chart.decimals, chart.within),
            _ => String::new(),
        };
        format!("{label:>10} |{}", shown.iter().map(cell).collect::<String>()).trim_end().to_owned()
    };
    (-HALF - 1..=HALF + 1).rev().map(text).collect()
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::report::BenchPoint;

    #[test]
    fn checks_stand_where_they_read() {
        let point = |value: f64, inside| BenchPoint {
            at: chrono::DateTime::UNIX_EPOCH.fixed_offset(),
            run_id: String::new(),
            value,
            inside,
            sums: None,
        };
        let chart = BenchChart {
            serial: "R".into(),
            measurand: &crate::measurand::CATALOGUE[0].name,
            unit: "mW".into(),
            decimals: 2,
            value: 1.0,
            within: 0.3,
            alarm: 8.0,
            points: vec![point(1.0, true), point(1.3, true), point(0.6, false), point(f64::NAN, false)],
        };
        let wanted = [
            "           |   X",
            "     +0.30 |-o--",
            "           |",
            "           |",
            "      1.00 |o",
            "           |",
            "           |",
            "     -0.30 |----",
            "           |  X",
        ];
        assert_eq!(plot(&chart), wanted);
        assert!(plot(&BenchChart { points: Vec::new(), ..chart }).is_empty());
    }
}
