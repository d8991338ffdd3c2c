//! Two- and three-dimensional crystals from text to bands, against tables, closed forms and one another.
#![allow(clippy::indexing_slicing, clippy::unwrap_used, missing_docs)]

#[path = "bands/mod.rs"]
mod bench;

use std::sync::Arc;

use bench::{Bench, EV};
use crenate::bands::{Class, Feature, GapKind, Solution, TargetState};
use crenate::model::{ParameterKind, Setting};

fn coarse(bench: &Bench) -> Arc<Solution> {
    let built = bench.build(0, &Setting::default());
    assert!(!built.crystal.broken, "{:#?}", built.troubles);
    bench
        .solver
        .solve_coarse(&built.crystal, &|| false)
        .expect("coarse bands")
}

/// One row of `mathieu.csv`: bottom and top of the n-th band at q.
fn mathieu(q: &str, n: usize) -> (f64, f64) {
    let rows = include_str!("reference/mathieu.csv").lines();
    let start = format!("band,{q},{n},");
    let row = { rows }.find(|row| row.starts_with(&start)).unwrap();
    let cells: Vec<&str> = row.split(',').collect();
    (cells[3].parse().unwrap(), cells[4].parse().unwrap())
}

/// −∇² + 2q cos 2x + 2q cos 2y has sums of Mathieu characteristic values for edges (rows of `mathieu.csv`).
#[test]
fn a_separable_square_lattice_has_sums_of_mathieu_values() {
    let bench = Bench::new(
        "crystal eggs\n  mass 10 u\n  lattice square 500 nm\n  recoil 1000 nm\n  cosine (1,0) = 2.0 Er\n  \
         cosine (0,1) = 2.0 Er\n  bands 2\n  measure h = hopping 1 by (1,1)\n  measure l = level 1 at M\n",
    );
    let recoil = bench
        .build(0, &Setting::default())
        .crystal
        .recoil
        .unwrap()
        .energy
        .value;
    let ((a0, b1), (a1, _)) = (mathieu("1", 0), mathieu("1", 1));
    let found = bench.solve(0);
    let edges = [
        (&found.bands[0].bottom, 2.0 * a0, "centre"),
        (&found.bands[0].top, 2.0 * b1, "M"),
        (&found.bands[1].bottom, a0 + a1, "X"),
    ];
    for (edge, wanted, name) in edges {
        let error = (edge.energy.value / recoil - wanted).abs();
        assert!(error < 1e-9, "{name}: off by {error:.1e}");
        assert!(
            error * recoil <= edge.energy.uncertainty,
            "{name}: {error:.1e}"
        );
        assert_eq!(edge.point.as_deref(), Some(name));
    }
    assert_eq!(found.gaps[0].kind, GapKind::Indirect);
    let range = found.potential;
    for (value, wanted) in [
        (range.lowest, -4.0),
        (range.mean, 0.0),
        (range.highest, 4.0),
    ] {
        assert!((value / recoil - wanted).abs() < 1e-9, "{range:?}");
    }
    // Energies that are sums have no hop along a diagonal.
    let (_, measures) = bench.assess(0);
    let hop = measures[0].value.clone().unwrap();
    assert!(
        hop.value.abs() <= hop.uncertainty.max(1e-9 * recoil),
        "{hop:?}"
    );
    let level = measures[1].value.clone().unwrap();
    assert!((level.value / recoil - 2.0 * b1).abs() < 1e-9);

    let quick = coarse(&Bench::new(
        "crystal eggs\n  mass 10 u\n  lattice square 500 nm\n  recoil 1000 nm\n  cosine (1,0) = 2.0 Er\n  \
         cosine (0,1) = 2.0 Er\n  bands 2\n",
    ));
    assert!(!quick.fine && found.fine);
    for (rough, fine) in quick.bands.iter().zip(&found.bands) {
        for (rough, fine) in [(&rough.bottom, &fine.bottom), (&rough.top, &fine.top)] {
            let error = (rough.energy.value - fine.energy.value).abs();
            assert!(error <= rough.energy.uncertainty + fine.energy.uncertainty);
        }
    }
}

/// Two equal wells a cell on a hexagonal lattice touch at the zone's corners by symmetry (common practice); a wave that
/// tells the wells apart opens a gap there.
#[test]
fn a_honeycomb_is_closed_at_its_corners() {
    let head = "crystal comb\n  mass 10 u\n  carriers fermions\n  lattice hexagonal 500 nm\n  recoil 750 nm\n  \
                bands 2\n  filling 2\n  cosine star (1,0) = 1.0 Er\n";
    let bench = Bench::new(&format!(
        "{head}  require gap 1 closed\n  require semimetal\n"
    ));
    let (targets, _) = bench.assess(0);
    for target in &targets {
        assert_eq!(target.state, TargetState::Met, "{target:?}");
    }
    let found = bench.solve(0);
    assert_eq!(found.bands[0].top.point.as_deref(), Some("K"));
    assert_eq!(found.bands[1].bottom.point.as_deref(), Some("K"));
    assert!(found.bands[0].top.mass.is_none());
    assert_eq!(found.class, Some(Class::Semimetal));

    let told_apart = "  cosine (1,0) = 0.2 Er phase 90 deg\n  cosine (0,1) = 0.2 Er phase -90 deg\n  \
                      cosine (1,-1) = 0.2 Er phase -90 deg\n";
    let open = coarse(&Bench::new(&format!("{head}{told_apart}")));
    assert_eq!(open.gaps[0].kind, GapKind::Direct, "{:?}", open.gaps[0]);
    assert_eq!(open.bands[0].top.point.as_deref(), Some("K"));
}

const SILICON: &str = "crystal si\n  lattice fcc 5.43 Å\n  atom A at (0.125, 0.125, 0.125)\n  \
     atom A at (0.875, 0.875, 0.875)\n  formfactor A 3 = -0.21 Ry\n  formfactor A 8 = 0.04 Ry\n  \
     formfactor A 11 = 0.08 Ry\n  filling 8\n  bands 4\n";

/// Form factors of silicon: Cohen & Bergstresser, Phys. Rev. 141, 789 (1966), Table II; a gap of 0.8 eV in print (from
/// memory), 0.8203 eV at 0.85·2π/a from Γ to X by a dense solve at cut-off 50 (`planewaves_epm.rs`).
#[test]
fn a_silicon_like_solid_has_its_indirect_gap() {
    let found = coarse(&Bench::new(SILICON));
    let gap = found.gaps[3];
    assert!((gap.size.value / EV - 0.8).abs() < 0.15, "{gap:?}");
    assert!(
        (gap.size.value / EV - 0.8203).abs() < gap.size.uncertainty / EV + 1e-3,
        "{gap:?}"
    );
    assert_eq!(gap.kind, GapKind::Indirect);
    assert_eq!(found.bands[3].top.point.as_deref(), Some("centre"));
    assert_eq!(found.class, Some(Class::Semiconductor));
    let fermi = found.fermi.unwrap().value;
    assert!(found.bands[3].top.energy.value < fermi);
}

/// A nearly free metal: levels at the middle of a face split by about twice its component (two-wave approximation,
/// common practice), and the Fermi level is near that of free electrons, (ħ²/2m)(3π²n)^⅔.
#[test]
fn an_aluminium_like_solid_is_a_nearly_free_metal() {
    let bench = Bench::new(
        "crystal al\n  lattice fcc 4.05 Å\n  atom A at (0, 0, 0)\n  formfactor A 3 = 0.0179 Ry\n  \
         formfactor A 4 = 0.0562 Ry\n  filling 3\n  bands 4\n",
    );
    let found = coarse(&bench);
    assert_eq!(found.class, Some(Class::Metal));
    let fermi = found.fermi.unwrap();
    let free = 0.038_099_821_109_685_837
        * (3.0 * std::f64::consts::PI.powi(2) * 12.0 / 0.405_f64.powi(3)).powf(2.0 / 3.0);
    assert!(
        (fermi.value / EV - free).abs() < 0.5,
        "{fermi:?}, free {free} eV"
    );
    // The second band begins above the first one's level at L by the split there.
    let split = (found.bands[1].bottom.energy.value - found.bands[0].bottom.energy.value) / EV;
    assert!(split > 0.0);
}

/// A potential that is constant along y has the chain's levels at k_y = 0.
#[test]
fn a_chain_is_a_rectangle_that_is_constant_across() {
    let text = "crystal row\n  mass 0.3 me\n  lattice chain 2 nm\n  cosine 1 = 0.3 eV phase 0.4\n  cosine 2 = 0.1 eV\n\n\
                crystal strip\n  mass 0.3 me\n  lattice rectangular 2 nm by 1 nm\n  cosine (1,0) = 0.3 eV phase 0.4\n  \
                cosine (2,0) = 0.1 eV\n  bands 2\n  measure a = level 1 at X\n  measure b = level 2 at (0.5, 0)\n  \
                measure c = level 1 at centre\n";
    let bench = Bench::new(text);
    let row = bench.solve(0);
    let (_, measures) = bench.assess(1);
    let wanted = [
        row.bands[0].top.energy,
        row.bands[1].bottom.energy,
        row.bands[0].bottom.energy,
    ];
    for (measure, wanted) in measures.iter().zip(wanted) {
        let found = measure.value.clone().unwrap();
        let error = (found.value - wanted.value).abs();
        assert!(
            error <= found.uncertainty + wanted.uncertainty,
            "{}: {error:.1e} J",
            measure.name
        );
        assert!(error < 1e-9 * EV, "{}: {error:.1e} J", measure.name);
    }
}

/// Derivatives by a tolerance against differences of solved bands.
fn check_slopes(text: &str, bands: usize) {
    let bench = Bench::new(text);
    let built = bench.build(0, &Setting::default());
    assert!(!built.crystal.broken, "{:#?}", built.troubles);
    let found = bench
        .solver
        .sensitivities(&built.crystal, bands, &|| false)
        .expect("sensitivities");
    let draws: Vec<_> = built
        .crystal
        .parameters
        .iter()
        .filter(|parameter| parameter.kind == ParameterKind::Draw)
        .map(|parameter| parameter.id)
        .collect();
    assert!(!draws.is_empty());
    for draw in draws {
        let at = |end: f64| {
            let mut setting = Setting::default();
            setting.draws.insert(draw, end);
            bench.solve_at(0, &setting)
        };
        let (low, high) = (at(-0.1), at(0.1));
        for one in &found {
            let value = |solution: &Solution| match one.feature {
                Feature::Gap(n) => solution.gaps[n - 1].size.value,
                Feature::Width(n) => solution.bands[n - 1].width.value,
                Feature::Bottom(n) => solution.bands[n - 1].bottom.energy.value,
                Feature::Top(n) => solution.bands[n - 1].top.energy.value,
            };
            let rough = (value(&high) - value(&low)) / 0.2;
            let exact = one
                .slopes
                .iter()
                .find(|(id, _)| *id == draw)
                .map_or(0.0, |(_, slope)| *slope);
            let size = built
                .crystal
                .potential
                .waves
                .first()
                .map_or(EV, |wave| wave.energy.value.abs());
            assert!(
                (exact - rough).abs() < 2e-3 * rough.abs() + 1e-6 * size,
                "{:?} by {draw:?}: {exact:e} J, differences {rough:e} J",
                one.feature
            );
        }
    }
}

#[test]
fn slopes_of_waves_lattice_and_mass_are_those_of_differences() {
    check_slopes(
        "crystal sheet\n  mass 0.3 me ± 1 %\n  lattice square 2 nm ± 1 %\n  cosine star (1,0) = 0.2 eV ± 1 %\n  bands 1\n",
        1,
    );
}

#[test]
fn slopes_of_sites_and_profiles_are_those_of_differences() {
    check_slopes(
        "let swing = 50 meV ± 5 %\n\ncrystal dots\n  mass 0.1 me ± 1 %\n  lattice square 4 nm\n  \
         site gaussian -0.2 eV ± 2 % sigma 0.9 nm ± 2 % at (0.5, 0.5)\n  \
         profile = swing*cos(2*pi*x/4 nm)*cos(2*pi*y/4 nm)\n  bands 1\n",
        1,
    );
}

/// Values that no plane waves settle are refused, not guessed.
#[test]
fn what_does_not_settle_is_said_so() {
    let bench =
        Bench::new("crystal fine\n  mass 1 me\n  lattice square 1 nm\n  cosine (900,0) = 1 eV\n");
    let built = bench.build(0, &Setting::default());
    let found = bench.solver.solve(&built.crystal, &|| false);
    assert!(
        matches!(found, Err(crenate::bands::Unsolved::NotConverged(_))),
        "{found:?}"
    );
}
