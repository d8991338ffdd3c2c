//! The word lists and the grammar hold the same words.

use std::collections::BTreeSet;

use crenate::syntax::words::{
    CLASSES, CLAUSES, FIXED, FUNCTIONS, HEADINGS, LATTICES, QUANTITIES, SHAPES, STATEMENTS,
};
use crenate::syntax::{ProblemKind, SectionKind, read};

const GRAMMAR: &str = include_str!("../../grammar/crenate.pest");

/// Every literal of the grammar that is a word.
fn grammar_words() -> BTreeSet<String> {
    GRAMMAR
        .lines()
        .filter(|line| !line.starts_with("//"))
        .flat_map(|line| line.split('"').skip(1).step_by(2))
        .filter(|literal| {
            literal.len() > 1 && literal.starts_with(|first: char| first.is_ascii_lowercase())
        })
        .map(str::to_owned)
        .collect()
}

fn listed_words() -> BTreeSet<String> {
    let statements = STATEMENTS.iter().map(|entry| entry.word);
    let lattices = LATTICES.iter().map(|entry| entry.word);
    [HEADINGS, CLAUSES, FIXED, CLASSES, QUANTITIES, SHAPES]
        .into_iter()
        .flatten()
        .copied()
        .chain(statements)
        .chain(lattices)
        .map(str::to_owned)
        .collect()
}

#[test]
fn the_lists_and_the_grammar_agree() {
    assert_eq!(listed_words(), grammar_words());
}

#[test]
fn every_statement_word_is_known_and_placed() {
    for entry in STATEMENTS {
        for (kind, heading) in [
            (SectionKind::Preamble, ""),
            (SectionKind::Material, "material a\n"),
            (SectionKind::Crystal, "crystal a\n"),
        ] {
            let tree = read(&format!("{heading}{} ?", entry.word));
            let problem = &tree.entries.last().unwrap().section.problems[0].kind;
            let misplaced = matches!(problem, ProblemKind::Misplaced { .. });
            assert_eq!(
                misplaced,
                !entry.sections.contains(&kind),
                "{} in {kind:?}",
                entry.word
            );
            assert!(
                !matches!(problem, ProblemKind::UnknownStatement { .. }),
                "{}",
                entry.word
            );
        }
    }
}

#[test]
fn every_clause_word_is_no_unit_and_no_value() {
    for word in CLAUSES {
        for text in [format!("let a = 5 {word}"), format!("let a = {word}")] {
            assert!(
                read(&text).entries[0].section.statements.is_empty(),
                "{text}"
            );
        }
        let named = format!("let {word} = 5");
        assert_eq!(
            read(&named).entries[0].section.statements.len(),
            1,
            "{named}"
        );
    }
}

#[test]
fn every_function_reads_as_a_call() {
    for function in FUNCTIONS {
        let shape = crate::shape::of_let(&format!("{function}(1)"));
        assert_eq!(shape, format!("{function}(1)"));
    }
}
