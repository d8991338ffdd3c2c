//! `crenate show PATH…`

use std::io;
use std::path::{Path, PathBuf};

use clap::{Args, ValueEnum};

use super::desk::Desk;
use super::files::{self, Selection, Shard};
use super::{FailOn, Status, in_order, output};
use crate::report::lint_text::Tally;
use crate::report::locate::Locator;
use crate::report::paint::Paint;
use crate::report::{Tier, lint_json, lint_text, locate, show_csv, show_json, show_text};

#[derive(Debug, Args)]
pub struct Arguments {
    /// Files and folders to show; `-` reads standard input.
    #[arg(required = true)]
    paths: Vec<PathBuf>,
    /// How to show them.
    #[arg(long, value_enum, default_value_t = Format::Text)]
    format: Format,
    /// From which level on a finding makes the command fail.
    #[arg(long, value_enum, default_value_t = FailOn::Error, value_name = "LEVEL")]
    fail_on: FailOn,
    /// Show only the crystal of this name; may be given several times.
    #[arg(long, value_name = "NAME")]
    only: Vec<String>,
    /// Take the I-th of N parts of the files.
    #[arg(long, value_name = "I/N")]
    shard: Option<Shard>,
}

#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, ValueEnum)]
enum Format {
    /// Tables for people.
    #[default]
    Text,
    /// The schema `crenate-show-1`.
    Json,
    /// A row a band.
    Csv,
}

/// What one file came to.
#[derive(Default)]
struct Piece {
    text: String,
    crystals: Vec<String>,
    findings: Vec<String>,
    messages: Vec<String>,
    tally: Tally,
    chosen: bool,
    failed: bool,
}

/// Shows each crystal's numbers.
pub fn run(arguments: &Arguments) -> Status {
    let selection = files::select(&arguments.paths, arguments.shard);
    for failure in &selection.failures {
        output::message(failure);
    }
    let mut printer = Printer {
        format: arguments.format,
        failed: !selection.failures.is_empty(),
        ..Printer::default()
    };
    let outcome = show(arguments, &selection, &mut printer);
    let status = printer.status(arguments, &selection);
    output::written(outcome, status)
}

fn show(arguments: &Arguments, selection: &Selection, printer: &mut Printer) -> io::Result<()> {
    let desk = Desk::knowing(&arguments.paths, selection);
    let paint = output::paint();
    printer.begin()?;
    in_order::each(
        &selection.files,
        |path, cancel| piece(arguments, &desk, paint, path, cancel),
        |piece| printer.take(piece),
    )?;
    printer.end()
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
        Err(why) => {
            return Piece {
                messages: vec![format!("{}: {why}", path.display())],
                failed: true,
                ..Piece::default()
            };
        }
    };
    let locator = Locator::new(&analysis);
    let only = &arguments.only;
    let name = locate::shown_path(&file.path);
    let mut piece = Piece {
        chosen: file.crystals(only).next().is_some(),
        ..Piece::default()
    };
    let findings = file.chosen_findings(only);
    findings
        .iter()
        .for_each(|finding| piece.tally.add(finding.level));
    match arguments.format {
        Format::Text => piece.text = show_text::file(&locator, &file, only, paint),
        Format::Csv => piece.text = show_csv::rows(&file, &name, only),
        Format::Json => {
            piece.crystals = show_json::lines(&locator, &file, &name, only);
            let told = findings
                .iter()
                .map(|finding| lint_json::line(&locator, finding));
            piece.findings = told.collect();
        }
    }
    if arguments.format != Format::Json && piece.tally.at_least(crate::report::Level::Warning) > 0 {
        let told = lint_text::counts(piece.tally, Paint::default());
        piece
            .messages
            .push(format!("{name}: {told}; `crenate lint` tells which"));
    }
    piece
}

/// Prints pieces as they come.
#[derive(Default)]
struct Printer {
    format: Format,
    first: bool,
    findings: Vec<String>,
    tally: Tally,
    failed: bool,
    chosen: bool,
}

impl Printer {
    fn begin(&mut self) -> io::Result<()> {
        self.first = true;
        match self.format {
            Format::Text => Ok(()),
            Format::Csv => output::result(&show_csv::header()),
            Format::Json => output::result(&format!(
                "{{\"schema\": \"{}\", \"crystals\": [",
                show_json::SCHEMA
            )),
        }
    }

    fn take(&mut self, piece: Piece) -> io::Result<()> {
        self.tally.join(piece.tally);
        self.failed |= piece.failed;
        self.chosen |= piece.chosen;
        output::result(&piece.text)?;
        for record in &piece.crystals {
            output::result(if self.first { "\n" } else { ",\n" })?;
            output::result(record)?;
            self.first = false;
        }
        self.findings.extend(piece.findings);
        for message in &piece.messages {
            output::message(message);
        }
        Ok(())
    }

    fn end(&self) -> io::Result<()> {
        match self.format {
            Format::Text | Format::Csv => Ok(()),
            Format::Json => {
                let findings = self.findings.join(",\n");
                output::result(&format!("\n],\n\"findings\": [\n{findings}\n]}}\n"))
            }
        }
    }

    fn status(&self, arguments: &Arguments, selection: &Selection) -> Status {
        let whole = selection.files.len() == selection.all.len();
        if !arguments.only.is_empty() && !self.chosen && whole {
            let names = arguments.only.join("`, `");
            output::message(&format!("there is no crystal `{names}`"));
            return Status::Failed;
        }
        if self.failed {
            return Status::Failed;
        }
        let level = arguments.fail_on.level();
        match level.is_some_and(|level| self.tally.at_least(level) > 0) {
            true => Status::Found,
            false => Status::Clean,
        }
    }
}
