//! Two- and three-dimensional crystals from text to bands, against tables, closed forms and one another.
#![allow(
    clippy::indexing_slicing,
    clippy::unwrap_used,
    clippy::print_stdout,
    missing_docs
)]

#[path = "bands/mod.rs"]
mod bench;

use bench::{Bench, EV, RYDBERG, draws, row};
use crenate::bands::{Class, Feature, GapKind, Measured, Solution, TargetState, Unsolved};
use crenate::model::Setting;
use serde_json::Value;

fn value(bench: &Bench, crystal: usize, measure: &str) -> Measured {
    let (_, measures) = bench.assess(crystal);
    let found = measures.iter().find(|one| one.name == measure).unwrap();
    found.value.clone().unwrap()
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
    let mut worst = 0.0_f64;
    for (edge, wanted, name) in edges {
        let error = (edge.energy.value / recoil - wanted).abs();
        worst = worst.max(error);
        assert!(
            error * recoil <= edge.energy.uncertainty,
            "{name}: {error:.1e}"
        );
        assert_eq!(edge.point.as_deref(), Some(name));
    }
    row(
        "separable cosines, square",
        "Mathieu values, Er",
        worst,
        1e-9,
    );
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

    let quick = Bench::new(
        "crystal eggs\n  mass 10 u\n  lattice square 500 nm\n  recoil 1000 nm\n  cosine (1,0) = 2.0 Er\n  \
         cosine (0,1) = 2.0 Er\n  bands 2\n",
    ).coarse();
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
    let open = Bench::new(&format!("{head}{told_apart}")).coarse();
    assert_eq!(open.gaps[0].kind, GapKind::Direct, "{:?}", open.gaps[0]);
    assert_eq!(open.bands[0].top.point.as_deref(), Some("K"));
}

const ALUMINIUM: &str = "crystal al\n  lattice fcc 4.05 Å\n  atom A at (0, 0, 0)\n  formfactor A 3 = 0.0179 Ry\n  \
     formfactor A 4 = 0.0562 Ry\n  filling 3\n  bands 4\n";

/// A nearly free metal. The lowest two levels in the middle of a face split by 2|V| of the wave across it (two-wave
/// approximation, common practice; other waves take off up to 0.01 Ry), and by what a dense solve at a large cut-off
/// gives (`tests/reference/al_generate.py`; form factors of Ashcroft, Phil. Mag. 8, 2055 (1963)). The Fermi level is near
/// that of free electrons, (ħ²/2m)(3π²n)^⅔.
#[test]
fn an_aluminium_like_solid_is_a_nearly_free_metal() {
    let bench = Bench::new(&format!(
        "{ALUMINIUM}  measure hexagon = level 2 at L - level 1 at L\n  measure square = level 2 at X - level 1 at X\n"
    ));
    let rows: Value = serde_json::from_str(include_str!("reference/al_levels.json")).unwrap();
    let largest = rows.as_object().unwrap().iter();
    let largest = largest
        .max_by_key(|(cut, _)| cut.parse::<u32>().unwrap())
        .unwrap()
        .1;
    let unit = (2.0 * std::f64::consts::PI / (4.05 / 0.529_177_210_544)).powi(2) * RYDBERG;
    let mut worst = 0.0_f64;
    for (name, point, component) in [("hexagon", "L", 0.0179), ("square", "X", 0.0562)] {
        let split = value(&bench, 0, name);
        let level = |index: usize| largest[point][index].as_f64().unwrap() * unit;
        let error = (split.value - (level(1) - level(0))).abs();
        assert!(error <= split.uncertainty + 1e-6 * EV, "{name}: {split:?}");
        worst = worst.max(error / EV);
        assert!(
            (split.value / RYDBERG - 2.0 * component).abs() < 0.01,
            "{name}: {split:?}"
        );
    }
    row(
        "aluminium, splittings at L and X",
        "dense solve, eV",
        worst,
        2e-6,
    );
    let found = bench.solve(0);
    assert_eq!(found.class, Some(Class::Metal));
    assert_eq!(found.bands[0].bottom.point.as_deref(), Some("centre"));
    let fermi = found.fermi.unwrap();
    let free = 0.038_099_821_109_685_837
        * (3.0 * std::f64::consts::PI.powi(2) * 12.0 / 0.405_f64.powi(3)).powf(2.0 / 3.0);
    assert!(
        (fermi.value / EV - free).abs() < 0.5,
        "{fermi:?}, free {free} eV"
    );
    let rough = Bench::new(ALUMINIUM).coarse().fermi.unwrap();
    let apart = (rough.value - fermi.value).abs();
    assert!(
        apart <= rough.uncertainty + fermi.uncertainty,
        "{rough:?} {fermi:?}"
    );
}

/// Without a potential particles fill a disk, or a sphere, of k: E = (ħ²/2m)·4πn/g in a plane and (ħ²/2m)(6π²n/g)^⅔ in
/// space, n the particles per area or volume and g the states a level.
#[test]
fn free_particles_fill_to_their_level() {
    let half = 0.038_099_821_109_685_837;
    let pi = std::f64::consts::PI;
    let rows = [
        (
            "lattice square 0.6 nm\n  cosine (1,0) = 0 eV",
            1.0,
            half * 4.0 * pi * 0.5 / 0.36,
        ),
        (
            "lattice hexagonal 0.6 nm\n  cosine (1,0) = 0 eV",
            3.0,
            half * 4.0 * pi * 1.5 / (0.36 * 0.75_f64.sqrt()),
        ),
        (
            "lattice fcc 0.5 nm\n  cosine (1,1,1) = 0 eV",
            1.0,
            half * (6.0 * pi * pi * 0.5 * 4.0 / 0.125).powf(2.0 / 3.0),
        ),
    ];
    let mut worst = 0.0_f64;
    for (lattice, filling, wanted) in rows {
        let bench = Bench::new(&format!("crystal free\n  {lattice}\n  filling {filling}\n"));
        let found = bench.solve(0);
        let fermi = found.fermi.unwrap();
        let error = (fermi.value / EV - wanted).abs();
        assert!(
            error <= fermi.uncertainty / EV,
            "{lattice}: {fermi:?} for {wanted} eV"
        );
        worst = worst.max(error / wanted);
        assert_eq!(found.class, Some(Class::Metal));
    }
    row(
        "free particles, Fermi levels",
        "closed form, of themselves",
        worst,
        2e-3,
    );
}

/// A wave along x only lowers the square's symmetry: the middle of the face across y is then not X, and has no name.
#[test]
fn points_that_the_potential_tells_apart_do_not_share_a_name() {
    let bench = Bench::new(
        "crystal sheet\n  mass 0.3 me\n  lattice square 2 nm\n  cosine (1,0) = 0.3 eV\n  cosine (0,1) = 0.1 eV\n  bands 2\n  \
         measure x = level 2 at X\n  measure y = level 2 at (0, 0.5)\n",
    );
    let found = bench.solve(0);
    let bottom = &found.bands[1].bottom;
    assert_eq!(
        (bottom.k.as_slice(), bottom.point.as_deref()),
        (&[0.0, 0.5][..], None)
    );
    let (x, y) = (value(&bench, 0, "x"), value(&bench, 0, "y"));
    assert!((y.value - bottom.energy.value).abs() <= y.uncertainty + bottom.energy.uncertainty);
    assert!(x.value > y.value + 0.05 * EV);
}

/// A square lattice of tubes five recoils deep: 4J = 0.263069 Er (Bloch, Dalibard & Zwerger, Rev. Mod. Phys. 80, 885 (2008),
/// Table I, from memory), by the text.
#[test]
fn an_optical_lattice_hops_as_in_the_table() {
    let bench = Bench::new(
        "crystal box\n  mass 87 u\n  carriers bosons\n  lattice square 532 nm\n  recoil 1064 nm\n  depth (1,0) = 5 Er\n  \
         depth (0,1) = 5 Er\n  bands 1\n  measure j = hopping 1 by (1,0)\n",
    );
    let recoil = bench
        .build(0, &Setting::default())
        .crystal
        .recoil
        .unwrap()
        .energy
        .value;
    let hop = value(&bench, 0, "j");
    row(
        "hopping, five recoils deep",
        "4J in print, Er",
        (4.0 * hop.value / recoil - 0.263_069).abs(),
        5e-7,
    );
}

/// Where a tolerance splits levels that touch, slopes at the nominal values name no corner: the worst case is that of the
/// corners solved.
#[test]
fn worst_cases_hold_where_a_tolerance_splits_a_crossing() {
    let dots = "crystal comb\n  mass 0.067 me\n  lattice hexagonal 20 nm\n  site gaussian -60 meV ± 5 % sigma 2.8 nm at (1/3, 2/3)\n  \
                site gaussian -60 meV ± 2 % sigma 2.8 nm at (2/3, 1/3)\n  bands 2\n  filling 2\n";
    let bench = Bench::new(&format!(
        "{dots}  require gap 1 <= 1 meV\n  require gap 1 closed\n"
    ));
    let draws = draws(&bench);
    let mut largest = 0.0_f64;
    for (one, other) in [(1.0, 1.0), (1.0, -1.0), (-1.0, 1.0), (-1.0, -1.0)] {
        let mut setting = Setting::default();
        setting.draws.insert(draws[0], one);
        setting.draws.insert(draws[1], other);
        largest = largest.max(bench.solve_at(0, &setting).gaps[0].size.value);
    }
    let (targets, _) = bench.assess(0);
    assert_eq!(targets[0].state, TargetState::AtRisk, "{:?}", targets[0]);
    let worst = targets[0].worst.unwrap();
    assert!(
        (worst - largest).abs() < 1e-6 * largest,
        "{worst:e} {largest:e}"
    );
    assert_eq!(targets[1].state, TargetState::Met, "{:?}", targets[1]);
}

const SILICON: &str = "crystal si\n  lattice fcc 5.43 Å\n  atom A at (0.125, 0.125, 0.125)\n  \
     atom A at (0.875, 0.875, 0.875)\n  formfactor A 3 = -0.21 Ry\n  formfactor A 8 = 0.04 Ry\n  \
     formfactor A 11 = 0.08 Ry\n  filling 8\n  bands 4\n";

/// A target in three dimensions: value, slope's sign and worst corner by the solver, against the corners solved apart.
#[test]
fn targets_of_a_solid_have_their_worst_corner() {
    let text = SILICON.replace(
        "formfactor A 8 = 0.04 Ry",
        "formfactor A 8 = 0.04 Ry ± 0.004 Ry",
    );
    let bench = Bench::new(&format!(
        "{text}  require gap 4 >= 0.7 eV\n  require semiconductor\n  require gap 4 indirect\n"
    ));
    let draw = draws(&bench)[0];
    let at = |end: f64| {
        let mut setting = Setting::default();
        setting.draws.insert(draw, end);
        bench.solve_at(0, &setting).gaps[3].size
    };
    let (low, high) = (at(-1.0), at(1.0));
    let least = if low.value < high.value { low } else { high };
    let (targets, _) = bench.assess(0);
    let worst = targets[0].worst.unwrap();
    assert!(
        (worst - least.value).abs() <= least.uncertainty,
        "{worst:e} {least:?}"
    );
    let wanted = if least.value / EV >= 0.7 {
        TargetState::Met
    } else {
        TargetState::AtRisk
    };
    assert_eq!(targets[0].state, wanted, "{:?}", targets[0]);
    assert_eq!(targets[1].state, TargetState::Met, "{:?}", targets[1]);
    assert_eq!(targets[2].state, TargetState::Met, "{:?}", targets[2]);
}

/// Hard or huge wishes end, with honest error bounds or with the reason why there are none.
#[test]
fn work_is_bounded_whatever_the_text_says() {
    let texts = [
        "crystal a\n  lattice cubic 1 nm\n  site box 10 eV size 0.3 nm by 0.3 nm by 0.3 nm at (0, 0, 0)\n  bands 3\n",
        "crystal b\n  lattice square 1 nm\n  site disk -300 eV radius 0.05 nm at (0, 0)\n  bands 3\n",
        "crystal c\n  lattice triclinic 0.5 nm by 0.6 nm by 0.7 nm angles 80 deg, 95 deg, 100 deg\n  bands 200\n  cosine (1,0,0) = 1 eV\n",
    ];
    for text in texts {
        let bench = Bench::new(text);
        let built = bench.build(0, &Setting::default());
        assert!(!built.crystal.broken, "{:#?}", built.troubles);
        match bench.solver.solve(&built.crystal, &|| false) {
            Ok(found) => {
                for band in &found.bands {
                    let (low, high) = (band.bottom.energy, band.top.energy);
                    assert!(low.uncertainty.is_finite() && high.uncertainty.is_finite());
                    assert!(low.value <= high.value + low.uncertainty + high.uncertainty);
                }
            }
            Err(Unsolved::NotConverged(why)) => assert!(!why.is_empty()),
            Err(other) => panic!("{other:?}"),
        }
        // Work that is not wanted any more stops.
        let calls = std::sync::atomic::AtomicUsize::new(0);
        let stop = || calls.fetch_add(1, std::sync::atomic::Ordering::Relaxed) > 3;
        let fresh = Bench::new(text);
        assert_eq!(
            fresh.solver.solve(&built.crystal, &stop),
            Err(Unsolved::Cancelled)
        );
    }
}

/// A potential that is constant along y has the chain's levels at k_y = 0.
#[test]
fn a_chain_is_a_rectangle_that_is_constant_across() {
    let text = "crystal row\n  mass 0.3 me\n  lattice chain 2 nm\n  cosine 1 = 0.3 eV phase 0.4\n  cosine 2 = 0.1 eV\n\n\
                crystal strip\n  mass 0.3 me\n  lattice rectangular 2 nm by 1 nm\n  cosine (1,0) = 0.3 eV phase 0.4\n  \
                cosine (2,0) = 0.1 eV\n  bands 2\n  measure a = level 1 at X\n  measure b = level 2 at (0.5, 0)\n  \
                measure c = level 1 at centre\n";
    let bench = Bench::new(text);
    let chain = bench.solve(0);
    let (_, measures) = bench.assess(1);
    let wanted = [
        chain.bands[0].top.energy,
        chain.bands[1].bottom.energy,
        chain.bands[0].bottom.energy,
    ];
    let mut worst = 0.0_f64;
    for (measure, wanted) in measures.iter().zip(wanted) {
        let found = measure.value.clone().unwrap();
        let error = (found.value - wanted.value).abs();
        worst = worst.max(error / EV);
        assert!(
            error <= found.uncertainty + wanted.uncertainty,
            "{}: {error:.1e} J",
            measure.name
        );
    }
    row(
        "a chain as a plane constant in y",
        "the same as a chain, eV",
        worst,
        1e-9,
    );
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
    let draws = draws(&bench);
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

/// A crease may be longer than a step of the mesh: the search goes on along it. 9.6258858887 meV at (0.557652, −0.278837) by a
/// simplex search on 289 plane waves (numpy, scipy).
#[test]
fn a_top_far_along_a_crease_is_found() {
    let bench = Bench::new(
        "crystal comb\n  lattice hexagonal 5 nm\n  fourier (0, 1) = 20 meV\n  fourier (0, -1) = 20 meV\n  \
         cosine (2, 0) = -1 meV\n",
    );
    let solution = bench.solve(0);
    let top = &solution.bands[0].top;
    let error = (top.energy.value / EV - 9.625_885_888_65e-3).abs();
    assert!(error < 2e-13 + top.energy.uncertainty / EV, "{top:?}");
    assert!((top.k[1].abs() - 0.278_837).abs() < 1e-5, "{top:?}");
}

/// Where a weak potential folds free particles back, bands have creases along the faces of the zone, and their tops lie
/// at its corners: no level may lie above the top, wherever it is.
#[test]
fn a_top_at_a_corner_of_the_zone_is_found_along_the_crease() {
    let bench = Bench::new(
        "crystal slab\n  lattice oblique 7 nm by 6.8 nm angle 85 deg\n  cosine (1, 0) = -0.2 meV\n  \
         cosine (2, -1) = -0.1 meV\n  measure l = level 1 at (0.4615, 0.5355)\n",
    );
    let (top, level) = (bench.solve(0), value(&bench, 0, "l"));
    let top = &top.bands[0].top.energy;
    assert!(
        top.value + top.uncertainty + level.uncertainty >= level.value,
        "{} meV at the top, {} meV elsewhere",
        top.value / EV * 1e3,
        level.value / EV * 1e3
    );
}
