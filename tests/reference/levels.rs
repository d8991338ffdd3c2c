//! D(E) of Hill's equation and of ramps, Fermi energies, hopping amplitudes and random layers against computed rows.

use super::reference::{Tally, flat, layered_cell, number, random_cells, rows, smooth_cell};
use crenate::numerics::{
    Budget, Cell, Mass, Piece, discriminant, fermi, hopping, integrated_states, level, solve,
};
use std::f64::consts::PI;

const ROWS: &str = include_str!("random_layers.csv");

fn discriminants_of_hills_equation() -> Vec<Tally> {
    let mut tally = Tally::new("hill discriminant");
    for row in rows(include_str!("hill.csv")) {
        let v: Vec<f64> = row[0].split(';').map(number).collect();
        let potential = |x: f64| {
            v[0] + v[1..]
                .chunks(2)
                .map(|c| c[0] * (c[1] * x).cos())
                .sum::<f64>()
        };
        let found = discriminant(
            &smooth_cell(PI, &potential, 4.0),
            number(row[1]),
            &Budget::default(),
        )
        .unwrap();
        let truth = number(row[2]);
        tally.check(
            &format!("{} E {}", row[0], row[1]),
            found,
            truth,
            truth.abs().max(2.0),
        );
    }
    vec![tally.within(1e-12 / f64::EPSILON)]
}

/// The cell of a name in one of the layered files.
fn named(name: &str) -> Cell {
    let files = [
        include_str!("kronig_penney.csv"),
        include_str!("delta_combs.csv"),
    ];
    let all = files.iter().flat_map(|text| rows(text));
    let row = all
        .into_iter()
        .find(|r| r[0] == "cell" && r[1] == name)
        .unwrap();
    layered_cell(&row[2..].iter().map(|f| number(f)).collect::<Vec<f64>>())
}

fn fillings_of_layers_and_combs() -> Vec<Tally> {
    let mut tally = Tally::new("filling");
    for row in rows(include_str!("filling.csv")) {
        let (cell, states) = (named(row[0]), number(row[1]));
        let found = fermi(&cell, states, &Budget::default()).unwrap();
        tally.check(
            &format!("{} n {states}", row[0]),
            found,
            number(row[2]),
            number(row[2]),
        );
        let back = integrated_states(&cell, found.value, &Budget::default()).unwrap();
        assert!(
            (back.value - states).abs() <= back.error,
            "{back:?} for {states}"
        );
        assert!(back.error < 1e-12);
        let (band, share) = (states.floor(), states.fract());
        let ka = PI * if band == 0.0 { share } else { 1.0 - share };
        let same = level(&cell, band as usize, ka, &Budget::default()).unwrap();
        assert!((same.value - found.value).abs() <= same.error);
    }
    vec![tally.within(1e-13 / f64::EPSILON)]
}

fn hoppings_of_the_optical_lattice() -> Vec<Tally> {
    let mut all = Vec::new();
    for r in 1..=5 {
        let mut tally = Tally::new(&format!("optical lattice J{r}"));
        for row in rows(include_str!("optical_lattice.csv"))
            .iter()
            .filter(|x| x[0] == "hop")
        {
            let s = number(row[1]);
            let cell = smooth_cell(PI, &|x| s * x.cos().powi(2), s);
            let found = hopping(&cell, 0, r, &Budget::default()).unwrap();
            let truth = number(row[1 + r]);
            tally.check(&format!("s {s}"), found, truth, truth.abs());
        }
        all.push(tally.within(1e-10 / f64::EPSILON));
    }
    all
}

fn ramps() -> Vec<Tally> {
    let mut tally = Tally::new("ramps");
    for row in rows(include_str!("ramps.csv")) {
        let x: Vec<f64> = row.iter().map(|f| number(f)).collect();
        let ramp = Piece::Ramp {
            length: x[0],
            potential: [x[1], x[2]],
            mass: [Mass::constant(x[3]); 2],
        };
        let cell = Cell {
            pieces: vec![ramp, flat(1.0, 0.0, 1.0)],
        };
        let found = discriminant(&cell, x[4], &Budget::default()).unwrap();
        tally.check(
            &format!(
                "length {} from {} to {} E {}",
                row[0], row[1], row[2], row[4]
            ),
            found,
            x[5],
            x[5].abs().max(2.0),
        );
    }
    vec![tally.within(1e-12 / f64::EPSILON)]
}

fn random_layers() -> Vec<Tally> {
    let all = rows(ROWS);
    let mut tally = Tally::new("random layers");
    for (label, cell) in random_cells(ROWS) {
        let found = solve(&cell, 5, &Budget::default()).unwrap();
        for row in all.iter().filter(|r| r[0] == "edge" && r[1] == label) {
            let states = number(row[2]) as usize;
            let edge = if row[3] == "1" {
                found.bands[states].bottom
            } else {
                found.bands[states - 1].top
            };
            let truth = number(row[4]);
            tally.check(
                &format!("cell {label} N {states} upper {}", row[3]),
                edge.energy,
                truth,
                truth.abs().max(10.0),
            );
        }
    }
    assert!(tally.checked > 500);
    vec![tally.within(1e-13 / f64::EPSILON)]
}

/// The tallies of these files.
pub fn tallies() -> Vec<Tally> {
    [
        discriminants_of_hills_equation,
        ramps,
        fillings_of_layers_and_combs,
        hoppings_of_the_optical_lattice,
        random_layers,
    ]
    .iter()
    .flat_map(|check| check())
    .collect()
}
