//! # What it finds
//! Names, materials or crystals that are defined through each other.
//!
//! # Why it matters
//! None of them has a value.
//!
//! # Example
//! ```cren
//! let well = cell - wall
//!     ^^^^
//! let wall = 2.6 nm
//! let cell = well + wall
//!
//! crystal tern
//!   lattice chain 8.0 nm
//!   cosine 1 = 20 meV
//! ```
//!
//! # Instead
//! ```cren
//! let well = cell - wall
//! let wall = 2.6 nm
//! let cell = 8.0 nm
//!
//! crystal tern
//!   lattice chain well + wall
//!   cosine 1 = 20 meV
//! ```
//!
//! # Fix
//! None: one of them has to be given a value of its own.

use super::{Finding, Level, Rule, Subject, Tier};
use crate::model::TroubleKind;

/// The rule.
pub const RULE: Rule = Rule {
    name: "circular-name",
    group: "names",
    level: Level::Error,
    tier: Tier::Model,
    waivable: false,
    source: include_str!("circular_name.rs"),
    check,
};

fn check(subject: &Subject<'_>, findings: &mut Vec<Finding>) {
    for trouble in subject.troubles {
        if let TroubleKind::CircularName { circle } = &trouble.kind {
            findings.push(
                Finding::of_trouble(&RULE, trouble, message(circle))
                    .help("give one of them a value that does not lead back to itself"),
            );
        }
    }
}

fn message(circle: &[String]) -> String {
    let quoted: Vec<_> = circle.iter().map(|name| format!("`{name}`")).collect();
    match quoted.as_slice() {
        [first, _] => format!("{first} is defined through itself"),
        [first, rest @ ..] => format!(
            "{first} leads back to itself: {first} → {}",
            rest.join(" → ")
        ),
        [] => "these names are defined through each other".to_owned(),
    }
}

#[cfg(test)]
mod tests {
    use super::super::fixture::{messages, silent};
    use super::{RULE, message};

    #[test]
    fn the_circle_is_spelled_out() {
        let circle = ["a", "b", "a"].map(str::to_owned);
        assert_eq!(
            message(&circle),
            "`a` leads back to itself: `a` → `b` → `a`"
        );
        let own = ["a", "a"].map(str::to_owned);
        assert_eq!(message(&own), "`a` is defined through itself");
    }

    #[test]
    fn a_circle_of_lets_is_found() {
        assert!(!messages(&RULE, "let a = b\nlet b = a\n").is_empty());
    }

    #[test]
    fn a_chain_is_no_circle() {
        silent(&RULE, "let a = b + c\nlet b = c\nlet c = 1 nm\n");
    }
}
