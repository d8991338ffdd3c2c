//! What the tests of the views share: files in memory, and marks for the cursor.
#![allow(dead_code, missing_docs, clippy::unwrap_used)]

#[path = "../memory/mod.rs"]
mod memory;

use std::path::PathBuf;

use crenate::report::{Analysis, Analyst, Request, Tier};
pub use memory::Memory as Files;

/// One file, analysed as far as wanted.
pub fn analysed(analyst: &Analyst, files: &Files, depth: Tier) -> Analysis {
    analyst.analyse(&Request {
        source: files,
        roots: &[PathBuf::from("a.cren")],
        depth,
        cancel: &|| false,
    })
}

/// A text without its `|` marks, and the bytes where they stood.
pub fn marked(text: &str) -> (String, Vec<u32>) {
    let mut plain = String::new();
    let mut marks = Vec::new();
    for character in text.chars() {
        match character {
            '|' => marks.push(u32::try_from(plain.len()).unwrap()),
            other => plain.push(other),
        }
    }
    (plain, marks)
}
