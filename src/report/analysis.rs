//! The one pipeline: files → model → bands → rules.
//!
//! Results are cached by section content, so that an edit is answered by
//! reading, building and solving only what it touched.

use std::path::{Path, PathBuf};
use std::sync::Arc;

use crate::bands::{Assessment, MeasureValue, Sensitivity, Solution, Unsolved};
use crate::model::{Crystal, FileId, Parameter, Reference, Trouble, World};
use crate::rules::{Finding, Tier};
use crate::syntax::{SectionId, Tree};

/// What came of a set of files.
#[derive(Default)]
pub struct Analysis {
    /// The files and what they use.
    pub world: World,
    /// The analysed roots in the order given.
    pub files: Vec<Arc<FileAnalysis>>,
}

/// What came of one file.
pub struct FileAnalysis {
    /// The file.
    pub file: FileId,
    /// Its path.
    pub path: PathBuf,
    /// Its statements.
    pub tree: Arc<Tree>,
    /// One for each of the tree's entries, in order.
    pub sections: Vec<Arc<SectionAnalysis>>,
    /// All findings of the file in order of place, waivers applied.
    pub findings: Vec<Finding>,
    /// How far the analysis went.
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
    /// Derivatives of its lowest gaps, widths and edges, once the bands are known.
    pub sensitivities: Vec<Sensitivity>,
    /// What the rules found in it, waivers not yet applied.
    pub findings: Vec<Finding>,
}

impl Analysis {
    /// The analysis of the file at `path`.
    #[must_use]
    pub fn file(&self, path: &Path) -> Option<&Arc<FileAnalysis>> {
        self.files.iter().find(|file| file.path == path)
    }
}
