//! What pictures of two- and three-dimensional crystals are drawn from: bands along a path, and the density of states.
//!
//! At the accuracy of a picture: energies to about a thousandth of the largest |bᵢ|² in ħ²/2m.

use crate::model::Crystal;

use super::solve::MOST_BANDS;
use super::zone_field::ZoneField;
use super::zone_slopes::kernel_k;
use super::zone_solve::{Effort, unsolved, with_zone, zone_budget};
use super::{Cancelled, Unsolved};

/// A corner of a path through the zone.
#[derive(Clone, Debug, PartialEq)]
pub struct PathStop {
    /// Its name, where it has one.
    pub name: Option<&'static str>,
    /// In fractions of the primitive reciprocal vectors.
    pub k: Vec<f64>,
}

/// A point of a path.
#[derive(Clone, Debug, PartialEq)]
pub struct PathPoint {
    /// In fractions of the primitive reciprocal vectors.
    pub k: Vec<f64>,
    /// The length of the path up to here, in inverse metre.
    pub distance: f64,
    /// The levels in joule, rising.
    pub energies: Vec<f64>,
}

/// The density of states: points (energy in joule, states per joule and primitive cell), `degeneracy` counted.
pub type DensityOfStates = Vec<(f64, f64)>;

/// Corners of the usual paths, by kind and dimension of lattice (common practice; Setyawan and Curtarolo, Comput. Mater.
/// Sci. 49, 299 (2010), shortened to one unbroken line).
const PATHS: [(&str, usize, &[&str]); 10] = [
    ("square", 2, &["centre", "X", "M", "centre"]),
    ("rectangular", 2, &["centre", "X", "S", "Y", "centre"]),
    ("hexagonal", 2, &["centre", "M", "K", "centre"]),
    ("cubic", 3, &["centre", "X", "M", "centre", "R", "X"]),
    ("fcc", 3, &["L", "centre", "X", "W", "K", "centre"]),
    ("bcc", 3, &["centre", "H", "N", "centre", "P", "H"]),
    (
        "tetragonal",
        3,
        &["centre", "X", "M", "centre", "Z", "R", "A", "Z"],
    ),
    (
        "orthorhombic",
        3,
        &["centre", "X", "S", "Y", "centre", "Z", "U", "R", "T", "Z"],
    ),
    (
        "hexagonal",
        3,
        &["centre", "M", "K", "centre", "A", "L", "H", "A"],
    ),
    ("chain", 1, &["centre", "edge"]),
];

/// Where nothing has a name: the middles of faces and the corner of the cell of reciprocal vectors.
const PLAIN: [&[[f64; 3]]; 2] = [
    &[
        [0.0; 3],
        [0.5, 0.0, 0.0],
        [0.5, 0.5, 0.0],
        [0.0, 0.5, 0.0],
        [0.0; 3],
    ],
    &[
        [0.0; 3],
        [0.5, 0.0, 0.0],
        [0.5, 0.5, 0.0],
        [0.0, 0.5, 0.0],
        [0.0; 3],
        [0.0, 0.0, 0.5],
        [0.5, 0.5, 0.5],
    ],
];

/// The usual path through the zone of a crystal's lattice.
#[must_use]
pub fn standard_path(crystal: &Crystal) -> Vec<PathStop> {
    let named = crystal.zone_points();
    let stop = |name: &&'static str| {
        let (name, k) = named.iter().find(|(known, _)| known == name)?;
        Some(PathStop {
            name: Some(*name),
            k: k.clone(),
        })
    };
    let kind = crystal.lattice_kind.as_deref().unwrap_or_default();
    let known = PATHS
        .iter()
        .find(|(word, dimension, _)| *word == kind && *dimension == crystal.dimension)
        .and_then(|(.., names)| names.iter().map(stop).collect::<Option<Vec<_>>>());
    known.unwrap_or_else(|| {
        let plain = PLAIN.get(crystal.dimension.saturating_sub(2));
        let stops = plain.copied().unwrap_or_default().iter();
        stops
            .map(|k| PathStop {
                name: k.iter().all(|x| *x == 0.0).then_some("centre"),
                k: k.iter().take(crystal.dimension).copied().collect(),
            })
            .collect()
    })
}

/// Bands along straight lines between corners.
pub(super) fn path(
    crystal: &Crystal,
    corners: &[Vec<f64>],
    per_segment: usize,
    cancelled: &Cancelled<'_>,
) -> Result<Vec<PathPoint>, Unsolved> {
    let field = ZoneField::new(crystal)?;
    let bands = crystal.bands.clamp(1, MOST_BANDS);
    with_zone(&field, |zone| {
        let budget = zone_budget(&field, bands, Effort::Fine, cancelled);
        let corners: Vec<[f64; 3]> = corners.iter().map(|k| kernel_k(k)).collect();
        let found = zone.waves.along(&corners, per_segment, bands, &budget);
        let points = found.map_err(unsolved)?.into_iter().map(|point| PathPoint {
            k: point.k.iter().take(crystal.dimension).copied().collect(),
            distance: point.distance / field.scale.length,
            energies: point
                .energies
                .iter()
                .take(bands)
                .map(|energy| energy * field.scale.energy)
                .collect(),
        });
        Ok(points.collect())
    })
}

/// The density of states of the lowest bands at evenly spaced energies, from just below all levels to just above.
pub(super) fn density_of_states(
    crystal: &Crystal,
    points: usize,
    cancelled: &Cancelled<'_>,
) -> Result<DensityOfStates, Unsolved> {
    let field = ZoneField::new(crystal)?;
    let bands = crystal.bands.clamp(1, MOST_BANDS);
    with_zone(&field, |zone| {
        let budget = zone_budget(&field, bands, Effort::Fine, cancelled);
        let states = zone
            .waves
            .sketched_states(bands, &budget)
            .map_err(unsolved)?;
        let (low, high) = states.range();
        let margin = 0.02 * (high - low);
        let step = (high - low + 2.0 * margin) / points.max(1) as f64;
        let each = f64::from(crystal.degeneracy) / field.scale.energy;
        let at = |index: usize| low - margin + step * index as f64;
        Ok((0..=points)
            .map(|index| {
                let energy = at(index);
                (energy * field.scale.energy, each * states.density(energy))
            })
            .collect())
    })
}
