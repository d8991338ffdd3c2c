//! `crenate tidy` as a user meets it.
#![allow(missing_docs, clippy::unwrap_used)]

mod cli;
mod memory;

use std::path::PathBuf;
use std::sync::OnceLock;

use cli::{Folder, run, run_with_input, stderr, stdout};
use crenate::report::analyst::{Analyst, Request};
use crenate::report::tidy::tidy;
use crenate::rules::Tier;
use crenate::syntax::read;
use memory::Memory;
use proptest::prelude::*;

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

/// A sound text with statements of many kinds.
const SOUND: &str = r#"
let well = 5.4 nm # the well
# The well.
material basin
  mass 0.067 me
  edge 0 meV ± 2 meV
material wall like basin
  edge 235 meV
  source "made up,  with # two blanks"
# One cell.
crystal tern
  layer well of basin
  layer 2.6 nm ± 0.1 nm of wall
  require gap 1 >= 40 meV
crystal pair
  mass 0.5 me
  lattice chain \
    1.2 nm
  cosine 1 = 300 meV phase 90 deg
  waive narrow-gap because "not  here"
"#;

/// Lines that cannot be read.
const UNREADABLE: [&str; 5] = [
    "flavour   very  strange",
    "layer  5 nm   off basin",
    "mass \"half  a string",
    "x  =  3,  4",
    "<<<<<<<  ours",
];

/// What a text means: what is found in it, and the bands of its crystals to the last bit.
fn meaning(text: &str) -> Vec<String> {
    static ANALYST: OnceLock<Analyst> = OnceLock::new();
    let path = PathBuf::from("/a.cren");
    let analysis = ANALYST.get_or_init(Analyst::default).analyse(&Request {
        source: &Memory::of([(path.clone(), text)]),
        roots: std::slice::from_ref(&path),
        depth: Tier::Bands,
        cancel: &|| false,
    });
    let file = analysis.file(&path).unwrap();
    let findings = file.findings.iter();
    let mut told: Vec<String> = findings
        .map(|finding| format!("{}: {}", finding.rule, finding.message))
        .collect();
    for (section, crystal) in file.crystals(&[]) {
        told.push(format!("{}: {:?}", crystal.name, section.solution()));
        let targets = section.targets.iter();
        told.extend(targets.map(|target| format!("{:?} {:?}", target.state, target.worst)));
    }
    told
}

/// A line with other blanks between its words, strings and comments as they were.
fn respaced(line: &str, blanks: &[&str]) -> String {
    let mut text = String::new();
    let (mut quoted, mut comment) = (false, false);
    let mut next = blanks.iter().cycle();
    for character in line.trim_start().chars() {
        quoted ^= character == '"';
        comment |= character == '#' && !quoted;
        match character {
            ' ' if !quoted && !comment => text += next.next().unwrap(),
            _ => text.push(character),
        }
    }
    text
}

fn blanks() -> impl Strategy<Value = &'static str> {
    prop::sample::select(vec![" ", "  ", "\t", "    ", " \t "])
}

/// The sound text, line by line laid out in another way, with lines that cannot be read between.
fn loose() -> impl Strategy<Value = (String, Vec<&'static str>)> {
    let count = SOUND.lines().count();
    let line = (
        prop::sample::select(vec!["", " ", "\t", "        "]),
        prop::collection::vec(blanks(), 1..4),
        prop::sample::select(vec!["", "", "", "\n", "\n\n\n", "  "]),
        prop::option::weighted(0.06, prop::sample::select(UNREADABLE.to_vec())),
    );
    let lines = prop::collection::vec(line, count);
    (lines, any::<bool>()).prop_map(|(lines, windows)| {
        let mut text = String::new();
        let mut unreadable = Vec::new();
        for (line, (indent, blanks, tail, more)) in SOUND.lines().zip(lines) {
            let continues = line.ends_with('\\');
            text += &format!("{indent}{}", respaced(line, &blanks));
            text += "\n";
            if !continues {
                text += tail;
                text += if tail == "  " { "\n" } else { "" };
                if let Some(more) = more {
                    text += &format!("{indent}{more}\n");
                    unreadable.push(more);
                }
            }
        }
        let text = if windows {
            text.replace('\n', "\r\n")
        } else {
            text
        };
        (text, unreadable)
    })
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 96, failure_persistence: None, ..ProptestConfig::default() })]

    #[test]
    fn tidying_comes_to_rest_and_changes_no_meaning((text, unreadable) in loose()) {
        let tidied = tidy(&read(&text));
        prop_assert_eq!(&tidy(&read(&tidied)), &tidied);
        prop_assert_eq!(meaning(&tidied), meaning(&text));
        for line in unreadable {
            prop_assert!(tidied.lines().any(|tidy| tidy.trim() == line), "{line} is not in\n{tidied}");
        }
        let plain = |text: &str| text.split_whitespace().collect::<String>();
        prop_assert_eq!(plain(&tidied), plain(&text));
    }

    #[test]
    fn any_text_comes_to_rest(text in "(crystal |material |layer |\"|#|\\\\|\n|\r\n|\r|[ \t]|5 nm|of |é|\u{feff}|×|let a = 2){0,40}") {
        let tidied = tidy(&read(&text));
        prop_assert_eq!(&tidy(&read(&tidied)), &tidied);
    }
}
