//! # What it finds
//! A `require` that cannot be tested: the model has errors, there is no filling, too few bands are solved, or the
//! numbers did not settle.
//!
//! # Why it matters
//! A target that is not tested is neither met nor missed, and a check that says nothing is easily taken for a pass.
//!
//! # Example
//! ```cren
//! crystal tern
//!   mass 1 me
//!   lattice chain 0.4 nm
//!   cosine 1 = 500 meV
//!   require insulator
//!   ^^^^^^^^^^^^^^^^^
//! ```
//!
//! # Instead
//! ```cren
//! crystal tern
//!   mass 1 me
//!   lattice chain 0.4 nm
//!   filling 2
//!   cosine 1 = 500 meV
//!   require insulator
//! ```
//!
//! # Fix
//! None: the message says what is in the way.

use super::target_missed::at_target;
use super::{Finding, Level, Rule, Subject, Tier};
use crate::bands::TargetState;

/// The rule.
pub const RULE: Rule = Rule {
    name: "target-untestable",
    group: "targets",
    level: Level::Warning,
    tier: Tier::Bands,
    waivable: true,
    source: include_str!("target_untestable.rs"),
    check,
};

fn check(subject: &Subject<'_>, findings: &mut Vec<Finding>) {
    for target in subject.targets {
        if target.state == TargetState::Untestable {
            let reason = target
                .reason
                .as_deref()
                .unwrap_or("there are no bands to hold it against");
            let message = format!("`{}` cannot be tested: {reason}", target.text);
            findings.push(at_target(&RULE, subject, target, message));
        }
    }
}

#[cfg(test)]
mod tests {
    use super::super::fixture::assessed;
    use super::RULE;
    use crate::bands::TargetState;

    #[test]
    fn the_reason_is_said() {
        let found = assessed(&RULE, |target| {
            target.text = "insulator".to_owned();
            target.state = TargetState::Untestable;
            target.reason = Some("the crystal says no `filling`".to_owned());
        });
        assert_eq!(
            found,
            ["`insulator` cannot be tested: the crystal says no `filling`"]
        );
    }

    #[test]
    fn an_undecided_target_was_tested() {
        assert!(assessed(&RULE, |target| target.state = TargetState::Undecided).is_empty());
    }
}
