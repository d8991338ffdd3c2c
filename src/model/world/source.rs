//! Where files come from, and the samples of tables.

use std::path::Path;
use std::sync::{Arc, OnceLock};

use crate::syntax::Tree;

/// Where files come from: open buffers, or the disk.
pub trait FileSource: Sync {
    /// What the file at a normalised path reads as.
    ///
    /// # Errors
    /// [`ReadFailure`] where it cannot be read as text.
    fn tree(&self, path: &Path) -> Result<Arc<Tree>, ReadFailure>;

    /// The bytes of a table.
    ///
    /// # Errors
    /// [`ReadFailure`] where it cannot be read.
    fn bytes(&self, path: &Path) -> Result<Arc<[u8]>, ReadFailure>;

    /// Whether a path lies in the workspace.
    fn inside(&self, path: &Path) -> bool;

    /// Whether a file that is not at hand is known to use this one.
    fn is_used(&self, path: &Path) -> bool {
        let _ = path;
        false
    }
}

/// No files at all: for what needs none.
pub(crate) struct NoFiles;

impl FileSource for NoFiles {
    fn tree(&self, _path: &Path) -> Result<Arc<Tree>, ReadFailure> {
        Err(ReadFailure::NotFound)
    }

    fn bytes(&self, _path: &Path) -> Result<Arc<[u8]>, ReadFailure> {
        Err(ReadFailure::NotFound)
    }

    fn inside(&self, _path: &Path) -> bool {
        false
    }
}

/// Why a file cannot be read.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum ReadFailure {
    /// There is none.
    NotFound,
    /// It is not UTF-8 text.
    NotText,
    /// Anything else, in words.
    Other(String),
}

impl ReadFailure {
    /// The reason in words.
    #[must_use]
    pub fn words(&self) -> String {
        match self {
            Self::NotFound => "there is no such file".to_owned(),
            Self::NotText => "it is not text in UTF-8".to_owned(),
            Self::Other(why) => why.clone(),
        }
    }
}

/// A table's file: known by its bytes, read once.
#[derive(Debug)]
pub struct TableFile {
    /// A hash of its bytes, or of the reason why there are none.
    pub hash: u64,
    pub(crate) readable: Result<(), String>,
    pub(crate) samples: OnceLock<Result<Arc<TableSamples>, String>>,
}

/// The two columns of a table as written, without units.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct TableSamples {
    /// Positions.
    pub positions: Vec<f64>,
    /// Potentials.
    pub energies: Vec<f64>,
    /// The line of the file of each row, from 1.
    pub lines: Vec<u64>,
}
