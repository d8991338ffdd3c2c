//! The `crenate` command.

use std::process::ExitCode;

use crenate::cli::{self, Outcome};
use crenate::server;

fn main() -> ExitCode {
    match cli::run() {
        Outcome::Done(status) => status.into(),
        Outcome::Serve => server::run(),
    }
}
