//! Head of the sheet: serial, type, the verdict as a sentence in its box, and three columns on tube, bench and run.
//! Must not let meaning rest on colour: each outcome has an edge of its own.
//! Main function: [`head`].

use super::{
    super::{
        SIMULATED,
        scene::{Anchor, DARK, GREY, Point, RULE, RUST, Scene, Stroke, Style},
        typeface::Typeface,
    },
    LEFT, RIGHT,
};
use crate::record::sheet::{Instrument, Outcome, Sheet, TubeVerdict};

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
    let box_end = verdict_box(&mut scene, face, &sheet.verdict);
    let rule = f64::max(title_end, box_end) + 11.0;
    scene.line(vec![(LEFT, rule), (RIGHT, rule)], Stroke::solid(DARK, 0.6));
    let columns = [("Tube", tube(sheet)), ("Bench", bench(sheet)), ("Run", run(sheet))];
    let mut end = rule + 20.0;
    for (i, (title, lines)) in columns.into_iter().enumerate() {
        let left = LEFT + 174.0 * i as f64;
        end = end.max(column(&mut scene, face, (left, rule + 12.0), title, &lines));
    }
    (scene, end + 8.0)
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
fn verdict_box(scene: &mut Scene, face: &Typeface, verdict: &TubeVerdict) -> f64 {
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
    for line in face.wrap(&verdict.reason, VALUE, room, 6) {
        y += 9.6;
        scene.text(face, (inner, y), Anchor::Start, &line, VALUE);
    }
    let end = (y + 7.5).max(100.0);
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

/// Label, text, and whether it must stand out.
type Said = (String, String, bool);

fn said(label: &str, text: &str) -> Said {
    (label.to_owned(), if text.is_empty() { "–".to_owned() } else { text.to_owned() }, false)
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
    lines.extend(sheet.instruments.iter().map(|instrument| {
        let (label, text, _) = said(&instrument.role, &instrument_text(instrument));
        (label, text, instrument.overdue)
    }));
    lines
}

fn instrument_text(instrument: &Instrument) -> String {
    let due = match (instrument.due, instrument.overdue) {
        (Some(day), false) => format!("due\u{a0}{day}"),
        (Some(day), true) => format!("overdue\u{a0}since\u{a0}{day}"),
        (None, true) => "overdue".to_owned(),
        (None, false) => String::new(),
    };
    let certificate = if instrument.certificate.is_empty() { "no certificate" } else { &instrument.certificate };
    [instrument.what.as_str(), certificate, &due].into_iter().filter(|s| !s.is_empty()).collect::<Vec<_>>().join(", ")
}

fn run(sheet: &Sheet) -> Vec<Said> {
    let minutes = |seconds: f64| format!("{:.0} min", seconds / 60.0);
    let took = sheet.started_at.zip(sheet.ended_at).map(|(from, to)| minutes((to - from).num_seconds() as f64));
    let dwell = sheet.dwell.filter(|s| s.is_finite()).map(|s| format!("dwell {}", minutes(s)));
    let started = sheet.started_at.map(|at| at.format("%Y-%m-%d %H:%M:%S %:z").to_string()).unwrap_or_default();
    let revisions = format!("revision {}, revision {}", sheet.recipe.revision, sheet.limits.revision);
    vec![
        said("started", &started),
        said("took", &[took, dwell].into_iter().flatten().collect::<Vec<_>>().join(", ")),
        said("recipe, limits", &revisions),
        said("rule", &sheet.rule),
        said("technician", &sheet.identity.technician),
    ]
}

/// One column of the head. Returns its last baseline.
fn column(scene: &mut Scene, face: &Typeface, (left, top): Point, title: &str, lines: &[Said]) -> f64 {
    scene.text(face, (left, top), Anchor::Start, title, Style::bold(8.0, DARK));
    let (value_left, room) = (left + 52.0, 116.0);
    let mut y = top + 1.0;
    for (label, text, stands_out) in lines {
        let style = Style { bold: *stands_out, ..VALUE };
        scene.fitted(face, (left, y + 10.0), Anchor::Start, label, LABEL, 49.0);
        for line in face.wrap(text, style, room, 2) {
            y += 10.0;
            scene.text(face, (value_left, y), Anchor::Start, &line, style);
        }
    }
    y
}
