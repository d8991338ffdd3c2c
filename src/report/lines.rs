//! A text with its lines, as people count them.

use std::ops::Range;
use std::sync::Arc;

use crate::text::{Encoding, LineIndex};

/// A text and its lines.
#[derive(Clone, Debug)]
pub struct Lines {
    text: Arc<str>,
    index: LineIndex,
}

impl Lines {
    /// The lines of a text.
    #[must_use]
    pub fn of(text: &Arc<str>) -> Self {
        Self {
            index: LineIndex::new(text),
            text: Arc::clone(text),
        }
    }

    /// The text.
    #[must_use]
    pub fn text(&self) -> &str {
        &self.text
    }

    /// The index of the last line, from 0.
    #[must_use]
    pub fn last(&self) -> u32 {
        self.index.line_count().saturating_sub(1)
    }

    /// The index (from 0) of the line that holds a byte; bytes past the end are in the last.
    #[must_use]
    pub fn line_of(&self, byte: u32) -> u32 {
        self.index.line(byte)
    }

    /// The bytes of a line (from 0), terminator left out; empty past the end.
    #[must_use]
    pub fn range(&self, line: u32) -> Range<usize> {
        let end = self.text.len();
        let span = self.index.line_span(line);
        span.map_or(end..end, |span| span.start as usize..span.end as usize)
    }

    /// Line and column of a byte, both from 1, the column in characters; a byte-order mark is no column.
    #[must_use]
    pub fn line_and_column(&self, byte: u32) -> (usize, usize) {
        let place = self.index.place(byte, Encoding::Utf32);
        let marked = place.line == 0 && self.text.starts_with('\u{feff}');
        let column = place.column.saturating_sub(u32::from(marked));
        (place.line as usize + 1, column as usize + 1)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn lines_end_at_each_of_the_three_terminators() {
        let lines = Lines::of(&Arc::from("a\u{b}\u{85}\u{2028}b\rc\r\nd\ne"));
        assert_eq!(lines.last(), 3);
        assert_eq!(lines.text().get(lines.range(1)), Some("c"));
        assert_eq!(lines.text().get(lines.range(3)), Some("e"));
        assert_eq!(lines.range(9), 15..15);
    }

    #[test]
    fn columns_count_characters() {
        let lines = Lines::of(&Arc::from("\u{feff}let µ = 1\nnext"));
        let equals = lines.text().find('=').map_or(0, |byte| byte as u32);
        assert_eq!(lines.line_and_column(equals), (1, 7));
        assert_eq!(lines.line_and_column(u32::MAX), (2, 5));
    }
}
