//! One file in memory, for tests and benches.

use std::path::{Path, PathBuf};
use std::sync::Arc;

use crenate::model::{FileSource, ReadFailure};
use crenate::syntax::{Tree, read};

/// A single file.
pub struct Memory(Arc<Tree>);

impl Memory {
    /// Holds a text.
    pub fn new(text: &str) -> Self {
        Self(Arc::new(read(text)))
    }

    /// Where it is.
    pub fn path() -> PathBuf {
        PathBuf::from("model.cren")
    }
}

impl FileSource for Memory {
    fn tree(&self, path: &Path) -> Result<Arc<Tree>, ReadFailure> {
        if path == Self::path() {
            Ok(Arc::clone(&self.0))
        } else {
            Err(ReadFailure::NotFound)
        }
    }
    fn bytes(&self, _: &Path) -> Result<Arc<[u8]>, ReadFailure> {
        Err(ReadFailure::NotFound)
    }
    fn inside(&self, _: &Path) -> bool {
        true
    }
}
