//! What came of a set of files: statements, models, bands, findings.

use std::path::{Path, PathBuf};
use std::sync::Arc;

use crate::bands::{Assessment, MeasureValue, Solution, Unsolved};
use crate::model::{Crystal, FileId, Parameter, Place, Reference, Trouble, World, normalise};
use crate::rules::{Finding, Tier};
use crate::syntax::{Entry, SectionId, Tree};
use crate::text::Span;

/// What came of a set of files.
#[derive(Default)]
pub struct Analysis {
    /// The files and what they use.
    pub world: Arc<World>,
    /// The analysed roots in the order given; a root that cannot be read is left out.
    pub files: Vec<Arc<FileAnalysis>>,
}

/// What came of one file.
pub struct FileAnalysis {
    /// The file.
    pub file: FileId,
    /// Its path, normalised.
    pub path: PathBuf,
    /// Its statements.
    pub tree: Arc<Tree>,
    /// One for each of the tree's entries, in order.
    pub sections: Vec<Arc<SectionAnalysis>>,
    /// All findings of the file in order of place, waivers applied.
    pub findings: Vec<Arc<Finding>>,
    /// Those among them that show only in the whole file, before waivers.
    pub(super) whole: Vec<Arc<Finding>>,
    /// What each section's result was found to depend on.
    pub(super) hashes: Vec<u64>,
    /// How far the analysis went: the least of its sections.
    pub depth: Tier,
}

/// What came of one section.
pub struct SectionAnalysis {
    /// The section.
    pub section: SectionId,
    /// Mistakes found while its model was built.
    pub troubles: Vec<Trouble>,
    /// Names it uses.
    pub references: Vec<Reference>,
    /// What its numbers depend on (a material's and the preamble's own too).
    pub parameters: Vec<Parameter>,
    /// The crystal, where it is one.
    pub crystal: Option<Arc<Crystal>>,
    /// Its bands; `None` before they are known.
    pub bands: Option<Result<Arc<Solution>, Unsolved>>,
    /// Its targets, once the bands are known.
    pub targets: Vec<Assessment>,
    /// Its measures, once the bands are known.
    pub measures: Vec<MeasureValue>,
    /// What the rules found in it, waivers not yet applied.
    pub findings: Vec<Arc<Finding>>,
    /// How far its analysis went.
    pub depth: Tier,
}

impl Analysis {
    /// The analysis of the file at `path`.
    #[must_use]
    pub fn file(&self, path: &Path) -> Option<&Arc<FileAnalysis>> {
        let path = normalise(path);
        self.files.iter().find(|file| file.path == path)
    }

    /// The analysis of a file by its identity.
    #[must_use]
    pub fn file_by_id(&self, file: FileId) -> Option<&Arc<FileAnalysis>> {
        self.files.iter().find(|known| known.file == file)
    }

    /// What came of a section.
    #[must_use]
    pub fn section(&self, file: FileId, section: SectionId) -> Option<&Arc<SectionAnalysis>> {
        let sections = &self.file_by_id(file)?.sections;
        sections.iter().find(|known| known.section == section)
    }

    /// Path and absolute bytes of a place; `None` where its section is not there any more.
    #[must_use]
    pub fn absolute(&self, place: &Place) -> Option<(&Path, Span)> {
        let file = self.world.file(place.file)?;
        let start = file.entry(place.section)?.start;
        Some((&file.path, place.span.shifted(start)))
    }

    /// The statements of a file, a used one too.
    #[must_use]
    pub fn tree(&self, file: FileId) -> Option<&Arc<Tree>> {
        self.world.file(file).map(|file| &file.tree)
    }

    /// The path of a file, a used one too.
    #[must_use]
    pub fn path(&self, file: FileId) -> Option<&Path> {
        self.world.file(file).map(|file| file.path.as_path())
    }
}

impl FileAnalysis {
    /// Its crystals in order, with what came of each; `only` picks some by name, all where it is empty.
    pub fn crystals<'a>(
        &'a self,
        only: &'a [String],
    ) -> impl Iterator<Item = (&'a SectionAnalysis, &'a Crystal)> {
        let all = self.sections.iter().filter_map(|section| {
            let crystal = section.crystal.as_deref()?;
            Some((section.as_ref(), crystal))
        });
        all.filter(move |(_, crystal)| only.is_empty() || only.contains(&crystal.name))
    }

    /// Its findings; with `only`, those in the crystals of these names.
    #[must_use]
    pub fn chosen_findings<'a>(&'a self, only: &'a [String]) -> Vec<&'a Finding> {
        let sections: Vec<SectionId> = self
            .crystals(only)
            .map(|(section, _)| section.section)
            .collect();
        // One on a named value counts in the crystals that use it.
        let wanted = |finding: &&Finding| {
            let related = finding.related.iter().map(|(place, _)| place);
            let mut places = related.chain([&finding.place]);
            only.is_empty() || places.any(|place| sections.contains(&place.section))
        };
        let findings = self.findings.iter().map(AsRef::as_ref);
        findings.filter(wanted).collect()
    }

    /// The section that holds an absolute byte, with what came of it.
    #[must_use]
    pub fn section_at(&self, byte: u32) -> Option<(&Entry, &Arc<SectionAnalysis>)> {
        let entries = &self.tree.entries;
        let behind = entries.partition_point(|entry| entry.start <= byte);
        let index = behind.checked_sub(1)?;
        Some((entries.get(index)?, self.sections.get(index)?))
    }
}

impl SectionAnalysis {
    /// Its bands, where they are known.
    #[must_use]
    pub fn solution(&self) -> Option<&Solution> {
        self.bands.as_ref()?.as_deref().ok()
    }

    /// Whether nothing is left to compute at this depth.
    #[must_use]
    pub fn settled(&self, depth: Tier) -> bool {
        let fine = self.solution().is_none_or(|solution| solution.fine);
        self.depth >= depth && (depth < Tier::Bands || fine)
    }

    /// Why it has no bands, where that is known.
    #[must_use]
    pub fn unsolved(&self) -> Option<&Unsolved> {
        self.bands.as_ref()?.as_ref().err()
    }
}
