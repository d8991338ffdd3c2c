//! Hard cases by name, invariants, budgets, refusals; each against a closed form, a symmetry or a count.
#![allow(
    clippy::indexing_slicing,
    clippy::print_stdout,
    clippy::unwrap_used,
    missing_docs
)]

#[path = "reference/mod.rs"]
mod reference;

use crenate::numerics::{Bands, Budget, Cell, Mass, Mesh, Piece, SolveError, fermi, level, solve};
use reference::mixtures::{Random, mirrored, mixture, trials};
use reference::{flat, smooth_cell};
use std::f64::consts::PI;
use std::sync::atomic::{AtomicUsize, Ordering};

fn bands(cell: &Cell, count: usize) -> Bands {
    solve(cell, count, &Budget::default()).unwrap()
}

/// Energies of all edges with their bounds.
fn edges(found: &Bands) -> Vec<(f64, f64)> {
    let both = found
        .bands
        .iter()
        .flat_map(|b| [b.bottom.energy, b.top.energy]);
    both.map(|e| (e.value, e.error)).collect()
}

/// Two solutions of what ought to be the same spectrum, within their bounds.
fn assert_same(name: &str, a: &Bands, b: &Bands, shift: f64) {
    for ((x, dx), (y, dy)) in edges(a).into_iter().zip(edges(b)) {
        assert!(
            (x - y - shift).abs() <= dx + dy,
            "{name}: {x} ± {dx} and {y} ± {dy}"
        );
    }
    for (x, y) in a.gaps.iter().zip(&b.gaps) {
        assert!(
            (x.size.value - y.size.value).abs() <= x.size.error + y.size.error,
            "{name}: {x:?} {y:?}"
        );
    }
}

fn lopsided() -> Vec<Piece> {
    vec![
        flat(0.7, 0.0, 1.0),
        flat(0.4, 8.0, 0.5),
        Piece::Delta { strength: 1.5 },
        flat(0.9, 2.0, 1.7),
        Piece::Ramp {
            length: 0.6,
            potential: [9.0, -3.0],
            mass: [Mass::constant(0.5), Mass::constant(1.2)],
        },
    ]
}

#[test]
fn spectrum_does_not_depend_on_the_origin_or_the_direction() {
    let cell = Cell { pieces: lopsided() };
    let reference = bands(&cell, 6);
    for turn in 1..5 {
        let mut pieces = lopsided();
        pieces.rotate_left(turn);
        assert_same("turned", &reference, &bands(&Cell { pieces }, 6), 0.0);
    }
    let pieces = mirrored(&lopsided());
    assert_same("mirrored", &reference, &bands(&Cell { pieces }, 6), 0.0);
    // a layer cut in two, nothing inserted
    let mut pieces = lopsided();
    pieces[0] = flat(0.3, 0.0, 1.0);
    pieces.insert(0, flat(0.4, 0.0, 1.0));
    pieces.insert(1, Piece::Delta { strength: 0.0 });
    pieces.insert(1, flat(0.0, 77.0, 1.0));
    assert_same("cut", &reference, &bands(&Cell { pieces }, 6), 0.0);
}

#[test]
fn potentials_all_above_or_all_below_zero_shift_the_spectrum() {
    let at = |v: f64| Cell {
        pieces: vec![flat(1.0, v, 1.0), flat(0.8, v + 12.0, 0.4)],
    };
    let reference = bands(&at(0.0), 5);
    for v in [300.0, -300.0] {
        assert_same("shifted", &bands(&at(v), 5), &reference, v);
    }
}

#[test]
fn units_do_not_matter() {
    // lengths by s, energies by 1/s²; and far from order one
    for s in [1e-9, 1e-3, 1e6] {
        let cell = Cell {
            pieces: vec![flat(s, 0.0, 1.0), flat(0.8 * s, 12.0 / (s * s), 0.4)],
        };
        let found = bands(&cell, 4);
        let plain = bands(
            &Cell {
                pieces: vec![flat(1.0, 0.0, 1.0), flat(0.8, 12.0, 0.4)],
            },
            4,
        );
        for ((x, dx), (y, dy)) in edges(&found).into_iter().zip(edges(&plain)) {
            assert!(
                (x * s * s - y).abs() <= dx * s * s + dy + 4.0 * f64::EPSILON * y.abs(),
                "{s}: {x} {y}"
            );
        }
    }
}

#[test]
fn a_doubled_cell_closes_every_other_gap() {
    let single = lopsided();
    let double = Cell {
        pieces: single.iter().chain(&single).cloned().collect(),
    };
    let found = bands(&double, 8);
    let plain = bands(&Cell { pieces: single }, 4);
    for n in 0..8 {
        assert_eq!(
            found.gaps[n].closed,
            n % 2 == 0,
            "gap {n}: {:?}",
            found.gaps[n]
        );
    }
    for (n, band) in plain.bands.iter().enumerate() {
        let (low, high) = (&found.bands[2 * n], &found.bands[2 * n + 1]);
        assert!(
            (low.bottom.energy.value - band.bottom.energy.value).abs()
                <= low.bottom.energy.error + band.bottom.energy.error
        );
        assert!(
            (high.top.energy.value - band.top.energy.value).abs()
                <= high.top.energy.error + band.top.energy.error
        );
        // the fold lies at ka = π/2 of the single cell
        let fold = level(
            &Cell { pieces: lopsided() },
            n,
            PI / 2.0,
            &Budget::default(),
        )
        .unwrap();
        assert!(
            (low.top.energy.value - fold.value).abs() <= low.top.energy.error + fold.error,
            "{n}"
        );
        assert!(low.top.mass.is_none() && high.bottom.mass.is_none());
    }
}

#[test]
fn doubled_cells_of_narrow_bands_are_honest() {
    // band 0 of KP11 is 6e-25 wide; of the doubled cell two bands share that width and touch
    let pieces = vec![flat(1.0, 0.0, 1.0), flat(6.0, 100.0, 1.0)];
    let double = Cell {
        pieces: pieces.iter().chain(&pieces).cloned().collect(),
    };
    let found = bands(&double, 2);
    let plain = bands(&Cell { pieces }, 1);
    assert!(found.gaps[0].closed, "{:?}", found.gaps[0]);
    // beyond what 106 bits separate behind two such walls, the bounds say so
    for band in &found.bands[..2] {
        assert!(
            (band.width.value - plain.bands[0].width.value / 2.0).abs() <= band.width.error,
            "{band:?}"
        );
        assert!(
            (band.bottom.energy.value - plain.bands[0].bottom.energy.value).abs()
                <= band.bottom.energy.error
        );
        assert!(
            band.bottom.energy.error < 1e-9 && band.width.error < 1e-9,
            "{band:?}"
        );
    }
    // 2e-11 wide: the halves are resolved
    let pieces = vec![flat(1.0, 0.0, 1.0), flat(3.0, 100.0, 1.0)];
    let found = bands(
        &Cell {
            pieces: pieces.iter().chain(&pieces).cloned().collect(),
        },
        2,
    );
    let whole = bands(&Cell { pieces }, 1).bands[0].width.value;
    assert!(found.gaps[0].closed, "{:?}", found.gaps[0]);
    let sum = found.bands[0].width.value + found.bands[1].width.value;
    assert!((sum / whole - 1.0).abs() < 1e-6, "{sum} {whole}");
}

/// The rounding of the way through two thick walls stays in D though its matrix is small in a band: in `f64` the halves of a
/// doubled cell's band came out a hundred times too wide, with a gap between them.
#[test]
fn the_rounding_of_the_way_through_two_walls_is_seen() {
    for b in [1.2, 1.6, 2.0, 2.4] {
        let pieces = vec![flat(1.0, 0.0, 1.0), flat(b, 100.0, 1.0)];
        let doubled = Cell {
            pieces: pieces.iter().chain(&pieces).cloned().collect(),
        };
        let found = bands(&doubled, 2);
        let plain = bands(&Cell { pieces }, 1).bands[0];
        assert!(found.gaps[0].closed, "{b}: {:?}", found.gaps[0]);
        let sum = found.bands[0].width.value + found.bands[1].width.value;
        assert!(
            (sum / plain.width.value - 1.0).abs() < 1e-6,
            "{b}: {sum:e} for {:?}",
            plain.width
        );
        assert!(found.bands[0].width.error < 1e-6, "{b}: {found:?}");
    }
}

#[test]
fn walls_of_hundreds_of_decay_lengths_do_not_overflow() {
    // one well, ψ decaying over 1/√V: the bound level in closed form, k tan(k a/2) = κ
    let (v, a) = (100.0, 1.0);
    for b in [40.0, 100.0, 400.0] {
        let found = bands(
            &Cell {
                pieces: vec![flat(a, 0.0, 1.0), flat(b, v, 1.0)],
            },
            2,
        );
        let e = found.bands[0].bottom.energy.value;
        let k = e.sqrt();
        assert!(
            (k * (k * a / 2.0).tan() - (v - e).sqrt()).abs() < 1e-12,
            "{b}: {e}"
        );
        let width = found.bands[0].width;
        assert!(
            width.value >= 0.0 && width.value < 1e-150 && width.error < 1e-28,
            "{b}: {width:?}"
        );
        assert!(!found.gaps[0].closed && found.gaps[0].size.value > 20.0);
    }
}

#[test]
fn widths_of_isolated_bands_fall_like_the_decay() {
    // w ∝ exp(−κ b): the ratio of two widths at large b is exp(−κ Δb)
    let width = |b: f64| {
        let found = bands(
            &Cell {
                pieces: vec![flat(1.0, 0.0, 1.0), flat(b, 100.0, 1.0)],
            },
            1,
        );
        (found.bands[0].width, found.bands[0].bottom.energy.value)
    };
    let (mut last, energy) = width(5.0);
    let kappa = (100.0 - energy).sqrt();
    for step in 1..60 {
        let (next, _) = width(5.0 + 0.5 * step as f64);
        let ratio = next.value / last.value / (-0.5 * kappa).exp();
        assert!((ratio - 1.0).abs() < 1e-9, "step {step}: {next:?}");
        assert!(next.error < 1e-9 * next.value, "step {step}: {next:?}");
        last = next;
    }
}

#[test]
fn attractive_deltas_bind_below_every_potential() {
    // far apart, −S δ binds at −S²/4
    for s in [3.0, 10.0, 40.0] {
        let cell = Cell {
            pieces: vec![flat(8.0, 5.0, 1.0), Piece::Delta { strength: -s }],
        };
        let found = bands(&cell, 2);
        let exact = 5.0 - s * s / 4.0;
        let band = &found.bands[0];
        assert!(
            band.bottom.energy.value <= exact
                && exact <= band.top.energy.value + band.top.energy.error
        );
        assert!(found.bands[1].bottom.energy.value > 4.9);
    }
    // two of them in a cell, many bound bands
    let cell = Cell {
        pieces: vec![
            flat(3.0, 0.0, 1.0),
            Piece::Delta { strength: -20.0 },
            flat(3.0, 0.0, 1.0),
            Piece::Delta {
                strength: -20.000001,
            },
        ],
    };
    let found = bands(&cell, 3);
    assert!(found.bands[1].top.energy.value < -99.0 && found.bands[2].bottom.energy.value > -1.0);
}

#[test]
fn narrow_gaps_are_resolved_not_called_closed() {
    // first-order perturbation: a layer of height v and share f opens gap n by 2 |V_n|
    for v in [1e-3, 1e-6, 1e-9, 1e-11] {
        let cell = Cell {
            pieces: vec![flat(0.7, 0.0, 1.0), flat(0.3, v, 1.0)],
        };
        let found = bands(&cell, 2);
        for n in 1..=2 {
            let first_order = 2.0 * v * (PI * n as f64 * 0.3).sin().abs() / (PI * n as f64);
            let gap = found.gaps[n - 1];
            assert!(!gap.closed, "v {v}: {gap:?}");
            assert!(
                (gap.size.value / first_order - 1.0).abs() < v + 1e-11,
                "v {v} gap {n}: {gap:?} {first_order}"
            );
        }
    }
}

#[test]
fn gaps_below_the_rounding_of_inputs_are_closed() {
    for v in [0.0, 1e-17, 1e-20] {
        let cell = Cell {
            pieces: vec![flat(0.7, 3.0, 1.0), flat(0.3, 3.0 + v, 1.0)],
        };
        for gap in bands(&cell, 6).gaps {
            assert!(
                gap.closed && gap.size.value == 0.0 && gap.size.error < 1e-12,
                "{gap:?}"
            );
        }
    }
}

#[test]
fn a_thousand_layers_are_solved() {
    let pieces: Vec<Piece> = (0..1000)
        .map(|i| {
            flat(
                0.01 + 0.005 * f64::from(i * 37 % 11),
                f64::from(i * 61 % 17),
                0.5 + 0.05 * f64::from(i * 13 % 7),
            )
        })
        .collect();
    let mut turned = pieces.clone();
    turned.rotate_left(333);
    let found = bands(&Cell { pieces }, 6);
    assert_same("turned", &found, &bands(&Cell { pieces: turned }, 6), 0.0);
    assert!(found.sweeps < 6 * 45, "{}", found.sweeps);
}

#[test]
fn mass_contrast_of_a_thousand_is_no_trouble() {
    for ratio in [1e-3, 1e3] {
        let found = bands(
            &Cell {
                pieces: vec![flat(1.0, 0.0, 1.0), flat(1.0, 5.0, ratio)],
            },
            5,
        );
        let turned = bands(
            &Cell {
                pieces: vec![
                    flat(0.5, 5.0, ratio),
                    flat(1.0, 0.0, 1.0),
                    flat(0.5, 5.0, ratio),
                ],
            },
            5,
        );
        assert_same("contrast", &found, &turned, 0.0);
    }
}

#[test]
fn linear_masses_agree_with_many_thin_layers() {
    // second-order convergence of a staircase to the ramp
    let ramp = |length: f64| Piece::Ramp {
        length,
        potential: [0.0, 9.0],
        mass: [Mass::constant(0.5), Mass::constant(1.5)],
    };
    let exact = bands(
        &Cell {
            pieces: vec![ramp(1.5), flat(0.5, 2.0, 1.0)],
        },
        3,
    );
    let stairs = |n: usize| {
        let step = |i: usize| (i as f64 + 0.5) / n as f64;
        let mut pieces: Vec<Piece> = (0..n)
            .map(|i| flat(1.5 / n as f64, 9.0 * step(i), 0.5 + step(i)))
            .collect();
        pieces.push(flat(0.5, 2.0, 1.0));
        bands(&Cell { pieces }, 3)
    };
    let (coarse, fine) = (stairs(40), stairs(80));
    for ((e, c), f) in edges(&exact).iter().zip(edges(&coarse)).zip(edges(&fine)) {
        let extrapolated = f.0 + (f.0 - c.0) / 3.0;
        assert!((extrapolated - e.0).abs() < 1e-5, "{} {extrapolated}", e.0);
        assert!(
            (c.0 - e.0).abs() > 3.0 * (f.0 - e.0).abs(),
            "staircases should converge like n^-2"
        );
    }
}

#[test]
fn the_gap_that_closes_inside_a_tolerance_is_found_closed() {
    // 4.5 nm at 0, 11.56 nm at 235 meV, 0.067 me: gap 2 closes between well widths 4.3 and 4.7 nm
    let c = 38.099_821_109_685_84; // ħ²/2m_e in meV nm²
    let gap = |well: f64| {
        let cell = Cell {
            pieces: vec![flat(well, 0.0, 0.067 / c), flat(11.56, 235.0, 0.067 / c)],
        };
        bands(&cell, 2).gaps[1]
    };
    assert!((gap(4.3).size.value - 5.5).abs() < 0.5 && (gap(4.7).size.value - 5.5).abs() < 0.5);
    let least = (0..=400)
        .map(|i| gap(4.3 + 0.001 * f64::from(i)).size.value)
        .fold(f64::INFINITY, f64::min);
    assert!(least < 0.03, "{least}");
}

#[test]
fn sweeps_are_bounded() {
    let mut worst = 0.0f64;
    for i in 0..400 {
        let x = f64::from(i);
        let cell = Cell {
            pieces: vec![
                flat(
                    0.2 + (x * 0.37) % 3.0,
                    (x * 1.7) % 40.0 - 10.0,
                    0.1 + (x * 0.11) % 2.0,
                ),
                flat(
                    0.1 + (x * 0.73) % 4.0,
                    (x * 7.9) % 90.0 - 5.0,
                    0.1 + (x * 0.29) % 2.0,
                ),
                Piece::Delta {
                    strength: (x * 0.91) % 9.0 - 4.0,
                },
            ],
        };
        let found = bands(&cell, 6);
        worst = worst.max(found.sweeps as f64 / 6.0);
    }
    println!("sweeps a band: worst {worst}");
    assert!(worst < 45.0, "{worst}");
}

#[test]
fn budgets_and_cancelling_are_kept() {
    let cell = Cell {
        pieces: vec![flat(1.0, 0.0, 1.0), flat(1.0, 10.0, 1.0)],
    };
    let never = || false;
    for max_work in [0, 1, 14, 40] {
        let budget = Budget {
            max_work,
            cancelled: &never,
        };
        assert_eq!(solve(&cell, 4, &budget), Err(SolveError::BudgetSpent));
        assert_eq!(
            fermi(
                &cell,
                1.5,
                &Budget {
                    max_work: max_work.min(8),
                    ..budget
                }
            )
            .err(),
            Some(SolveError::BudgetSpent)
        );
    }
    let asked = AtomicUsize::new(0);
    let after_two = || asked.fetch_add(1, Ordering::Relaxed) >= 2;
    let budget = Budget {
        max_work: 100_000,
        cancelled: &after_two,
    };
    assert_eq!(solve(&cell, 4, &budget), Err(SolveError::Cancelled));
    assert_eq!(asked.load(Ordering::Relaxed), 3);
    // a sweep that alone would take too long is not begun
    let long = Piece::Ramp {
        length: 1e9,
        potential: [0.0, 10.0],
        mass: [Mass::constant(1.0); 2],
    };
    assert_eq!(
        solve(&Cell { pieces: vec![long] }, 2, &Budget::default()),
        Err(SolveError::BudgetSpent)
    );
    // a function that no mesh follows ends at the budget, not never
    let wild = |x: f64| (1e9 * x).sin();
    let small = Budget {
        max_work: 10_000,
        cancelled: &never,
    };
    assert_eq!(
        Mesh::build(1.0, &wild, 1.0, &small),
        Err(SolveError::BudgetSpent)
    );
}

#[test]
fn bad_numbers_are_refused() {
    let refuse = |pieces: Vec<Piece>| solve(&Cell { pieces }, 2, &Budget::default()).unwrap_err();
    for bad in [f64::NAN, f64::INFINITY] {
        assert_eq!(refuse(vec![flat(1.0, bad, 1.0)]), SolveError::NotFinite);
        assert_eq!(refuse(vec![flat(bad, 0.0, 1.0)]), SolveError::NotFinite);
        assert_eq!(refuse(vec![flat(1.0, 0.0, bad)]), SolveError::NotFinite);
        assert_eq!(
            refuse(vec![flat(1.0, 0.0, 1.0), Piece::Delta { strength: bad }]),
            SolveError::NotFinite
        );
    }
    assert_eq!(refuse(vec![]), SolveError::NotFinite);
    assert_eq!(
        refuse(vec![flat(-1.0, 0.0, 1.0), flat(3.0, 0.0, 1.0)]),
        SolveError::NotFinite
    );
    assert_eq!(
        refuse(vec![flat(1.0, 0.0, 0.0)]),
        SolveError::MassOutOfRange
    );
    assert_eq!(
        refuse(vec![flat(1.0, 0.0, -1.0)]),
        SolveError::MassOutOfRange
    );
    let smooth = Piece::Smooth {
        length: 1.0,
        samples: vec![1.0; 3],
        mass: [Mass::constant(1.0); 2],
    };
    assert_eq!(refuse(vec![smooth]), SolveError::NotFinite);
    // a mass that vanishes among the levels, or falls with energy
    let bent = |value, slope| Piece::Flat {
        length: 1.0,
        potential: 0.0,
        mass: Mass { value, slope },
    };
    assert_eq!(
        refuse(vec![bent(-5.0, 1.0), flat(1.0, 1.0, 1.0)]),
        SolveError::MassOutOfRange
    );
    assert_eq!(refuse(vec![bent(1.0, -0.1)]), SolveError::MassOutOfRange);
}

#[test]
fn meshes_follow_kinks_jumps_and_steep_walls() {
    // a potential with a kink inside agrees with the two ramps it is made of
    let hat = |x: f64| 10.0 * (1.0 - (x - 0.6).abs() / 0.6).max(0.0);
    let meshed = bands(&smooth_cell(1.2, &hat, 10.0), 4);
    let m = [Mass::constant(1.0); 2];
    let ramps = Cell {
        pieces: vec![
            Piece::Ramp {
                length: 0.6,
                potential: [0.0, 10.0],
                mass: m,
            },
            Piece::Ramp {
                length: 0.6,
                potential: [10.0, 0.0],
                mass: m,
            },
        ],
    };
    assert_same("kink", &meshed, &bands(&ramps, 4), 0.0);
    // a jump agrees with layers
    let jump = |x: f64| if x < 0.3777 { 0.0 } else { 7.0 };
    let layers = Cell {
        pieces: vec![flat(0.3777, 0.0, 1.0), flat(0.6223, 7.0, 1.0)],
    };
    for ((x, _), (y, _)) in edges(&bands(&smooth_cell(1.0, &jump, 7.0), 3))
        .iter()
        .zip(edges(&bands(&layers, 3)))
    {
        assert!((x - y).abs() < 1e-10, "{x} {y}");
    }
}

/// What two solutions of one spectrum, or a fold, contradict each other in.
fn contradictions(found: &Bands, other: &Bands) -> Vec<String> {
    let mut list = Vec::new();
    for (n, (a, b)) in found.bands.iter().zip(&other.bands).enumerate() {
        let pairs = [
            ("bottom", Some(a.bottom.energy), Some(b.bottom.energy)),
            ("top", Some(a.top.energy), Some(b.top.energy)),
            ("width", Some(a.width), Some(b.width)),
            ("gap", Some(found.gaps[n].size), Some(other.gaps[n].size)),
            ("mass of the bottom", a.bottom.mass, b.bottom.mass),
            ("mass of the top", a.top.mass, b.top.mass),
        ];
        for (what, x, y) in pairs {
            if let (Some(x), Some(y)) = (x, y) {
                let agree = (x.value - y.value).abs() <= x.error + y.error;
                if !agree {
                    list.push(format!("{what} {n}: {x:?} and {y:?}"));
                }
            }
        }
    }
    list
}

/// A random mixture written twice in one cell has the same spectrum from any origin and in either direction, and each
/// of its bands in two halves that touch: found so within the bounds, walls of hundreds of decay lengths or not.
#[test]
fn doubled_random_mixtures_fold_and_do_not_depend_on_origin_or_direction() {
    let mut random = Random(0x7f4a_7c15_9e37_79b9);
    let mut doubled = 0;
    let mut wrong = Vec::new();
    for trial in 0..trials(400) {
        let mut pieces = mixture(&mut random);
        let repeated = random.next() < 0.25;
        if repeated {
            pieces = [pieces.clone(), pieces].concat();
        }
        let mut turned = pieces.clone();
        turned.rotate_left(1 + (random.next() * 2.0) as usize);
        if !repeated {
            continue;
        }
        doubled += 1;
        let mirror = mirrored(&pieces);
        let found = bands(&Cell { pieces }, 5);
        for (n, gap) in found.gaps.iter().enumerate().step_by(2) {
            if !(gap.closed && gap.size.value == 0.0) {
                wrong.push(format!("{trial}: open at the fold, gap {n}: {gap:?}"));
            }
        }
        for (name, other) in [("turned", turned), ("mirrored", mirror)] {
            let other = bands(&Cell { pieces: other }, 5);
            let found = contradictions(&found, &other);
            wrong.extend(found.iter().map(|what| format!("{trial} {name}: {what}")));
        }
    }
    println!("{doubled} doubled cells");
    assert!(doubled > 50 && wrong.is_empty(), "{wrong:#?}");
}
