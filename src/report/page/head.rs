//! Head of the sheet: serial, type, the verdict as a sentence in its box, and three columns on tube, bench and run.
//! Must not let meaning rest on colour: each outcome has an edge of its own.
//! Main function: [`head`].

use super::{
    super::{
        reason,
        scene::{Anchor, DARK, GREY, RULE, RUST, Scene, Stroke, Style},
        typeface::Typeface,
    },
    LEFT, RIGHT,
};
use crate::{
    phrase::{
        self, Phrase, Saying, figure, name, page as phrases, said as piece,
        verdict::{COMMA, rule},
    },
    record::sheet::{Instrument, Outcome, Sheet},
};

const BOX_LEFT: f64 = 318.0;
const BOX_TOP: f64 = 54.0;
const LABEL: Style = Style::plain(7.2, GREY);
const VALUE: Style = Style::plain(7.6, DARK);

/// The head and where it ends.
pub fn head(sheet: &Sheet, face: &Typeface) -> (Scene, f64) {
    let mut scene = Scene::default();
    scene.text(face, (LEFT, 44.0), Anchor::Start, face.word(&phrases::RECORD), Style::bold(7.0, GREY).spaced(1.2));
    let origin = match (sheet.identity.simulated, sheet.identity.from_captures) {
        (true, _) => face.word(&phrases::SIMULATED),
        (false, true) => face.word(&phrases::FROM_FILES),
        (false, false) => "",
    };
    scene.text(face, (RIGHT, 44.0), Anchor::End, origin, Style::plain(7.0, RUST));
    let title_end = serial_and_title(&mut scene, face, sheet);
    let box_end = verdict_box(&mut scene, face, sheet);
    let rule = f64::max(title_end, box_end) + 11.0;
    scene.line(vec![(LEFT, rule), (RIGHT, rule)], Stroke::solid(DARK, 0.6));
    let columns = [tube(sheet, face), bench(sheet, face), run(sheet, face)];
    let mut end = rule + 20.0;
    for (place, lines) in COLUMNS.iter().zip(&columns) {
        end = end.max(column(&mut scene, face, place, rule + 12.0, lines));
    }
    (scene, end + 7.0)
}

/// Head of a further page.
pub fn continued(sheet: &Sheet, face: &Typeface) -> (Scene, f64) {
    let mut scene = Scene::default();
    let serial = face.say(&phrases::CONTINUED.with([name(sheet.identity.serial.as_str())]));
    scene.fitted(face, (LEFT, 44.0), Anchor::Start, &serial, Style::bold(9.0, DARK), 300.0);
    let origin = if sheet.identity.simulated { face.word(&phrases::SIMULATED) } else { "" };
    scene.text(face, (RIGHT, 44.0), Anchor::End, origin, Style::plain(7.0, RUST));
    scene.line(vec![(LEFT, 50.0), (RIGHT, 50.0)], Stroke::solid(DARK, 0.6));
    (scene, 60.0)
}

/// The serial as large as it can stand whole, the type under it. Returns where they end.
fn serial_and_title(scene: &mut Scene, face: &Typeface, sheet: &Sheet) -> f64 {
    let room = BOX_LEFT - 9.0 - LEFT;
    let serial = face.printable(&sheet.identity.serial);
    let sizes = [25.0, 22.0, 19.0, 17.0, 15.0, 13.0, 11.0];
    let style = |size: f64| Style::bold(size, DARK);
    let mut y = 71.0;
    if let Some(&size) = sizes.iter().find(|&&size| face.width(&serial, style(size)) <= room) {
        scene.text(face, (LEFT, y), Anchor::Start, &serial, style(size));
    } else {
        // Sixty-four of the widest letters fit into three lines of the second size.
        let size = if face.wrap(&serial, style(11.0), room, 9).len() <= 2 { 11.0 } else { 8.5 };
        for (i, line) in face.wrap(&serial, style(size), room, 3).iter().enumerate() {
            y = 58.0 + (size + 2.0) * (i as f64 + 0.3);
            scene.text(face, (LEFT, y), Anchor::Start, line, style(size));
        }
    }
    let title = match sheet.identity.tube_type.as_str() {
        "" => face.say(&sheet.title),
        kind => format!("{} ({kind})", face.say(&sheet.title)),
    };
    let style = Style::plain(8.5, GREY);
    for line in face.wrap(&title, style, room, 2) {
        y += if y > 71.0 { 10.5 } else { 14.0 };
        scene.text(face, (LEFT, y), Anchor::Start, &line, style);
    }
    y + 4.0
}

/// "This tube: …" filled in as a clerk would, with the reason. Returns where the box ends.
fn verdict_box(scene: &mut Scene, face: &Typeface, sheet: &Sheet) -> f64 {
    let verdict = &sheet.verdict;
    let (inner, room) = (BOX_LEFT + 10.0, RIGHT - BOX_LEFT - 20.0);
    let lead = scene.text(face, (inner, 70.0), Anchor::Start, face.word(&phrases::THIS_TUBE), Style::plain(8.5, GREY));
    let from = inner + lead + 8.0;
    let until = RIGHT - 14.0;
    let large = Style::bold(10.5, DARK);
    let sentence = face.say(&verdict.sentence);
    let style = if face.width(&face.printable(&sentence), large) <= until - from { large } else { large.sized(8.0) };
    let mut y = 70.0;
    let lines = face.wrap(&sentence, style, until - from, 3);
    for (i, line) in lines.iter().enumerate() {
        y += if i > 0 { 11.0 } else { 0.0 };
        scene.text(face, (from + 2.0, y), Anchor::Start, line, style);
        scene.line(vec![(from, y + 3.0), (until, y + 3.0)], Stroke::solid(RULE, 0.6));
    }
    y += 4.0;
    let own = if verdict.reason.is_empty() { reason::of_pass(sheet, face.language) } else { None };
    for line in face.wrap(&own.unwrap_or_else(|| face.say(&verdict.reason)), VALUE, room, 6) {
        y += 9.6;
        scene.text(face, (inner, y), Anchor::Start, &line, VALUE);
    }
    let end = (y + 7.5).max(84.0);
    edge(scene, verdict.outcome, end);
    end
}

/// Each outcome has an edge of its own: whole, cut at a corner, hatched, dashed, dotted.
fn edge(scene: &mut Scene, outcome: Outcome, end: f64) {
    let whole = vec![(BOX_LEFT, BOX_TOP), (RIGHT, BOX_TOP), (RIGHT, end), (BOX_LEFT, end)];
    match outcome {
        Outcome::Pass => scene.outline(whole, Stroke::solid(DARK, 1.2)),
        Outcome::Fail => {
            let cut = 14.0;
            let mut cut_corner = whole;
            cut_corner.splice(1..2, [(RIGHT - cut, BOX_TOP), (RIGHT, BOX_TOP + cut)]);
            scene.outline(cut_corner, Stroke::solid(DARK, 2.4));
        }
        Outcome::Hold => {
            scene.outline(whole, Stroke::solid(DARK, 1.2));
            let steps = ((end - BOX_TOP) / 5.0).floor() as usize;
            for i in 0..steps {
                let y = BOX_TOP + 5.0 * i as f64;
                scene.line(vec![(BOX_LEFT - 6.0, y), (BOX_LEFT - 0.6, y + 5.0)], Stroke::solid(DARK, 1.0));
            }
        }
        Outcome::Stopped => scene.outline(whole, Stroke::dashed(DARK, 1.2, 5.0, 3.0)),
        Outcome::Open => scene.outline(whole, Stroke::dashed(GREY, 0.8, 1.0, 2.0)),
    }
}

/// Where a column of the head stands.
struct Column {
    title: &'static Phrase,
    left: f64,
    /// Left end of what is said, from the left end of the column.
    indent: f64,
    /// Room for what is said.
    room: f64,
}

/// The bench is said at most length.
const COLUMNS: [Column; 3] = [
    Column { title: &phrases::TUBE, left: LEFT, indent: 38.0, room: 84.0 },
    Column { title: &phrases::BENCH, left: LEFT + 132.0, indent: 52.0, room: 154.0 },
    Column { title: &phrases::RUN, left: LEFT + 350.0, indent: 52.0, room: RIGHT - LEFT - 402.0 },
];

/// One line of a column.
struct Said {
    label: String,
    /// May be shortened.
    text: String,
    /// Is never shortened.
    rest: String,
    stands_out: bool,
}

fn said(label: &str, text: &str) -> Said {
    let text = if text.is_empty() { "–" } else { text };
    Said { label: label.to_owned(), text: text.to_owned(), rest: String::new(), stands_out: false }
}

fn tube(sheet: &Sheet, face: &Typeface) -> Vec<Said> {
    let who = &sheet.identity;
    vec![
        said(face.word(&phrases::SUPPLIER), &who.supplier),
        said(face.word(&phrases::LOT), &who.lot),
        said(face.word(&phrases::CONDITION), &who.condition),
        said(face.word(&phrases::RECEIVED), &face.language.day_text(&who.received)),
    ]
}

fn bench(sheet: &Sheet, face: &Typeface) -> Vec<Said> {
    let mut lines = vec![said(face.word(&phrases::STATION), &sheet.station)];
    lines.extend(sheet.instruments.iter().map(|it| instrument(it, face)));
    lines
}

/// What it is and until when its certificate holds; the certificate's number stands in the metadata of record.csv.
fn instrument(instrument: &Instrument, face: &Typeface) -> Said {
    let due = match (instrument.due, instrument.overdue) {
        (Some(day), false) => face.say(&phrases::DUE.with([phrase::day(day)])),
        (Some(day), true) => face.say(&phrases::OVERDUE_SINCE.with([phrase::day(day)])),
        (None, true) => face.word(&phrases::OVERDUE).to_owned(),
        (None, false) if instrument.certificate.is_empty() => face.word(&phrases::NO_CERTIFICATE).to_owned(),
        (None, false) => instrument.certificate.clone(),
    };
    let what = face.say(&instrument.what);
    let comma = if what.is_empty() { "" } else { ", " };
    Said {
        label: face.say(&instrument.role),
        text: what,
        rest: format!("{comma}{due}"),
        stands_out: instrument.overdue,
    }
}

fn run(sheet: &Sheet, face: &Typeface) -> Vec<Said> {
    let minutes = |seconds: f64| phrases::MINUTES.with([figure(format!("{:.0}", seconds / 60.0))]);
    let took = sheet.started_at.zip(sheet.ended_at).map(|(from, to)| minutes((to - from).num_seconds() as f64));
    let dwell = sheet.dwell.filter(|s| s.is_finite()).map(|s| phrases::DWELL.with([piece(minutes(s))]));
    let started = sheet.started_at.map(|at| face.language.moment(at)).unwrap_or_default();
    let revisions = phrases::REVISIONS.with([figure(sheet.recipe.revision), figure(sheet.limits.revision)]);
    let took = Saying::list([took, dwell].into_iter().flatten(), &COMMA);
    // Only where there is one: the head of an ordinary sheet stays as it is.
    let repeats = sheet.identity.repeats.as_ref();
    let repeats = repeats.map(|repeat| said(face.word(&phrases::REPEATS_RUN), &repeat.run_id));
    let mut lines = vec![
        said(face.word(&phrases::STARTED), &started),
        said(face.word(&phrases::TOOK), &face.say(&took)),
        said(face.word(&phrases::RECIPE_LIMITS), &face.say(&revisions)),
        said(face.word(&phrases::RULE), &face.say(&rule(&sheet.rule))),
        said(face.word(&phrases::TECHNICIAN), &sheet.identity.technician),
    ];
    lines.extend(repeats);
    lines
}

/// One column of the head, a line for each thing said. Returns its last baseline.
fn column(scene: &mut Scene, face: &Typeface, place: &Column, top: f64, lines: &[Said]) -> f64 {
    scene.text(face, (place.left, top), Anchor::Start, face.word(place.title), Style::bold(8.0, DARK));
    let mut y = top + 1.0;
    for line in lines {
        y += 10.2;
        let style = Style { bold: line.stands_out, ..VALUE };
        scene.fitted(face, (place.left, y), Anchor::Start, &line.label, LABEL, place.indent - 3.0);
        let whole = format!("{}{}", line.text, line.rest);
        let at = (place.left + place.indent, y);
        let (fitted, smaller) = face.fit(&whole, style, place.room);
        if fitted == face.printable(&whole) {
            scene.text(face, at, Anchor::Start, &fitted, smaller);
            continue;
        }
        let rest = face.shorten(&face.printable(&line.rest), smaller, place.room * 0.75);
        let text = face.printable(&line.text);
        let text = face.shorten(&text, smaller, place.room - face.width(&rest, smaller));
        scene.fitted(face, at, Anchor::Start, &format!("{text}{rest}"), smaller, place.room);
    }
    y
}
