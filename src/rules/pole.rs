//! # What it finds
//! A profile that is not finite somewhere in the cell.
//!
//! # Why it matters
//! No energies can be computed with it.
//!
//! # Example
//! ```cren
//! crystal tern
//!   lattice chain 8.0 nm
//!   mass 0.067 me
//!   profile = -1 eV * (1 nm) / x
//!             ^^^^^^^^^^^^^^^^^^
//! ```
//!
//! # Instead
//! ```cren
//! crystal tern
//!   lattice chain 8.0 nm
//!   mass 0.067 me
//!   profile -4.0 nm to 4.0 nm = -1 eV * (1 nm) / sqrt(x^2 + (1 nm)^2)
//! ```
//!
//! # Fix
//! None: soften the formula there, as the example does, or cut it off with `max` or `min`.

use super::{Finding, Level, Rule, Subject, Tier, words};
use crate::model::{Crystal, TroubleKind};

/// The rule.
pub const RULE: Rule = Rule {
    name: "pole",
    group: "continuity",
    level: Level::Error,
    tier: Tier::Model,
    waivable: false,
    source: include_str!("pole.rs"),
    check,
};

fn check(subject: &Subject<'_>, findings: &mut Vec<Finding>) {
    for trouble in subject.troubles {
        if let TroubleKind::Pole { at } = &trouble.kind {
            let message = format!(
                "this profile has no finite value near {}",
                place_of(subject, *at)
            );
            findings.push(
                Finding::of_trouble(&RULE, trouble, message)
                    .help("soften it there, or cut it off with `max` or `min`"),
            );
        }
    }
}

/// A pole is located to rounding: what is next to nothing of the cell is nothing.
fn place_of(subject: &Subject<'_>, at: f64) -> String {
    let period = subject
        .crystal
        .and_then(Crystal::period)
        .map_or(0.0, |period| period.value);
    let next_to_nothing = at.abs() < 1e-6 * period;
    words::length(if next_to_nothing { 0.0 } else { at })
}

#[cfg(test)]
mod tests {
    use super::super::fixture::{messages, silent};
    use super::RULE;

    #[test]
    fn a_pole_between_the_grid_points_is_found() {
        for formula in [
            "1 meV / sin(pi*(x - 2.4567 nm)/period)",
            "1 meV * log(x / (8 nm) - 0.5)",
        ] {
            let text = format!("crystal a\n  lattice chain 8 nm\n  profile = {formula}\n");
            assert_eq!(messages(&RULE, &text).len(), 1, "{formula}");
        }
    }

    #[test]
    fn a_steep_profile_is_no_pole() {
        silent(
            &RULE,
            "crystal a\n  lattice chain 8 nm\n  profile = 1 meV / (1e-4 + sin(pi*x/period)^2)\n",
        );
    }
}
