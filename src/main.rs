//! The `crenate` command.

use std::process::ExitCode;

use crenate::cli::{self, Outcome};

fn main() -> ExitCode {
    match cli::run() {
        Outcome::Done(status) => status.into(),
        Outcome::Serve => ExitCode::from(2),
    }
}
