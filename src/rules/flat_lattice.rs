//! # What it finds
//! Lattice vectors that lie in one line or plane, and lengths or angles that give no cell.
//!
//! # Why it matters
//! A cell without volume holds nothing.
//!
//! # Example
//! ```cren
//! crystal tern
//!   lattice vectors (5 nm, 0) (10 nm, 0)
//!   ^^^^^^^^^^^^^^^^^^^^^^^^^^^^^^^^^^^^
//!   cosine (1, 0) = 20 meV
//! ```
//!
//! # Instead
//! ```cren
//! crystal tern
//!   lattice vectors (5 nm, 0) (0, 10 nm)
//!   cosine (1, 0) = 20 meV
//! ```
//!
//! # Fix
//! None.

use super::{Finding, Level, Rule, Subject, Tier};
use crate::model::TroubleKind;

/// The rule.
pub const RULE: Rule = Rule {
    name: "flat-lattice",
    group: "cell",
    level: Level::Error,
    tier: Tier::Model,
    waivable: false,
    source: include_str!("flat_lattice.rs"),
    check,
};

fn check(subject: &Subject<'_>, findings: &mut Vec<Finding>) {
    for trouble in subject.troubles {
        if let TroubleKind::FlatLattice { what } = &trouble.kind {
            let message = format!("this lattice has no cell: {what}");
            findings.push(Finding::of_trouble(&RULE, trouble, message));
        }
    }
}

#[cfg(test)]
mod tests {
    use super::super::fixture::{messages, silent};
    use super::RULE;

    #[test]
    fn impossible_angles_and_dependent_vectors_are_found() {
        let flat = "triclinic 1 nm by 1 nm by 1 nm angles 20 deg, 20 deg, 90 deg";
        for lattice in [
            flat,
            "vectors (1 nm, 1 nm) (2 nm, 2 nm)",
            "oblique 1 nm by 1 nm angle 180 deg",
        ] {
            let text = format!("crystal a\n  lattice {lattice}\n");
            assert_eq!(messages(&RULE, &text).len(), 1, "{lattice}");
        }
    }

    #[test]
    fn a_slim_cell_is_a_cell() {
        silent(
            &RULE,
            "crystal a\n  lattice oblique 1 nm by 1 nm angle 5 deg\n",
        );
    }
}
