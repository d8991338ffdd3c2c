//! An open document: a text that an editor changes piece by piece.

use std::sync::{Arc, OnceLock};

use ropey::{Rope, RopeSlice};

use super::{Encoding, Place};

/// A change to a document.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Edit {
    /// What is replaced; `None` is everything.
    pub range: Option<(Place, Place)>,
    /// What stands there then.
    pub text: String,
}

/// A text under edit. Edits apply one after another, each to the result of the last.
///
/// Lines break at LF, CRLF and CR alone, as editors count them.
#[derive(Clone, Debug, Default)]
pub struct Document {
    rope: Rope,
    text: OnceLock<Arc<str>>,
}

impl Document {
    /// A document with this text.
    #[must_use]
    pub fn new(text: &str) -> Self {
        Self {
            rope: Rope::from_str(text),
            text: OnceLock::from(Arc::from(text)),
        }
    }

    /// Its whole text; made once for each state and then shared.
    #[must_use]
    pub fn text(&self) -> Arc<str> {
        let text = self.text.get_or_init(|| {
            let mut text = String::with_capacity(self.rope.len_bytes());
            text.extend(self.rope.chunks());
            Arc::from(text)
        });
        Arc::clone(text)
    }

    /// How many lines it has: one more than terminators.
    #[must_use]
    pub fn line_count(&self) -> usize {
        self.rope.len_lines()
    }

    /// Applies one change, whose columns count in `encoding`. Places outside the text are clamped: a
    /// column past the line's end to before its terminator, a line past the last to the end;
    /// one inside a character counts as its start, and a range that runs backwards is turned round.
    pub fn apply(&mut self, edit: &Edit, encoding: Encoding) {
        match edit.range {
            None => *self = Self::new(&edit.text),
            Some((from, to)) => {
                let from = character_at(&self.rope, from, encoding);
                let to = character_at(&self.rope, to, encoding);
                let (from, to) = (from.min(to), from.max(to));
                self.rope.remove(from..to);
                self.rope.insert(from, &edit.text);
                self.text = OnceLock::new();
            }
        }
    }
}

/// The character that a place points at, clamped to the text.
fn character_at(rope: &Rope, place: Place, encoding: Encoding) -> usize {
    let line = place.line as usize;
    if line >= rope.len_lines() {
        return rope.len_chars();
    }
    let start = rope.line_to_char(line);
    let end = start + content_length(rope.line(line));
    let column = place.column as usize;
    let target = match encoding {
        Encoding::Utf8 => {
            let byte = rope.char_to_byte(start) + column;
            (byte < rope.char_to_byte(end)).then(|| rope.byte_to_char(byte))
        }
        Encoding::Utf16 => {
            let unit = rope.char_to_utf16_cu(start) + column;
            (unit < rope.char_to_utf16_cu(end)).then(|| rope.utf16_cu_to_char(unit))
        }
        Encoding::Utf32 => Some(start + column),
    };
    target.map_or(end, |target| target.min(end))
}

/// The characters of a line without its terminator.
fn content_length(line: RopeSlice<'_>) -> usize {
    let mut length = line.len_chars();
    for terminator in ['\n', '\r'] {
        let last = length.checked_sub(1).and_then(|last| line.get_char(last));
        if last == Some(terminator) {
            length -= 1;
        }
    }
    length
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::text::LineIndex;
    use proptest::prelude::*;

    fn edit(from: (u32, u32), to: (u32, u32), text: &str) -> Edit {
        Edit {
            range: Some((Place::new(from.0, from.1), Place::new(to.0, to.1))),
            text: text.to_owned(),
        }
    }

    #[test]
    fn lines_are_those_of_editors() {
        assert_eq!(
            Document::new("a\u{b}\u{c}\u{85}\u{2028}b\rc").line_count(),
            2
        );
    }

    #[test]
    fn edits_build_on_each_other() {
        let mut document = Document::new("layer 5 nm\r\n🙂 x");
        document.apply(&edit((0, 6), (0, 7), "6"), Encoding::Utf16);
        document.apply(&edit((1, 2), (1, 3), "\n"), Encoding::Utf16);
        assert_eq!(&*document.text(), "layer 6 nm\r\n🙂\nx");
        document.apply(&edit((0, 99), (1, 0), " "), Encoding::Utf8);
        assert_eq!(&*document.text(), "layer 6 nm 🙂\nx");
        let whole = Edit {
            range: None,
            text: "b".to_owned(),
        };
        document.apply(&whole, Encoding::Utf16);
        assert_eq!(&*document.text(), "b");
        assert!(Arc::ptr_eq(&document.text(), &document.text()));
    }

    /// The text as UTF-16 and nothing else: lines are found by scanning, places by counting.
    struct Model(Vec<u16>);

    impl Model {
        fn offset(&self, place: Place) -> usize {
            let (mut line, mut start) = (0, 0);
            while line < place.line {
                let Some(length) = self.line_length(start) else {
                    return self.0.len();
                };
                start += length + self.terminator(start + length);
                line += 1;
            }
            let content = self.line_length(start).unwrap_or(self.0.len() - start);
            let offset = start + (place.column as usize).min(content);
            let low_surrogate = self
                .0
                .get(offset)
                .is_some_and(|unit| (0xdc00..0xe000).contains(unit));
            if low_surrogate && offset > start {
                offset - 1
            } else {
                offset
            }
        }

        /// Units before the line's terminator; none on the last line.
        fn line_length(&self, start: usize) -> Option<usize> {
            self.0
                .iter()
                .skip(start)
                .position(|unit| matches!(unit, 10 | 13))
        }

        fn terminator(&self, at: usize) -> usize {
            match (self.0.get(at), self.0.get(at + 1)) {
                (Some(13), Some(10)) => 2,
                _ => 1,
            }
        }

        fn apply(&mut self, from: Place, to: Place, text: &str) {
            let (from, to) = (self.offset(from), self.offset(to));
            let (from, to) = (from.min(to), from.max(to));
            self.0.splice(from..to, text.encode_utf16());
        }

        fn text(&self) -> String {
            String::from_utf16_lossy(&self.0)
        }
    }

    fn piece() -> impl Strategy<Value = String> {
        let parts = prop::sample::select(vec![
            "a", "\n", "\r", "\r\n", "🙂", "é", "\u{2028}", "\u{85}", "layer", "",
        ]);
        prop::collection::vec(parts, 0..8).prop_map(|parts| parts.concat())
    }

    fn place() -> impl Strategy<Value = Place> {
        (0_u32..9, 0_u32..9).prop_map(|(line, column)| Place::new(line, column))
    }

    proptest! {
        #[test]
        fn a_document_follows_the_naive_model(
            start in piece(),
            edits in prop::collection::vec((place(), place(), piece()), 1..12),
        ) {
            let mut document = Document::new(&start);
            let mut model = Model(start.encode_utf16().collect());
            for (from, to, text) in edits {
                model.apply(from, to, &text);
                let range = Some((from, to));
                document.apply(&Edit { range, text }, Encoding::Utf16);
                prop_assert_eq!(document.text().to_string(), model.text());
            }
        }

        #[test]
        fn an_index_agrees_with_the_naive_model(text in piece(), place in place()) {
            let model = Model(text.encode_utf16().collect());
            let units = model.offset(place);
            let before: Vec<u16> = model.0.iter().take(units).copied().collect();
            let bytes = String::from_utf16_lossy(&before).len();
            let index = LineIndex::new(&text);
            prop_assert_eq!(index.offset(place, Encoding::Utf16) as usize, bytes);
        }

        #[test]
        fn places_come_back(text in piece(), offset in 0_u32..60) {
            let index = LineIndex::new(&text);
            for encoding in [Encoding::Utf8, Encoding::Utf16, Encoding::Utf32] {
                let place = index.place(offset, encoding);
                let back = index.offset(place, encoding);
                prop_assert!(text.is_char_boundary(back as usize));
                prop_assert!(back <= offset);
                prop_assert_eq!(index.place(back, encoding), place);
            }
        }
    }
}
