//! The language of a sheet: German all through with a decimal comma, while the files for programs stay as they are.
//! Must not know the words of the table: it looks for what must not be there.

#![allow(clippy::unwrap_used, clippy::expect_used, clippy::panic, missing_docs)]

#[path = "program/mod.rs"]
mod program;

use std::{fs, path::Path};

use chrono::DateTime;
use program::Place;
use tubewright::{
    disk::read_chain,
    measurand,
    phrase::{self, Phrase},
    record::{
        event::{Event, Happening, Identity},
        sheet::Sheet,
    },
    report,
    run::{At, Plan, Run},
    station::Want,
};

/// English words that no German sentence has.
const ENGLISH: &[&str] = &[
    "the", "of", "and", "no", "not", "is", "with", "capture", "captures", "modes", "by", "or", "to", "from", "walk",
    "sweep", "peak", "tube", "bench", "run", "value", "power", "at", "due", "hold", "pass", "fail",
];

/// Phrases that are the same in both languages: signs, units, words that both have.
const SAME: &[&str] = &[
    "SEMICOLON",
    "COMMA",
    "SPACE",
    "BENCH_OF_TUBE",
    "SENTENCE",
    "COLON",
    "IS_COUNTED",
    "RANGE",
    "TAU",
    "MINUTES",
    "HASH",
];

/// Every phrase: those of the table and the names of the catalogue.
fn everything() -> Vec<(&'static str, &'static Phrase)> {
    phrase::all().chain(measurand::CATALOGUE.iter().map(|measurand| (measurand.key, &measurand.name))).collect()
}

/// The numbers of the places of a text, each once, ascending.
fn places(text: &str) -> Vec<usize> {
    let parts = text.split('{').skip(1);
    let mut found: Vec<usize> = parts.map(|part| part.split_once('}').unwrap().0.parse().unwrap()).collect();
    found.sort_unstable();
    found.dedup();
    found
}

#[test]
fn every_phrase_stands_in_both_languages_with_the_same_places() {
    let everything = everything();
    assert!(everything.len() > 200, "only {} phrases found", everything.len());
    for (name, phrase) in everything {
        assert!(!phrase.en.is_empty() && !phrase.de.is_empty(), "{name} is empty");
        let found = places(phrase.en);
        assert_eq!(found, places(phrase.de), "{name}");
        assert!(found.iter().enumerate().all(|(i, place)| i == *place), "{name} leaves a place out");
    }
}

#[test]
fn german_is_no_english() {
    // Words that German does not have, or has in another sense.
    let english = [
        " the ",
        " of ",
        " and ",
        " no ",
        " not ",
        " is ",
        " with ",
        " without ",
        " capture",
        " mode ",
        " bench",
        " sheet",
        " at ",
        " by ",
        " or ",
        " to ",
        " from ",
        " walk",
        " sweep",
        " peak",
    ];
    for (name, phrase) in everything() {
        assert_eq!(phrase.en == phrase.de, SAME.contains(&name), "{name}: {}", phrase.de);
        // Keys of files stand between backticks.
        let german = phrase.de.split('`').step_by(2).collect::<Vec<_>>().join(" ");
        let words = format!(" {} ", german.replace(['\u{a0}', '(', ')', ',', ':', ';', '.'], " "));
        for word in english {
            assert!(!words.contains(word), "{name}: `{word}` in `{}`", phrase.de);
        }
        let point =
            phrase.de.as_bytes().windows(3).any(|w| w[0].is_ascii_digit() && w[1] == b'.' && w[2].is_ascii_digit());
        assert!(!point, "{name}: a decimal point in `{}`", phrase.de);
    }
}

fn events(path: &Path) -> Vec<Event> {
    read_chain(&fs::read(path).unwrap()).unwrap().events
}

/// The run of some events, in a language.
fn folded(events: &[Event], language: &str) -> Run {
    let Happening::Opened(opened) = &events[0].what else { panic!("opened first") };
    let plan = Plan::from_texts(&opened.recipe, &opened.limits, &opened.station).unwrap();
    let mut run = Run::open(plan, Identity { language: language.into(), ..opened.identity.clone() });
    events.iter().for_each(|event| take(&mut run, event));
    run
}

fn take(run: &mut Run, event: &Event) {
    let wall = DateTime::parse_from_rfc3339(&event.at).unwrap();
    run.take(&event.what, At { wall, elapsed_ms: (event.elapsed_s * 1e3).round() as u64 });
}

/// What stands on the pages, but for the shop's own words and names.
fn said(sheet: &Sheet) -> Vec<String> {
    let pages = report::sheet_pages(sheet, &"0".repeat(64)).unwrap();
    let who = &sheet.identity;
    let title = sheet.title.english();
    let shops = [&title, &who.condition, &who.lot, &who.supplier, &sheet.station, &who.tube_type];
    let own = |text: &String| !shops.iter().any(|words| words.contains(text.trim_end_matches([')', '('])));
    let texts: Vec<String> =
        pages.iter().flat_map(|page| page.scene().texts().map(str::to_owned).collect::<Vec<_>>()).collect();
    texts.into_iter().filter(own).filter(|text| !text.starts_with("tubewright ")).collect()
}

/// English words and decimal points of a text.
fn breaches(text: &str) -> Vec<String> {
    let words = text.split(|c: char| !c.is_alphanumeric() && c != '.' && c != '_');
    let is_english = |word: &&str| ENGLISH.contains(&word.trim_matches('.').to_lowercase().as_str());
    let digits = |text: &str| !text.is_empty() && text.bytes().all(|b| b.is_ascii_digit());
    let is_decimal = |word: &&str| word.split('.').count() == 2 && word.split('.').all(digits);
    words.filter(|word| is_english(word) || is_decimal(word)).map(str::to_owned).collect()
}

fn stored() -> Vec<(&'static str, Vec<Event>)> {
    let path = |name: &str| format!("{}/fixtures/events/{name}.jsonl", env!("CARGO_MANIFEST_DIR"));
    ["twin", "quad", "plate"].map(|name| (name, events(path(name).as_ref()))).into()
}

#[test]
fn a_german_sheet_is_german_and_has_a_decimal_comma() {
    for (name, events) in stored() {
        // Open, in mid-run, and ended: what is not measured yet says so too.
        for n in [1, events.len() / 2, events.len()] {
            let sheet = folded(&events[..n], "de").sheet();
            let said = said(&sheet);
            assert!(said.iter().any(|text| text == "Diese Röhre:"));
            for text in &said {
                // What a person typed is told as it was.
                let found = breaches(&text.replace("not here", ""));
                assert!(found.is_empty(), "{name}, {n} events: {found:?} in `{text}`");
            }
            let commas = said.iter().filter(|text| text.contains(|c: char| c.is_ascii_digit()) && text.contains(','));
            assert!(n < events.len() || commas.count() > 10, "{name}: hardly a decimal comma\n{}", said.join("\n"));
        }
    }
}

#[test]
fn files_for_programs_do_not_know_the_language() {
    for (name, events) in stored() {
        let of = |language: &str| {
            let sheet = folded(&events, language).sheet();
            let metadata = report::csv_metadata(&sheet, "", "");
            (report::record_csv(&sheet), report::budget_csv(&sheet), metadata)
        };
        assert_eq!(of(""), of("de"), "{name}");
        assert_ne!(said(&folded(&events, "").sheet()), said(&folded(&events, "de").sheet()), "{name}");
        assert_eq!(
            said(&folded(&events, "").sheet()),
            said(&folded(&events, "xx").sheet()),
            "{name}: a language of later"
        );
    }
}

#[test]
fn questions_are_put_in_the_language_of_the_run() {
    for (name, events) in stored() {
        let (mut english, mut german) = (folded(&events[..1], ""), folded(&events[..1], "de"));
        let mut asked = 0;
        for event in &events[1..] {
            take(&mut english, event);
            take(&mut german, event);
            let (Want::Answer(english), Want::Answer(german)) = (english.wants(), german.wants()) else { continue };
            asked += 1;
            assert_eq!((&english.word, &english.expects), (&german.word, &german.expects));
            // A look's question is the recipe's own.
            assert!(english.text != german.text || german.word == "choice", "{name}: {}", german.text);
            assert!(german.word == "choice" || breaches(&german.text).is_empty(), "{name}: {}", german.text);
        }
        assert!(asked > 3, "{name}: only {asked} questions");
    }
}

#[test]
fn the_program_takes_the_language_from_the_command_and_keeps_it() {
    let (english, german) = (Place::new(), Place::new());
    english.inspect("BRISK-1", &["--format", "json"]).is_calm();
    let unanswered = german.write("answers.toml", "technician = \"KT\"\n");
    german.inspect("BRISK-1", &["--language", "de", "--answers", &unanswered]).ends(22, &[]);
    german.inspect("BRISK-1", &["--language", "en"]).ends(30, &["language `de`"]);
    let ran = german.inspect("BRISK-1", &[]);
    ran.is_calm();
    assert!(ran.out.contains("Modenabstand: ") && !ran.out.contains("Mode spacing"), "{}", ran.out);
    let events = events(&german.find("events.jsonl").unwrap());
    let Happening::Opened(opened) = &events[0].what else { panic!("opened first") };
    assert_eq!(opened.identity.language, "de");
    let asked = events
        .iter()
        .any(|event| matches!(&event.what, Happening::Asked { question } if question.caution.contains("Röhre sitzt")));
    assert!(asked, "a stored question is what was shown");
    german.inspect("BRISK-2", &["--language", "fr"]).ends(2, &["`fr`", "en, de"]);

    let again = Place::new();
    again.inspect("BRISK-1", &["--format", "json", "--language", "de"]).is_calm();
    for name in ["record.csv", "budget.csv", "record.csv-metadata.json"] {
        let of = |place: &Place| fs::read_to_string(place.find(name).unwrap()).unwrap();
        assert_eq!(of(&english), of(&again), "{name}");
    }
}

#[test]
fn a_station_has_a_language() {
    let place = Place::new();
    let text = program::fixture("bench.toml");
    let station = place.write("bench.toml", format!("language = \"de\"\n{text}"));
    let ran = place.inspect("BRISK-1", &["--station", &station]);
    assert!(ran.out.contains("Modenabstand: "), "{}\n{}", ran.out, ran.err);
    let station = place.write("odd.toml", format!("language = \"fr\"\n{text}"));
    place.inspect("BRISK-2", &["--station", &station]).ends(30, &["language", "`fr`", "en, de"]);
}
