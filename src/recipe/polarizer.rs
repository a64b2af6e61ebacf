//! Keys of a polarizer step: the axes of the modes, or the extinction of one axis.
//! Must not turn anything.
//! Main types: [`Polarizer`], [`Polarization`].

use super::parse::Context;
use crate::{limits::reading::Item, quantity::Dimension};

/// Readings at polarizer angles.
#[derive(Debug, Clone, PartialEq)]
pub struct Polarizer {
    /// Coarse angles for the fit of the azimuth, rad; default 0° to 165° by 15°.
    pub angles: Vec<f64>,
    /// Angles about the null for the fine scan, rad; default −2° to 2° by 0.5°. Used where one axis is expected.
    pub fine: Vec<f64>,
    /// What the tube should show.
    pub polarization: Polarization,
}

/// Polarization of a type.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Polarization {
    /// One axis, set by a Brewster surface.
    Linear,
    /// Neighbouring modes at right angles, axes given by chance of manufacture.
    Random,
}

impl Polarizer {
    pub(super) const KEYS: &[&str] = &["angles", "fine", "polarization"];

    pub(super) fn fills(&self) -> &'static [&'static str] {
        match self.polarization {
            Polarization::Linear => &["extinction", "polarization_azimuth"],
            Polarization::Random => &["polarization_azimuth", "mode_orthogonality"],
        }
    }

    pub(super) fn read(context: &Context<'_, '_>) -> Option<Self> {
        let degrees = |first: i32, step: f64, n: i32| -> Vec<f64> {
            (first..first + n).map(|i| (f64::from(i) * step).to_radians()).collect()
        };
        let angles = context.or("angles", degrees(0, 15.0, 12), |item| list(item, 4));
        let fine = context.or("fine", degrees(-4, 0.5, 9), |item| list(item, 3));
        let words = [("linear", Polarization::Linear), ("random", Polarization::Random)];
        let polarization = context.table.need("polarization").and_then(|item| item.word(&words));
        Some(Self { angles: angles?, fine: fine?, polarization: polarization? })
    }
}

fn list(item: &Item<'_>, least: usize) -> Option<Vec<f64>> {
    let items = item.list()?;
    if items.len() < least {
        item.fault(format!("`{}` has {} angles; expected at least {least}", item.name, items.len()), None);
        return None;
    }
    items.iter().map(|item| item.quantity(Dimension::Angle)).collect()
}
