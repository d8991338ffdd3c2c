//! The point symmetry of a lattice, and the stars of its waves.
//!
//! An operation R of the lattice maps its primitive vectors onto lattice vectors
//! of the same lengths and angles: R·p_i = Σ_j M_ij·p_j with whole M. A wave with
//! primitive indices m is equivalent to those with indices M·m, since
//! G·(R·p_i) = 2π Σ_j M_ij·m_j.

use super::centring::Centring;

/// A whole matrix, as far as the dimension goes.
pub type Operation = Vec<Vec<i64>>;

/// Lengths and angles are equal within this share.
const TOLERANCE: f64 = 1e-9;
/// No lattice vector of the lengths looked for needs larger indices, unless the vectors are very oblique.
const LARGEST_INDEX: i64 = 6;

/// All operations that map the lattice onto itself, for primitive vectors in any one unit of length.
#[must_use]
pub fn point_operations(vectors: &[Vec<f64>]) -> Vec<Operation> {
    let metric: Vec<Vec<f64>> = vectors
        .iter()
        .map(|a| vectors.iter().map(|b| dot(a, b)).collect())
        .collect();
    let candidates = short_vectors(&metric);
    let mut found = Vec::new();
    extend(&metric, &candidates, &mut Vec::new(), &mut found);
    found
}

fn dot(a: &[f64], b: &[f64]) -> f64 {
    a.iter().zip(b).map(|(x, y)| x * y).sum()
}

fn metric_product(metric: &[Vec<f64>], a: &[i64], b: &[i64]) -> f64 {
    metric
        .iter()
        .zip(a)
        .map(|(row, i)| {
            let inner: f64 = row.iter().zip(b).map(|(g, j)| g * to_f64(*j)).sum();
            to_f64(*i) * inner
        })
        .sum()
}

fn to_f64(index: i64) -> f64 {
    #[expect(clippy::cast_precision_loss, reason = "indices are far below 2^53")]
    let value = index as f64;
    value
}

fn diagonal(metric: &[Vec<f64>], index: usize) -> f64 {
    metric
        .get(index)
        .and_then(|row| row.get(index))
        .copied()
        .unwrap_or(0.0)
}

/// Lattice vectors as long as one of the primitive vectors.
fn short_vectors(metric: &[Vec<f64>]) -> Vec<Vec<i64>> {
    let range = -LARGEST_INDEX..=LARGEST_INDEX;
    let mut all: Vec<Vec<i64>> = vec![Vec::new()];
    for _ in metric {
        all = all
            .iter()
            .flat_map(|start| {
                range.clone().map(move |next| {
                    let mut longer = start.clone();
                    longer.push(next);
                    longer
                })
            })
            .collect();
    }
    all.retain(|vector| {
        let length = metric_product(metric, vector, vector);
        (0..metric.len()).any(|index| close(length, diagonal(metric, index), metric))
    });
    all
}

fn close(a: f64, b: f64, metric: &[Vec<f64>]) -> bool {
    let scale = (0..metric.len())
        .map(|index| diagonal(metric, index))
        .fold(0.0, f64::max);
    (a - b).abs() <= TOLERANCE * scale
}

/// Adds images of the next primitive vector that keep all lengths and angles.
fn extend(
    metric: &[Vec<f64>],
    candidates: &[Vec<i64>],
    rows: &mut Operation,
    found: &mut Vec<Operation>,
) {
    let next = rows.len();
    let Some(wanted) = metric.get(next) else {
        found.push(rows.clone());
        return;
    };
    for candidate in candidates {
        let keeps_length = close(
            metric_product(metric, candidate, candidate),
            diagonal(metric, next),
            metric,
        );
        let keeps_angles = rows
            .iter()
            .zip(wanted)
            .all(|(row, g)| close(metric_product(metric, row, candidate), *g, metric));
        if keeps_length && keeps_angles {
            rows.push(candidate.clone());
            extend(metric, candidates, rows, found);
            rows.pop();
        }
    }
}

/// A wave's equivalents, itself first, each pair ±G once. Indices on the conventional reciprocal vectors, also given so.
#[must_use]
pub fn star(indices: &[i64], centring: Centring, operations: &[Operation]) -> Vec<Vec<i64>> {
    let Some(start) = centring.to_primitive(indices) else {
        return vec![indices.to_vec()];
    };
    let mut members = vec![indices.to_vec()];
    for operation in operations {
        let image: Vec<i64> = operation
            .iter()
            .map(|row| row.iter().zip(&start).map(|(a, b)| a * b).sum())
            .collect();
        let image = centring.to_conventional(&image);
        let opposite: Vec<i64> = image.iter().map(|index| -index).collect();
        if !members.contains(&image) && !members.contains(&opposite) {
            members.push(image);
        }
    }
    members
}

#[cfg(test)]
mod tests {
    use super::*;

    fn vectors(rows: &[&[f64]]) -> Vec<Vec<f64>> {
        rows.iter().map(|row| row.to_vec()).collect()
    }

    /// Orders of the holohedries: International Tables for Crystallography A (2016), table 3.1.2.1 (from memory).
    #[test]
    fn holohedries_have_the_orders_of_the_tables() {
        let root = 3.0_f64.sqrt() / 2.0;
        let cases: [(&str, Vec<Vec<f64>>, usize); 8] = [
            ("square", vectors(&[&[1.0, 0.0], &[0.0, 1.0]]), 8),
            ("rectangular", vectors(&[&[1.0, 0.0], &[0.0, 1.3]]), 4),
            ("hexagonal", vectors(&[&[1.0, 0.0], &[-0.5, root]]), 12),
            ("oblique", vectors(&[&[1.0, 0.0], &[0.3, 1.1]]), 2),
            (
                "fcc",
                vectors(&[&[0.0, 0.5, 0.5], &[0.5, 0.0, 0.5], &[0.5, 0.5, 0.0]]),
                48,
            ),
            (
                "bcc",
                vectors(&[&[-0.5, 0.5, 0.5], &[0.5, -0.5, 0.5], &[0.5, 0.5, -0.5]]),
                48,
            ),
            (
                "tetragonal",
                vectors(&[&[1.0, 0.0, 0.0], &[0.0, 1.0, 0.0], &[0.0, 0.0, 1.3]]),
                16,
            ),
            (
                "hexagonal prism",
                vectors(&[&[1.0, 0.0, 0.0], &[-0.5, root, 0.0], &[0.0, 0.0, 1.6]]),
                24,
            ),
        ];
        for (name, lattice, order) in cases {
            assert_eq!(point_operations(&lattice).len(), order, "{name}");
        }
    }

    #[test]
    fn stars_have_as_many_members_as_the_shell_of_their_wave() {
        let fcc = vectors(&[&[0.0, 0.5, 0.5], &[0.5, 0.0, 0.5], &[0.5, 0.5, 0.0]]);
        let operations = point_operations(&fcc);
        for (indices, members) in [
            ([1, 1, 1], 4),
            ([2, 0, 0], 3),
            ([2, 2, 0], 6),
            ([3, 1, 1], 12),
        ] {
            assert_eq!(star(&indices, Centring::Face, &operations).len(), members);
        }
        let hexagonal = vectors(&[&[1.0, 0.0], &[-0.5, 3.0_f64.sqrt() / 2.0]]);
        let operations = point_operations(&hexagonal);
        let mut members = star(&[1, 0], Centring::Primitive, &operations);
        members.sort();
        assert_eq!(members.len(), 3);
        for wanted in [[1, 0], [0, 1], [1, -1]] {
            let opposite: Vec<i64> = wanted.iter().map(|index| -index).collect();
            assert!(
                members.iter().any(|one| *one == wanted || *one == opposite),
                "{wanted:?}"
            );
        }
    }
}
