//! From text to typed statements: never fails, knows no meaning.
//!
//! A text is cut at its headings into sections; a section is read statement by
//! statement, one logical line a parse. All spans inside a [`Section`] count
//! from the section's first byte, so that a section read once stays valid when
//! text above it changes.

mod tree;

pub use tree::*;
