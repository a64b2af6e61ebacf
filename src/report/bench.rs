//! The chart of a bench's reference tubes as PDF, with its numbers as CSV inside it.
//! Must not judge: what is inside and what drifts comes in.
//! Main types: [`BenchChart`], [`BenchPoint`]; main functions: [`bench_pdf`], [`bench_csv`].

use chrono::{DateTime, FixedOffset};

use super::{
    PdfError,
    charts::{self, Frame},
    document_id,
    escape::neutralise,
    page::{HEIGHT, LEFT, RIGHT},
    pdf,
    scene::{Anchor, DARK, GREY, RUST, Scene, Stroke, Style},
    typeface::Typeface,
};
use crate::phrase::{Language, Phrase, Saying, name, page};

/// One measurand of one reference tube over time, in the unit that people see.
#[derive(Debug, Clone, PartialEq)]
pub struct BenchChart {
    /// Serial of the tube.
    pub serial: String,
    /// Name of the measurand.
    pub measurand: &'static Phrase,
    /// Unit, as people write it.
    pub unit: String,
    /// Decimals shown.
    pub decimals: usize,
    /// What the bench reads when it is in order.
    pub value: f64,
    /// A check may be this far off.
    pub within: f64,
    /// Sum at which a drift is an alarm, standard deviations.
    pub alarm: f64,
    /// The checks, in the order of time.
    pub points: Vec<BenchPoint>,
}

/// One check on a chart.
#[derive(Debug, Clone, PartialEq)]
pub struct BenchPoint {
    /// When.
    pub at: DateTime<FixedOffset>,
    /// Id of its run; empty for a check that came with the scenario.
    pub run_id: String,
    /// Value in the unit of the chart.
    pub value: f64,
    /// Inside its bounds.
    pub inside: bool,
    /// Cumulative sums (up, down), standard deviations.
    pub sums: Option<(f64, f64)>,
}

/// What is written over the charts.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct BenchTitle {
    /// Name of the bench.
    pub station: String,
    /// Sentences below the title.
    pub lines: Vec<Saying>,
    /// It is a simulated one.
    pub simulated: bool,
    /// Language of the page.
    pub language: Language,
}

/// Height that the head takes, pt.
const HEAD: f64 = 62.0;
/// Lowest place of a chart's end, pt.
const BOTTOM: f64 = HEIGHT - 40.0;

/// The charts on A4, as many pages as they need, with [`bench_csv`] inside.
///
/// * `sha256`: SHA-256 of that CSV, hexadecimal: the id of the document.
pub fn bench_pdf(
    title: &BenchTitle,
    charts: &[BenchChart],
    date: DateTime<FixedOffset>,
    program: &str,
    sha256: &str,
) -> Result<Vec<u8>, PdfError> {
    let face = &Typeface::embedded(title.language).ok_or(PdfError::Typeface)?;
    let mut pages = Vec::new();
    let (mut sheet, mut top) = head(title, face);
    for chart in charts {
        if top + charts::BENCH_HEIGHT > BOTTOM {
            pages.push(std::mem::take(&mut sheet));
            (sheet, top) = head(title, face);
        }
        let frame = Frame { left: LEFT, top, width: RIGHT - LEFT, plot: 100.0 };
        sheet.append(charts::bench(chart, face, frame));
        top += charts::BENCH_HEIGHT;
    }
    pages.push(sheet);
    let about = pdf::About {
        title: face.say(&page::BENCH_TITLE.with([name(title.station.clone())])),
        language: title.language.code(),
        program: program.to_owned(),
        date: Some(date),
        id: document_id(sha256, ""),
        attached: ("checks.csv", "text/csv", bench_csv(charts)),
    };
    pdf::write(&pages, face, about)
}

/// The head of a page and where it ends.
fn head(title: &BenchTitle, face: &Typeface) -> (Scene, f64) {
    let mut scene = Scene::default();
    let origin = if title.simulated { face.word(&page::SIMULATED) } else { "" };
    scene.text(face, (RIGHT, 44.0), Anchor::End, origin, Style::plain(7.0, RUST));
    let words = face.say(&page::BENCH_TITLE.with([name(title.station.clone())]));
    scene.fitted(face, (LEFT, HEAD - 4.0), Anchor::Start, &words, Style::bold(15.0, DARK), RIGHT - LEFT);
    let mut y = HEAD + 8.0;
    for line in &title.lines {
        for line in face.wrap(&face.say(line), Style::plain(8.0, GREY), RIGHT - LEFT, 3) {
            scene.text(face, (LEFT, y), Anchor::Start, &line, Style::plain(8.0, GREY));
            y += 10.5;
        }
    }
    scene.line(vec![(LEFT, y), (RIGHT, y)], Stroke::solid(DARK, 0.6));
    (scene, y + 12.0)
}

/// The numbers behind the charts: one line a check and measurand.
pub fn bench_csv(charts: &[BenchChart]) -> Vec<u8> {
    let mut lines = vec![
        ["serial", "at", "run_id", "measurand", "value", "unit", "reference", "within", "inside", "sum_up", "sum_down"]
            .map(str::to_owned),
    ];
    for chart in charts {
        for point in &chart.points {
            let sum = |of: fn((f64, f64)) -> f64| point.sums.map_or(String::new(), |sums| format!("{:.4}", of(sums)));
            lines.push([
                neutralise(&chart.serial),
                point.at.to_rfc3339(),
                point.run_id.clone(),
                chart.measurand.en.to_owned(),
                format!("{:.*}", chart.decimals + 2, point.value),
                chart.unit.clone(),
                format!("{:.*}", chart.decimals + 2, chart.value),
                format!("{:.*}", chart.decimals + 2, chart.within),
                if point.inside { "yes" } else { "no" }.to_owned(),
                sum(|sums| sums.0),
                sum(|sums| sums.1),
            ]);
        }
    }
    let cell = |text: &String| match text.contains([',', '"', '\r', '\n']) {
        true => format!("\"{}\"", text.replace('"', "\"\"")),
        false => text.clone(),
    };
    let line = |cells: &[String; 11]| cells.iter().map(cell).collect::<Vec<_>>().join(",") + "\r\n";
    lines.iter().map(line).collect::<String>().into_bytes()
}
