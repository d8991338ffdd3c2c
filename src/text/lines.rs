//! Byte offsets ↔ lines and columns of a text that no longer changes.

use super::{Encoding, Place, Span};

/// The lines of a text, broken at LF, CRLF and CR alone, and its characters of more than one byte.
///
/// Every question is answered in O(log n), without the text.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct LineIndex {
    /// Each line without its terminator.
    lines: Vec<Span>,
    /// The characters of more than one byte, in order.
    wide: Vec<Wide>,
    /// The text's length in bytes.
    length: u32,
}

/// A character of more than one byte.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
struct Wide {
    span: Span,
    /// How many UTF-16 code units fewer than bytes the text has up to the character's end.
    saved_utf16: u32,
    /// How many characters fewer than bytes the text has up to the character's end.
    saved_utf32: u32,
}

impl Wide {
    fn saved(&self, encoding: Encoding) -> u32 {
        match encoding {
            Encoding::Utf8 => 0,
            Encoding::Utf16 => self.saved_utf16,
            Encoding::Utf32 => self.saved_utf32,
        }
    }
}

impl LineIndex {
    /// Indexes `text`, in O(n). A text past 4 GiB is indexed up to there.
    #[must_use]
    pub fn new(text: &str) -> Self {
        let length = u32::try_from(text.len()).unwrap_or(u32::MAX);
        Self {
            lines: line_spans(text.as_bytes(), length),
            wide: wide_characters(text),
            length,
        }
    }

    /// How many lines there are: one more than terminators.
    #[must_use]
    pub fn line_count(&self) -> u32 {
        u32::try_from(self.lines.len()).unwrap_or(u32::MAX)
    }

    /// The bytes of a line without its terminator.
    #[must_use]
    pub fn line_span(&self, line: u32) -> Option<Span> {
        self.lines.get(line as usize).copied()
    }

    /// The line of a byte offset; one past the end is on the last line.
    #[must_use]
    pub fn line(&self, offset: u32) -> u32 {
        let after = self.lines.partition_point(|line| line.start <= offset);
        u32::try_from(after.saturating_sub(1)).unwrap_or(u32::MAX)
    }

    /// The place of a byte offset. An offset inside a character counts as its start, one inside a
    /// terminator as before it, one past the end as the end.
    #[must_use]
    pub fn place(&self, offset: u32, encoding: Encoding) -> Place {
        let line = self.line(offset);
        let span = self.line_span(line).unwrap_or_default();
        let offset = offset.min(span.end);
        let column = self.units_before(offset, encoding) - self.units_before(span.start, encoding);
        Place { line, column }
    }

    /// The byte offset of a place. A column past the line's end is before its terminator, one inside a
    /// character at its start; a line past the last is the end of the text.
    #[must_use]
    pub fn offset(&self, place: Place, encoding: Encoding) -> u32 {
        let Some(line) = self.line_span(place.line) else {
            return self.length;
        };
        let start = self.units_before(line.start, encoding);
        let target = start.saturating_add(place.column);
        self.byte_at(target, encoding).min(line.end)
    }

    /// The bytes between two places.
    #[must_use]
    pub fn span(&self, from: Place, to: Place, encoding: Encoding) -> Span {
        let (from, to) = (self.offset(from, encoding), self.offset(to, encoding));
        Span::new(from.min(to), from.max(to))
    }

    /// How many units stand before a byte offset, the start of the character it falls into.
    fn units_before(&self, offset: u32, encoding: Encoding) -> u32 {
        let whole = self.wide.partition_point(|wide| wide.span.end <= offset);
        let offset = match self.wide.get(whole) {
            Some(wide) if wide.span.start < offset => wide.span.start,
            _ => offset,
        };
        offset.min(self.length) - self.saved_by(whole, encoding)
    }

    /// The byte offset at which `target` units stand before, snapped to the start of a character.
    fn byte_at(&self, target: u32, encoding: Encoding) -> u32 {
        let whole = self
            .wide
            .partition_point(|wide| wide.span.end - wide.saved(encoding) <= target);
        let offset = target.saturating_add(self.saved_by(whole, encoding));
        match self.wide.get(whole) {
            Some(wide) => offset.min(wide.span.start),
            None => offset.min(self.length),
        }
    }

    /// What the first `count` wide characters save.
    fn saved_by(&self, count: usize, encoding: Encoding) -> u32 {
        let last = count.checked_sub(1).and_then(|last| self.wide.get(last));
        last.map_or(0, |wide| wide.saved(encoding))
    }
}

fn line_spans(bytes: &[u8], length: u32) -> Vec<Span> {
    let mut lines = Vec::new();
    let mut start = 0;
    for offset in memchr::memchr2_iter(b'\n', b'\r', bytes) {
        let Some(offset) = u32::try_from(offset).ok().filter(|&at| at < length) else {
            break;
        };
        let ends_pair = offset > 0
            && offset == start
            && bytes.get(offset as usize) == Some(&b'\n')
            && bytes.get(offset as usize - 1) == Some(&b'\r');
        if !ends_pair {
            lines.push(Span::new(start, offset));
        }
        start = offset + 1;
    }
    lines.push(Span::new(start, length));
    lines
}

fn wide_characters(text: &str) -> Vec<Wide> {
    if text.is_ascii() {
        return Vec::new();
    }
    let mut saved = (0, 0);
    text.char_indices()
        .filter(|(_, character)| !character.is_ascii())
        .filter_map(|(start, character)| {
            let bytes = u32::try_from(character.len_utf8()).ok()?;
            saved.0 += bytes - u32::try_from(character.len_utf16()).ok()?;
            saved.1 += bytes - 1;
            let start = u32::try_from(start).ok()?;
            Some(Wide {
                span: Span::new(start, start.saturating_add(bytes)),
                saved_utf16: saved.0,
                saved_utf32: saved.1,
            })
        })
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn lines_break_at_lf_crlf_and_cr_alone() {
        assert_eq!(
            LineIndex::new("a\u{b}\u{c}\u{85}\u{2028}b\rc").line_count(),
            2
        );
        assert_eq!(LineIndex::new("a\r\nb\n\rc\n").line_count(), 5);
        assert_eq!(LineIndex::new("").line_count(), 1);
    }

    #[test]
    fn columns_count_as_asked() {
        let index = LineIndex::new("é🙂x\ny");
        let column = |encoding| index.place(6, encoding).column;
        assert_eq!(column(Encoding::Utf8), 6);
        assert_eq!(column(Encoding::Utf16), 3);
        assert_eq!(column(Encoding::Utf32), 2);
    }

    #[test]
    fn places_snap_and_clamp() {
        let index = LineIndex::new("é🙂\r\nz");
        assert_eq!(index.place(4, Encoding::Utf16), Place::new(0, 1));
        assert_eq!(index.place(7, Encoding::Utf16), Place::new(0, 3));
        assert_eq!(index.place(99, Encoding::Utf8), Place::new(1, 1));
        assert_eq!(index.offset(Place::new(0, 2), Encoding::Utf16), 2);
        assert_eq!(index.offset(Place::new(0, 99), Encoding::Utf16), 6);
        assert_eq!(index.offset(Place::new(7, 0), Encoding::Utf16), 9);
    }
}
