//! Where a command's files come from, and what works on them.

use std::path::{Path, PathBuf};
use std::sync::Arc;

use super::files::{self, Selection};
use crate::report::analysis::{Analysis, FileAnalysis};
use crate::report::analyst::{Analyst, Request};
use crate::report::disk::Disk;
use crate::report::{FileSource, Tier};

/// The disk as far as some paths reach, and an analyst.
pub struct Desk {
    pub disk: Disk,
    pub analyst: Analyst,
}

impl Desk {
    pub fn of(paths: &[PathBuf]) -> Self {
        Self {
            disk: Disk::within(&files::reach(paths)),
            analyst: Analyst::default(),
        }
    }

    /// One that knows which of the selected files others use.
    pub fn knowing(paths: &[PathBuf], selection: &Selection) -> Self {
        Self {
            analyst: Analyst::knowing_used(files::used(&selection.all)),
            ..Self::of(paths)
        }
    }

    /// What comes of a file by itself, the first of those analysed.
    ///
    /// # Errors
    /// Why it cannot be read, in words.
    pub fn analysed(
        &self,
        path: &Path,
        depth: Tier,
        cancel: &(dyn Fn() -> bool + Sync),
    ) -> Result<(Analysis, Arc<FileAnalysis>), String> {
        let analysis = self.analyst.analyse(&Request {
            source: &self.disk,
            roots: &[path.to_owned()],
            depth,
            cancel,
        });
        match analysis.files.first().map(Arc::clone) {
            Some(file) => Ok((analysis, file)),
            None => {
                let why = self.disk.tree(path).err().map(|failure| failure.words());
                Err(why.unwrap_or_default())
            }
        }
    }
}
