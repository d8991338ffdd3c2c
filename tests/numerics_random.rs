//! Random cells, seeded: layered ones against rows at 50 digits, smooth ones against plane waves, and all sensitivities
//! against the rows and against differences of the solver itself.
#![allow(
    clippy::indexing_slicing,
    clippy::print_stdout,
    clippy::unwrap_used,
    missing_docs
)]

#[path = "reference/mod.rs"]
mod reference;

use crenate::numerics::{
    Budget, Cell, Mass, Piece, PieceSensitivity, Quantity, level, sensitivities, solve,
};
use nalgebra::{DMatrix, SymmetricEigen};
use reference::mixtures::{Random, mirrored, mixture, trials};
use reference::{flat, number, random_cells, rows, smooth_cell};
use std::f64::consts::PI;

const ROWS: &str = include_str!("reference/random_layers.csv");

/// All derivatives in the order of the rows.
fn flattened(cell: &Cell, slopes: &[PieceSensitivity]) -> Vec<f64> {
    let numbers = |(piece, slope): (&Piece, &PieceSensitivity)| match piece {
        Piece::Delta { .. } => vec![slope.strength],
        _ => vec![
            slope.length,
            slope.potential[0],
            slope.mass[0].value,
            slope.mass[0].slope,
        ],
    };
    cell.pieces.iter().zip(slopes).flat_map(numbers).collect()
}

#[test]
fn sensitivities_meet_their_rows() {
    let all = rows(ROWS);
    let mut worst = 0.0f64;
    let mut checked = 0;
    for (label, cell) in random_cells(ROWS) {
        for row in all.iter().filter(|r| r[0] == "slope" && r[1] == label) {
            let states = number(row[2]) as usize;
            let quantity = if row[3] == "1" {
                Quantity::Bottom(states)
            } else {
                Quantity::Top(states - 1)
            };
            let found = sensitivities(&cell, &[quantity], &Budget::default()).unwrap();
            let found = flattened(&cell, &found[0]);
            let truth: Vec<f64> = row[4..].iter().map(|f| number(f)).collect();
            assert_eq!(found.len(), truth.len());
            let size = truth.iter().fold(1.0f64, |m, t| m.max(t.abs()));
            for (x, t) in found.iter().zip(&truth) {
                worst = worst.max((x - t).abs() / size);
                checked += 1;
            }
        }
    }
    println!("sensitivities: {checked} rows, worst {worst:e} of the largest");
    assert!(checked > 500 && worst < 1e-11, "{worst:e}");
}

/// Every number of every piece, to be changed.
fn numbers(cell: &mut Cell) -> Vec<&mut f64> {
    let mut list: Vec<&mut f64> = Vec::new();
    for piece in &mut cell.pieces {
        match piece {
            Piece::Flat {
                length,
                potential,
                mass,
            } => list.extend([length, potential, &mut mass.value, &mut mass.slope]),
            Piece::Ramp {
                length,
                potential: [v, w],
                mass: [m, n],
            } => {
                list.extend([
                    length,
                    v,
                    w,
                    &mut m.value,
                    &mut m.slope,
                    &mut n.value,
                    &mut n.slope,
                ]);
            }
            Piece::Smooth {
                length,
                samples,
                mass: [m, n],
            } => {
                list.push(length);
                list.extend(samples.iter_mut());
                list.extend([&mut m.value, &mut m.slope, &mut n.value, &mut n.slope]);
            }
            Piece::Delta { strength } => list.push(strength),
        }
    }
    list
}

/// The sensitivities in the order of [`numbers`].
fn in_order(cell: &Cell, slopes: &[PieceSensitivity]) -> Vec<f64> {
    let mut list = Vec::new();
    for (piece, s) in cell.pieces.iter().zip(slopes) {
        let [m, n] = s.mass;
        match piece {
            Piece::Flat { .. } => list.extend([s.length, s.potential[0], m.value, m.slope]),
            Piece::Ramp { .. } => list.extend([
                s.length,
                s.potential[0],
                s.potential[1],
                m.value,
                m.slope,
                n.value,
                n.slope,
            ]),
            Piece::Smooth { .. } => {
                list.push(s.length);
                list.extend(&s.samples);
                list.extend([m.value, m.slope, n.value, n.slope]);
            }
            Piece::Delta { .. } => list.push(s.strength),
        }
    }
    list
}

fn value(cell: &Cell, quantity: Quantity) -> f64 {
    let bands = |n: usize| solve(cell, n + 1, &Budget::default()).unwrap();
    match quantity {
        Quantity::Bottom(n) => bands(n).bands[n].bottom.energy.value,
        Quantity::Top(n) => bands(n).bands[n].top.energy.value,
        Quantity::Gap(n) => bands(n).gaps[n].size.value,
        Quantity::Width(n) => bands(n).bands[n].width.value,
        Quantity::Level(n, ka) => level(cell, n, ka, &Budget::default()).unwrap().value,
    }
}

/// Checks against central differences with Richardson's extrapolation.
fn check_differences(name: &str, cell: &Cell, quantities: &[Quantity], tolerance: f64) {
    let found = sensitivities(cell, quantities, &Budget::default()).unwrap();
    for (quantity, slopes) in quantities.iter().zip(&found) {
        let exact = in_order(cell, slopes);
        let size = exact.iter().fold(0.0f64, |m, x| m.max(x.abs()));
        for (i, expected) in exact.iter().enumerate() {
            let base = *numbers(&mut cell.clone())[i];
            let central = |h: f64| {
                let at = |x: f64| {
                    let mut changed = cell.clone();
                    *numbers(&mut changed)[i] = x;
                    value(&changed, *quantity)
                };
                // a mass's slope must not fall below zero
                if base == 0.0 {
                    (4.0 * at(h) - at(2.0 * h) - 3.0 * at(0.0)) / (2.0 * h)
                } else {
                    (at(base + h) - at(base - h)) / (2.0 * h)
                }
            };
            let h = 1e-3 * base.abs().clamp(0.03, 1.0);
            let (coarse, fine) = (central(h), central(0.5 * h));
            let extrapolated = fine + (fine - coarse) / 3.0;
            let slack = if base == 0.0 { 30.0 } else { 1.0 };
            assert!(
                (extrapolated - expected).abs() <= slack * tolerance * size,
                "{name} {quantity:?} number {i} at {base}: {expected} against {extrapolated}"
            );
        }
    }
}

const ALL: [Quantity; 8] = [
    Quantity::Bottom(0),
    Quantity::Top(0),
    Quantity::Bottom(1),
    Quantity::Gap(0),
    Quantity::Gap(1),
    Quantity::Width(0),
    Quantity::Width(1),
    Quantity::Level(1, 1.1),
];

#[test]
fn sensitivities_of_every_kind_of_piece_meet_differences() {
    let bent = |value: f64, slope: f64| Mass { value, slope };
    let mixed = Cell {
        pieces: vec![
            Piece::Flat {
                length: 0.8,
                potential: 1.0,
                mass: bent(0.7, 0.01),
            },
            Piece::Delta { strength: 2.0 },
            Piece::Ramp {
                length: 0.9,
                potential: [6.0, -2.0],
                mass: [bent(0.5, 0.0), bent(1.1, 0.02)],
            },
            flat(0.5, 9.0, 1.3),
        ],
    };
    check_differences("mixed", &mixed, &ALL, 2e-8);
    let smooth = smooth_cell(
        2.0,
        &|x| 6.0 * (PI * x).cos() + 2.0 * (2.0 * PI * x).sin(),
        6.0,
    );
    check_differences(
        "smooth",
        &smooth,
        &[Quantity::Top(0), Quantity::Gap(0), Quantity::Width(1)],
        2e-8,
    );
}

#[test]
fn sensitivities_of_narrow_bands_and_gaps_keep_their_digits() {
    // width 3e-5 of the spacing and less: relative differences
    for b in [2.0, 3.0, 5.0] {
        let cell = Cell {
            pieces: vec![flat(1.0, 0.5, 1.0), flat(b, 60.0, 0.8)],
        };
        check_differences("narrow band", &cell, &[Quantity::Width(0)], 1e-6);
    }
    let cell = Cell {
        pieces: vec![flat(0.7, 0.5, 1.0), flat(0.3, 0.5001, 1.0)],
    };
    let found = sensitivities(&cell, &[Quantity::Gap(0)], &Budget::default()).unwrap();
    // first-order perturbation: gap = 2 |ΔV| sin(0.3 π)/π
    let expected = 2.0 * (0.3 * PI).sin() / PI;
    assert!(
        (found[0][1].potential[0] - expected).abs() < 1e-3
            && (found[0][0].potential[0] + expected).abs() < 1e-3
    );
}

#[test]
fn a_closed_gap_opens_at_the_reported_rate() {
    let cell = Cell {
        pieces: vec![flat(0.7, 0.5, 1.0), flat(0.3, 0.5, 1.0)],
    };
    let found = sensitivities(
        &cell,
        &[Quantity::Gap(0), Quantity::Top(0), Quantity::Bottom(1)],
        &Budget::default(),
    )
    .unwrap();
    let expected = 2.0 * (0.3 * PI).sin() / PI;
    for piece in &found[0] {
        assert!((piece.potential[0] - expected).abs() < 1e-9, "{piece:?}");
    }
    // the doublet's mean moves by the share of the cell
    assert!(
        (found[1][0].potential[0] - 0.7).abs() < 1e-9
            && (found[2][1].potential[0] - 0.3).abs() < 1e-9
    );
}

/// Levels of V = Σ c_j cos 2jx at k = 0 or the zone's edge in plane waves.
fn plane_waves(coefficients: &[f64], edge: bool) -> Vec<f64> {
    let size = 24i32;
    let n = (2 * size + 1) as usize;
    let shift = if edge { 1.0 } else { 0.0 };
    let matrix = DMatrix::from_fn(n, n, |i, j| {
        let distance = i.abs_diff(j);
        if distance == 0 {
            return (2.0 * f64::from(i as i32 - size) + shift).powi(2) + coefficients[0];
        }
        coefficients.get(distance).map_or(0.0, |c| c / 2.0)
    });
    let mut values: Vec<f64> = SymmetricEigen::new(matrix)
        .eigenvalues
        .iter()
        .copied()
        .collect();
    values.sort_by(f64::total_cmp);
    values
}

#[test]
fn random_smooth_cells_meet_plane_waves() {
    let mut random = Random(0x9e37_79b9_7f4a_7c15);
    let mut worst = 0.0f64;
    for trial in 0..trials(1000) {
        let size = 10f64.powf(2.5 * random.next() - 1.0);
        let coefficients: Vec<f64> = (0..4).map(|_| size * (random.next() - 0.5)).collect();
        // the origin anywhere
        let origin = PI * random.next();
        let potential = |x: f64| {
            coefficients
                .iter()
                .enumerate()
                .map(|(j, c)| c * (2.0 * j as f64 * (x - origin)).cos())
                .sum::<f64>()
        };
        let found = solve(&smooth_cell(PI, &potential, size), 4, &Budget::default()).unwrap();
        let (centre, edge) = (
            plane_waves(&coefficients, false),
            plane_waves(&coefficients, true),
        );
        for (n, band) in found.bands.iter().enumerate() {
            // k = 0 levels 0 | 1 2 | 3 4 and zone edge levels 0 1 | 2 3: band n takes the n-th of each
            let mut pair = [centre[n], edge[n]];
            pair.sort_by(f64::total_cmp);
            let scale = size.max(16.0);
            for (value, exact) in [(band.bottom.energy, pair[0]), (band.top.energy, pair[1])] {
                worst = worst.max((value.value - exact).abs() / scale);
                // the dense solve is good to some 1e-13 of its largest entry, 48²
                assert!(
                    (value.value - exact).abs() < value.error + 2e-12 * scale.max(100.0),
                    "{trial} {n}: {value:?} {exact}"
                );
            }
        }
    }
    println!("1000 random smooth cells: worst {worst:e} of the scale");
}

/// What Hill's equation demands of D, on points that the search never used: D falls (or rises) all through a band,
/// stays beyond ±2 all through an open gap, and is above 2 below the first band. A band missed or counted twice breaks
/// the alternation of signs. (D itself is held by the Hill, ramp and random rows.)
#[test]
fn random_layers_have_no_band_missed() {
    let mut random = Random(0x1234_5678_9abc_def1);
    for trial in 0..trials(1500) {
        let count = 2 + (random.next() * 5.0) as usize;
        let mut pieces = Vec::new();
        for _ in 0..count {
            pieces.push(flat(
                0.1 + random.next(),
                20.0 * random.next() - 5.0,
                0.3 + random.next(),
            ));
            if random.next() < 0.3 {
                pieces.push(Piece::Delta {
                    strength: 8.0 * random.next() - 3.0,
                });
            }
        }
        let cell = Cell { pieces };
        let found = solve(&cell, 6, &Budget::default()).unwrap();
        let d = |e: f64| {
            crenate::numerics::discriminant(&cell, e, &Budget::default())
                .unwrap()
                .value
        };
        let mut last = f64::NEG_INFINITY;
        for (n, band) in found.bands.iter().enumerate() {
            let (low, high) = (band.bottom.energy, band.top.energy);
            assert!(
                low.value >= last - low.error && high.value > low.value,
                "{trial} {n}"
            );
            last = high.value;
            // D runs from 2(−1)ⁿ to −2(−1)ⁿ inside the band and turns nowhere
            let sign = if n % 2 == 0 { 1.0 } else { -1.0 };
            let inner: Vec<f64> = (1..8)
                .map(|i| sign * d(low.value + (high.value - low.value) * f64::from(i) / 8.0))
                .collect();
            assert!(
                inner.iter().all(|x| x.abs() < 2.0) && inner.windows(2).all(|w| w[1] < w[0]),
                "{trial} {n} {inner:?}"
            );
            // and does not come back within the gap above
            if let Some(next) = found.bands.get(n + 1)
                && !found.gaps[n].closed
            {
                let gap = next.bottom.energy.value - high.value;
                for i in 1..8 {
                    assert!(
                        -sign * d(high.value + gap * f64::from(i) / 8.0) > 2.0,
                        "{trial} gap {n}"
                    );
                }
            }
        }
        // nothing below the first band
        let floor = found.bands[0].bottom.energy.value;
        assert!(
            (1..20).all(|i| d(floor - 0.05 * f64::from(i * i)) > 2.0),
            "{trial}"
        );
    }
}

/// A spectrum does not depend on where its cell begins, nor on the direction: found so within the bounds, in a bounded
/// number of sweeps, for every kind of piece, all above or all below zero.
#[test]
fn random_mixtures_do_not_depend_on_origin_or_direction() {
    let mut random = Random(0x7f4a_7c15_9e37_79b9);
    let mut sweeps = 0.0f64;
    for trial in 0..trials(300) {
        let pieces = mixture(&mut random);
        let cell = Cell { pieces };
        let mut turned = cell.clone();
        turned
            .pieces
            .rotate_left(1 + (random.next() * 2.0) as usize);
        let solved = |cell: &Cell| {
            solve(cell, 5, &Budget::default())
                .unwrap_or_else(|error| panic!("{trial}: {error:?} of {cell:?}"))
        };
        let found = solved(&cell);
        sweeps = sweeps.max(found.sweeps as f64 / 5.0);
        for (name, other) in [
            ("turned", solved(&turned)),
            (
                "mirrored",
                solved(&Cell {
                    pieces: mirrored(&cell.pieces),
                }),
            ),
        ] {
            for (n, (a, b)) in found.bands.iter().zip(&other.bands).enumerate() {
                let pairs = [
                    (a.bottom.energy, b.bottom.energy),
                    (a.top.energy, b.top.energy),
                    (a.width, b.width),
                    (found.gaps[n].size, other.gaps[n].size),
                ];
                for (what, (x, y)) in ["bottom", "top", "width", "gap"].iter().zip(pairs) {
                    assert!(
                        (x.value - y.value).abs() <= x.error + y.error,
                        "{trial} {name}: {what} {n}: {x:?} and {y:?} of {cell:?}"
                    );
                }
                for (x, y) in [(a.bottom.mass, b.bottom.mass), (a.top.mass, b.top.mass)] {
                    if let (Some(x), Some(y)) = (x, y) {
                        assert!(
                            (x.value - y.value).abs() <= x.error + y.error,
                            "{trial} {name}: mass {n}: {x:?} and {y:?} of {cell:?}"
                        );
                    }
                }
            }
        }
    }
    println!("sweeps a band: worst {sweeps}");
    assert!(sweeps < 120.0, "{sweeps}");
}
