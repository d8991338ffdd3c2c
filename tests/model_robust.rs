//! Text that nobody would write: a finding or a crystal, never a panic, and no crystal that is both whole and not finite.
#![allow(clippy::unwrap_used, clippy::indexing_slicing, missing_docs)]

mod model_support;

use crenate::model::{
    Crystal, FormfactorValues, ParameterKind, Setting, build_crystal, build_material,
};
use model_support::Desk;
use proptest::prelude::*;

const VALUES: [&str; 28] = [
    "0",
    "1",
    "-1",
    "4 nm",
    "0 nm",
    "-2 nm",
    "1e300 nm",
    "1e-300 nm",
    "5 meV",
    "-3 eV",
    "0.1 me",
    "87 u",
    "3 Er",
    "2 ML",
    "d",
    "e*2",
    "d/e",
    "1 nm ± 0.1 nm",
    "5 meV ± 200 %",
    "0 ± 1 meV",
    "sqrt(d*d)",
    "exp(800)",
    "1/0",
    "90 deg",
    "120 deg",
    "2 x",
    "0.5",
    "w ± 10 %",
];

const PATTERNS: [&str; 40] = [
    "mass V",
    "edge V",
    "monolayer V",
    "nonparabolic V",
    "rate V",
    "let d = V",
    "let e = V",
    "let w = d",
    "let x = V",
    "lattice chain V",
    "lattice square V",
    "lattice fcc V",
    "lattice hexagonal V axis V",
    "lattice oblique V by V angle V",
    "lattice rhombohedral V angle V",
    "lattice triclinic V by V by V angles V, V, V",
    "lattice vectors (V, V) (V, V)",
    "layer V at V",
    "layer V at V to V mass V",
    "layer V of m",
    "layer V of m to n",
    "stack 3 times V of m, V of n",
    "delta V at V",
    "profile = V * cos(2*pi*x/period)",
    "profile V to V = V / x",
    "table \"t.csv\" in nm, meV",
    "cosine 1 = V phase V",
    "cosine star (1, 1) = V",
    "depth (1, 1, 1) = V",
    "fourier 2 = V phase V",
    "site gaussian V sigma V at V",
    "site lorentzian V width V at V",
    "site box V size V at (V, V)",
    "atom A at (V, V, V)",
    "formfactor A V = V",
    "formfactor A curve = V * q * nm",
    "recoil V",
    "filling V",
    "require gap 1 between V and V",
    "require level 2 at (V, V) = V within V",
];

fn statement() -> impl Strategy<Value = String> {
    (0..PATTERNS.len(), prop::collection::vec(0..VALUES.len(), 7)).prop_map(|(pattern, values)| {
        let mut values = values.into_iter().cycle();
        let parts: Vec<String> = PATTERNS[pattern]
            .split('V')
            .map(|part| format!("{part}{}", VALUES[values.next().unwrap()]))
            .collect();
        let text = parts.concat();
        // The last value stands behind the last part only where the pattern ends in one.
        if PATTERNS[pattern].ends_with('V') {
            text
        } else {
            text[..text.len() - last_value(&text).len()].to_owned()
        }
    })
}

fn last_value(text: &str) -> &'static str {
    let mut found = "";
    for value in VALUES {
        if text.ends_with(value) && value.len() > found.len() {
            found = value;
        }
    }
    found
}

fn assert_whole(crystal: &Crystal) {
    let mut numbers = vec![crystal.mass.value];
    numbers.extend(crystal.vectors.iter().flatten().map(|one| one.value));
    numbers.extend(crystal.potential.layers.iter().flat_map(|layer| {
        [
            layer.length.value,
            layer.edge[0].value,
            layer.mass[1].mass.value,
        ]
    }));
    numbers.extend(
        crystal
            .potential
            .deltas
            .iter()
            .map(|delta| delta.strength.value),
    );
    numbers.extend(crystal.potential.waves.iter().map(|wave| wave.energy.value));
    for one in &crystal.potential.formfactors {
        if let FormfactorValues::At { energies, .. } = &one.form {
            numbers.extend(energies.iter().map(|energy| energy.value));
        }
    }
    assert!(
        numbers.iter().all(|number| number.is_finite()),
        "{crystal:#?}"
    );
    assert_eq!(crystal.vectors.len(), crystal.dimension);
    assert!(crystal.dimension > 0 && crystal.mass.value > 0.0);
    assert!(crystal.dimension > 1 || crystal.period().unwrap().value > 0.0);
    assert!(
        crystal
            .potential
            .layers
            .iter()
            .all(|layer| layer.length.value > 0.0)
    );
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(1500))]
    #[test]
    fn nothing_panics(
        preamble in prop::collection::vec(statement(), 0..3),
        material in prop::collection::vec(statement(), 0..5),
        own in prop::collection::vec(statement(), 0..8),
        more in prop::collection::vec(statement(), 0..4),
    ) {
        let text = format!(
            "{}\nmaterial m\n{}\nmaterial n like m\ncrystal a\n{}\ncrystal b like a\n{}\n",
            preamble.join("\n"), material.join("\n"), own.join("\n"), more.join("\n"),
        );
        let desk = Desk::of(&[("a.cren", &text), ("t.csv", "0,1\n1,2\n2,1\n3,0\n")]);
        let _ = desk.troubles();
        for name in ["a", "b"] {
            let built = desk.crystal(name);
            let mut setting = Setting::nominal();
            for parameter in built.crystal.parameters.iter().filter(|one| one.kind == ParameterKind::Draw) {
                setting.draws.insert(parameter.id, -1.0);
            }
            let drawn = desk.crystal_at(name, &setting);
            for crystal in [&built.crystal, &drawn.crystal] {
                if !crystal.broken {
                    assert_whole(crystal);
                    let _ = (crystal.potential_at(1e-9), crystal.breakpoints());
                }
            }
            // A crystal with an error says so.
            if built.troubles.iter().any(crenate::model::Trouble::breaks) {
                prop_assert!(built.crystal.broken);
            }
        }
    }
}

#[test]
fn sections_that_are_not_there_give_nothing() {
    let desk = Desk::new("crystal a\n  lattice chain 1 nm\n");
    let of = crenate::model::CrystalRef::clone(&desk.crystal_ref("a"));
    let gone = crenate::model::CrystalRef {
        section: crenate::syntax::SectionId(1),
        ..of
    };
    assert!(
        build_crystal(&desk.world, gone, &Setting::nominal(), &desk.files)
            .crystal
            .broken
    );
    let material = build_material(&desk.world, gone.file, gone.section, &Setting::nominal());
    assert!(material.mass.is_none());
}
