//! Reading the compact reference files, and the tally of errors and coverage against them.
#![allow(
    dead_code,
    clippy::indexing_slicing,
    clippy::print_stdout,
    clippy::unwrap_used,
    missing_docs
)]

use crenate::numerics::{Bounded, Budget, Cell, Mass, Mesh, Piece};

/// The comma-separated fields of every line but comments.
pub fn rows(text: &str) -> Vec<Vec<&str>> {
    let lines = text
        .lines()
        .filter(|line| !line.starts_with('#') && !line.is_empty());
    lines.map(|line| line.split(',').collect()).collect()
}

pub fn number(field: &str) -> f64 {
    field.parse().unwrap()
}

pub fn optional(field: &str) -> Option<f64> {
    field.parse().ok()
}

pub fn flat(length: f64, potential: f64, mass: f64) -> Piece {
    Piece::Flat {
        length,
        potential,
        mass: Mass::constant(mass),
    }
}

/// The cell of a `cell` line: a, V1, m1, b, V2, m2, C, delta in the middle of layer 1.
pub fn layered_cell(fields: &[f64]) -> Cell {
    let [a, v1, m1, b, v2, m2, c, strength] = fields[..8] else {
        panic!("eight numbers")
    };
    let mut pieces = vec![flat(a, v1, m1 / c)];
    if strength != 0.0 {
        pieces = vec![
            flat(a / 2.0, v1, m1 / c),
            Piece::Delta { strength },
            flat(a / 2.0, v1, m1 / c),
        ];
    }
    if b > 0.0 {
        pieces.push(flat(b, v2, m2 / c));
    }
    Cell { pieces }
}

/// Errors against a reference: the worst in eps of the scale, and whether the bounds hold.
#[derive(Default)]
pub struct Tally {
    pub name: String,
    pub checked: usize,
    pub covered: usize,
    pub worst: f64,
    pub worst_row: String,
    pub misses: Vec<String>,
    pub padding: Vec<f64>,
}

impl Tally {
    pub fn new(name: &str) -> Self {
        Tally {
            name: name.into(),
            ..Tally::default()
        }
    }

    /// Books a value; `scale` is the size in whose eps the error is told.
    pub fn check(&mut self, row: &str, found: Bounded, truth: f64, scale: f64) {
        let error = (found.value - truth).abs();
        self.checked += 1;
        if error <= found.error {
            self.covered += 1;
        } else {
            self.misses
                .push(format!("{row}: {found:?} against {truth:e}"));
        }
        let eps = error / scale / f64::EPSILON;
        if eps > self.worst || eps.is_nan() || self.worst_row.is_empty() {
            self.worst = eps;
            self.worst_row = row.into();
        }
        if error > 1e-15 * scale {
            self.padding.push(found.error / error);
        }
    }

    /// Median of stated over true error, where the true error is above 1e-15 of the scale.
    pub fn median_padding(&self) -> f64 {
        let mut sorted = self.padding.clone();
        sorted.sort_by(f64::total_cmp);
        sorted.get(sorted.len() / 2).copied().unwrap_or(0.0)
    }

    /// Prints the tally and asserts that every true value lies in its bound, that the worst error is
    /// at most `limit` eps of the scale, and that bounds are not padded.
    pub fn finish(&self, limit: f64) {
        println!(
            "{:<28} rows {:5}  covered {:5}  worst {:8.2} eps ({})  median stated/true {:.1} of {}",
            self.name,
            self.checked,
            self.covered,
            self.worst,
            self.worst_row,
            self.median_padding(),
            self.padding.len()
        );
        assert!(self.checked > 0, "{}: nothing checked", self.name);
        assert!(
            self.misses.is_empty(),
            "{}: outside the bound:\n{}",
            self.name,
            self.misses.join("\n")
        );
        assert!(
            self.worst <= limit,
            "{}: worst error {} eps at {}",
            self.name,
            self.worst,
            self.worst_row
        );
        assert!(
            self.median_padding() < 1000.0,
            "{}: padded bounds",
            self.name
        );
    }
}

/// A cell that is one smooth stretch, and its mesh.
pub fn smooth_cell(period: f64, potential: &dyn Fn(f64) -> f64, scale: f64) -> Cell {
    let mesh = Mesh::build(period, potential, scale, &Budget::default()).unwrap();
    let samples: Vec<f64> = mesh.nodes().iter().map(|x| potential(x * period)).collect();
    Cell {
        pieces: mesh.pieces(&samples, [Mass::constant(1.0); 2]),
    }
}

/// Jacobi's sn²(u|m) by descending Landen transformations (DLMF 22.20(ii)).
pub fn sn_squared(u: f64, m: f64) -> f64 {
    let (mut a, mut b, mut c) = (1.0f64, (1.0 - m).sqrt(), m.sqrt());
    let mut ratios = Vec::new();
    while c > 2e-16 * a && ratios.len() < 12 {
        (a, b, c) = (0.5 * (a + b), (a * b).sqrt(), 0.5 * (a - b));
        ratios.push(c / a);
    }
    let mut angle = a * u * 2f64.powi(ratios.len() as i32);
    for ratio in ratios.iter().rev() {
        angle = 0.5 * (angle + (ratio * angle.sin()).asin());
    }
    angle.sin().powi(2)
}
