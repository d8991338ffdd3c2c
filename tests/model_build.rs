//! Whole crystals, as a designer writes them.
#![allow(clippy::unwrap_used, clippy::indexing_slicing, missing_docs)]

mod model_support;

use crenate::model::Scalar;
use model_support::{Desk, assert_close};

const MEV: f64 = 1.602_176_634e-22;
const ME: f64 = 9.109_383_713_9e-31;

const MATERIALS: &str = r#"
material basin
  mass      0.067 me
  edge      0 meV
  rate      1 ± 1.5 %

material wall
  mass      0.092 me
  edge      235 meV ± 5 meV
  source    "invented for this example"
"#;

const SUPERLATTICE: &str = r#"use "materials.cren"

# Eight-nanometre period with a thin wall.
crystal tern_8
  lattice   chain 8.0 nm
  monolayer 0.283 nm
  layer     5.4 nm of basin
  layer     2.6 nm ± 0.14 nm of wall
  require   gap 1 >= 60 meV
  require   width 1 = 32 meV within 8 meV
  measure   line = level 2 at centre - level 1 at centre
  require   line <= 320 meV
"#;

#[test]
fn a_superlattice_with_its_materials_in_another_file() {
    let desk = Desk::of(&[("a.cren", SUPERLATTICE), ("materials.cren", MATERIALS)]);
    assert!(desk.troubles().is_empty(), "{:#?}", desk.troubles());
    let built = desk.crystal("tern_8");
    let crystal = &built.crystal;
    assert!(!crystal.broken);
    assert_eq!(crystal.dimension, 1);
    let layers = &crystal.potential.layers;
    assert_eq!(layers.len(), 2);
    assert_close(layers[0].length.value, 5.4e-9, 1e-15);
    assert_close(layers[1].edge[0].value, 235.0 * MEV, 1e-15);
    assert_close(layers[1].mass[0].mass.value, 0.092 * ME, 1e-15);
    assert_eq!(layers[1].mass_origin, "of material wall");
    assert_close(crystal.period().unwrap().value, 8.0e-9, 1e-15);
    assert_eq!(crystal.targets.len(), 3);
    assert_eq!(crystal.targets[0].text, "gap 1 >= 60 meV");
    assert_eq!(crystal.measures.len(), 1);
    assert_eq!(crystal.bands, 4);
    let sampler = crystal.sampler().unwrap();
    assert_close(sampler.at(6.0e-9), 235.0 * MEV, 1e-15);
    assert_eq!(sampler.at(1.0e-9), 0.0);
    let draws = crystal
        .parameters
        .iter()
        .filter(|one| one.kind == crenate::model::ParameterKind::Draw);
    assert_eq!(draws.count(), 3);
}

#[test]
fn an_optical_lattice_in_units_of_its_recoil() {
    let desk = Desk::new(
        "let rb = 86.909180531 u
crystal trap
  mass rb
  recoil 1064 nm
  lattice chain 532 nm
  carriers bosons
  depth 1 = 8 Er
",
    );
    assert!(desk.troubles().is_empty(), "{:#?}", desk.troubles());
    let crystal = desk.crystal("trap").crystal;
    // h²/(2·m·λ²) by CODATA 2022 and the AME2020 mass: reference/constants.json, row Rb-87 at 1064 nm.
    assert_close(
        crystal.recoil.as_ref().unwrap().energy.value,
        1.343_643_496_009_402_6e-30,
        1e-14,
    );
    let top = crystal.potential_at(266e-9);
    assert_close(top, 8.0 * 1.343_643_496_009_402_6e-30, 1e-14);
    assert!(crystal.potential_at(0.0).abs() < 1e-45);
}

#[test]
fn a_profile_crystal() {
    let desk = Desk::new(
        "crystal ripple
  mass 0.1 me
  lattice chain 10 nm
  profile = 50 meV * cos(2*pi*x/period) + 1 eV/nm^2 * (0 nm)^2
",
    );
    assert!(desk.troubles().is_empty(), "{:#?}", desk.troubles());
    let crystal = desk.crystal("ripple").crystal;
    assert_close(crystal.potential_at(0.0), 50.0 * MEV, 1e-15);
    assert_close(crystal.potential_at(5e-9), -50.0 * MEV, 1e-15);
    let slope = crystal.sampler().unwrap().slope_at(2.5e-9);
    assert_close(
        slope,
        -50.0 * MEV * 2.0 * std::f64::consts::PI / 10e-9,
        1e-14,
    );
    assert_close(
        crystal
            .potential_dual_at(&crenate::model::Dual::constant(0.0))
            .value(),
        50.0 * MEV,
        1e-15,
    );
}
