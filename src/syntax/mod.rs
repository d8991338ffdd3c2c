//! From text to typed statements: never fails, knows no meaning.
//!
//! A text is cut at its headings into sections; a section is read statement by
//! statement, one logical line a parse. All spans inside a [`Section`] count
//! from the section's first byte, so that a section read once stays valid when
//! text above it changes.

mod build;
mod grammar;
mod locate;
mod mentions;
mod read;
mod section;
mod split;
mod tokens;
// A statement is read once and then shared: boxing its larger forms would save nothing.
#[allow(clippy::large_enum_variant)]
mod tree;
mod walk;
mod wording;
pub mod words;

pub use read::{read, reread};
pub use tree::*;
