//! States for a picture: a coarse mesh solved, a fine one between its points.

use super::basis::Waves;
use super::lattice::add;
use super::mesh::Mesh;
use super::nearby::Nearby;
use super::states::States;
use super::symmetry::rotate_real;
use super::{Budget, Error};
use rayon::prelude::*;

/// Levels solved beyond those wanted, among which the widest gap is looked for.
const FURTHER: usize = 8;
/// Points of the fine mesh, and those of them that are looked at.
const MOST: [usize; 2] = [40_000, 8_000];

impl Waves<'_> {
    /// States for a picture, as [`Waves::along`] has its levels.
    ///
    /// # Errors
    /// `NotFinite`, `BudgetSpent`, `Cancelled`.
    pub fn sketched_states(&self, bands: usize, budget: &Budget) -> Result<States, Error> {
        let cut = self.first_cut(bands, 200.0, budget)?;
        let most = [384, 12, 8][self.frame.dimension - 1];
        let coarse = self.mesh(most);
        let near = match self.frame.dimension {
            1 => None,
            _ => self.sketched_around(&coarse, bands, cut, budget)?,
        };
        let Some(near) = near else {
            return self.states(bands, [384, 48, 16][self.frame.dimension - 1], cut, budget);
        };
        let fine = self.finer(&coarse);
        let energies: Vec<Vec<f64>> = fine
            .points
            .par_iter()
            .map(|k| {
                let (point, way) = self.nearest(&coarse, *k);
                near[point].levels(way)
            })
            .collect();
        self.states_of(&fine, &energies, bands, Vec::new())
    }

    /// The neighbourhoods of a mesh's points; `None` where some has too few levels.
    fn sketched_around(
        &self,
        mesh: &Mesh,
        bands: usize,
        cut: f64,
        budget: &Budget,
    ) -> Result<Option<Vec<Nearby>>, Error> {
        let solved = self.solved_on(mesh, bands + FURTHER, cut, budget)?;
        if solved.iter().any(|(_, at)| at.energies.len() <= bands) {
            return Ok(None);
        }
        let lowest = solved.iter().map(|(_, at)| at.energies[0]);
        let highest = solved.iter().map(|(_, at)| at.energies[bands - 1]);
        let middle = 0.5 * (lowest.fold(f64::INFINITY, f64::min) + highest.fold(0.0, f64::max));
        solved
            .par_iter()
            .map(|(basis, at)| {
                let gap = |count: &usize| at.energies[*count] - at.energies[count - 1];
                let count = (bands..at.energies.len())
                    .max_by(|a, b| gap(a).total_cmp(&gap(b)))
                    .unwrap_or(bands);
                let near = middle.min(at.energies[count - 1]);
                self.nearby(basis, at, (0..count, near), cut, budget)
            })
            .collect()
    }

    /// A mesh with several times the points along every vector, as fine as is cheap.
    fn finer(&self, coarse: &Mesh) -> Mesh {
        let d = self.frame.dimension;
        let times = |factor: usize| -> [usize; 3] {
            std::array::from_fn(|i| if i < d { factor * coarse.size[i] } else { 1 })
        };
        let [points, looked_at] = MOST;
        let cheap = |factor: &usize| {
            let all: usize = times(*factor).iter().product();
            all <= points && all <= looked_at * self.operations()
        };
        let factor = [16, 8, 6, 4, 3, 2].into_iter().find(cheap).unwrap_or(1);
        self.mesh_of(times(factor))
    }

    /// The irreducible point of a mesh nearest to a wave vector or an image of it, and the way from there, on the axes.
    fn nearest(&self, mesh: &Mesh, k: [f64; 3]) -> (usize, [f64; 3]) {
        let d = self.frame.dimension;
        let base = k.map(|_| 0.0);
        let below: [i64; 3] = std::array::from_fn(|i| (k[i] * mesh.size[i] as f64).floor() as i64);
        let mut best = (f64::INFINITY, base, 0);
        for corner in 0..(1 << d) {
            let at: [i64; 3] =
                std::array::from_fn(|i| below[i] + i64::from(corner >> i & 1 == 1 && i < d));
            let way = std::array::from_fn(|i| k[i] - at[i] as f64 / mesh.size[i] as f64);
            let square = self.frame.square(way);
            if square < best.0 {
                best = (square, way, mesh.of[mesh.wrapped(at)]);
            }
        }
        let (_, way, point) = best;
        let place = add(k, way.map(|x| -x));
        let same = |m: &&super::symmetry::Rotation| {
            let image = rotate_real(m, place);
            (0..3).all(|i| {
                let gap = image[i] - mesh.points[point][i];
                (gap - gap.round()).abs() < 1e-6
            })
        };
        let turned = match self.symmetry.operations.iter().find(same) {
            Some(m) => rotate_real(m, way),
            None => way,
        };
        (point, self.frame.on_axes(self.frame.wave(turned)))
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::numerics::planewaves::{Decay, Lattice, Potential};
    use nalgebra::Complex;

    /// Levels between the points of the coarse mesh against solves there, up to where the highest band begins: a
    /// picture ends below that.
    #[test]
    fn sketches_are_as_good_as_a_picture_needs() {
        let lattice = Lattice::new(&[[0.0, 0.5, 0.5], [0.5, 0.0, 0.5], [0.5, 0.5, 0.0]]);
        let lattice = lattice.expect("a lattice");
        let components = |n: [i32; 3]| {
            let g = [-n[0] + n[1] + n[2], n[0] - n[1] + n[2], n[0] + n[1] - n[2]];
            match g.iter().map(|x| x * x).sum::<i32>() {
                3 => Complex::new(-9.0, 0.0),
                4 => Complex::new(4.0, 0.0),
                _ => Complex::new(0.0, 0.0),
            }
        };
        let radius = 4.0 * std::f64::consts::PI * 1.01;
        let potential = Potential {
            components: &components,
            decay: Decay::Finite { radius },
        };
        let waves = Waves::new(&lattice, potential).expect("waves");
        let budget = Budget::new(&|| false, 500, 10_000);
        let (bands, cut) = (8, waves.first_cut(8, 200.0, &budget).expect("a cut"));
        let mesh = waves.mesh(8);
        let near = waves.sketched_around(&mesh, bands, cut, &budget);
        let near = near.expect("no error").expect("neighbourhoods");
        let highest = |k: &[f64; 3]| near[waves.nearest(&mesh, *k).0].levels([0.0; 3])[bands - 1];
        let ends = mesh
            .points
            .iter()
            .map(highest)
            .fold(f64::INFINITY, f64::min);
        let mut worst = 0.0_f64;
        for step in 0..60 {
            let k = [0.618_034, 0.754_878, 0.569_840].map(|x| (x * f64::from(step)).fract() - 0.5);
            let (point, way) = waves.nearest(&mesh, k);
            let found = near[point].levels(way);
            let exact = waves
                .solve_on(&waves.basis(k, cut), k, bands, true, &budget)
                .expect("levels");
            let mut known: Vec<f64> = waves
                .predict(&exact, cut)
                .expect("no error")
                .iter()
                .map(|p| p.value)
                .collect();
            known.sort_by(f64::total_cmp);
            for (found, known) in found.iter().zip(&known).filter(|(_, known)| **known < ends) {
                worst = worst.max((found - known).abs() / waves.frame.unit());
            }
        }
        assert!(worst < 2e-3, "{worst} |b|²");
    }
}
