//! # What it finds
//! An operation that has no finite result: a division by zero, the root of a negative number, an overflow.
//!
//! # Why it matters
//! There is no number to go on with.
//!
//! # Example
//! ```cren
//! let spare = 0
//!
//! crystal tern
//!   lattice chain 8.0 nm / spare
//!                 ^^^^^^^^^^^^^^
//!   cosine 1 = 20 meV
//! ```
//!
//! # Instead
//! ```cren
//! let spare = 2
//!
//! crystal tern
//!   lattice chain 8.0 nm / spare
//!   cosine 1 = 20 meV
//! ```
//!
//! # Fix
//! None.

use super::{Finding, Level, Rule, Subject, Tier};
use crate::model::TroubleKind;

/// The rule.
pub const RULE: Rule = Rule {
    name: "not-finite",
    group: "units",
    level: Level::Error,
    tier: Tier::Model,
    waivable: false,
    source: include_str!("not_finite.rs"),
    check,
};

fn check(subject: &Subject<'_>, findings: &mut Vec<Finding>) {
    for trouble in subject.troubles {
        if let TroubleKind::NotFinite { what } = &trouble.kind {
            let message = format!("this has no finite value: {what}");
            findings.push(Finding::of_trouble(&RULE, trouble, message));
        }
    }
}

#[cfg(test)]
mod tests {
    use super::super::fixture::{messages, silent};
    use super::RULE;

    #[test]
    fn division_by_zero_roots_and_overflow_are_found() {
        for value in [
            "3 nm / 0",
            "1 nm * sqrt(-2)",
            "1 nm * exp(1e4)",
            "1 nm * log(0)",
        ] {
            let text = format!("crystal a\n  lattice chain {value}\n");
            assert_eq!(messages(&RULE, &text).len(), 1, "{value}");
        }
    }

    #[test]
    fn large_numbers_are_still_numbers() {
        silent(&RULE, "crystal a\n  lattice chain 1e-9 nm * exp(20)\n");
    }
}
