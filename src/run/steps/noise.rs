//! Noise of the light: fast traces with the beam open and blocked, slow and fast.
//! Must not see samples: findings come in, `behaviour` puts them together.
//! Main type: [`Noise`].

use super::{Given, LightWish, Room, Step, Wish};
use crate::{
    behaviour::{LightMeasurement, LightSet, LightTone, MainsRipple, NoiseFound, ToneOrigin, light_noise},
    phrase::{Phrase, Saying, figure, questions, reasons, said},
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
    reason: Option<Saying>,
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
    fn give_up(&mut self, reason: impl Into<Saying>) {
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
            return self.give_up(Saying::outside(reason));
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
                self.give_up(reasons::NO_DARK_TRACE.with([said(Saying::outside(why))]));
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
                let found = light_noise(&set, self.bandwidth, self.keys.highest);
                found.map(|found| self.rows(&set, &found, book)).map_err(|why| Saying::outside(&why))
            }
            (None, _) => Err((&reasons::NO_LIGHT_TRACES).into()),
        };
        self.filled = rows.unwrap_or_else(|why| KEYS.iter().map(|key| Filled::absent(key, why.clone())).collect());
    }

    fn rows(&self, set: &LightSet<'_>, found: &NoiseFound, book: &mut Notebook) -> Vec<Filled> {
        let hertz = |value: f64| figure(Frequency::from_si(value));
        let band = || said(reasons::BAND.with([hertz(self.keys.lowest), hertz(self.keys.highest)]));
        let noise = match &found.noise_rms {
            _ if self.bandwidth < self.keys.highest => Filled::absent(
                KEYS[0],
                reasons::DETECTOR_REACHES.with([hertz(self.bandwidth), hertz(self.keys.highest)]),
            ),
            Some(noise) => Filled::number(KEYS[0], noise).noted(reasons::NOISE_BAND.with([
                band(),
                figure(format!("{:.2}", set.slow.duration)),
                figure(format!("{:.1}", set.fast.duration * 1e3)),
                figure(format!("{:.3}", found.dark_rms * 100.0)),
            ])),
            None => Filled::absent(KEYS[0], &reasons::FOLDED),
        };
        let (mains, clear, n) = found.mains;
        if !clear {
            book.remark(reasons::NO_MAINS.with([figure(format!("{mains:.0}"))]));
        }
        let ripple = Filled::number(KEYS[1], &found.line_ripple).noted(reasons::HARMONICS.with([
            figure(n),
            figure(format!("{mains:.2}")),
            figure(format!("{:.2}", set.slow.duration)),
            figure(format!("{:.3}", found.ripple_floor * 100.0)),
        ]));
        let mut rows = vec![noise, ripple];
        rows.extend(match &found.tone {
            Some(tone) => [
                Filled::number(KEYS[2], &tone.level).noted(words(tone.origin)),
                Filled::number(KEYS[3], &tone.frequency),
            ],
            None => {
                let why = reasons::NO_TONE.with([band()]);
                [KEYS[2], KEYS[3]].map(|key| Filled::absent(key, why.clone()))
            }
        });
        rows
    }
}

/// What a tone is, as far as two traces tell.
fn words(origin: ToneOrigin) -> &'static Phrase {
    match origin {
        ToneOrigin::ModeBeat => &reasons::TONE_OF_MODES,
        ToneOrigin::Moving => &reasons::TONE_MOVING,
        ToneOrigin::Fixed => &reasons::TONE_FIXED,
        ToneOrigin::Unknown => &reasons::TONE_ONCE,
    }
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
                self.give_up(&reasons::NO_LIGHT_DETECTOR);
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
            Stage::Block => Wish::done("block_beam", &questions::BLOCK_LIGHT),
            Stage::Open => Wish::done("open_beam", &questions::OPEN_BEAM),
            Stage::Done => Wish::Nothing,
        }
    }

    fn take(&mut self, given: Given<'_>, room: &mut Room<'_>) {
        match given {
            Given::Light(light) => self.took(&light.finding),
            Given::Lost { reason, .. } if self.stage == Stage::FastLater => {
                room.book.remark(reasons::TONE_UNSEEN.with([said(Saying::outside(reason))]));
                self.stage = Stage::Done;
            }
            Given::Lost { reason, .. } => self.give_up(Saying::outside(reason)),
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
