//! `crenate lint --mend`: the safe fixes, written to the files.
//!
//! All texts are worked out before the first file is written, so that what comes
//! of one never depends on how far the others are.

use std::collections::BTreeMap;
use std::io;
use std::path::{Path, PathBuf};

use super::files::{self, Selection};
use super::{Status, in_order, output, replace};
use crate::report::ReadFailure;
use crate::report::analyst::Analyst;
use crate::report::disk::{self, Disk, STANDARD_INPUT};
use crate::report::locate::shown_path;
use crate::report::mend::{Mended, Mending};

/// A mended file may make a fix in another one possible; so many times all are looked at.
const PASSES: usize = 8;

/// What to mend.
pub struct Chosen<'a> {
    /// The files.
    pub selection: &'a Selection,
    /// Where `use` may reach.
    pub reach: &'a [PathBuf],
    /// Crystals by name; all where it is empty.
    pub only: &'a [String],
}

type Changes = BTreeMap<PathBuf, Mended>;

/// Applies the safe fixes; dry, it only prints what they would change, and finds something where there is any.
pub fn run(chosen: &Chosen<'_>, dry: bool) -> Status {
    let files = &chosen.selection.files;
    if files.iter().any(|file| file == Path::new(STANDARD_INPUT)) {
        output::message(
            "`--mend` rewrites files and cannot rewrite standard input; name a file instead of `-`",
        );
        return Status::Failed;
    }
    let (changes, mut status) = match changes(chosen) {
        Ok(changes) => changes,
        Err(error) => {
            output::message(&format!("cannot mend: {error}"));
            return Status::Failed;
        }
    };
    if dry {
        if !chosen.selection.failures.is_empty() {
            status = Status::Failed;
        }
        return print(&changes, status);
    }
    for (path, mended) in &changes {
        match write(path, mended) {
            Ok(()) => output::message(&format!("mended {}", shown_path(path))),
            Err(why) => {
                output::message(&format!("{}: {why}", path.display()));
                status = Status::Failed;
            }
        }
    }
    status
}

/// The files that change, with their texts; failed where a file could not be read.
fn changes(chosen: &Chosen<'_>) -> io::Result<(Changes, Status)> {
    let disk = Disk::within(chosen.reach);
    let analyst = Analyst::knowing_used(files::used(&chosen.selection.all));
    let mut mending = Mending::of(&disk);
    let mut changes = Changes::new();
    let mut status = Status::Clean;
    for _ in 0..PASSES {
        let mut fresh: Vec<(PathBuf, Mended)> = Vec::new();
        in_order::each(
            &chosen.selection.files,
            |path, cancel| {
                let mended = mending.mended(&analyst, path, chosen.only, cancel);
                (path.to_owned(), mended)
            },
            |(path, mended): (PathBuf, Result<Option<Mended>, ReadFailure>)| {
                match mended {
                    Ok(mended) => fresh.extend(mended.map(|mended| (path, mended))),
                    // The report that follows says why.
                    Err(_) => status = Status::Failed,
                }
                Ok(())
            },
        )?;
        if fresh.is_empty() {
            break;
        }
        for (path, mended) in fresh {
            mending.keep(&path, &mended.after);
            changes.insert(path, mended);
        }
    }
    Ok((changes, status))
}

fn print(changes: &Changes, status: Status) -> Status {
    let outcome = changes
        .iter()
        .try_for_each(|(path, mended)| output::result(&mended.diff(&shown_path(path))));
    let found = if changes.is_empty() {
        Status::Clean
    } else {
        Status::Found
    };
    output::written(outcome, status.max(found))
}

/// Writes a mended file, unless it is no longer the one that was read.
fn write(path: &Path, mended: &Mended) -> Result<(), String> {
    let now = disk::text(path).map_err(|failure| failure.words())?;
    if *now != *mended.before {
        return Err("it changed while it was being mended, and was left alone".to_owned());
    }
    replace::replace(path, &mended.after).map_err(|error| error.to_string())
}
