//! Hopping energies: the Fourier series of one band over the zone.
//!
//! ```text
//! E(k) = E₀ − 2 Σ J_R cos(k·R)   (R and −R once),     J_R = −(1/V_zone) ∫ E(k) cos(k·R) dk
//! ```
//!
//! The uniform mesh sums this with an error that falls exponentially where the band is apart from its neighbours, for
//! E(k) is then analytic and periodic.

use super::basis::Waves;
use super::lattice::{dot, real};
use super::mesh::Mesh;
use super::settle::UNTRIED;
use super::{Budget, Error, Estimate};

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
        let mut best: Option<Vec<Estimate>> = None;
        for size in sizes {
            let mesh = self.mesh_of(std::array::from_fn(|i| if i < d { *size } else { 1 }));
            let (energies, errors) = match self.settled_on(&mesh, band + 2, (cut, UNTRIED), budget)
            {
                Err(Error::BudgetSpent) if best.is_some() => break,
                other => other?,
            };
            let error = errors.get(band).copied().unwrap_or(f64::INFINITY);
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
                best = Some(found);
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
