//! The keys of a limits file.
//! Must not judge a value.
//! Main function: [`limits`].

use super::{
    Bound, Fillable, Limit, Limits, Outside, Rule, Severity,
    fault::{Fault, nearest},
    reading::{Item, Table, read, sha256_hex},
};
use crate::{
    measurand::{CATALOGUE, Measurand, Shape, find},
    quantity::Dimension,
};

const TOP: &[&str] = &["revision", "title", "grades", "rule", "limit"];
const LIMIT: &[&str] = &["measurand", "lower", "upper", "wanted", "rule", "severity", "reject", "outside", "rack"];
const SEVERITIES: &[(&str, Severity)] =
    &[("critical", Severity::Critical), ("major", Severity::Major), ("minor", Severity::Minor)];
const OUTSIDE: &[(&str, Outside)] = &[("fail", Outside::Fail), ("hold", Outside::Hold)];
/// A revision is counted by hand.
const MOST_REVISIONS: u64 = 1_000_000;

/// Reads a limits file, against what the recipe fills if that is known.
pub fn limits(name: &str, text: &str, fillable: Option<&[Fillable]>) -> Result<Limits, Vec<Fault>> {
    read(name, text, TOP, |root| {
        let revision = root.need("revision").and_then(|item| item.whole(1, MOST_REVISIONS));
        let title = root.need("title").and_then(|item| item.text());
        let grades = root.need("grades").and_then(|item| item.texts());
        let default_rule = root.need("rule").and_then(|item| rule(&item));
        let mut limits: Vec<Limit> = Vec::new();
        let mut whole = true;
        if root.need("limit").is_some() {
            for (index, item) in root.list("limit").iter().enumerate() {
                let Some(limit) = limit(item, index + 1, grades.as_deref(), fillable, &limits) else {
                    whole = false;
                    continue;
                };
                limits.push(limit);
            }
        }
        whole.then_some(())?;
        Some(Limits {
            revision: revision?,
            sha256: sha256_hex(text),
            title: title?.to_owned(),
            grades: grades?,
            rule: default_rule?,
            limits,
        })
    })
}

/// `shared`, `guarded`, or a wanted conformance probability such as `95 %`.
fn rule(item: &Item<'_>) -> Option<Rule> {
    let text = item.text()?;
    match text {
        "shared" => return Some(Rule::Shared),
        "guarded" => return Some(Rule::Guarded),
        _ => {}
    }
    let p = crate::quantity::parse_as(text, Dimension::Ratio).ok().filter(|p| *p > 0.5 && *p < 1.0);
    if p.is_none() || !text.ends_with('%') {
        let message = format!(
            "`rule` is `{text}`; expected shared, guarded, or a conformance probability above 50 % and below 100 % \
             such as \"95 %\""
        );
        item.fault(message, nearest(text, ["shared", "guarded"]));
        return None;
    }
    p.map(Rule::Probability)
}

/// What a limit's measurand is.
enum Subject<'f> {
    Number(&'static Measurand),
    Look(Option<&'f Fillable>),
}

fn limit(
    item: &Item<'_>,
    number: usize,
    grades: Option<&[String]>,
    fillable: Option<&[Fillable]>,
    before: &[Limit],
) -> Option<Limit> {
    let table = item.table(&format!("limit {number}"), LIMIT)?;
    let key = table.need("measurand");
    let subject = key.as_ref().and_then(|key| subject(key, fillable, before));
    let (lower, upper) = (table.get("lower"), table.get("upper"));
    let read_bound = |item: &Option<Item<'_>>| match (item, &subject) {
        (None, _) => Some(Bound::None),
        (Some(item), Some(Subject::Number(measurand))) => bound(item, measurand, grades),
        (Some(item), Some(Subject::Look(_))) => {
            item.fault("a look has no bounds; expected `wanted` with the words that pass", None);
            None
        }
        (Some(_), None) => None,
    };
    let (lower_bound, upper_bound) = (read_bound(&lower), read_bound(&upper));
    let wanted = wanted(&table, subject.as_ref());
    if let (Some(lower), Some(upper), Some(item)) = (&lower_bound, &upper_bound, &lower) {
        check_order(item, lower, upper, grades.unwrap_or_default());
    }
    if subject.is_some() && lower.is_none() && upper.is_none() && table.get("wanted").is_none() {
        table.fault(format!("limit {number} bounds nothing; expected `lower`, `upper` or `wanted`"), None);
    }
    let rule = match table.get("rule") {
        Some(item) => Some(rule(&item)?),
        None => None,
    };
    let outside = table.get("outside").map_or(Some(Outside::Fail), |item| item.word(OUTSIDE));
    let rack_skips = table.get("rack").map_or(Some(false), |item| item.word(&[("hold", false), ("skip", true)]));
    let holds = table.get("outside").is_some_and(|item| item.written() != "\"fail\"");
    let severity = match table.get("severity") {
        Some(item) => item.word(SEVERITIES),
        // What only holds fails nothing, so that its severity has no say.
        None if holds => Some(Severity::Major),
        None => table.need("severity").and(None),
    };
    let reject = match table.get("reject") {
        Some(item) => Some(item.text()?.to_owned()),
        None if holds => None,
        None => table.need("reject").and(None),
    };
    Some(Limit {
        measurand: key?.text()?.to_owned(),
        lower: lower_bound?,
        upper: upper_bound?,
        wanted: wanted?,
        rule,
        severity: severity?,
        reject,
        outside: outside?,
        rack_skips: rack_skips?,
    })
}

fn subject<'f>(key: &Item<'_>, fillable: Option<&'f [Fillable]>, before: &[Limit]) -> Option<Subject<'f>> {
    let text = key.text()?;
    if before.iter().any(|limit| limit.measurand == text) {
        key.fault(format!("`{text}` is limited twice; expected one limit a measurand"), None);
    }
    let filled = fillable.map(|all| all.iter().find(|fillable| fillable.measurand == text));
    let number = find(text);
    let is_look = text.strip_prefix("visual.").is_some_and(|step| !step.is_empty());
    if number.is_none() && !is_look {
        let known = CATALOGUE.iter().map(|measurand| measurand.key);
        let message = format!("unknown measurand `{text}`; expected a key of the catalogue, or `visual.` and a look");
        key.fault(message, nearest(text, known));
        return None;
    }
    if filled == Some(None) {
        let known = fillable.unwrap_or_default().iter().map(|fillable| fillable.measurand.as_str());
        let message =
            format!("`{text}` is limited, but no step of the recipe fills it; expected one that a step fills");
        key.fault(message, nearest(text, known));
    }
    Some(number.map_or(Subject::Look(filled.flatten()), Subject::Number))
}

/// One value for all grades, or a table of grades.
fn bound(item: &Item<'_>, measurand: &Measurand, grades: Option<&[String]>) -> Option<Bound> {
    if !item.is_table() {
        return one_bound(item, measurand).map(Bound::All);
    }
    let table = item.open_table("a bound")?;
    let mut bounds = Vec::new();
    for item in table.each() {
        if grades.is_some_and(|grades| !grades.contains(&item.name)) {
            let known = grades.unwrap_or_default();
            let message = format!("unknown grade `{}`; expected one of {}", item.name, known.join(", "));
            item.key_fault(message, nearest(&item.name, known.iter().map(String::as_str)));
            continue;
        }
        let value = one_bound(&item, measurand);
        bounds.extend(value.map(|value| (item.name, value)));
    }
    if table.each().is_empty() {
        item.fault("the bound names no grade; expected at least one", None);
    }
    let rank = |name: &String| grades.and_then(|grades| grades.iter().position(|grade| grade == name));
    bounds.sort_by_key(|(name, _)| rank(name));
    Some(Bound::PerGrade(bounds))
}

fn one_bound(item: &Item<'_>, measurand: &Measurand) -> Option<f64> {
    match measurand.shape {
        Shape::Count => item.whole(0, MOST_REVISIONS).map(|count| count as f64),
        Shape::Normal | Shape::Positive => item.quantity(measurand.unit().dimension),
    }
}

fn check_order(item: &Item<'_>, lower: &Bound, upper: &Bound, grades: &[String]) {
    let broken = |grade: &str| matches!((lower.of(grade), upper.of(grade)), (Some(low), Some(high)) if low > high);
    if broken("") {
        item.fault("the lower bound is above the upper; expected it below", None);
    } else if let Some(grade) = grades.iter().find(|grade| broken(grade)) {
        item.fault(format!("the lower bound of grade {grade} is above the upper; expected it below"), None);
    }
}

fn wanted(table: &Table<'_>, subject: Option<&Subject<'_>>) -> Option<Vec<String>> {
    let Some(item) = table.get("wanted") else { return Some(Vec::new()) };
    if let Some(Subject::Number(measurand)) = subject {
        item.fault(format!("`{}` is a number; expected `lower` or `upper`, not `wanted`", measurand.key), None);
        return None;
    }
    let words = if item.is_text() { vec![item.text()?.to_owned()] } else { item.texts()? };
    if let Some(Subject::Look(Some(look))) = subject {
        for word in words.iter().filter(|word| !look.choices.contains(word)) {
            let message = format!("`{word}` is no choice of that look; expected one of {}", look.choices.join(", "));
            item.fault(message, nearest(word, look.choices.iter().map(String::as_str)));
        }
    }
    Some(words)
}
