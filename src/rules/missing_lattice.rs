//! # What it finds
//! A crystal in which nothing says what repeats: no `lattice`, and no layers whose sum would be the period.
//!
//! # Why it matters
//! Without a cell there are no bands.
//!
//! # Example
//! ```cren
//! crystal tern
//!         ^^^^
//!   mass 0.067 me
//!   cosine 1 = 20 meV
//! ```
//!
//! # Instead
//! ```cren
//! crystal tern
//!   lattice chain 8.0 nm
//!   mass 0.067 me
//!   cosine 1 = 20 meV
//! ```
//!
//! # Fix
//! None: only the author knows the cell.

use super::{Finding, Level, Rule, Subject, Tier};
use crate::model::TroubleKind;

/// The rule.
pub const RULE: Rule = Rule {
    name: "missing-lattice",
    group: "cell",
    level: Level::Error,
    tier: Tier::Model,
    waivable: false,
    source: include_str!("missing_lattice.rs"),
    check,
};

fn check(subject: &Subject<'_>, findings: &mut Vec<Finding>) {
    let mut troubles = subject.troubles.iter();
    let Some(trouble) = troubles.find(|trouble| trouble.kind == TroubleKind::MissingLattice) else {
        return;
    };
    // A lattice may be what the missing crystal would bring along.
    let base_is_missing = subject.troubles.iter().any(|trouble| {
        matches!(
            &trouble.kind,
            TroubleKind::CircularName { .. }
                | TroubleKind::UnknownName {
                    wanted: "crystal",
                    ..
                }
        )
    });
    if subject.entry.section.like.is_some() && base_is_missing {
        return;
    }
    let finding = Finding {
        place: subject.heading(),
        ..Finding::of_trouble(&RULE, trouble, "nothing says what repeats in this crystal")
    };
    findings.push(
        finding
            .help("write `lattice chain 8 nm` or another lattice, or build the cell of `layer`s"),
    );
}

#[cfg(test)]
mod tests {
    use super::super::fixture::{messages, silent};
    use super::RULE;

    #[test]
    fn a_potential_needs_a_cell() {
        let found = messages(&RULE, "crystal a\n  mass 1 me\n  cosine 1 = 3 meV\n");
        assert_eq!(found, ["nothing says what repeats in this crystal"]);
    }

    #[test]
    fn a_crystal_like_an_unknown_one_may_have_a_lattice() {
        silent(&RULE, "crystal a like b\n  mass 1 me\n");
    }

    #[test]
    fn layers_are_a_cell() {
        silent(&RULE, "crystal a\n  mass 1 me\n  layer 3 nm at 0\n");
    }
}
