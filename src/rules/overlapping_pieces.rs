//! # What it finds
//! Pieces of a profile that lie on top of each other.
//!
//! # Why it matters
//! Where they overlap, the potential would have two values.
//!
//! # Example
//! ```cren
//! crystal tern
//!   lattice chain 8.0 nm
//!   mass 0.067 me
//!   profile 0 to 5.5 nm = 0 meV
//!   profile 5.4 nm to 8.0 nm = 235 meV
//!   ^^^^^^^^^^^^^^^^^^^^^^^^^^^^^^^^^^
//! ```
//!
//! # Instead
//! ```cren
//! crystal tern
//!   lattice chain 8.0 nm
//!   mass 0.067 me
//!   profile 0 to 4.0 nm = 20 meV * cos(2*pi*x/period)
//!   profile 4.0 nm to 8.0 nm = 20 meV * cos(2*pi*x/period)
//! ```
//!
//! # Fix
//! None: which piece gives way is for its author to say.

use super::{Finding, Level, Rule, Subject, Tier, words};
use crate::model::TroubleKind;

/// The rule.
pub const RULE: Rule = Rule {
    name: "overlapping-pieces",
    group: "cell",
    level: Level::Error,
    tier: Tier::Model,
    waivable: false,
    source: include_str!("overlapping_pieces.rs"),
    check,
};

fn check(subject: &Subject<'_>, findings: &mut Vec<Finding>) {
    for trouble in subject.troubles {
        if let TroubleKind::OverlappingPieces { by } = &trouble.kind {
            let message = format!("this piece overlaps another by {}", words::length(*by));
            findings.push(
                Finding::of_trouble(&RULE, trouble, message)
                    .help("let each piece begin where the one before it ends"),
            );
        }
    }
}

#[cfg(test)]
mod tests {
    use super::super::fixture::{messages, silent};
    use super::RULE;

    #[test]
    fn the_overlap_is_measured() {
        let text = "crystal a\n  lattice chain 8 nm\n  profile 0 to 5.5 nm = 0 meV\n  profile 5.4 nm to 8 nm = 3 meV\n";
        assert_eq!(
            messages(&RULE, text),
            ["this piece overlaps another by 0.1 nm"]
        );
    }

    #[test]
    fn pieces_that_touch_do_not_overlap() {
        let text = "crystal a\n  lattice chain 8 nm\n  profile 0 to 5.5 nm = 0 meV\n  profile 5.5 nm to 8 nm = 3 meV\n";
        silent(&RULE, text);
    }
}
