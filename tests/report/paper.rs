//! record.pdf: what stands on the page, that nothing runs over anything else, and that the file is always the same.

use std::{fs, path::Path};

use super::sheets;
use tubewright::{
    record::sheet::{Sheet, Value},
    report::{
        Page, Part, record_pdf,
        scene::{Mark, Scene},
        sheet_pages,
    },
};

const SHA: &str = "5e1c90b7a1b2c3d4e5f60718293a4b5c6d7e8f90a1b2c3d4e5f60718293a77d2";

fn samples() -> Vec<(&'static str, Sheet)> {
    use sheets::*;
    vec![
        ("pass", pass()),
        ("fail", fail()),
        ("hold", hold()),
        ("doubt", doubt()),
        ("stopped", stopped()),
        ("empty", empty()),
        ("long", long()),
        ("glyphless", glyphless()),
        ("full", full()),
        ("endless", endless()),
        ("german", german()),
    ]
}

fn pages(sheet: &Sheet) -> Vec<Page> {
    sheet_pages(sheet, SHA).unwrap()
}

/// The page's texts, one after the other.
fn said(sheet: &Sheet) -> String {
    let scenes: Vec<Scene> = pages(sheet).iter().map(Page::scene).collect();
    scenes.iter().flat_map(Scene::texts).collect::<Vec<_>>().join("\n")
}

fn part(sheet: &Sheet, wanted: Part) -> Scene {
    pages(sheet).into_iter().flat_map(|page| page.parts).find(|(part, _)| *part == wanted).unwrap().1
}

/// Writes every sample to `target/report-samples` for people to look at.
#[test]
fn samples_for_the_eye() {
    let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("target/report-samples");
    fs::create_dir_all(&folder).unwrap();
    for (name, sheet) in samples() {
        let bytes = record_pdf(&sheet, SHA).unwrap();
        assert!(bytes.starts_with(b"%PDF-1.7"), "{name}");
        assert!(bytes.len() < 300_000 * pages(&sheet).len(), "{name}: {} bytes", bytes.len());
        fs::write(folder.join(format!("{name}.pdf")), bytes).unwrap();
    }
}

/// Left, top, right, bottom of a text: figures of this typeface reach 0.72 em up, letters 0.2 em down.
fn extent(mark: &Mark) -> Option<(f64, f64, f64, f64, &str)> {
    match mark {
        Mark::Text { at: (x, y), width, text, style } => {
            Some((*x, y - 0.72 * style.size, x + width, y + 0.2 * style.size, text))
        }
        _ => None,
    }
}

#[test]
fn no_text_runs_over_another_or_off_the_paper() {
    for (name, sheet) in samples() {
        for page in pages(&sheet) {
            let scene = page.scene();
            let texts: Vec<_> = scene.marks.iter().filter_map(extent).collect();
            for (i, a) in texts.iter().enumerate() {
                assert!(a.0 > 33.0 && a.1 > 30.0 && a.2 < 560.0 && a.3 < 812.0, "{name}: {a:?} is off the paper");
                for b in &texts[i + 1..] {
                    // A tenth of a point cannot be seen in print.
                    let apart = a.2 <= b.0 + 0.1 || b.2 <= a.0 + 0.1 || a.3 <= b.1 + 0.1 || b.3 <= a.1 + 0.1;
                    assert!(apart, "{name}: {a:?} runs over {b:?}");
                }
            }
        }
    }
}

#[test]
fn everything_drawn_is_on_the_paper() {
    for (name, sheet) in samples() {
        for page in pages(&sheet) {
            for mark in page.scene().marks {
                if let Mark::Line { points, .. } | Mark::Area { points, .. } = mark {
                    let inside = |&(x, y): &(f64, f64)| (30.0..565.0).contains(&x) && (30.0..812.0).contains(&y);
                    assert!(points.iter().all(inside), "{name}: {points:?}");
                }
            }
        }
    }
}

/// The parts whose drawing differs between two sheets.
fn changed(a: &Sheet, b: &Sheet) -> Vec<Part> {
    let parts = |sheet| pages(sheet).into_iter().flat_map(|page| page.parts);
    parts(a).zip(parts(b)).filter(|(a, b)| a.1 != b.1).map(|(a, _)| a.0).collect()
}

#[test]
fn every_curve_comes_from_the_sheet() {
    let sheet = sheets::pass();
    let mut other = sheet.clone();
    other.sweep_chart.as_mut().unwrap().modes[0].peak_height *= 1.01;
    assert_eq!(changed(&sheet, &other), [Part::Sweep], "one mode's height moves its own chart and nothing else");
    let mut other = sheet.clone();
    other.gain_chart.as_mut().unwrap().points[40].1 *= 0.99;
    assert_eq!(changed(&sheet, &other), [Part::Gain]);
    let mut other = sheet.clone();
    other.walk_chart.as_mut().unwrap().prediction[150].1 += 1.0;
    assert_eq!(changed(&sheet, &other), [Part::Walk]);
    let mut other = sheet.clone();
    other.rows[0].value = sheets::number("mode_spacing", 998.8, 3.0);
    assert_eq!(changed(&sheet, &other), [Part::Rows]);
    assert!(changed(&sheet, &sheet).is_empty());
}

#[test]
fn one_page_where_one_can_do() {
    for (name, sheet) in samples() {
        let expected = match name {
            "long" | "full" => 2,
            "endless" => 4,
            _ => 1,
        };
        assert_eq!(pages(&sheet).len(), expected, "{name}");
    }
}

#[test]
fn text_is_never_smaller_than_can_be_read() {
    for (name, sheet) in samples() {
        for mark in pages(&sheet).iter().flat_map(|page| page.scene().marks) {
            if let Mark::Text { text, style, .. } = mark {
                assert!(style.size >= 6.5, "{name}: {text:?} at {} pt", style.size);
            }
        }
    }
}

/// Baselines of the labels at the left margin, down the page.
fn label_baselines(scene: &Scene, labels: &[String]) -> Vec<f64> {
    let mut found: Vec<f64> = scene
        .marks
        .iter()
        .filter_map(|mark| match mark {
            Mark::Text { at, text, .. } if labels.contains(text) => Some(at.1),
            _ => None,
        })
        .collect();
    found.sort_by(f64::total_cmp);
    found
}

#[test]
fn rows_stand_far_enough_apart() {
    for (name, sheet) in samples() {
        let limited = sheet.rows.iter().filter(|row| !row.judged.is_empty());
        let labels: Vec<String> = limited.map(|row| row.label.text(sheet.language())).collect();
        for page in pages(&sheet) {
            let baselines = label_baselines(&page.scene(), &labels);
            let least = baselines.windows(2).map(|pair| pair[1] - pair[0]).fold(f64::INFINITY, f64::min);
            assert!(least >= 11.5 - 1e-9, "{name}: {least} pt from row to row");
        }
    }
}

#[test]
fn what_is_for_information_stands_apart() {
    let text = said(&sheets::pass());
    let (limited, rest) = text.split_once("Also measured, for information").unwrap();
    assert!(limited.contains("Power ripple") && !rest.contains("Power ripple"));
    assert!(rest.contains("Mirror spacing") && !limited.contains("Mirror spacing"));
    let mut sheet = sheets::pass();
    for key in ["mode_count_min", "mode_count_max"] {
        sheets::row_mut(&mut sheet, key).judged.clear();
    }
    sheets::row_mut(&mut sheet, "finesse").value = Value::Absent(sheets::say("no sweep was fit to be measured"));
    let text = said(&sheet);
    assert!(text.contains("Modes over a walk cycle\n") && text.contains("1 to 2"), "{text}");
    assert!(text.contains("Finesse of the bench (no sweep was fit to be measured)"), "{text}");
}

#[test]
fn a_pass_names_its_nearest_limit() {
    let sheet = sheets::pass();
    let text = said(&sheet).replace(['\n', '\u{a0}'], " ");
    // 1.02 − 0.98 kV is 4.0 U; the angle's 89.6° − 85° is 4.2 U.
    let sentence = "All 15 limits hold; the nearest is run voltage at the tube, 0.980 kV of at most 1.02 kV.";
    assert!(text.contains(sentence), "{text}");
    let mut doubtful = sheet;
    sheets::row_mut(&mut doubtful, "hop_count").judged[0].verdict = tubewright::record::sheet::RowVerdict::Hold;
    assert!(!said(&doubtful).contains("limits hold"), "claims no more than the rows say");
}

#[test]
fn an_uncertainty_never_reads_as_zero() {
    let mut sheet = sheets::pass();
    sheets::row_mut(&mut sheet, "warmup_ready").value = sheets::number("warmup_ready", 38.6029, 0.0034);
    sheets::row_mut(&mut sheet, "cycles_watched").value = sheets::number("cycles_watched", 149.15, 3e-6);
    let text = said(&sheet);
    assert!(text.contains("38.6029\n± 0.0034") && text.contains("149.1500\nU < 0.0001"), "{text}");
}

#[test]
fn every_order_names_every_mode() {
    let mut sheet = sheets::pass();
    let chart = sheet.sweep_chart.as_mut().unwrap();
    // Modes a twentieth of a gigahertz apart have no room for letters of their own.
    chart.trace.marks = vec![(0, 2e9), (1, 2.05e9), (0, 8.4e9), (1, 8.45e9)];
    let texts: Vec<String> = part(&sheet, Part::Sweep).texts().map(str::to_owned).collect();
    assert_eq!(texts.iter().filter(|text| *text == "ab").count(), 2, "{texts:?}");
}

#[test]
fn what_the_head_says_of_the_bench_is_not_said_again() {
    let mut sheet = sheets::pass();
    sheet.remarks = vec![sheets::say("Simulated bench: not a measurement of a tube.")];
    let text = said(&sheet);
    assert_eq!(text.matches("Simulated bench").count(), 1, "{text}");
}

#[test]
fn no_row_is_lost_however_many() {
    for (name, sheet) in samples().into_iter().filter(|(name, _)| *name != "long") {
        // Lines of a wrapped paragraph follow each other.
        let text = said(&sheet).replace('\n', " ");
        for row in &sheet.rows {
            let counts_modes = ["mode_count_min", "mode_count_max"].contains(&row.measurand.as_str());
            let shared = counts_modes
                && row.judged.is_empty()
                && ["Modes over a walk cycle", "Moden je Wanderperiode"].iter().any(|it| text.contains(it));
            assert!(shared || text.contains(&row.label.text(sheet.language())), "{name}: {:?}", row.label);
        }
    }
}

#[test]
fn the_page_says_what_a_customer_needs() {
    let text = said(&sheets::fail());
    for words in [
        "DEMO-0004",
        "fail, dim.",
        "998.7",
        "± 3.0",
        "MHz",
        "979.3",
        "1019.3",
        "0.5 · 0.3",
        "< 0.001",
        "dim: below 0.30 mW, the last grade's bound",
        "2026-03-02 10:46:52 +00:00",
        "measured",
        "not sealed",
        "Simulated bench: not a measurement of a tube",
        "run 019cad3e-6f10-7c51-a2d4-3b1f0c9e7a55",
        "record.csv sha256 5e1c90b7 a1b2c3d4 e5f60718 293a4b5c 6d7e8f90 a1b2c3d4 e5f60718 293a77d2",
        "tubewright 0.1.0 · page 1 of 1 · end",
        "due\u{a0}2027-01-12",
        "2 swaps (diamond)",
        "exact",
        "wanted: clean",
    ] {
        assert!(text.contains(words), "{words} in:\n{text}");
    }
    assert!(!said(&sheets::doubt()).contains("Simulated"));
    assert!(said(&sheets::hold()).contains("overdue\u{a0}since\u{a0}2026-01-12"));
    let stopped = said(&sheets::stopped());
    assert!(stopped.contains("no value: the run was stopped before"));
    assert!(stopped.contains("no sweep was kept") && stopped.contains("no heights were followed"));
    assert!(said(&sheets::glyphless()).contains("□□□□"));
}

#[test]
fn outcomes_differ_in_shape_alone() {
    let shapes = |sheet: &Sheet| {
        let marks = part(sheet, Part::Head).marks;
        let lines = marks.into_iter().filter_map(|mark| match mark {
            Mark::Line { points, stroke, .. } => Some(format!("{points:.0?} {:?}", stroke.dash)),
            _ => None,
        });
        lines.collect::<Vec<_>>()
    };
    let mut sheet = sheets::pass();
    sheet.verdict.reason = Default::default();
    let mut seen = Vec::new();
    use tubewright::record::sheet::Outcome::*;
    for outcome in [Pass, Fail, Hold, Stopped, Open] {
        sheet.verdict.outcome = outcome;
        let shape = shapes(&sheet);
        assert!(!seen.contains(&shape), "{outcome:?}");
        seen.push(shape);
    }
}

#[test]
fn the_same_sheet_gives_the_same_bytes() {
    let sheet = sheets::pass();
    let once = record_pdf(&sheet, SHA).unwrap();
    assert_eq!(once, record_pdf(&sheet, SHA).unwrap());
    let mut later = sheet.clone();
    later.ended_at = later.started_at;
    assert_ne!(once, record_pdf(&later, SHA).unwrap());
}

#[test]
fn the_file_can_be_read_back() {
    let sheet = sheets::fail();
    let file = lopdf::Document::load_mem(&record_pdf(&sheet, SHA).unwrap()).unwrap();
    let text = file.extract_text(&[1]).unwrap();
    for words in ["DEMO-0004", "998.7", "± 3.0", "MHz", "µm", "not sealed", "τ 6.30 ± 0.30 min"] {
        assert!(text.contains(words), "{words} in:\n{text}");
    }
    let info = file.trailer.get(b"Info").and_then(|info| info.as_reference()).unwrap();
    let title = file.get_dictionary(info).unwrap().get(b"Title").and_then(|title| title.as_str()).unwrap();
    let units: Vec<u16> = title.chunks(2).map(|pair| u16::from_be_bytes([pair[0], pair[1]])).collect();
    assert!(String::from_utf16(&units).unwrap().contains("Simulated bench: not a measurement of a tube"));
    let csv = tubewright::report::record_csv(&sheet);
    let carried = file.objects.values().filter_map(|object| object.as_stream().ok());
    assert!(carried.into_iter().any(|stream| stream.get_plain_content().is_ok_and(|bytes| bytes == csv)));
}

#[test]
fn odd_numbers_do_not_spoil_the_page() {
    for odd in [f64::NAN, f64::INFINITY, f64::NEG_INFINITY, f64::MAX, f64::MIN_POSITIVE, 0.0, -1.0] {
        let mut sheet = sheets::fail();
        for row in &mut sheet.rows {
            if let tubewright::record::sheet::Value::Number { value, expanded, .. } = &mut row.value {
                (*value, *expanded) = (odd, odd);
            }
            for judged in &mut row.judged {
                judged.lower = judged.lower.map(|_| odd);
                judged.conformance_probability = Some(odd);
            }
        }
        let sweep = sheet.sweep_chart.as_mut().unwrap();
        sweep.modes.iter_mut().for_each(|mode| (mode.peak_height, mode.fwhm) = (odd, odd));
        sweep.trace.high[7] = odd;
        sweep.trace.marks.push((99, odd));
        sheet.gain_chart.as_mut().unwrap().points[3] = (odd, odd, odd);
        let walk = sheet.walk_chart.as_mut().unwrap();
        walk.points[5] = (odd, odd);
        (walk.tau, walk.ready, walk.dwell_end) = (Some((odd, odd)), Some((odd, odd)), Some(odd));
        walk.swaps.push(odd);
        sheet.dwell = Some(odd);
        let text = said(&sheet);
        let is_odd = |word: &str| word.contains("NaN") || matches!(word, "inf" | "−inf" | "-inf");
        assert!(!text.split_whitespace().any(is_odd), "{odd}:\n{text}");
        record_pdf(&sheet, SHA).unwrap();
    }
}
