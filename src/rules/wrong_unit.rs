//! # What it finds
//! A quantity that its place cannot take: a length where an energy is wanted, two sides of a sum that do not match, a
//! tolerance or a count that is out of bounds.
//!
//! # Why it matters
//! The statement has no meaning with it, so the crystal is not solved.
//!
//! # Example
//! ```cren
//! crystal tern
//!   lattice chain 8.0 nm
//!   cosine 1 = 20 nm
//!              ^^^^^
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
//! None: the right quantity is not to be guessed.

use super::{Finding, Level, Rule, Subject, Tier};
use crate::model::{Trouble, TroubleKind};

/// The rule.
pub const RULE: Rule = Rule {
    name: "wrong-unit",
    group: "units",
    level: Level::Error,
    tier: Tier::Model,
    waivable: false,
    source: include_str!("wrong_unit.rs"),
    check,
};

fn check(subject: &Subject<'_>, findings: &mut Vec<Finding>) {
    findings.extend(subject.troubles.iter().filter_map(finding));
}

fn finding(trouble: &Trouble) -> Option<Finding> {
    match &trouble.kind {
        TroubleKind::WrongUnit { wanted, found } => {
            let message = format!("this is {found}, where {wanted} is wanted");
            Some(Finding::of_trouble(&RULE, trouble, message))
        }
        TroubleKind::BadValue { what } => Some(Finding::of_trouble(&RULE, trouble, what.clone())),
        _ => None,
    }
}

#[cfg(test)]
mod tests {
    use super::super::fixture::{messages, silent};
    use super::RULE;

    #[test]
    fn a_length_is_no_energy() {
        let found = messages(
            &RULE,
            "crystal a\n  lattice chain 8 nm\n  cosine 1 = 3 nm\n",
        );
        assert_eq!(found, ["this is a length, where an energy is wanted"]);
    }

    #[test]
    fn an_energy_may_be_made_of_other_quantities() {
        let energy = "hbar^2 * (1 nm)^-2 / (1 me)";
        silent(
            &RULE,
            &format!("crystal a\n  lattice chain 8 nm\n  cosine 1 = {energy}\n"),
        );
    }
}
