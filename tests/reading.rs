//! Reading: from text to statements, problems and their words.
#![allow(clippy::unwrap_used, clippy::indexing_slicing)]

use crenate::syntax::{Tree, read};

#[path = "reading/broken.rs"]
mod broken;
#[path = "reading/places.rs"]
mod places;
#[path = "reading/properties.rs"]
mod properties;
#[path = "reading/reference.rs"]
mod reference;
#[path = "reading/shape.rs"]
mod shape;
#[path = "reading/statements.rs"]
mod statements;
#[path = "reading/words.rs"]
mod words;

const SAMPLES: &[(&str, &str)] = &[
    ("layers", include_str!("data/reading/layers.cren")),
    ("waves", include_str!("data/reading/waves.cren")),
    ("solid", include_str!("data/reading/solid.cren")),
];

fn problems(tree: &Tree) -> Vec<String> {
    tree.entries
        .iter()
        .flat_map(|entry| {
            entry.section.problems.iter().map(|problem| {
                format!(
                    "{:?} at {:?}",
                    problem.kind,
                    problem.span.of(&entry.section.text)
                )
            })
        })
        .collect()
}

#[test]
fn the_samples_read_without_a_problem() {
    for (name, text) in SAMPLES {
        assert_eq!(problems(&read(text)), Vec::<String>::new(), "{name}");
    }
}
