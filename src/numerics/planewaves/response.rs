//! How levels answer to the potential and to the lattice (Hellmann–Feynman).
//!
//! ```text
//! dE = Σ_G S_G dV(G),   S_G = Σ_G' c*_{G'+G} c_G'          (all G; S_{−G} = S_G*)
//! dE/dε_xy = −2 Σ |c_G|² q_x q_y,   q = k+G                (strain r → (1+ε) r, V(G) and the fractions of k held)
//! ```
//!
//! Within a degenerate set only the average over the set is meant; a set that is cut gives numbers without meaning.

use super::Levels;
use super::basis::Waves;
use super::lattice::{add, real};
use nalgebra::Complex;
use rustc_hash::FxHashMap;
use std::ops::Range;

impl Levels {
    /// The levels within `apart` of this one, chained from neighbour to neighbour.
    pub fn degenerate_with(&self, level: usize, apart: f64) -> Range<usize> {
        let close = |a: usize, b: usize| match (self.energies.get(a), self.energies.get(b)) {
            (Some(x), Some(y)) => (x - y).abs() <= apart,
            _ => false,
        };
        let (mut low, mut high) = (level, level + 1);
        while low > 0 && close(low - 1, low) {
            low -= 1;
        }
        while close(high - 1, high) {
            high += 1;
        }
        low..high
    }

    /// S_G averaged over a set of levels, for each G. Empty sets give zero.
    pub fn responses(&self, set: Range<usize>, waves: &[[i32; 3]]) -> Vec<Complex<f64>> {
        let places: FxHashMap<[i32; 3], usize> = self
            .waves
            .iter()
            .enumerate()
            .map(|(i, n)| (*n, i))
            .collect();
        let set = set.start..set.end.min(self.vectors.ncols());
        let share = 1.0 / (set.len().max(1) as f64);
        waves
            .iter()
            .map(|g| {
                let mut sum = Complex::new(0.0, 0.0);
                for (i, n) in self.waves.iter().enumerate() {
                    let Some(moved) = places.get(&[n[0] + g[0], n[1] + g[1], n[2] + g[2]]) else {
                        continue;
                    };
                    for level in set.clone() {
                        sum += self.vectors[(*moved, level)].conj() * self.vectors[(i, level)];
                    }
                }
                sum * share
            })
            .collect()
    }
}

impl Waves<'_> {
    /// dE/dε averaged over a set of levels, Cartesian.
    pub fn strain(&self, levels: &Levels, set: Range<usize>) -> [[f64; 3]; 3] {
        let set = set.start..set.end.min(levels.vectors.ncols());
        let share = 1.0 / (set.len().max(1) as f64);
        let mut tensor = [[0.0; 3]; 3];
        for (i, n) in levels.waves.iter().enumerate() {
            let q = self.frame.wave(add(levels.k, real(*n)));
            let weight: f64 = set
                .clone()
                .map(|level| levels.vectors[(i, level)].norm_sqr())
                .sum::<f64>()
                * share;
            for x in 0..3 {
                for y in 0..3 {
                    tensor[x][y] -= 2.0 * weight * q[x] * q[y];
                }
            }
        }
        tensor
    }
}
