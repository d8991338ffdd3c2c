//! Places that stay valid while text above them changes.

use std::path::Path;

use super::hash::hash_bytes;
use crate::syntax::SectionId;
use crate::text::Span;

/// Names a file: a hash of its path, the same in every run and snapshot.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub struct FileId(pub u64);

impl FileId {
    /// The identity of the file at a normalised path.
    #[must_use]
    pub fn of(path: &Path) -> Self {
        Self(hash_bytes(path.to_string_lossy().as_bytes()))
    }
}

/// A range of text: a file, a section of it, and bytes counted from the section's first.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub struct Place {
    /// The file.
    pub file: FileId,
    /// The section.
    pub section: SectionId,
    /// Bytes, relative to the section's first.
    pub span: Span,
}
