//! The lines of a text and the characters in them.

use std::ops::Range;
use std::sync::Arc;

/// A text cut into lines at LF, CRLF and CR.
#[derive(Clone, Debug)]
pub struct Lines {
    text: Arc<str>,
    starts: Vec<u32>,
}

impl Lines {
    /// The lines of a text.
    #[must_use]
    pub fn of(text: &Arc<str>) -> Self {
        let mut starts = vec![0];
        let bytes = text.as_bytes();
        for (index, byte) in bytes.iter().enumerate() {
            let ends = match byte {
                b'\n' => true,
                b'\r' => bytes.get(index + 1) != Some(&b'\n'),
                _ => false,
            };
            if ends {
                starts.push(u32::try_from(index + 1).unwrap_or(u32::MAX));
            }
        }
        Self {
            text: Arc::clone(text),
            starts,
        }
    }

    /// The text.
    #[must_use]
    pub fn text(&self) -> &str {
        &self.text
    }

    /// How many lines there are; one more than there are terminators.
    #[must_use]
    pub fn count(&self) -> usize {
        self.starts.len()
    }

    /// The index (from 0) of the line that holds a byte; bytes past the end are in the last.
    #[must_use]
    pub fn line_of(&self, byte: u32) -> usize {
        self.starts.partition_point(|start| *start <= byte).max(1) - 1
    }

    /// The bytes of a line (from 0), terminator included; empty past the end.
    #[must_use]
    pub fn range(&self, line: usize) -> Range<usize> {
        let end = self.text.len();
        let start = self.starts.get(line).map_or(end, |start| *start as usize);
        let stop = self.starts.get(line + 1).map_or(end, |start| *start as usize);
        start..stop
    }

    /// Line and column of a byte, both from 1, the column in characters.
    #[must_use]
    pub fn line_and_column(&self, byte: u32) -> (usize, usize) {
        let line = self.line_of(byte);
        let start = self.range(line).start;
        let mut end = (byte as usize).clamp(start, self.text.len());
        while !self.text.is_char_boundary(end) {
            end -= 1;
        }
        let before = self.text.get(start..end).unwrap_or("");
        // A byte-order mark is no column.
        let characters = before.chars().filter(|character| *character != '\u{feff}');
        (line + 1, characters.count() + 1)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn lines_end_at_each_of_the_three_terminators() {
        let lines = Lines::of(&Arc::from("a\u{b}\u{85}\u{2028}b\rc\r\nd\ne"));
        assert_eq!(lines.count(), 4);
        assert_eq!(lines.text().get(lines.range(1)), Some("c\r\n"));
        assert_eq!(lines.text().get(lines.range(3)), Some("e"));
        assert_eq!(lines.range(9), 14..14);
    }

    #[test]
    fn columns_count_characters() {
        let lines = Lines::of(&Arc::from("\u{feff}let µ = 1\nnext"));
        let equals = lines.text().find('=').map(|byte| u32::try_from(byte).unwrap_or(0));
        assert_eq!(lines.line_and_column(equals.unwrap_or(0)), (1, 7));
        assert_eq!(lines.line_and_column(u32::MAX), (2, 5));
    }
}
