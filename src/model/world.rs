//! All files that take part, and where names are found.

use std::path::PathBuf;

use super::FileId;

/// The files of one snapshot and what they `use`.
#[derive(Debug, Default)]
pub struct World {
    /// The files, roots first.
    pub files: Vec<(FileId, PathBuf)>,
}
