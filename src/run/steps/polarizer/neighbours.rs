//! The angle between neighbours from captures that show both at once: what holds even where the tube swaps its axes.
//! Must not follow a mode from capture to capture.
//! Main type: [`Neighbours`].

use crate::run::malus;

/// Fewest pairs that decide, four more than a fit of three unknowns needs at least.
const FEWEST: usize = 8;

/// Pairs of neighbouring modes seen in one capture each.
#[derive(Debug, Clone, Default)]
pub(super) struct Neighbours {
    /// (polarizer rad, sum of the shares of light that pass).
    pairs: Vec<(f64, f64)>,
}

/// The angle between neighbours.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Between {
    /// In [0, 90°], rad.
    pub angle: f64,
    /// Its standard uncertainty, rad.
    pub u: f64,
    /// Pairs less three.
    pub dof: usize,
}

impl Neighbours {
    /// Takes the modes of one capture: (place on the comb, share of its light that passes).
    pub fn take(&mut self, angle: f64, modes: &[(i64, f64)]) {
        for (place, share) in modes {
            if let Some((_, next)) = modes.iter().find(|(other, _)| *other == place + 1) {
                self.pairs.push((angle, share + next));
            }
        }
    }

    /// cos²(θ − α) + cos²(θ − β) = 1 + cos(α − β)·cos(2θ − α − β): how much the sum swings as the polarizer turns is the
    /// cosine of the angle between the axes, whichever mode has which.
    pub fn between(&self) -> Option<Between> {
        if self.pairs.len() < FEWEST {
            return None;
        }
        let fit = malus::fit(&self.pairs)?;
        let swing = fit.swing.min(1.0);
        let u = 2.0 * fit.u_axis * fit.swing / (1.0 - swing * swing).sqrt().max(1e-3);
        u.is_finite().then_some(Between { angle: swing.acos(), u, dof: fit.dof })
    }
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used)]
    use super::*;

    #[test]
    fn a_swap_in_the_middle_changes_nothing() {
        for between in [70f64, 88.0] {
            let mut neighbours = Neighbours::default();
            for i in 0..12 {
                let angle = f64::from(i) * 15f64.to_radians();
                let share = |axis: f64| (angle - axis.to_radians()).cos().powi(2);
                let (one, other) = (share(20.0), share(20.0 + between));
                let modes = if i < 6 { [(3, one), (4, other)] } else { [(3, other), (4, one)] };
                neighbours.take(angle, &modes);
            }
            let found = neighbours.between().unwrap();
            assert!((found.angle.to_degrees() - between).abs() < 1e-6, "exact without noise");
        }
    }
}
