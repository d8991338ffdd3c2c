//! Which points of the zone have a name, up to the lattice's symmetry and reciprocal vectors.

use crate::model::Crystal;
use crate::model::shape::symmetry::{Operation, point_operations};

/// Fractions of the reciprocal vectors this close are one point.
const SAME: f64 = 1e-5;

/// The named points of one lattice with its operations.
pub(super) struct ZoneNames {
    points: Vec<(&'static str, Vec<f64>)>,
    operations: Vec<Operation>,
}

impl ZoneNames {
    pub fn new(crystal: &Crystal) -> Self {
        Self {
            points: crystal.zone_points(),
            operations: point_operations(&crystal.primitive_values()),
        }
    }

    /// The name of a point, in fractions of the primitive reciprocal vectors.
    pub fn name(&self, k: &[f64]) -> Option<String> {
        let images: Vec<Vec<f64>> = self.operations.iter().map(|m| image(m, k)).collect();
        let found = self
            .points
            .iter()
            .find(|(_, point)| same(point, k) || images.iter().any(|image| same(point, image)));
        found.map(|(name, _)| (*name).to_string())
    }
}

fn image(operation: &Operation, k: &[f64]) -> Vec<f64> {
    let row = |row: &Vec<i64>| row.iter().zip(k).map(|(m, x)| *m as f64 * x).sum();
    operation.iter().map(row).collect()
}

/// Whether two points differ by a reciprocal vector.
fn same(a: &[f64], b: &[f64]) -> bool {
    a.iter().zip(b).all(|(x, y)| {
        let apart = x - y;
        (apart - apart.round()).abs() < SAME
    })
}
