//! Neighbouring modes at right angles: a capture at each angle, each mode's axis by Malus's law.
//! Must not turn anything itself.
//! Main type: [`Random`].

use super::{
    neighbours::{Between, Neighbours},
    take_out, turn,
};
use crate::{
    phrase::{Saying, figure, reasons},
    recipe::Polarizer,
    record::{event::Captured, finding::ModeFinding, question::Answer},
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
/// Turns through all angles, until modes of both families were seen: a short tube at rest may show one mode alone for long.
const MOST_ROUNDS: u32 = 8;
/// An angle between neighbours with a greater expanded uncertainty is none, degrees.
const WORST: f64 = 20.0;
const KEYS: [&str; 2] = ["polarization_azimuth", "mode_orthogonality"];

/// One mode followed over the captures.
struct Track {
    /// Number of its place on the comb.
    place: i64,
    /// What a capture shows of it.
    sightings: Vec<Sighting>,
}

/// A mode in one capture.
#[derive(Clone, Copy)]
struct Sighting {
    /// Index of the capture.
    capture: usize,
    /// Polarizer, rad.
    angle: f64,
    /// Share of the mode's light that passes, where the crossed photodiode shows the rest; else its height, V.
    signal: f64,
    /// It is a share: free of how high the mode stands on the gain line.
    share: bool,
}

/// The step.
pub(super) struct Random {
    keys: Polarizer,
    u_angle: f64,
    spacing: f64,
    index: usize,
    round: u32,
    turned: bool,
    out: bool,
    done: bool,
    /// Where the comb's place 0 stood last, and when: Hz on the scan axis, s.
    origin: Option<(f64, f64)>,
    /// How fast it moves, Hz/s.
    rate: f64,
    tracks: Vec<Track>,
    neighbours: Neighbours,
    /// Polarizer of each capture that could be used, rad.
    angles: Vec<f64>,
    reason: Option<Saying>,
    filled: Vec<Filled>,
}

impl Random {
    pub fn new(keys: &Polarizer) -> Self {
        Self {
            keys: keys.clone(),
            u_angle: 0.0,
            spacing: 0.0,
            index: 0,
            round: 1,
            turned: false,
            out: false,
            done: false,
            origin: None,
            rate: 0.0,
            tracks: Vec::new(),
            neighbours: Neighbours::default(),
            angles: Vec::new(),
            reason: None,
            filled: Vec::new(),
        }
    }

    fn angle(&self) -> Option<(f64, Wish)> {
        self.keys.angles.get(self.index).map(|angle| turn(*angle))
    }

    /// The next angle; after the last another round, unless both families were seen.
    fn go_on(&mut self) {
        self.turned = false;
        self.index += 1;
        if self.index < self.keys.angles.len() {
            return;
        }
        let between = self.between().is_some_and(|row| !row.is_absent());
        if between || self.round >= MOST_ROUNDS {
            self.out = true;
        } else {
            self.round += 1;
            self.index = 0;
        }
    }

    fn captured(&mut self, captured: &Captured) {
        let finding = &captured.finding;
        if finding.refused.is_some() || finding.dark || finding.modes.is_empty() {
            // Across a single mode's axis nothing is left to measure.
            let refused = finding.refused.as_deref().map(Saying::outside);
            let why = refused.unwrap_or_else(|| (&reasons::NO_MODE_THROUGH).into());
            self.reason.get_or_insert(why);
            return;
        }
        let set = self.angle().map_or(0.0, |(angle, _)| angle);
        let angle = captured.fact.polarizer.filter(|angle| angle.is_finite()).unwrap_or(set);
        let sound =
            |mode: &&ModeFinding| mode.position.is_finite() && mode.peak_height.is_finite() && mode.peak_height > 0.0;
        let modes: Vec<&ModeFinding> = finding.modes.iter().filter(sound).collect();
        self.angles.push(angle);
        self.follow(angle, captured.fact.taken_s, &modes, finding.free_spectral_range);
    }

    /// Gives each mode its place on the comb; it may have walked by less than half a spacing beyond what it did before.
    fn follow(&mut self, angle: f64, at: f64, modes: &[&ModeFinding], fsr: f64) {
        let Some(strongest) = modes.iter().max_by(|a, b| a.peak_height.total_cmp(&b.peak_height)) else { return };
        let expected = self.origin.map_or(strongest.position, |(origin, then)| origin + self.rate * (at - then));
        // Departure of each mode from the places of the comb, as a circular mean weighted by height.
        let (mut cos, mut sin) = (0.0, 0.0);
        for mode in modes {
            let phase = std::f64::consts::TAU * folded(mode.position - expected, fsr) / self.spacing;
            cos += mode.peak_height * phase.cos();
            sin += mode.peak_height * phase.sin();
        }
        let origin = expected + self.spacing * sin.atan2(cos) / std::f64::consts::TAU;
        if !origin.is_finite() || !at.is_finite() {
            return;
        }
        if let Some((before, then)) = self.origin.filter(|(_, then)| at > *then) {
            self.rate = (origin - before) / (at - then);
        }
        self.origin = Some((origin, at));
        let mut shares = Vec::new();
        for mode in modes {
            let place = (folded(mode.position - origin, fsr) / self.spacing).round() as i64;
            let crossed = mode.crossed_height.filter(|crossed| crossed.is_finite());
            let (signal, share) = match crossed {
                Some(crossed) => (mode.peak_height / (mode.peak_height + crossed.max(0.0)), true),
                None => (mode.peak_height, false),
            };
            if share {
                shares.push((place, signal));
            }
            let sighting = Sighting { capture: self.angles.len(), angle, signal, share };
            match self.tracks.iter_mut().find(|track| track.place == place) {
                Some(track) => track.sightings.push(sighting),
                None => self.tracks.push(Track { place, sightings: vec![sighting] }),
            }
        }
        self.neighbours.take(angle, &shares);
    }

    /// Axis of each mode, by place.
    fn axes(&self) -> Vec<(i64, Malus)> {
        let fitted = |track: &Track| {
            let fit = malus::fit(&self.points(track))?;
            // Its axis must be known to be told from its neighbour's: 10°.
            (fit.dof > 0 && fit.u_axis < 10f64.to_radians()).then_some((track.place, fit))
        };
        let mut axes: Vec<_> = self.tracks.iter().filter_map(fitted).collect();
        axes.sort_by_key(|(place, _)| *place);
        axes
    }

    /// (angle, signal) of a mode; heights alone are 0 in captures between two sightings that do not show it.
    fn points(&self, track: &Track) -> Vec<(f64, f64)> {
        let shares = track.sightings.iter().any(|sighting| sighting.share);
        let seen = track.sightings.iter().filter(|sighting| sighting.share == shares);
        let mut points: Vec<_> = seen.map(|sighting| (sighting.angle, sighting.signal)).collect();
        if let (false, Some(first), Some(last)) = (shares, track.sightings.first(), track.sightings.last()) {
            let hidden = (first.capture..=last.capture).filter(|n| track.sightings.iter().all(|s| s.capture != *n));
            // Captures count from 1 there.
            points.extend(hidden.filter_map(|n| Some((*self.angles.get(n.checked_sub(1)?)?, 0.0))));
        }
        points
    }

    fn finish(&mut self) {
        self.done = true;
        if self.angles.len() < FEWEST {
            let few = reasons::FEW_ANGLE_CAPTURES.with([figure(self.angles.len()), figure(FEWEST)]);
            let reason = self.reason.clone().unwrap_or(few);
            self.filled = KEYS.map(|key| Filled::absent(key, reason.clone())).to_vec();
            return;
        }
        let axes = self.axes();
        let families: Vec<Family> = (0..2).filter_map(|parity| family(&axes, parity)).collect();
        // Of two axes at right angles one lies below 90°.
        let first = families.iter().find(|family| family.axis < std::f64::consts::FRAC_PI_2).or(families.first());
        let azimuth = match first {
            Some(family) => self.azimuth(family),
            None => Filled::absent(KEYS[0], &reasons::NO_AXIS_KEPT),
        };
        let between = self.between();
        self.filled = vec![azimuth, between.unwrap_or_else(|| Filled::absent(KEYS[1], &reasons::NO_NEIGHBOURS))];
    }

    /// The angle between neighbours, by families that kept their axes, else by pairs seen at once.
    fn between(&self) -> Option<Filled> {
        let axes = self.axes();
        let families = family(&axes, 0).zip(family(&axes, 1)).map(|(even, odd)| self.between_families(&even, &odd));
        let pairs = || self.neighbours.between().map(|between| self.between_pairs(&between));
        families.filter(|row| !row.is_absent()).or_else(pairs)
    }

    fn between_pairs(&self, found: &Between) -> Filled {
        let words = "scatter of shares of neighbours";
        let scatter = BudgetLine::direct("scatter", words, Evaluation::TypeA, found.u, found.dof as f64);
        let row = known(&Measured { value: found.angle, budget: vec![scatter, self.scale_line()] });
        if row.is_absent() { row } else { row.noted(&reasons::BOTH_AT_ONCE) }
    }

    fn scale_line(&self) -> BudgetLine {
        BudgetLine::direct("polarizer", "angle of the polarizer", Evaluation::TypeB, self.u_angle, f64::INFINITY)
    }

    fn azimuth(&self, family: &Family) -> Filled {
        let scatter =
            BudgetLine::direct("scatter", "scatter about Malus's law", Evaluation::TypeA, family.u, family.dof);
        let measured = Measured { value: family.axis, budget: vec![scatter, self.scale_line()] };
        Filled::number(KEYS[0], &measured).noted(&reasons::OF_ONE_FAMILY)
    }

    /// In [0°, 180°): which neighbour comes first is chance, so 90.3° and 89.7° say the same.
    fn between_families(&self, even: &Family, odd: &Family) -> Filled {
        let value = malus::turned(odd.axis - even.axis);
        let one = BudgetLine::direct("scatter", "axis of one family", Evaluation::TypeA, even.u, even.dof);
        let other = BudgetLine::direct("scatter, neighbours", "axis of the other", Evaluation::TypeA, odd.u, odd.dof);
        known(&Measured { value, budget: vec![one, other, self.scale_line()] })
    }
}

/// The row on the angle between neighbours; one that is hardly known decides nothing.
fn known(measured: &Measured) -> Filled {
    let expanded = measured.expanded().to_degrees();
    if expanded <= WORST {
        Filled::number(KEYS[1], measured)
    } else {
        Filled::absent(KEYS[1], reasons::AXES_KNOWN_TO.with([figure(format!("{expanded:.0}"))]))
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
            None => Some(&reasons::NO_POLARIZER),
            Some(_) if room.from_captures => Some(&reasons::FOLDER_HAS_NO_TURN),
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
        match given {
            _ if self.out || self.keys.angles.is_empty() => self.finish(),
            Given::Answer(Answer::Done) => self.turned = true,
            Given::Answer(Answer::CannotSay(reason)) => {
                self.reason = Some(Saying::outside(reason));
                self.angles.clear();
                self.out = true;
            }
            Given::Capture(captured) => {
                self.captured(captured);
                self.go_on();
            }
            Given::Lost { reason, for_good } => {
                self.reason.get_or_insert_with(|| Saying::outside(reason));
                self.go_on();
                self.out |= for_good;
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
