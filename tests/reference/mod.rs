//! Reading the compact reference files, and the tally of errors and coverage against them.
#![allow(
    dead_code,
    clippy::indexing_slicing,
    clippy::print_stdout,
    clippy::unwrap_used,
    missing_docs
)]

pub mod mixtures;

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
#[derive(Clone, Default)]
pub struct Tally {
    pub name: String,
    pub checked: usize,
    pub covered: usize,
    pub worst: f64,
    pub worst_row: String,
    pub misses: Vec<String>,
    pub padding: Vec<f64>,
    /// stated bounds in eps of the scale
    pub stated: Vec<f64>,
    /// the worst error allowed, in eps of the scale
    pub limit: f64,
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
        self.stated.push(found.error / scale / f64::EPSILON);
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
        median(&self.padding)
    }

    /// Sets the worst error allowed, in eps of the scale.
    pub fn within(mut self, limit: f64) -> Self {
        self.limit = limit;
        self
    }

    /// A line of the table.
    pub fn line(&self) -> String {
        let padding = match self.padding.len() {
            0 => "–".into(),
            count => format!("{:.1} of {count}", self.median_padding()),
        };
        format!(
            "{:<26} {:>5} {:>8.1} % {:>10.2} {:>10.0} {:>10.1} {:>12}  {}",
            self.name,
            self.checked,
            100.0 * self.covered as f64 / self.checked as f64,
            self.worst,
            self.limit,
            median(&self.stated),
            padding,
            self.worst_row
        )
    }

    /// What is wrong: a true value outside its bound, an error above the limit, padded bounds, nothing checked.
    pub fn faults(&self) -> Vec<String> {
        let mut faults = self.misses.clone();
        if self.worst > self.limit || self.worst.is_nan() {
            faults.push(format!(
                "worst error {} eps at {}",
                self.worst, self.worst_row
            ));
        }
        if self.median_padding() >= 1000.0 {
            faults.push(format!("bounds padded by {}", self.median_padding()));
        }
        if self.checked == 0 {
            faults.push("nothing checked".into());
        }
        faults
            .iter()
            .map(|fault| format!("{}: {fault}", self.name))
            .collect()
    }

    /// Asserts that nothing is wrong.
    pub fn finish(self, limit: f64) {
        let tally = self.within(limit);
        println!("{}", tally.line());
        assert!(tally.faults().is_empty(), "{:#?}", tally.faults());
    }
}

/// The middle of some numbers; 0 of none.
fn median(numbers: &[f64]) -> f64 {
    let mut sorted = numbers.to_vec();
    sorted.sort_by(f64::total_cmp);
    sorted.get(sorted.len() / 2).copied().unwrap_or(0.0)
}

/// The headings of the table of tallies.
pub fn headings() -> String {
    format!(
        "{:<26} {:>5} {:>10} {:>10} {:>10} {:>10} {:>12}  worst row",
        "reference", "rows", "covered", "worst", "allowed", "stated", "stated/true"
    )
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

/// A piece from `flat:length:V:m:slope` or `delta:strength`.
fn parsed(text: &str) -> Piece {
    let fields: Vec<&str> = text.split(':').collect();
    if fields[0] == "delta" {
        return Piece::Delta {
            strength: number(fields[1]),
        };
    }
    let [length, potential, value, slope] = [1, 2, 3, 4].map(|i| number(fields[i]));
    Piece::Flat {
        length,
        potential,
        mass: Mass { value, slope },
    }
}

/// The cells of the file of random layers, by their labels.
pub fn random_cells(text: &str) -> Vec<(String, Cell)> {
    let all = rows(text);
    let cell = |r: &Vec<&str>| {
        (
            r[1].to_string(),
            Cell {
                pieces: r[2..].iter().map(|t| parsed(t)).collect(),
            },
        )
    };
    all.iter().filter(|r| r[0] == "cell").map(cell).collect()
}
