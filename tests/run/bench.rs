//! A small synthetic tube and a driver that does what a run wants, for the tests of `run`.
//! Must not share code with the phantom or the engine: findings are made by hand.
//! Main types: [`Tube`], [`Script`].

use chrono::{DateTime, FixedOffset, TimeDelta};
use tubewright::{
    record::{
        event::{CaptureFact, Captured, Happening, Identity, Opened},
        finding::{CaptureFinding, ModeFinding, StoredLine, Trace},
        light::{LightCaptured, LightFinding, StoredMains},
        question::{Answer, Expects, Question},
        sheet::Sheet,
    },
    run::{At, Plan, Run},
    station::{CaptureRequest, LightRequest, ReadingKind, Want},
};

pub const FSR: f64 = 6.4e9;
/// Where the middle of the gain line stands on the scan axis, Hz.
const MIDDLE: f64 = 6.0e9;
/// A capture takes this long, ms.
const CAPTURE_MS: u64 = 20;
/// An answer takes this long, ms.
const ANSWER_MS: u64 = 500;

/// A tube whose comb walks as N∞(1 − e^(−t/τ)) under a parabola of a gain line.
#[derive(Clone)]
pub struct Tube {
    pub spacing: f64,
    /// Half of the lasing span, Hz.
    pub half_span: f64,
    pub tau: f64,
    pub n_infinity: f64,
    /// Amplitude, mode spacings, of a draught with a period of 12 s, from 15 s on.
    pub draught: f64,
    /// One axis for all modes, or two at right angles.
    pub linear: bool,
    /// Both families exchange their axes once a cycle, at a fixed place under the line.
    pub swaps: bool,
    /// Axis of the even modes, rad.
    pub axis: f64,
    pub power: f64,
    /// No light from this time after switching on, s.
    pub dark_from: f64,
    /// Light again from this time on, s.
    pub dark_to: f64,
    /// The source has no capture after this one.
    pub n_captures: u64,
    pub tries: u64,
}

impl Tube {
    pub fn twin() -> Self {
        Self {
            spacing: 999.3e6,
            half_span: 0.75e9,
            tau: 20.0,
            n_infinity: 12.0,
            draught: 0.0,
            linear: false,
            swaps: false,
            axis: 0.3,
            power: 0.9e-3,
            dark_from: f64::INFINITY,
            dark_to: f64::INFINITY,
            n_captures: u64::MAX,
            tries: 1,
        }
    }

    pub fn plate() -> Self {
        Self { spacing: 599.6e6, half_span: 0.75e9, linear: true, power: 2.5e-3, ..Self::twin() }
    }

    pub fn quad() -> Self {
        Self { spacing: 399.7e6, half_span: 0.75e9, power: 7e-3, ..Self::twin() }
    }

    /// Spacings walked.
    fn walked(&self, t: f64) -> f64 {
        let draught = self.draught * (std::f64::consts::TAU * (t - 15.0).max(0.0) / 12.0).sin();
        self.n_infinity * (1.0 - (-t / self.tau).exp()) + draught
    }

    /// (index, detuning from the middle Hz, height V) of the modes.
    fn modes(&self, t: f64) -> Vec<(i64, f64, f64)> {
        let walked = self.walked(t);
        let height = |detuning: f64| 1.0 - (detuning / self.half_span).powi(2);
        (-10..100)
            .map(|index| (index, (index as f64 - walked) * self.spacing))
            .filter(|(_, detuning)| height(*detuning) > 0.02)
            .map(|(index, detuning)| (index, detuning, height(detuning)))
            .collect()
    }

    /// Whether a mode has the first of two axes.
    fn first_axis(&self, index: i64, t: f64) -> bool {
        let swaps = if self.swaps { (self.walked(t) + 0.7).floor() as i64 } else { 0 };
        self.linear || (index + swaps).rem_euclid(2) == 0
    }

    pub fn watts(&self, t: f64, polarizer: Option<f64>) -> f64 {
        let full = self.power / 1.02 * (1.0 + 0.01 * (std::f64::consts::TAU * self.walked(t)).cos());
        // 800:1 through the polarizer, with a dark level of 1 µW on the meter.
        polarizer.map_or(full, |angle| full * ((angle - self.axis).cos().powi(2) + 1.0 / 800.0)) + 1e-6
    }

    pub fn finding(&self, t: f64, polarizer: Option<f64>, trace: bool, noise: &mut Noise) -> CaptureFinding {
        let mut finding =
            CaptureFinding { engine: "by hand".into(), free_spectral_range: FSR, order_count: 2, ..Default::default() };
        if (self.dark_from..self.dark_to).contains(&t) {
            finding.dark = true;
            return finding;
        }
        let modes = self.modes(t);
        let first = modes.first().map_or(0.0, |(_, detuning, _)| *detuning);
        for (index, detuning, height) in &modes {
            let even = self.first_axis(*index, t);
            let axis = if even { self.axis } else { self.axis + std::f64::consts::FRAC_PI_2 };
            let through = polarizer.map_or(1.0, |angle| (angle - axis).cos().powi(2));
            if through < 0.02 {
                continue;
            }
            let peak_height = height * through * if even { 0.8 } else { 0.2 } * (1.0 + 0.002 * noise.next());
            finding.modes.push(ModeFinding {
                position: (MIDDLE + detuning + 0.3e6 * noise.next()).rem_euclid(FSR),
                u_position: 0.3e6,
                offset: detuning - first,
                u_offset: 0.4e6,
                peak_height: if polarizer.is_some() { height * through } else { peak_height },
                u_peak_height: 0.002,
                fwhm: 32e6,
                area: height * through * 50e6,
                crossed_height: (!self.linear).then_some(match polarizer {
                    // The splitter turns with the polarizer.
                    Some(_) => height * (1.0 - through) + 0.001 * noise.next(),
                    None => height * if even { 0.2 } else { 0.8 },
                }),
                // No ramp voltages: this bench has one scan axis for all captures already.
                places: Vec::new(),
                u_ramp: 0.0,
            });
        }
        let line = |source_id: &str, type_a: bool, u: f64| StoredLine {
            source_id: source_id.into(),
            line: source_id.into(),
            type_a,
            standard_uncertainty: u,
            dof: if type_a { Some(30.0) } else { None },
            sensitivity: 1.0,
            note: String::new(),
        };
        if finding.modes.len() >= 2 {
            finding.mode_spacing = Some(self.spacing + 0.4e6 * noise.next());
            finding.budget = vec![line("scatter", true, 0.4e6), line("SIM-0001", false, 0.003 * self.spacing)];
        }
        finding.finesse = Some(200.0 + noise.next());
        if trace {
            let detuning: Vec<f64> = (0..100).map(|i| f64::from(i) * 1e8).collect();
            finding.trace = Some(Trace { low: vec![0.0; 100], high: vec![0.1; 100], detuning, marks: vec![(0, 1e9)] });
        }
        finding
    }
}

/// Sum of three uniform numbers, about one standard deviation wide; seeded.
pub struct Noise(pub u64);

impl Noise {
    pub fn bits(&mut self) -> u64 {
        // SplitMix64 (Steele, Lea, Flood 2014; constants from memory).
        self.0 = self.0.wrapping_add(0x9e37_79b9_7f4a_7c15);
        let mut z = self.0;
        z = (z ^ (z >> 30)).wrapping_mul(0xbf58_476d_1ce4_e5b9);
        z = (z ^ (z >> 27)).wrapping_mul(0x94d0_49bb_1331_11eb);
        z ^ (z >> 31)
    }

    pub fn below(&mut self, n: u64) -> u64 {
        self.bits() % n
    }

    fn uniform(&mut self) -> f64 {
        (self.bits() >> 11) as f64 / (1u64 << 53) as f64
    }

    pub fn next(&mut self) -> f64 {
        2.0 * (self.uniform() + self.uniform() + self.uniform() - 1.5)
    }
}

/// The texts of a plan.
#[derive(Clone)]
pub struct Texts {
    pub recipe: String,
    pub limits: String,
    pub station: String,
}

pub fn identity() -> Identity {
    Identity {
        run_id: "01980000-0000-7000-8000-000000000001".into(),
        serial: "TEST-0001".into(),
        tube_type: "test".into(),
        technician: "KT".into(),
        started_at: "2026-03-02T08:00:00.000+00:00".into(),
        time_zone: "Europe/Lisbon".into(),
        simulated: true,
        ..Identity::default()
    }
}

/// What happened in a run that was driven to its end, with what it wanted and showed after each happening.
pub struct Script {
    pub texts: Texts,
    pub identity: Identity,
    pub events: Vec<(Happening, At)>,
    pub wants: Vec<Want>,
    /// (number of happenings taken, sheet).
    pub sheets: Vec<(usize, Sheet)>,
    pub run: Run,
}

/// Drives runs.
pub struct Driver {
    script: Script,
    tube: Tube,
    noise: Noise,
    now_ms: u64,
    lit_ms: u64,
    polarizer: Option<f64>,
    /// Sheets are taken after every so many happenings.
    every: usize,
}

impl Driver {
    pub fn new(texts: &Texts, identity: Identity, tube: Tube, every: usize) -> Self {
        let plan = Plan::from_texts(&texts.recipe, &texts.limits, &texts.station).unwrap();
        let run = Run::open(plan, identity.clone());
        let script = Script {
            texts: texts.clone(),
            identity: identity.clone(),
            events: Vec::new(),
            wants: Vec::new(),
            sheets: Vec::new(),
            run,
        };
        let mut driver = Self { script, tube, noise: Noise(1), now_ms: 0, lit_ms: 0, polarizer: None, every };
        let Texts { recipe, limits, station } = texts.clone();
        driver.happen(Happening::Opened(Box::new(Opened { identity, recipe, limits, station })));
        driver
    }

    pub fn run(&self) -> &Run {
        &self.script.run
    }

    pub fn happen(&mut self, happening: Happening) {
        let start: DateTime<FixedOffset> = DateTime::parse_from_rfc3339("2026-03-02T08:00:00+00:00").unwrap();
        let wall = start + TimeDelta::milliseconds(i64::try_from(self.now_ms).unwrap());
        let at = At { wall, elapsed_ms: self.now_ms };
        let script = &mut self.script;
        let remarks = script.run.take(&happening, at);
        assert!(remarks.iter().all(|remark| !remark.text.contains("wanted")), "{remarks:?}");
        script.events.push((happening, at));
        script.wants.push(script.run.wants());
        if script.events.len().is_multiple_of(self.every) {
            script.sheets.push((script.events.len(), script.run.sheet()));
        }
    }

    /// Does the one thing that the run wants; `false` when it wants nothing more.
    pub fn one(&mut self) -> bool {
        match self.script.run.wants() {
            Want::Capture(request) => self.capture(&request),
            Want::Light(request) => self.light(&request),
            Want::Reading(request) => {
                let t = self.seconds();
                let value = match request.what {
                    ReadingKind::DarkPower => 1e-6,
                    _ => self.tube.watts(t, self.polarizer) * (1.0 + 1e-4 * self.noise.next()),
                };
                let (step, what) = (request.step, request.what.word().into());
                self.happen(Happening::Reading { step, what, value: Some(value), reason: None });
            }
            Want::Answer(question) => self.answer(&question),
            Want::WaitUntil { elapsed_ms, .. } => {
                self.now_ms = self.now_ms.max(elapsed_ms);
                self.happen(Happening::Waited);
            }
            Want::MakeSafe => self.happen(Happening::MadeSafe),
            Want::Finished => return false,
        }
        true
    }

    /// Time in which nothing happens: a pause.
    pub fn pause(&mut self, seconds: f64) {
        self.now_ms += (seconds * 1e3) as u64;
    }

    pub fn until(&mut self, stop: impl Fn(&Want) -> bool) {
        while !stop(&self.script.run.wants()) && self.one() {}
    }

    pub fn finish(mut self) -> Script {
        while self.one() {
            assert!(self.script.events.len() < 20_000, "a run that never ends");
        }
        let n = self.script.events.len();
        self.script.sheets.push((n, self.script.run.sheet()));
        self.script
    }

    fn seconds(&self) -> f64 {
        (self.now_ms - self.lit_ms) as f64 / 1e3
    }

    fn capture(&mut self, request: &CaptureRequest) {
        let (step, number) = (request.step.clone(), request.number);
        if number > self.tube.n_captures {
            let reason = "the folder is at its end".into();
            return self.happen(Happening::CaptureLost { step, number, reason, for_good: true });
        }
        self.now_ms = self.now_ms.max(request.not_before_ms);
        let t = self.seconds();
        let fact = CaptureFact {
            taken_s: self.now_ms as f64 / 1e3,
            sha256: format!("{number:064x}"),
            power: Some(self.tube.watts(t, None) * (1.0 + 1e-4 * self.noise.next())),
            ..CaptureFact::default()
        };
        let finding = self.tube.finding(t, self.polarizer, request.trace, &mut self.noise);
        self.now_ms += CAPTURE_MS;
        self.happen(Happening::Captured(Box::new(Captured { step, number, fact, finding })));
    }

    /// A light trace as the tube's own tests want none: level and noise of an ordinary tube.
    fn light(&mut self, request: &LightRequest) {
        let level = if request.lit { 0.8 } else { 0.02 };
        let finding = LightFinding {
            engine: "made".into(),
            sample_rate: request.sample_rate,
            duration: request.samples as f64 / request.sample_rate,
            mean: level,
            noise: (1e-6 * level, 1e-8 * level, 1000.0),
            mains: (request.band.0 < 50.0).then_some(StoredMains {
                frequency: 50.0,
                clear: true,
                power: 1e-7 * level,
                u_power: 1e-9,
                floor: 1e-9,
                n_harmonics: 39,
            }),
            ..LightFinding::default()
        };
        let fact = CaptureFact { taken_s: self.now_ms as f64 / 1e3, ..CaptureFact::default() };
        self.now_ms += 1500;
        let (step, number, lit) = (request.step.clone(), request.number, request.lit);
        self.happen(Happening::Light(Box::new(LightCaptured { step, number, lit, fact, finding })));
    }

    fn answer(&mut self, question: &Question) {
        self.happen(Happening::Asked { question: question.clone() });
        self.now_ms += ANSWER_MS;
        let answer = match (question.word.as_str(), &question.expects) {
            ("start_delay", _) => {
                self.lit_ms = self.now_ms;
                Answer::Number(0.6)
            }
            ("tries", _) => Answer::Whole(self.tube.tries),
            ("start_voltage", _) => Answer::CannotSay("no high-voltage probe".into()),
            ("run_current", _) => Answer::Number(4.0e-3),
            ("run_voltage", _) => Answer::Number(1.28e3),
            ("dropout_current", _) => Answer::Number(3.0e-3),
            (_, Expects::Choice(words)) => Answer::Choice(words[0].clone()),
            _ => Answer::Done,
        };
        if let Some(degrees) = question.word.strip_prefix("turn_") {
            self.polarizer = Some(degrees.parse::<f64>().unwrap().to_radians());
        }
        if question.word == "polarizer_out" {
            self.polarizer = None;
        }
        let (step, word) = (question.step.clone(), question.word.clone());
        self.happen(Happening::Answered { step, word, answer, by: "KT".into() });
    }
}
