//! Cells as vectors: products, reciprocal vectors, sums.

use std::f64::consts::PI;

use crenate::model::Crystal;

use super::Desk;

pub fn crystal(lattice: &str) -> Crystal {
    let desk = Desk::new(&format!("crystal a\n  lattice {lattice}\n"));
    assert_eq!(desk.problems(), 0, "{lattice}");
    assert!(
        desk.troubles().is_empty(),
        "{lattice}: {:?}",
        desk.troubles()
    );
    let built = desk.crystal("a").crystal;
    assert!(!built.broken);
    built
}

pub fn values(vectors: &[Vec<crenate::model::Dual>]) -> Vec<Vec<f64>> {
    vectors
        .iter()
        .map(|row| row.iter().map(|entry| entry.value).collect())
        .collect()
}

pub fn cross(a: &[f64], b: &[f64]) -> Vec<f64> {
    vec![
        a[1] * b[2] - a[2] * b[1],
        a[2] * b[0] - a[0] * b[2],
        a[0] * b[1] - a[1] * b[0],
    ]
}

pub fn dot(a: &[f64], b: &[f64]) -> f64 {
    a.iter().zip(b).map(|(x, y)| x * y).sum()
}

pub fn padded(vectors: &[Vec<f64>]) -> Vec<Vec<f64>> {
    let mut rows: Vec<Vec<f64>> = vectors
        .iter()
        .map(|row| {
            row.iter()
                .copied()
                .chain(std::iter::repeat(0.0))
                .take(3)
                .collect()
        })
        .collect();
    for axis in rows.len()..3 {
        let mut unit = vec![0.0; 3];
        unit[axis] = 1.0;
        rows.push(unit);
    }
    rows
}

/// b_i with b_i·a_j = 2π δ_ij.
pub fn reciprocal(vectors: &[Vec<f64>]) -> Vec<Vec<f64>> {
    let rows = padded(vectors);
    let whole = dot(&rows[0], &cross(&rows[1], &rows[2]));
    (0..vectors.len())
        .map(|i| {
            let b = cross(&rows[(i + 1) % 3], &rows[(i + 2) % 3]);
            b.iter()
                .take(vectors.len())
                .map(|entry| 2.0 * PI * entry / whole)
                .collect()
        })
        .collect()
}

pub fn combine(vectors: &[Vec<f64>], factors: &[f64]) -> Vec<f64> {
    (0..vectors.len())
        .map(|axis| {
            vectors
                .iter()
                .zip(factors)
                .map(|(row, factor)| factor * row[axis])
                .sum()
        })
        .collect()
}
