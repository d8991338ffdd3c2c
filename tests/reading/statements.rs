//! Single statements read as what they say, with their places.

use crenate::syntax::{
    BandQuantityKind, FormfactorForm, LayerContent, Point, ProblemKind, Relation, Requirement,
    Shape, StatementKind, WaveKind, read,
};

use crate::shape;

/// The one statement of a crystal.
fn one(line: &str) -> StatementKind {
    shape::statement(&format!("crystal c\n  {line}\n")).kind
}

#[test]
fn lattices_keep_lengths_axis_and_angles_apart() {
    let StatementKind::Lattice(form) =
        one("lattice triclinic 1 nm by 2 nm by 3 nm angles 70 deg, 80 deg, 90 deg")
    else {
        panic!("a lattice");
    };
    let shapes =
        |values: &[crenate::syntax::Value]| values.iter().map(shape::value).collect::<Vec<_>>();
    assert_eq!(form.kind.text, "triclinic");
    assert_eq!(shapes(&form.lengths), ["1[nm]", "2[nm]", "3[nm]"]);
    assert_eq!(shapes(&form.angles), ["70[deg]", "80[deg]", "90[deg]"]);
    let StatementKind::Lattice(form) = one("lattice hexagonal 3 Å axis 5 Å ± 1 %") else {
        panic!("a lattice");
    };
    assert_eq!(shapes(&form.lengths), ["3[Å]"]);
    assert_eq!(
        form.axis.as_ref().map(shape::value).as_deref(),
        Some("5[Å] ± 1[%]")
    );
    let StatementKind::Lattice(form) = one("lattice vectors (5 nm)") else {
        panic!("a lattice");
    };
    assert_eq!(form.vectors.len(), 1);
    assert!(form.vectors[0].bracketed);
}

#[test]
fn layers_read_in_all_forms() {
    let StatementKind::Layer(part) = one("layer 5 nm at 0 meV to 35 meV mass 0.08 me") else {
        panic!("a layer");
    };
    let LayerContent::At { from, to, mass } = part.content else {
        panic!("at");
    };
    assert_eq!(shape::value(&from), "0[meV]");
    assert_eq!(to.as_ref().map(shape::value).as_deref(), Some("35[meV]"));
    assert_eq!(mass.as_ref().map(shape::value).as_deref(), Some("0.08[me]"));
    let StatementKind::Stack { times, parts } =
        one("stack 3 times 2 nm of a, 1 nm of b to c, 1 nm at 0")
    else {
        panic!("a stack");
    };
    assert_eq!(times.value, 3);
    assert_eq!(parts.len(), 3);
    assert!(matches!(&parts[1].content, LayerContent::Of { to: Some(to), .. } if to.text == "c"));
}

#[test]
fn waves_and_sites_read_in_all_forms() {
    let StatementKind::Wave {
        kind,
        star,
        index,
        phase,
        ..
    } = one("depth star (1, -1,+0) = 8 Er phase 90 deg")
    else {
        panic!("a wave");
    };
    assert_eq!(kind, WaveKind::Depth);
    assert!(star.is_some() && phase.is_some());
    assert_eq!(
        index
            .entries
            .iter()
            .map(|entry| entry.value)
            .collect::<Vec<_>>(),
        [1, -1, 0]
    );
    let StatementKind::Site {
        shape: Shape::Box { sizes },
        at,
        ..
    } = one("site box 5 meV size 1 nm by 2 nm at (0.5, 1 nm)")
    else {
        panic!("a box");
    };
    assert_eq!(sizes.len(), 2);
    assert!(at.bracketed && at.entries.len() == 2);
    let StatementKind::Delta { at, .. } = one("delta 1 eV*nm at (period)/2") else {
        panic!("a delta");
    };
    assert!(!at.bracketed);
    assert_eq!(shape::value(&at.entries[0]), "(period/2)");
    let StatementKind::Formfactor { second, form, .. } =
        one("formfactor A and B 11/1 = 0.1 Ry, 0.2 Ry")
    else {
        panic!("a form factor");
    };
    assert_eq!(second.unwrap().text, "B");
    assert!(matches!(form, FormfactorForm::At { energies, .. } if energies.len() == 2));
}

#[test]
fn targets_read_in_all_forms() {
    let requirement = |line: &str| match one(line) {
        StatementKind::Require(requirement) => requirement,
        other => panic!("{other:?}"),
    };
    assert!(
        matches!(requirement("require semimetal"), Requirement::Class(word) if word.text == "semimetal")
    );
    let Requirement::GapIs { quantity, kind } = requirement("require gap 1 of other indirect")
    else {
        panic!("a kind of gap");
    };
    assert_eq!(quantity.of.unwrap().text, "other");
    assert_eq!(kind.text, "indirect");
    let Requirement::Compare {
        relation: Relation::Near { within, .. },
        ..
    } = requirement("require width 1 = 32 meV within 5 %")
    else {
        panic!("near");
    };
    assert_eq!(shape::value(&within), "5[%]");
    let Requirement::Compare {
        expression,
        relation: Relation::Between(..),
    } = requirement("require mass top 2 between 1 me and 2 me")
    else {
        panic!("between");
    };
    assert!(shape::expression(&expression).starts_with("MassTop"));
    // A class word may also be a value's name.
    assert!(matches!(
        requirement("require metal >= 3"),
        Requirement::Compare { .. }
    ));
}

#[test]
fn quantities_know_their_crystal_and_point() {
    let quantities = |line: &str| {
        let statement = shape::statement(&format!("crystal c\n{line}"));
        let mut found = Vec::new();
        statement.quantities(&mut |quantity| found.push(quantity.clone()));
        found
    };
    let found =
        quantities("measure line = level 2 at (0.5, 0) of other - hopping 1 by (1,0)*2 + fermi");
    assert_eq!(found.len(), 3);
    assert!(
        matches!(&found[0].kind, BandQuantityKind::Level { at: Point::Fractions(position), .. } if position.entries.len() == 2)
    );
    assert_eq!(
        found[0].of.as_ref().map(|word| word.text.as_str()),
        Some("other")
    );
    assert!(
        matches!(&found[1].kind, BandQuantityKind::Hopping { by, .. } if by.entries.len() == 2)
    );
    assert_eq!(found[2].kind, BandQuantityKind::Fermi);
}

#[test]
fn one_unreadable_line_hides_no_other() {
    let tree = read(
        "crystal a\n  mass ?\n  layer 5 nm of b\n  lay\n  title \"t\"\nmaterial !\n  mass 1 me\n",
    );
    let counts: Vec<_> = tree
        .entries
        .iter()
        .map(|entry| (entry.section.statements.len(), entry.section.problems.len()))
        .collect();
    assert_eq!(counts, [(0, 0), (2, 2), (1, 1)]);
    assert!(tree.entries[2].section.name.is_none());
}

#[test]
fn continuations_join_lines_but_no_heading() {
    let tree =
        read("crystal a\n  layer 5 nm \\ # thick\n    of \\\n  b\n  title \"x\" \\\ncrystal c\n");
    let section = &tree.entries[1].section;
    assert_eq!(section.statements.len(), 2);
    assert_eq!(section.problems.len(), 1);
    assert_eq!(section.problems[0].kind, ProblemKind::DanglingContinuation);
    assert_eq!(section.problems[0].span.of(&section.text), "\\");
    assert_eq!(tree.entries[2].section.name.as_ref().unwrap().text, "c");
}

#[test]
fn control_characters_are_told_wherever_they_stand() {
    for text in [
        "let a = 1 # \u{7}",
        "use \"a\u{0}b\"",
        "let a\u{85}= 1",
        "\u{7f}",
        "let a = 1\u{feff}",
    ] {
        let tree = read(text);
        let problems = &tree.entries[0].section.problems;
        assert_eq!(problems.len(), 1, "{text:?}");
        assert!(
            matches!(problems[0].kind, ProblemKind::StrayCharacter { .. }),
            "{text:?}"
        );
    }
    assert_eq!(
        read("let a = 1 # \u{7}").entries[0]
            .section
            .statements
            .len(),
        1
    );
}

#[test]
fn names_compare_after_normalisation() {
    let tree = read("material cafe\u{301}\ncrystal b like caf\u{e9}");
    let text = |index: usize| {
        tree.entries[index]
            .section
            .heading_words()
            .last()
            .unwrap()
            .text
            .clone()
    };
    assert_eq!(text(1), text(2));
}
