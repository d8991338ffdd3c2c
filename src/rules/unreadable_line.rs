//! # What it finds
//! A line whose first word is a statement, but whose rest does not read as that statement. Also a `\` that has nothing
//! to continue with, and brackets nested beyond all use.
//!
//! # Why it matters
//! Such a line says nothing: the crystal is read as if it were not there. The lines around it are not affected.
//!
//! # Example
//! ```cren
//! material basin
//!   mass 0.067 me
//!   edge 0 meV
//!
//! crystal tern
//!   layer 8.0 nm off basin
//!                ^^^
//! ```
//!
//! # Instead
//! ```cren
//! material basin
//!   mass 0.067 me
//!   edge 0 meV
//!
//! crystal tern
//!   layer 8.0 nm of basin
//! ```
//!
//! # Fix
//! A `\` with nothing behind it is taken away, and a misspelt word is replaced, to be looked at. For the rest, the
//! message says what would have been readable.

use super::{Finding, Fix, Level, Replacement, Rule, Subject, Tier};
use crate::model::words::nearest;
use crate::syntax::words::{LATTICES, lattice, statement};
use crate::syntax::{Problem, ProblemKind};

/// The rule.
pub const RULE: Rule = Rule {
    name: "unreadable-line",
    group: "reading",
    level: Level::Error,
    tier: Tier::Read,
    waivable: false,
    source: include_str!("unreadable_line.rs"),
    check,
};

fn check(subject: &Subject<'_>, findings: &mut Vec<Finding>) {
    let problems = &subject.entry.section.problems;
    findings.extend(
        problems
            .iter()
            .filter_map(|problem| finding(subject, problem)),
    );
}

fn finding(subject: &Subject<'_>, problem: &Problem) -> Option<Finding> {
    let place = subject.place(problem.span);
    let of = |message: String| Finding::new(&RULE, place, message);
    match &problem.kind {
        ProblemKind::Unreadable { expected, found } => {
            let finding = of(format!("expected {expected}, found {found}"));
            let finding = finding.help_if(form(subject, problem));
            Some(finding.fix(nearest_word(expected, found).map(|word| {
                let title = format!("write `{word}`");
                Fix::guess(title, Replacement::new(place, word))
            })))
        }
        ProblemKind::DanglingContinuation => Some(
            of("`\\` continues this line, but the text ends here".to_owned())
                .help("write the rest of the statement, or take the `\\` away")
                .fix(Fix::safe("take the `\\` away", Replacement::new(place, ""))),
        ),
        ProblemKind::TooDeep => Some(
            of("this is too long, or nests too deep, to be read".to_owned())
                .help("name parts of the expression with `let`"),
        ),
        _ => None,
    }
}

/// The one of the words that were expected which is close to the word that stands there.
fn nearest_word(expected: &str, found: &str) -> Option<String> {
    let found = found.strip_prefix('`')?.strip_suffix('`')?;
    if expected.contains("kind of lattice") {
        return nearest(found, LATTICES.iter().map(|kind| kind.word));
    }
    let quoted = expected.split('`').skip(1).step_by(2);
    nearest(
        found,
        quoted.filter(|word| word.chars().all(char::is_alphanumeric)),
    )
}

/// How the statement on the line is written.
fn form(subject: &Subject<'_>, problem: &Problem) -> Option<String> {
    let line = subject.line_at(problem.span.start)?;
    let content = line.content.of(&subject.entry.section.text);
    let mut words = content.split([' ', '\t']).filter(|word| !word.is_empty());
    let first = words.next()?;
    let kind = words
        .next()
        .filter(|_| first == "lattice")
        .and_then(lattice);
    let form = match kind {
        Some(kind) => format!("lattice {}", kind.form),
        None => statement(first)?.form.to_owned(),
    };
    Some(format!("it is written `{form}`"))
}

#[cfg(test)]
mod tests {
    use super::super::fixture::{fixed, messages, silent};
    use super::RULE;

    #[test]
    fn says_what_was_expected_and_what_is_there() {
        let found = messages(
            &RULE,
            "crystal a\n  lattice chain 5 nm\n  layer 5 nm off b\n",
        );
        assert_eq!(found.len(), 1, "{found:?}");
        assert!(
            found
                .iter()
                .all(|text| text.starts_with("expected ") && text.contains("`off`"))
        );
    }

    #[test]
    fn a_misspelt_word_is_replaced() {
        let text = "crystal a\n  lattice chin 5 nm\n";
        assert_eq!(fixed(&RULE, text), "crystal a\n  lattice chain 5 nm\n");
        let text = "crystal a\n  layer 5 nm off b\n";
        assert_eq!(fixed(&RULE, text), "crystal a\n  layer 5 nm of b\n");
    }

    #[test]
    fn a_continued_line_is_readable() {
        silent(&RULE, "crystal a\n  lattice chain \\\n    5 nm\n");
        assert_eq!(
            messages(&RULE, "crystal a\n  lattice chain 5 nm \\").len(),
            1
        );
    }
}
