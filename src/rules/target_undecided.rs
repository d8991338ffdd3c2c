//! # What it finds
//! A `require` whose limit lies inside the uncertainty of the value that is held against it.
//!
//! # Why it matters
//! The numbers cannot tell whether it holds.
//!
//! # Example
//! ```cren
//! crystal tern
//!   mass 1 me
//!   lattice chain 0.4 nm
//!   cosine 1 = 500 meV
//!   require gap 1 - gap 1 >= 0 meV
//!   ^^^^^^^^^^^^^^^^^^^^^^^^^^^^^^
//! ```
//!
//! # Instead
//! ```cren
//! crystal tern
//!   mass 1 me
//!   lattice chain 0.4 nm
//!   cosine 1 = 500 meV
//!   require gap 1 >= 300 meV
//! ```
//!
//! # Fix
//! None: move the limit off the value, or ask for something else.

use super::target_missed::{at_target, halves};
use super::words::Trade;
use super::{Finding, Level, Rule, Subject, Tier, words};
use crate::bands::{Assessment, TargetState};

/// The rule.
pub const RULE: Rule = Rule {
    name: "target-undecided",
    group: "targets",
    level: Level::Warning,
    tier: Tier::Bands,
    waivable: true,
    source: include_str!("target_undecided.rs"),
    check,
};

fn check(subject: &Subject<'_>, findings: &mut Vec<Finding>) {
    for target in subject.targets {
        if target.state == TargetState::Undecided {
            let finding = at_target(&RULE, subject, target, message(subject, target));
            findings.push(finding.help_if(target.reason.clone()));
        }
    }
}

fn message(subject: &Subject<'_>, target: &Assessment) -> String {
    let (what, _) = halves(&target.text);
    let Some(value) = target.value else {
        return format!("whether `{}` holds cannot be told", target.text);
    };
    let trade = Trade::here(subject);
    let of = |size| words::quantity(size, target.dimension, trade);
    let bound = words::in_unit(
        value.uncertainty,
        words::unit_for(value.uncertainty, target.dimension, trade),
        2,
    );
    format!(
        "whether this holds cannot be told: `{what}` is {} to within {bound}",
        of(value.value)
    )
}

#[cfg(test)]
mod tests {
    use super::super::fixture::{assessed, electronvolts};
    use super::RULE;
    use crate::bands::{Measured, TargetState};

    #[test]
    fn value_and_bound_are_said() {
        let found = assessed(&RULE, |target| {
            target.text = "gap 1 >= 60 meV".to_owned();
            target.state = TargetState::Undecided;
            target.value = Some(Measured {
                uncertainty: electronvolts(1e-6).value,
                ..electronvolts(0.06)
            });
        });
        assert_eq!(
            found,
            ["whether this holds cannot be told: `gap 1` is 60 meV to within 1 µeV"]
        );
    }

    #[test]
    fn a_target_that_is_met_is_decided() {
        assert!(assessed(&RULE, |target| target.state = TargetState::Met).is_empty());
    }
}
