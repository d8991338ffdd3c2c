//! Bytes of a text to the client's lines and columns, and back.

use tower_lsp::lsp_types::{Position, Range, TextDocumentContentChangeEvent};

use crate::text::{Document, Edit, Encoding, LineIndex, Place, Span};

/// Applies a change as the client words it.
pub(super) fn apply(
    document: &mut Document,
    change: TextDocumentContentChangeEvent,
    encoding: Encoding,
) {
    let range = change
        .range
        .map(|range| (place(range.start), place(range.end)));
    document.apply(
        &Edit {
            range,
            text: change.text,
        },
        encoding,
    );
}

/// The client's position of a byte.
pub(super) fn position(lines: &LineIndex, offset: u32, encoding: Encoding) -> Position {
    let place = lines.place(offset, encoding);
    Position::new(place.line, place.column)
}

/// The client's range of some bytes.
pub(super) fn range(lines: &LineIndex, span: Span, encoding: Encoding) -> Range {
    Range::new(
        position(lines, span.start, encoding),
        position(lines, span.end, encoding),
    )
}

/// The byte of a position, clamped to the text.
pub(super) fn offset(lines: &LineIndex, position: Position, encoding: Encoding) -> u32 {
    lines.offset(place(position), encoding)
}

/// The bytes of a range, clamped to the text.
pub(super) fn span(lines: &LineIndex, range: Range, encoding: Encoding) -> Span {
    lines.span(place(range.start), place(range.end), encoding)
}

fn place(position: Position) -> Place {
    Place::new(position.line, position.character)
}
