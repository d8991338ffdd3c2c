//! # What it finds
//! A line whose first word is not a statement of the format.
//!
//! # Why it matters
//! The line says nothing: what it was meant to add to the model is missing.
//!
//! # Example
//! ```cren
//! crystal tern
//!   latice chain 8.0 nm
//!   ^^^^^^
//!   cosine 1 = 20 meV
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
//! The closest statement word, where one is close.

use super::{Finding, Fix, Level, Replacement, Rule, Subject, Tier};
use crate::model::words::nearest;
use crate::syntax::ProblemKind;
use crate::syntax::words::{HEADINGS, STATEMENTS};

/// The rule.
pub const RULE: Rule = Rule {
    name: "unknown-statement",
    group: "reading",
    level: Level::Error,
    tier: Tier::Read,
    waivable: false,
    source: include_str!("unknown_statement.rs"),
    check,
};

fn check(subject: &Subject<'_>, findings: &mut Vec<Finding>) {
    for problem in &subject.entry.section.problems {
        let ProblemKind::UnknownStatement { word } = &problem.kind else {
            continue;
        };
        let place = subject.place(problem.span);
        let known = STATEMENTS.iter().map(|entry| entry.word);
        let close = nearest(word, known.chain(HEADINGS.iter().copied()));
        let fix = close.as_ref().map(|close| {
            let title = format!("write `{close}`");
            Fix::guess(title, Replacement::new(place, close.clone()))
        });
        let message = format!("`{word}` is not a statement");
        let help = match &close {
            Some(close) => format!("did you mean `{close}`?"),
            None => "a line begins with a statement word, or with `#` for a comment".to_owned(),
        };
        findings.push(Finding::new(&RULE, place, message).help(help).fix(fix));
    }
}

#[cfg(test)]
mod tests {
    use super::super::fixture::{fixed, messages, silent};
    use super::RULE;

    #[test]
    fn the_closest_statement_is_offered() {
        let text = "crystal a\n  latice chain 8 nm\n";
        assert_eq!(messages(&RULE, text), ["`latice` is not a statement"]);
        assert_eq!(fixed(&RULE, text), "crystal a\n  lattice chain 8 nm\n");
    }

    #[test]
    fn a_statement_in_the_wrong_section_is_another_rules_matter() {
        silent(&RULE, "crystal a\n  lattice chain 8 nm\n  edge 3 meV\n");
    }
}
