//! `inspect --scenario`: every tube of a scenario in its order, each to its ending, then the day as a table.
//! Must not inspect a tube another way than by its serial alone, and never runs a finished one again.
//! Main function: [`run`].

use std::path::PathBuf;
use std::time::Instant;

use serde_json::json;

use super::{Arguments, Done, Format, earlier, ending_of, inputs::Inputs, inspect, show::Show};
use crate::cli::{Ending, Failure, output};
use crate::phantom::Scenario;
use crate::record::sheet::{Outcome, Sheet};

/// How one tube of the day ended.
struct Line {
    serial: String,
    ending: Ending,
    /// "pass, prime", "fail, dim", "not finished".
    words: String,
    outcome: String,
    grade: String,
    reject_code: String,
    reason: String,
    folder: Option<PathBuf>,
    /// It was finished before today.
    earlier: bool,
}

/// Inspects every tube of the scenario.
///
/// Returns the highest of the endings. A tube that cannot be inspected is said and listed; the others are inspected all the
/// same. A run that a person stopped ends the day: who stops the bench does not want the next tube on it.
pub(super) fn run(arguments: &Arguments) -> Result<Ending, Failure> {
    let scenario = match arguments.scenario.as_ref().and_then(Option::as_ref) {
        Some(path) => super::inputs::read_scenario(path)?,
        None => Scenario::demo(),
    };
    let serials: Vec<&str> = scenario.tubes.iter().map(|tube| tube.serial.as_str()).collect();
    if serials.is_empty() {
        return Err(Failure::unusable("the scenario has no tube to inspect; expected `[[tube]]`"));
    }
    let n = serials.len();
    output::talk(&format!(
        "{}: {n} tubes, as fast as this machine goes unless `--pace` says otherwise",
        scenario.title
    ));
    let (began, mut ran, mut lines) = (Instant::now(), 0u32, Vec::new());
    for (index, serial) in serials.iter().enumerate() {
        let left = match ran {
            0 => String::new(),
            _ => time_left(began.elapsed().as_secs_f64() / f64::from(ran) * (n - index) as f64),
        };
        output::talk(&format!("\nTube {} of {n}: {serial}{left}", index + 1));
        let line = one(arguments, serial);
        ran += u32::from(!line.earlier);
        if arguments.format == Format::Json {
            output::result(&json(&line))?;
        }
        let stopped = line.outcome == Outcome::Stopped.word() && !line.earlier;
        lines.push(line);
        if stopped {
            output::talk("Stopped: the tubes that follow were not begun. The same command goes on with them.");
            break;
        }
    }
    if arguments.format == Format::Text {
        table(&scenario.title, &lines, n)?;
    }
    let ending = lines.iter().fold(Ending::Accepted, |worst, line| worst.worse(line.ending));
    Ok(if lines.len() < n { ending.worse(Ending::Unfinished) } else { ending })
}

/// One tube: the run it has, or a new one.
fn one(arguments: &Arguments, serial: &str) -> Line {
    let done = Inputs::read(arguments.for_day(), serial).and_then(|inputs| match finished(&inputs)? {
        Some(line) => Ok(line),
        None => {
            let mut show = (inputs.format == Format::Text)
                .then(|| Show::new(inputs.format, inputs.pace, inputs.screen.clone(), inputs.ask));
            inspect(&inputs, show.as_mut()).map(|Done { sheet, folder }| of_sheet(&sheet, folder))
        }
    });
    done.unwrap_or_else(|failure| {
        output::talk(&format!("tubewright: {}", failure.message));
        let reason = failure.message.lines().next().unwrap_or_default().to_owned();
        let words = "not finished".to_owned();
        Line { ending: failure.ending, words, reason, ..empty(serial) }
    })
}

fn empty(serial: &str) -> Line {
    Line {
        serial: serial.to_owned(),
        ending: Ending::Unfinished,
        words: String::new(),
        outcome: String::new(),
        grade: String::new(),
        reject_code: String::new(),
        reason: String::new(),
        folder: None,
        earlier: false,
    }
}

/// The last run of a serial that is finished, unless another is open or it was stopped: those go on, or are run anew.
fn finished(inputs: &Inputs) -> Result<Option<Line>, Failure> {
    let runs = inputs.store.runs_of(&inputs.serial).map_err(|error| Failure::store(&error))?;
    if runs.iter().any(|run| !run.frozen) {
        return Ok(None);
    }
    let Some(last) = earlier::Finished::of(&runs).pop() else { return Ok(None) };
    let record = last.record.map_err(|error| Failure::store(&error))?;
    if record.outcome == Outcome::Stopped.word() {
        return Ok(None);
    }
    output::talk(&format!("  finished already: {}", earlier::ending_words(&record)));
    let of_outcome = [(Outcome::Pass, Ending::Accepted), (Outcome::Fail, Ending::NotAccepted)];
    let ending = of_outcome.iter().find(|(outcome, _)| outcome.word() == record.outcome);
    Ok(Some(Line {
        ending: ending.map_or(Ending::Hold, |(_, ending)| *ending),
        words: earlier::ending_words(&record),
        outcome: record.outcome,
        grade: record.grade,
        reject_code: record.reject_code,
        reason: record.reason,
        folder: Some(last.run.path.clone()),
        earlier: true,
        ..empty(&inputs.serial)
    }))
}

fn of_sheet(sheet: &Sheet, folder: PathBuf) -> Line {
    let verdict = &sheet.verdict;
    let (grade, reject_code) =
        (verdict.grade.clone().unwrap_or_default(), verdict.reject_code.clone().unwrap_or_default());
    let word = verdict.outcome.word();
    let more = if grade.is_empty() { &reject_code } else { &grade };
    Line {
        ending: ending_of(sheet),
        words: if more.is_empty() { word.to_owned() } else { format!("{word}, {more}") },
        outcome: word.to_owned(),
        grade,
        reject_code,
        // As the record has it, by which a finished one is listed.
        reason: verdict.reason.english(),
        folder: Some(folder),
        ..empty(&sheet.identity.serial)
    }
}

/// The day on paper: a line a tube, the reason beneath it.
fn table(title: &str, lines: &[Line], n: usize) -> Result<(), Failure> {
    output::result(&format!("\n{title}: {} of {n} tubes", lines.len()))?;
    let wide = |of: fn(&Line) -> &String| lines.iter().map(|line| of(line).chars().count()).max().unwrap_or(0);
    let (serial, words) = (wide(|line| &line.serial), wide(|line| &line.words));
    for line in lines {
        let folder = line.folder.as_ref().map(|folder| folder.display().to_string()).unwrap_or_default();
        output::result(format!("{:serial$}  {:words$}  {folder}", line.serial, line.words).trim_end())?;
        if !line.reason.is_empty() {
            output::result(&format!("{:serial$}  {}", "", line.reason))?;
        }
    }
    Ok(())
}

fn json(line: &Line) -> String {
    let or_null = |text: &str| if text.is_empty() { serde_json::Value::Null } else { json!(text) };
    json!({
        "serial": line.serial,
        "verdict": or_null(&line.outcome),
        "grade": or_null(&line.grade),
        "reject_code": or_null(&line.reject_code),
        "reason": line.reason,
        "status": line.ending.status(),
        "folder": line.folder.as_ref().map(|folder| folder.to_string_lossy()),
        "finished_earlier": line.earlier,
    })
    .to_string()
}

/// ", about 3 min left".
fn time_left(seconds: f64) -> String {
    if seconds < 90.0 {
        format!(", about {seconds:.0} s left")
    } else {
        format!(", about {:.0} min left", seconds / 60.0)
    }
}
