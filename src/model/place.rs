//! Places that stay valid while text above them changes.

use crate::syntax::SectionId;
use crate::text::Span;

/// Names a file: a hash of its path, the same in every run and snapshot.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub struct FileId(pub u64);

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
