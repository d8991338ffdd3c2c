//! Weighted densities over the whole zone, from the points of a mesh that symmetry does not make equal.
//!
//! With weights w_n(k)·cos(2πk·R), w the same at all k that symmetry makes equal,
//!
//! ```text
//! Σ_k Σ_n w_n(k) cos(2πk·R) ρ_nk = Σ_k' (star of k')/|P| Σ_M cos(2πk'·MᵀR) M[ Σ_n w_n(k') ρ_nk' ]
//! ```
//!
//! k over the full mesh, k' over its irreducible points, M over all operations P. Those with one MᵀR (up to sign) are
//! gathered before they are turned. Levels are grouped where they coincide, for only the mean over a degenerate set means
//! anything.

use super::basis::Waves;
use super::density::Density;
use super::lattice::{dot, real};
use super::mesh::Mesh;
use super::symmetry::Rotation;
use super::{Error, Levels};
use rayon::prelude::*;
use std::f64::consts::PI;

/// What is told of one irreducible point: something of its own, its levels, and the weight of each level.
pub(super) type Told<T> = (T, Levels, Vec<f64>);

/// Points summed one after another: the order of sums is the same whatever the number of threads.
const TOGETHER: usize = 8;
/// Levels this close, in the natural unit, share their weights.
const CLOSE: f64 = 1e-7;

/// An R′ = MᵀR and the operations that lead to it.
struct Class {
    cell: [i32; 3],
    operations: Vec<usize>,
}

impl Waves<'_> {
    /// The sum over the full mesh; `tell` is asked once for each irreducible point, whose bases lie within `cut`.
    pub(super) fn swept<T: Send>(
        &self,
        mesh: &Mesh,
        cell: [i32; 3],
        cut: f64,
        tell: &(dyn Fn(usize) -> Result<Told<T>, Error> + Sync),
    ) -> Result<(Vec<T>, Density), Error> {
        let classes = self.classes(cell);
        let room = self.room(cut);
        let indices: Vec<usize> = (0..mesh.points.len()).collect();
        let parts: Vec<(Vec<T>, Vec<Density>)> = indices
            .par_chunks(TOGETHER)
            .map(|chunk| {
                let mut sums = vec![Density::empty(room)?; classes.len()];
                let mut own = Vec::with_capacity(chunk.len());
                for index in chunk {
                    let (told, levels, weights) = tell(*index)?;
                    own.push(told);
                    if weights.iter().all(|w| *w == 0.0) {
                        continue;
                    }
                    let weights = levels.shared(&weights, CLOSE * self.frame.unit());
                    let density = levels.weighted(&weights, room)?;
                    for (sum, class) in sums.iter_mut().zip(&classes) {
                        let turn = 2.0 * PI * dot(mesh.points[*index], real(class.cell));
                        sum.add(&density, mesh.weights[*index] * turn.cos());
                    }
                }
                Ok((own, sums))
            })
            .collect::<Result<_, Error>>()?;
        let mut own = Vec::with_capacity(mesh.points.len());
        let mut sums = vec![Density::empty(room)?; classes.len()];
        for (told, densities) in parts {
            own.extend(told);
            for (sum, density) in sums.iter_mut().zip(&densities) {
                sum.add(density, 1.0);
            }
        }
        Ok((own, self.turned(&classes, &sums, room)?))
    }

    fn classes(&self, cell: [i32; 3]) -> Vec<Class> {
        let mut classes: Vec<Class> = Vec::new();
        for (index, m) in self.symmetry.operations.iter().enumerate() {
            let image = transposed(m, cell);
            let opposite = image.map(|x| -x);
            match classes
                .iter_mut()
                .find(|class| class.cell == image || class.cell == opposite)
            {
                Some(class) => class.operations.push(index),
                None => classes.push(Class {
                    cell: image,
                    operations: vec![index],
                }),
            }
        }
        classes
    }

    /// Each class's sum turned by its operations.
    fn turned(
        &self,
        classes: &[Class],
        sums: &[Density],
        room: [i32; 3],
    ) -> Result<Density, Error> {
        let share = 1.0 / self.symmetry.operations.len() as f64;
        let mut total = Density::empty(room)?;
        for (class, sum) in classes.iter().zip(sums) {
            for index in &class.operations {
                let (m, shift) = &self.symmetry.in_space[*index];
                total.add_turned(sum, m, *shift, share);
            }
        }
        Ok(total)
    }
}

fn transposed(m: &Rotation, cell: [i32; 3]) -> [i32; 3] {
    std::array::from_fn(|j| (0..3).map(|i| m[i][j] * cell[i]).sum())
}

impl Levels {
    /// These weights, each shared among the levels that coincide.
    fn shared(&self, weights: &[f64], apart: f64) -> Vec<f64> {
        let mut shared = vec![0.0; self.energies.len()];
        let mut level = 0;
        while level < self.energies.len() {
            let set = self.degenerate_with(level, apart);
            let sum: f64 = set.clone().map(|i| weights.get(i).unwrap_or(&0.0)).sum();
            shared[set.clone()].fill(sum / set.len() as f64);
            level = set.end;
        }
        shared
    }
}
