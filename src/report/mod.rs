//! The pipeline from files to findings and numbers, and the views of it.

pub mod actions;
pub mod analysis;
pub mod analyst;
pub mod disk;
mod drawing;
pub mod editor_complete;
pub mod editor_format;
pub mod editor_links;
pub mod editor_names;
pub mod editor_outline;
pub mod editor_picture;
pub mod editor_rules;
pub mod editor_signature;
pub mod editor_text;
pub mod editor_tokens;
mod grid;
pub mod hints;
pub mod hover;
pub mod junit;
mod lines;
pub mod lint_json;
pub mod lint_text;
pub mod locate;
pub mod paint;
pub mod rule_page;
pub mod sarif;
pub mod show_csv;
pub mod show_json;
pub mod show_text;
pub mod tidy;
pub mod units;
pub mod words;

pub use crate::model::{FileSource, ReadFailure};
pub use crate::rules::{Finding, Level, Tier};
pub use analysis::{Analysis, FileAnalysis, SectionAnalysis};
pub use analyst::{Analyst, Request};
