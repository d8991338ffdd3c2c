//! Hopping energies: the Fourier series of one band over the zone.
//!
//! ```text
//! E(k) = E₀ − 2 Σ J_R cos(k·R)   (R and −R once),     J_R = −(1/V_zone) ∫ E(k) cos(k·R) dk
//! ```
//!
//! The uniform mesh sums this with an error that falls exponentially where the band is apart from its neighbours, for
//! E(k) is then analytic and periodic.

use super::basis::Waves;
use super::density::Density;
use super::lattice::{dot, real};
use super::mesh::Mesh;
use super::settle::{Prediction, UNTRIED};
use super::{Budget, Error, Estimate};

/// The levels at each irreducible point, the largest error of the band, and what else is wanted.
type Solved<T> = (Vec<Vec<f64>>, f64, T);

/// What gives them on a mesh at a cut.
type OnMesh<'a, T> = dyn Fn(&Mesh, f64) -> Result<Solved<T>, Error> + 'a;

impl Waves<'_> {
    /// J_R of a band (counted from zero) for each R in cells of the primitive vectors.
    ///
    /// # Errors
    /// `Touching` where the band touches the one above or below at a mesh point; `NotFinite`; `BudgetSpent` where not
    /// even two meshes fit; `Cancelled`.
    pub fn hopping(
        &self,
        band: usize,
        cells: &[[i32; 3]],
        tolerance: f64,
        budget: &Budget,
    ) -> Result<Vec<Estimate>, Error> {
        let solve = |mesh: &Mesh, cut: f64| {
            let (energies, errors) = self.settled_on(mesh, band + 2, (cut, UNTRIED), budget)?;
            let error = errors.get(band).copied().unwrap_or(f64::INFINITY);
            Ok((energies, error, ()))
        };
        let (found, ()) = self.hopping_by(band, cells, tolerance, budget, &solve)?;
        Ok(found)
    }

    /// J_R of a band for one R, and how it answers: by the same coefficient of the levels' own answers.
    ///
    /// # Errors
    /// As [`Waves::hopping`].
    pub fn hopping_density(
        &self,
        band: usize,
        cell: [i32; 3],
        tolerance: f64,
        budget: &Budget,
    ) -> Result<(Estimate, Density), Error> {
        let solve = |mesh: &Mesh, cut: f64| {
            let share = -1.0 / mesh.of.len() as f64;
            let tell = |point: usize| {
                let k = mesh.points[point];
                let levels = self.solve_on(&self.basis(k, cut), k, band + 2, true, budget)?;
                let known: Vec<Estimate> = self
                    .predict(&levels, cut)?
                    .iter()
                    .map(Prediction::unjudged)
                    .collect();
                let mut weights = vec![0.0; band + 1];
                weights[band] = share;
                Ok((known, levels, weights))
            };
            let (known, density) = self.swept(mesh, cell, cut, &tell)?;
            let error = |point: &Vec<Estimate>| point.get(band).map_or(f64::INFINITY, |e| e.error);
            let worst = known.iter().map(error).fold(0.0, f64::max);
            let energies = known.into_iter().map(|point| {
                let mut energies: Vec<f64> = point.iter().map(|e| e.value).collect();
                energies.sort_by(f64::total_cmp);
                energies
            });
            Ok((energies.collect(), worst, density))
        };
        let (found, density) = self.hopping_by(band, &[cell], tolerance, budget, &solve)?;
        let first = found.first().copied().ok_or(Error::NotFinite)?;
        Ok((first, density))
    }

    /// Meshes refined until the coefficients settle; `solve` gives the levels on one, the error of the band, and
    /// what else is wanted of the last.
    fn hopping_by<T>(
        &self,
        band: usize,
        cells: &[[i32; 3]],
        tolerance: f64,
        budget: &Budget,
        solve: &OnMesh<'_, T>,
    ) -> Result<(Vec<Estimate>, T), Error> {
        if !(tolerance > 0.0 && tolerance.is_finite()) {
            return Err(Error::NotFinite);
        }
        let cut = self.cut_for_hopping(band, tolerance, budget)?;
        let sizes: &[usize] = match self.frame.dimension {
            1 => &[8, 16, 32, 64, 128, 256, 512],
            2 => &[6, 12, 24, 48, 96],
            _ => &[4, 8, 12, 24],
        };
        let d = self.frame.dimension;
        let mut last: Option<Vec<f64>> = None;
        let mut best: Option<(Vec<Estimate>, T)> = None;
        for size in sizes {
            let mesh = self.mesh_of(std::array::from_fn(|i| if i < d { *size } else { 1 }));
            let (energies, error, more) = match solve(&mesh, cut) {
                Err(Error::BudgetSpent) if best.is_some() => break,
                other => other?,
            };
            self.check_apart(&energies, band, error)?;
            let own: Vec<f64> = energies
                .iter()
                .map(|e| e.get(band).copied().unwrap_or(f64::NAN))
                .collect();
            let values: Vec<f64> = cells
                .iter()
                .map(|cell| fourier(&mesh, &own, *cell))
                .collect();
            if let Some(last) = &last {
                let found: Vec<Estimate> = values
                    .iter()
                    .zip(last)
                    .map(|(fine, coarse)| Estimate {
                        value: *fine,
                        error: (fine - coarse).abs() + error,
                    })
                    .collect();
                let settled = found.iter().all(|e| e.error <= tolerance);
                best = Some((found, more));
                if settled {
                    break;
                }
            }
            last = Some(values);
        }
        best.ok_or(Error::BudgetSpent)
    }

    fn cut_for_hopping(&self, band: usize, tolerance: f64, budget: &Budget) -> Result<f64, Error> {
        let largest = (budget.max_basis as f64 / 1.3)
            .min(600.0)
            .max(2.5 * (band + 2) as f64);
        let mut cut = self.first_cut(band + 2, f64::INFINITY, budget)?;
        loop {
            let k = self.inside([0.5, 0.25, 0.125]);
            let solved = self.solve_on(&self.basis(k, cut), k, band + 1, true, budget)?;
            let worst = self
                .predict(&solved, cut)?
                .iter()
                .map(|p| p.unjudged().error)
                .fold(0.0, f64::max);
            let larger = self.frame.cut_for(1.5 * self.frame.expected(cut));
            if worst <= 0.1 * tolerance || self.frame.expected(larger) > largest {
                return Ok(cut);
            }
            cut = larger;
        }
    }

    fn check_apart(&self, energies: &[Vec<f64>], band: usize, error: f64) -> Result<(), Error> {
        let apart = (2.0 * error).max(1e-9 * self.frame.unit());
        for levels in energies {
            let to = |a: usize, b: usize| match (levels.get(a), levels.get(b)) {
                (Some(a), Some(b)) => b - a,
                _ => f64::INFINITY,
            };
            if to(band, band + 1) <= apart || (band > 0 && to(band - 1, band) <= apart) {
                return Err(Error::Touching);
            }
        }
        Ok(())
    }
}

/// −∫ E(k) cos(2πk·R) over the zone by the mesh, R in cells.
fn fourier(mesh: &Mesh, energies: &[f64], cell: [i32; 3]) -> f64 {
    let sum: f64 = (0..mesh.of.len())
        .map(|place| {
            let turn = 2.0 * std::f64::consts::PI * dot(mesh.point(place), real(cell));
            energies[mesh.of[place]] * turn.cos()
        })
        .sum();
    -sum / mesh.of.len() as f64
}
