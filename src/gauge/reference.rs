//! The chart of a reference tube: each check against its own bounds, and cumulative sums for a slow drift (`quality.md` 28).
//! Must not decide what an alarm means for a tube.
//! Main functions: [`chart`], [`with_sums`].

use crate::{
    numerics::cusum::{cusum, sd_of_moving_range},
    record::reference::ReferenceCheck,
};

/// Slack of the sums, standard deviations (`quality.md` 28).
pub const SLACK: f64 = 0.25;
/// A sum above this is an alarm, standard deviations: with [`SLACK`], one false alarm in 367 checks (`quality.md` 28).
pub const ALARM: f64 = 8.0;
/// Checks that give the standard deviation where the station file states none (common practice: 20 at least).
pub const BASELINE: usize = 20;

/// What a measurand of a reference tube reads on a bench that is in order.
#[derive(Debug, Clone, PartialEq)]
pub struct Target {
    /// Measurand's key.
    pub measurand: String,
    /// Value, SI.
    pub value: f64,
    /// A check may be this far off, SI.
    pub within: f64,
    /// Standard deviation of one check, SI, if it is known.
    pub sd: Option<f64>,
}

/// One check on a chart.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Point {
    /// Value, SI.
    pub value: f64,
    /// It is inside its bounds; a value that is not finite is not.
    pub inside: bool,
    /// Cumulative sums (up, down); none while no standard deviation is known.
    pub sums: Option<(f64, f64)>,
}

impl Point {
    /// A sum is above the alarm.
    pub fn drifts(&self) -> bool {
        self.sums.is_some_and(drifts)
    }
}

/// A sum is above [`ALARM`].
pub fn drifts((up, down): (f64, f64)) -> bool {
    up > ALARM || down > ALARM
}

/// Whether a value is inside the bounds of its target, ends inclusive.
pub fn inside(target: &Target, value: f64) -> bool {
    (value - target.value).abs() <= target.within
}

/// The chart of one measurand.
///
/// * `values`: one a check, in the order of time, SI.
///
/// Returns the standard deviation that the sums are counted in, SI, and a point for each value. Without a stated one it
/// is that of the moving range of the first [`BASELINE`] checks; with fewer there are no sums.
pub fn chart(target: &Target, values: &[f64]) -> (Option<f64>, Vec<Point>) {
    let baseline = values.get(..BASELINE).and_then(sd_of_moving_range);
    let sd = target.sd.or(baseline).filter(|sd| sd.is_finite() && *sd > 0.0);
    let sums: Vec<Option<(f64, f64)>> = match sd {
        Some(sd) => {
            let z: Vec<f64> = values.iter().map(|value| (value - target.value) / sd).collect();
            cusum(&z, SLACK).into_iter().map(Some).collect()
        }
        None => vec![None; values.len()],
    };
    let point =
        |(value, sums): (&f64, Option<(f64, f64)>)| Point { value: *value, inside: inside(target, *value), sums };
    (sd, values.iter().zip(sums).map(point).collect())
}

/// Puts the sums to the checks of one reference tube, which stand in the order of time.
pub fn with_sums(checks: &mut [ReferenceCheck], targets: &[Target]) {
    for target in targets {
        let has = |check: &ReferenceCheck| check.value(&target.measurand).map(|value| value.value);
        let values: Vec<f64> = checks.iter().filter_map(has).collect();
        let (_, points) = chart(target, &values);
        let own =
            |check: &mut ReferenceCheck| check.values.iter_mut().position(|value| value.measurand == target.measurand);
        let mut points = points.into_iter();
        for check in checks.iter_mut() {
            if let Some(place) = own(check) {
                check.values[place].sums = points.next().and_then(|point| point.sums);
            }
        }
    }
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used)]
    use super::*;
    use crate::record::reference::CheckedValue;

    fn target(sd: Option<f64>) -> Target {
        Target { measurand: "power".into(), value: 100.0, within: 3.0, sd }
    }

    #[test]
    fn a_single_value_out_is_seen_at_once_and_a_drift_long_before_it_is_out() {
        let (sd, points) = chart(&target(Some(1.0)), &[100.0, 103.0, 103.1, f64::NAN]);
        assert_eq!(sd, Some(1.0));
        assert_eq!(points.iter().map(|p| p.inside).collect::<Vec<_>>(), [true, true, false, false]);
        // One standard deviation off, well inside: S grows by 0.75 a check and passes 8 at the eleventh.
        let (_, points) = chart(&target(Some(1.0)), &[101.0; 12]);
        assert!(points.iter().all(|p| p.inside));
        assert_eq!(points.iter().position(Point::drifts), Some(10));
    }

    #[test]
    fn without_a_standard_deviation_the_first_twenty_give_it() {
        let values: Vec<f64> = (0..20).map(|k| 100.0 + f64::from(k % 2)).collect();
        assert_eq!(chart(&target(None), &values[..19]).0, None);
        assert!((chart(&target(None), &values).0.unwrap() - 1.0 / 1.128).abs() < 1e-12);
        // Twenty equal values would divide by nothing.
        assert_eq!(chart(&target(None), &[100.0; 20]).0, None);
    }

    #[test]
    fn a_check_without_the_measurand_is_passed_over() {
        let check = |value: Option<f64>| ReferenceCheck {
            serial: "R".into(),
            run_id: String::new(),
            at: String::new(),
            stored: true,
            values: value
                .map(|value| CheckedValue { measurand: "power".into(), value, sums: None })
                .into_iter()
                .collect(),
        };
        let mut checks = [check(Some(101.0)), check(None), check(Some(101.0))];
        with_sums(&mut checks, &[target(Some(1.0))]);
        assert_eq!(checks[2].values[0].sums, Some((1.5, 0.0)));
    }
}
