//! A document: its text, byte spans, line and column positions, and edits.

mod span;

pub use span::Span;
