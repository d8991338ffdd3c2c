//! Bands along a path, for pictures.

use super::basis::Waves;
use super::levels::FARTHEST;
use super::{Budget, Error};
use rayon::prelude::*;

/// One point of a path.
#[derive(Clone, Debug, PartialEq)]
pub struct PathPoint {
    /// In fractions of the primitive reciprocal vectors.
    pub k: [f64; 3],
    /// The Cartesian length of the path up to here.
    pub distance: f64,
    /// The levels, rising.
    pub energies: Vec<f64>,
}

impl Waves<'_> {
    /// The lowest `bands` levels along the straight lines between these points, `per_segment` steps each, at the
    /// accuracy of a picture (about a thousandth of the largest |bᵢ|²).
    ///
    /// # Errors
    /// `NotFinite`, `BudgetSpent`, `Cancelled`.
    pub fn along(
        &self,
        points: &[[f64; 3]],
        per_segment: usize,
        bands: usize,
        budget: &Budget,
    ) -> Result<Vec<PathPoint>, Error> {
        let far = |x: &f64| !x.is_finite() || x.abs() > FARTHEST;
        if points.iter().flatten().any(far) || per_segment == 0 || bands == 0 {
            return Err(Error::NotFinite);
        }
        let stops = self.stops(points, per_segment);
        let cut = self.first_cut(bands, 200.0, budget)?;
        stops
            .par_iter()
            .map(|(k, distance)| {
                let levels = self.solve_on(&self.basis(*k, cut), *k, bands, true, budget)?;
                let mut energies: Vec<f64> = self
                    .predict(&levels, cut)?
                    .iter()
                    .map(|p| p.value)
                    .collect();
                energies.sort_by(f64::total_cmp);
                Ok(PathPoint {
                    k: *k,
                    distance: *distance,
                    energies,
                })
            })
            .collect()
    }

    fn stops(&self, points: &[[f64; 3]], per_segment: usize) -> Vec<([f64; 3], f64)> {
        let mut stops = Vec::new();
        let mut distance = 0.0;
        for (index, end) in points.iter().enumerate() {
            let end = self.inside(*end);
            let Some(start) = index
                .checked_sub(1)
                .map(|before| self.inside(points[before]))
            else {
                stops.push((end, 0.0));
                continue;
            };
            let way: [f64; 3] = std::array::from_fn(|i| end[i] - start[i]);
            let length = self.frame.square(way).sqrt();
            for step in 1..=per_segment {
                let share = step as f64 / per_segment as f64;
                stops.push((
                    std::array::from_fn(|i| start[i] + share * way[i]),
                    distance + share * length,
                ));
            }
            distance += length;
        }
        stops
    }
}
