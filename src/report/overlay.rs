//! Files as a source has them, but for some with other texts.

use std::path::{Path, PathBuf};
use std::sync::Arc;

use rustc_hash::FxHashMap;

use crate::model::{FileSource, ReadFailure, normalise};
use crate::syntax::{self, Tree};

/// A source over another one.
#[derive(Clone)]
pub(super) struct Overlay<'a> {
    /// Where all other files come from.
    pub source: &'a dyn FileSource,
    texts: FxHashMap<PathBuf, Arc<Tree>>,
}

impl<'a> Overlay<'a> {
    /// Files as the source has them.
    pub fn of(source: &'a dyn FileSource) -> Self {
        Self {
            source,
            texts: FxHashMap::default(),
        }
    }

    /// Sees the file at `path` with this text from now on.
    pub fn keep(&mut self, path: &Path, text: &str) {
        self.texts
            .insert(normalise(path), Arc::new(syntax::read(text)));
    }
}

impl FileSource for Overlay<'_> {
    fn tree(&self, path: &Path) -> Result<Arc<Tree>, ReadFailure> {
        match self.texts.get(path) {
            Some(tree) => Ok(Arc::clone(tree)),
            None => self.source.tree(path),
        }
    }

    fn bytes(&self, path: &Path) -> Result<Arc<[u8]>, ReadFailure> {
        self.source.bytes(path)
    }

    fn inside(&self, path: &Path) -> bool {
        self.source.inside(path)
    }

    fn is_used(&self, path: &Path) -> bool {
        self.source.is_used(path)
    }
}
