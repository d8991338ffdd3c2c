//! Files with their safe fixes applied, before anything is written.
//!
//! Mending goes by rounds: the findings of a text give fixes, those that do not
//! touch each other are applied, and the text is looked at again. It ends where
//! nothing is left to apply, where a text comes back, or after `ROUNDS` rounds.
//!
//! *Invariant*: only what a fix calls safe is applied, and only in the file that
//! the finding stands in.

use std::path::Path;
use std::sync::Arc;

use rustc_hash::FxHashSet;
use similar::TextDiff;

use super::analysis::{Analysis, FileAnalysis};
use super::analyst::{Analyst, Request};
use super::overlay::Overlay;
use crate::model::{FileSource, ReadFailure, normalise};
use crate::rules::{Fix, Tier};
use crate::text::Span;

/// Fixes come to rest within fewer rounds than this; beyond it the rest is left to be reported.
const ROUNDS: usize = 32;
/// Unchanged lines shown around each change.
const CONTEXT: usize = 3;

/// A source of files in which some have been mended.
pub struct Mending<'a> {
    files: Overlay<'a>,
}

/// A file before and after.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Mended {
    /// Its text as it was read.
    pub before: Arc<str>,
    /// Its text with the safe fixes applied.
    pub after: Arc<str>,
}

impl<'a> Mending<'a> {
    /// Files as the source has them.
    #[must_use]
    pub fn of(source: &'a dyn FileSource) -> Self {
        Self {
            files: Overlay::of(source),
        }
    }

    /// The file at `path` with its safe fixes applied, nothing where there are none; `only` picks crystals by
    /// name. The other files are seen as they are kept here.
    ///
    /// # Errors
    /// Where the file cannot be read whole.
    pub fn mended(
        &self,
        analyst: &Analyst,
        path: &Path,
        only: &[String],
        cancel: &(dyn Fn() -> bool + Sync),
    ) -> Result<Option<Mended>, ReadFailure> {
        let path = normalise(path);
        let original = self.files.source.tree(&path)?;
        let start = self.files.tree(&path)?;
        let mut trial = Self {
            files: self.files.clone(),
        };
        let mut seen = FxHashSet::from_iter([Arc::clone(&start.text)]);
        let mut text = Arc::clone(&start.text);
        for _ in 0..ROUNDS {
            let Some(next) = trial.round(analyst, &path, only, cancel) else {
                break;
            };
            text = Arc::from(next);
            if !seen.insert(Arc::clone(&text)) {
                break;
            }
            trial.keep(&path, &text);
        }
        Ok((text != start.text).then(|| Mended {
            before: Arc::clone(&original.text),
            after: text,
        }))
    }

    /// Sees the file at `path` with this text from now on.
    pub fn keep(&mut self, path: &Path, text: &str) {
        self.files.keep(path, text);
    }

    /// The text after one round; nothing where no fix is left.
    fn round(
        &self,
        analyst: &Analyst,
        path: &Path,
        only: &[String],
        cancel: &(dyn Fn() -> bool + Sync),
    ) -> Option<String> {
        let analysis = analyst.analyse(&Request {
            source: &self.files,
            roots: &[path.to_owned()],
            depth: Tier::Bands,
            cancel,
        });
        applied(&analysis, analysis.files.first()?, only)
    }
}

impl Mended {
    /// What changes, as a unified diff of a file of this name.
    #[must_use]
    pub fn diff(&self, name: &str) -> String {
        TextDiff::from_lines(&*self.before, &*self.after)
            .unified_diff()
            .context_radius(CONTEXT)
            .header(&format!("a/{name}"), &format!("b/{name}"))
            .to_string()
    }
}

/// The text with those safe fixes applied that do not touch each other, the first in order of place before others.
fn applied(analysis: &Analysis, file: &FileAnalysis, only: &[String]) -> Option<String> {
    let mut edits: Vec<(Span, &str)> = Vec::new();
    for finding in file.chosen_findings(only) {
        let fix = finding.fixes.iter().find(|fix| fix.safe);
        let Some(new) = fix.and_then(|fix| located(analysis, file, fix)) else {
            continue;
        };
        if new.iter().all(|(span, _)| free(*span, &edits)) {
            edits.extend(new);
        }
    }
    if edits.is_empty() {
        return None;
    }
    edits.sort();
    let break_by = if file.tree.text.contains("\r\n") {
        "\r\n"
    } else {
        "\n"
    };
    let mut text = file.tree.text.to_string();
    for (span, new) in edits.into_iter().rev() {
        let new = new.replace("\r\n", "\n").replace('\n', break_by);
        text.replace_range(span.start as usize..span.end as usize, &new);
    }
    Some(text)
}

/// A fix as edits of the whole text; nothing where it reaches beyond this file or changes nothing.
fn located<'f>(
    analysis: &Analysis,
    file: &FileAnalysis,
    fix: &'f Fix,
) -> Option<Vec<(Span, &'f str)>> {
    let mut edits = Vec::new();
    for edit in &fix.edits {
        let (_, span) = analysis.absolute(&edit.place)?;
        let old = file.tree.text.get(span.start as usize..span.end as usize)?;
        if edit.place.file != file.file || old == edit.text || !free(span, &edits) {
            return None;
        }
        edits.push((span, edit.text.as_str()));
    }
    (!edits.is_empty()).then_some(edits)
}

/// Whether a span neither overlaps nor touches another: of two insertions at one place, the second waits a round.
fn free(span: Span, edits: &[(Span, &str)]) -> bool {
    edits
        .iter()
        .all(|(other, _)| span.end < other.start || other.end < span.start)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::syntax::{self, Tree};

    struct One(&'static str);

    impl FileSource for One {
        fn tree(&self, _: &Path) -> Result<Arc<Tree>, ReadFailure> {
            Ok(Arc::new(syntax::read(self.0)))
        }

        fn bytes(&self, _: &Path) -> Result<Arc<[u8]>, ReadFailure> {
            Err(ReadFailure::NotFound)
        }

        fn inside(&self, _: &Path) -> bool {
            true
        }
    }

    fn mended(text: &'static str, only: &[String]) -> Option<String> {
        let source = One(text);
        let mending = Mending::of(&source);
        let mended = mending.mended(&Analyst::default(), Path::new("a.cren"), only, &|| false);
        mended.ok().flatten().map(|mended| mended.after.to_string())
    }

    #[test]
    fn fixes_of_one_line_wait_for_each_other() {
        let text =
            "crystal a\n  mass 1 me\n  lattice chain 5 nm × 1\n  fourier 1 = 3 meV phase 0.5\n";
        let wanted = "crystal a\n  mass 1 me\n  lattice chain 5 nm * 1\n  fourier 1 = 3 meV phase 0.5\n  fourier -1 = 3 meV phase -0.5\n";
        assert_eq!(mended(text, &[]).as_deref(), Some(wanted));
    }

    #[test]
    fn line_ends_stay_those_of_the_file() {
        let text = "crystal a\r\n  mass 1 me\r\n  lattice chain 5 nm\r\n  fourier 1 = 3 meV\r\n";
        let wanted = format!("{text}  fourier -1 = 3 meV\r\n");
        assert_eq!(mended(text, &[]).as_deref(), Some(wanted.as_str()));
    }

    #[test]
    fn what_needs_a_look_and_what_was_not_chosen_stay() {
        assert_eq!(
            mended(
                "crystal a\n  mass 0.067 u\n  lattice chain 8 nm\n  cosine 1 = 20 meV\n",
                &[]
            ),
            None
        );
        let text = "crystal a\n  lattice chain 5 nm × 1\n  cosine 1 = 3 meV\n";
        assert_eq!(mended(text, &["b".to_owned()]), None);
    }
}
