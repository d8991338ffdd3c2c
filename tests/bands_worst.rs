//! Hoppings, masses and Fermi levels of plane and solid crystals over their tolerances: derivatives against differences of
//! whole solutions and against closed forms, worst cases against grids over the box.
#![allow(
    clippy::indexing_slicing,
    clippy::unwrap_used,
    clippy::print_stdout,
    missing_docs
)]

#[path = "bands/mod.rs"]
mod bench;

use std::sync::Arc;
use std::sync::atomic::{AtomicUsize, Ordering};

use bench::{Bench, EV, draws, row};
use crenate::bands::{Assessment, TargetState, Unsolved, Wanted};
use crenate::model::{CrystalRef, ParameterId, Setting};

fn setting(draws: &[ParameterId], at: &[f64]) -> Setting {
    Setting {
        draws: draws.iter().copied().zip(at.iter().copied()).collect(),
        ..Setting::default()
    }
}

/// The value of a measure and its uncertainty at a setting, in SI.
fn value_at(bench: &Bench, setting: &Setting, name: &str) -> (f64, f64) {
    let built = bench.build(0, setting);
    let assessed = bench.solver.assess(
        bench.crystal_ref(0),
        &Arc::new(built.crystal),
        &|_: CrystalRef, _: &Setting| None,
        &|| false,
    );
    let (_, measures) = assessed.unwrap();
    let found = measures.into_iter().find(|one| one.name == name).unwrap();
    let value = found.value.unwrap();
    (value.value, value.uncertainty)
}

/// The derivatives of the first target's value by its tolerances, per half width.
fn slopes(bench: &Bench, draws: &[ParameterId]) -> Vec<f64> {
    let crystal = Arc::new(bench.build(0, &Setting::default()).crystal);
    let rebuild = |_: CrystalRef, setting: &Setting| {
        let built = bench.build(0, setting);
        (!built.crystal.broken).then(|| Arc::new(built.crystal))
    };
    let wanted = Wanted {
        of: bench.crystal_ref(0),
        crystal: &crystal,
        rebuild: &rebuild,
        index: 0,
        cancelled: &|| false,
    };
    let numbers: Vec<(ParameterId, f64)> = draws.iter().map(|draw| (*draw, 0.0)).collect();
    bench.solver.pulls(&wanted, &numbers, &[]).expect("slopes")
}

/// Slopes of quantities by every tolerance of a text against central differences of their values: the largest error, as a
/// part of the largest slope of its quantity.
fn slope_error(text: &str, quantities: &[(&str, &str)]) -> f64 {
    let measures = quantities.iter().enumerate();
    let measures: String = measures
        .map(|(index, (quantity, _))| format!("  measure q{index} = {quantity}\n"))
        .collect();
    let plain = Bench::new(&format!("{text}{measures}"));
    let draws = draws(&plain);
    assert!(!draws.is_empty());
    let values = |index: usize, end: f64| -> Vec<f64> {
        let mut point = vec![0.0; draws.len()];
        point[index] = end;
        let setting = setting(&draws, &point);
        let names = (0..quantities.len()).map(|index| format!("q{index}"));
        names
            .map(|name| value_at(&plain, &setting, &name).0)
            .collect()
    };
    let ends = (0..draws.len()).map(|index| [values(index, -1.0), values(index, 1.0)]);
    let ends: Vec<[Vec<f64>; 2]> = ends.collect();
    let mut worst = 0.0_f64;
    for (q, (quantity, zero)) in quantities.iter().enumerate() {
        let wanted = Bench::new(&format!("{text}  require {quantity} >= {zero}\n"));
        let exact = slopes(&wanted, &draws);
        let rough: Vec<f64> = ends
            .iter()
            .map(|[low, high]| 0.5 * (high[q] - low[q]))
            .collect();
        let largest = rough.iter().copied().map(f64::abs).fold(0.0, f64::max);
        assert!(largest > 0.0);
        for (exact, rough) in exact.iter().zip(&rough) {
            let error = (exact - rough).abs() / largest;
            assert!(error < 1e-2, "{quantity}: {exact:e} for {rough:e}");
            worst = worst.max(error);
        }
    }
    worst
}

/// One row of `reference/optical_slopes.csv`: J, dJ/ds, mass, dmass/ds.
fn standing_wave(s: &str) -> [f64; 4] {
    let rows = include_str!("reference/optical_slopes.csv").lines();
    let start = format!("{s},");
    let row = { rows }.find(|row| row.starts_with(&start)).unwrap();
    let numbers: Vec<f64> = row.split(',').skip(1).map(|x| x.parse().unwrap()).collect();
    [numbers[0], numbers[1], numbers[2], numbers[3]]
}

/// Standing waves along the axes do not know of one another: hopping along one is that of a single wave, and the mass of the
/// bottom is the geometric mean of the masses along each (rows made with mpmath, `reference/optical_slopes.py`).
#[test]
fn crossed_standing_waves_have_the_slopes_of_one() {
    let text = |lattice: &str, waves: [&str; 3], depth: &str| {
        let waves = waves.iter().filter(|wave| !wave.is_empty());
        let waves: String = waves
            .map(|wave| format!("  depth {wave} = {depth} Er ± 0.05 Er\n"))
            .collect();
        format!(
            "crystal box\n  mass 87 u\n  carriers bosons\n  lattice {lattice} 532 nm\n  recoil 1064 nm\n{waves}  bands 1\n"
        )
    };
    let mut worst = [0.0_f64; 4];
    for (lattice, waves, hop, depth) in [
        ("square", ["(1,0)", "(0,1)", ""], "(1,0)", "5.0"),
        ("square", ["(1,0)", "(0,1)", ""], "(1,0)", "1.0"),
        ("cubic", ["(1,0,0)", "(0,1,0)", "(0,0,1)"], "(1,0,0)", "2.0"),
    ] {
        let [hopping, slope, mass, rise] = standing_wave(depth);
        let text = text(lattice, waves, depth);
        let bench = Bench::new(&format!("{text}  require hopping 1 by {hop} >= 0 Er\n"));
        let draws = draws(&bench);
        let unit = bench
            .build(0, &Setting::default())
            .crystal
            .recoil
            .unwrap()
            .energy
            .value;
        let mut wanted = vec![0.0; draws.len()];
        // Tolerances are sorted by their names, not by their places.
        let exact = slopes(&bench, &draws);
        let along = (0..draws.len()).max_by(|a, b| exact[*a].abs().total_cmp(&exact[*b].abs()));
        wanted[along.unwrap()] = 0.05 * slope;
        for (exact, wanted) in exact.iter().zip(&wanted) {
            worst[0] = worst[0].max((exact / unit - wanted).abs() / (0.05 * slope).abs());
        }
        let (targets, _) = bench.assess(0);
        let value = targets[0].value.unwrap().value / unit;
        worst[1] = worst[1].max((value - hopping).abs());

        let bench = Bench::new(&format!("{text}  require mass bottom 1 >= 0 u\n"));
        let share = 0.05 / draws.len() as f64 * rise / mass;
        let value = bench.solve(0).bands[0].bottom.mass.unwrap().value;
        for exact in slopes(&bench, &draws) {
            let solid = usize::from(lattice == "cubic");
            worst[2 + solid] = worst[2 + solid].max((exact / value / share - 1.0).abs());
        }
    }
    row(
        "crossed waves, dJ/ds",
        "one wave, of itself",
        worst[0],
        1e-6,
    );
    row("crossed waves, J", "one wave, Er", worst[1], 1e-8);
    row(
        "crossed waves in the plane, dm/ds",
        "one wave, of itself",
        worst[2],
        1e-5,
    );
    // Levels of a solid are settled less far.
    row(
        "crossed waves in space, dm/ds",
        "one wave, of itself",
        worst[3],
        1e-4,
    );
}

/// A tolerance on one of the waves that symmetry makes equal breaks it; the cells are moved off their middles.
#[test]
fn slopes_of_hoppings_are_those_of_differences_where_symmetry_breaks() {
    let hexagonal = "crystal wells\n  mass 0.3 me\n  lattice hexagonal 6 nm\n  cosine (1,0) = -0.2 eV ± 1 % phase 0.7\n  \
                     cosine (0,1) = -0.2 eV phase 1.9\n  cosine (1,-1) = -0.2 eV phase 0.7 - 1.9\n  bands 1\n";
    let rectangle = "crystal slab\n  mass 0.3 me ± 1 %\n  lattice rectangular 5 nm by 4 nm ± 0.5 %\n  \
                     cosine (1,0) = -0.2 eV phase 0.7\n  cosine (0,1) = -0.2 eV phase 1.9\n  \
                     fourier (1,1) = -0.02 eV phase 2.6\n  fourier (-1,-1) = -0.02 eV phase -2.6\n  bands 1\n";
    let hops = [
        ("hopping 1 by (1,0)", "-9 eV"),
        ("hopping 1 by (1,1)", "-9 eV"),
    ];
    let worst = slope_error(hexagonal, &hops).max(slope_error(rectangle, &hops));
    row(
        "hoppings, broken symmetry",
        "differences, of the largest",
        worst,
        2e-3,
    );
}

/// On an oblique lattice the highest energy of the lowest band lies at no point that symmetry holds, and moves.
#[test]
fn slopes_of_masses_follow_an_extremum_that_moves() {
    let text = "crystal slant\n  mass 0.3 me\n  lattice oblique 2 nm by 1.8 nm ± 0.25 % angle 72 deg\n  \
                cosine (1,0) = -0.2 eV ± 0.5 %\n  cosine (0,1) = -0.15 eV\n  cosine (1,1) = -0.15 eV\n  bands 1\n";
    let at = |end: f64| {
        let bench = Bench::new(text);
        let draws = draws(&bench);
        let point = vec![end; draws.len()];
        bench.solve_at(0, &setting(&draws, &point)).bands[0]
            .top
            .k
            .clone()
    };
    let (low, high) = (at(-1.0), at(1.0));
    assert!(
        low.iter().zip(&high).any(|(a, b)| (a - b).abs() > 1e-5),
        "{low:?}"
    );
    let worst = slope_error(text, &[("mass top 1", "0 me"), ("mass bottom 1", "0 me")]);
    row(
        "masses, a top that moves",
        "differences, of the largest",
        worst,
        1e-3,
    );
}

#[test]
fn slopes_of_masses_in_wells_are_those_of_differences() {
    let text = "crystal dots\n  mass 0.1 me\n  lattice square 4 nm\n  \
                site gaussian -0.15 eV sigma 0.9 nm ± 0.5 % at (0.5, 0.5)\n  bands 1\n";
    let worst = slope_error(
        text,
        &[("mass bottom 1", "0 me"), ("hopping 1 by (1,0)", "0 eV")],
    );
    row(
        "masses in wells",
        "differences, of the largest",
        worst,
        1e-3,
    );
}

/// A Fermi level of free particles is in proportion to 1/m and to 1/a²; another one by differences.
#[test]
fn slopes_of_fermi_levels_are_those_of_closed_forms_and_differences() {
    let bench = Bench::new(
        "crystal free\n  mass 0.3 me ± 3 %\n  lattice hexagonal 0.6 nm ± 1 %\n  cosine (1,0) = 0 eV\n  filling 1\n  bands 1\n  \
         require fermi >= 0 eV\n",
    );
    let level = bench.solve(0).fermi.unwrap().value;
    let mut found: Vec<f64> = slopes(&bench, &draws(&bench))
        .iter()
        .map(|s| s / level)
        .collect();
    found.sort_by(f64::total_cmp);
    let worst = found
        .iter()
        .zip([-0.03, -0.02])
        .map(|(a, b)| (a / b - 1.0).abs())
        .fold(0.0, f64::max);
    row(
        "free particles, dE_F",
        "closed form, of itself",
        worst,
        2e-3,
    );
    let text = "crystal sheet\n  mass 0.3 me\n  lattice square 2 nm\n  cosine (1,0) = 0.3 eV ± 20 %\n  \
                cosine (0,1) = 0.2 eV\n  cosine (1,1) = 0.1 eV\n  filling 1.2\n  bands 2\n";
    let worst = slope_error(text, &[("fermi", "-9 eV")]);
    row("a metal's dE_F", "differences, of itself", worst, 1e-2);
}

/// The least of some values over a grid of the box, and where.
fn least(count: usize, dimensions: usize, value: impl Fn(&[f64]) -> f64) -> (f64, Vec<f64>) {
    let points = (0..count.pow(u32::try_from(dimensions).unwrap())).map(|index| {
        let place = |axis: usize| index / count.pow(u32::try_from(axis).unwrap()) % count;
        let at = |axis: usize| 2.0 * place(axis) as f64 / (count - 1) as f64 - 1.0;
        let point: Vec<f64> = (0..dimensions).map(at).collect();
        (value(&point), point)
    });
    points.min_by(|a, b| a.0.total_cmp(&b.0)).unwrap()
}

fn corner(assessment: &Assessment, draws: &[ParameterId]) -> Vec<f64> {
    let at = |draw: &ParameterId| {
        assessment
            .corner
            .iter()
            .find(|(id, _)| id == draw)
            .unwrap()
            .1
    };
    draws.iter().map(at).collect()
}

/// A second harmonic makes the bottom heavier whichever its sign, so that the lightest mass lies inside the tolerance; the
/// masses along each axis are those of a chain, solved by another method.
#[test]
fn the_worst_mass_inside_the_box_is_found() {
    let head = "  mass 10 u\n  carriers bosons\n  recoil 1000 nm\n  bands 1\n";
    let bench = Bench::new(&format!(
        "crystal plane\n{head}  lattice square 500 nm\n  cosine (1,0) = 2.4 Er\n  cosine (2,0) = 4 Er ± 2.4 Er\n  \
         cosine (0,1) = 2 Er ± 1 Er\n  require mass bottom 1 >= 13.2 u\n"
    ));
    let along_x = Bench::new(&format!(
        "crystal x\n{head}  lattice chain 500 nm\n  cosine 1 = 2.4 Er\n  cosine 2 = 4 Er ± 2.4 Er\n"
    ));
    let along_y = Bench::new(&format!(
        "crystal y\n{head}  lattice chain 500 nm\n  cosine 1 = 2 Er ± 1 Er\n"
    ));
    let mass = |bench: &Bench, point: &[f64]| {
        let setting = setting(&draws(bench), point);
        bench.solve_at(0, &setting).bands[0]
            .bottom
            .mass
            .unwrap()
            .value
    };
    let (x, inside) = least(801, 1, |point| mass(&along_x, point));
    let (y, end) = least(41, 1, |point| mass(&along_y, point));
    assert!(inside[0].abs() < 0.9 && end == [-1.0], "{inside:?} {end:?}");
    let (targets, _) = bench.assess(0);
    let worst = targets[0].worst.unwrap();
    assert_eq!(targets[0].state, TargetState::AtRisk, "{:?}", targets[0]);
    assert_eq!(targets[0].reason, None);
    let mut found = corner(&targets[0], &draws(&bench));
    found.sort_by(f64::total_cmp);
    assert!(
        found[0] == -1.0 && (found[1] - inside[0]).abs() < 0.01,
        "{found:?} {inside:?}"
    );
    row(
        "the lightest mass",
        "two chains, of itself",
        (worst / (x * y).sqrt() - 1.0).abs(),
        2e-5,
    );
}

/// A hop along the diagonal takes the sign of the wave along it: its magnitude is least inside the tolerance, and largest
/// at a corner.
#[test]
fn a_hopping_that_changes_sign_is_followed_to_zero() {
    let text = "crystal sheet\n  mass 0.3 me\n  lattice square 5 nm\n  cosine (1,0) = 0.2 eV\n  cosine (0,1) = 0.2 eV ± 10 %\n  \
                cosine (1,1) = 0.02 eV ± 0.06 eV\n  bands 1\n";
    let measured = Bench::new(&format!("{text}  measure q = hopping 1 by (1,1)\n"));
    let bench = Bench::new(&format!(
        "{text}  require abs(hopping 1 by (1,1)) >= 0.002 meV\n  require hopping 1 by (1,1) <= 9 meV\n  \
         require hopping 1 by (1,1) between -9 meV and 9 meV\n"
    ));
    let draws = draws(&bench);
    let value = |point: &[f64]| value_at(&measured, &setting(&draws, point), "q").0;
    let (lowest, _) = least(5, 2, value);
    let (highest, at) = least(5, 2, |point| -value(point));
    let highest = -highest;
    assert!(lowest < 0.0 && highest > 0.0, "{lowest:e} {highest:e}");
    let (targets, _) = bench.assess(0);
    assert_eq!(targets[0].state, TargetState::AtRisk, "{:?}", targets[0]);
    assert!(targets[0].worst.unwrap() < 1e-9 * EV, "{:?}", targets[0]);
    assert_eq!(corner(&targets[1], &draws), at);
    let error = (targets[1].worst.unwrap() / highest - 1.0).abs();
    row(
        "the largest hopping",
        "a grid over the box, of itself",
        error,
        1e-6,
    );
    let widest = if -lowest > highest { lowest } else { highest };
    let error = (targets[2].worst.unwrap() / widest - 1.0).abs();
    row(
        "the widest hopping",
        "a grid over the box, of itself",
        error,
        1e-6,
    );
}

/// A wave that tells the two wells of a honeycomb apart passes zero inside its tolerance, and the gap with it.
#[test]
fn a_gap_that_closes_inside_the_box_is_found() {
    let bench = Bench::new(
        "crystal comb\n  let tilt = 0.1 Er ± 0.3 Er\n  mass 10 u\n  lattice hexagonal 500 nm\n  recoil 750 nm\n  bands 2\n  \
         filling 2\n  cosine star (1,0) = 1.0 Er\n  cosine (1,0) = tilt phase 90 deg\n  cosine (0,1) = tilt phase -90 deg\n  \
         cosine (1,-1) = tilt phase -90 deg\n  require gap 1 >= 0.01 Er\n",
    );
    let (targets, _) = bench.assess(0);
    let value = targets[0].value.unwrap().value;
    assert_eq!(targets[0].state, TargetState::AtRisk, "{:?}", targets[0]);
    assert!(
        targets[0].worst.unwrap().abs() < 1e-4 * value,
        "{:?}",
        targets[0]
    );
    let found = corner(&targets[0], &draws(&bench))[0];
    assert!((found + 1.0 / 3.0).abs() < 1e-3, "{found}");
}

/// The worst Fermi level of a metal against those at the ends.
#[test]
fn the_worst_fermi_level_is_at_an_end() {
    let text = "crystal sheet\n  mass 0.3 me\n  lattice square 2 nm\n  cosine star (1,0) = 0.2 eV ± 20 %\n  filling 0.8\n  bands 1\n";
    let bench = Bench::new(&format!(
        "{text}  require fermi <= 9 eV\n  require fermi >= -9 eV\n"
    ));
    let draws = draws(&bench);
    let ends = [-1.0, 1.0].map(|end| {
        bench
            .solve_at(0, &setting(&draws, &[end]))
            .fermi
            .unwrap()
            .value
    });
    let (targets, _) = bench.assess(0);
    let [low, high] = if ends[0] < ends[1] {
        ends
    } else {
        [ends[1], ends[0]]
    };
    assert_eq!(targets[0].worst, Some(high));
    assert_eq!(targets[1].worst, Some(low));
    for target in &targets {
        assert_eq!((target.state, &target.reason), (TargetState::Met, &None));
    }
}

/// Work that is not wanted any more stops inside the sums over the zone and the search.
#[test]
fn a_search_that_is_overtaken_stops() {
    let text = "crystal sheet\n  mass 0.3 me\n  lattice square 2 nm\n  cosine star (1,0) = 0.2 eV ± 20 %\n  filling 0.8\n  bands 1\n";
    for quantity in [
        "hopping 1 by (1,0) >= 0 eV",
        "fermi >= -9 eV",
        "mass bottom 1 >= 0 me",
    ] {
        let bench = Bench::new(&format!("{text}  require {quantity}\n"));
        let crystal = Arc::new(bench.build(0, &Setting::default()).crystal);
        let rebuild =
            |_: CrystalRef, setting: &Setting| Some(Arc::new(bench.build(0, setting).crystal));
        let asked = AtomicUsize::new(0);
        // The whole zone once, so that what is stopped is what comes after.
        bench.solve(0);
        let stop = || asked.fetch_add(1, Ordering::Relaxed) > 20;
        let found = bench
            .solver
            .assess(bench.crystal_ref(0), &crystal, &rebuild, &stop);
        assert_eq!(found.err(), Some(Unsolved::Cancelled), "{quantity}");
        let asked = asked.into_inner();
        assert!(asked < 200, "{quantity}: went on for {asked}");
    }
}
