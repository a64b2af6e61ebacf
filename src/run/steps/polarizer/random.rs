//! Neighbouring modes at right angles: a capture at each angle, each mode's axis by Malus's law.
//! Must not turn anything itself.
//! Main type: [`Random`].

use super::{take_out, turn};
use crate::{
    recipe::Polarizer,
    record::{event::Captured, question::Answer},
    run::{
        filled::Filled,
        malus::{self, Malus},
        notebook::Notebook,
        steps::{Given, Room, Step, Wish},
    },
    uncertainty::{BudgetLine, Evaluation, Measured},
};

/// Fewest captures that a fit of three unknowns shows a scatter with.
const FEWEST: usize = 5;
const KEYS: [&str; 2] = ["polarization_azimuth", "mode_orthogonality"];

/// One mode followed over the captures.
struct Track {
    /// Number of its place on the comb.
    place: i64,
    /// (angle, height); a mode that a capture hides has height 0 there.
    points: Vec<(f64, f64)>,
}

/// The step.
pub(super) struct Random {
    keys: Polarizer,
    u_angle: f64,
    spacing: f64,
    index: usize,
    turned: bool,
    out: bool,
    done: bool,
    /// Where the comb's place 0 stood last, and how fast it moves: Hz on the scan axis, Hz a capture.
    origin: Option<f64>,
    step: f64,
    tracks: Vec<Track>,
    angles: Vec<f64>,
    reason: Option<String>,
    filled: Vec<Filled>,
}

impl Random {
    pub fn new(keys: &Polarizer) -> Self {
        Self {
            keys: keys.clone(),
            u_angle: 0.0,
            spacing: 0.0,
            index: 0,
            turned: false,
            out: false,
            done: false,
            origin: None,
            step: 0.0,
            tracks: Vec::new(),
            angles: Vec::new(),
            reason: None,
            filled: Vec::new(),
        }
    }

    fn angle(&self) -> Option<(f64, Wish)> {
        self.keys.angles.get(self.index).map(|angle| turn(*angle))
    }

    fn captured(&mut self, captured: &Captured) {
        let finding = &captured.finding;
        if let Some(reason) = &finding.refused {
            self.reason.get_or_insert_with(|| reason.clone());
            return;
        }
        let set = self.angle().map_or(0.0, |(angle, _)| angle);
        let angle = captured.fact.polarizer.filter(|angle| angle.is_finite()).unwrap_or(set);
        let modes: Vec<(f64, f64)> = finding
            .modes
            .iter()
            .filter(|mode| mode.position.is_finite() && mode.peak_height.is_finite())
            .map(|mode| (mode.position, mode.peak_height))
            .collect();
        self.angles.push(angle);
        self.follow(angle, &modes, finding.free_spectral_range);
    }

    /// Gives each mode its place on the comb; the comb may have walked by less than half a spacing beyond what it did before.
    fn follow(&mut self, angle: f64, modes: &[(f64, f64)], fsr: f64) {
        let strongest = modes.iter().max_by(|a, b| a.1.total_cmp(&b.1));
        let Some((reference, _)) = strongest else { return };
        let expected = self.origin.map_or(*reference, |origin| origin + self.step);
        // Departure of each mode from the places of the comb, as a circular mean weighted by height.
        let (mut cos, mut sin) = (0.0, 0.0);
        for (position, height) in modes {
            let phase = std::f64::consts::TAU * folded(position - expected, fsr) / self.spacing;
            cos += height * phase.cos();
            sin += height * phase.sin();
        }
        let shift = self.spacing * sin.atan2(cos) / std::f64::consts::TAU;
        if !shift.is_finite() {
            return;
        }
        if let Some(origin) = self.origin {
            self.step = expected + shift - origin;
        }
        let origin = expected + shift;
        self.origin = Some(origin);
        for (position, height) in modes {
            let place = (folded(position - origin, fsr) / self.spacing).round() as i64;
            match self.tracks.iter_mut().find(|track| track.place == place) {
                Some(track) => track.points.push((angle, *height)),
                None => self.tracks.push(Track { place, points: vec![(angle, *height)] }),
            }
        }
    }

    /// Axis of each mode, by place.
    fn axes(&self) -> Vec<(i64, Malus)> {
        let mut axes = Vec::new();
        for track in &self.tracks {
            let mut points = track.points.clone();
            // Hidden by the polarizer where the capture shows others only.
            points.extend(self.angles.iter().filter(|a| !track.points.iter().any(|(b, _)| a == &b)).map(|a| (*a, 0.0)));
            // A mode that shows at two angles or fewer came or went at the edge of the line.
            if track.points.len() >= 3
                && let Some(fit) = malus::fit(&points)
            {
                axes.push((track.place, fit));
            }
        }
        axes.sort_by_key(|(place, _)| *place);
        axes
    }

    fn finish(&mut self) {
        self.done = true;
        if self.angles.len() < FEWEST {
            let few = format!("{} captures with the polarizer, expected {FEWEST} or more", self.angles.len());
            let reason = self.reason.clone().unwrap_or(few);
            self.filled = KEYS.map(|key| Filled::absent(key, reason.as_str())).to_vec();
            return;
        }
        let axes = self.axes();
        let even = family(&axes, 0);
        let odd = family(&axes, 1);
        self.filled = match (even, odd) {
            (Some(even), Some(odd)) => vec![self.azimuth(&even), self.between(&even, &odd)],
            (Some(one), None) | (None, Some(one)) => {
                let reason = "modes of one family alone were seen: no neighbours";
                vec![self.azimuth(&one), Filled::absent(KEYS[1], reason)]
            }
            (None, None) => KEYS.map(|key| Filled::absent(key, "no mode could be followed over the angles")).to_vec(),
        };
    }

    fn scale_line(&self) -> BudgetLine {
        BudgetLine::direct("polarizer", "angle of the polarizer", Evaluation::TypeB, self.u_angle, f64::INFINITY)
    }

    fn azimuth(&self, family: &Family) -> Filled {
        let scatter =
            BudgetLine::direct("scatter", "scatter about Malus's law", Evaluation::TypeA, family.u, family.dof);
        let measured = Measured { value: family.axis, budget: vec![scatter, self.scale_line()] };
        Filled::number(KEYS[0], &measured)
            .noted("of one family of modes; the other's is given by the angle between neighbours")
    }

    /// In [0°, 180°): which neighbour comes first is chance, so 90.3° and 89.7° say the same.
    fn between(&self, even: &Family, odd: &Family) -> Filled {
        let value = malus::turned(odd.axis - even.axis);
        let one = BudgetLine::direct("scatter", "axis of one family", Evaluation::TypeA, even.u, even.dof);
        let other = BudgetLine::direct("scatter, neighbours", "axis of the other", Evaluation::TypeA, odd.u, odd.dof);
        let measured = Measured { value, budget: vec![one, other, self.scale_line()] };
        Filled::number(KEYS[1], &measured)
    }
}

/// A difference of positions into half an order either side.
fn folded(difference: f64, fsr: f64) -> f64 {
    if fsr > 0.0 { difference - fsr * (difference / fsr).round() } else { difference }
}

/// Axis of every second mode.
struct Family {
    axis: f64,
    u: f64,
    dof: f64,
}

/// Mean axis of the modes of one parity, by doubled angles weighted by the square of the swing.
fn family(axes: &[(i64, Malus)], parity: i64) -> Option<Family> {
    let members: Vec<&Malus> =
        axes.iter().filter(|(place, _)| place.rem_euclid(2) == parity).map(|(_, malus)| malus).collect();
    let weight = |malus: &Malus| malus.swing * malus.swing;
    let total: f64 = members.iter().map(|malus| weight(malus)).sum();
    if !(total.is_finite() && total > 0.0) {
        return None;
    }
    let cos: f64 = members.iter().map(|malus| weight(malus) * (2.0 * malus.axis).cos()).sum();
    let sin: f64 = members.iter().map(|malus| weight(malus) * (2.0 * malus.axis).sin()).sum();
    let axis = malus::turned(0.5 * sin.atan2(cos));
    let u = members.iter().map(|malus| (weight(malus) / total * malus.u_axis).powi(2)).sum::<f64>().sqrt();
    let dof: usize = members.iter().map(|malus| malus.dof).sum();
    Some(Family { axis, u, dof: dof as f64 })
}

impl Step for Random {
    fn begin(&mut self, room: &mut Room<'_>) {
        let lacking = match &room.plan.station.polarizer {
            None => Some("the station file names no polarizer"),
            Some(_) if room.from_captures => Some("captures from a folder carry no turn of a polarizer"),
            Some(polarizer) => {
                self.u_angle = polarizer.u_angle;
                None
            }
        };
        self.spacing = room.book.spacing.as_ref().map_or(room.plan.recipe.nominal_spacing, |spacing| spacing.value);
        if let Some(reason) = lacking {
            self.filled = KEYS.map(|key| Filled::absent(key, reason)).to_vec();
            self.done = true;
        }
    }

    fn wants(&self) -> Wish {
        match self.angle() {
            _ if self.done => Wish::Nothing,
            Some((_, ask)) if !self.out => {
                if !self.turned {
                    return ask;
                }
                Wish::Capture { not_before_ms: 0, samples: crate::run::steps::WHOLE_CAPTURE, keep: false, trace: false }
            }
            _ => take_out(),
        }
    }

    fn take(&mut self, given: Given<'_>, _room: &mut Room<'_>) {
        let asked = self.out || self.index >= self.keys.angles.len();
        match given {
            _ if asked => self.finish(),
            Given::Answer(Answer::Done) => self.turned = true,
            Given::Answer(Answer::CannotSay(reason)) => {
                self.reason = Some(reason.clone());
                self.angles.clear();
                self.out = true;
            }
            Given::Capture(captured) => {
                self.captured(captured);
                self.turned = false;
                self.index += 1;
            }
            Given::Lost { reason, for_good } => {
                self.reason.get_or_insert_with(|| reason.to_owned());
                self.turned = false;
                self.index += 1;
                self.out = for_good;
            }
            _ => {}
        }
    }

    fn filled(&self) -> &[Filled] {
        &self.filled
    }

    fn expected_s(&self, _book: &Notebook) -> Option<f64> {
        Some(if self.done {
            0.0
        } else {
            5.0 * (self.keys.angles.len() - self.index.min(self.keys.angles.len())) as f64
        })
    }
}
