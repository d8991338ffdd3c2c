//! The `crenate` command.

fn main() {}
