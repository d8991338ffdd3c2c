//! # What it finds
//! A `waive` that silences nothing, or that names a rule which cannot be waived.
//!
//! # Why it matters
//! It would silence the next finding of that rule, which nobody has looked at.
//!
//! # Example
//! ```cren
//! crystal tern
//!   waive seam-step because "a sawtooth is meant"
//!   ^^^^^^^^^^^^^^^^^^^^^^^^^^^^^^^^^^^^^^^^^^^^^
//!   lattice chain 8.0 nm
//!   mass 0.067 me
//!   profile = 20 meV * cos(2*pi*x/period)
//! ```
//!
//! # Instead
//! ```cren
//! crystal tern
//!   waive seam-step because "a sawtooth is meant"
//!   lattice chain 8.0 nm
//!   mass 0.067 me
//!   profile = 20 meV * x/period
//! ```
//!
//! # Fix
//! The waiver is taken out.

use super::{Finding, Fix, Level, Replacement, Rule, Subject, Tier};
use crate::model::Place;

/// The rule.
pub const RULE: Rule = Rule {
    name: "idle-waiver",
    group: "waivers",
    level: Level::Warning,
    tier: Tier::Read,
    waivable: false,
    source: include_str!("idle_waiver.rs"),
    check,
};

/// Whether a waiver silences something shows only when all else is found: see [`super::apply_waivers`].
fn check(_: &Subject<'_>, _: &mut Vec<Finding>) {}

/// The finding on a waiver at `place`, whose line is `line`.
#[must_use]
pub fn finding(rule: &str, waivable: bool, place: Place, line: Place) -> Finding {
    let message = match waivable {
        true => format!("this waiver silences nothing: no `{rule}` is found here"),
        false => format!("`{rule}` cannot be waived, so this waiver silences nothing"),
    };
    let fix = Fix::guess("take this waiver out", Replacement::new(line, ""));
    Finding {
        unused: true,
        ..Finding::new(&RULE, place, message)
    }
    .fix(fix)
}

#[cfg(test)]
mod tests {
    use super::super::fixture::after_waivers;

    #[test]
    fn a_waiver_that_silences_something_is_not_idle() {
        let text = "crystal a\n  waive seam-step because \"r\"\n  lattice chain 8 nm\n  profile = 1 meV * x/period\n";
        assert!(
            after_waivers(text)
                .iter()
                .all(|(rule, _)| *rule != "seam-step" && *rule != "idle-waiver")
        );
    }

    #[test]
    fn a_waiver_in_the_preamble_serves_the_whole_file() {
        let crystal = "crystal a\n  lattice chain 8 nm\n  profile = 1 meV * x/period\n";
        let text = format!("waive seam-step because \"r\"\n{crystal}");
        assert!(
            after_waivers(&text).is_empty(),
            "{:?}",
            after_waivers(&text)
        );
    }

    #[test]
    fn idle_waivers_and_waivers_of_errors_are_found() {
        let text = "crystal a\n  waive seam-step because \"r\"\n  waive open-cell because \"r\"\n  lattice chain 8 nm\n  cosine 1 = 1 meV\n";
        let found = after_waivers(text);
        assert_eq!(found.len(), 2, "{found:?}");
        assert!(found.iter().all(|(rule, _)| *rule == "idle-waiver"));
    }
}
