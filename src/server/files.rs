//! All files as they are at one moment: open buffers before the disk.

use std::collections::HashMap;
use std::fs::{self, Metadata};
use std::io::ErrorKind;
use std::path::{Path, PathBuf};
use std::sync::{Arc, Mutex, OnceLock, PoisonError};
use std::time::SystemTime;

use tower_lsp::lsp_types::Url;

use super::cancel::Cancel;
use crate::report::disk;
use crate::report::editor_links::links;
use crate::report::editor_text::{Tree, normalise, read, reread};
use crate::report::{FileSource, ReadFailure};
use crate::text::{Document, LineIndex};

/// Files of one folder that searches look at, at most.
const MOST_FILES: usize = 10_000;

/// Where the open documents, the folders and the disk meet.
#[derive(Clone, Default)]
pub(super) struct Files {
    /// Open documents by path.
    pub(super) open: HashMap<PathBuf, Arc<OpenFile>>,
    /// Workspace folders.
    pub(super) folders: Vec<PathBuf>,
    /// What was read from the disk.
    pub(super) disk: Arc<Disk>,
    /// Which files the files in the folders use, as they are on the disk.
    pub(super) uses: Arc<Uses>,
}

/// Each file's path and the paths that it uses.
pub(super) type Uses = HashMap<PathBuf, Vec<PathBuf>>;

/// An open document as it is at one moment.
#[derive(Clone)]
pub(super) struct OpenFile {
    /// What the client calls it.
    pub(super) uri: Url,
    /// The client's count of its changes.
    pub(super) version: i32,
    /// What it reads as, its text included.
    pub(super) tree: Arc<Tree>,
    /// Set once an edit has made this out of date.
    pub(super) overtaken: Cancel,
    lines: OnceLock<Arc<LineIndex>>,
}

impl OpenFile {
    /// The document as it is now.
    pub(super) fn new(uri: Url, version: i32, document: &Document) -> Self {
        let tree = Arc::new(read(&document.text()));
        Self {
            uri,
            version,
            tree,
            overtaken: Cancel::default(),
            lines: OnceLock::new(),
        }
    }

    /// The same document after edits; sections that they left alone are shared.
    pub(super) fn after(&self, document: &Document) -> Self {
        let tree = Arc::new(reread(&document.text(), &self.tree));
        Self {
            tree,
            lines: OnceLock::new(),
            ..self.clone()
        }
    }

    /// The same document under another version; its text is still to follow.
    pub(super) fn with_version(&self, version: i32) -> Self {
        Self {
            version,
            overtaken: Cancel::default(),
            ..self.clone()
        }
    }

    /// Its lines, counted when first asked for.
    pub(super) fn lines(&self) -> &LineIndex {
        self.lines
            .get_or_init(|| Arc::new(LineIndex::new(&self.tree.text)))
    }

    /// Its path.
    pub(super) fn path(&self) -> PathBuf {
        path_of(&self.uri)
    }
}

impl Files {
    /// What the client calls a file.
    pub(super) fn uri(&self, path: &Path) -> Option<Url> {
        match self.open.get(path) {
            Some(file) => Some(file.uri.clone()),
            None => Url::from_file_path(path).ok(),
        }
    }

    /// The open documents and the format's files in the folders, each once, in order.
    pub(super) fn all(&self) -> Vec<PathBuf> {
        let mut paths: Vec<PathBuf> = self.open.keys().cloned().collect();
        for folder in &self.folders {
            let walk = ignore::WalkBuilder::new(folder).build().flatten();
            let ours = walk.filter(|entry| {
                entry
                    .path()
                    .extension()
                    .is_some_and(|extension| extension == "cren")
            });
            paths.extend(ours.map(ignore::DirEntry::into_path).take(MOST_FILES));
        }
        paths.sort_unstable();
        paths.dedup();
        paths
    }

    fn in_folder(&self, path: &Path) -> bool {
        self.folders.iter().any(|folder| path.starts_with(folder))
    }

    /// What the files in the folders use; reads them all.
    pub(super) fn survey(&self) -> Uses {
        let used = |path: PathBuf| {
            let uses: Vec<PathBuf> = disk::uses(&path).into_iter().collect();
            (!uses.is_empty()).then_some((path, uses))
        };
        self.all().into_iter().filter_map(used).collect()
    }

    /// Whether a document that belongs to no folder lies at or above the path.
    fn beside_loose_file(&self, path: &Path) -> bool {
        let loose = self.open.keys().filter(|open| !self.in_folder(open));
        loose
            .filter_map(|open| open.parent())
            .any(|folder| path.starts_with(folder))
    }
}

impl FileSource for Files {
    fn tree(&self, path: &Path) -> Result<Arc<Tree>, ReadFailure> {
        match self.open.get(path) {
            Some(file) => Ok(Arc::clone(&file.tree)),
            None => self.disk.tree(path),
        }
    }

    fn bytes(&self, path: &Path) -> Result<Arc<[u8]>, ReadFailure> {
        match self.open.get(path) {
            Some(file) => Ok(Arc::from(file.tree.text.as_bytes())),
            None => self.disk.bytes(path),
        }
    }

    fn inside(&self, path: &Path) -> bool {
        self.in_folder(path) || self.open.contains_key(path) || self.beside_loose_file(path)
    }

    fn is_used(&self, path: &Path) -> bool {
        let on_disk = self
            .uses
            .iter()
            .filter(|(user, _)| !self.open.contains_key(*user));
        let mut on_disk = on_disk.filter(|(_, used)| used.iter().any(|used| used == path));
        let in_buffer = |file: &Arc<OpenFile>| {
            links(&file.tree, &file.path())
                .iter()
                .any(|(_, used)| used == path)
        };
        on_disk.next().is_some() || self.open.values().any(in_buffer)
    }
}

/// Files of the disk, kept while they do not change there.
#[derive(Default)]
pub(super) struct Disk {
    trees: Mutex<HashMap<PathBuf, Stamped<Tree>>>,
    tables: Mutex<HashMap<PathBuf, Stamped<[u8]>>>,
}

/// What was read, with the age and the size that the file had.
struct Stamped<T: ?Sized> {
    stamp: (Option<SystemTime>, u64),
    content: Arc<T>,
}

impl Disk {
    /// Forgets files, as they may have changed without looking so.
    pub(super) fn forget(&self, paths: &[PathBuf]) {
        let mut trees = self.trees.lock().unwrap_or_else(PoisonError::into_inner);
        let mut tables = self.tables.lock().unwrap_or_else(PoisonError::into_inner);
        for path in paths {
            trees.remove(path);
            tables.remove(path);
        }
    }

    fn tree(&self, path: &Path) -> Result<Arc<Tree>, ReadFailure> {
        kept(&self.trees, path, |bytes| {
            match std::str::from_utf8(&bytes) {
                Ok(text) => Ok(Arc::new(read(text))),
                Err(_) => Err(ReadFailure::NotText),
            }
        })
    }

    fn bytes(&self, path: &Path) -> Result<Arc<[u8]>, ReadFailure> {
        kept(&self.tables, path, |bytes| Ok(Arc::from(bytes)))
    }
}

/// What is kept of a file, or what is made of it now.
fn kept<T: ?Sized>(
    known: &Mutex<HashMap<PathBuf, Stamped<T>>>,
    path: &Path,
    make: impl FnOnce(Vec<u8>) -> Result<Arc<T>, ReadFailure>,
) -> Result<Arc<T>, ReadFailure> {
    let metadata = fs::metadata(path).map_err(|error| failure(&error))?;
    // A pipe or a device could keep us waiting for ever.
    if !metadata.is_file() {
        return Err(ReadFailure::Other("it is not a file".to_owned()));
    }
    let stamp = stamp(&metadata);
    let mut known = known.lock().unwrap_or_else(PoisonError::into_inner);
    if let Some(kept) = known.get(path).filter(|kept| kept.stamp == stamp) {
        return Ok(Arc::clone(&kept.content));
    }
    let content = make(fs::read(path).map_err(|error| failure(&error))?)?;
    known.insert(
        path.to_owned(),
        Stamped {
            stamp,
            content: Arc::clone(&content),
        },
    );
    Ok(content)
}

fn stamp(metadata: &Metadata) -> (Option<SystemTime>, u64) {
    (metadata.modified().ok(), metadata.len())
}

fn failure(error: &std::io::Error) -> ReadFailure {
    match error.kind() {
        ErrorKind::NotFound => ReadFailure::NotFound,
        _ => ReadFailure::Other(error.to_string()),
    }
}

/// The path of a document; one that is no file has a path of its own that no file has.
pub(super) fn path_of(uri: &Url) -> PathBuf {
    match uri.to_file_path() {
        Ok(path) => normalise(&path),
        Err(()) => PathBuf::from(uri.as_str()),
    }
}
