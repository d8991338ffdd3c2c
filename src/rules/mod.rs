//! The rules: one file each, listed here.

mod rule;

pub use rule::*;
