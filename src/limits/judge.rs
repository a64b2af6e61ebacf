//! The verdict on a tube: rows against limits, grades left, order of outcomes.
//! Must not round: verdicts take unrounded values.
//! Main function: [`judge`].

use super::{Limit, Limits, Severity, decide::judge_row, words};
use crate::phrase::{Saying, name, verdict as phrases};
use crate::record::sheet::{Judged, Outcome, Row, RowVerdict, TubeVerdict};

/// What is judged.
pub struct Judging<'a> {
    /// The limits.
    pub limits: &'a Limits,
    /// The rows; judged in place.
    pub rows: &'a mut [Row],
    /// Why the bench gives no verdicts, as sentences; empty if it is in order.
    pub bench_holds: &'a [Saying],
    /// Every step is done.
    pub finished: bool,
    /// The tube gave no light.
    pub dark: bool,
}

/// Reject code of a tube without light.
pub const DARK: &str = "dark";

/// A limited row, beside its limit and that limit's place in the file.
pub(super) struct Limited<'a> {
    pub index: usize,
    pub limit: &'a Limit,
    pub row: &'a Row,
}

impl<'a> Limited<'a> {
    pub fn entries(&self, verdict: RowVerdict) -> impl Iterator<Item = &'a Judged> + use<'a> {
        self.row.judged.iter().filter(move |judged| judged.verdict == verdict)
    }

    fn costs_a_grade(&self) -> bool {
        self.limit.severity != Severity::Minor && self.entries(RowVerdict::Fail).next().is_some()
    }
}

/// Judges every limited row and the tube.
///
/// Fills `judged`, `deciding` and `note` of the rows; a row without a limit stays not judged. The order of outcomes:
/// 1. not finished: open;
/// 2. the bench out of order or overdue: hold, and no row has a verdict of its own;
/// 3. no light, a failed critical limit, or no grade left: fail, with the first reject code by severity, then file order;
/// 4. a limited row without a value, or outside a limit that says hold, for a grade that is left: hold;
/// 5. pass, with the best grade left.
pub fn judge(judging: Judging<'_>) -> TubeVerdict {
    let Judging { limits, rows, bench_holds, finished, dark } = judging;
    for row in rows.iter_mut() {
        let limit = limits.limits.iter().find(|limit| limit.measurand == row.measurand);
        row.judged = limit.map_or(Vec::new(), |limit| judge_row(row, limit, limits, finished));
        row.deciding = false;
        if !bench_holds.is_empty() {
            for judged in &mut row.judged {
                judged.verdict = if finished { RowVerdict::Hold } else { RowVerdict::NotJudged };
                judged.reject_code = None;
            }
        } else if let Some(limit) = limit {
            row.note = words::appended(&row.note, words::note(row, limit));
        }
    }
    if !finished {
        return verdict(Outcome::Open, &phrases::OPEN, Saying::none());
    }
    if !bench_holds.is_empty() {
        return verdict(Outcome::Hold, &phrases::HOLD, words::bench_hold(bench_holds));
    }
    let (ending, deciding) = conclude(limits, rows, dark);
    for index in deciding {
        rows[index].deciding = true;
    }
    ending
}

fn verdict(outcome: Outcome, sentence: impl Into<Saying>, reason: Saying) -> TubeVerdict {
    TubeVerdict { outcome, grade: None, reject_code: None, sentence: sentence.into(), reason }
}

fn failed_by(code: &str) -> Saying {
    phrases::FAIL_CODE.with([name(code)])
}

/// Outcomes 3 to 5, and the indices of the rows that decide.
fn conclude(limits: &Limits, rows: &[Row], dark: bool) -> (TubeVerdict, Vec<usize>) {
    let place = |row: &Row| limits.limits.iter().position(|limit| limit.measurand == row.measurand);
    let limited: Vec<(usize, Limited<'_>)> = rows
        .iter()
        .enumerate()
        .filter_map(|(at, row)| {
            let index = place(row)?;
            Some((at, Limited { index, limit: &limits.limits[index], row }))
        })
        .collect();
    if dark {
        let ending = verdict(Outcome::Fail, failed_by(DARK), (&phrases::NO_LIGHT).into());
        return (TubeVerdict { reject_code: Some(DARK.to_owned()), ..ending }, Vec::new());
    }

    let left = grades_left(limits, limited.iter().map(|(_, limited)| limited));
    if left.is_empty() {
        let mut failed: Vec<&(usize, Limited<'_>)> = limited.iter().filter(|(_, row)| row.costs_a_grade()).collect();
        failed.sort_by_key(|(_, row)| (row.limit.severity, row.index));
        let rows: Vec<&Limited<'_>> = failed.iter().map(|(_, row)| row).collect();
        let code = rows.first().and_then(|row| row.limit.reject.clone());
        let sentence = code.as_ref().map_or((&phrases::FAIL).into(), |code| failed_by(code));
        let ending = verdict(Outcome::Fail, sentence, words::fail(&rows));
        return (TubeVerdict { reject_code: code, ..ending }, failed.iter().map(|(at, _)| *at).collect());
    }

    let held = |row: &Limited<'_>| {
        row.entries(RowVerdict::Hold).any(|judged| judged.grade.is_empty() || left.contains(&judged.grade.as_str()))
    };
    let held: Vec<&(usize, Limited<'_>)> = limited.iter().filter(|(_, row)| held(row)).collect();
    let has_row = |limit: &&Limit| !rows.iter().any(|row| row.measurand == limit.measurand);
    let unfilled: Vec<&Limit> = limits.limits.iter().filter(has_row).collect();
    if !held.is_empty() || !unfilled.is_empty() {
        let rows: Vec<&Limited<'_>> = held.iter().map(|(_, row)| row).collect();
        let ending = verdict(Outcome::Hold, &phrases::HOLD, words::hold(&rows, &unfilled));
        return (ending, held.iter().map(|(at, _)| *at).collect());
    }

    let best = left[0].to_owned();
    let lost: Vec<&str> = limits.grades.iter().map(String::as_str).take_while(|grade| *grade != best).collect();
    let all: Vec<&Limited<'_>> = limited.iter().map(|(_, row)| row).collect();
    let ending = verdict(Outcome::Pass, phrases::PASS.with([name(best.as_str())]), words::pass(&all, &lost));
    let deciding = limited.iter().filter(|(_, row)| row.costs_a_grade()).map(|(at, _)| *at).collect();
    (TubeVerdict { grade: Some(best), ..ending }, deciding)
}

/// The grades that no failed limit took, best first.
fn grades_left<'l, 'r>(limits: &'l Limits, limited: impl Iterator<Item = &'r Limited<'r>>) -> Vec<&'l str> {
    let mut left: Vec<&str> = limits.grades.iter().map(String::as_str).collect();
    for row in limited {
        for judged in row.entries(RowVerdict::Fail) {
            match row.limit.severity {
                Severity::Critical => left.clear(),
                Severity::Major if judged.grade.is_empty() => left.clear(),
                Severity::Major => left.retain(|grade| *grade != judged.grade),
                Severity::Minor => {}
            }
        }
    }
    left
}
