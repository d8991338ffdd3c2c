//! Derivatives of built crystals against differences of crystals built with one number changed.
#![allow(clippy::unwrap_used, clippy::indexing_slicing, missing_docs)]

mod model_support;

use crenate::model::{Crystal, Dual, ParameterKind, Setting, TargetFormula, Wish};
use model_support::Desk;

/// All numbers of a crystal that carry derivatives.
fn numbers(crystal: &Crystal, places: &[f64]) -> Vec<Dual> {
    let mut all = vec![crystal.mass.clone()];
    all.extend(crystal.vectors.iter().flatten().cloned());
    all.extend(crystal.recoil.iter().map(|recoil| recoil.energy.clone()));
    all.extend(crystal.filling.iter().cloned());
    let potential = &crystal.potential;
    for layer in &potential.layers {
        all.push(layer.length.clone());
        all.extend(layer.edge.iter().cloned());
        all.extend(layer.mass.iter().map(|law| law.mass.clone()));
        all.extend(
            layer
                .mass
                .iter()
                .filter_map(|law| law.nonparabolic.clone())
                .map(|(_, gap)| gap),
        );
    }
    all.extend(
        potential
            .deltas
            .iter()
            .flat_map(|delta| [delta.strength.clone(), delta.at.clone()]),
    );
    all.extend(
        potential
            .waves
            .iter()
            .flat_map(|wave| [wave.energy.clone(), wave.phase.clone()]),
    );
    all.extend(potential.sites.iter().map(|site| site.energy.clone()));
    all.extend(potential.sites.iter().flat_map(|site| site.at.clone()));
    all.extend(potential.atoms.iter().flat_map(|atom| atom.at.clone()));
    for target in &crystal.targets {
        if let Wish::Compare { limits, .. } = &target.wish {
            for (limit, _) in limits.lower.iter().chain(&limits.upper) {
                if let TargetFormula::Constant(value) = limit {
                    all.push(value.clone());
                }
            }
        }
    }
    all.extend(
        places
            .iter()
            .map(|x| crystal.potential_dual_at(&Dual::constant(*x))),
    );
    all
}

/// Every slope with respect to every parameter, by Richardson's extrapolation of differences.
fn check(text: &str, name: &str) {
    let desk = Desk::new(text);
    assert!(desk.troubles().is_empty(), "{:#?}", desk.troubles());
    let nominal = desk.crystal(name).crystal;
    let period = nominal.period().map_or(0.0, |period| period.value);
    let places: Vec<f64> = [0.07, 0.31, 0.52, 0.83]
        .iter()
        .map(|share| share * period)
        .collect();
    let numbers_at = |id, value: f64, draw: bool| {
        let mut setting = Setting::nominal();
        let map = if draw {
            &mut setting.draws
        } else {
            &mut setting.overrides
        };
        map.insert(id, value);
        numbers(&desk.crystal_at(name, &setting).crystal, &places)
    };
    let mut seen = 0;
    for parameter in &nominal.parameters {
        let draw = parameter.kind == ParameterKind::Draw;
        let (at, step) = match (draw, parameter.value) {
            (true, _) => (0.0, 1e-2),
            (false, 0.0) => continue,
            (false, value) => (value, 1e-3 * value.abs()),
        };
        let sides = |h: f64| {
            let (up, down) = (
                numbers_at(parameter.id, at + h, draw),
                numbers_at(parameter.id, at - h, draw),
            );
            let slopes: Vec<f64> = up
                .iter()
                .zip(&down)
                .map(|(a, b)| (a.value - b.value) / (2.0 * h))
                .collect();
            slopes
        };
        let (wide, narrow) = (sides(step), sides(step / 2.0));
        for ((number, a), b) in numbers(&nominal, &places).iter().zip(&wide).zip(&narrow) {
            let wanted = (4.0 * b - a) / 3.0;
            let found = number.slope(parameter.id);
            let scale = number.value.abs() / step * 1e-11 + 1e-8 * wanted.abs();
            assert!(
                (found - wanted).abs() <= scale,
                "{:?} {:?}: {found:e} {wanted:e}",
                parameter.kind,
                parameter.text
            );
            seen += usize::from(found != 0.0);
        }
    }
    assert!(
        seen >= nominal.parameters.len() / 2,
        "hardly any slopes: {seen}"
    );
}

#[test]
fn layers_of_materials() {
    check(
        "let thick = 5 nm + base/2
let base = 1 nm ± 0.1 nm
material well
  let share = 0.067
  mass share * me
  edge 10 meV + 5 meV ± 1 meV
  rate 1.02 ± 1.5 %
  nonparabolic 1.5 eV ± 10 %
  monolayer 0.28 nm ± 1 %
material wall like well
  edge 235 meV ± 2 %
  mass 0.1 me
crystal a
  mass 0.3 me
  layer thick of well
  layer 9 ML ± 1 ML of wall
  layer 2 nm of well to wall
  layer 1 nm ± 5 % at 20 meV to 40 meV ± 3 meV
  delta 0.3 eV*nm ± 10 % at 0.4
  delta 0.2 eV*nm at 3 nm ± 0.2 nm
  require gap 1 >= 20 meV + 2*base*3 meV/nm
  require gap 2 = 40 meV within 5 %
",
        "a",
    );
}

#[test]
fn an_optical_lattice() {
    check(
        "let depth = 5
crystal a
  mass 87 u ± 0.01 %
  recoil 1064 nm ± 1 nm
  lattice chain 532 nm
  depth 1 = depth * Er phase 0.3 ± 0.01
  depth 2 = 2 Er ± 3 %
  cosine 3 = (1 + 0.5^2) Er * 0.1
  filling 0.5
",
        "a",
    );
}

#[test]
fn profiles_and_sites() {
    check(
        "let w = 1.2 nm ± 0.1 nm
let e = 40 meV
crystal a
  mass 0.2 me
  lattice chain 8 nm ± 1 %
  profile = e * (sech((x - 3 nm)/w)^2 + sin(2*pi*x/period)^2) + e*exp(-(x/w)^2) + min(e, 70 meV)
  site gaussian 20 meV ± 2 meV sigma 0.7 nm at 0.6 ± 0.01
  site sech2 -30 meV width w at 2 nm
  site lorentzian 12 meV width 1.1 nm at 5 nm
",
        "a",
    );
}

#[test]
fn lattices_and_atoms_in_three_dimensions() {
    check(
        "let a = 0.5 nm ± 1 %
crystal a
  lattice triclinic a by 1.2*a by 0.7 nm angles 80 deg ± 1 deg, 95 deg, 110 deg
  atom A at (0.1, 0.2, 0.3 ± 0.01)
  atom B at (0.2 nm, 0.3 nm, 0.1 nm)
  cosine (1, 0, 0) = 1 eV ± 5 %
",
        "a",
    );
    check(
        "crystal a\n  lattice rhombohedral 0.5 nm angle 70 deg ± 1 deg\n  atom A at (0.1, 0.2, 0.3)\n",
        "a",
    );
    check(
        "crystal a\n  lattice base-monoclinic 0.5 nm by 0.6 nm by 0.7 nm angle 100 deg\n  atom A at (0.1, 0.2, 0.3)\n",
        "a",
    );
}

#[test]
fn names_and_fields_have_a_slope_of_their_own() {
    let text = "let t = 2*d\nlet d = 3 nm\nmaterial m\n  edge 100 meV\n  mass 0.1 me\ncrystal a\n  layer t of m\n  layer d at 0\n";
    let desk = Desk::new(text);
    let crystal = desk.crystal("a").crystal;
    let named = |kind: ParameterKind| {
        crystal
            .parameters
            .iter()
            .find(|one| one.kind == kind)
            .unwrap()
    };
    let (t, d) = (
        named(ParameterKind::Name("t".into())),
        named(ParameterKind::Name("d".into())),
    );
    let literal = crystal
        .parameters
        .iter()
        .find(|one| one.text == "3 nm" && one.kind == ParameterKind::Literal)
        .unwrap();
    let layers = &crystal.potential.layers;
    assert_eq!(
        (
            layers[0].length.slope(t.id),
            layers[0].length.slope(d.id),
            layers[0].length.slope(literal.id)
        ),
        (1.0, 2.0, 2.0)
    );
    assert_eq!(
        (layers[1].length.slope(t.id), layers[1].length.slope(d.id)),
        (0.0, 1.0)
    );
    let edge = named(ParameterKind::Field("m".into(), "edge".into()));
    assert_eq!(layers[0].edge[0].slope(edge.id), 1.0);
    assert_eq!(
        (edge.text.as_str(), desk.world.text_at(edge.place)),
        ("100 meV", "100 meV")
    );
    assert_eq!(literal.unit.as_ref().unwrap().0, "nm");
    // A literal written in a unit with a power.
    let desk = Desk::new("let k = 0.2 nm^-1\ncrystal a\n  layer 1/k at 0\n");
    let crystal = desk.crystal("a").crystal;
    let literal = crystal
        .parameters
        .iter()
        .find(|one| one.text == "0.2 nm^-1" && one.kind == ParameterKind::Literal)
        .unwrap();
    let (unit, size) = literal.unit.as_ref().unwrap();
    assert_eq!(unit, "nm^-1");
    model_support::assert_close(*size, 1e9, 1e-15);
}
