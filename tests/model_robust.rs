//! Text that nobody would write: a finding or a crystal, never a panic, and no crystal that is both whole and not finite.
#![allow(clippy::unwrap_used, clippy::indexing_slicing, missing_docs)]

mod model_support;

use crenate::model::{
    Crystal, FormfactorValues, ParameterKind, Setting, build_crystal, build_material,
};
use model_support::Desk;
use proptest::prelude::*;
use proptest::test_runner::{RngAlgorithm, TestRng, TestRunner};

/// Values by the letter of their place: a length, energy, mass, number, angle, energy times length; and odd ones for any place.
const VALUES: [(char, &[&str]); 6] = [
    (
        'L',
        &[
            "4 nm",
            "0.3 nm",
            "d",
            "2*d",
            "1 nm ± 0.1 nm",
            "0 nm + 1 nm",
            "sqrt(d*d)",
        ],
    ),
    (
        'E',
        &[
            "5 meV",
            "0",
            "-3 eV",
            "1 eV ± 2 %",
            "e",
            "min(e, 2 eV)",
            "0 ± 1 meV",
        ],
    ),
    ('M', &["0.1 me", "87 u", "0.067 me ± 1 %"]),
    ('N', &["1", "0.5", "2 - 1", "0"]),
    ('A', &["90 deg", "80 deg ± 1 deg", "1.2", "60 deg"]),
    ('S', &["1 meV*nm", "e*d", "0"]),
];

const ODD: [&str; 17] = [
    "0",
    "1",
    "-1",
    "0 nm",
    "-2 nm",
    "1e300 nm",
    "1e-300 nm",
    "5 meV ± 200 %",
    "3 Er",
    "2 ML",
    "exp(800)",
    "1/0",
    "2 x",
    "x",
    "w ± 10 %",
    "d/e",
    "(1e200 nm)^2",
];

const PATTERNS: [&str; 42] = [
    "mass M",
    "edge E",
    "monolayer L",
    "nonparabolic E",
    "rate N",
    "let d = L",
    "let e = E",
    "let w = d",
    "let v = N",
    "lattice chain L",
    "lattice square L",
    "lattice fcc L",
    "lattice hexagonal L axis L",
    "lattice oblique L by L angle A",
    "lattice rhombohedral L angle A",
    "lattice triclinic L by L by L angles A, A, A",
    "lattice vectors (L, 0) (0, L)",
    "layer L at E",
    "layer L at E to E mass M",
    "layer L of m",
    "layer L of m to n",
    "stack 3 times L of m, L of n",
    "delta S at N",
    "profile = E * cos(2*pi*x/period)",
    "profile L to L = E * x/d",
    "table \"t.csv\" in nm, meV",
    "cosine 1 = E phase A",
    "cosine star (1, 1) = E",
    "depth (1, 1, 1) = E",
    "fourier 2 = E phase A",
    "site gaussian E sigma L at L",
    "site lorentzian E width L at N",
    "site box E size L at (N, N)",
    "atom A at (N, N, L)",
    "formfactor A N = E",
    "formfactor A curve = E * q * d",
    "recoil L",
    "filling N",
    "temperature E/kB",
    "require gap 1 between E and E",
    "require level 2 at N = E within 5 %",
    "measure g = gap 2 - E",
];

/// Headings' first lines, so that some crystals have a lattice that fits.
const FIRST: [&str; 5] = [
    "",
    "lattice chain 4 nm",
    "layer 2 nm at 0",
    "lattice square 1 nm",
    "lattice fcc 1 nm",
];

/// A statement; one value in ten is odd.
fn statement() -> impl Strategy<Value = String> {
    (0..PATTERNS.len(), prop::collection::vec(0..10_000_usize, 7)).prop_map(|(pattern, picks)| {
        let mut picks = picks.into_iter().cycle();
        let mut text = String::new();
        for letter in PATTERNS[pattern].chars() {
            match VALUES.iter().find(|(place, _)| *place == letter) {
                // The name of the atom is no place.
                Some(_)
                    if letter == 'A'
                        && (text.ends_with("atom ") || text.ends_with("formfactor ")) =>
                {
                    text.push(letter)
                }
                Some((_, values)) => {
                    let pick = picks.next().unwrap();
                    let odd = pick % 10 == 0;
                    text += if odd {
                        ODD[pick / 10 % ODD.len()]
                    } else {
                        values[pick / 10 % values.len()]
                    };
                }
                None => text.push(letter),
            }
        }
        text
    })
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

/// Builds all that a text says; how many of its crystals are whole.
fn build_all(text: &str) -> usize {
    let desk = Desk::of(&[("a.cren", text), ("t.csv", "0,1\n1,2\n2,1\n3,0\n")]);
    let _ = desk.troubles();
    let mut whole = 0;
    for name in ["a", "b"] {
        let built = desk.crystal(name);
        let mut setting = Setting::nominal();
        for parameter in built
            .crystal
            .parameters
            .iter()
            .filter(|one| one.kind == ParameterKind::Draw)
        {
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
            assert!(built.crystal.broken);
        }
        whole += usize::from(!built.crystal.broken);
    }
    whole
}

#[test]
fn nothing_panics() {
    let lines = |most: usize| prop::collection::vec(statement(), 0..most);
    let texts = (lines(2), lines(4), 0..FIRST.len(), lines(5), lines(3));
    let whole = std::cell::Cell::new(0);
    let mut runner = TestRunner::new_with_rng(
        ProptestConfig {
            failure_persistence: None,
            ..ProptestConfig::with_cases(3000)
        },
        TestRng::deterministic_rng(RngAlgorithm::ChaCha),
    );
    let outcome = runner.run(&texts, |(preamble, material, first, own, more)| {
        let text = format!(
            "let d = 1 nm\nlet e = 1 meV\n{}\nmaterial m\n  edge 1 eV\n{}\nmaterial n like m\ncrystal a\n{}\n{}\ncrystal b like a\n{}\n",
            preamble.join("\n"),
            material.join("\n"),
            FIRST[first],
            own.join("\n"),
            more.join("\n"),
        );
        whole.set(whole.get() + build_all(&text));
        Ok(())
    });
    outcome.unwrap();
    // Some of them must get through, or the check of whole crystals would check nothing.
    assert!(whole.get() >= 300, "{}", whole.get());
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
