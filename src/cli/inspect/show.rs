//! What is shown while a run goes on: rows as they are measured, progress, the verdict and where the record is.
//! Must not judge or change anything.
//! Main type: [`Show`].

use std::collections::HashSet;
use std::io::{self, IsTerminal as _, Write as _};
use std::path::Path;
use std::time::{Duration, Instant};

use serde_json::{Value as Json, json};

use super::Format;
use crate::cli::{Failure, output};
use crate::driver::Watcher;
use crate::measurand;
use crate::phrase::page;
use crate::record::event::Event;
use crate::record::question::Question;
use crate::record::sheet::{Row, Sheet, Value};
use crate::report::row_line;
use crate::run::{Remark, Run};
use crate::station::standing::holds;

/// A rewritten line changes this often at most.
const REWRITE_EVERY: Duration = Duration::from_millis(200);
/// Without a terminal a line about the same step is enough this often.
const LINE_EVERY: Duration = Duration::from_secs(15);

/// Shows a run on the two streams.
pub(super) struct Show {
    format: Format,
    pace: Option<f64>,
    on_terminal: bool,
    shown: HashSet<(String, String)>,
    /// Steps done when rows were looked for last.
    done_steps: usize,
    /// Step and time of the last progress line.
    progress: Option<(String, Instant)>,
    /// A progress line stands on the terminal.
    line_open: bool,
    /// Wall time and bench time, s, when this process began.
    began: Option<(Instant, f64)>,
    failed: Option<Failure>,
}

impl Show {
    /// * `pace`: ceiling on bench time, where there is one: then waiting is shorter than bench time.
    pub fn new(format: Format, pace: Option<f64>) -> Self {
        Self {
            format,
            pace,
            on_terminal: io::stderr().is_terminal(),
            shown: HashSet::new(),
            done_steps: 0,
            progress: None,
            line_open: false,
            began: None,
            failed: None,
        }
    }

    /// The run is known.
    pub fn begun(&mut self, run: &Run, folder: &Path, again: bool) {
        let identity = run.identity();
        if identity.simulated {
            output::talk(page::SIMULATED.of(run.identity().language()));
        }
        let how = if again { "taken up again" } else { "opened" };
        let (serial, tube_type) = (&identity.serial, &identity.tube_type);
        output::talk(&format!("{serial}, type {tube_type}: sheet {how} in {}", folder.display()));
        output::talk(&format!("Decision rule: {}", run.sheet().rule));
        if let Some(at) = run.sheet().started_at.filter(|_| identity.run_kind.is_product()) {
            for sentence in holds(&run.plan().station, at, identity.reference_checks.as_deref()) {
                output::talk(&format!("No verdict will be given: {}", sentence.english()));
            }
        }
        if again && !identity.from_captures {
            output::talk("Look first whether the supply is on and the tube lit: high voltage may still be there.");
        }
    }

    /// Takes the progress line off the terminal.
    pub fn clear(&mut self) {
        if std::mem::take(&mut self.line_open) {
            let mut err = io::stderr().lock();
            let _ = write!(err, "\r\x1b[2K").and_then(|()| err.flush());
        }
    }

    /// Shows the rows of steps that are done, each once.
    fn rows(&mut self, sheet: &Sheet, is_done: impl Fn(&str) -> bool) {
        for row in sheet.rows.iter().filter(|row| is_done(&row.step)) {
            if self.shown.insert((row.step.clone(), row.measurand.clone())) {
                self.clear();
                let line = match self.format {
                    Format::Text => row_line(row, sheet.language()),
                    Format::Json => row_json(row),
                };
                if let Err(failure) = output::result(&line) {
                    self.failed.get_or_insert(failure);
                }
            }
        }
    }

    /// Bench seconds that pass in one second of wall time: as seen so far, else as fast as allowed.
    fn rate(&self, elapsed_s: f64) -> f64 {
        let (Some(pace), Some((at, first_s))) = (self.pace, self.began) else { return 1.0 };
        let wall = at.elapsed().as_secs_f64();
        if wall > 1.0 { ((elapsed_s - first_s) / wall).clamp(1e-3, pace) } else { pace }
    }

    fn progress(&mut self, run: &Run, elapsed_s: f64) {
        let progress = run.progress();
        let every = if self.on_terminal { REWRITE_EVERY } else { LINE_EVERY };
        let due = self.progress.as_ref().is_none_or(|(step, at)| *step != progress.step || at.elapsed() >= every);
        if !due || progress.step.is_empty() {
            return;
        }
        self.progress = Some((progress.step.clone(), Instant::now()));
        let left = progress.expected_s.map_or_else(String::new, |s| time_left(s / self.rate(elapsed_s)));
        let line = format!("[{}/{}] {}{left}", progress.done_steps + 1, progress.n_steps, progress.step);
        if self.on_terminal {
            let mut err = io::stderr().lock();
            let _ = write!(err, "\r\x1b[2K{line}").and_then(|()| err.flush());
            self.line_open = true;
        } else {
            output::talk(&line);
        }
    }

    /// The record is frozen.
    pub fn ended(&mut self, sheet: &Sheet, folder: &Path) -> Result<(), Failure> {
        // What an early end left unmeasured says why.
        self.rows(sheet, |_| true);
        if let Some(failure) = self.failed.take() {
            return Err(failure);
        }
        let verdict = &sheet.verdict;
        if !sheet.identity.from_captures {
            // The program sees no supply: whatever the ending, a person makes the bench safe.
            output::talk(
                "Supply off. Charge stays in tube and ballast after switch-off: discharge them before touching.",
            );
        }
        let (csv, pdf) = (folder.join("record.csv"), folder.join("record.pdf"));
        match self.format {
            Format::Json => output::result(&object(&[
                ("run_id", json!(sheet.identity.run_id)),
                ("serial", json!(sheet.identity.serial)),
                ("verdict", json!(verdict.outcome.word())),
                ("grade", json!(verdict.grade)),
                ("reject_code", json!(verdict.reject_code)),
                ("sentence", json!(verdict.sentence.english())),
                ("reason", json!(verdict.reason.english())),
                ("record_csv", json!(csv.to_string_lossy())),
                ("record_pdf", json!(pdf.to_string_lossy())),
            ])),
            Format::Text => {
                output::result("")?;
                let language = sheet.language();
                output::result(&format!("{}: {}", sheet.identity.serial, verdict.sentence.text(language)))?;
                if !verdict.reason.is_empty() {
                    output::result(&verdict.reason.text(language))?;
                }
                output::result(&csv.display().to_string())?;
                output::result(&pdf.display().to_string())
            }
        }
    }
}

impl Watcher for Show {
    fn happened(&mut self, run: &Run, event: &Event, remarks: &[Remark]) {
        self.began.get_or_insert((Instant::now(), event.elapsed_s));
        for remark in remarks {
            self.clear();
            output::talk(&format!("  {remark}"));
        }
        let progress = run.progress();
        if progress.done_steps > self.done_steps {
            self.done_steps = progress.done_steps;
            let done = run.plan().recipe.steps.get(..progress.done_steps).unwrap_or_default();
            self.rows(&run.sheet(), |name| done.iter().any(|step| step.name == name));
        }
        self.progress(run, event.elapsed_s);
    }

    fn asking(&mut self, _question: &Question) {
        self.clear();
    }
}

/// ", about 3 min left".
fn time_left(seconds: f64) -> String {
    match seconds {
        s if !s.is_finite() => String::new(),
        s if s < 1.0 => ", a moment left".to_owned(),
        s if s < 90.0 => format!(", about {s:.0} s left"),
        s => format!(", about {:.0} min left", s / 60.0),
    }
}

/// A row as JSON: the value in SI under the measurand's key with the unit's suffix, unknown null.
fn row_json(row: &Row) -> String {
    let known = measurand::find(&row.measurand);
    let key = known.map_or_else(|| row.measurand.clone(), measurand::Measurand::json_key);
    let (value, u, absent) = match &row.value {
        Value::Number { value, u, .. } => (json!(value), json!(u), Json::Null),
        Value::Count { value, .. } => (json!(value), Json::Null, Json::Null),
        Value::AtLeast(least) => (json!(least), Json::Null, Json::Null),
        Value::Word(word) => (json!(word), Json::Null, Json::Null),
        Value::Absent(reason) => (Json::Null, Json::Null, json!(reason.english())),
    };
    let mut fields = vec![("step", json!(row.step)), ("measurand", json!(row.measurand)), (key.as_str(), value)];
    let u_key = known.map(|m| format!("{}_u{}", m.key, m.unit().dimension.suffix()));
    if let Some(u_key) = &u_key {
        fields.push((u_key, u));
    }
    let verdicts = row.judged.iter().map(|judged| json!({ "grade": judged.grade, "verdict": judged.verdict.word() }));
    fields.push(("is_lower_bound", json!(matches!(row.value, Value::AtLeast(_)))));
    fields.push(("absent", absent));
    fields.push(("judged", verdicts.collect()));
    fields.push(("note", json!(row.note.english())));
    object(&fields)
}

/// A JSON object whose fields stay in the order given.
fn object(fields: &[(&str, Json)]) -> String {
    let fields: Vec<String> = fields.iter().map(|(key, value)| format!("{}:{value}", json!(key))).collect();
    format!("{{{}}}", fields.join(","))
}
