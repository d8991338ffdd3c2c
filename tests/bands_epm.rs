//! The fourteen local form-factor models of Cohen & Bergstresser, Phys. Rev. 141, 789 (1966), Table II, from their text.
#![allow(
    clippy::indexing_slicing,
    clippy::unwrap_used,
    clippy::print_stdout,
    missing_docs
)]

#[path = "bands/mod.rs"]
mod bench;

use bench::{Bench, EV, RYDBERG, row};
use crenate::bands::{Class, GapKind};
use serde_json::Value;

fn numbers(value: &Value) -> Vec<f64> {
    let entries = value.as_array().unwrap().iter();
    entries.map(|entry| entry.as_f64().unwrap()).collect()
}

/// Names, lattice constants and form factors of the models, with what dense solves give.
fn models() -> Vec<(String, Value)> {
    let rows: Value = serde_json::from_str(include_str!("reference/epm_levels.json")).unwrap();
    let rows = rows.as_object().unwrap().clone();
    rows.into_iter().collect()
}

/// A model as a file would have it, its origin half-way between the atoms.
fn text(model: &Value) -> String {
    let form = numbers(&model["form"]);
    let mut text = format!(
        "crystal c\n  lattice fcc {} Å\n  filling 8\n  bands 5\n  atom A at (0.125, 0.125, 0.125)\n",
        model["a"]
    );
    if form[3..].iter().all(|v| *v == 0.0) {
        text += "  atom A at (0.875, 0.875, 0.875)\n";
        for (q, v) in [3, 8, 11].iter().zip(&form) {
            text += &format!("  formfactor A {q} = {v} Ry\n");
        }
        return text;
    }
    text += "  atom B at (0.875, 0.875, 0.875)\n";
    for (q, s, v) in [
        (3, form[0], form[3]),
        (4, 0.0, form[4]),
        (8, form[1], 0.0),
        (11, form[2], form[5]),
    ] {
        text += &format!("  formfactor A and B {q} = {s} Ry, {v} Ry\n");
    }
    text
}

/// Levels at Γ, X and L against a dense LAPACK solve at cut-off 80 (`tests/reference/epm_generate.py`).
#[test]
fn form_factor_models_have_the_levels_of_a_dense_solve() {
    let mut worst = 0.0_f64;
    for (name, model) in models() {
        let mut text = text(&model);
        for point in ["centre", "X", "L"] {
            for level in [4, 5] {
                text += &format!("  measure at_{point}_{level} = level {level} at {point}\n");
            }
        }
        let (_, measures) = Bench::new(&text).assess(0);
        let a = model["a"].as_f64().unwrap();
        let unit = (2.0 * std::f64::consts::PI / (a / 0.529_177_210_544)).powi(2) * RYDBERG;
        for measure in measures {
            let parts: Vec<&str> = measure.name.split('_').collect();
            let label = if parts[1] == "centre" { "G" } else { parts[1] };
            let level: usize = parts[2].parse().unwrap();
            let wanted = model["cuts"]["80"][label][1][level - 1].as_f64().unwrap() * unit;
            let found = measure.value.unwrap();
            let error = (found.value - wanted).abs();
            // The reference itself is settled to about 1e-6 of the unit.
            assert!(
                error <= found.uncertainty + 1e-6 * unit,
                "{name} {}: {found:?} for {wanted:e}",
                measure.name
            );
            worst = worst.max(error / EV);
        }
    }
    row(
        "fourteen form-factor models, levels",
        "dense solve, eV",
        worst,
        1e-4,
    );
}

/// Measured gaps at 300 K in eV, by the Varshni terms of Vurgaftman, Meyer & Ram-Mohan, J. Appl. Phys. 89, 5815 (2001), GaAs,
/// GaSb and AlSb read in its table and the others from memory, with a third of the valence band's spin splitting added, as
/// these models have no spin; silicon's in the models' own paper (from memory); none of grey tin (common practice).
const PRINTED: &[(&str, f64)] = &[
    ("Si", 0.8),
    ("Sn", 0.0),
    ("GaP", 2.273 + 0.080 / 3.0),
    ("GaAs", 1.422 + 0.341 / 3.0),
    ("AlSb", 1.616 + 0.676 / 3.0),
    ("InP", 1.353 + 0.108 / 3.0),
    ("GaSb", 0.727 + 0.760 / 3.0),
    ("InAs", 0.354 + 0.390 / 3.0),
    ("InSb", 0.174 + 0.810 / 3.0),
];
/// Fitted in 1966 to the optical data of the time, these two are off by up to this.
const FARTHEST_FITS: [&str; 2] = ["InP", "GaSb"];

/// The gap above band 4 over the whole zone, where it lies, and its kind, against a search with dense solves
/// (`tests/reference/epm_gaps.py`), and against print.
#[test]
fn form_factor_models_have_the_gaps_of_a_dense_search() {
    let gaps: Value = serde_json::from_str(include_str!("reference/epm_gaps.json")).unwrap();
    let (mut worst, mut apart) = (0.0_f64, 0.0_f64);
    for (name, model) in models() {
        let wanted = gaps[&name]["gap"].as_f64().unwrap();
        let found = Bench::new(&text(&model)).solve(0);
        let gap = &found.gaps[3];
        let error = (gap.size.value / EV - wanted).abs();
        // The dense search is settled to about 1e-4 eV at its cut-off.
        println!(
            "| {name} | {wanted:.4} eV | {:.4} ± {:.0e} | {:?} |",
            gap.size.value / EV,
            gap.size.uncertainty / EV,
            gap.kind
        );
        assert!(
            error <= gap.size.uncertainty / EV + 1e-4,
            "{name}: {gap:?} for {wanted}"
        );
        worst = worst.max(error);
        let (top, bottom) = (
            numbers(&gaps[&name]["top"]),
            numbers(&gaps[&name]["bottom"]),
        );
        let kind = match (wanted < 1e-6, top == bottom) {
            (true, _) => GapKind::Closed,
            (_, true) => GapKind::Direct,
            _ => GapKind::Indirect,
        };
        assert_eq!(gap.kind, kind, "{name}");
        let point = match bottom.as_slice() {
            [0.0, 0.0, 0.0] => Some("centre"),
            [1.0, 0.0, 0.0] => Some("X"),
            [0.5, 0.5, 0.5] => Some("L"),
            _ => None,
        };
        assert_eq!(found.bands[4].bottom.point.as_deref(), point, "{name}");
        assert_eq!(
            found.bands[3].top.point.as_deref(),
            Some("centre"),
            "{name}"
        );
        if let Some((_, printed)) = PRINTED.iter().find(|(known, _)| *known == name) {
            let off = (gap.size.value / EV - printed).abs();
            if FARTHEST_FITS.contains(&name.as_str()) {
                assert!(off > 0.15 && off < 0.25, "{name}: {off} eV from print");
            } else {
                apart = apart.max(off);
            }
        }
    }
    row(
        "fourteen form-factor models, gap 4",
        "dense search, eV",
        worst,
        1e-4,
    );
    row("seven of nine of them", "print, eV", apart, 0.15);
}

/// The first answer, within its bound of the gap by a dense search (`tests/reference/epm_gaps.py`), and the valleys of the fine one.
#[test]
fn a_silicon_like_solid_has_its_indirect_gap() {
    let model = &models()
        .into_iter()
        .find(|(name, _)| name == "Si")
        .unwrap()
        .1;
    let bench = Bench::new(&text(model));
    let found = bench.coarse();
    let gap = found.gaps[3];
    assert!(
        (gap.size.value / EV - 0.820_236).abs() < gap.size.uncertainty / EV + 1e-4,
        "{gap:?}"
    );
    let fine = bench.solve(0);
    // Its place on that line, in 2π/a, by the same search.
    let far = fine.bands[4].bottom.k.iter().copied().fold(0.0, f64::max);
    assert!((2.0 * far.min(1.0 - far) - 0.853_667).abs() < 1e-4, "{far}");
    // The valleys lie on the axes, longer along them than across; six of them have one mean mass.
    let valley = &fine.bands[4].bottom;
    let masses: Vec<f64> = valley.axes.iter().map(|axis| axis.mass.value).collect();
    let mean = valley.mass.unwrap().value;
    assert_eq!(masses.len(), 3);
    assert!((masses.iter().product::<f64>().cbrt() - mean).abs() < 1e-6 * mean);
    assert!(
        masses[0] > 3.0 * masses[1] && (masses[1] - masses[2]).abs() < 1e-3 * masses[1],
        "{masses:?}"
    );
    let along = &valley.axes[0].along;
    assert!(
        along.iter().any(|x| (x.abs() - 1.0).abs() < 1e-6),
        "{along:?}"
    );
    assert_eq!(gap.kind, GapKind::Indirect);
    assert_eq!(found.bands[3].top.point.as_deref(), Some("centre"));
    assert_eq!(found.class, Some(Class::Semiconductor));
    let fermi = found.fermi.unwrap().value;
    assert!(found.bands[3].top.energy.value < fermi);
}

/// Eight free levels meet at the corner of a cubic zone, and atoms of no symmetry part them into basins narrower than the
/// search's mesh: 21.540258702 meV at (0.498541, 0.500764, 0.529944) by a simplex search from the best points of a mesh of
/// 12³ (251 plane waves, numpy and scipy).
#[test]
fn a_narrow_basin_beside_a_corner_is_found() {
    let bench = Bench::new(
        "crystal crowd\n  lattice cubic 128.20339373651774 bohr\n  bands 6\n  atom A at (0.261, 0.382, 0.202)\n  \
         atom B at (0, 0.5, 0.25)\n  atom A at (0.513, 0.371, 0.627)\n  \
         formfactor A curve = -4814.062991785267 ueV*exp(-(q*1.4743098628059656 nm)^2) \
         - 1.4388483851079073 meV*sech(1.3*q*1.4743098628059658 nm)*exp(-(q*1.4743098628059656 nm)^2)\n  \
         formfactor B curve = 2.9459356843391574e-5 Ry*exp(-(q*1.1173207102730396 nm)^2) \
         + 5.343457523179299e-22 J*sech(1.3*q*1.1173207102730396 nm)*exp(-(q*1.1173207102730396 nm)^2)\n",
    );
    let solution = bench.solve(0);
    let bottom = &solution.bands[4].bottom.energy;
    let error = (bottom.value / EV - 21.540_258_702e-3).abs();
    assert!(error < 1e-11 + bottom.uncertainty / EV, "{bottom:?}");
}
