//! A display list: lines, areas and text on a page, in points from the top left corner, y downwards.
//! Must not know what it draws, nor PDF or SVG.
//! Main types: [`Scene`], [`Mark`], [`Style`].

use super::typeface::Typeface;

/// Red, green, blue, 0–255.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Ink(pub u8, pub u8, pub u8);

/// Text and verdict lines.
pub const DARK: Ink = Ink(0x1b, 0x24, 0x30);
/// Labels and units; 5.9:1 on white.
pub const GREY: Ink = Ink(0x5b, 0x66, 0x73);
/// Measured traces under a fitted line.
pub const MIST: Ink = Ink(0xa3, 0xad, 0xb8);
/// Axes and rules.
pub const RULE: Ink = Ink(0xc9, 0xd0, 0xd8);
/// Inside the bounds of the least demanding grade.
pub const INSIDE: Ink = Ink(0xe9, 0xef, 0xf5);
/// Inside the bounds of every grade tried.
pub const BEST: Ink = Ink(0xd2, 0xde, 0xea);
/// Fitted and predicted lines.
pub const BLUE: Ink = Ink(0x1f, 0x5f, 0x9e);
/// What must not be overlooked; shape or words always say the same.
pub const RUST: Ink = Ink(0xa3, 0x45, 0x12);
/// Paper.
pub const WHITE: Ink = Ink(0xff, 0xff, 0xff);

/// A point on the page, pt.
pub type Point = (f64, f64);

/// How a line is drawn.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Stroke {
    /// Colour.
    pub ink: Ink,
    /// Width, pt.
    pub width: f64,
    /// Lengths of dash and gap, pt; none for a solid line.
    pub dash: Option<(f64, f64)>,
}

impl Stroke {
    /// A solid line.
    pub const fn solid(ink: Ink, width: f64) -> Self {
        Self { ink, width, dash: None }
    }

    /// A dashed line.
    pub const fn dashed(ink: Ink, width: f64, dash: f64, gap: f64) -> Self {
        Self { ink, width, dash: Some((dash, gap)) }
    }
}

/// How text is set.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Style {
    /// Size, pt.
    pub size: f64,
    /// Bold weight.
    pub bold: bool,
    /// Colour.
    pub ink: Ink,
    /// Extra space after each letter, pt.
    pub spacing: f64,
}

impl Style {
    /// Regular weight.
    pub const fn plain(size: f64, ink: Ink) -> Self {
        Self { size, bold: false, ink, spacing: 0.0 }
    }

    /// Bold weight.
    pub const fn bold(size: f64, ink: Ink) -> Self {
        Self { size, bold: true, ink, spacing: 0.0 }
    }

    /// The same in another size.
    pub const fn sized(mut self, size: f64) -> Self {
        self.size = size;
        self
    }

    /// The same with space between the letters.
    pub const fn spaced(mut self, spacing: f64) -> Self {
        self.spacing = spacing;
        self
    }
}

/// Which point of a text stands at the given place.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Anchor {
    /// Its left end.
    Start,
    /// Its middle.
    Middle,
    /// Its right end.
    End,
}

/// One thing on the page.
#[derive(Debug, Clone, PartialEq)]
pub enum Mark {
    /// An open or closed line.
    Line {
        /// Corners.
        points: Vec<Point>,
        /// Back to the first corner.
        closed: bool,
        /// How.
        stroke: Stroke,
    },
    /// A filled area.
    Area {
        /// Corners.
        points: Vec<Point>,
        /// Colour.
        ink: Ink,
    },
    /// One line of text.
    Text {
        /// Left end of the baseline.
        at: Point,
        /// Its width, pt.
        width: f64,
        /// What it says; every character has a glyph.
        text: String,
        /// How.
        style: Style,
    },
}

/// What stands on a page, or a part of it, in drawing order.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Scene {
    /// In drawing order.
    pub marks: Vec<Mark>,
}

impl Scene {
    /// A line through points; nothing for fewer than two or for points that are not finite.
    pub fn line(&mut self, points: Vec<Point>, stroke: Stroke) {
        if points.len() > 1 && finite(&points) {
            self.marks.push(Mark::Line { points, closed: false, stroke });
        }
    }

    /// A closed outline.
    pub fn outline(&mut self, points: Vec<Point>, stroke: Stroke) {
        if points.len() > 2 && finite(&points) {
            self.marks.push(Mark::Line { points, closed: true, stroke });
        }
    }

    /// A filled area.
    pub fn area(&mut self, points: Vec<Point>, ink: Ink) {
        if points.len() > 2 && finite(&points) {
            self.marks.push(Mark::Area { points, ink });
        }
    }

    /// A filled upright rectangle.
    pub fn block(&mut self, (left, top): Point, (width, height): Point, ink: Ink) {
        self.area(corners((left, top), (width, height)), ink);
    }

    /// A filled disc, drawn as a polygon fine enough for print at these sizes.
    pub fn disc(&mut self, center: Point, radius: f64, ink: Ink) {
        self.area(circle(center, radius), ink);
    }

    /// A ring.
    pub fn ring(&mut self, center: Point, radius: f64, stroke: Stroke) {
        self.outline(circle(center, radius), stroke);
    }

    /// A cross of two lines.
    pub fn cross(&mut self, (x, y): Point, arm: f64, stroke: Stroke) {
        self.line(vec![(x - arm, y - arm), (x + arm, y + arm)], stroke);
        self.line(vec![(x - arm, y + arm), (x + arm, y - arm)], stroke);
    }

    /// A line of text; characters without a glyph become `□`. Returns its width.
    pub fn text(&mut self, face: &Typeface, at: Point, anchor: Anchor, text: &str, style: Style) -> f64 {
        let text = face.printable(text);
        let width = face.width(&text, style);
        let left = match anchor {
            Anchor::Start => at.0,
            Anchor::Middle => at.0 - width / 2.0,
            Anchor::End => at.0 - width,
        };
        if !text.trim().is_empty() {
            self.marks.push(Mark::Text { at: (left, at.1), width, text, style });
        }
        width
    }

    /// A line of text that is made smaller, then shortened, until it fits into a width.
    pub fn fitted(&mut self, face: &Typeface, at: Point, anchor: Anchor, text: &str, style: Style, most: f64) -> f64 {
        let (text, style) = face.fit(text, style, most);
        self.text(face, at, anchor, &text, style)
    }

    /// Adds the marks of another scene.
    pub fn append(&mut self, other: Self) {
        self.marks.extend(other.marks);
    }

    /// The same further down the page.
    pub fn lowered(mut self, by: f64) -> Self {
        let lower = |point: &mut Point| point.1 += by;
        for mark in &mut self.marks {
            match mark {
                Mark::Line { points, .. } | Mark::Area { points, .. } => points.iter_mut().for_each(lower),
                Mark::Text { at, .. } => lower(at),
            }
        }
        self
    }

    /// Every text, in drawing order.
    pub fn texts(&self) -> impl Iterator<Item = &str> {
        self.marks.iter().filter_map(|mark| match mark {
            Mark::Text { text, .. } => Some(text.as_str()),
            _ => None,
        })
    }
}

/// Corners of an upright rectangle.
pub fn corners((left, top): Point, (width, height): Point) -> Vec<Point> {
    vec![(left, top), (left + width, top), (left + width, top + height), (left, top + height)]
}

fn circle((x, y): Point, radius: f64) -> Vec<Point> {
    let corner = |i: usize| std::f64::consts::TAU * i as f64 / 20.0;
    (0..20).map(|i| (x + radius * corner(i).cos(), y + radius * corner(i).sin())).collect()
}

fn finite(points: &[Point]) -> bool {
    points.iter().all(|(x, y)| x.is_finite() && y.is_finite())
}
