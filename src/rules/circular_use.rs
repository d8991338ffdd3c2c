//! # What it finds
//! Files that `use` each other, or a file that uses itself.
//!
//! # Why it matters
//! Which of two equal names is meant would depend on where one begins to read.
//!
//! # Example
//! ```cren
//! use "example.cren"
//!     ^^^^^^^^^^^^^^
//!
//! crystal tern
//!   lattice chain 8.0 nm
//!   cosine 1 = 20 meV
//! ```
//!
//! # Instead
//! ```cren
//! crystal tern
//!   lattice chain 8.0 nm
//!   cosine 1 = 20 meV
//! ```
//!
//! # Fix
//! None: move what both need into a third file.

use super::{Finding, Level, Rule, Subject, Tier};
use crate::model::TroubleKind;

/// The rule.
pub const RULE: Rule = Rule {
    name: "circular-use",
    group: "names",
    level: Level::Error,
    tier: Tier::Model,
    waivable: false,
    source: include_str!("circular_use.rs"),
    check,
};

fn check(subject: &Subject<'_>, findings: &mut Vec<Finding>) {
    for trouble in subject.troubles {
        if let TroubleKind::CircularUse { circle } = &trouble.kind {
            findings.push(
                Finding::of_trouble(&RULE, trouble, message(circle))
                    .help("move what both need into a file that both use"),
            );
        }
    }
}

fn message(circle: &[String]) -> String {
    match circle {
        [] | [_] => "this file uses itself".to_owned(),
        [first, last] if first == last => "this file uses itself".to_owned(),
        _ => format!(
            "this file uses itself by way of others: {}",
            circle.join(" → ")
        ),
    }
}

#[cfg(test)]
mod tests {
    use super::super::fixture::{messages_with, silent_with};
    use super::{RULE, message};

    #[test]
    fn the_way_round_is_spelled_out() {
        let circle = ["a.cren", "b.cren", "a.cren"].map(str::to_owned);
        assert!(message(&circle).ends_with("a.cren → b.cren → a.cren"));
    }

    #[test]
    fn two_files_that_use_each_other_are_found() {
        let other = [("b.cren", "use \"example.cren\"\n")];
        assert_eq!(messages_with(&RULE, "use \"b.cren\"\n", &other).len(), 1);
    }

    #[test]
    fn two_files_that_use_a_third_are_no_circle() {
        let others = [("b.cren", "use \"c.cren\"\n"), ("c.cren", "let w = 3 nm\n")];
        silent_with(&RULE, "use \"b.cren\"\nuse \"c.cren\"\n", &others);
    }
}
