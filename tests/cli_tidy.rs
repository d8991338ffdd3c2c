//! `crenate tidy` as a user meets it.
#![allow(missing_docs, clippy::unwrap_used)]

mod cli;

use cli::{Folder, run, run_with_input, stderr, stdout};

const LOOSE: &str = "crystal tern\n\n\n mass   0.07 me#light\n layer 8 nm at 0 meV\n";
const NEAT: &str = "crystal tern\n\n  mass      0.07 me  #light\n  layer     8 nm at 0 meV\n";

#[test]
fn files_are_rewritten_once() {
    let folder = Folder::new();
    folder.write("loose.cren", LOOSE);
    folder.write("neat.cren", NEAT);
    let output = run(&folder, &["tidy", "."]);
    assert_eq!(
        (output.status.code(), stdout(&output)),
        (Some(0), "./loose.cren\n".to_owned())
    );
    assert_eq!(folder.read("loose.cren"), NEAT);
    assert_eq!(stdout(&run(&folder, &["tidy", "."])), "");
}

#[test]
fn a_check_changes_nothing_and_fails() {
    let folder = Folder::new();
    folder.write("loose.cren", LOOSE);
    let output = run(&folder, &["tidy", "--check", "loose.cren"]);
    assert_eq!(
        (output.status.code(), stdout(&output)),
        (Some(1), "loose.cren\n".to_owned())
    );
    assert_eq!(folder.read("loose.cren"), LOOSE);
    folder.write("loose.cren", NEAT);
    assert_eq!(
        run(&folder, &["tidy", "--check", "loose.cren"])
            .status
            .code(),
        Some(0)
    );
}

#[test]
fn standard_input_goes_to_standard_output() {
    let folder = Folder::new();
    assert_eq!(
        stdout(&run_with_input(&folder, &["tidy", "-"], LOOSE)),
        NEAT
    );
}

#[test]
fn what_cannot_be_read_is_left_alone() {
    let folder = Folder::new();
    folder.write_bytes("latin.cren", b"crystal caf\xe9\n");
    let output = run(&folder, &["tidy", "latin.cren"]);
    assert_eq!(output.status.code(), Some(2));
    assert!(stderr(&output).contains("not text in UTF-8"));
}

#[test]
fn the_examples_are_tidy() {
    let examples = concat!(env!("CARGO_MANIFEST_DIR"), "/examples");
    let output = run(&Folder::new(), &["tidy", "--check", examples]);
    assert_eq!(
        (output.status.code(), stdout(&output)),
        (Some(0), String::new())
    );
}
