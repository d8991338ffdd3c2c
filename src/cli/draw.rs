//! `crenate draw PATH… [-o DIR]`

use std::collections::HashSet;
use std::fs;
use std::path::{Path, PathBuf};

use clap::Args;

use super::desk::Desk;
use super::{Status, files, in_order, output};
use crate::report::{Tier, svg};

#[derive(Debug, Args)]
pub struct Arguments {
    /// Files and folders to draw; `-` reads standard input.
    #[arg(required = true)]
    paths: Vec<PathBuf>,
    /// Where the pictures go, one for each crystal.
    #[arg(short, long, value_name = "DIR", default_value = ".")]
    output: PathBuf,
    /// Draw only the crystal of this name; may be given several times.
    #[arg(long, value_name = "NAME")]
    only: Vec<String>,
}

/// A file's pictures: the name of each, and the picture or why there is none.
type Pictures = Vec<(String, Result<String, String>)>;

/// Draws crystals.
pub fn run(arguments: &Arguments) -> Status {
    let selection = files::select(&arguments.paths, None);
    let mut status = Status::Clean;
    for failure in &selection.failures {
        output::message(failure);
        status = Status::Failed;
    }
    if let Err(error) = fs::create_dir_all(&arguments.output) {
        output::message(&format!("{}: {error}", arguments.output.display()));
        return Status::Failed;
    }
    let desk = Desk::of(&arguments.paths);
    let mut taken = HashSet::new();
    let mut drawn = 0;
    let outcome = in_order::each(
        &selection.files,
        |path, cancel| pictures(arguments, &desk, path, cancel),
        |pictures| {
            for (name, picture) in pictures {
                match picture.and_then(|picture| {
                    write(&arguments.output, &free(&name, &mut taken), &picture)
                }) {
                    Ok(path) => {
                        drawn += 1;
                        output::result(&format!("{path}\n"))?;
                    }
                    Err(why) => output::message(&format!("{name}: {why}")),
                }
            }
            Ok(())
        },
    );
    if drawn == 0 {
        output::message("nothing was drawn");
        status = Status::Failed;
    }
    output::written(outcome, status)
}

fn pictures(
    arguments: &Arguments,
    desk: &Desk,
    path: &Path,
    cancel: &(dyn Fn() -> bool + Sync),
) -> Pictures {
    let file = match desk.analysed(path, Tier::Model, cancel) {
        Ok((_, file)) => file,
        Err(why) => return vec![(path.display().to_string(), Err(why))],
    };
    let stem = path
        .file_stem()
        .map_or_else(String::new, |stem| stem.to_string_lossy().into_owned());
    let stem = if stem == "-" {
        "input".to_owned()
    } else {
        stem
    };
    file.crystals(&arguments.only)
        .map(|(_, crystal)| {
            (
                format!("{stem}-{}", crystal.name),
                svg::draw(&desk.analyst, crystal, cancel),
            )
        })
        .collect()
}

/// A file name that is not taken yet.
fn free(name: &str, taken: &mut HashSet<String>) -> String {
    let mut free = name.to_owned();
    let mut number = 2;
    while !taken.insert(free.clone()) {
        free = format!("{name}-{number}");
        number += 1;
    }
    free
}

fn write(folder: &Path, name: &str, picture: &str) -> Result<String, String> {
    let path = folder.join(format!("{name}.svg"));
    match fs::write(&path, picture) {
        Ok(()) => Ok(path.display().to_string()),
        Err(error) => Err(format!("{}: {error}", path.display())),
    }
}
