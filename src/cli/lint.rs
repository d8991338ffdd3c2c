//! `crenate lint [PATH…]`

use std::io;
use std::path::{Path, PathBuf};

use clap::{Args, ValueEnum};

use super::desk::Desk;
use super::files::{self, Selection, Shard};
use super::{FailOn, Status, in_order, mend, output};
use crate::report::lint_text::{self, Tally};
use crate::report::locate::Locator;
use crate::report::paint::Paint;
use crate::report::{Level, Tier, junit, lint_json, sarif};

#[derive(Debug, Args)]
pub struct Arguments {
    /// Files and folders to check; `-` reads standard input.
    #[arg(default_value = ".")]
    paths: Vec<PathBuf>,
    /// How to tell what is found.
    #[arg(long, value_enum, default_value_t = Format::Text)]
    format: Format,
    /// From which level on a finding makes the command fail.
    #[arg(long, value_enum, default_value_t = FailOn::Error, value_name = "LEVEL")]
    fail_on: FailOn,
    /// Look only at the crystal of this name; may be given several times.
    #[arg(long, value_name = "NAME")]
    only: Vec<String>,
    /// Take the I-th of N parts of the files.
    #[arg(long, value_name = "I/N")]
    shard: Option<Shard>,
    /// Apply the safe fixes to the files first, then report what is left.
    #[arg(long)]
    mend: bool,
    /// With `--mend`: change nothing and print what would change as a unified diff; fail if there is any.
    #[arg(long, requires = "mend")]
    dry_run: bool,
}

#[derive(Clone, Copy, Debug, PartialEq, Eq, ValueEnum)]
enum Format {
    /// For people.
    Text,
    /// The schema `crenate-lint-1`.
    Json,
    /// SARIF 2.1.0.
    Sarif,
    /// JUnit XML: a case a file and a case a target.
    Junit,
}

/// What one file came to.
struct Piece {
    told: Told,
    tally: Tally,
    chosen: bool,
    failure: Option<String>,
}

enum Told {
    Text(String),
    Json(Vec<String>),
    Sarif(Vec<serde_json::Value>),
    Junit(Option<Box<quick_junit::TestSuite>>),
}

/// Checks files and prints what is found.
pub fn run(arguments: &Arguments) -> Status {
    let selection = files::select(&arguments.paths, arguments.shard);
    for failure in &selection.failures {
        output::message(failure);
    }
    let mut mended = Status::Clean;
    if arguments.mend {
        let chosen = mend::Chosen {
            selection: &selection,
            reach: &files::reach(&arguments.paths),
            only: &arguments.only,
        };
        match mend::run(&chosen, arguments.dry_run) {
            status if arguments.dry_run => return status,
            Status::Failed => mended = Status::Failed,
            _ => {}
        }
    }
    let mut printer = Printer::new(arguments, &selection);
    printer.failed |= mended == Status::Failed;
    let outcome = check(arguments, &selection, &mut printer);
    let status = printer.status(arguments, &selection);
    output::written(outcome, status)
}

fn check(arguments: &Arguments, selection: &Selection, printer: &mut Printer) -> io::Result<()> {
    let desk = Desk::knowing(&arguments.paths, selection);
    let paint = output::paint();
    printer.begin()?;
    in_order::each(
        &selection.files,
        |path, cancel| piece(arguments, &desk, paint, path, cancel),
        |piece| printer.take(piece),
    )?;
    printer.end(paint)
}

fn piece(
    arguments: &Arguments,
    desk: &Desk,
    paint: Paint,
    path: &Path,
    cancel: &(dyn Fn() -> bool + Sync),
) -> Piece {
    let (analysis, file) = match desk.analysed(path, Tier::Bands, cancel) {
        Ok(analysed) => analysed,
        Err(why) => return Piece::failed(arguments.format, path, &why),
    };
    let locator = Locator::new(&analysis);
    let findings = file.chosen_findings(&arguments.only);
    let mut tally = Tally::default();
    findings.iter().for_each(|finding| tally.add(finding.level));
    let told = match arguments.format {
        Format::Text => Told::Text(lint_text::file(&locator, &file, &findings, paint)),
        Format::Json => Told::Json(
            findings
                .iter()
                .map(|finding| lint_json::line(&locator, finding))
                .collect(),
        ),
        Format::Sarif => Told::Sarif(sarif::results(&locator, &file, &findings)),
        Format::Junit => {
            let fail_on = arguments.fail_on.level();
            Told::Junit(Some(Box::new(junit::suite(
                &locator,
                &file,
                &findings,
                fail_on,
                &arguments.only,
            ))))
        }
    };
    Piece {
        told,
        tally,
        chosen: file.crystals(&arguments.only).next().is_some(),
        failure: None,
    }
}

impl Piece {
    fn failed(format: Format, path: &Path, why: &str) -> Self {
        let told = match format {
            Format::Text => Told::Text(String::new()),
            Format::Json => Told::Json(Vec::new()),
            Format::Sarif => Told::Sarif(Vec::new()),
            Format::Junit => Told::Junit(None),
        };
        Self {
            told,
            tally: Tally::default(),
            chosen: false,
            failure: Some(format!("{}: {why}", path.display())),
        }
    }
}

/// Prints pieces as they come.
struct Printer {
    format: Format,
    first: bool,
    files: usize,
    tally: Tally,
    failed: bool,
    chosen: bool,
    results: Vec<serde_json::Value>,
    suites: Vec<quick_junit::TestSuite>,
}

impl Printer {
    fn new(arguments: &Arguments, selection: &Selection) -> Self {
        Self {
            format: arguments.format,
            first: true,
            files: 0,
            tally: Tally::default(),
            failed: !selection.failures.is_empty(),
            chosen: false,
            results: Vec::new(),
            suites: Vec::new(),
        }
    }

    fn begin(&self) -> io::Result<()> {
        match self.format {
            Format::Json => output::result(&format!(
                "{{\"schema\": \"{}\", \"findings\": [",
                lint_json::SCHEMA
            )),
            _ => Ok(()),
        }
    }

    fn take(&mut self, piece: Piece) -> io::Result<()> {
        self.tally.join(piece.tally);
        self.chosen |= piece.chosen;
        self.files += usize::from(piece.failure.is_none());
        if let Some(failure) = &piece.failure {
            self.failed = true;
            output::message(failure);
        }
        match piece.told {
            Told::Text(text) => output::result(&text)?,
            Told::Json(records) => {
                for record in records {
                    output::result(if self.first { "\n" } else { ",\n" })?;
                    output::result(&record)?;
                    self.first = false;
                }
            }
            Told::Sarif(results) => self.results.extend(results),
            Told::Junit(suite) => self.suites.extend(suite.map(|suite| *suite)),
        }
        Ok(())
    }

    fn end(&mut self, paint: Paint) -> io::Result<()> {
        match self.format {
            Format::Text => output::result(&lint_text::summary(self.tally, self.files, paint)),
            Format::Json => output::result("\n]}\n"),
            Format::Sarif => {
                let log = sarif::log(&self.results);
                output::result(&(serde_json::to_string_pretty(&log).unwrap_or_default() + "\n"))
            }
            Format::Junit => {
                let suites = std::mem::take(&mut self.suites);
                output::result(&junit::document(suites).map_err(io::Error::other)?)
            }
        }
    }

    fn status(&self, arguments: &Arguments, selection: &Selection) -> Status {
        if !arguments.only.is_empty() && !self.chosen {
            let names = arguments.only.join("`, `");
            // Other parts of the files may well have it.
            if selection.files.len() == selection.all.len() {
                output::message(&format!("there is no crystal `{names}`"));
                return Status::Failed;
            }
        }
        if self.failed {
            return Status::Failed;
        }
        let level: Option<Level> = arguments.fail_on.level();
        match level.is_some_and(|level| self.tally.at_least(level) > 0) {
            true => Status::Found,
            false => Status::Clean,
        }
    }
}
