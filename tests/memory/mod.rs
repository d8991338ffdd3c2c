//! Files in memory.
#![allow(dead_code, missing_docs)]

use std::collections::BTreeMap;
use std::path::{Path, PathBuf};
use std::sync::Arc;

use crenate::model::{FileSource, ReadFailure};
use crenate::syntax::{Tree, read};

/// Files by path. All paths are in the workspace but those that begin with `..`, or that `outside` is true of.
#[derive(Clone, Default)]
pub struct Memory {
    files: BTreeMap<PathBuf, Vec<u8>>,
    outside: Option<fn(&Path) -> bool>,
}

impl Memory {
    pub fn of<P: Into<PathBuf>, B: Into<Vec<u8>>>(files: impl IntoIterator<Item = (P, B)>) -> Self {
        let files = files.into_iter();
        Self {
            files: files
                .map(|(path, bytes)| (path.into(), bytes.into()))
                .collect(),
            outside: None,
        }
    }

    #[must_use]
    pub fn with(mut self, path: &str, text: &str) -> Self {
        self.files.insert(path.into(), text.into());
        self
    }

    #[must_use]
    pub fn but(self, outside: fn(&Path) -> bool) -> Self {
        Self {
            outside: Some(outside),
            ..self
        }
    }

    fn found(&self, path: &Path) -> Result<&[u8], ReadFailure> {
        self.files
            .get(path)
            .map(Vec::as_slice)
            .ok_or(ReadFailure::NotFound)
    }
}

impl FileSource for Memory {
    fn tree(&self, path: &Path) -> Result<Arc<Tree>, ReadFailure> {
        let text = std::str::from_utf8(self.found(path)?).map_err(|_| ReadFailure::NotText)?;
        Ok(Arc::new(read(text)))
    }

    fn bytes(&self, path: &Path) -> Result<Arc<[u8]>, ReadFailure> {
        Ok(Arc::from(self.found(path)?))
    }

    fn inside(&self, path: &Path) -> bool {
        match self.outside {
            Some(outside) => !outside(path),
            None => !path.starts_with(".."),
        }
    }
}
