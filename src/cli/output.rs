//! Standard output and standard error.

use std::io::{self, ErrorKind, IsTerminal, Write};

use super::Status;
use crate::report::paint::Paint;

/// Whether results are coloured: on a terminal, unless `NO_COLOR` is set or the terminal is dumb.
#[must_use]
pub fn paint() -> Paint {
    let unwanted = std::env::var_os("NO_COLOR").is_some_and(|value| !value.is_empty());
    let dumb = std::env::var_os("TERM").is_some_and(|value| value == "dumb");
    Paint {
        colour: io::stdout().is_terminal() && !unwanted && !dumb,
    }
}

/// Writes a result.
///
/// # Errors
/// Where standard output does not take it.
pub fn result(text: &str) -> io::Result<()> {
    io::stdout().lock().write_all(text.as_bytes())
}

/// Says something about the work itself.
pub fn message(text: &str) {
    // Where even this cannot be written there is no one left to tell.
    let _ = writeln!(io::stderr().lock(), "crenate: {text}");
}

/// The status after writing: a reader that left early is no failure and gets no message.
#[must_use]
pub fn written(outcome: io::Result<()>, status: Status) -> Status {
    match outcome.and_then(|()| io::stdout().lock().flush()) {
        Ok(()) => status,
        Err(error) if error.kind() == ErrorKind::BrokenPipe => status,
        Err(error) => {
            message(&format!("cannot write the result: {error}"));
            Status::Failed
        }
    }
}
