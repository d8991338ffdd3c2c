//! The command line: one file a command.
//!
//! Results go to standard output, messages to standard error. The exit status is
//! 0 where nothing reaches the failing level, 1 where something does, 2 where the
//! work could not be done.

mod desk;
mod draw;
mod files;
mod in_order;
mod lint;
mod mend;
mod output;
mod replace;
mod rules;
mod scan;
mod show;
mod tidy;

use std::process::ExitCode;

use clap::{Args, Parser, Subcommand, ValueEnum};

use crate::report::Level;

/// What is left to do once the arguments are read.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Outcome {
    /// Nothing: leave with this status.
    Done(Status),
    /// Start the language server on standard input and output.
    Serve,
}

/// The exit statuses.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub enum Status {
    /// Nothing at or above the failing level.
    Clean,
    /// Something at or above it.
    Found,
    /// The work could not be done.
    Failed,
}

impl From<Status> for ExitCode {
    fn from(status: Status) -> Self {
        Self::from(match status {
            Status::Clean => 0,
            Status::Found => 1,
            Status::Failed => 2,
        })
    }
}

/// Checks and explains periodic potentials written in plain text.
#[derive(Debug, Parser)]
#[command(name = "crenate", version, max_term_width = 100)]
struct Arguments {
    #[command(subcommand)]
    command: Command,
}

#[derive(Debug, Subcommand)]
enum Command {
    /// Check files and folders and print what is found.
    Lint(lint::Arguments),
    /// Show the bands, gaps, masses, filling and targets of each crystal.
    Show(show::Arguments),
    /// Draw each crystal: its potential with the bands, E(k), and |ψ|² at the edges, as SVG.
    Draw(draw::Arguments),
    /// Show the bands against one named value.
    Scan(scan::Arguments),
    /// Rewrite files in the one standard layout.
    Tidy(tidy::Arguments),
    /// List the rules, or explain one of them.
    Rules(rules::Arguments),
    /// Start the language server on standard input and output.
    Serve(Serve),
}

/// The language server takes no settings.
#[derive(Debug, Args)]
struct Serve {
    /// Talk over standard input and output, as it always does; editors pass this.
    #[arg(long)]
    stdio: bool,
}

/// From which level on a finding makes the command fail.
#[derive(Clone, Copy, Debug, ValueEnum)]
enum FailOn {
    /// An error.
    Error,
    /// A warning or an error.
    Warning,
    /// Any finding.
    Note,
    /// No finding.
    Never,
}

impl FailOn {
    fn level(self) -> Option<Level> {
        match self {
            Self::Error => Some(Level::Error),
            Self::Warning => Some(Level::Warning),
            Self::Note => Some(Level::Note),
            Self::Never => None,
        }
    }
}

/// Reads the arguments of this process and does what they say; bad ones end it with status 2.
#[must_use]
pub fn run() -> Outcome {
    match Arguments::parse().command {
        Command::Lint(arguments) => Outcome::Done(lint::run(&arguments)),
        Command::Show(arguments) => Outcome::Done(show::run(&arguments)),
        Command::Draw(arguments) => Outcome::Done(draw::run(&arguments)),
        Command::Scan(arguments) => Outcome::Done(scan::run(&arguments)),
        Command::Tidy(arguments) => Outcome::Done(tidy::run(&arguments)),
        Command::Rules(arguments) => Outcome::Done(rules::run(&arguments)),
        Command::Serve(_) => Outcome::Serve,
    }
}
