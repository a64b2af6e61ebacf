//! The beam: knife-edge readings at one distance or two, asked of the technician.
//! Must not compute a diameter: `behaviour` does.
//! Main type: [`Beam`].

use super::{Given, Room, Step, Wish, strike::absent};
use crate::{
    behaviour::{KnifeEdge, beam_diameter, beam_divergence},
    phrase::{Phrase, Saying, figure, questions, reasons},
    recipe,
    record::question::Answer,
    run::{filled::Filled, notebook::Notebook},
};

const KEYS: [&str; 2] = ["beam_diameter", "beam_divergence"];
/// Questions at each distance: word, what is asked, UCUM unit, greatest answer, m.
static ASKED: [(&str, &Phrase, &str, f64); 3] = [
    ("distance", &questions::KNIFE_DISTANCE, "m", 50.0),
    ("at_10", &questions::KNIFE_AT_10, "mm", 0.3),
    ("at_90", &questions::KNIFE_AT_90, "mm", 0.3),
];

/// The step.
pub(super) struct Beam {
    distances: usize,
    wavelength: f64,
    answers: Vec<f64>,
    done: bool,
    filled: Vec<Filled>,
}

impl Beam {
    pub fn new(keys: &recipe::Beam) -> Self {
        let distances = if keys.distances >= 2 { 2 } else { 1 };
        Self { distances, wavelength: 0.0, answers: Vec::new(), done: false, filled: Vec::new() }
    }

    fn finish(&mut self) {
        self.done = true;
        let readings: Vec<KnifeEdge> = self
            .answers
            .chunks_exact(ASKED.len())
            .map(|a| KnifeEdge { distance: a[0], at_10: a[1], at_90: a[2] })
            .collect();
        let nearest = readings.iter().min_by(|a, b| a.distance.total_cmp(&b.distance));
        let diameter = nearest.map(|reading| (beam_diameter(reading), reading.distance));
        self.filled.push(match diameter {
            Some((Ok(found), distance)) => {
                Filled::number(KEYS[0], &found).noted(reasons::FROM_MIRROR.with([figure(format!("{distance:.2} m"))]))
            }
            Some((Err(why), _)) => Filled::absent(KEYS[0], Saying::outside(&why)),
            None => Filled::absent(KEYS[0], &reasons::NO_KNIFE_READINGS),
        });
        self.filled.push(match &readings[..] {
            [one, other] => match beam_divergence(one, other, self.wavelength) {
                Ok(found) => Filled::number(KEYS[1], &found).noted(&reasons::FULL_ANGLE),
                Err(why) => Filled::absent(KEYS[1], Saying::outside(&why)),
            },
            _ => Filled::absent(KEYS[1], &reasons::TWO_DISTANCES),
        });
    }
}

impl Step for Beam {
    fn begin(&mut self, room: &mut Room<'_>) {
        self.wavelength = room.plan.recipe.wavelength;
    }

    fn wants(&self) -> Wish {
        if self.done {
            return Wish::Nothing;
        }
        let (place, index) = (self.answers.len() / ASKED.len() + 1, self.answers.len() % ASKED.len());
        let (word, text, unit, highest) = ASKED[index];
        let lowest = if index == 0 { 0.0 } else { -highest };
        Wish::number(&format!("{word}_{place}"), text, unit, lowest, highest)
    }

    fn take(&mut self, given: Given<'_>, _room: &mut Room<'_>) {
        match given {
            Given::Answer(Answer::Number(value)) => {
                self.answers.push(*value);
                if self.answers.len() >= self.distances * ASKED.len() {
                    self.finish();
                }
            }
            // What was read at the first distance still counts.
            Given::Answer(_) if self.answers.len() >= ASKED.len() => self.finish(),
            Given::Answer(answer) => {
                self.done = true;
                self.filled = KEYS.iter().map(|key| absent(key, answer)).collect();
            }
            _ => {}
        }
    }

    fn filled(&self) -> &[Filled] {
        &self.filled
    }

    fn expected_s(&self, _book: &Notebook) -> Option<f64> {
        // Some twenty seconds a reading (practice).
        Some(20.0 * (self.distances * ASKED.len()).saturating_sub(self.answers.len()) as f64)
    }
}
