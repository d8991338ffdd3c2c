//! What the tests of the views share: files in memory, and marks for the cursor.
#![allow(dead_code, missing_docs, clippy::unwrap_used)]

use std::collections::HashMap;
use std::path::{Path, PathBuf};
use std::sync::Arc;

use crenate::report::{Analysis, Analyst, FileSource, ReadFailure, Request, Tier};
use crenate::syntax::{Tree, read};

/// Files in memory.
#[derive(Default)]
pub struct Files(HashMap<PathBuf, String>);

impl Files {
    pub fn with(mut self, path: &str, text: &str) -> Self {
        self.0.insert(PathBuf::from(path), text.to_owned());
        self
    }
}

impl FileSource for Files {
    fn tree(&self, path: &Path) -> Result<Arc<Tree>, ReadFailure> {
        let text = self.0.get(path).ok_or(ReadFailure::NotFound)?;
        Ok(Arc::new(read(text)))
    }

    fn bytes(&self, path: &Path) -> Result<Arc<[u8]>, ReadFailure> {
        let text = self.0.get(path).ok_or(ReadFailure::NotFound)?;
        Ok(Arc::from(text.as_bytes()))
    }

    fn inside(&self, path: &Path) -> bool {
        !path.starts_with("..")
    }
}

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
