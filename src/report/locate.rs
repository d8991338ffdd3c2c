//! From places to lines and columns, as people and machines are told them.

use std::cell::RefCell;
use std::collections::HashMap;
use std::path::Path;
use std::sync::Arc;

use super::analysis::Analysis;
use super::lines::Lines;
use crate::model::{FileId, Place};

/// Where something stands: lines and columns from 1, columns in characters, the end exclusive.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Position {
    /// First line.
    pub line: usize,
    /// First column.
    pub column: usize,
    /// Last line.
    pub end_line: usize,
    /// The column behind the last character.
    pub end_column: usize,
}

/// Finds the lines and columns of places in one analysis; each file's lines are counted once.
pub struct Locator<'a> {
    analysis: &'a Analysis,
    lines: RefCell<HashMap<FileId, Arc<Lines>>>,
}

impl<'a> Locator<'a> {
    /// A locator of an analysis.
    #[must_use]
    pub fn new(analysis: &'a Analysis) -> Self {
        Self {
            analysis,
            lines: RefCell::default(),
        }
    }

    /// The analysis.
    #[must_use]
    pub fn analysis(&self) -> &'a Analysis {
        self.analysis
    }

    /// The lines of a file, where it is known.
    #[must_use]
    pub fn lines(&self, file: FileId) -> Option<Arc<Lines>> {
        if let Some(known) = self.lines.borrow().get(&file) {
            return Some(Arc::clone(known));
        }
        let tree = self.analysis.tree(file)?;
        let lines = Arc::new(Lines::of(&tree.text));
        self.lines.borrow_mut().insert(file, Arc::clone(&lines));
        Some(lines)
    }

    /// Lines and columns of a place.
    #[must_use]
    pub fn position(&self, place: &Place) -> Option<Position> {
        let (_, span) = self.analysis.absolute(place)?;
        let lines = self.lines(place.file)?;
        let (line, column) = lines.line_and_column(span.start);
        let (end_line, end_column) = lines.line_and_column(span.end);
        Some(Position {
            line,
            column,
            end_line,
            end_column,
        })
    }

    /// The first line of a place; 1 where the place is not known any more.
    #[must_use]
    pub fn line(&self, place: &Place) -> usize {
        self.position(place).map_or(1, |position| position.line)
    }

    /// The path of a file as it is shown.
    #[must_use]
    pub fn file_name(&self, file: FileId) -> String {
        self.analysis.path(file).map(shown_path).unwrap_or_default()
    }
}

/// A path as it is shown: forward slashes, no leading `./`.
#[must_use]
pub fn shown_path(path: &Path) -> String {
    let text = path.to_string_lossy().replace('\\', "/");
    match text.strip_prefix("./") {
        Some(rest) if !rest.is_empty() => rest.to_owned(),
        _ => text,
    }
}
