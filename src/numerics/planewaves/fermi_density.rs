//! How the Fermi level answers to the potential and to the lattice.
//!
//! The number of states below E_F is held, so that
//!
//! ```text
//! dE_F = Σ_T Σ_i w_Ti dE_i / Σ_T Σ_i w_Ti,     w_Ti = −∂n_T/∂e_i
//! ```
//!
//! over the corners i of all simplices T, n_T the share of T below E_F (`states.rs`): the level's own change averaged over
//! the Fermi surface by 1/|∇E|. What linear simplices leave is of second order in the mesh, and is taken off by comparing
//! two meshes.

use super::basis::Waves;
use super::density::Density;
use super::mesh::Mesh;
use super::states::{States, pulls};
use super::{Budget, Error};
use rayon::prelude::*;

impl Waves<'_> {
    /// The density with which the Fermi level at `levels` filled levels answers. For whole bands with a gap above there
    /// is no Fermi surface.
    ///
    /// # Errors
    /// `NotFinite` where `levels` is not positive; `Touching` without a Fermi surface; `BudgetSpent`; `Cancelled`.
    pub fn fermi_density(&self, levels: f64, budget: &Budget) -> Result<Density, Error> {
        if !(levels > 0.0 && levels < 1e4) {
            return Err(Error::NotFinite);
        }
        let mut bands = levels.ceil() as usize + 1;
        let most = [200.0, 250.0, 180.0][self.frame.dimension - 1];
        let [coarse, fine] = [[48, 96], [18, 36], [8, 12]][self.frame.dimension - 1];
        let cut = self.first_cut(bands + 2, most, budget)?;
        let lower = loop {
            match self.surface(&self.mesh(coarse), levels, bands, cut, budget)? {
                Some(lower) => break lower,
                None => bands += 2,
            }
        };
        let mesh = self.mesh(fine);
        let Some(mut found) = self.surface(&mesh, levels, bands, cut, budget)? else {
            return Ok(lower);
        };
        // As many points along an edge as there are, whatever was asked for.
        let longest = |mesh: &Mesh| mesh.size.iter().copied().max().unwrap_or(1) as f64;
        let ratio = longest(&mesh) / longest(&self.mesh(coarse));
        let share = 1.0 / (ratio * ratio - 1.0);
        if share.is_finite() {
            let finer = found.clone();
            found.add(&finer, share);
            found.add(&lower, -share);
        }
        Ok(found)
    }

    /// The same on one mesh; `None` where more bands reach the level.
    fn surface(
        &self,
        mesh: &Mesh,
        levels: f64,
        bands: usize,
        cut: f64,
        budget: &Budget,
    ) -> Result<Option<Density>, Error> {
        let energies: Vec<Vec<f64>> = mesh
            .points
            .par_iter()
            .map(|k| {
                let levels = self.solve_on(&self.basis(*k, cut), *k, bands, false, budget)?;
                Ok(levels.energies)
            })
            .collect::<Result<_, Error>>()?;
        let Some(weights) = self.surface_weights(mesh, &energies, levels, bands)? else {
            return Ok(None);
        };
        let tell = |point: usize| {
            let k = mesh.points[point];
            let weights = weights[point].clone();
            let reached = weights.iter().rposition(|w| *w != 0.0);
            // Points off the surface need not be solved again; two more levels make degenerate sets whole.
            let basis = match reached {
                Some(_) => self.basis(k, cut),
                None => self.basis(k, -1.0),
            };
            let bands = reached.map_or(1, |band| band + 3);
            let levels = self.solve_on(&basis, k, bands, true, budget)?;
            Ok(((), levels, weights))
        };
        Ok(Some(self.swept(mesh, [0; 3], cut, &tell)?.1))
    }

    /// The weight of each level at one of the points that each irreducible one stands for; their sum over the mesh is one.
    fn surface_weights(
        &self,
        mesh: &Mesh,
        energies: &[Vec<f64>],
        levels: f64,
        bands: usize,
    ) -> Result<Option<Vec<Vec<f64>>>, Error> {
        let shares = self.shares(mesh);
        let states = States::cut(self.frame.dimension, &shares, energies, bands)?;
        let level = states.fill(levels).level;
        // The first band left out may begin below the last one's top, not below its own bottom.
        let last = energies.iter().filter_map(|point| point.get(bands - 1));
        if level > last.copied().fold(f64::INFINITY, f64::min) {
            return Ok(None);
        }
        let mut weights = vec![vec![0.0; bands]; mesh.points.len()];
        let mut sum = 0.0;
        for (points, share) in &shares {
            for band in 0..bands {
                let mut corners: Vec<(f64, usize)> = points
                    .iter()
                    .map(|point| (energies[*point][band], *point))
                    .collect();
                corners.sort_by(|a, b| a.0.total_cmp(&b.0));
                let sorted: Vec<f64> = corners.iter().map(|(energy, _)| *energy).collect();
                for ((_, point), pull) in corners.iter().zip(pulls(&sorted, level)) {
                    weights[*point][band] += share * pull / mesh.weights[*point];
                    sum += share * pull;
                }
            }
        }
        if !(sum > 0.0 && sum.is_finite()) {
            return Err(Error::Touching);
        }
        weights.iter_mut().flatten().for_each(|w| *w /= sum);
        Ok(Some(weights))
    }
}
