//! Signs that make a picture: bars in eighths of a character, and a field of dots, four to a character.
//! Must not know what they mean. Block elements are in nearly every terminal's typeface; finer dots are not.
//! Main items: [`Canvas`], [`bars`].

/// Dots, two to a character across and two down, `(0, 0)` at the bottom left.
pub(super) struct Canvas {
    columns: usize,
    rows: usize,
    /// Four bits a character: upper left, upper right, lower left, lower right.
    cells: Vec<u8>,
}

impl Canvas {
    /// Empty, of that many characters.
    pub fn new(columns: usize, rows: usize) -> Self {
        Self { columns, rows, cells: vec![0; columns * rows] }
    }

    /// Dots across.
    pub fn width(&self) -> usize {
        2 * self.columns
    }

    /// Dots up.
    pub fn height(&self) -> usize {
        2 * self.rows
    }

    /// Sets a dot; outside nothing happens.
    pub fn set(&mut self, x: usize, y: usize) {
        if x < self.width() && y < self.height() {
            let from_top = self.height() - 1 - y;
            self.cells[from_top / 2 * self.columns + x / 2] |= 1 << (2 * (from_top % 2) + x % 2);
        }
    }

    /// The rows of characters, top first.
    pub fn lines(&self, unicode: bool) -> Vec<String> {
        const QUARTERS: [char; 16] = [' ', '▘', '▝', '▀', '▖', '▌', '▞', '▛', '▗', '▚', '▐', '▜', '▄', '▙', '▟', '█'];
        const ASCII: [char; 16] = [' ', '\'', '\'', '\'', '.', ':', ':', ':', '.', ':', ':', ':', '.', ':', ':', ':'];
        let signs = if unicode { QUARTERS } else { ASCII };
        let sign = |cell: &u8| signs[usize::from(*cell & 15)];
        self.cells.chunks(self.columns.max(1)).map(|row| row.iter().map(sign).collect()).collect()
    }
}

/// Bars from the bottom up, one a column: rows of characters, top first.
///
/// * `heights`: 0 for none to 1 for the whole height.
pub(super) fn bars(heights: &[f64], rows: usize, unicode: bool) -> Vec<String> {
    const EIGHTHS: [char; 9] = [' ', '▁', '▂', '▃', '▄', '▅', '▆', '▇', '█'];
    const ASCII: [char; 9] = [' ', '.', '.', '.', ':', ':', ':', '|', '|'];
    let signs = if unicode { EIGHTHS } else { ASCII };
    let eighths = |height: &f64| (height.clamp(0.0, 1.0) * 8.0 * rows as f64).round() as usize;
    let row =
        |above: usize| heights.iter().map(|height| signs[eighths(height).saturating_sub(8 * above).min(8)]).collect();
    (0..rows).rev().map(row).collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn dots_stand_where_they_are_set() {
        let mut canvas = Canvas::new(2, 1);
        canvas.set(0, 0);
        canvas.set(1, 1);
        canvas.set(2, 0);
        canvas.set(4, 0);
        assert_eq!(canvas.lines(true), ["▞▖"]);
        assert_eq!(canvas.lines(false), [":."]);
        let mut low = Canvas::new(1, 2);
        low.set(1, 1);
        assert_eq!(low.lines(true), [" ", "▝"]);
        assert_eq!(Canvas::new(0, 0).lines(true), [""; 0]);
    }

    #[test]
    fn bars_grow_from_the_bottom() {
        assert_eq!(bars(&[0.0, 0.1, 0.5, 0.75, 1.0, 2.0, f64::NAN], 2, true), ["   ▄██ ", " ▂████ "]);
        assert_eq!(bars(&[0.0, 0.1, 0.5, 0.75, 1.0], 2, false), ["   :|", " .|||"]);
    }
}
