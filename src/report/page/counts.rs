//! Boxes for a counted row: one a whole number, solid where allowed, dashed where not, the count marked in its box.
//! Must not let meaning rest on colour.
//! Main items: [`draw`], [`boxes`].

use super::{
    super::{
        scene::{Anchor, BEST, DARK, GREY, MIST, Point, Scene, Stroke, Style, corners},
        typeface::{SMALLEST, Typeface},
    },
    scale::{CROSS, LEFT_END},
};
use crate::record::sheet::{Row, RowVerdict, Value};

/// Most boxes of a row.
const MOST: usize = 5;
/// From box to box, pt.
const STEP: f64 = 38.0;

/// What stands in a box.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum InBox {
    /// Nothing.
    Nothing,
    /// The count, which is allowed.
    Count,
    /// The count, which is not.
    Outside,
    /// The count may be this as well.
    Possible,
}

/// One box of a counted row, before it is drawn, on paper or on a terminal.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct CountBox {
    /// Its number.
    pub n: u64,
    /// The limit allows it.
    pub allowed: bool,
    /// What stands in it.
    pub mark: InBox,
    /// The next box is further than one.
    pub gap: bool,
}

/// The boxes of a counted row, ascending; none where nothing is limited.
pub fn boxes(row: &Row) -> Option<Vec<CountBox>> {
    let Value::Count { value, low, high } = row.value else { return None };
    let judged = row.judged.last()?;
    let allowed = |n: u64| {
        let n = n as f64;
        judged.lower.is_none_or(|lower| n >= lower) && judged.upper.is_none_or(|upper| n <= upper)
    };
    let numbers = shown(value, judged.lower, judged.upper);
    let boxed = |(i, &n): (usize, &u64)| {
        let mark = match n {
            n if n == value && (judged.verdict == RowVerdict::Fail || !allowed(n)) => InBox::Outside,
            n if n == value => InBox::Count,
            n if (low..=high).contains(&n) => InBox::Possible,
            _ => InBox::Nothing,
        };
        let gap = numbers.get(i + 1).is_some_and(|&next| next > n + 1);
        CountBox { n, allowed: allowed(n), mark, gap }
    };
    Some(numbers.iter().enumerate().map(boxed).collect())
}

/// The boxes, their middle at `y`. Returns where they end; nothing is drawn where nothing is limited.
pub fn draw(scene: &mut Scene, face: &Typeface, row: &Row, y: f64, pitch: f64) -> Option<f64> {
    let boxes = boxes(row)?;
    let height = (pitch * 0.47).min(6.4);
    for (i, boxed) in boxes.iter().enumerate() {
        let left = LEFT_END + 4.0 + STEP * i as f64;
        let frame: (Point, Point) = ((left, y - height / 2.0), (15.0, height));
        if boxed.allowed {
            scene.block(frame.0, frame.1, BEST);
            scene.outline(corners(frame.0, frame.1), Stroke::solid(GREY, 0.5));
        } else {
            scene.outline(corners(frame.0, frame.1), Stroke::dashed(MIST, 0.5, 1.5, 1.5));
        }
        let middle = (left + 7.5, y);
        match boxed.mark {
            InBox::Outside => scene.cross(middle, 2.8, CROSS),
            InBox::Count => scene.disc(middle, 2.2, DARK),
            InBox::Possible => scene.ring(middle, 1.9, Stroke::solid(DARK, 0.7)),
            InBox::Nothing => {}
        }
        let style = Style::plain(SMALLEST, GREY);
        // What follows in the row is further than one: said by an ellipsis.
        let text = if boxed.gap { format!("{} …", boxed.n) } else { boxed.n.to_string() };
        scene.fitted(face, (left + 18.0, y + style.size * 0.35), Anchor::Start, &text, style, STEP - 21.0);
    }
    Some(LEFT_END + 4.0 + STEP * boxes.len() as f64 - 15.0)
}

/// The numbers that get a box: the count, the bounds, and their neighbours; ascending.
fn shown(value: u64, lower: Option<f64>, upper: Option<f64>) -> Vec<u64> {
    let whole = |bound: Option<f64>| bound.filter(|b| b.is_finite() && *b >= 0.0).map(|b| b as u64);
    let mut wanted = vec![value];
    for bound in [whole(upper), whole(lower)].into_iter().flatten() {
        wanted.extend([bound, bound.saturating_add(1), bound.saturating_sub(1)]);
    }
    wanted.extend([value.saturating_sub(1), value.saturating_add(1), 0]);
    let mut kept: Vec<u64> = Vec::new();
    for n in wanted {
        if kept.len() < MOST && !kept.contains(&n) {
            kept.push(n);
        }
    }
    kept.sort_unstable();
    kept
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn boxes_hold_the_count_and_the_bounds() {
        assert_eq!(shown(0, None, Some(0.0)), [0, 1]);
        assert_eq!(shown(2, Some(1.0), Some(2.0)), [0, 1, 2, 3]);
        assert_eq!(shown(37, None, Some(2.0)), [1, 2, 3, 36, 37]);
        assert_eq!(shown(u64::MAX, None, None), [0, u64::MAX - 1, u64::MAX]);
    }
}
