//! `crenate tidy PATH… [--check]`

use std::path::{Path, PathBuf};

use clap::Args;

use super::{Status, files, in_order, output, replace};
use crate::report::disk::{Disk, STANDARD_INPUT};
use crate::report::{FileSource, tidy};

#[derive(Debug, Args)]
pub struct Arguments {
    /// Files and folders to rewrite; `-` reads standard input and writes standard output.
    #[arg(required = true)]
    paths: Vec<PathBuf>,
    /// Change nothing; name the files that would change, and fail if there are any.
    #[arg(long)]
    check: bool,
}

enum Done {
    Same,
    Changed(String),
    Printed(String),
    Failed(String),
}

/// Rewrites files in the standard layout.
pub fn run(arguments: &Arguments) -> Status {
    let selection = files::select(&arguments.paths, None);
    let mut status = Status::Clean;
    for failure in &selection.failures {
        output::message(failure);
        status = Status::Failed;
    }
    let disk = Disk::within(&[]);
    let outcome = in_order::each(
        &selection.files,
        |path, _| one(path, &disk, arguments.check),
        |done| {
            match done {
                Done::Same => {}
                Done::Printed(text) => output::result(&text)?,
                Done::Changed(name) => {
                    output::result(&format!("{name}\n"))?;
                    if arguments.check {
                        status = status.max(Status::Found);
                    }
                }
                Done::Failed(why) => {
                    output::message(&why);
                    status = Status::Failed;
                }
            }
            Ok(())
        },
    );
    output::written(outcome, status)
}

fn one(path: &Path, disk: &Disk, check: bool) -> Done {
    let failed = |why: String| Done::Failed(format!("{}: {why}", path.display()));
    let tree = match disk.tree(path) {
        Ok(tree) => tree,
        Err(failure) => return failed(failure.words()),
    };
    let tidied = tidy::tidy(&tree);
    if path == Path::new(STANDARD_INPUT) && !check {
        return Done::Printed(tidied);
    }
    if *tidied == *tree.text {
        return Done::Same;
    }
    let name = path.display().to_string();
    match check {
        true => Done::Changed(name),
        false => match replace::replace(path, &tidied) {
            Ok(()) => Done::Changed(name),
            Err(error) => failed(error.to_string()),
        },
    }
}
