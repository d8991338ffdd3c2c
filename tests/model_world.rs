//! Files and names: `use`, what is in sight, what results depend on.
#![allow(clippy::unwrap_used, clippy::indexing_slicing, missing_docs)]

mod model_support;

use std::path::Path;

use crenate::model::{NameSort, TroubleKind, values_in_scope};
use model_support::{Desk, assert_close};

const LAYER: &str = "material m\n  edge 0\n  mass 1 me\n";

#[test]
fn a_file_sees_what_it_uses_and_no_further() {
    let files = [
        ("a.cren", "use \"b.cren\"\ncrystal x\n  layer d of m\n"),
        (
            "b.cren",
            "use \"sub/c.cren\"\nlet d = 2*deep\nmaterial m\n  edge e\n  mass 1 me\n",
        ),
        (
            "sub/c.cren",
            "let deep = 2 nm\nlet e = 1 meV\nmaterial far\n  edge 0\n",
        ),
    ];
    let desk = Desk::of(&files);
    assert!(desk.troubles().is_empty(), "{:?}", desk.troubles());
    assert_eq!(desk.world.files().len(), 3);
    assert_close(
        desk.crystal("x").crystal.potential.layers[0].length.value,
        4e-9,
        1e-14,
    );
    let file = desk.file();
    assert!(desk.world.material(file, "m").is_some());
    assert!(desk.world.material(file, "far").is_none());
    assert!(desk.world.preamble_let(file, "deep").is_none());
    let c = desk.world.file_at(Path::new("/w/sub/./c.cren")).unwrap();
    assert_eq!(
        desk.world.file(c.id).unwrap().path,
        Path::new("/w/sub/c.cren")
    );
}

#[test]
fn missing_and_outer_files_are_said_at_the_use() {
    let desk = Desk::of(&[("a.cren", "use \"gone.cren\"\nuse \"../out.cren\"\n")]);
    match desk.troubles().as_slice() {
        [
            (TroubleKind::MissingFile { path, why }, at),
            (TroubleKind::MissingFile { why: outer, .. }, _),
        ] => {
            assert_eq!((path.as_str(), at.as_str()), ("gone.cren", "\"gone.cren\""));
            assert!(why.contains("no such file") && outer.contains("outside"));
        }
        other => panic!("{other:?}"),
    }
    let desk = Desk::of(&[("a.cren", "use \"here.cren\"\n"), ("here.cren", "")]);
    assert!(desk.troubles().is_empty());
}

#[test]
fn circles_of_use_are_said_and_names_still_resolve() {
    let desk = Desk::of(&[
        ("a.cren", "use \"b.cren\"\ncrystal x\n  layer 1 nm of m\n"),
        ("b.cren", &format!("use \"a.cren\"\n{LAYER}")),
    ]);
    match desk.troubles().as_slice() {
        [(TroubleKind::CircularUse { circle }, at)] => {
            assert_eq!(circle.as_slice(), ["a.cren", "b.cren", "a.cren"]);
            assert_eq!(at, "\"b.cren\"");
        }
        other => panic!("{other:?}"),
    }
    assert!(!desk.crystal("x").crystal.broken);
    let desk = Desk::new("use \"a.cren\"\n");
    assert!(matches!(
        desk.troubles()[0].0,
        TroubleKind::CircularUse { .. }
    ));
    // Two ways to one file are no circle.
    let desk = Desk::of(&[
        ("a.cren", "use \"b.cren\"\nuse \"c.cren\"\n"),
        ("b.cren", "use \"c.cren\"\n"),
        ("c.cren", ""),
    ]);
    assert!(desk.troubles().is_empty());
}

#[test]
fn names_given_here_and_in_a_used_file_are_taken() {
    let desk = Desk::of(&[
        (
            "a.cren",
            &format!("use \"b.cren\"\nlet d = 1\n{LAYER}crystal x\n  lattice chain 1 nm\n"),
        ),
        (
            "b.cren",
            &format!("let d = 2\n{LAYER}crystal x\n  lattice chain 1 nm\n"),
        ),
    ]);
    let troubles = desk.troubles();
    assert_eq!(troubles.len(), 2, "{troubles:?}");
    assert!(
        troubles
            .iter()
            .all(|(kind, _)| matches!(kind, TroubleKind::TakenName { .. }))
    );
    // A crystal of one's own comes before one of a used file.
    assert_eq!(desk.crystal_ref("x").file, desk.file());
}

#[test]
fn references_know_their_definitions() {
    let desk = Desk::of(&[
        (
            "a.cren",
            "use \"b.cren\"\nlet d = 2*w\ncrystal y\n  layer 1 nm at 0\ncrystal x like y\n  layer d of m\n  measure g = gap 1 of y\n  require g >= 1 meV\n",
        ),
        ("b.cren", &format!("let w = 1 nm\n{LAYER}")),
    ]);
    let built = desk.crystal("x");
    let words: Vec<(&str, NameSort, &str)> = built
        .references
        .iter()
        .map(|one| {
            (
                desk.world.text_at(one.place),
                one.sort,
                desk.world.text_at(one.definition.unwrap()),
            )
        })
        .collect();
    for wanted in [
        ("y", NameSort::Crystal, "y"),
        ("d", NameSort::Value, "d"),
        ("m", NameSort::Material, "m"),
        ("g", NameSort::Measure, "g"),
    ] {
        assert!(words.contains(&wanted), "{wanted:?} {words:?}");
    }
    assert_eq!(
        words
            .iter()
            .filter(|word| word.1 == NameSort::Crystal)
            .count(),
        2
    );
    let preamble = desk.preamble();
    let file = preamble
        .references
        .iter()
        .find(|one| one.sort == NameSort::File)
        .unwrap();
    assert_eq!(
        (file.name.as_str(), desk.world.text_at(file.place)),
        ("b.cren", "\"b.cren\"")
    );
    assert_eq!(
        file.definition.unwrap().file,
        desk.world.file_at(Path::new("/w/b.cren")).unwrap().id
    );
    let w = preamble
        .references
        .iter()
        .find(|one| one.name == "w")
        .unwrap();
    assert_eq!(w.definition.unwrap().file, file.definition.unwrap().file);
}

#[test]
fn values_in_sight_come_nearest_first() {
    let desk = Desk::of(&[
        (
            "a.cren",
            "use \"b.cren\"\nlet d = 1 nm\nlet e = 2 nm\ncrystal x\n  monolayer 0.5 nm\n  let e = 3 ML\n  lattice chain e\n",
        ),
        ("b.cren", "let far = 7 nm\n"),
    ]);
    let section = desk.crystal_ref("x").section;
    let values = values_in_scope(&desk.world, desk.file(), section);
    let found: Vec<(&str, f64)> = values
        .iter()
        .map(|one| (one.name.as_str(), (one.value.value * 1e10).round()))
        .collect();
    assert_eq!(found, [("e", 15.0), ("d", 10.0), ("far", 70.0)]);
}

const ONE: &str = "use \"b.cren\"
let d = 1 nm
material m
  edge 0
  mass 1 me
crystal one
  layer d of m
crystal two like one
  table \"t.csv\" in nm, meV
crystal three
  lattice chain 1 nm
  require gap 1 of one >= 0
crystal four
  lattice chain 1 nm
";

fn hashes(root: &str, used: &str, table: &str) -> Vec<u64> {
    let desk = Desk::of(&[
        ("a.cren", root),
        ("b.cren", used),
        ("c.cren", "let z = 1\n"),
        ("t.csv", table),
    ]);
    ["one", "two", "three", "four"]
        .iter()
        .map(|name| {
            desk.world
                .dependency_hash(desk.file(), desk.crystal_ref(name).section)
        })
        .collect()
}

/// Which of the four crystals an edit touches.
#[track_caller]
fn touched(root: &str, used: &str, table: &str) -> Vec<bool> {
    let before = hashes(ONE, "let w = 1\n", "0,1\n");
    let after = hashes(root, used, table);
    before.iter().zip(&after).map(|(a, b)| a != b).collect()
}

#[test]
fn results_depend_on_what_they_are_made_of_and_on_nothing_else() {
    let used = "let w = 1\n";
    assert_eq!(touched(ONE, used, "0,1\n"), [false; 4]);
    let edited = |from: &str, to: &str| touched(&ONE.replace(from, to), used, "0,1\n");
    assert_eq!(edited("let d = 1 nm", "let d = 2 nm"), [true; 4]);
    assert_eq!(edited("mass 1 me", "mass 2 me"), [true; 4]);
    assert_eq!(
        edited("layer d of m", "layer 2*d of m"),
        [true, true, true, false]
    );
    assert_eq!(
        edited(
            "crystal four\n  lattice chain 1 nm",
            "crystal four\n  lattice chain 2 nm"
        ),
        [false, false, false, true]
    );
    assert_eq!(touched(ONE, "let w = 2\n", "0,1\n"), [true; 4]);
    assert_eq!(touched(ONE, used, "0,2\n"), [false, true, false, false]);
    // Through two files, and with what only moves.
    assert_eq!(
        touched(ONE, "use \"c.cren\"\nlet w = 1\n", "0,1\n"),
        [true; 4]
    );
    assert_eq!(
        edited(
            "crystal one",
            "crystal zero\n  lattice chain 9 nm\ncrystal one"
        ),
        [false; 4]
    );
}

#[test]
fn places_are_found_again_in_the_file() {
    let text = "let d = 1 nm\ncrystal one\n  lattice chain 3 nm\n";
    let desk = Desk::new(text);
    let crystal = desk.crystal("one").crystal;
    let literal = crystal
        .parameters
        .iter()
        .find(|one| one.text == "3 nm")
        .unwrap();
    let (file, span) = desk.world.place_to_absolute(literal.place).unwrap();
    assert_eq!(file, desk.file());
    assert_eq!(span.of(text), "3 nm");
    assert_eq!(
        desk.world.section_at(file, span.start).unwrap().name(),
        "one"
    );
    assert_eq!(
        desk.world.crystals(file),
        [(desk.crystal_ref("one").section, 1)]
    );
}
