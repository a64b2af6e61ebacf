//! Lays a sheet out on A4: head, rows, charts, foot; one page, more only when even the closest spacing cannot hold the rows.
//! Must not drop a row, nor measure or judge anything.
//! Main types: [`Page`], [`Part`]; main function: [`pages`].

mod also;
mod counts;
mod foot;
mod head;
mod rows;
mod scale;

pub use self::{
    counts::{CountBox, InBox, boxes},
    rows::telling,
    scale::RowScale,
};

use super::{
    charts::{self, Frame},
    scene::Scene,
    typeface::Typeface,
};
use crate::record::sheet::Sheet;

/// Width of A4, pt.
pub const WIDTH: f64 = 595.28;
/// Height of A4, pt.
pub const HEIGHT: f64 = 841.89;
/// Left edge of everything but the mark of the deciding row.
pub const LEFT: f64 = 40.0;
/// Right edge.
pub const RIGHT: f64 = 555.0;

/// What a part of a page shows.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Part {
    /// Serial, verdict, tube, bench, run.
    Head,
    /// Measured rows.
    Rows,
    /// Chart of one sweep.
    Sweep,
    /// Chart of peak heights.
    Gain,
    /// Chart of the walk.
    Walk,
    /// Remarks, signature, hashes.
    Foot,
}

/// One page, part by part.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Page {
    /// In drawing order.
    pub parts: Vec<(Part, Scene)>,
}

impl Page {
    /// The whole page.
    pub fn scene(&self) -> Scene {
        let mut scene = Scene::default();
        self.parts.iter().for_each(|(_, part)| scene.append(part.clone()));
        scene
    }
}

/// How close things stand, pt.
#[derive(Debug, Clone, Copy)]
struct Density {
    /// From row to row.
    pitch: f64,
    /// Height of a heading.
    heading: f64,
    /// Size of a row's text.
    size: f64,
    /// Height of a chart's plot.
    plot: f64,
}

/// Tried in this order; closer than the last would be hard to read.
const DENSITIES: [Density; 5] = [
    Density { pitch: 14.4, heading: 19.0, size: 8.6, plot: 130.0 },
    Density { pitch: 13.6, heading: 17.5, size: 8.5, plot: 125.0 },
    Density { pitch: 12.8, heading: 16.0, size: 8.3, plot: 120.0 },
    Density { pitch: 12.0, heading: 15.0, size: 8.1, plot: 113.0 },
    Density { pitch: 11.5, heading: 14.0, size: 7.9, plot: 106.0 },
];
/// Tallest plot where there is room to spare.
const TALLEST_PLOT: f64 = 150.0;
/// Above the rows: their heading.
const TABLE_HEAD: f64 = 18.0;
/// Space between rows and charts.
const GAP: f64 = 16.0;

/// The pages of a sheet.
///
/// * `record_sha256`: hash of record.csv, hexadecimal; shown at the foot.
pub fn pages(sheet: &Sheet, face: &Typeface, record_sha256: &str) -> Vec<Page> {
    let layout = |density: &Density, notes: bool| laid_out(sheet, face, record_sha256, density, notes);
    // The first of the fewest pages is the widest spacing that does; `min_by_key` keeps the first.
    let best = DENSITIES.iter().map(|density| (density, layout(density, false))).min_by_key(|(_, pages)| pages.len());
    let Some((density, plain)) = best else { return vec![] };
    let with_notes = layout(density, true);
    if with_notes.len() == plain.len() { with_notes } else { plain }
}

/// The pages with one spacing.
///
/// * `notes`: the notes of rows that do not decide may take lines of their own.
fn laid_out(sheet: &Sheet, face: &Typeface, record_sha256: &str, density: &Density, notes: bool) -> Vec<Page> {
    let (head, head_end) = head::head(sheet, face);
    let (_, foot_top) = foot::foot(sheet, face, record_sha256, (1, 1));
    let mut flow = Flow { pages: vec![], page: Page::default(), y: head_end };
    flow.page.parts.push((Part::Head, head));
    flow.rows(rows::blocks(sheet, face, density, notes), sheet, face);
    if flow.charts_end(density) > foot_top {
        flow.turn(sheet, face);
    }
    let spare = (foot_top - flow.charts_end(density)).max(0.0);
    flow.charts(sheet, face, (density.plot + spare).min(density.plot.max(TALLEST_PLOT)));
    flow.pages.push(flow.page);
    let total = flow.pages.len();
    for (i, page) in flow.pages.iter_mut().enumerate() {
        let foot = if i + 1 == total {
            foot::foot(sheet, face, record_sha256, (total, total)).0
        } else {
            foot::last_lines(sheet, face, record_sha256, (i + 1, total))
        };
        page.parts.push((Part::Foot, foot));
    }
    flow.pages
}

/// Pages as they fill.
struct Flow {
    pages: Vec<Page>,
    page: Page,
    y: f64,
}

impl Flow {
    /// Turns over: a short head with the serial on the next page.
    fn turn(&mut self, sheet: &Sheet, face: &Typeface) {
        self.pages.push(std::mem::take(&mut self.page));
        let (head, end) = head::continued(sheet, face);
        self.page.parts.push((Part::Head, head));
        self.y = end;
    }

    /// Where the charts would end, drawn here.
    fn charts_end(&self, density: &Density) -> f64 {
        self.y + GAP + charts::OVERHEAD + density.plot + 8.0
    }

    /// The rows; on a page that is not the last they may go down to the last line.
    fn rows(&mut self, blocks: Vec<rows::Block>, sheet: &Sheet, face: &Typeface) {
        let mut blocks = blocks.into_iter().peekable();
        let bottom = foot::BOTTOM;
        let mut scene = self.table_head(face);
        while let Some(block) = blocks.next() {
            // A heading stays with its first row.
            let with_next = if block.is_heading { blocks.peek().map_or(0.0, |next| next.height) } else { 0.0 };
            if self.y + block.height + with_next > bottom {
                self.page.parts.push((Part::Rows, std::mem::take(&mut scene)));
                self.turn(sheet, face);
                scene = self.table_head(face);
            }
            scene.append(block.scene.lowered(self.y));
            self.y += block.height;
        }
        self.page.parts.push((Part::Rows, scene));
    }

    fn table_head(&mut self, face: &Typeface) -> Scene {
        let scene = rows::table_head(face).lowered(self.y);
        self.y += TABLE_HEAD;
        scene
    }

    fn charts(&mut self, sheet: &Sheet, face: &Typeface, plot: f64) {
        let gap = 14.0;
        let width = (RIGHT - LEFT - 2.0 * gap) / 3.0;
        let frame = |i: f64| Frame { left: LEFT + i * (width + gap), top: self.y + GAP, width, plot };
        let charts = [
            (Part::Sweep, charts::sweep(sheet.sweep_chart.as_ref(), face, frame(0.0))),
            (Part::Gain, charts::gain(sheet.gain_chart.as_ref(), face, frame(1.0))),
            (Part::Walk, charts::walk(sheet.walk_chart.as_ref(), &sheet.rows, face, frame(2.0))),
        ];
        self.page.parts.extend(charts);
    }
}
