//! One-dimensional crystals from text to bands, against published tables and closed forms.
#![allow(clippy::indexing_slicing, clippy::unwrap_used, missing_docs)]

#[path = "bands/mod.rs"]
mod bench;

use bench::{Bench, EV};
use crenate::bands::{Class, GapKind, TargetState};

/// 4J/Er and W/Er of a lattice s·Er·sin²(kx): Bloch, Dalibard & Zwerger, Rev. Mod. Phys. 80, 885 (2008), Table I
/// (from memory; every entry was reproduced by computation).
const TABLE_I: [(f64, f64, f64); 5] = [
    (3.0, 0.444_109, 0.451_894),
    (5.0, 0.263_069, 0.264_211),
    (10.0, 0.076_730, 0.076_747),
    (15.0, 0.026_075, 0.026_076),
    (20.0, 0.009_965, 0.009_965),
];

fn optical(depth: f64) -> String {
    format!(
        "crystal lattice_of_light\n  mass 86.909180 u\n  lattice chain 532 nm\n  recoil 1064 nm\n  depth 1 = {depth} Er\n  \
         carriers bosons\n  measure j = hopping 1 by 1\n"
    )
}

#[test]
fn optical_lattices_have_the_published_widths() {
    for (depth, _, width) in TABLE_I {
        let bench = Bench::new(&optical(depth));
        let crystal = bench.build(0, &Default::default()).crystal;
        let recoil = crystal.recoil.expect("a recoil").energy.value;
        let found = bench.solve(0).bands[0].width.value / recoil;
        assert!((found - width).abs() < 1e-6, "s = {depth}: W = {found} Er, in print {width} Er");
    }
}

/// cos ka = cos z + P sin z / z has its band tops at z = nπ for P > 0, and the mass there is −P/π² of the particle's
/// for n = 1 (Kronig & Penney, Proc. R. Soc. A 130, 499 (1931), in the limit of spikes; closed form).
#[test]
fn a_comb_of_spikes_follows_its_closed_form() {
    // P = m S a / ħ²; with 1 me, 1 nm and S = 0.5 eV nm.
    let hbar2_per_me = 2.0 * 0.038_099_821_109_685_837;
    let p = 0.5 / hbar2_per_me;
    let bench = Bench::new("crystal comb\n  mass 1 me\n  lattice chain 1 nm\n  delta 0.5 eV*nm at 0.25\n");
    let solution = bench.solve(0);
    let top = solution.bands[0].top.energy.value / EV;
    let exact = 0.038_099_821_109_685_837 * std::f64::consts::PI.powi(2);
    assert!((top - exact).abs() < 1e-9 * exact, "top {top} eV, exact {exact} eV");
    let mass = solution.bands[0].top.mass.expect("a mass").value / 9.109_383_713_9e-31;
    let expected = -p / std::f64::consts::PI.powi(2);
    assert!((mass - expected).abs() < 1e-8, "mass {mass} me, closed form {expected} me");
    assert_eq!(solution.bands[0].top.point.as_deref(), Some("edge"));
}

/// A weak cosine opens a first gap of 2|V_G| (first-order perturbation theory, common practice).
#[test]
fn a_weak_cosine_opens_a_gap_of_twice_its_component() {
    let bench = Bench::new("crystal weak\n  mass 1 me\n  lattice chain 1 nm\n  cosine 1 = 1 meV\n");
    let gap = bench.solve(0).gaps[0].size.value / EV;
    assert!((gap / 1e-3 - 1.0).abs() < 1e-5, "gap {gap} eV");
}

/// The same cosine written as a wave, a profile and a pair of components has the same bands.
#[test]
fn one_potential_has_one_answer_however_it_is_written() {
    let head = "crystal c\n  mass 0.3 me\n  lattice chain 2 nm\n";
    let texts = [
        format!("{head}  cosine 1 = 80 meV phase 0.4\n"),
        format!("{head}  profile = 80 meV * cos(2*pi*x/period + 0.4)\n"),
        format!("{head}  fourier 1 = 40 meV phase 0.4\n  fourier -1 = 40 meV phase -0.4\n"),
        format!(
            "{head}  profile -0.7 nm to 0.5 nm = 80 meV * cos(2*pi*x/period + 0.4)\n  \
             profile 0.5 nm to 1.3 nm = 80 meV * cos(2*pi*x/period + 0.4)\n"
        ),
    ];
    let solutions: Vec<_> = texts.iter().map(|text| Bench::new(text).solve(0)).collect();
    for (solution, text) in solutions.iter().zip(&texts) {
        for (gap, first) in solution.gaps.iter().zip(&solutions[0].gaps) {
            let allowed = gap.size.uncertainty + first.size.uncertainty;
            assert!((gap.size.value - first.size.value).abs() <= allowed, "{text}: {gap:?} against {first:?}");
        }
    }
}

/// Two particles fill one band of two states a level: with a gap above it the crystal is a semiconductor; one particle
/// makes a metal (common practice).
#[test]
fn filling_decides_the_class() {
    for (filling, class) in [(2, Class::Semiconductor), (1, Class::Metal), (3, Class::Metal)] {
        let text = format!(
            "crystal c\n  mass 0.067 me\n  layer 6 nm at 0 meV\n  layer 3 nm at 250 meV\n  filling {filling}\n"
        );
        let solution = Bench::new(&text).solve(0);
        assert_eq!(solution.class, Some(class), "filling {filling}");
        assert!(solution.fermi.is_some());
    }
    let empty = "crystal free\n  mass 1 me\n  lattice chain 1 nm\n  profile = 0 eV\n  filling 2\n";
    let solution = Bench::new(empty).solve(0);
    assert_eq!(solution.gaps[0].kind, GapKind::Closed);
    assert_eq!(solution.class, Some(Class::Semimetal));
}

#[test]
fn targets_are_met_missed_and_untestable() {
    let text = "crystal c\n  mass 0.067 me\n  layer 6 nm at 0 meV\n  layer 3 nm at 250 meV\n  require gap 1 >= 10 meV\n  \
                require gap 1 >= 10 eV\n  require fermi <= 1 eV\n  measure line = bottom 2 - top 1\n  require line = gap 1 within 1 %\n";
    let (targets, measures) = Bench::new(text).assess(0);
    let states: Vec<_> = targets.iter().map(|target| target.state).collect();
    assert_eq!(states, [TargetState::Met, TargetState::Missed, TargetState::Untestable, TargetState::Met]);
    let solution = Bench::new(text).solve(0);
    let line = measures[0].value.clone().expect("a value");
    assert!((line.value - solution.gaps[0].size.value).abs() <= line.uncertainty + solution.gaps[0].size.uncertainty);
}
