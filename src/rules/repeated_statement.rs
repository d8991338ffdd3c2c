//! # What it finds
//! A statement that may stand once in its section and stands there again, and a second description of the whole cell
//! (layers beside a profile or a table).
//!
//! # Why it matters
//! Which of the two is meant cannot be told; only the first is heeded.
//!
//! # Example
//! ```cren
//! crystal tern
//!   lattice chain 8.0 nm
//!   cosine 1 = 20 meV
//!   mass 0.067 me
//!   mass 0.092 me
//!   ^^^^^^^^^^^^^
//! ```
//!
//! # Instead
//! ```cren
//! crystal tern
//!   lattice chain 8.0 nm
//!   cosine 1 = 20 meV
//!   mass 0.092 me
//! ```
//!
//! # Fix
//! The later one is taken out.

use super::{Finding, Fix, Level, Replacement, Rule, Subject, Tier};
use crate::model::{Place, Trouble, TroubleKind};

/// The rule.
pub const RULE: Rule = Rule {
    name: "repeated-statement",
    group: "reading",
    level: Level::Error,
    tier: Tier::Model,
    waivable: false,
    source: include_str!("repeated_statement.rs"),
    check,
};

fn check(subject: &Subject<'_>, findings: &mut Vec<Finding>) {
    let troubles = subject.troubles.iter();
    findings.extend(troubles.filter_map(|trouble| finding(subject, trouble)));
}

fn finding(subject: &Subject<'_>, trouble: &Trouble) -> Option<Finding> {
    match &trouble.kind {
        TroubleKind::Repeated { word } => {
            let message = format!("`{word}` stands here a second time");
            Some(
                Finding::of_trouble(&RULE, trouble, message)
                    .help("only the first is heeded; keep one of the two")
                    .fix(take_out(subject, trouble.place)),
            )
        }
        TroubleKind::TwoDescriptions { first, second } => {
            let message =
                format!("the whole cell is described twice: by {first}, and here by {second}");
            Some(
                Finding::of_trouble(&RULE, trouble, message)
                    .help("keep one kind of description; cosines, sites and deltas add to it"),
            )
        }
        _ => None,
    }
}

/// Takes out the line of a statement.
fn take_out(subject: &Subject<'_>, place: Place) -> Option<Fix> {
    let statement = subject.statement_at(place)?;
    let line = subject.line_at(statement.span.start)?;
    let edit = Replacement::new(subject.place(line.span), "");
    Some(Fix::guess("take this line out", edit))
}

#[cfg(test)]
mod tests {
    use super::super::fixture::{fixed, messages, silent};
    use super::RULE;

    #[test]
    fn the_later_line_is_taken_out() {
        let text = "crystal a\n  lattice chain 8 nm\n  mass 1 me\n  mass 2 me # why\n";
        assert_eq!(messages(&RULE, text), ["`mass` stands here a second time"]);
        assert_eq!(
            fixed(&RULE, text),
            "crystal a\n  lattice chain 8 nm\n  mass 1 me\n"
        );
    }

    #[test]
    fn layers_and_a_profile_are_two_descriptions() {
        let text = "crystal a\n  lattice chain 8 nm\n  layer 8 nm at 0 meV\n  profile = 1 meV\n";
        assert_eq!(messages(&RULE, text).len(), 1);
    }

    #[test]
    fn layers_may_stand_many_times() {
        silent(
            &RULE,
            "crystal a\n  mass 1 me\n  layer 4 nm at 0 meV\n  layer 4 nm at 9 meV\n",
        );
    }
}
