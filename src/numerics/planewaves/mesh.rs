//! Uniform meshes over the zone, cut down by symmetry.

use super::basis::Waves;
use super::symmetry::rotate_real;
use super::{Budget, Error};
use rayon::prelude::*;

/// A mesh k = (m₁/M₁, m₂/M₂, m₃/M₃) and its points that symmetry does not make equal.
#[derive(Clone, Debug)]
pub(super) struct Mesh {
    /// Points along each reciprocal vector; 1 beyond the dimension.
    pub size: [usize; 3],
    /// The irreducible points.
    pub points: Vec<[f64; 3]>,
    /// The place in the full mesh of each irreducible point.
    pub places: Vec<usize>,
    /// How many points of the full mesh each stands for.
    pub weights: Vec<f64>,
    /// For every point of the full mesh, its irreducible one.
    pub of: Vec<usize>,
}

/// Numbers of points that hold the zone's halves, and mostly its thirds and quarters.
const SIZES: [usize; 11] = [2, 4, 6, 8, 12, 16, 24, 32, 36, 48, 72];

impl Waves<'_> {
    /// A mesh with about `most` points along the longest reciprocal vector, as fine along the others.
    pub(super) fn mesh(&self, most: usize) -> Mesh {
        let b = self.frame.reciprocal;
        let length = |i: usize| super::lattice::dot(b[i], b[i]).sqrt();
        let longest = (0..3).map(length).fold(0.0, f64::max);
        let wanted = |i: usize| {
            let share = (most as f64 * length(i) / longest).max(4.0) - 1e-6;
            SIZES
                .iter()
                .copied()
                .find(|size| *size as f64 >= share)
                .unwrap_or(most)
        };
        let d = self.frame.dimension;
        self.mesh_of(std::array::from_fn(|i| {
            if i < d { wanted(i).min(most.max(4)) } else { 1 }
        }))
    }

    /// A mesh of this size, made equal along all axes where symmetry exchanges axes of different size.
    pub(super) fn mesh_of(&self, size: [usize; 3]) -> Mesh {
        let d = self.frame.dimension;
        let fits = self.symmetry.operations.iter().all(|m| {
            (0..d).all(|i| (0..d).all(|j| (m[i][j] as i64 * size[i] as i64) % size[j] as i64 == 0))
        });
        let most = size.iter().copied().max().unwrap_or(1);
        let size = if fits {
            size
        } else {
            std::array::from_fn(|i| if i < d { most } else { 1 })
        };
        self.irreducible(size)
    }

    fn irreducible(&self, size: [usize; 3]) -> Mesh {
        let total = size[0] * size[1] * size[2];
        let mut mesh = Mesh {
            size,
            points: Vec::new(),
            places: Vec::new(),
            weights: Vec::new(),
            of: vec![usize::MAX; total],
        };
        for place in 0..total {
            if mesh.of[place] != usize::MAX {
                continue;
            }
            let k = mesh.point(place);
            let index = mesh.points.len();
            let mut weight = 0.0;
            for m in &self.symmetry.operations {
                let image = mesh.place(rotate_real(m, k));
                if mesh.of[image] == usize::MAX {
                    mesh.of[image] = index;
                    weight += 1.0;
                }
            }
            mesh.points.push(k);
            mesh.places.push(place);
            mesh.weights.push(weight);
        }
        mesh
    }

    /// The lowest levels at every irreducible point less what the cut leaves out, and for each band the largest error.
    pub(super) fn settled_on(
        &self,
        mesh: &Mesh,
        bands: usize,
        (cut, share): (f64, f64),
        budget: &Budget,
    ) -> Result<(Vec<Vec<f64>>, Vec<f64>), Error> {
        let solved: Vec<(Vec<f64>, Vec<f64>)> = mesh
            .points
            .par_iter()
            .map(|k| {
                let levels = self.solve_on(&self.basis(*k, cut), *k, bands, true, budget)?;
                let known: Vec<_> = self
                    .predict(&levels, cut)?
                    .iter()
                    .map(|p| p.known_to(share))
                    .collect();
                let mut energies: Vec<f64> = known.iter().map(|e| e.value).collect();
                energies.sort_by(f64::total_cmp);
                Ok((energies, known.iter().map(|e| e.error).collect()))
            })
            .collect::<Result<_, Error>>()?;
        let mut worst = vec![0.0_f64; bands];
        for (_, errors) in &solved {
            for (worst, error) in worst.iter_mut().zip(errors) {
                *worst = worst.max(*error);
            }
        }
        Ok((
            solved.into_iter().map(|(energies, _)| energies).collect(),
            worst,
        ))
    }

    /// The lowest levels at every irreducible point, each at its own basis; less what the cut leaves out, where that
    /// is cheap to know.
    pub(super) fn energies_on(
        &self,
        mesh: &Mesh,
        bands: usize,
        cut: f64,
        budget: &Budget,
    ) -> Result<Vec<Vec<f64>>, Error> {
        let known = self.few.is_some();
        mesh.points
            .par_iter()
            .map(|k| {
                let levels = self.solve_on(&self.basis(*k, cut), *k, bands, known, budget)?;
                if !known {
                    return Ok(levels.energies);
                }
                let mut energies: Vec<f64> = self
                    .predict(&levels, cut)?
                    .iter()
                    .map(|p| p.value)
                    .collect();
                energies.sort_by(f64::total_cmp);
                Ok(energies)
            })
            .collect()
    }
}

impl Mesh {
    /// Indices of a place.
    pub fn indices(&self, place: usize) -> [usize; 3] {
        let [_, b, c] = self.size;
        [place / (b * c), place / c % b, place % c]
    }

    /// The place of indices taken modulo the size.
    pub fn wrapped(&self, indices: [i64; 3]) -> usize {
        let [a, b, c]: [usize; 3] =
            std::array::from_fn(|i| indices[i].rem_euclid(self.size[i] as i64) as usize);
        (a * self.size[1] + b) * self.size[2] + c
    }

    /// The wave vector at a place, in (−1/2, 1/2].
    pub fn point(&self, place: usize) -> [f64; 3] {
        let indices = self.indices(place);
        std::array::from_fn(|i| {
            let (m, size) = (indices[i] as f64, self.size[i] as f64);
            if 2.0 * m > size {
                (m - size) / size
            } else {
                m / size
            }
        })
    }

    fn place(&self, k: [f64; 3]) -> usize {
        self.wrapped(std::array::from_fn(|i| {
            (k[i] * self.size[i] as f64).round() as i64
        }))
    }

    /// The irreducible points next to one, corners included.
    pub fn neighbours(&self, point: usize) -> Vec<usize> {
        let indices = self.indices(self.places[point]).map(|x| x as i64);
        let steps = |i: usize| if self.size[i] > 1 { -1..=1 } else { 0..=0 };
        let mut found = Vec::new();
        for a in steps(0) {
            for b in steps(1) {
                for c in steps(2) {
                    if [a, b, c] != [0; 3] {
                        found.push(
                            self.of[self.wrapped([indices[0] + a, indices[1] + b, indices[2] + c])],
                        );
                    }
                }
            }
        }
        found
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::numerics::planewaves::{Decay, Lattice, Potential};
    use nalgebra::Complex;

    /// Irreducible points of Γ-centred meshes counted by Burnside's lemma by hand for the square; the weights add up.
    #[test]
    fn symmetry_cuts_a_square_mesh_to_its_wedge() {
        let lattice = Lattice::new(&[[1.0, 0.0, 0.0], [0.0, 1.0, 0.0]]).expect("a square");
        let zero = |_: [i32; 3]| Complex::new(0.0, 0.0);
        let waves = Waves::new(
            &lattice,
            Potential {
                components: &zero,
                decay: Decay::Finite { radius: 0.0 },
            },
        )
        .expect("waves");
        let mesh = waves.mesh_of([8, 8, 1]);
        assert_eq!(mesh.points.len(), 15);
        assert_eq!(mesh.weights.iter().sum::<f64>(), 64.0);
        assert!(mesh.neighbours(0).iter().all(|n| *n != 0));
    }
}
