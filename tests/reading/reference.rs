//! The format's reference: its examples read, and it leaves out no word.

use std::collections::BTreeSet;

use crenate::syntax::read;
use crenate::syntax::words::{
    CLASSES, CLAUSES, FUNCTIONS, LATTICES, QUANTITIES, SHAPES, STATEMENTS,
};

const REFERENCE: &str = include_str!("../../grammar/README.md");

/// The fenced examples; those marked `crystal` stand without their heading.
fn examples() -> Vec<String> {
    REFERENCE
        .split("```cren")
        .skip(1)
        .map(|rest| {
            let (mark, rest) = rest.split_once('\n').unwrap();
            let (body, _) = rest.split_once("```").unwrap();
            match mark.trim() {
                "" => body.to_owned(),
                "crystal" => format!("crystal example\n{body}"),
                other => panic!("unknown mark {other}"),
            }
        })
        .collect()
}

#[test]
fn every_example_reads_without_a_problem() {
    let examples = examples();
    assert!(examples.len() >= 18);
    for example in examples {
        assert_eq!(
            crate::problems(&read(&example)),
            Vec::<String>::new(),
            "{example}"
        );
    }
}

#[test]
fn every_statement_has_an_example() {
    let mut shown = BTreeSet::new();
    for example in examples() {
        for entry in read(&example).entries {
            for statement in &entry.section.statements {
                shown.insert(statement.word.of(&entry.section.text).to_owned());
            }
        }
    }
    let listed: BTreeSet<_> = STATEMENTS
        .iter()
        .map(|entry| entry.word.to_owned())
        .collect();
    assert_eq!(shown, listed);
}

#[test]
fn every_word_is_mentioned() {
    let mentioned: BTreeSet<&str> = REFERENCE
        .split(|character: char| !character.is_alphanumeric() && character != '-')
        .collect();
    let lattices = LATTICES.iter().map(|kind| kind.word);
    for word in [CLASSES, CLAUSES, FUNCTIONS, QUANTITIES, SHAPES]
        .into_iter()
        .flatten()
        .copied()
        .chain(lattices)
    {
        assert!(mentioned.contains(word), "{word}");
    }
}
