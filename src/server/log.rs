//! Messages for whoever looks after the server; standard output is the protocol's.

use std::io::Write;

/// Writes one line to standard error. A closed standard error is no reason to stop.
pub(super) fn write_line(line: std::fmt::Arguments<'_>) {
    let _ = writeln!(std::io::stderr().lock(), "crenate serve: {line}");
}

macro_rules! log {
    ($($part:tt)*) => { $crate::server::log::write_line(format_args!($($part)*)) };
}
pub(super) use log;
