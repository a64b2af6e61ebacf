//! One axis: azimuth from a turn of the polarizer, extinction from a fine scan through the null.
//! Must not turn anything itself.
//! Main type: [`Linear`].

use super::{take_out, turn};
use crate::{
    phrase::{Saying, figure, questions, reasons},
    recipe::Polarizer,
    record::{question::Answer, sheet::Value},
    run::{
        filled::Filled,
        malus::{self, Malus},
        notebook::Notebook,
        steps::{Given, Room, Step, Wish},
    },
    station::{ReadingKind, file::Polarizer as StationPolarizer},
    uncertainty::{BudgetLine, Evaluation, Measured},
};

/// Fewest readings that a fit of three unknowns shows a scatter with.
const FEWEST: usize = 5;

#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Stage {
    Coarse,
    Fine,
    Block,
    Dark,
    Open,
    Out,
    Done,
}

/// The step.
pub(super) struct Linear {
    keys: Polarizer,
    station: Option<StationPolarizer>,
    stage: Stage,
    /// Angle within the stage.
    index: usize,
    /// The polarizer stands at the angle; the reading is due.
    turned: bool,
    coarse: Vec<(f64, f64)>,
    fine: Vec<(f64, f64)>,
    fit: Option<Malus>,
    dark: Option<f64>,
    /// Why something is missing.
    reason: Option<Saying>,
    filled: Vec<Filled>,
}

impl Linear {
    pub fn new(keys: &Polarizer) -> Self {
        Self {
            keys: keys.clone(),
            station: None,
            stage: Stage::Coarse,
            index: 0,
            turned: false,
            coarse: Vec::new(),
            fine: Vec::new(),
            fit: None,
            dark: None,
            reason: None,
            filled: Vec::new(),
        }
    }

    /// Expected null: across the strong axis.
    fn null_at(&self) -> f64 {
        self.fit.map_or(0.0, |fit| fit.axis) + std::f64::consts::FRAC_PI_2
    }

    fn angles(&self) -> (&[f64], f64) {
        match self.stage {
            Stage::Coarse => (&self.keys.angles, 0.0),
            _ => (&self.keys.fine, self.null_at()),
        }
    }

    /// The angle at hand as it can be set, and the question for it; none past the last.
    fn angle(&self) -> Option<(f64, Wish)> {
        let (angles, origin) = self.angles();
        angles.get(self.index).map(|angle| turn(origin + angle))
    }

    fn read(&mut self, reading: Result<f64, &str>) {
        if let (Some((angle, _)), Ok(watts)) = (self.angle(), reading) {
            let point = (angle, watts);
            if self.stage == Stage::Coarse { self.coarse.push(point) } else { self.fine.push(point) }
        }
        if let Err(reason) = reading {
            self.reason.get_or_insert_with(|| Saying::outside(reason));
        }
        self.turned = false;
        self.index += 1;
        if self.index < self.angles().0.len() {
            return;
        }
        self.index = 0;
        if self.stage == Stage::Coarse {
            self.fit = if self.coarse.len() >= FEWEST { malus::fit(&self.coarse) } else { None };
            self.stage = if self.fit.is_some() { Stage::Fine } else { Stage::Out };
        } else {
            self.stage = Stage::Block;
        }
    }

    fn finish(&mut self) {
        self.stage = Stage::Done;
        let Some((fit, station)) = self.fit.zip(self.station.clone()) else {
            let few = reasons::FEW_ANGLE_READINGS.with([figure(self.coarse.len()), figure(FEWEST)]);
            let reason = self.reason.clone().unwrap_or(few);
            self.filled =
                vec![Filled::absent("extinction", reason.clone()), Filled::absent("polarization_azimuth", reason)];
            return;
        };
        self.filled = vec![self.extinction(&fit, &station), azimuth(&fit, station.u_angle)];
    }

    fn extinction(&self, fit: &Malus, station: &StationPolarizer) -> Filled {
        let key = "extinction";
        let Some(dark) = self.dark else {
            let reason = self.reason.clone().unwrap_or_else(|| (&reasons::NO_DARK_READING).into());
            return Filled::absent(key, reason);
        };
        let null_at = self.null_at();
        let scan: Vec<_> = self.fine.iter().map(|(at, watts)| (malus::difference(*at, null_at), *watts)).collect();
        let Some((least, u_least, _)) = malus::null(&scan) else {
            return Filled::absent(key, &reasons::NO_NULL);
        };
        let greatest = fit.mean + fit.swing - dark;
        let u_greatest = fit.scatter / ((fit.dof + 3) as f64).sqrt() * 3f64.sqrt();
        let least = least - dark;
        // Both the scan and the one dark reading carry the noise of the meter at low light.
        let dof = self.fine.len().saturating_sub(3).max(1) as f64;
        let u_dark = u_least * (self.fine.len() as f64 / 3.0).sqrt();
        let u_low = u_least.hypot(u_dark);
        if !greatest.is_finite() || greatest <= 0.0 {
            return Filled::absent(key, &reasons::NO_LIGHT_THROUGH);
        }
        if least < 2.0 * u_low {
            let bound = greatest / (least.max(0.0) + 2.0 * u_low).max(f64::MIN_POSITIVE);
            let bound = bound.min(station.extinction);
            return Filled::plain(key, Value::AtLeast(bound)).noted(&reasons::NULL_UNDER_NOISE);
        }
        let value = greatest / least;
        let line = |source: &str, words: &str, evaluation, u: f64, dof: f64, sensitivity: f64| {
            let mut line = BudgetLine::direct(source, words, evaluation, u, dof);
            line.sensitivity = sensitivity;
            line
        };
        let (a, b) = (Evaluation::TypeA, Evaluation::TypeB);
        // 1/ε_seen = 1/ε + 1/E: the polarizer's own E is no more known than its number, so its whole share is a half-width.
        let own = value.powi(2) / station.extinction / 3f64.sqrt();
        let budget = vec![
            line("scatter", "greatest power", a, u_greatest, fit.dof as f64, 1.0 / least),
            line("null", "least power, fine scan", a, u_least, dof, -greatest / least.powi(2)),
            line("dark", "power with the beam blocked", a, u_dark, dof, greatest / least.powi(2)),
            line("polarizer", "extinction of the polarizer itself", b, own, f64::INFINITY, 1.0),
        ];
        Filled::number(key, &Measured { value, budget })
    }
}

/// The strong axis with the polarizer's own scale.
fn azimuth(fit: &Malus, u_angle: f64) -> Filled {
    let budget = vec![
        BudgetLine::direct("scatter", "scatter about Malus's law", Evaluation::TypeA, fit.u_axis, fit.dof as f64),
        BudgetLine::direct("polarizer", "angle of the polarizer", Evaluation::TypeB, u_angle, f64::INFINITY),
    ];
    Filled::number("polarization_azimuth", &Measured { value: fit.axis, budget })
}

impl Step for Linear {
    fn begin(&mut self, room: &mut Room<'_>) {
        let station = &room.plan.station;
        let lacking = match (&station.polarizer, &station.power_meter) {
            (None, _) => Some(&reasons::NO_POLARIZER),
            (_, None) => Some(&reasons::NO_POWER_METER),
            _ if room.from_captures => Some(&reasons::FOLDER_HAS_NO_TURN),
            _ => None,
        };
        self.station.clone_from(&station.polarizer);
        if let Some(reason) = lacking {
            self.filled = vec![Filled::absent("extinction", reason), Filled::absent("polarization_azimuth", reason)];
            self.stage = Stage::Done;
        }
    }

    fn wants(&self) -> Wish {
        match self.stage {
            Stage::Coarse | Stage::Fine => match self.angle() {
                Some(_) if self.turned => Wish::Reading(ReadingKind::Power),
                Some((_, ask)) => ask,
                None => Wish::Nothing,
            },
            Stage::Block => Wish::done("block_beam", &questions::BLOCK_BEAM),
            Stage::Dark => Wish::Reading(ReadingKind::DarkPower),
            Stage::Open => Wish::done("open_beam", &questions::OPEN_BEAM),
            Stage::Out => take_out(),
            Stage::Done => Wish::Nothing,
        }
    }

    fn take(&mut self, given: Given<'_>, _room: &mut Room<'_>) {
        match (self.stage, given) {
            (Stage::Coarse | Stage::Fine, Given::Answer(Answer::Done)) => self.turned = true,
            (Stage::Coarse | Stage::Fine, Given::Answer(Answer::CannotSay(reason))) => {
                self.reason = Some(Saying::outside(reason));
                self.fit = None;
                self.stage = Stage::Out;
            }
            (Stage::Coarse | Stage::Fine, Given::Reading(reading)) => self.read(reading),
            (Stage::Block, Given::Answer(Answer::Done)) => self.stage = Stage::Dark,
            (Stage::Block, Given::Answer(Answer::CannotSay(reason))) => {
                self.reason = Some(Saying::outside(reason));
                self.stage = Stage::Out;
            }
            (Stage::Dark, Given::Reading(reading)) => {
                match reading {
                    Ok(watts) => self.dark = Some(watts),
                    Err(reason) => self.reason = Some(Saying::outside(reason)),
                }
                self.stage = Stage::Open;
            }
            (Stage::Open, _) => self.stage = Stage::Out,
            (Stage::Out, _) => self.finish(),
            _ => {}
        }
    }

    fn filled(&self) -> &[Filled] {
        &self.filled
    }

    fn expected_s(&self, _book: &Notebook) -> Option<f64> {
        let left = match self.stage {
            Stage::Coarse => self.keys.angles.len() + self.keys.fine.len() - self.index,
            Stage::Fine => self.keys.fine.len() - self.index,
            Stage::Done => return Some(0.0),
            _ => 1,
        };
        Some(5.0 * left as f64)
    }
}
