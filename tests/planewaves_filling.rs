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

/// Free particles: N = Ω k_F/π, Ω k_F²/4π, Ω k_F³/6π², and U = N·E_F·d/(d+2).
#[test]
fn free_particles_fill_their_sphere() {
    let h = 3f64.sqrt() / 2.0;
    let rows: [(Lattice, f64); 6] = [
        (cubic(1, 1.0), 0.7),
        (cubic(2, 1.0), 0.4),
        (cubic(2, 1.0), 1.3),
        (
            Lattice::new(&[[1.0, 0.0, 0.0], [-0.5, h, 0.0]]).unwrap(),
            1.0,
        ),
        (cubic(3, 1.0), 0.5),
        (
            Lattice::new(&[[0.0, 0.5, 0.5], [0.5, 0.0, 0.5], [0.5, 0.5, 0.0]]).unwrap(),
            1.5,
        ),
    ];
    for (lattice, filling) in rows {
        let waves = Waves::new(&lattice, finite(&empty, 0.0)).unwrap();
        let n = filling / lattice.volume();
        let wanted = match lattice.dimension {
            1 => (PI * n).powi(2),
            2 => 4.0 * PI * n,
            _ => (6.0 * PI * PI * n).powf(2.0 / 3.0),
        };
        let d = lattice.dimension as f64;
        let found = waves.fermi(filling, 2e-3 * wanted, &endless()).unwrap();
        let energy = filling * wanted * d / (d + 2.0);
        let density = filling * 0.5 * d / wanted;
        println!(
            "{d}D {filling}: {:?} for {wanted}, {:?} for {energy}, D {:?} for {density}",
            found.level, found.energy, found.density
        );
        assert!(
            (found.level.value - wanted).abs() <= found.level.error,
            "{d}D {filling}: {found:?} for {wanted}"
        );
        assert!(
            (found.energy.value - energy).abs() <= found.energy.error,
            "{d}D {filling}: {found:?} for {energy}"
        );
        assert!(
            (found.density.value - density).abs() < 0.1 * density,
            "{d}D {filling}: {found:?} for {density}"
        );
        assert!(found.level.error < 0.02 * wanted);
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
