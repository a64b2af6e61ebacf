//! Scenes to a PDF file: the same scenes give the same bytes.
//! Must not lay anything out, nor know what a page says.
//! Main function: [`write`].

use chrono::{DateTime, FixedOffset};
use lopdf::{Dictionary, Object, Stream, StringFormat, dictionary};
use printpdf::{
    Color, FontId, Line, LineCapStyle, LineDashPattern, LineJoinStyle, LinePoint, Op, PaintMode, PdfDocument, PdfFont,
    PdfFontHandle, PdfPage, PdfSaveOptions, Polygon, PolygonRing, Pt, Rgb, TextItem, TextMatrix, WindingOrder,
};

use super::{
    page::{HEIGHT, WIDTH},
    scene::{Ink, Mark, Point, Scene, Stroke, Style},
    typeface::Typeface,
};

/// Why no PDF could be made.
#[derive(Debug, thiserror::Error)]
pub enum PdfError {
    /// The embedded typeface cannot be read.
    #[error("the typeface built into the program cannot be read; build it again from a clean copy of its source")]
    Typeface,
    /// The writer refused.
    #[error("the PDF could not be put together: {0}")]
    Write(String),
}

/// What a PDF says of itself.
pub struct About<'a> {
    /// Its language: a code of ISO 639-1.
    pub language: &'static str,
    /// Title.
    pub title: String,
    /// Program and version.
    pub program: String,
    /// Date of the document.
    pub date: Option<DateTime<FixedOffset>>,
    /// Sixteen bytes or more that tell the document from every other.
    pub id: Vec<u8>,
    /// A file carried inside: name, MIME type, bytes.
    pub attached: (&'a str, &'a str, Vec<u8>),
}

/// Pages to bytes.
pub fn write(pages: &[Scene], face: &Typeface, about: About<'_>) -> Result<Vec<u8>, PdfError> {
    let mut document = PdfDocument::new(&about.title);
    document.metadata.info.creator = about.program.clone();
    document.metadata.info.producer = about.program.clone();
    for (name, font) in [("Regular", face.regular), ("Bold", face.bold)] {
        document.resources.fonts.map.insert(FontId(name.to_owned()), PdfFont::new((*font).clone()));
    }
    let (width, height) = (Pt(WIDTH as f32).into(), Pt(HEIGHT as f32).into());
    document.with_pages(pages.iter().map(|page| PdfPage::new(width, height, operations(page))).collect());
    let mut file = document.to_lopdf_document(&PdfSaveOptions::default(), &mut Vec::new());
    finish(&mut file, about).map_err(|error| PdfError::Write(error.to_string()))?;
    file.compress();
    let mut bytes = Vec::new();
    file.save_to(&mut bytes).map_err(|error| PdfError::Write(error.to_string()))?;
    Ok(bytes)
}

/// Everything that would differ from run to run is fixed, and the attachment is added.
fn finish(file: &mut lopdf::Document, about: About<'_>) -> Result<(), lopdf::Error> {
    file.version = "1.7".to_owned();
    let id = Object::String(about.id, StringFormat::Hexadecimal);
    file.trailer.set("ID", Object::Array(vec![id.clone(), id]));
    let (name, mime, bytes) = about.attached;
    let sizes = dictionary! { "Size" => bytes.len() as i64 };
    let kind = dictionary! { "Type" => "EmbeddedFile", "Subtype" => mime, "Params" => sizes };
    let stream = file.add_object(Stream::new(kind, bytes));
    let attachment = file.add_object(dictionary! {
        "Type" => "Filespec",
        "F" => Object::string_literal(name),
        "UF" => Object::string_literal(name),
        "AFRelationship" => "Data",
        "EF" => dictionary! { "F" => Object::Reference(stream) },
    });
    let names = vec![Object::string_literal(name), Object::Reference(attachment)];
    let catalog = file.catalog_mut()?;
    catalog.set("Lang", Object::string_literal(about.language));
    catalog.set("ViewerPreferences", dictionary! { "DisplayDocTitle" => true });
    catalog.set("AF", vec![Object::Reference(attachment)]);
    catalog.set("Names", dictionary! { "EmbeddedFiles" => dictionary! { "Names" => names } });
    let info = file.trailer.get(b"Info").and_then(Object::as_reference)?;
    date_info(file.get_object_mut(info).and_then(Object::as_dict_mut)?, about.date);
    Ok(())
}

fn date_info(info: &mut Dictionary, date: Option<DateTime<FixedOffset>>) {
    for key in ["GTS_PDFXVersion", "Identifier", "Author", "Subject", "Keywords", "Trapped", "CreationDate", "ModDate"]
    {
        info.remove(key.as_bytes());
    }
    if let Some(date) = date {
        // ISO 32000-1, 7.9.4: an apostrophe parts the hours of the offset from its minutes.
        let text = date.format("D:%Y%m%d%H%M%S%:z").to_string().replacen(':', "\0", 1).replace(':', "'");
        let text = Object::string_literal(text.replace('\0', ":"));
        info.set("CreationDate", text.clone());
        info.set("ModDate", text);
    }
}

fn operations(page: &Scene) -> Vec<Op> {
    let mut ops =
        vec![Op::SetLineJoinStyle { join: LineJoinStyle::Round }, Op::SetLineCapStyle { cap: LineCapStyle::Butt }];
    let mut last_stroke = None;
    for mark in &page.marks {
        match mark {
            Mark::Line { points, closed, stroke } => {
                if last_stroke != Some(*stroke) {
                    ops.extend(stroke_operations(*stroke));
                    last_stroke = Some(*stroke);
                }
                let line = Line { points: points.iter().map(line_point).collect(), is_closed: *closed };
                ops.push(Op::DrawLine { line });
            }
            Mark::Area { points, ink } => {
                ops.push(Op::SetFillColor { col: color(*ink) });
                let polygon = Polygon {
                    rings: vec![PolygonRing { points: points.iter().map(line_point).collect() }],
                    mode: PaintMode::Fill,
                    winding_order: WindingOrder::NonZero,
                };
                ops.push(Op::DrawPolygon { polygon });
            }
            Mark::Text { at, text, style, .. } => ops.extend(text_operations(*at, text, *style)),
        }
    }
    ops
}

fn stroke_operations(stroke: Stroke) -> [Op; 3] {
    let dash = match stroke.dash {
        Some((dash, gap)) => LineDashPattern::new(0.0, &[hundredths(dash), hundredths(gap)]),
        None => LineDashPattern::solid(),
    };
    [
        Op::SetOutlineColor { col: color(stroke.ink) },
        Op::SetOutlineThickness { pt: Pt(hundredths(stroke.width)) },
        Op::SetLineDashPattern { dash },
    ]
}

fn text_operations((x, y): Point, text: &str, style: Style) -> Vec<Op> {
    let font = PdfFontHandle::External(FontId(if style.bold { "Bold" } else { "Regular" }.to_owned()));
    vec![
        Op::StartTextSection,
        Op::SetFont { font, size: Pt(hundredths(style.size)) },
        Op::SetCharacterSpacing { multiplier: hundredths(style.spacing) },
        Op::SetFillColor { col: color(style.ink) },
        Op::SetTextMatrix { matrix: TextMatrix::Translate(Pt(hundredths(x)), Pt(hundredths(HEIGHT - y))) },
        Op::ShowText { items: vec![TextItem::Text(text.to_owned())] },
        Op::EndTextSection,
    ]
}

fn line_point(&(x, y): &Point) -> LinePoint {
    let p = printpdf::Point { x: Pt(hundredths(x)), y: Pt(hundredths(HEIGHT - y)) };
    LinePoint { p, bezier: false }
}

fn color(Ink(r, g, b): Ink) -> Color {
    let part = |value: u8| (f32::from(value) / 255.0 * 1000.0).round() / 1000.0;
    Color::Rgb(Rgb { r: part(r), g: part(g), b: part(b), icc_profile: None })
}

/// A hundredth of a point is finer than print; rounding keeps the bytes apart from a platform's last bits.
fn hundredths(value: f64) -> f32 {
    ((value * 100.0).round() / 100.0) as f32
}
