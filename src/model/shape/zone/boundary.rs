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
    let cell = DMatrix::from_fn(dimension, dimension, |row, column| {
        let vector = conventional.get(row);
        vector
            .and_then(|vector| vector.get(column))
            .copied()
            .unwrap_or(0.0)
    });
    let inverse = cell.try_inverse()?;
    // Conventional rows; the i-th primitive one is Σ Cⁱⁿᵛⱼᵢ b_j.
    let own = |axis: usize| -> Vec<f64> {
        let unit: Vec<f64> = (0..dimension)
            .map(|at| f64::from(u8::from(at == axis)))
            .collect();
        let indices = kind.centring.fractions_to_conventional(&unit);
        (0..dimension)
            .map(|row| {
                let parts = indices.iter().enumerate();
                parts
                    .map(|(column, index)| index * inverse[(row, column)])
                    .sum()
            })
            .collect()
    };
    let vectors: Vec<Vec<f64>> = (0..dimension).map(own).collect();
    let whole = vectors.iter().flatten().all(|entry| entry.is_finite());
    whole.then_some(vectors)
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

/// The reciprocal vectors near the origin, without it.
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
        .map(steps)
        .filter(|steps| steps.iter().any(|step| *step != 0.0))
        .map(|steps| along(vectors, &steps))
        .collect()
}

/// Whether a point, brought into the first zone, is as near to another reciprocal vector as to the origin.
fn is_on_boundary(point: &[f64], vectors: &[Vec<f64>], waves: &[Vec<f64>]) -> bool {
    let far = |k: &[f64], wave: &[f64]| -> f64 {
        let apart = k.iter().zip(wave).map(|(k, wave)| (k - wave).powi(2));
        apart.sum()
    };
    let place = along(vectors, point);
    let shortest = vectors
        .iter()
        .map(|vector| dot(vector, vector))
        .fold(f64::INFINITY, f64::min);
    let own = dot(&place, &place);
    let nearest = waves
        .iter()
        .map(|wave| far(&place, wave))
        .fold(f64::INFINITY, f64::min);
    (nearest - own).abs() <= SAME * shortest
        || nearest < own && ties(&place, waves, nearest, SAME * shortest)
}

/// Whether two reciprocal vectors or more are this near.
fn ties(place: &[f64], waves: &[Vec<f64>], nearest: f64, same: f64) -> bool {
    let near = waves.iter().filter(|wave| {
        let apart: f64 = place
            .iter()
            .zip(wave.iter())
            .map(|(k, wave)| (k - wave).powi(2))
            .sum();
        apart <= nearest + same
    });
    near.count() > 1
}
