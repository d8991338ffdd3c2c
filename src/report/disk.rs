//! Files from the disk, and from standard input under the name `-`.

use std::fs;
use std::io::{ErrorKind, Read};
use std::path::{Path, PathBuf};
use std::sync::{Arc, Mutex, OnceLock, PoisonError};

use rustc_hash::FxHashMap;

use crate::model::{FileSource, ReadFailure, normalise};
use crate::syntax::{self, StatementKind, Tree};

/// The name under which standard input is read.
pub const STANDARD_INPUT: &str = "-";
/// Trees are kept until their texts add up to this many bytes; so memory does not grow with the number of files.
const KEPT_BYTES: usize = 1 << 20;
/// Files and tables beyond this are not read.
const LARGEST_FILE: u64 = 256 << 20;

/// The disk. A file that several others use is read once, as long as there is room.
#[derive(Default)]
pub struct Disk {
    folders: Vec<PathBuf>,
    trees: Mutex<Kept>,
    standard_input: OnceLock<Result<Arc<Tree>, ReadFailure>>,
}

#[derive(Default)]
struct Kept {
    trees: FxHashMap<PathBuf, Arc<Tree>>,
    bytes: usize,
}

impl Disk {
    /// The disk, where `use` may reach what lies under one of these folders, or in the version-controlled
    /// tree around one of them.
    #[must_use]
    pub fn within(folders: &[PathBuf]) -> Self {
        let roots = folders.iter().filter_map(|folder| {
            let real = fs::canonicalize(folder).ok()?;
            Some(repository(&real).unwrap_or(real))
        });
        Self {
            folders: roots.collect(),
            ..Self::default()
        }
    }

    fn keep(&self, path: &Path, tree: &Arc<Tree>) {
        let mut kept = self.trees.lock().unwrap_or_else(PoisonError::into_inner);
        if kept.bytes + tree.text.len() > KEPT_BYTES {
            *kept = Kept::default();
        }
        kept.bytes += tree.text.len();
        kept.trees.insert(path.to_owned(), Arc::clone(tree));
    }
}

/// The nearest folder upward that is under version control.
fn repository(folder: &Path) -> Option<PathBuf> {
    let mut folders = folder.ancestors();
    folders
        .find(|folder| folder.join(".git").exists())
        .map(Path::to_owned)
}

impl FileSource for Disk {
    fn tree(&self, path: &Path) -> Result<Arc<Tree>, ReadFailure> {
        if path == Path::new(STANDARD_INPUT) {
            return self.standard_input.get_or_init(read_standard_input).clone();
        }
        {
            let kept = self.trees.lock().unwrap_or_else(PoisonError::into_inner);
            if let Some(tree) = kept.trees.get(path) {
                return Ok(Arc::clone(tree));
            }
        }
        let tree = Arc::new(syntax::read(&text(path)?));
        self.keep(path, &tree);
        Ok(tree)
    }

    fn bytes(&self, path: &Path) -> Result<Arc<[u8]>, ReadFailure> {
        bytes(path).map(Arc::from)
    }

    fn inside(&self, path: &Path) -> bool {
        // The real path, so that a link cannot lead out of the workspace. A file that is not there is judged
        // by its folder, so that the finding says that it is missing.
        let real = fs::canonicalize(path).ok().or_else(|| {
            let folder = path
                .parent()
                .filter(|folder| !folder.as_os_str().is_empty());
            fs::canonicalize(folder.unwrap_or(Path::new("."))).ok()
        });
        real.is_none_or(|real| self.folders.iter().any(|folder| real.starts_with(folder)))
    }
}

fn read_standard_input() -> Result<Arc<Tree>, ReadFailure> {
    let mut bytes = Vec::new();
    let read = std::io::stdin().lock().read_to_end(&mut bytes);
    read.map_err(|error| ReadFailure::Other(error.to_string()))?;
    let text = String::from_utf8(bytes).map_err(|_| ReadFailure::NotText)?;
    Ok(Arc::new(syntax::read(&text)))
}

/// The text of a file.
///
/// # Errors
/// [`ReadFailure`] where it cannot be read as text.
pub fn text(path: &Path) -> Result<String, ReadFailure> {
    String::from_utf8(bytes(path)?).map_err(|_| ReadFailure::NotText)
}

fn bytes(path: &Path) -> Result<Vec<u8>, ReadFailure> {
    let about = fs::metadata(path).map_err(|error| failure(&error))?;
    if about.is_dir() {
        return Err(ReadFailure::Other("it is a folder".to_owned()));
    }
    if !about.is_file() {
        return Err(ReadFailure::Other("it is no regular file".to_owned()));
    }
    if about.len() > LARGEST_FILE {
        return Err(ReadFailure::Other(format!(
            "it is larger than {} MB",
            LARGEST_FILE >> 20
        )));
    }
    fs::read(path).map_err(|error| failure(&error))
}

fn failure(error: &std::io::Error) -> ReadFailure {
    match error.kind() {
        ErrorKind::NotFound => ReadFailure::NotFound,
        ErrorKind::PermissionDenied => ReadFailure::Other("reading it is not permitted".to_owned()),
        _ => ReadFailure::Other(error.to_string()),
    }
}

/// The files that a file uses, read from its preamble alone; none where it cannot be read.
#[must_use]
pub fn uses(path: &Path) -> Vec<PathBuf> {
    let Ok(text) = text(path) else {
        return Vec::new();
    };
    let preamble: Vec<&str> = text
        .lines()
        .take_while(|line| !matches!(line.split_whitespace().next(), Some("material" | "crystal")))
        .collect();
    let preamble = preamble.join("\n");
    if !preamble.contains("use") {
        return Vec::new();
    }
    let tree = syntax::read(&preamble);
    let statements = tree
        .entries
        .iter()
        .flat_map(|entry| &entry.section.statements);
    let folder = path.parent().unwrap_or(Path::new(""));
    statements
        .filter_map(|statement| match &statement.kind {
            StatementKind::Use(file) => Some(normalise(&folder.join(&file.text))),
            _ => None,
        })
        .collect()
}
