//! All files that take part: what they contain, and what their names mean.
//!
//! *Invariant*: a file sees its own names first, then those of the files that it
//! itself `use`s, in order; what those files in turn use stays their own affair.
//! *Invariant*: a [`World`] is a snapshot. It is cheap to make anew after each
//! edit; what is costly is keyed by [`World::dependency_hash`].

mod depend;
mod gather;
mod names;
mod path;
mod source;

use std::path::{Path, PathBuf};
use std::sync::Arc;

use rustc_hash::{FxHashMap, FxHashSet};

use super::{CrystalRef, FileId, Place, Trouble};
use crate::syntax::{Entry, Section, SectionId, SectionKind, Tree};
use crate::text::Span;

pub use names::LetRef;
pub(crate) use names::{Scope, lets_of};
pub(crate) use path::beside;
pub use path::normalise;
pub(crate) use source::NoFiles;
pub use source::{FileSource, ReadFailure, TableFile, TableSamples};

/// A snapshot of all files that take part.
#[derive(Debug, Default)]
pub struct World {
    files: Vec<WorldFile>,
    by_id: FxHashMap<FileId, usize>,
    tables: FxHashMap<PathBuf, TableFile>,
}

/// One file of a [`World`].
#[derive(Debug)]
pub struct WorldFile {
    /// Its identity.
    pub id: FileId,
    /// Its normalised path.
    pub path: PathBuf,
    /// What it reads as.
    pub tree: Arc<Tree>,
    /// The files that it uses, in order, those that could be read.
    pub uses: Vec<FileId>,
    /// Its `use` statements: the place of the path in quotes, and the file where it could be read.
    pub use_places: Vec<(Place, Option<FileId>)>,
    /// Mistakes of its `use` statements.
    pub use_troubles: Vec<Trouble>,
    entry_of: FxHashMap<SectionId, usize>,
    materials: FxHashMap<String, usize>,
    crystals: FxHashMap<String, usize>,
    lets: FxHashMap<String, usize>,
    /// Names that this file gives more than once, by the kind of section that gives them.
    repeated: FxHashSet<(SectionKind, String)>,
    scope_hash: u64,
}

impl WorldFile {
    /// A section by its identity.
    #[must_use]
    pub fn entry(&self, section: SectionId) -> Option<&Entry> {
        self.tree.entries.get(*self.entry_of.get(&section)?)
    }

    /// Its preamble.
    #[must_use]
    pub fn preamble(&self) -> Option<&Entry> {
        self.tree.entries.first()
    }

    /// Whether it gives a name more than once: a `let` of the preamble, a material or a crystal.
    pub(crate) fn repeats(&self, kind: SectionKind, name: &str) -> bool {
        !self.repeated.is_empty() && self.repeated.contains(&(kind, name.to_owned()))
    }

    /// Its sections of one kind, in order.
    pub fn sections(&self, kind: SectionKind) -> impl Iterator<Item = &Entry> {
        self.tree
            .entries
            .iter()
            .filter(move |entry| entry.section.kind == kind)
    }
}

/// A section where it stands.
#[derive(Clone, Copy, Debug)]
pub struct SectionRef<'w> {
    /// Its file.
    pub file: FileId,
    /// Its identity.
    pub id: SectionId,
    /// What it says.
    pub section: &'w Section,
}

impl<'w> SectionRef<'w> {
    /// A range of it as a place.
    #[must_use]
    pub fn place(&self, span: Span) -> Place {
        Place {
            file: self.file,
            section: self.id,
            span,
        }
    }

    /// The text of a range of it.
    #[must_use]
    pub fn text(&self, span: Span) -> &'w str {
        span.of(&self.section.text)
    }

    /// The place of its name, or of its heading where it has none.
    #[must_use]
    pub fn name_place(&self) -> Place {
        let name = self.section.name.as_ref();
        self.place(name.map_or(self.section.heading, |word| word.span))
    }

    /// Its name, empty where it has none.
    #[must_use]
    pub fn name(&self) -> &'w str {
        self.section
            .name
            .as_ref()
            .map_or("", |word| word.text.as_str())
    }

    /// File and section.
    #[must_use]
    pub fn key(&self) -> (FileId, SectionId) {
        (self.file, self.id)
    }
}

impl World {
    /// All files, in the order in which they were reached.
    #[must_use]
    pub fn files(&self) -> &[WorldFile] {
        &self.files
    }

    /// A file.
    #[must_use]
    pub fn file(&self, id: FileId) -> Option<&WorldFile> {
        self.files.get(*self.by_id.get(&id)?)
    }

    /// The file at a path, normalised here.
    #[must_use]
    pub fn file_at(&self, path: &Path) -> Option<&WorldFile> {
        self.file(FileId::of(&normalise(path)))
    }

    /// A section.
    #[must_use]
    pub fn section(&self, file: FileId, section: SectionId) -> Option<SectionRef<'_>> {
        let entry = self.file(file)?.entry(section)?;
        Some(SectionRef {
            file,
            id: entry.id,
            section: &entry.section,
        })
    }

    /// The crystals of a file, in order: their identity, and the index of their entry in the file's tree.
    #[must_use]
    pub fn crystals(&self, file: FileId) -> Vec<(SectionId, usize)> {
        self.sections_of(file, SectionKind::Crystal)
    }

    /// The materials of a file, likewise.
    #[must_use]
    pub fn materials(&self, file: FileId) -> Vec<(SectionId, usize)> {
        self.sections_of(file, SectionKind::Material)
    }

    fn sections_of(&self, file: FileId, kind: SectionKind) -> Vec<(SectionId, usize)> {
        let Some(file) = self.file(file) else {
            return Vec::new();
        };
        let entries = file.tree.entries.iter().enumerate();
        entries
            .filter(|(_, entry)| entry.section.kind == kind)
            .map(|(index, entry)| (entry.id, index))
            .collect()
    }

    /// A reference to a crystal's section.
    #[must_use]
    pub fn crystal_section(&self, of: CrystalRef) -> Option<SectionRef<'_>> {
        self.section(of.file, of.section)
            .filter(|found| found.section.kind == SectionKind::Crystal)
    }

    /// A place in bytes of its file.
    #[must_use]
    pub fn place_to_absolute(&self, place: Place) -> Option<(FileId, Span)> {
        let entry = self.file(place.file)?.entry(place.section)?;
        Some((place.file, place.span.shifted(entry.start)))
    }

    /// The text at a place.
    #[must_use]
    pub fn text_at(&self, place: Place) -> &str {
        self.section(place.file, place.section)
            .map_or("", |found| found.text(place.span))
    }

    /// The section of a file that holds an absolute byte.
    #[must_use]
    pub fn section_at(&self, file: FileId, byte: u32) -> Option<SectionRef<'_>> {
        let found = self.file(file)?;
        let entries = &found.tree.entries;
        let behind = entries.partition_point(|entry| entry.start <= byte);
        let entry = entries.get(behind.checked_sub(1)?)?;
        Some(SectionRef {
            file,
            id: entry.id,
            section: &entry.section,
        })
    }

    pub(crate) fn table(&self, path: &Path) -> Option<&TableFile> {
        self.tables.get(path)
    }
}
