//! Hopping, masses, Fermi levels, responses and paths.
#![allow(
    clippy::indexing_slicing,
    clippy::unwrap_used,
    missing_docs,
    clippy::print_stdout
)]

use crenate::numerics::planewaves::{
    Accuracy, Budget, Decay, Error, Lattice, Potential, Waves, shapes,
};
use nalgebra::Complex;
use serde_json::Value;
use std::f64::consts::PI;

fn endless<'a>() -> Budget<'a> {
    Budget::new(&|| false, 3000, 1_000_000)
}

fn cubic(d: usize, a: f64) -> Lattice {
    let all = [[a, 0.0, 0.0], [0.0, a, 0.0], [0.0, 0.0, a]];
    Lattice::new(&all[..d]).unwrap()
}

fn cosines(s: f64, axes: usize) -> impl Fn([i32; 3]) -> Complex<f64> + Sync {
    move |n| {
        let size: i32 = n.iter().map(|x| x.abs()).sum();
        Complex::new(
            if size == 0 {
                0.5 * s * axes as f64
            } else if size == 1 {
                0.25 * s
            } else {
                0.0
            },
            0.0,
        )
    }
}

fn finite(components: &(dyn Fn([i32; 3]) -> Complex<f64> + Sync), radius: f64) -> Potential<'_> {
    Potential {
        components,
        decay: Decay::Finite { radius },
    }
}

/// The largest |bᵢ|².
fn largest(lattice: &Lattice) -> f64 {
    let squares = lattice.reciprocal().map(|b| b.iter().map(|x| x * x).sum());
    squares.into_iter().fold(0.0, f64::max)
}

fn empty(_: [i32; 3]) -> Complex<f64> {
    Complex::new(0.0, 0.0)
}

/// Chain values by `tests/reference/lattices_chain.py`; in a separable square or cube the hopping along an axis is the
/// chain's, and that along a diagonal zero.
#[test]
fn hopping_and_masses_are_the_chain_s() {
    let rows: Value = serde_json::from_str(include_str!("reference/lattices_chain.json")).unwrap();
    for (name, row) in rows.as_object().unwrap() {
        let s: f64 = name.parse().unwrap();
        let wanted: Vec<f64> = row["hopping"]
            .as_array()
            .unwrap()
            .iter()
            .map(|x| x.as_f64().unwrap())
            .collect();
        for d in 1..=2 {
            let components = cosines(s, d);
            let waves = Waves::new(&cubic(d, PI), finite(&components, 2.0)).unwrap();
            let cells = [[1, 0, 0], [2, 0, 0], [3, 0, 0], [1, 1, 0]];
            let found = waves
                .hopping(0, &cells[..if d == 1 { 3 } else { 4 }], 1e-9, &endless())
                .unwrap();
            for (found, wanted) in found.iter().zip(wanted.iter().chain(&[0.0])) {
                assert!(
                    (found.value - wanted).abs() <= found.error + 1e-12,
                    "{d}D s = {s}: {found:?} for {wanted}"
                );
                // The shallowest band is so near the next that the largest mesh is not yet enough.
                assert!(
                    found.error <= if s < 2.0 { 1e-6 } else { 1e-9 },
                    "{d}D s = {s}: {found:?}"
                );
            }
            let zone = waves.zone(1, Accuracy::Settled(1e-9), &endless()).unwrap();
            for (extremum, wanted) in [
                (zone.bands[0].bottom, &row["inverse_bottom"]),
                (zone.bands[0].top, &row["inverse_top"]),
            ] {
                let (tensor, mass, inverse) = (
                    extremum.inverse_mass.unwrap(),
                    extremum.mass.unwrap(),
                    wanted.as_f64().unwrap(),
                );
                assert!(
                    (mass.value - 1.0 / inverse).abs() <= mass.error + 1e-9 * mass.value.abs(),
                    "{d}D s = {s}: {mass:?} for {}",
                    1.0 / inverse
                );
                assert!(mass.error < 1e-3 * mass.value.abs());
                for (x, row) in tensor.iter().enumerate().take(d) {
                    assert!((row[x] - inverse).abs() < 1e-3 * inverse.abs());
                }
            }
        }
    }
}

#[test]
fn hopping_of_a_band_that_touches_is_refused() {
    // The honeycomb's Dirac point lies on every mesh that thirds the zone.
    let a = 4.0 * PI / 3.0;
    let lattice = Lattice::new(&[[a, 0.0, 0.0], [-0.5 * a, 0.75f64.sqrt() * a, 0.0]]).unwrap();
    let components = |n: [i32; 3]| {
        let star = [[1, 0, 0], [0, 1, 0], [1, -1, 0]];
        let hit = star.iter().any(|g| *g == n || g.map(|x| -x) == n);
        Complex::new(if hit { 5.0 } else { 0.0 }, 0.0)
    };
    let waves = Waves::new(&lattice, finite(&components, 1.8)).unwrap();
    assert_eq!(
        waves.hopping(0, &[[1, 0, 0]], 1e-8, &endless()),
        Err(Error::Touching)
    );
}

/// Free particles: N = Ω k_F/π, Ω k_F²/4π, Ω k_F³/6π², and U = N·E_F·d/(d+2). One to six particles by twos in every
/// lattice, to 2·10⁻⁵ of |b|² in a plane and 6·10⁻⁵ in space.
#[test]
fn free_particles_fill_their_sphere() {
    let h = 3f64.sqrt() / 2.0;
    let lattices = [
        ("chain", cubic(1, 1.0)),
        ("square", cubic(2, 1.0)),
        (
            "hexagonal",
            Lattice::new(&[[1.0, 0.0, 0.0], [-0.5, h, 0.0]]).unwrap(),
        ),
        (
            "oblique",
            Lattice::new(&[[1.0, 0.0, 0.0], [0.27, 1.13, 0.0]]).unwrap(),
        ),
        ("cubic", cubic(3, 1.0)),
        (
            "fcc",
            Lattice::new(&[[0.0, 0.5, 0.5], [0.5, 0.0, 0.5], [0.5, 0.5, 0.0]]).unwrap(),
        ),
        (
            "bcc",
            Lattice::new(&[[-0.5, 0.5, 0.5], [0.5, -0.5, 0.5], [0.5, 0.5, -0.5]]).unwrap(),
        ),
        (
            "hexagonal solid",
            Lattice::new(&[[1.0, 0.0, 0.0], [-0.5, h, 0.0], [0.0, 0.0, 1.6]]).unwrap(),
        ),
    ];
    for (name, lattice) in lattices {
        let waves = Waves::new(&lattice, finite(&empty, 0.0)).unwrap();
        let unit = largest(&lattice);
        let mut worst = (0.0_f64, 0.0_f64);
        for particles in 1..=6 {
            let filling = 0.5 * f64::from(particles);
            let n = filling / lattice.volume();
            let wanted = match lattice.dimension {
                1 => (PI * n).powi(2),
                2 => 4.0 * PI * n,
                _ => (6.0 * PI * PI * n).powf(2.0 / 3.0),
            };
            let d = lattice.dimension as f64;
            let tolerance = [1e-4, 2e-5, 6e-5][lattice.dimension - 1] * unit;
            let found = waves.fermi(filling, tolerance, &endless()).unwrap();
            let energy = filling * wanted * d / (d + 2.0);
            let density = filling * 0.5 * d / wanted;
            let error = (found.level.value - wanted).abs();
            worst = (
                worst.0.max(error / unit),
                worst.1.max(found.level.error / unit),
            );
            assert!(
                error <= found.level.error,
                "{name} {filling}: {found:?} for {wanted}"
            );
            assert!(
                (found.energy.value - energy).abs() <= found.energy.error,
                "{name} {filling}: {found:?} for {energy}"
            );
            assert!(
                (found.density.value - density).abs() < 0.05 * density,
                "{name} {filling}: {found:?} for {density}"
            );
            assert!(found.settled && found.level.error <= tolerance);
        }
        println!(
            "{name}: off by at most {:.1e} |b|², {:.1e} stated",
            worst.0, worst.1
        );
    }
}

/// Squares and cubes of cosines, whose states are convolutions of a chain's, by `tests/reference/lattices_filling.py`.
#[test]
fn separable_cosines_fill_as_sums_of_chains() {
    let rows: Vec<[f64; 5]> =
        serde_json::from_str(include_str!("reference/lattices_filling.json")).unwrap();
    for [dimension, s, levels, wanted, open] in rows {
        let d = dimension as usize;
        let lattice = cubic(d, PI);
        let components = cosines(s, d);
        let waves = Waves::new(&lattice, finite(&components, 2.0)).unwrap();
        let unit = largest(&lattice);
        let tolerance = [1e-5, 5e-5][d - 2] * unit;
        let found = waves.fermi(levels, tolerance, &endless()).unwrap();
        let error = (found.level.value - wanted).abs();
        println!(
            "{d}D s = {s}, {levels} levels: off by {:.1e} |b|², {:.1e} stated",
            error / unit,
            found.level.error / unit
        );
        assert!(
            error <= found.level.error + open,
            "{d}D s = {s}, {levels} levels: {found:?} for {wanted}"
        );
        assert!(found.settled, "{found:?}");
    }
    // A whole band with a gap above: up to its top.
    let components = cosines(5.0, 2);
    let waves = Waves::new(&cubic(2, PI), finite(&components, 2.0)).unwrap();
    let zone = waves.zone(1, Accuracy::Settled(1e-9), &endless()).unwrap();
    let found = waves.fermi(1.0, 4e-5, &endless()).unwrap();
    let top = zone.bands[0].top.energy.value;
    assert!(
        (found.level.value - top).abs() <= found.level.error && found.settled,
        "{found:?} for {top}"
    );
}

/// Nearly-free aluminium by meshes of dense solves (`tests/reference/al_filling.py`), energies in (2π/a)².
#[test]
fn aluminium_fills_as_dense_meshes_do() {
    let row: Value = serde_json::from_str(include_str!("reference/al_filling.json")).unwrap();
    let (wanted, open) = (
        row["level"].as_f64().unwrap(),
        row["open"].as_f64().unwrap(),
    );
    let lattice = Lattice::new(&[[0.0, PI, PI], [PI, 0.0, PI], [PI, PI, 0.0]]).unwrap();
    let unit = (2.0 * PI / (4.05 / 0.529_177_210_544)).powi(2);
    let components = move |n: [i32; 3]| {
        let g = [-n[0] + n[1] + n[2], n[0] - n[1] + n[2], n[0] + n[1] - n[2]];
        let value = match g.iter().map(|x| x * x).sum::<i32>() {
            3 => 0.0179,
            4 => 0.0562,
            _ => 0.0,
        };
        Complex::new(value / unit, 0.0)
    };
    let waves = Waves::new(&lattice, finite(&components, 2.0)).unwrap();
    for tolerance in [1e-2, 1e-3, 4e-5] {
        let found = waves
            .fermi(1.5, tolerance * largest(&lattice), &endless())
            .unwrap();
        println!("{:?} for {wanted}", found.level);
        assert!(
            (found.level.value - wanted).abs() <= found.level.error + open,
            "{found:?} for {wanted}"
        );
        assert!(found.settled);
    }
}

/// Two kinds of atoms, so that matrices are complex: rough answers against better ones.
#[test]
fn levels_of_complex_matrices_agree_at_every_tolerance() {
    let lattice = Lattice::new(&[[0.0, PI, PI], [PI, 0.0, PI], [PI, PI, 0.0]]).unwrap();
    let components = |n: [i32; 3]| {
        let g = [-n[0] + n[1] + n[2], n[0] - n[1] + n[2], n[0] + n[1] - n[2]];
        let (even, odd) = match g.iter().map(|x| x * x).sum::<i32>() {
            3 => (-0.5, 0.15),
            4 => (0.0, 0.1),
            8 => (0.03, 0.0),
            11 => (0.13, 0.02),
            _ => (0.0, 0.0),
        };
        let turn = PI / 4.0 * f64::from(g.iter().sum::<i32>());
        Complex::new(even * turn.cos(), -odd * turn.sin())
    };
    let waves = Waves::new(&lattice, finite(&components, 3.3166247903554)).unwrap();
    assert!(!waves.is_real());
    for levels in [0.5, 4.0, 4.5] {
        let found = [3e-2, 3e-3, 3e-4].map(|tolerance| {
            waves
                .fermi(levels, tolerance * largest(&lattice), &endless())
                .unwrap()
                .level
        });
        for rough in &found[..2] {
            assert!(
                (rough.value - found[2].value).abs() <= rough.error + found[2].error,
                "{levels}: {found:?}"
            );
        }
    }
}

/// A chain half filled has its Fermi level at a quarter of the zone's width from the centre; whole fillings end at a top.
#[test]
fn chains_fill_from_the_centre() {
    let components = cosines(5.0, 1);
    let waves = Waves::new(&cubic(1, PI), finite(&components, 2.0)).unwrap();
    let wanted = waves
        .settled_at([0.25, 0.0, 0.0], 1, 1e-11, &endless())
        .unwrap()
        .energies[0]
        .value;
    let half = waves.fermi(0.5, 1e-6, &endless()).unwrap();
    assert!(
        (half.level.value - wanted).abs() <= half.level.error && half.settled,
        "{half:?} for {wanted}"
    );
    let whole = waves.fermi(1.0, 1e-6, &endless()).unwrap();
    let zone = waves.zone(1, Accuracy::Settled(1e-10), &endless()).unwrap();
    assert!(
        (whole.level.value - zone.bands[0].top.energy.value).abs() < 1e-8,
        "{whole:?}"
    );
    let states = waves.states(3, 96, 200.0, &endless()).unwrap();
    assert!((states.number(zone.bands[0].top.energy.value + 0.01) - 1.0).abs() < 1e-12);
    assert_eq!(states.density(zone.bands[0].top.energy.value + 0.01), 0.0);
}

/// Responses and strain against differences of levels on the same waves.
#[test]
fn responses_are_slopes() {
    let lattice = |stretch: f64, shear: f64| {
        Lattice::new(&[[1.0 + stretch, 0.0, 0.0], [0.3 + shear, 1.1, 0.0]]).unwrap()
    };
    let value = |n: [i32; 3], extra: f64, turn: f64| {
        let g = f64::from(n[0] * n[0] + n[1] * n[1]);
        // Two wells of different depth, so that no inversion makes the matrix real.
        let phase = 2.0 * PI * (0.21 * f64::from(n[0]) + 0.37 * f64::from(n[1]));
        let base = Complex::new(-6.0, 0.0) * (-0.4 * g).exp()
            + Complex::cis(-phase) * -4.0 * (-0.3 * g).exp();
        let sign = if n == [1, -1, 0] {
            1.0
        } else if n == [-1, 1, 0] {
            -1.0
        } else {
            0.0
        };
        base + Complex::new(extra * sign * sign, turn * sign)
    };
    let bound = |g: f64| (-0.3 * (g / 7.0).powi(2)).exp();
    let k = [0.13, 0.29, 0.0];
    let cut = 1500.0;
    let energy = |extra: f64, turn: f64, stretch: f64, shear: f64, level: usize| {
        let components = |n: [i32; 3]| value(n, extra, turn);
        let potential = Potential {
            components: &components,
            decay: Decay::Bounded(&bound),
        };
        let waves = Waves::new(&lattice(stretch, shear), potential).unwrap();
        waves.levels_at(k, 4, cut, &endless()).unwrap().energies[level]
    };
    let components = |n: [i32; 3]| value(n, 0.0, 0.0);
    let waves = Waves::new(
        &lattice(0.0, 0.0),
        Potential {
            components: &components,
            decay: Decay::Bounded(&bound),
        },
    )
    .unwrap();
    assert!(!waves.is_real());
    let levels = waves.levels_at(k, 4, cut, &endless()).unwrap();
    let h = 1e-4;
    for level in 0..4 {
        let response = levels.responses(level..level + 1, &[[1, -1, 0], [0, 0, 0], [-1, 1, 0]]);
        assert!(
            (response[1] - 1.0).norm() < 1e-12 && (response[0] - response[2].conj()).norm() < 1e-12
        );
        let real = (energy(h, 0.0, 0.0, 0.0, level) - energy(-h, 0.0, 0.0, 0.0, level)) / (2.0 * h);
        let turned =
            (energy(0.0, h, 0.0, 0.0, level) - energy(0.0, -h, 0.0, 0.0, level)) / (2.0 * h);
        assert!(
            (real - 2.0 * response[0].re).abs() < 1e-7,
            "{real} {response:?}"
        );
        assert!(
            (turned - (response[0] * Complex::i()).re * 2.0).abs() < 1e-7,
            "{turned} {response:?}"
        );
        // a₁ = (1+e, 0), a₂ = (0.3, 1.1): strain that takes the lattice there. The basis changes at the edge of the cut
        // only, by less than the tolerance.
        let strain = waves.strain(&levels, level..level + 1);
        let slope =
            (energy(0.0, 0.0, h, 0.0, level) - energy(0.0, 0.0, -h, 0.0, level)) / (2.0 * h);
        let (xx, xy) = (strain[0][0], strain[0][1]);
        // ε a₁ = (1, 0), ε a₂ = 0 per unit: ε_xx = 1, ε_xy = −0.3/1.1.
        assert!(
            (slope - (xx - 0.3 / 1.1 * xy)).abs() < 1e-4 * slope.abs().max(1.0),
            "{slope} {}",
            xx - 0.3 / 1.1 * xy
        );
        let slope =
            (energy(0.0, 0.0, 0.0, h, level) - energy(0.0, 0.0, 0.0, -h, level)) / (2.0 * h);
        assert!(
            (slope - xy / 1.1).abs() < 1e-4 * slope.abs().max(1.0),
            "{slope} {}",
            xy / 1.1
        );
    }
}

/// Disks on a square, whose components fall slowly: coarse and medium answers against the finest affordable one.
#[test]
fn slowly_falling_potentials_state_their_errors() {
    let lattice = cubic(2, 1.0);
    let components = |n: [i32; 3]| {
        let g = 2.0 * PI * f64::from(n[0] * n[0] + n[1] * n[1]).sqrt();
        Complex::new(-60.0 * shapes::disk(g, 0.3, 1.0), 0.0)
    };
    let bound = |g: f64| g.max(1.0).powf(-1.5);
    let waves = Waves::new(
        &lattice,
        Potential {
            components: &components,
            decay: Decay::Bounded(&bound),
        },
    )
    .unwrap();
    for k in [[0.0; 3], [0.5, 0.0, 0.0], [0.5, 0.5, 0.0], [0.2, 0.1, 0.0]] {
        let fine = waves.settled_at(k, 3, 1e-6, &endless()).unwrap();
        assert!(
            fine.energies.iter().all(|e| e.error < 2e-3),
            "{:?}",
            fine.energies
        );
        for tolerance in [10.0, 1.0, 0.1, 3e-2, 1e-2] {
            let rough = waves.settled_at(k, 3, tolerance, &endless()).unwrap();
            for (rough, fine) in rough.energies.iter().zip(&fine.energies) {
                assert!(
                    (rough.value - fine.value).abs() <= rough.error + fine.error,
                    "{k:?} {tolerance}: {rough:?} for {fine:?}"
                );
            }
        }
    }
}

#[test]
fn paths_join_their_points() {
    let components = cosines(4.0, 2);
    let lattice = cubic(2, PI);
    let corners = [[0.0; 3], [0.5, 0.0, 0.0], [0.5, 0.5, 0.0], [0.0; 3]];
    let waves = Waves::new(&lattice, finite(&components, 2.0)).unwrap();
    let found = waves.along(&corners, 20, 3, &endless()).unwrap();
    assert_eq!(found.len(), 61);
    assert!((found[60].distance - (2.0 + 2f64.sqrt())).abs() < 1e-12);
    for (one, other) in found[0].energies.iter().zip(&found[60].energies) {
        assert!((one - other).abs() < 1e-9);
    }
    let exact = waves
        .settled_at([0.5, 0.25, 0.0], 3, 1e-9, &endless())
        .unwrap();
    for (found, exact) in found[30].energies.iter().zip(&exact.energies) {
        assert!((found - exact.value).abs() < 4e-3, "{found} {exact:?}");
    }
    assert_eq!(
        waves.along(&corners, 0, 3, &endless()),
        Err(Error::NotFinite)
    );
}
