//! A document: its text, byte spans, line and column positions, and edits.

mod document;
mod lines;
mod place;
mod span;

pub use document::{Document, Edit};
pub use lines::LineIndex;
pub use place::{Encoding, Place};
pub use span::Span;
