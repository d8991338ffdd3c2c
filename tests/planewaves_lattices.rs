//! Bands over the whole zone of lattices with known answers.
#![allow(
    clippy::indexing_slicing,
    clippy::unwrap_used,
    missing_docs,
    clippy::print_stdout
)]

use crenate::numerics::planewaves::{
    Accuracy, Budget, Decay, Error, GapKind, Lattice, Potential, Waves, Zone, shapes, solve,
};
use nalgebra::Complex;
use serde_json::Value;
use std::f64::consts::PI;

fn reference() -> Value {
    serde_json::from_str(include_str!("reference/lattices_levels.json")).unwrap()
}

fn numbers(value: &Value) -> Vec<f64> {
    value
        .as_array()
        .unwrap()
        .iter()
        .map(|x| x.as_f64().unwrap())
        .collect()
}

fn endless<'a>() -> Budget<'a> {
    Budget::new(&|| false, 3000, 1_000_000)
}

/// Simple lattices of period π in d dimensions.
fn cubic(d: usize) -> Lattice {
    let all = [[PI, 0.0, 0.0], [0.0, PI, 0.0], [0.0, 0.0, PI]];
    Lattice::new(&all[..d]).unwrap()
}

/// Σ s·cos² over the first `axes` axes: mean s/2 and s/4 at ±1 each.
fn cosines(s: f64, axes: usize) -> impl Fn([i32; 3]) -> Complex<f64> + Sync {
    move |n| {
        let size: i32 = n.iter().map(|x| x.abs()).sum();
        let along = n.iter().position(|x| *x != 0).unwrap_or(0);
        let value = match size {
            0 => 0.5 * s * axes as f64,
            1 if along < axes => 0.25 * s,
            _ => 0.0,
        };
        Complex::new(value, 0.0)
    }
}

fn finite(components: &(dyn Fn([i32; 3]) -> Complex<f64> + Sync), radius: f64) -> Potential<'_> {
    Potential {
        components,
        decay: Decay::Finite { radius },
    }
}

fn assert_inside(
    found: crenate::numerics::planewaves::Estimate,
    wanted: f64,
    slack: f64,
    what: &str,
) {
    let error = (found.value - wanted).abs();
    assert!(
        error <= found.error + slack,
        "{what}: {} for {wanted}, off by {error:.1e}, stated {:.1e}",
        found.value,
        found.error
    );
}

/// Sums of one-dimensional bands (Mathieu characteristic values, DLMF chapter 28; rows computed at 40 digits).
#[test]
fn separable_cosines_are_sums_of_one_dimensional_bands() {
    let mut worst = (0.0_f64, String::new());
    for (name, row) in reference()["separable"].as_object().unwrap() {
        let s: f64 = name.parse().unwrap();
        let e = numbers(row);
        for d in 1..=3 {
            let components = cosines(s, d);
            let bands = 2;
            let zone = solve(
                &cubic(d),
                finite(&components, 2.0),
                bands,
                Accuracy::Settled(1e-9),
                &endless(),
            )
            .unwrap();
            assert!(zone.settled, "{d}D s = {s}: {zone:?}");
            let n = d as f64;
            // The second band of the sum: bottom with one axis in its second band, all others at their bottom.
            let rows = [
                (zone.bands[0].bottom.energy, n * e[0], "bottom 1"),
                (zone.bands[0].top.energy, n * e[1], "top 1"),
                (
                    zone.bands[1].bottom.energy,
                    (n - 1.0) * e[0] + e[2],
                    "bottom 2",
                ),
            ];
            for (index, (found, wanted, what)) in rows.into_iter().enumerate() {
                // Where bands overlap, the sorted bands of the sum are not the sums of bands.
                let overlaps = (n - 1.0) * e[0] + e[2] < n * e[1];
                if overlaps && index > 0 {
                    continue;
                }
                assert_inside(found, wanted, 0.0, &format!("{d}D s = {s} {what}"));
                let error = (found.value - wanted).abs();
                if error > worst.0 {
                    worst = (error, format!("{d}D s = {s} {what}"));
                }
            }
            let wanted = (n - 1.0) * e[0] + e[2] - n * e[1];
            if wanted > 0.0 {
                assert_eq!(
                    zone.gaps[0].kind,
                    if d == 1 {
                        GapKind::Direct
                    } else {
                        GapKind::Indirect
                    }
                );
            } else {
                assert_eq!(zone.gaps[0].kind, GapKind::Overlap);
            }
        }
    }
    println!("worst edge: {:.1e} Er, {}", worst.0, worst.1);
    assert!(worst.0 < 1e-9);
}

/// Where bands overlap, edges lie on crossings at no point with a name: sorted sums of one-dimensional levels, extremal
/// over the zone (`tests/reference/lattices_overlaps.py`).
#[test]
fn edges_on_crossings_of_overlapping_bands_are_found() {
    let rows: Value =
        serde_json::from_str(include_str!("reference/lattices_overlaps.json")).unwrap();
    let mut worst = (0.0_f64, String::new());
    for (name, row) in rows.as_object().unwrap() {
        let parts: Vec<f64> = name.split(' ').map(|x| x.parse().unwrap()).collect();
        let (d, s) = (parts[0] as usize, parts[1]);
        let components = cosines(s, d);
        let wanted: Vec<Vec<f64>> = row.as_array().unwrap().iter().map(numbers).collect();
        let tolerance = if d == 2 { 1e-9 } else { 1e-6 };
        let budget = endless();
        let started = std::time::Instant::now();
        let zone = solve(
            &cubic(d),
            finite(&components, 2.0),
            wanted.len(),
            Accuracy::Settled(tolerance),
            &budget,
        )
        .unwrap();
        let coarse = solve(
            &cubic(d),
            finite(&components, 2.0),
            wanted.len(),
            Accuracy::Coarse,
            &budget,
        )
        .unwrap();
        println!(
            "{d}D s = {s}: {} solves of at most {} waves, {:.2} s",
            zone.spent,
            zone.basis,
            started.elapsed().as_secs_f64()
        );
        for (band, wanted) in wanted.iter().enumerate() {
            for (zone, what) in [(&zone, "settled"), (&coarse, "coarse")] {
                let found = zone.bands[band];
                for (found, wanted, edge) in [
                    (found.bottom, wanted[0], "bottom"),
                    (found.top, wanted[1], "top"),
                ] {
                    let label = format!(
                        "{d}D s = {s} {edge} of band {} at {:?}, {what}",
                        band + 1,
                        found.k
                    );
                    println!("  {label}: {:?} for {wanted}", found.energy);
                    assert_inside(found.energy, wanted, 1e-9, &label);
                    let error = (found.energy.value - wanted).abs();
                    if what == "settled" && error > worst.0 {
                        worst = (error, label);
                    }
                }
            }
        }
    }
    println!("worst edge: {:.1e} Er, {}", worst.0, worst.1);
    assert!(worst.0 < 1e-7);
}

fn hexagonal(v: f64) -> (Lattice, impl Fn([i32; 3]) -> Complex<f64> + Sync) {
    // |b| = √3; direct vectors at 120°, reciprocal ones at 60°.
    let a = 4.0 * PI / 3.0;
    let lattice = Lattice::new(&[[a, 0.0, 0.0], [-0.5 * a, 0.75f64.sqrt() * a, 0.0]]).unwrap();
    let components = move |n: [i32; 3]| {
        let star = [[1, 0, 0], [0, 1, 0], [1, -1, 0]];
        let hit = star.iter().any(|g| *g == n || g.map(|x| -x) == n);
        Complex::new(if hit { v } else { 0.0 }, 0.0)
    };
    (lattice, components)
}

/// Rows by a dense solve at |k+G|² ≤ 300 (`tests/reference/lattices_generate.py`); the honeycomb's first two bands
/// touch at K at every depth (the symmetry of K forces it).
#[test]
fn honeycomb_touches_at_its_zone_corner() {
    for (name, row) in reference()["hexagonal"].as_object().unwrap() {
        let v: f64 = name.parse().unwrap();
        let (lattice, components) = hexagonal(v);
        let zone = solve(
            &lattice,
            finite(&components, 1.8),
            2,
            Accuracy::Settled(1e-9),
            &endless(),
        )
        .unwrap();
        let (g, k) = (numbers(&row["G"]), numbers(&row["K"]));
        assert!(zone.settled, "v = {v}: {zone:?}");
        assert_inside(zone.bands[0].bottom.energy, g[0], 1e-11, "bottom 1");
        assert_inside(
            zone.bands[0].top.energy,
            k[0].max(g[0]),
            1e-11,
            &format!("v = {v} top 1"),
        );
        if v > 0.0 {
            let gap = zone.gaps[0];
            // At 0.1 and 0.5 other parts of the two bands overlap in energy or not; the touching stays.
            let waves = Waves::new(&lattice, finite(&components, 1.8)).unwrap();
            let apart = waves
                .separations(1, Accuracy::Settled(1e-9), &endless())
                .unwrap()[0];
            assert!(
                apart.size.value.abs() <= apart.size.error && apart.size.error < 1e-10,
                "v = {v}: {apart:?}"
            );
            assert!((apart.k[0] - 1.0 / 3.0).abs() < 1e-9 && (apart.k[1] - 1.0 / 3.0).abs() < 1e-9);
            if v >= 1.0 {
                assert_eq!(gap.kind, GapKind::Closed, "v = {v}: {gap:?}");
                assert!(gap.size.error < 1e-10);
            }
            assert!(zone.bands[0].top.mass.is_none());
        } else {
            assert_ne!(zone.gaps[0].kind, GapKind::Closed);
        }
        // Deep wells have masses of up to millions, known to a per cent only.
        let mass = zone.bands[0].bottom.mass.unwrap();
        let share = if v.abs() > 2.0 { 2e-2 } else { 1e-4 };
        assert!(
            mass.value >= 1.0 && mass.error < share * mass.value,
            "v = {v}: {mass:?}"
        );
    }
}

/// |k+G|² and how often, counted exactly.
#[test]
fn empty_lattices_have_their_levels_and_degeneracies() {
    let zero = |_: [i32; 3]| Complex::new(0.0, 0.0);
    // Conventional edge 2π.
    let fcc = [[0.0, PI, PI], [PI, 0.0, PI], [PI, PI, 0.0]];
    let bcc = [[-PI, PI, PI], [PI, -PI, PI], [PI, PI, -PI]];
    let corners = [
        ("G", [0.0; 3]),
        ("X", [1.0, 0.0, 0.0]),
        ("L", [0.5; 3]),
        ("W", [1.0, 0.5, 0.0]),
        ("K", [0.75, 0.75, 0.0]),
        ("U", [1.0, 0.25, 0.25]),
        ("H", [1.0, 0.0, 0.0]),
        ("N", [0.5, 0.5, 0.0]),
        ("P", [0.5; 3]),
    ];
    let mut seen = 0;
    for (kind, vectors) in [("fcc", fcc), ("bcc", bcc)] {
        let lattice = Lattice::new(&vectors).unwrap();
        let waves = Waves::new(&lattice, finite(&zero, 0.0)).unwrap();
        for (label, rows) in reference()["empty"][kind].as_object().unwrap() {
            let cartesian = corners.iter().find(|(name, _)| name == label).unwrap().1;
            let k = vectors.map(|a| (0..3).map(|x| a[x] * cartesian[x]).sum::<f64>() / (2.0 * PI));
            let wanted: Vec<f64> = rows
                .as_array()
                .unwrap()
                .iter()
                .flat_map(|row| vec![row[0].as_f64().unwrap(); row[1].as_u64().unwrap() as usize])
                .collect();
            let found = waves.levels_at(k, wanted.len(), 12.0, &endless()).unwrap();
            assert_eq!(found.energies.len(), wanted.len());
            for (found, wanted) in found.energies.iter().zip(&wanted) {
                assert!(
                    (found - wanted).abs() < 1e-12,
                    "{kind} {label}: {found} for {wanted}"
                );
                seen += 1;
            }
        }
    }
    assert!(seen > 200);
}

/// A chain, and the same wave constant along y: with period π in y as well, band 1 of the plane folds k_y² ≤ 1 onto it.
#[test]
fn a_wave_constant_in_y_has_the_chain_s_bands() {
    let components = cosines(5.0, 1);
    let chain = solve(
        &cubic(1),
        finite(&components, 2.0),
        3,
        Accuracy::Settled(1e-10),
        &endless(),
    )
    .unwrap();
    let plane = solve(
        &cubic(2),
        finite(&components, 2.0),
        1,
        Accuracy::Settled(1e-10),
        &endless(),
    )
    .unwrap();
    let bottom = chain.bands[0].bottom;
    assert_inside(
        plane.bands[0].bottom.energy,
        bottom.energy.value,
        1e-12,
        "bottom",
    );
    // The top of the plane's first band: the chain's top with k_y at the zone's edge, or where its levels cross.
    assert_inside(
        plane.bands[0].top.energy,
        chain.bands[0].top.energy.value + 1.0,
        1e-12,
        "top",
    );
    let tensor = plane.bands[0].bottom.inverse_mass.unwrap();
    let inverse = bottom.inverse_mass.unwrap()[0][0];
    assert!(
        (tensor[0][0] - inverse).abs() < 1e-8
            && (tensor[1][1] - 1.0).abs() < 1e-9
            && tensor[0][1].abs() < 1e-9
    );
    let mass = plane.bands[0].bottom.mass.unwrap();
    assert!((mass.value - inverse.powf(-0.5)).abs() < mass.error + 1e-9);
}

/// Gaussian wells on a square, by a dense solve at a cut-off beyond need.
#[test]
fn gaussian_wells_settle_inside_their_stated_errors() {
    let lattice = Lattice::new(&[[1.0, 0.0, 0.0], [0.0, 1.0, 0.0]]).unwrap();
    for (name, row) in reference()["gaussian"].as_object().unwrap() {
        let parts: Vec<f64> = name.split(' ').map(|x| x.parse().unwrap()).collect();
        let (depth, sigma) = (parts[0], parts[1]);
        let components = |n: [i32; 3]| {
            let g = 2.0 * PI * f64::from(n[0] * n[0] + n[1] * n[1]).sqrt();
            Complex::new(-depth * shapes::gaussian(g, sigma, 2, 1.0), 0.0)
        };
        let bound = |g: f64| (-0.5 * (g * sigma).powi(2)).exp();
        let potential = Potential {
            components: &components,
            decay: Decay::Bounded(&bound),
        };
        for (accuracy, most) in [(Accuracy::Coarse, 0.5), (Accuracy::Settled(1e-7), 1e-7)] {
            let zone = solve(&lattice, potential, 2, accuracy, &endless()).unwrap();
            let (g, m) = (numbers(&row["G"]), numbers(&row["M"]));
            assert_inside(zone.bands[0].bottom.energy, g[0], 1e-11, "bottom");
            assert_inside(zone.bands[0].top.energy, m[0], 1e-11, "top");
            let error = zone.bands[0].top.energy.error;
            println!(
                "{name} {accuracy:?}: stated {error:.1e}, off by {:.1e}, {} waves, {} solves",
                (zone.bands[0].top.energy.value - m[0]).abs(),
                zone.basis,
                zone.spent
            );
            assert!(error <= most);
        }
    }
}

/// Lattices without symmetry: no point of a fine grid lies outside the edges found, and the edges are levels.
#[test]
fn no_point_of_a_fine_grid_beats_the_edges() {
    let lattice = Lattice::new(&[[1.0, 0.0, 0.0], [0.37, 0.92, 0.0]]).unwrap();
    for (first, second, place) in [
        (-25.0, -14.0, [0.31, 0.17]),
        (-60.0, 35.0, [0.45, 0.3]),
        (-8.0, -8.0, [0.2, 0.6]),
    ] {
        let b = lattice.reciprocal();
        let components = |n: [i32; 3]| {
            let g: [f64; 3] =
                std::array::from_fn(|x| (0..3).map(|i| f64::from(n[i]) * b[i][x]).sum());
            let size = g.iter().map(|x| x * x).sum::<f64>().sqrt();
            let volume = lattice.volume();
            shapes::at(g, [place[0], place[1], 0.0])
                * first
                * shapes::gaussian(size, 0.14, 2, volume)
                + Complex::new(second * shapes::gaussian(size, 0.19, 2, volume), 0.0)
        };
        let bound = |g: f64| (-0.5 * (0.14 * g).powi(2)).exp();
        let potential = Potential {
            components: &components,
            decay: Decay::Bounded(&bound),
        };
        let waves = Waves::new(&lattice, potential).unwrap();
        assert_eq!(waves.operations(), 2);
        let zone = waves.zone(4, Accuracy::Settled(1e-6), &endless()).unwrap();
        assert!(zone.settled);
        let apart_at_one_k = waves
            .separations(4, Accuracy::Settled(1e-6), &endless())
            .unwrap();
        let mut grid = Vec::new();
        for i in 0..40 {
            for j in 0..=20 {
                let k = [
                    f64::from(i) / 40.0 + 0.003,
                    f64::from(j) / 40.0 + 0.002,
                    0.0,
                ];
                grid.push(waves.levels_at(k, 5, 900.0, &endless()).unwrap().energies);
            }
        }
        for band in 0..4 {
            let best =
                |f: &dyn Fn(&[f64]) -> f64| grid.iter().map(|e| f(e)).fold(f64::INFINITY, f64::min);
            let (low, high, apart) = (
                best(&|e| e[band]),
                -best(&|e| -e[band]),
                best(&|e| e[band + 1] - e[band]),
            );
            let (found, separation) = (zone.bands[band], apart_at_one_k[band]);
            // The grid's levels are high by what their cut leaves out, below 1e-6.
            assert!(
                found.bottom.energy.value <= low + 1e-6,
                "bottom {band}: {found:?} {low}"
            );
            assert!(
                found.top.energy.value >= high - 2e-6,
                "top {band}: {found:?} {high}"
            );
            assert!(
                separation.size.value <= apart + 2e-6,
                "direct {band}: {separation:?} {apart}"
            );
            // Nor is the answer far beyond the grid: levels rise by at most 2|k+G| of about 20 over half a step of 0.08.
            assert!(
                found.bottom.energy.value > low - 0.8 && found.top.energy.value < high + 0.8,
                "{band}: {low} {high} {found:?}"
            );
            for extremum in [found.bottom, found.top] {
                let there = waves
                    .settled_at(extremum.k, 5, 1e-7, &endless())
                    .unwrap()
                    .energies[band];
                assert!(
                    (there.value - extremum.energy.value).abs()
                        <= extremum.energy.error + there.error + 1e-9
                );
            }
        }
    }
}

fn summary(zone: &Zone) -> String {
    zone.bands
        .iter()
        .map(|b| {
            format!(
                "{:.6}±{:.0e} … {:.6}±{:.0e}",
                b.bottom.energy.value,
                b.bottom.energy.error,
                b.top.energy.value,
                b.top.energy.error
            )
        })
        .collect::<Vec<_>>()
        .join("; ")
}

/// Budgets and cancellation stop the work.
#[test]
fn work_is_bounded() {
    let components = cosines(5.0, 2);
    let lattice = cubic(2);
    let potential = finite(&components, 2.0);
    let coarse = endless();
    let zone = solve(&lattice, potential, 3, Accuracy::Coarse, &coarse).unwrap();
    println!(
        "{} with {} solves of at most {} waves",
        summary(&zone),
        coarse.spent(),
        zone.basis
    );
    assert!(coarse.spent() < 1500, "{}", coarse.spent());
    let few = Budget::new(&|| false, 3000, 10);
    assert_eq!(
        solve(&lattice, potential, 3, Accuracy::Coarse, &few),
        Err(Error::BudgetSpent)
    );
    let small = Budget::new(&|| false, 10, 10_000);
    assert_eq!(
        solve(&lattice, potential, 3, Accuracy::Coarse, &small),
        Err(Error::BudgetSpent)
    );
    let gone = Budget::new(&|| true, 3000, 10_000);
    assert_eq!(
        solve(&lattice, potential, 3, Accuracy::Coarse, &gone),
        Err(Error::Cancelled)
    );
    let broken = |_: [i32; 3]| Complex::new(f64::NAN, 0.0);
    assert_eq!(
        solve(
            &lattice,
            finite(&broken, 2.0),
            3,
            Accuracy::Coarse,
            &endless()
        ),
        Err(Error::NotFinite)
    );
    let hard = Budget::new(&|| false, 60, 10_000);
    let wells = |n: [i32; 3]| {
        Complex::new(
            -40.0
                * shapes::disk(
                    2.0 * f64::from(n[0] * n[0] + n[1] * n[1]).sqrt(),
                    0.8,
                    PI * PI,
                ),
            0.0,
        )
    };
    let bound = |g: f64| g.powf(-1.5);
    let hard_zone = solve(
        &lattice,
        Potential {
            components: &wells,
            decay: Decay::Bounded(&bound),
        },
        1,
        Accuracy::Settled(1e-9),
        &hard,
    )
    .unwrap();
    assert!(!hard_zone.settled && hard_zone.basis <= 60, "{hard_zone:?}");
}
