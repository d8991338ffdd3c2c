//! Which files a command works on.

use std::collections::HashSet;
use std::fs;
use std::path::{Path, PathBuf};

use ignore::WalkBuilder;
use rayon::prelude::*;
use rustc_hash::FxHashSet;

use crate::report::disk::{self, STANDARD_INPUT};

/// The files to work on, in a stable order.
pub struct Selection {
    /// The files of this part.
    pub files: Vec<PathBuf>,
    /// All files found, of the other parts too.
    pub all: Vec<PathBuf>,
    /// What could not be read, in words.
    pub failures: Vec<String>,
}

/// One of N parts of the files.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Shard {
    /// Which, from 1.
    pub part: usize,
    /// How many.
    pub parts: usize,
}

impl std::str::FromStr for Shard {
    type Err = String;

    fn from_str(text: &str) -> Result<Self, String> {
        let wrong = || format!("`{text}` is not of the form I/N with I from 1 to N, as in 2/8");
        let (part, parts) = text.split_once('/').ok_or_else(wrong)?;
        let part: usize = part.parse().map_err(|_| wrong())?;
        let parts: usize = parts.parse().map_err(|_| wrong())?;
        match part >= 1 && part <= parts {
            true => Ok(Self { part, parts }),
            false => Err(wrong()),
        }
    }
}

/// Files as given, folders walked for `*.cren`: ignore files heeded, links not followed. A file named twice is taken once.
#[must_use]
pub fn select(paths: &[PathBuf], shard: Option<Shard>) -> Selection {
    let mut selection = Selection {
        files: Vec::new(),
        all: Vec::new(),
        failures: Vec::new(),
    };
    for path in paths {
        if path.is_dir() {
            walk(path, &mut selection);
        } else if path.exists() || path == Path::new(STANDARD_INPUT) {
            selection.all.push(path.clone());
        } else {
            selection.failures.push(format!(
                "{}: there is no such file or folder",
                path.display()
            ));
        }
    }
    let mut seen = HashSet::new();
    selection
        .all
        .retain(|path| seen.insert(fs::canonicalize(path).unwrap_or_else(|_| path.clone())));
    let whole = Shard { part: 1, parts: 1 };
    let shard = shard.unwrap_or(whole);
    let chosen = selection
        .all
        .iter()
        .skip(shard.part - 1)
        .step_by(shard.parts);
    selection.files = chosen.cloned().collect();
    selection
}

fn walk(folder: &Path, selection: &mut Selection) {
    let walk = WalkBuilder::new(folder)
        .require_git(false)
        .follow_links(false)
        .sort_by_file_path(Path::cmp)
        .build();
    for entry in walk {
        match entry {
            Ok(entry) => {
                let regular = entry.file_type().is_some_and(|kind| kind.is_file());
                if regular
                    && entry
                        .path()
                        .extension()
                        .is_some_and(|extension| extension == "cren")
                {
                    selection.all.push(entry.into_path());
                }
            }
            Err(error) => selection.failures.push(error.to_string()),
        }
    }
}

/// Where `use` may reach: the folder we are in, those given, and those of the files given.
#[must_use]
pub fn reach(paths: &[PathBuf]) -> Vec<PathBuf> {
    let given = paths.iter().map(|path| match path.is_dir() {
        true => path.clone(),
        false => match path.parent() {
            Some(folder) if !folder.as_os_str().is_empty() => folder.to_owned(),
            _ => PathBuf::from("."),
        },
    });
    std::iter::once(PathBuf::from(".")).chain(given).collect()
}

/// The files that others use.
#[must_use]
pub fn used(files: &[PathBuf]) -> FxHashSet<PathBuf> {
    files
        .par_iter()
        .flat_map_iter(|file| disk::uses(file))
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_shard_is_one_of_its_parts() {
        assert_eq!("2/8".parse(), Ok(Shard { part: 2, parts: 8 }));
        for wrong in ["0/2", "3/2", "1", "a/b", "1/0", "-1/2", ""] {
            assert!(wrong.parse::<Shard>().is_err(), "{wrong}");
        }
    }
}
