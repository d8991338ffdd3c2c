//! # What it finds
//! Two atoms at one position, images in other cells included.
//!
//! # Why it matters
//! One of them is likely a slip of the pen; together they would count twice.
//!
//! # Example
//! ```cren
//! crystal tern
//!   lattice fcc 0.54 nm
//!   atom A at (0, 0, 0)
//!   atom B at (1, 0, 0)
//!   ^^^^^^^^^^^^^^^^^^^
//!   formfactor A 3 = -0.2 Ry
//!   formfactor B 3 = -0.2 Ry
//! ```
//!
//! # Instead
//! ```cren
//! crystal tern
//!   lattice fcc 0.54 nm
//!   atom A at (0, 0, 0)
//!   atom B at (0.25, 0.25, 0.25)
//!   formfactor A 3 = -0.2 Ry
//!   formfactor B 3 = -0.2 Ry
//! ```
//!
//! # Fix
//! None.

use super::{Finding, Level, Rule, Subject, Tier, words};
use crate::model::TroubleKind;

/// The rule.
pub const RULE: Rule = Rule {
    name: "clashing-atoms",
    group: "cell",
    level: Level::Error,
    tier: Tier::Model,
    waivable: false,
    source: include_str!("clashing_atoms.rs"),
    check,
};

fn check(subject: &Subject<'_>, findings: &mut Vec<Finding>) {
    for trouble in subject.troubles {
        if let TroubleKind::ClashingAtoms { distance } = &trouble.kind {
            let message = match *distance > 0.0 {
                true => format!(
                    "this atom is only {} from another",
                    words::length(*distance)
                ),
                false => "this atom stands where another stands already".to_owned(),
            };
            findings.push(
                Finding::of_trouble(&RULE, trouble, message)
                    .help("positions count modulo the lattice, so (1, 0, 0) is (0, 0, 0)"),
            );
        }
    }
}

#[cfg(test)]
mod tests {
    use super::super::fixture::{messages, silent};
    use super::RULE;

    #[test]
    fn an_atom_and_the_image_of_another_clash() {
        let text =
            "crystal a\n  lattice fcc 0.5 nm\n  atom A at (0,0,0)\n  atom A at (0.5,0.5,0)\n";
        assert_eq!(messages(&RULE, text).len(), 1);
    }

    #[test]
    fn the_centre_of_a_simple_cube_is_free() {
        silent(
            &RULE,
            "crystal a\n  lattice cubic 0.5 nm\n  atom A at (0,0,0)\n  atom A at (0.5,0.5,0.5)\n",
        );
    }
}
