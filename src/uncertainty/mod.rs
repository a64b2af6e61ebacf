//! A measured value with its uncertainty budget, and the certificate an instrument stands on.
//! Must not know which measurand it is.
//! Main types: [`Measured`], [`BudgetLine`], [`Certificate`].

mod certificate;
mod rounding;

pub use certificate::Certificate;
pub use rounding::{decimals_for, joint};

use statrs::distribution::{ContinuousCDF, Normal, StudentsT};

/// Coverage probability of every expanded uncertainty in the program.
pub const COVERAGE: f64 = 0.9545;

/// How a line of a budget was found (JCGM 100:2008, 4.2 and 4.3).
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Evaluation {
    /// From the scatter of observations.
    TypeA,
    /// From anything else: a certificate, a resolution, a model.
    TypeB,
}

/// One contribution to an uncertainty.
#[derive(Debug, Clone, PartialEq)]
pub struct BudgetLine {
    /// Lines that share this id, in any measurand, run or tube, are fully correlated: `SIM-0001`, `scatter`.
    pub source_id: String,
    /// What it is, in words.
    pub line: String,
    /// Type A or B.
    pub evaluation: Evaluation,
    /// Standard uncertainty of the input, in its own SI unit.
    pub standard_uncertainty: f64,
    /// Degrees of freedom; infinite where nothing is known against it.
    pub dof: f64,
    /// ∂(value)/∂(input).
    pub sensitivity: f64,
    /// More words, or empty.
    pub note: String,
}

impl BudgetLine {
    /// A line already expressed in the unit of the result.
    pub fn direct(source_id: &str, line: &str, evaluation: Evaluation, u: f64, dof: f64) -> Self {
        Self {
            source_id: source_id.to_owned(),
            line: line.to_owned(),
            evaluation,
            standard_uncertainty: u,
            dof,
            sensitivity: 1.0,
            note: String::new(),
        }
    }

    /// The line's share of the result's standard uncertainty, in the unit of the result.
    pub fn contribution(&self) -> f64 {
        (self.sensitivity * self.standard_uncertainty).abs()
    }
}

/// A value with its budget.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Measured {
    /// Value in SI.
    pub value: f64,
    /// Its budget; lines are independent of each other.
    pub budget: Vec<BudgetLine>,
}

impl Measured {
    /// A value with one line only.
    pub fn with_line(value: f64, line: BudgetLine) -> Self {
        Self { value, budget: vec![line] }
    }

    /// Combined standard uncertainty, u² = Σ (cᵢ uᵢ)² (JCGM 100:2008, eq. 10).
    pub fn u(&self) -> f64 {
        self.budget.iter().map(|line| line.contribution().powi(2)).sum::<f64>().sqrt()
    }

    /// Effective degrees of freedom, ν = u⁴ / Σ (uᵢ⁴ / νᵢ) (Welch–Satterthwaite; JCGM 100:2008, G.4.1). May be infinite.
    pub fn dof(&self) -> f64 {
        let denominator: f64 = self.budget.iter().map(|line| line.contribution().powi(4) / line.dof.max(1e-9)).sum();
        if denominator > 0.0 { self.u().powi(4) / denominator } else { f64::INFINITY }
    }

    /// Coverage factor for [`COVERAGE`].
    pub fn coverage_factor(&self) -> f64 {
        coverage_factor(COVERAGE, self.dof())
    }

    /// Expanded uncertainty U = k·u for [`COVERAGE`].
    pub fn expanded(&self) -> f64 {
        self.coverage_factor() * self.u()
    }

    /// The same value and budget multiplied by a constant.
    pub fn scaled(&self, factor: f64) -> Self {
        let mut scaled = self.clone();
        scaled.value *= factor;
        for line in &mut scaled.budget {
            line.sensitivity *= factor;
        }
        scaled
    }
}

/// Two-sided coverage factor of Student's t.
///
/// * `probability`: wanted coverage, inside (0, 1).
/// * `dof`: degrees of freedom, at least 1, truncated to a whole number (JCGM 100:2008, G.4.1 note 1); infinite gives the normal.
pub fn coverage_factor(probability: f64, dof: f64) -> f64 {
    let upper = 0.5 + probability.clamp(0.0, 1.0 - 1e-12) / 2.0;
    // Beyond 1e6 the two differ by less than 1e-6.
    if dof.is_finite() && dof < 1e6 {
        StudentsT::new(0.0, 1.0, dof.floor().max(1.0)).map_or(f64::NAN, |t| t.inverse_cdf(upper))
    } else {
        Normal::standard().inverse_cdf(upper)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn coverage_factors_of_the_guide() {
        // JCGM 100:2008, table G.2, column 95.45 %.
        for (dof, k) in [(1.0, 13.97), (3.0, 3.31), (5.0, 2.65), (10.0, 2.28), (50.0, 2.05), (f64::INFINITY, 2.0)] {
            assert!((coverage_factor(COVERAGE, dof) - k).abs() < 0.006, "dof {dof}: the table has two decimals");
        }
    }

    #[test]
    fn combines_as_the_gauge_block_example() {
        // JCGM 100:2008, H.1: u² = 1002 nm², ν_eff = 16.7 from the rounded u.
        let line = |u: f64, dof: f64| BudgetLine::direct("", "", Evaluation::TypeB, u, dof);
        let measured = Measured {
            value: 0.0,
            budget: vec![
                line(25.0, 18.0),
                line(5.8, 24.0),
                line(3.9, 5.0),
                line(6.7, 8.0),
                line(2.9, 50.0),
                line(16.6, 2.0),
            ],
        };
        assert!((measured.u() - 31.7).abs() < 0.1);
        assert!((measured.dof() - 16.7).abs() < 0.3);
    }

    #[test]
    fn combines_as_the_impedance_example() {
        // JCGM 100:2008, H.2: five simultaneous readings of V, mA, rad; R = 127.732, X = 219.847, Z = 254.260 ohm with
        // u = 0.071, 0.295, 0.236. Means over the five make each reading's resistance one observation (approach 2).
        let readings = [
            (5.007, 19.663, 1.0456),
            (4.994, 19.639, 1.0438),
            (5.005, 19.640, 1.0468),
            (4.990, 19.685, 1.0428),
            (4.999, 19.678, 1.0433),
        ];
        let wanted = [(127.732, 0.071), (219.847, 0.295), (254.260, 0.236)];
        for (which, (value, u)) in wanted.into_iter().enumerate() {
            let one = |&(volt, milliampere, phase): &(f64, f64, f64)| {
                let ohm = volt / milliampere * 1e3;
                [ohm * f64::cos(phase), ohm * f64::sin(phase), ohm][which]
            };
            let values: Vec<f64> = readings.iter().map(one).collect();
            let mean = values.iter().sum::<f64>() / 5.0;
            let scatter = (values.iter().map(|v| (v - mean).powi(2)).sum::<f64>() / 20.0).sqrt();
            let measured = Measured::with_line(mean, BudgetLine::direct("", "", Evaluation::TypeA, scatter, 4.0));
            // Both approaches of the guide agree to the digits printed there, the last one rounded.
            assert!(
                (measured.value - value).abs() < 1e-3 && (measured.u() - u).abs() < 1e-3,
                "{which}: {mean} {scatter}"
            );
            assert_eq!(measured.dof(), 4.0);
        }
    }
}
