//! `like`: format section 5.4.
#![allow(clippy::unwrap_used, clippy::indexing_slicing, missing_docs)]

mod model_support;

use crenate::model::TroubleKind;
use model_support::{Desk, assert_close, only_trouble};

const BASE: &str = "let d = 2 nm
let twice = 2*d
crystal a
  mass 0.1 me
  let wall = 1.5*d
  layer d at 0
  layer wall at 100 meV
  delta 1 meV*nm at 0
  measure m = gap 1
  require gap 1 >= 10 meV
  require width 1 <= 20 meV
";

fn lengths(desk: &Desk, name: &str) -> Vec<f64> {
    let crystal = desk.crystal(name).crystal;
    crystal
        .potential
        .layers
        .iter()
        .map(|layer| layer.length.value)
        .collect()
}

#[track_caller]
fn desk(more: &str) -> Desk {
    let desk = Desk::new(&format!("{BASE}{more}"));
    assert!(desk.troubles().is_empty(), "{:#?}", desk.troubles());
    desk
}

#[test]
fn all_statements_are_taken_over() {
    let desk = desk("crystal b like a\n");
    let (a, b) = (desk.crystal("a").crystal, desk.crystal("b").crystal);
    assert_eq!(lengths(&desk, "a"), lengths(&desk, "b"));
    assert_eq!(a.potential.deltas.len(), b.potential.deltas.len());
    assert_eq!((a.targets.len(), b.targets.len()), (2, 2));
    assert_eq!(a.mass, b.mass);
    assert_eq!(
        (a.name.as_str(), b.name.as_str(), b.title.as_str()),
        ("a", "b", "b")
    );
    // Places point to where a thing is written.
    assert_eq!(b.potential.layers[0].place, a.potential.layers[0].place);
    assert_ne!(b.place, a.place);
}

#[test]
fn single_statements_replace_and_others_add() {
    let desk = desk("crystal b like a\n  mass 0.2 me\n  delta 2 meV*nm at 0.5\n");
    let b = desk.crystal("b").crystal;
    assert_close(b.mass.value, 0.2 * 9.109_383_713_9e-31, 1e-14);
    assert_eq!(b.potential.deltas.len(), 2);
    assert_eq!(b.potential.layers[0].mass[0].mass, b.mass);
}

#[test]
fn a_let_replaces_that_of_the_other_crystal() {
    let desk = desk("crystal b like a\n  let wall = 5 nm\n");
    assert_close(lengths(&desk, "b")[1], 5e-9, 1e-14);
    assert_close(lengths(&desk, "a")[1], 3e-9, 1e-14);
}

#[test]
fn a_let_replaces_that_of_the_preamble_in_all_that_is_taken_over() {
    let desk = desk("crystal b like a\n  let d = 4 nm\n");
    let b = lengths(&desk, "b");
    assert_close(b[0], 4e-9, 1e-14);
    // The other crystal's own `let` is taken over too, and sees the new one.
    assert_close(b[1], 6e-9, 1e-14);
}

#[test]
fn the_preambles_own_values_stay_what_they_are() {
    let text =
        BASE.replace("layer d at 0", "layer twice at 0") + "crystal b like a\n  let d = 4 nm\n";
    assert_close(lengths(&Desk::new(&text), "b")[0], 4e-9, 1e-14);
    let text = text.replace("let d = 4 nm", "let d = 5 nm");
    assert_close(lengths(&Desk::new(&text), "b")[0], 4e-9, 1e-14);
}

#[test]
fn layers_replace_all_layers() {
    let desk = desk("crystal b like a\n  layer 7 nm at 50 meV\n");
    assert_eq!(lengths(&desk, "b").len(), 1);
}

#[test]
fn a_requirement_replaces_that_on_the_same_quantity() {
    let desk = desk(
        "crystal b like a\n  require gap   1 >= 30 meV\n  measure m = gap 2\n  require metal\n",
    );
    let texts: Vec<String> = desk
        .crystal("b")
        .crystal
        .targets
        .iter()
        .map(|one| one.text.clone())
        .collect();
    assert_eq!(texts, ["width 1 <= 20 meV", "gap 1 >= 30 meV", "metal"]);
    let measures = desk.crystal("b").crystal.measures;
    assert_eq!(measures.len(), 1);
    assert_eq!(desk.world.text_at(measures[0].place), "measure m = gap 2");
}

#[test]
fn a_chain_of_likes() {
    let desk = desk("crystal b like a\n  let d = 4 nm\ncrystal c like b\n  mass 0.3 me\n");
    assert_close(lengths(&desk, "c")[1], 6e-9, 1e-14);
}

#[test]
fn quantities_speak_of_the_crystal_that_is_built() {
    let desk = desk("crystal b like a\n");
    let b = desk.crystal("b").crystal;
    let quantities = b.measures[0].expression.quantities();
    assert_eq!(quantities[0].of, desk.crystal_ref("b"));
}

#[test]
fn circles_are_found_once_each() {
    let desk = Desk::new("crystal a like b\ncrystal b like a\n");
    let troubles = desk.troubles();
    let circles: Vec<&TroubleKind> = troubles
        .iter()
        .map(|(kind, _)| kind)
        .filter(|kind| matches!(kind, TroubleKind::CircularName { .. }))
        .collect();
    assert_eq!(circles.len(), 2, "{troubles:?}");
    assert!(desk.crystal("a").crystal.broken);
    match only_trouble("material a like a\n").0 {
        TroubleKind::CircularName { circle } => assert_eq!(circle, ["a", "a"]),
        other => panic!("{other:?}"),
    }
}

#[test]
fn an_unknown_model_is_named_with_the_nearest() {
    match only_trouble(&format!(
        "{BASE}crystal tern_8\n  lattice chain 2 nm\ncrystal b like tren_8\n  lattice chain 2 nm\n"
    ))
    .0
    {
        TroubleKind::UnknownName {
            wanted, nearest, ..
        } => {
            assert_eq!((wanted, nearest.as_deref()), ("crystal", Some("tern_8")));
        }
        other => panic!("{other:?}"),
    }
}

#[test]
fn a_mistake_is_said_where_it_is_written_and_only_once() {
    let text = "crystal a\n  layer 4 nm at 3 nm\ncrystal b like a\n";
    let (kind, at) = only_trouble(text);
    assert!(matches!(kind, TroubleKind::WrongUnit { .. }));
    assert_eq!(at, "3 nm");
    assert!(Desk::new(text).crystal("b").crystal.broken);
    // One that only the taking over makes is said there.
    let text = "crystal a\n  let w = 4 nm\n  layer w at 0\ncrystal b like a\n  let w = 4 meV\n";
    assert_eq!(only_trouble(text).1, "w");
    let built = Desk::new(text).crystal("b");
    assert_eq!(built.troubles[0].related[0].1, "as `b` takes it over");
    // So is a lattice that the new layers do not fill, at the layers.
    let text =
        "crystal a\n  lattice chain 4 nm\n  layer 4 nm at 0\ncrystal b like a\n  layer 3 nm at 0\n";
    assert_eq!(only_trouble(text).1, "layer 3 nm at 0");
}

#[test]
fn a_let_that_replaces_another_is_used_by_what_is_taken_over() {
    let desk =
        Desk::new("crystal a\n  let w = 4 nm\n  layer w at 0\ncrystal b like a\n  let w = 5 nm\n");
    let built = desk.crystal("b");
    let used = built.references.iter().find(|one| one.name == "w").unwrap();
    assert_eq!(
        used.definition.unwrap().section,
        desk.crystal_ref("b").section
    );
    assert_eq!(used.place.section, desk.crystal_ref("a").section);
}

#[test]
fn materials_take_over_fields_and_lets() {
    let desk = Desk::new(
        "material a
  let m = 0.1 me
  mass m
  edge 100 meV
material b like a
  let m = 0.2 me
material c like a
  edge 50 meV
",
    );
    assert!(desk.troubles().is_empty(), "{:#?}", desk.troubles());
    let me = 9.109_383_713_9e-31;
    let mass = |name: &str| desk.material(name).mass.unwrap().value.value;
    assert_close(mass("a"), 0.1 * me, 1e-14);
    assert_close(mass("b"), 0.2 * me, 1e-14);
    let edge = |name: &str| desk.material(name).edge.unwrap();
    assert_close(edge("c").value.value, 50.0 * 1.602_176_634e-22, 1e-14);
    assert_eq!(edge("b").place, edge("a").place);
}

#[test]
fn names_are_read_where_the_text_stands() {
    let library =
        "let d = 6 nm\nmaterial well\n  edge 0\n  mass 0.5 me\ncrystal base\n  layer d of well\n";
    let root = "use \"lib.cren\"\nlet own = 1 nm\nmaterial other\n  edge 1 meV\ncrystal b like base\n  delta 1 meV*nm at own\n";
    let desk = Desk::of(&[("a.cren", root), ("lib.cren", library)]);
    assert!(desk.troubles().is_empty(), "{:#?}", desk.troubles());
    assert_close(lengths(&desk, "b")[0], 6e-9, 1e-14);
    assert_eq!(
        desk.crystal("b").crystal.potential.layers[0].mass_origin,
        "of material well"
    );
}
