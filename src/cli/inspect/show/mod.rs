//! What is shown while a run goes on: rows as they are measured, where it is, the verdict and where the record is.
//! Must not judge or change anything.
//! Main type: [`Show`].

mod json;
mod plain;

use std::collections::HashSet;
use std::io::{self, IsTerminal as _};
use std::path::Path;
use std::time::{Duration, Instant};

use super::{
    Format,
    live::{Live, row_lines, verdict_lines},
};
use crate::cli::{Failure, output};
use crate::driver::Watcher;
use crate::instruments::{Role, Screen, caution_lines, said};
use crate::phrase::{Language, name, page, terminal};
use crate::record::{
    event::{Event, Happening},
    finding::{CaptureFinding, Trace},
    question::{Answer, Question},
    sheet::{Row, Sheet},
};
use crate::report::row_line;
use crate::run::{Remark, Run};
use crate::station::standing::holds;

/// Shows a run on the two streams.
pub(super) struct Show {
    format: Format,
    pace: Option<f64>,
    asks: bool,
    face: Face,
    /// Results go to the same terminal as the block.
    is_shared: bool,
    shown: HashSet<(String, String)>,
    /// Steps done when rows were looked for last.
    done_steps: usize,
    clock: Pace,
    /// The question that stands open.
    asked: Option<Question>,
    failed: Option<Failure>,
}

/// How it is shown.
enum Face {
    Plain(plain::Plain),
    Live(Box<Live>),
}

/// How fast bench time has passed, questions left out.
#[derive(Default)]
struct Pace {
    /// Wall time and bench time, s, when this process began.
    began: Option<(Instant, f64)>,
    /// A person was asked then.
    asked: Option<Instant>,
    /// Wall time that questions took.
    waited: Duration,
}

impl Pace {
    fn at(&mut self, elapsed_s: f64) {
        self.began.get_or_insert((Instant::now(), elapsed_s));
    }

    fn answered(&mut self) {
        self.waited += self.asked.take().map_or(Duration::ZERO, |at| at.elapsed());
    }

    /// Bench seconds in a second of wall time: as seen so far, else as fast as allowed.
    fn rate(&self, elapsed_s: f64, ceiling: f64) -> f64 {
        let Some((at, first_s)) = self.began else { return ceiling };
        let wall = at.elapsed().saturating_sub(self.waited).as_secs_f64();
        if wall > 1.0 { ((elapsed_s - first_s) / wall).clamp(1e-3, ceiling.max(1e-3)) } else { ceiling }
    }
}

impl Show {
    /// * `pace`: ceiling on bench time, where there is one: then waiting is shorter than bench time.
    /// * `asks`: somebody answers at this terminal.
    pub fn new(format: Format, pace: Option<f64>, screen: Screen, asks: bool) -> Self {
        Self {
            format,
            pace,
            asks,
            is_shared: io::stdout().is_terminal(),
            face: if screen.is_live() {
                Face::Live(Box::new(Live::new(screen)))
            } else {
                Face::Plain(plain::Plain::default())
            },
            shown: HashSet::new(),
            done_steps: 0,
            clock: Pace::default(),
            asked: None,
            failed: None,
        }
    }

    /// The run is known. One that is taken up again shows what it has, once, by its number.
    pub fn begun(&mut self, run: &Run, folder: &Path) {
        let identity = run.identity();
        if identity.simulated {
            self.say(page::SIMULATED.of(identity.language()));
        }
        let (serial, tube_type) = (&identity.serial, &identity.tube_type);
        self.say(&format!("{serial}, type {tube_type}: sheet opened in {}", folder.display()));
        self.say(&format!("Decision rule: {}", run.sheet().rule));
        if let Some(at) = run.sheet().started_at.filter(|_| identity.run_kind.is_product()) {
            for sentence in holds(&run.plan().station, at, identity.reference_checks.as_deref()) {
                self.say(&format!("No verdict will be given: {}", sentence.english()));
            }
        }
    }

    /// The run was taken up again after so many events: its rows were shown before.
    pub fn taken_up(&mut self, run: &Run, last: &Event) {
        let before = self.shown.len();
        let sheet = run.sheet();
        self.done_steps = run.progress().done_steps;
        let rows = sheet.rows.iter().filter(|row| is_done(run, self.done_steps, &row.step));
        self.shown.extend(rows.map(key));
        let n = self.shown.len() - before;
        let rows = if n == 1 { "1 row".to_owned() } else { format!("{n} rows") };
        self.say(&format!("taken up again after {}, {rows} so far", last.at));
        if !run.identity().from_captures {
            self.caution(terminal::LOOK_FIRST.of(run.identity().language()));
        }
    }

    /// A line that stays, on standard error.
    pub fn say(&mut self, line: &str) {
        match &mut self.face {
            Face::Plain(_) => output::talk(line),
            Face::Live(live) => live.say(Role::Quiet, line),
        }
    }

    /// A caution that stays, on standard error.
    fn caution(&mut self, text: &str) {
        match &mut self.face {
            Face::Plain(_) => output::talk(text),
            Face::Live(live) => {
                let lines = caution_lines(text, &live.screen().look());
                live.lasting(&lines);
            }
        }
    }

    /// Takes the block off the terminal.
    pub fn clear(&mut self) {
        if let Face::Live(live) = &mut self.face {
            live.over();
        }
    }

    /// A line of results; the first that could not be written is kept.
    fn result(&mut self, line: &str) {
        if let (true, Face::Live(live)) = (self.is_shared, &mut self.face) {
            live.clear();
        }
        if let Err(failure) = output::result(line) {
            self.failed.get_or_insert(failure);
        }
    }

    fn row(&mut self, row: &Row, language: Language) {
        let is_json = self.format == Format::Json;
        // A terminal shows a row once: as it is asked for.
        let drawn = matches!(self.face, Face::Live(_)) && !(is_json && self.is_shared);
        if is_json {
            self.result(&json::row_json(row));
        } else if !(drawn && self.is_shared) {
            self.result(&row_line(row, language));
        }
        if let (true, Face::Live(live)) = (drawn, &mut self.face) {
            let lines = row_lines(row, &live.screen().look());
            live.lasting(&lines);
        }
    }

    /// Shows the rows of steps that are done, each once.
    fn rows(&mut self, sheet: &Sheet, is_done: impl Fn(&str) -> bool) {
        for row in sheet.rows.iter().filter(|row| is_done(&row.step)) {
            if self.shown.insert(key(row)) {
                self.row(row, sheet.language());
            }
        }
    }

    fn at(&mut self, run: &Run, elapsed_s: f64) {
        let rate = self.pace.map(|pace| self.clock.rate(elapsed_s, pace));
        match &mut self.face {
            Face::Plain(plain) => plain.at(&run.progress(), rate.unwrap_or(1.0)),
            Face::Live(live) => live.at(run, elapsed_s, rate),
        }
    }

    /// The record is frozen.
    pub fn ended(&mut self, sheet: &Sheet, folder: &Path) -> Result<(), Failure> {
        // What an early end left unmeasured says why.
        self.rows(sheet, |_| true);
        if let Some(failure) = self.failed.take() {
            return Err(failure);
        }
        self.clear();
        let drawn = self.drawn_end(sheet);
        match self.format {
            Format::Json => output::result(&json::ended_json(sheet, folder)),
            Format::Text => {
                let (verdict, language) = (&sheet.verdict, sheet.language());
                if !drawn || !self.is_shared {
                    output::result("")?;
                    output::result(&format!("{}: {}", sheet.identity.serial, verdict.sentence.text(language)))?;
                    if !verdict.reason.is_empty() {
                        output::result(&verdict.reason.text(language))?;
                    }
                }
                output::result(&folder.join("record.csv").display().to_string())?;
                output::result(&folder.join("record.pdf").display().to_string())
            }
        }
    }

    /// The caution, and on a terminal the verdict in its box. Returns whether it was drawn.
    fn drawn_end(&mut self, sheet: &Sheet) -> bool {
        if !sheet.identity.from_captures {
            self.caution(terminal::TAKE_OFF.of(sheet.language()));
        }
        let Face::Live(live) = &mut self.face else { return false };
        let look = live.screen().look();
        let verdict = &sheet.verdict;
        let (sentence, reason) = (verdict.sentence.text(look.language), verdict.reason.text(look.language));
        let lines = verdict_lines(&sheet.identity.serial, verdict.outcome, &sentence, &reason, &look);
        live.lasting(&lines);
        true
    }

    /// An answer that was typed stays on the terminal, as it was understood; that a hand has done something does not.
    fn noted(&mut self, answer: &Answer) {
        let Some(question) = self.asked.take() else { return };
        if let (Face::Live(live), true) = (&mut self.face, self.asks && *answer != Answer::Done) {
            let answered = said(&question, answer);
            let noted = terminal::NOTED.with([name(question.step), name(question.word), name(answered)]);
            live.say(Role::Quiet, &format!("  {}", noted.text(live.screen().look().language)));
        }
    }
}

/// A row is shown once.
fn key(row: &Row) -> (String, String) {
    (row.step.clone(), row.measurand.clone())
}

/// Whether a step is among the first so many of the recipe.
fn is_done(run: &Run, done_steps: usize, name: &str) -> bool {
    run.plan().recipe.steps.iter().take(done_steps).any(|step| step.name == name)
}

impl Watcher for Show {
    fn happened(&mut self, run: &Run, event: &Event, remarks: &[Remark]) {
        self.clock.at(event.elapsed_s);
        self.clock.answered();
        match (&event.what, &mut self.face) {
            (Happening::Captured(_), Face::Live(live)) => live.captured(),
            (Happening::Answered { answer, .. }, _) => self.noted(answer),
            _ => {}
        }
        for remark in remarks {
            self.say(&format!("  {remark}"));
        }
        let progress = run.progress();
        if progress.done_steps > self.done_steps {
            self.done_steps = progress.done_steps;
            self.rows(&run.sheet(), |name| is_done(run, progress.done_steps, name));
        }
        self.at(run, event.elapsed_s);
    }

    fn looks(&self) -> bool {
        matches!(&self.face, Face::Live(live) if live.looks())
    }

    fn swept(&mut self, finding: &CaptureFinding, trace: Option<Trace>) {
        if let Face::Live(live) = &mut self.face {
            live.swept(finding, trace);
        }
    }

    fn asking(&mut self, question: &Question) {
        self.clock.asked = Some(Instant::now());
        self.asked = Some(question.clone());
        if let Face::Live(live) = &mut self.face {
            live.asking();
        }
    }
}
