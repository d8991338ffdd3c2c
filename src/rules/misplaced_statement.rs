//! # What it finds
//! A statement that does not belong in its kind of section, or that needs another dimension than its crystal has: a
//! `layer` on a square lattice, an `atom` in a chain.
//!
//! # Why it matters
//! The statement has no meaning there and is left out of the model.
//!
//! # Example
//! ```cren
//! material basin
//!   mass 0.067 me
//!   edge 0 meV
//!   filling 1
//!   ^^^^^^^
//!
//! crystal tern
//!   layer 8.0 nm of basin
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
//!   filling 1
//! ```
//!
//! # Fix
//! None: where the statement should go is for its author to say.

use super::{Finding, Level, Rule, Subject, Tier, words};
use crate::model::{Trouble, TroubleKind};
use crate::syntax::words::statement;
use crate::syntax::{Problem, ProblemKind, SectionKind};

/// The rule.
pub const RULE: Rule = Rule {
    name: "misplaced-statement",
    group: "reading",
    level: Level::Error,
    tier: Tier::Read,
    waivable: false,
    source: include_str!("misplaced_statement.rs"),
    check,
};

fn check(subject: &Subject<'_>, findings: &mut Vec<Finding>) {
    let problems = subject.entry.section.problems.iter();
    findings.extend(problems.filter_map(|problem| misplaced(subject, problem)));
    findings.extend(subject.troubles.iter().filter_map(wrong_dimension));
}

fn misplaced(subject: &Subject<'_>, problem: &Problem) -> Option<Finding> {
    let ProblemKind::Misplaced { word, found_in } = &problem.kind else {
        return None;
    };
    let message = format!("`{word}` does not belong {}", in_words(*found_in));
    let homes = statement(word).map_or(&[][..], |entry| entry.sections);
    let homes: Vec<_> = homes
        .iter()
        .map(|kind| in_words(*kind).to_owned())
        .collect();
    let help = (!homes.is_empty()).then(|| format!("it may stand {}", words::listed(&homes)));
    Some(Finding::new(&RULE, subject.place(problem.span), message).help_if(help))
}

fn in_words(kind: SectionKind) -> &'static str {
    match kind {
        SectionKind::Preamble => "before the first heading",
        SectionKind::Material => "in a `material`",
        SectionKind::Crystal => "in a `crystal`",
    }
}

fn wrong_dimension(trouble: &Trouble) -> Option<Finding> {
    let TroubleKind::WrongDimension { word, needs } = &trouble.kind else {
        return None;
    };
    let message = format!("`{word}` does not fit this crystal: it needs {needs}");
    Some(Finding::of_trouble(&RULE, trouble, message))
}

#[cfg(test)]
mod tests {
    use super::super::fixture::{messages, silent};
    use super::RULE;

    #[test]
    fn the_sections_that_would_take_it_are_named() {
        let found = messages(
            &RULE,
            "material a\n  mass 1 me\n  edge 0 meV\n  filling 2\n",
        );
        assert_eq!(found, ["`filling` does not belong in a `material`"]);
    }

    #[test]
    fn a_layer_on_a_square_lattice_does_not_fit() {
        let found = messages(
            &RULE,
            "crystal a\n  lattice square 8 nm\n  layer 8 nm at 0 meV\n",
        );
        assert_eq!(found.len(), 1, "{found:?}");
    }

    #[test]
    fn a_mass_belongs_in_both_kinds_of_section() {
        silent(
            &RULE,
            "material a\n  mass 1 me\n  edge 0 meV\ncrystal b\n  mass 1 me\n  layer 8 nm of a\n",
        );
    }
}
