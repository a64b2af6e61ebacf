//! Noise of the light: fast traces with the beam open and blocked, slow and fast.
//! Must not see samples: findings come in, `behaviour` puts them together.
//! Main type: [`Noise`].

use super::{Given, LightWish, Room, Step, Wish};
use crate::{
    behaviour::{LightMeasurement, LightSet, LightTone, MainsRipple, NoiseFound, ToneOrigin, light_noise},
    quantity::Frequency,
    recipe,
    record::{light::LightFinding, question::Answer},
    run::{filled::Filled, notebook::Notebook},
};

/// Where the slow traces end and the fast ones begin, Hz: above it mains harmonics are weak, below it a short trace shows
/// too few cycles (design choice).
const SPLICE: f64 = 2e3;
/// Samples a second of a slow trace, and of one; 15 cycles of the lowest frequency or more.
const SLOW_RATE: f64 = 20e3;
const SLOW_SAMPLES: usize = 30_000;
const SLOW_CYCLES: f64 = 15.0;
/// Samples a second of a fast trace over the end of the band, and of one.
const FAST_OVER_END: f64 = 5.0;
const FAST_SAMPLES: usize = 40_000;
const KEYS: [&str; 4] = ["noise_rms", "line_ripple", "tone_level", "tone_frequency"];

/// What is done, in this order.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Stage {
    Slow,
    Fast,
    Block,
    SlowDark,
    FastDark,
    Open,
    FastLater,
    Done,
}

/// The step.
pub(super) struct Noise {
    keys: recipe::Noise,
    bandwidth: f64,
    stage: Stage,
    /// Slow, fast, slow dark, fast dark, fast later.
    traces: Vec<LightMeasurement>,
    blocked: bool,
    reason: Option<String>,
    filled: Vec<Filled>,
}

impl Noise {
    pub fn new(keys: &recipe::Noise) -> Self {
        Self {
            keys: keys.clone(),
            bandwidth: 0.0,
            stage: Stage::Slow,
            traces: Vec::new(),
            blocked: false,
            reason: None,
            filled: Vec::new(),
        }
    }

    fn trace(&self, lit: bool, fast: bool) -> Wish {
        let overlap = (SPLICE, 2.0 * SPLICE);
        Wish::Light(if fast {
            let sample_rate = FAST_OVER_END * self.keys.highest;
            let band = (SPLICE, self.keys.highest);
            // Twelve cycles of the splice or more, whatever the rate.
            let samples = FAST_SAMPLES.max((12.0 / SPLICE * sample_rate).ceil() as usize);
            LightWish { lit, sample_rate, samples, band, overlap }
        } else {
            let samples = SLOW_SAMPLES.max((SLOW_CYCLES / self.keys.lowest * SLOW_RATE).ceil() as usize);
            LightWish { lit, sample_rate: SLOW_RATE, samples, band: (self.keys.lowest, SPLICE), overlap }
        })
    }

    /// Gives up: what is missing is said once, in every row.
    fn give_up(&mut self, reason: impl Into<String>) {
        self.reason.get_or_insert(reason.into());
        // A beam that was blocked is opened again for the steps that follow.
        self.stage = if self.blocked { Stage::Open } else { Stage::Done };
    }

    fn took(&mut self, finding: &LightFinding) {
        if let Some(reason) = &finding.refused {
            // The last one only says whether a tone moved.
            if self.stage == Stage::FastLater {
                self.stage = Stage::Done;
                return;
            }
            return self.give_up(reason.as_str());
        }
        self.traces.push(live(finding));
        self.stage = match self.stage {
            Stage::Slow => Stage::Fast,
            Stage::Fast => Stage::Block,
            Stage::SlowDark => Stage::FastDark,
            Stage::FastDark => Stage::Open,
            stage => {
                if stage == Stage::FastLater {
                    Stage::Done
                } else {
                    stage
                }
            }
        };
    }

    fn answered(&mut self, answer: &Answer) {
        match (self.stage, answer) {
            (Stage::Block, Answer::CannotSay(why)) => {
                self.give_up(format!("no trace in the dark, so the level without light is unknown: {why}"));
            }
            (Stage::Block, _) => {
                self.blocked = true;
                self.stage = Stage::SlowDark;
            }
            (Stage::Open, answer) => {
                self.blocked = false;
                let opened = !matches!(answer, Answer::CannotSay(_));
                self.stage = if self.reason.is_none() && opened { Stage::FastLater } else { Stage::Done };
            }
            _ => {}
        }
    }

    fn finish(&mut self, book: &mut Notebook) {
        let rows = match (&self.reason, &self.traces[..]) {
            (Some(reason), _) => Err(reason.clone()),
            (None, [slow, fast, slow_dark, fast_dark, later @ ..]) => {
                let set = LightSet { slow, slow_dark, fast, fast_dark, fast_later: later.first() };
                light_noise(&set, self.bandwidth, self.keys.highest).map(|found| self.rows(&set, &found, book))
            }
            (None, _) => Err("light traces are missing".to_owned()),
        };
        self.filled = rows.unwrap_or_else(|why| KEYS.iter().map(|key| Filled::absent(key, why.as_str())).collect());
    }

    fn rows(&self, set: &LightSet<'_>, found: &NoiseFound, book: &mut Notebook) -> Vec<Filled> {
        let band = format!("{} to {}", hertz(self.keys.lowest), hertz(self.keys.highest));
        let noise = match &found.noise_rms {
            _ if self.bandwidth < self.keys.highest => Filled::absent(
                KEYS[0],
                format!("the light detector reaches {}, the band {}", hertz(self.bandwidth), hertz(self.keys.highest)),
            ),
            Some(noise) => Filled::number(KEYS[0], noise).noted(format!(
                "{band}: {:.2} s, then {:.1} ms; dark noise {:.3} % taken off",
                set.slow.duration,
                set.fast.duration * 1e3,
                found.dark_rms * 100.0
            )),
            None => {
                let why = "the slow trace folds noise down from above its band: average the light over each sample";
                Filled::absent(KEYS[0], why)
            }
        };
        let (mains, clear, n) = found.mains;
        if !clear {
            book.remark(format!("No mains line stands clear of the noise: {mains:.0} Hz was taken."));
        }
        let ripple = Filled::number(KEYS[1], &found.line_ripple).noted(format!(
            "{n} harmonics of {mains:.2} Hz, {:.2} s; {:.3} % could hide in the noise",
            set.slow.duration,
            found.ripple_floor * 100.0
        ));
        let mut rows = vec![noise, ripple];
        rows.extend(match &found.tone {
            Some(tone) => [
                Filled::number(KEYS[2], &tone.level).noted(words(tone.origin)),
                Filled::number(KEYS[3], &tone.frequency),
            ],
            None => {
                let why = format!("no line stands above the noise, {band}; a tone of the discharge may lie higher");
                [KEYS[2], KEYS[3]].map(|key| Filled::absent(key, why.as_str()))
            }
        });
        rows
    }
}

/// What a tone is, as far as two traces tell.
fn words(origin: ToneOrigin) -> &'static str {
    match origin {
        ToneOrigin::ModeBeat => "moved between two traces, as a beat of modes does: no fault",
        ToneOrigin::Moving => "moved between two traces, too high for a beat of modes: points at the discharge",
        ToneOrigin::Fixed => "stayed between two traces: supply or discharge; try another current",
        ToneOrigin::Unknown => "seen in one trace only: whether it moves is not known",
    }
}

fn hertz(value: f64) -> String {
    Frequency::from_si(value).to_string()
}

fn live(finding: &LightFinding) -> LightMeasurement {
    LightMeasurement {
        mean: finding.mean,
        duration: finding.duration,
        sample_rate: finding.sample_rate,
        noise: finding.noise,
        overlap: finding.overlap,
        mains: finding.mains.map(|mains| MainsRipple {
            frequency: mains.frequency,
            clear: mains.clear,
            power: mains.power,
            u_power: mains.u_power,
            n_harmonics: mains.n_harmonics,
        }),
        tone: finding.tone.map(|tone| LightTone {
            frequency: tone.frequency,
            u_frequency: tone.u_frequency,
            power: tone.power,
            u_power: tone.u_power,
            probability: tone.probability,
        }),
    }
}

impl Step for Noise {
    fn begin(&mut self, room: &mut Room<'_>) {
        match &room.plan.station.light_detector {
            Some(detector) => self.bandwidth = detector.bandwidth,
            None => {
                self.give_up("the station file names no light detector");
                self.finish(room.book);
            }
        }
    }

    fn wants(&self) -> Wish {
        match self.stage {
            Stage::Slow => self.trace(true, false),
            Stage::Fast | Stage::FastLater => self.trace(true, true),
            Stage::SlowDark => self.trace(false, false),
            Stage::FastDark => self.trace(false, true),
            Stage::Block => Wish::done("block_beam", "Block the beam ahead of the light detector, with a beam stop"),
            Stage::Open => Wish::done("open_beam", "Open the beam again"),
            Stage::Done => Wish::Nothing,
        }
    }

    fn take(&mut self, given: Given<'_>, room: &mut Room<'_>) {
        match given {
            Given::Light(light) => self.took(&light.finding),
            Given::Lost { reason, .. } if self.stage == Stage::FastLater => {
                room.book.remark(format!("Whether a tone moves was not seen: {reason}."));
                self.stage = Stage::Done;
            }
            Given::Lost { reason, .. } => self.give_up(reason),
            Given::Answer(answer) => self.answered(answer),
            _ => {}
        }
        if self.stage == Stage::Done {
            self.finish(room.book);
        }
    }

    fn filled(&self) -> &[Filled] {
        &self.filled
    }

    fn expected_s(&self, _book: &Notebook) -> Option<f64> {
        // Two answers, and two traces of a second and a half.
        Some(if self.stage == Stage::Done { 0.0 } else { 13.0 })
    }
}
