//! Which points lie on the boundary of the zone.
//!
//! The formulas hold for cells as their paper chooses them. Where a cell of the same lattice is chosen otherwise, a corner would
//! come out inside the zone or beyond it: it is left without a name.

use super::Labels;
use super::sized::dot;
use crate::model::shape::centring::LatticeKind;
use nalgebra::DMatrix;

/// Of squared lengths, in the shortest reciprocal vector's.
const SAME: f64 = 1e-6;
/// Reciprocal vectors go this far along each primitive one.
const REACH: i32 = 4;

pub(super) fn keep_those_on_it(
    labels: Labels,
    kind: &LatticeKind,
    conventional: &[Vec<f64>],
) -> Labels {
    let nothing = Labels {
        points: Vec::new(),
        runs: &[],
    };
    let Some(vectors) = reciprocal(kind, conventional) else {
        return nothing;
    };
    let waves = around(&vectors);
    let points = labels.points.into_iter();
    Labels {
        points: points
            .filter(|(_, point)| is_on_boundary(point, &vectors, &waves))
            .collect(),
        ..labels
    }
}

/// Primitive reciprocal vectors without their 2π; `None` where the vectors make no cell.
fn reciprocal(kind: &LatticeKind, conventional: &[Vec<f64>]) -> Option<Vec<Vec<f64>>> {
    let dimension = kind.dimension;
    let entries: Vec<f64> = conventional.iter().flatten().copied().collect();
    let whole = entries.len() == dimension * dimension && entries.iter().all(|x| x.is_finite());
    let cell = whole.then(|| DMatrix::from_row_slice(dimension, dimension, &entries))?;
    // The columns of the inverse are the conventional reciprocal vectors.
    let inverse = cell.try_inverse()?;
    let conventional: Vec<Vec<f64>> = inverse
        .column_iter()
        .map(|column| column.iter().copied().collect())
        .collect();
    let primitive = |axis: usize| {
        let unit: Vec<f64> = (0..dimension)
            .map(|at| f64::from(u8::from(at == axis)))
            .collect();
        along(
            &conventional,
            &kind.centring.fractions_to_conventional(&unit),
        )
    };
    Some((0..dimension).map(primitive).collect())
}

fn along(vectors: &[Vec<f64>], fractions: &[f64]) -> Vec<f64> {
    let entry = |axis: usize| {
        let parts = fractions.iter().zip(vectors);
        parts
            .map(|(fraction, vector)| fraction * vector.get(axis).copied().unwrap_or(0.0))
            .sum()
    };
    (0..vectors.len()).map(entry).collect()
}

/// The reciprocal vectors near the origin.
fn around(vectors: &[Vec<f64>]) -> Vec<Vec<f64>> {
    let side = 2 * REACH + 1;
    let dimension = vectors.len();
    let count = side.pow(u32::try_from(dimension).unwrap_or(3));
    let steps = |index: i32| -> Vec<f64> {
        (0..dimension)
            .scan(index, |rest, _| {
                let step = *rest % side - REACH;
                *rest /= side;
                Some(f64::from(step))
            })
            .collect()
    };
    (0..count)
        .map(|index| along(vectors, &steps(index)))
        .collect()
}

/// Whether two reciprocal vectors, of which the origin may be one, are the nearest to a point.
fn is_on_boundary(point: &[f64], vectors: &[Vec<f64>], waves: &[Vec<f64>]) -> bool {
    let place = along(vectors, point);
    let far = |wave: &Vec<f64>| -> f64 {
        let apart = place.iter().zip(wave).map(|(k, wave)| k - wave);
        apart.map(|step| step * step).sum()
    };
    let distances: Vec<f64> = waves.iter().map(far).collect();
    let nearest = distances.iter().copied().fold(f64::INFINITY, f64::min);
    let lengths = vectors.iter().map(|vector| dot(vector, vector));
    let same = SAME * lengths.fold(f64::INFINITY, f64::min);
    let near = distances.iter().filter(|far| **far <= nearest + same);
    near.count() > 1
}
