//! What a feature looks at: a frozen document, what is known of it, and how the client counts.

use std::path::PathBuf;
use std::sync::Arc;

use tower_lsp::lsp_types::{Position, Range};

use super::abilities::Abilities;
use super::findings::Locations;
use super::positions;
use super::record::View;
use crate::report::editor_text::Tree;
use crate::report::{Analysis, Analyst, Request, Tier};
use crate::text::Span;

/// One document and all that is needed to answer a question about it.
pub(super) struct Scene {
    pub(super) view: View,
    pub(super) analyst: Arc<Analyst>,
    pub(super) abilities: Arc<Abilities>,
}

impl Scene {
    /// The document's path.
    pub(super) fn path(&self) -> PathBuf {
        self.view.file.path()
    }

    /// What the document reads as.
    pub(super) fn tree(&self) -> &Tree {
        &self.view.file.tree
    }

    /// What is known of it.
    pub(super) fn analysis(&self) -> Option<&Analysis> {
        self.view.analysis.as_deref()
    }

    /// Whether the document's bands are fully known.
    pub(super) fn settled(&self) -> bool {
        let file = self
            .analysis()
            .and_then(|analysis| analysis.file(&self.path()));
        file.is_some_and(|file| file.depth >= Tier::Bands)
    }

    /// What is known of all files of the workspace, bands aside.
    pub(super) fn workspace(&self) -> Analysis {
        let overtaken = &self.view.file.overtaken;
        self.analyst.analyse(&Request {
            source: &*self.view.files,
            roots: &self.view.files.all(),
            depth: Tier::Model,
            cancel: &|| overtaken.is_cancelled(),
        })
    }

    /// The byte of a position.
    pub(super) fn offset(&self, position: Position) -> u32 {
        positions::offset(self.view.file.lines(), position, self.abilities.encoding())
    }

    /// The bytes of a range.
    pub(super) fn span(&self, range: Range) -> Span {
        positions::span(self.view.file.lines(), range, self.abilities.encoding())
    }

    /// The position of a byte.
    pub(super) fn position(&self, offset: u32) -> Position {
        positions::position(self.view.file.lines(), offset, self.abilities.encoding())
    }

    /// The range of some bytes.
    pub(super) fn range(&self, span: Span) -> Range {
        positions::range(self.view.file.lines(), span, self.abilities.encoding())
    }

    /// Locations in this file and others.
    pub(super) fn locations(&self) -> Option<Locations<'_>> {
        Some(Locations::new(
            self.analysis()?,
            &self.view.files,
            &self.abilities,
        ))
    }
}
