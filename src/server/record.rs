//! An open document as the owner keeps it, and what it gives out of it.

use std::sync::Arc;
use std::time::Instant;

use tokio::sync::oneshot;
use tower_lsp::lsp_types::{Diagnostic, Url};

use super::checker::{Checked, Depth};
use super::files::{Files, OpenFile};
use crate::report::Analysis;
use crate::text::Document;

/// A wish to look at a document as it is at this point of the conversation.
pub(super) struct Want {
    /// Which.
    pub(super) uri: Url,
    /// What must be known of it; `None`: the text is enough.
    pub(super) depth: Option<Depth>,
    /// Where the answer goes.
    pub(super) reply: oneshot::Sender<Answer>,
}

/// What comes of a [`Want`].
pub(super) enum Answer {
    /// The document.
    View(View),
    /// It changed while the answer was being prepared.
    Stale,
    /// No such document is open, or it could not be analysed.
    Nothing,
}

/// A document and its surroundings, frozen.
#[derive(Clone)]
pub(super) struct View {
    /// All files.
    pub(super) files: Arc<Files>,
    /// The document.
    pub(super) file: Arc<OpenFile>,
    /// What is known of it, where that was wanted.
    pub(super) analysis: Option<Arc<Analysis>>,
}

/// An open document.
pub(super) struct Record {
    pub(super) document: Document,
    pub(super) file: Arc<OpenFile>,
    /// Whether `document` is ahead of `file`.
    pub(super) dirty: bool,
    /// The newest results, whatever they are of.
    pub(super) cheap: Option<Checked>,
    pub(super) rough: Option<Checked>,
    pub(super) dear: Option<Checked>,
    pub(super) waiting: Vec<Want>,
    /// When the cheap findings are shown, if the dear ones do not come before.
    pub(super) due: Option<Instant>,
    /// What the client shows.
    pub(super) shown: Option<(i32, Arc<[Diagnostic]>)>,
    /// Whether the client was answered before the bands were known.
    pub(super) owes: bool,
}

impl Record {
    /// The newest result of at least this depth, if nothing has changed since.
    pub(super) fn known(&self, depth: Depth, generation: u64) -> Option<&Checked> {
        let newest = [
            (Depth::Dear, &self.dear),
            (Depth::Rough, &self.rough),
            (Depth::Cheap, &self.cheap),
        ];
        newest
            .into_iter()
            .filter(|(known, _)| *known >= depth)
            .filter_map(|(_, checked)| checked.as_ref())
            .find(|checked| checked.generation == generation)
    }
}

impl Want {
    pub(super) fn send(self, answer: Answer) {
        // Whoever asked may have gone.
        let _ = self.reply.send(answer);
    }
}
