//! Levels, hopping amplitudes and densities against closed forms, and the published
//! hopping of the optical lattice (Bloch, Dalibard & Zwerger, Rev. Mod. Phys. 80, 885 (2008), Table I; from memory,
//! reproduced by the computed rows).
#![allow(
    clippy::indexing_slicing,
    clippy::print_stdout,
    clippy::unwrap_used,
    missing_docs
)]

#[path = "reference/mod.rs"]
mod reference;

use crenate::numerics::{Budget, Cell, Piece, dispersion, hopping, level, solve, wave_function};
use reference::{flat, layered_cell, number, rows, smooth_cell};
use std::f64::consts::PI;

/// The cell of a name in one of the layered files.
fn named(name: &str) -> Cell {
    let files = [
        include_str!("reference/kronig_penney.csv"),
        include_str!("reference/delta_combs.csv"),
    ];
    let all = files.iter().flat_map(|text| rows(text));
    let row = all
        .into_iter()
        .find(|r| r[0] == "cell" && r[1] == name)
        .unwrap();
    layered_cell(&row[2..].iter().map(|f| number(f)).collect::<Vec<f64>>())
}

#[test]
fn published_hoppings_of_the_optical_lattice_are_met() {
    let table = [
        (3.0, 0.444109, 0.451894),
        (5.0, 0.263069, 0.264211),
        (10.0, 0.076730, 0.076747),
        (15.0, 0.026075, 0.026076),
        (20.0, 0.009965, 0.009965),
    ];
    for (s, four_j, width) in table {
        let cell = smooth_cell(PI, &|x| s * x.cos().powi(2), s);
        let j = hopping(&cell, 0, 1, &Budget::default()).unwrap();
        let w = solve(&cell, 1, &Budget::default()).unwrap().bands[0].width;
        assert!((4.0 * j.value - four_j).abs() < 6e-7, "s {s}: {j:?}");
        assert!((w.value - width).abs() < 6e-7, "s {s}: {w:?}");
    }
}

#[test]
fn hoppings_of_an_exponentially_narrow_band_keep_their_digits() {
    // 6e-25 wide (KP11): D is linear over the band, so J1 is a quarter of the width and J2 far below it
    let cell = named("KP11");
    let width = solve(&cell, 1, &Budget::default()).unwrap().bands[0].width;
    let j = hopping(&cell, 0, 1, &Budget::default()).unwrap();
    assert!(
        (4.0 * j.value / width.value - 1.0).abs() < 1e-12,
        "{j:?} {width:?}"
    );
    assert!(j.error < 1e-11 * j.value);
    // the free particle, whose gaps are closed: E = (ka)^2, J_r = -2 (-1)^r / r^2 by Fourier's series
    let free = Cell {
        pieces: vec![flat(1.0, 0.0, 1.0)],
    };
    for r in 1..4 {
        let j = hopping(&free, 0, r, &Budget::default()).unwrap();
        let truth = -2.0 * if r % 2 == 0 { 1.0 } else { -1.0 } / (r * r) as f64;
        assert!((j.value - truth).abs() <= j.error, "{j:?} {truth}");
        assert!(j.error < 1e-9, "{j:?}");
    }
}

#[test]
fn densities_are_normalised_and_follow_the_closed_form() {
    // a free particle has a flat density, at a touching too
    let free = Cell {
        pieces: vec![flat(0.4, 0.0, 1.0), flat(0.6, 0.0, 1.0)],
    };
    for (band, ka) in [(0, 0.3), (1, 1.0), (1, PI), (2, 0.0)] {
        for [_, density] in wave_function(&free, band, ka, 41, &Budget::default()).unwrap() {
            assert!(
                (density - 1.0).abs() < 1e-9,
                "band {band} ka {ka}: {density}"
            );
        }
    }
    // top of the first band of a comb: sin² with its nodes at the deltas
    let comb = Cell {
        pieces: vec![flat(1.0, 0.0, 1.0), Piece::Delta { strength: 5.0 }],
    };
    for [x, density] in wave_function(&comb, 0, PI, 201, &Budget::default()).unwrap() {
        assert!(
            (density - 2.0 * (PI * x).sin().powi(2)).abs() < 1e-9,
            "{x}: {density}"
        );
    }
}

#[test]
fn dispersions_rise_from_edge_to_edge() {
    let cell = named("KP01");
    let bands = solve(&cell, 3, &Budget::default()).unwrap();
    for (band, found) in bands.bands.iter().enumerate() {
        let curve = dispersion(&cell, band, 21, &Budget::default()).unwrap();
        let (mut first, mut last) = (curve[0][1], curve[20][1]);
        if band % 2 == 1 {
            std::mem::swap(&mut first, &mut last);
        }
        assert_eq!(
            (first, last),
            (found.bottom.energy.value, found.top.energy.value)
        );
        let sign = if band % 2 == 0 { 1.0 } else { -1.0 };
        assert!(curve.windows(2).all(|w| sign * (w[1][1] - w[0][1]) > 0.0));
        for [ka, energy] in &curve[1..20] {
            let there = level(&cell, band, *ka, &Budget::default()).unwrap();
            assert!(
                (there.value - energy).abs() < 1e-12 * energy.abs(),
                "{ka}: {energy} against {there:?}"
            );
        }
    }
}
