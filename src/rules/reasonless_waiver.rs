//! # What it finds
//! A `waive` without a reason, or with an empty one. It silences nothing.
//!
//! # Why it matters
//! The next reader cannot tell a decision from an excuse.
//!
//! # Example
//! ```cren
//! crystal tern
//!   waive default-mass
//!   ^^^^^^^^^^^^^^^^^^
//!   mass 0.067 me
//!   layer 8.0 nm at 0
//! ```
//!
//! # Instead
//! ```cren
//! crystal tern
//!   waive default-mass because "free electrons are meant"
//!   layer 8.0 nm at 0
//! ```
//!
//! # Fix
//! None: the reason is for its author to give.

use super::{Finding, Level, Rule, Subject, Tier};
use crate::syntax::StatementKind;

/// The rule.
pub const RULE: Rule = Rule {
    name: "reasonless-waiver",
    group: "waivers",
    level: Level::Error,
    tier: Tier::Read,
    waivable: false,
    source: include_str!("reasonless_waiver.rs"),
    check,
};

fn check(subject: &Subject<'_>, findings: &mut Vec<Finding>) {
    for statement in &subject.entry.section.statements {
        let StatementKind::Waive { rule, reason } = &statement.kind else {
            continue;
        };
        if reason
            .as_ref()
            .is_some_and(|reason| !reason.text.trim().is_empty())
        {
            continue;
        }
        let message = format!("this waiver of `{}` gives no reason", rule.text);
        let help = format!("write `waive {} because \"the reason\"`", rule.text);
        findings.push(Finding::new(&RULE, subject.place(statement.span), message).help(help));
    }
}

#[cfg(test)]
mod tests {
    use super::super::fixture::{messages, silent};
    use super::RULE;

    #[test]
    fn a_missing_and_an_empty_reason_are_found() {
        let message = "this waiver of `seam-step` gives no reason";
        assert_eq!(messages(&RULE, "waive seam-step\n"), [message]);
        assert_eq!(
            messages(&RULE, "waive seam-step because \" \"\n"),
            [message]
        );
    }

    #[test]
    fn a_reason_is_enough() {
        silent(&RULE, "waive seam-step because \"a sawtooth is meant\"\n");
    }
}
