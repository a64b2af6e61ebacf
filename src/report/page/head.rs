//! Head of the sheet: serial, type, the verdict as a sentence in its box, and three columns on tube, bench and run.
//! Must not let meaning rest on colour: each outcome has an edge of its own.
//! Main function: [`head`].

use super::{
    super::{
        SIMULATED, reason,
        scene::{Anchor, DARK, GREY, RULE, RUST, Scene, Stroke, Style},
        typeface::Typeface,
    },
    LEFT, RIGHT,
};
use crate::record::sheet::{Instrument, Outcome, Sheet};

const BOX_LEFT: f64 = 318.0;
const BOX_TOP: f64 = 54.0;
const LABEL: Style = Style::plain(7.2, GREY);
const VALUE: Style = Style::plain(7.6, DARK);

/// The head and where it ends.
pub fn head(sheet: &Sheet, face: &Typeface) -> (Scene, f64) {
    let mut scene = Scene::default();
    scene.text(face, (LEFT, 44.0), Anchor::Start, "RECORD OF ONE TUBE", Style::bold(7.0, GREY).spaced(1.2));
    let origin = match (sheet.identity.simulated, sheet.identity.from_captures) {
        (true, _) => SIMULATED,
        (false, true) => "From files of captured sweeps",
        (false, false) => "",
    };
    scene.text(face, (RIGHT, 44.0), Anchor::End, origin, Style::plain(7.0, RUST));
    let title_end = serial_and_title(&mut scene, face, sheet);
    let box_end = verdict_box(&mut scene, face, sheet);
    let rule = f64::max(title_end, box_end) + 11.0;
    scene.line(vec![(LEFT, rule), (RIGHT, rule)], Stroke::solid(DARK, 0.6));
    let columns = [tube(sheet), bench(sheet), run(sheet)];
    let mut end = rule + 20.0;
    for (place, lines) in COLUMNS.iter().zip(&columns) {
        end = end.max(column(&mut scene, face, place, rule + 12.0, lines));
    }
    (scene, end + 7.0)
}

/// Head of a further page.
pub fn continued(sheet: &Sheet, face: &Typeface) -> (Scene, f64) {
    let mut scene = Scene::default();
    let serial = format!("{}, continued", sheet.identity.serial);
    scene.fitted(face, (LEFT, 44.0), Anchor::Start, &serial, Style::bold(9.0, DARK), 300.0);
    let origin = if sheet.identity.simulated { SIMULATED } else { "" };
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
        "" => sheet.title.clone(),
        kind => format!("{} ({kind})", sheet.title),
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
    let lead = scene.text(face, (inner, 70.0), Anchor::Start, "This tube:", Style::plain(8.5, GREY));
    let from = inner + lead + 8.0;
    let until = RIGHT - 14.0;
    let large = Style::bold(10.5, DARK);
    let style =
        if face.width(&face.printable(&verdict.sentence), large) <= until - from { large } else { large.sized(8.0) };
    let mut y = 70.0;
    let lines = face.wrap(&verdict.sentence, style, until - from, 3);
    for (i, line) in lines.iter().enumerate() {
        y += if i > 0 { 11.0 } else { 0.0 };
        scene.text(face, (from + 2.0, y), Anchor::Start, line, style);
        scene.line(vec![(from, y + 3.0), (until, y + 3.0)], Stroke::solid(RULE, 0.6));
    }
    y += 4.0;
    let own = if verdict.reason.is_empty() { reason::of_pass(sheet) } else { None };
    for line in face.wrap(own.as_deref().unwrap_or(&verdict.reason), VALUE, room, 6) {
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
    title: &'static str,
    left: f64,
    /// Left end of what is said, from the left end of the column.
    indent: f64,
    /// Room for what is said.
    room: f64,
}

/// The bench is said at most length.
const COLUMNS: [Column; 3] = [
    Column { title: "Tube", left: LEFT, indent: 38.0, room: 84.0 },
    Column { title: "Bench", left: LEFT + 132.0, indent: 52.0, room: 154.0 },
    Column { title: "Run", left: LEFT + 350.0, indent: 52.0, room: RIGHT - LEFT - 402.0 },
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

fn tube(sheet: &Sheet) -> Vec<Said> {
    let who = &sheet.identity;
    vec![
        said("supplier", &who.supplier),
        said("lot", &who.lot),
        said("condition", &who.condition),
        said("received", &who.received),
    ]
}

fn bench(sheet: &Sheet) -> Vec<Said> {
    let mut lines = vec![said("station", &sheet.station)];
    lines.extend(sheet.instruments.iter().map(instrument));
    lines
}

/// What it is and until when its certificate holds; the certificate's number stands in the metadata of record.csv.
fn instrument(instrument: &Instrument) -> Said {
    let due = match (instrument.due, instrument.overdue) {
        (Some(day), false) => format!("due\u{a0}{day}"),
        (Some(day), true) => format!("overdue\u{a0}since\u{a0}{day}"),
        (None, true) => "overdue".to_owned(),
        (None, false) if instrument.certificate.is_empty() => "no\u{a0}certificate".to_owned(),
        (None, false) => instrument.certificate.clone(),
    };
    let comma = if instrument.what.is_empty() { "" } else { ", " };
    Said {
        label: instrument.role.clone(),
        text: instrument.what.clone(),
        rest: format!("{comma}{due}"),
        stands_out: instrument.overdue,
    }
}

fn run(sheet: &Sheet) -> Vec<Said> {
    let minutes = |seconds: f64| format!("{:.0} min", seconds / 60.0);
    let took = sheet.started_at.zip(sheet.ended_at).map(|(from, to)| minutes((to - from).num_seconds() as f64));
    let dwell = sheet.dwell.filter(|s| s.is_finite()).map(|s| format!("dwell {}", minutes(s)));
    let started = sheet.started_at.map(|at| at.format("%Y-%m-%d %H:%M:%S %:z").to_string()).unwrap_or_default();
    let revisions = format!("revision {}, revision {}", sheet.recipe.revision, sheet.limits.revision);
    // Only where there is one: the head of an ordinary sheet stays as it is.
    let repeats = sheet.identity.repeats.as_ref().map(|repeat| said("repeats run", &repeat.run_id));
    let mut lines = vec![
        said("started", &started),
        said("took", &[took, dwell].into_iter().flatten().collect::<Vec<_>>().join(", ")),
        said("recipe, limits", &revisions),
        said("rule", &sheet.rule),
        said("technician", &sheet.identity.technician),
    ];
    lines.extend(repeats);
    lines
}

/// One column of the head, a line for each thing said. Returns its last baseline.
fn column(scene: &mut Scene, face: &Typeface, place: &Column, top: f64, lines: &[Said]) -> f64 {
    scene.text(face, (place.left, top), Anchor::Start, place.title, Style::bold(8.0, DARK));
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
