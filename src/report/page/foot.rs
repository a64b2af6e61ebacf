//! Foot of the sheet: remarks, who measured, "not sealed", cautions, run id, hash of record.csv, page.
//! Must not claim a seal.
//! Main function: [`foot`].

use super::{
    super::{
        remarks,
        scene::{Anchor, DARK, GREY, RULE, RUST, Scene, Stroke, Style},
        typeface::{SMALLEST, Typeface},
    },
    LEFT, RIGHT,
};
use crate::{
    phrase::{figure, name, page as phrases},
    record::sheet::Sheet,
};

const LEADING: f64 = 9.0;
/// How far down rows may go on a page that another one follows.
pub const BOTTOM: f64 = LAST_LINE - LEADING - 13.0;
/// Baseline of the last line of every page.
pub const LAST_LINE: f64 = 806.0;
const SMALL: Style = Style::plain(6.8, GREY);

/// The foot and where it begins; drawn from the bottom of the page upwards.
///
/// * `page`: number of the page and of all pages.
pub fn foot(sheet: &Sheet, face: &Typeface, record_sha256: &str, page: (usize, usize)) -> (Scene, f64) {
    let mut scene = last_lines(sheet, face, record_sha256, page);
    let mut lines = face.wrap(&face.say(&sheet.caution), SMALL, RIGHT - LEFT, 4);
    lines.extend(face.wrap(face.word(&phrases::EXPLAINED), SMALL, RIGHT - LEFT, 2));
    let first = LAST_LINE - LEADING - 12.5 - LEADING * (lines.len() as f64 - 1.0);
    for (i, line) in lines.iter().enumerate() {
        scene.text(face, (LEFT, first + LEADING * i as f64), Anchor::Start, line, SMALL);
    }
    let mut top = signatures(&mut scene, face, sheet, first - 18.0);
    let remarks = remark_lines(sheet, face);
    if !remarks.is_empty() {
        let first = top - 1.0 - 9.6 * (remarks.len() as f64 - 1.0);
        scene.text(face, (LEFT, first), Anchor::Start, face.word(&phrases::REMARKS), Style::bold(7.2, DARK));
        for (i, line) in remarks.iter().enumerate() {
            let y = first + LEADING * i as f64;
            scene.text(face, (LEFT + REMARK_INDENT, y), Anchor::Start, line, REMARK);
        }
        top = first - 11.0;
    }
    (scene, top)
}

const REMARK: Style = Style::plain(7.2, DARK);
const REMARK_INDENT: f64 = 38.0;
/// More remarks than this would push the rows off the page; record.csv holds them all.
const MOST_REMARKS: usize = 5;

fn remark_lines(sheet: &Sheet, face: &Typeface) -> Vec<String> {
    let room = RIGHT - LEFT - REMARK_INDENT;
    let mut lines: Vec<String> =
        remarks(sheet).flat_map(|remark| face.wrap(&face.say(remark), REMARK, room, MOST_REMARKS)).collect();
    if lines.len() > MOST_REMARKS {
        lines.truncate(MOST_REMARKS - 1);
        lines.push(face.word(&phrases::MORE_REMARKS).to_owned());
    }
    lines
}

/// The last two lines alone, for a page that another one follows: hash; run, program and page.
pub fn last_lines(sheet: &Sheet, face: &Typeface, record_sha256: &str, (page, pages): (usize, usize)) -> Scene {
    let mut scene = Scene::default();
    let style = Style::plain(SMALLEST, GREY);
    let version = sheet.identity.program_version.as_str();
    let program = ["tubewright", version].join(" ");
    let phrase = if page == pages { &phrases::LAST_PAGE_OF } else { &phrases::PAGE_OF };
    let program = face.say(&phrase.with([name(program.trim_end()), figure(page), figure(pages)]));
    let run = face.say(&phrases::RUN_ID.with([name(sheet.identity.run_id.as_str())]));
    let hash = face.say(&phrases::HASH.with([name(grouped(record_sha256))]));
    scene.fitted(face, (LEFT, LAST_LINE - LEADING), Anchor::Start, &hash, style, RIGHT - LEFT);
    scene.fitted(face, (LEFT, LAST_LINE), Anchor::Start, &run, style, 300.0);
    scene.fitted(face, (RIGHT, LAST_LINE), Anchor::End, &program, style, 205.0);
    scene
}

/// Hexadecimal in groups of eight, as people compare it.
fn grouped(hex: &str) -> String {
    let digits: Vec<char> = hex.chars().collect();
    digits.chunks(8).map(|group| group.iter().collect::<String>()).collect::<Vec<_>>().join(" ")
}

/// Who measured, the empty line of who reviews, and that no seal is on it. Returns where the block begins.
fn signatures(scene: &mut Scene, face: &Typeface, sheet: &Sheet, baseline: f64) -> f64 {
    let label = Style::plain(7.2, GREY);
    let rule = |scene: &mut Scene, from: f64, to: f64| {
        scene.line(vec![(from, baseline + 5.0), (to, baseline + 5.0)], Stroke::solid(RULE, 0.6));
    };
    scene.text(face, (LEFT, baseline - 14.0), Anchor::Start, face.word(&phrases::MEASURED_BY), label);
    scene.text(face, (300.0, baseline - 14.0), Anchor::Start, face.word(&phrases::REVIEWED_BY), label);
    rule(scene, LEFT, 282.0);
    rule(scene, 300.0, 440.0);
    if let Some(by) = &sheet.measured_by {
        let width = scene.fitted(face, (LEFT, baseline), Anchor::Start, &by.initials, Style::bold(11.0, DARK), 80.0);
        let at = face.language.moment(by.at);
        let (x, style) = (LEFT + width.max(24.0) + 10.0, Style::plain(8.0, DARK));
        let at_width = scene.text(face, (x, baseline), Anchor::Start, &at, style);
        let x = x + at_width + 8.0;
        scene.fitted(face, (x, baseline), Anchor::Start, &face.say(&by.meaning), Style::plain(8.0, GREY), 280.0 - x);
    }
    scene.text(face, (RIGHT, baseline), Anchor::End, face.word(&phrases::NOT_SEALED), Style::bold(9.0, RUST));
    let top = baseline - 25.0;
    scene.line(vec![(LEFT, top), (RIGHT, top)], Stroke::solid(DARK, 0.8));
    top - 6.0
}
