//! What a rule, a finding and a fix are.

use crate::bands::{Assessment, MeasureValue, Solution, Unsolved};
use crate::model::{Crystal, FileId, Place, Reference, Trouble, World};
use crate::syntax::Entry;

/// How serious a finding is.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum Level {
    /// Worth knowing.
    Note,
    /// Probably not meant.
    Warning,
    /// Wrong.
    Error,
}

/// What a rule needs before it can speak; cheap ones are published first.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum Tier {
    /// The statements alone.
    Read,
    /// The model.
    Model,
    /// The bands.
    Bands,
}

/// A rule: a plain record with a function.
pub struct Rule {
    /// Its name, as `waive` and the outputs write it.
    pub name: &'static str,
    /// The group it stands in ("reading", "units" …).
    pub group: &'static str,
    /// Its usual level (a finding may carry another where the design says so).
    pub level: Level,
    /// What it needs.
    pub tier: Tier,
    /// Whether `waive` may silence it.
    pub waivable: bool,
    /// The source text of its file; the leading `//!` lines are its documentation.
    pub source: &'static str,
    /// Looks at one section and adds what it finds.
    pub check: fn(&Subject<'_>, &mut Vec<Finding>),
}

/// What a rule looks at: one section, and what is known of it.
pub struct Subject<'a> {
    /// All files.
    pub world: &'a World,
    /// The file.
    pub file: FileId,
    /// The section.
    pub entry: &'a Entry,
    /// What was found wrong while the section's model was built.
    pub troubles: &'a [Trouble],
    /// The names that the section uses.
    pub references: &'a [Reference],
    /// The crystal, where the section is one.
    pub crystal: Option<&'a Crystal>,
    /// Its bands; `None` before they are known and where the section is no crystal.
    pub bands: Option<&'a Result<std::sync::Arc<Solution>, Unsolved>>,
    /// Its targets; empty before the bands are known.
    pub targets: &'a [Assessment],
    /// Its measures; empty before the bands are known.
    pub measures: &'a [MeasureValue],
}

/// One finding.
#[derive(Clone, Debug, PartialEq)]
pub struct Finding {
    /// The rule's name.
    pub rule: &'static str,
    /// The level.
    pub level: Level,
    /// Where.
    pub place: Place,
    /// What is wrong, with the numbers in it; lower case, no full stop.
    pub message: String,
    /// One line of help.
    pub help: Option<String>,
    /// Other places that take part, each with what it is.
    pub related: Vec<(Place, String)>,
    /// How to mend it.
    pub fixes: Vec<Fix>,
    /// Whether an editor may grey the place, as nothing uses it.
    pub unused: bool,
}

/// A way to mend a finding.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Fix {
    /// What it does, as an imperative ("write `meV`").
    pub title: String,
    /// Replacements, none overlapping another.
    pub edits: Vec<Replacement>,
    /// Whether it can be applied without a look.
    pub safe: bool,
}

/// A replacement of text.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Replacement {
    /// What is replaced.
    pub place: Place,
    /// The new text.
    pub text: String,
}
