//! Weighted densities: how a sum of levels answers to the potential and to the lattice (Hellmann–Feynman).
//!
//! For Q = Σ w E over any levels with weights w,
//!
//! ```text
//! dQ = Σ_ab K_ab d(b_a·b_b) + Σ_G S_G dV(G)        (all G; S_{−G} = S_G*)
//! K_ab = Σ w Σ_G |c_G|² (k+G)_a (k+G)_b,   S_G = Σ w Σ_G' c*_{G'+G} c_G'
//! ```
//!
//! with k+G in fractions of the reciprocal vectors, held. The density in space is ρ(r) = Σ_G S_G e^{−iG·r}. A level at Mk,
//! M an operation with shift t (`symmetry.rs`), has S_{Mn} = S_n e^{2πi (Mn)·t} and K turned alike; time reversal
//! leaves both as they are.
//!
//! Within a degenerate set only the average over the set is meant.

use super::basis::{Waves, extent};
use super::lattice::{add, dot, real};
use super::samples::fourier;
use super::slopes::Tensor;
use super::symmetry::{Rotation, rotate};
use super::{Error, Levels};
use nalgebra::Complex;
use std::f64::consts::PI;
use std::ops::Range;

/// See the module.
#[derive(Clone, Debug)]
pub struct Density {
    half: [i32; 3],
    values: Vec<Complex<f64>>,
    /// K, in fractions of the reciprocal vectors; zero beyond the dimension.
    pub kinetic: Tensor,
}

/// Components kept of one density at most: beyond this they take a gigabyte.
const MOST: usize = 1 << 26;

impl Density {
    /// Nothing, with room for indices up to `half`.
    pub(super) fn empty(half: [i32; 3]) -> Result<Self, Error> {
        let total = half
            .map(|h| 2 * h.unsigned_abs() as usize + 1)
            .iter()
            .fold(1_usize, |total, size| total.saturating_mul(*size));
        if total > MOST {
            return Err(Error::BudgetSpent);
        }
        Ok(Self {
            half,
            values: vec![Complex::new(0.0, 0.0); total],
            kinetic: [[0.0; 3]; 3],
        })
    }

    fn offset(&self, n: [i32; 3]) -> isize {
        let [_, b, c] = self.half.map(|h| 2 * h as isize + 1);
        (n[0] as isize * b + n[1] as isize) * c + n[2] as isize
    }

    /// S_G for one of each pair ±G, G by its indices: those that are not zero.
    pub fn components(&self) -> Vec<([i32; 3], Complex<f64>)> {
        let [a, b, c] = self.half;
        let centre = self.offset(self.half);
        let mut found = Vec::new();
        for x in 0..=a {
            for y in -b..=b {
                for z in -c..=c {
                    let n = [x, y, z];
                    let value = self.values[(centre + self.offset(n)) as usize];
                    if n >= [0; 3] && value != Complex::new(0.0, 0.0) {
                        found.push((n, value));
                    }
                }
            }
        }
        found
    }

    /// ρ at the points m/size of a cell of dimension `d`, the last index running fastest.
    pub fn on_grid(&self, d: usize, size: usize) -> Vec<f64> {
        let mut grid = vec![Complex::new(0.0, 0.0); size.pow(d as u32)];
        let place = |n: [i32; 3]| {
            n[..d]
                .iter()
                .fold(0, |at, x| at * size + x.rem_euclid(size as i32) as usize)
        };
        for (n, value) in self.components() {
            grid[place(n)] += value;
            if n != [0; 3] {
                grid[place(n.map(|x| -x))] += value.conj();
            }
        }
        fourier(grid, d, size).iter().map(|x| x.re).collect()
    }

    /// Adds a multiple of another with the same room.
    pub(super) fn add(&mut self, other: &Self, factor: f64) {
        for (sum, value) in self.values.iter_mut().zip(&other.values) {
            *sum += factor * value;
        }
        self.add_kinetic(&other.kinetic, factor);
    }

    fn add_kinetic(&mut self, kinetic: &Tensor, factor: f64) {
        for (sum, value) in self
            .kinetic
            .iter_mut()
            .flatten()
            .zip(kinetic.iter().flatten())
        {
            *sum += factor * value;
        }
    }

    /// Adds what another becomes under an operation with a shift.
    pub(super) fn add_turned(&mut self, other: &Self, m: &Rotation, shift: [f64; 3], factor: f64) {
        let centre = self.offset(self.half);
        for (n, value) in other.components() {
            let image = rotate(m, n);
            if (0..3).any(|i| image[i].abs() > self.half[i]) {
                continue;
            }
            let turned = factor * value * Complex::cis(2.0 * PI * dot(real(image), shift));
            let at = self.offset(image);
            self.values[(centre + at) as usize] += turned;
            if n != [0; 3] {
                self.values[(centre - at) as usize] += turned.conj();
            }
        }
        let k = &other.kinetic;
        let entry = |a: usize, b: usize| -> f64 {
            let pairs = (0..3).flat_map(|i| (0..3).map(move |j| (i, j)));
            pairs
                .map(|(i, j)| f64::from(m[a][i]) * k[i][j] * f64::from(m[b][j]))
                .sum()
        };
        let turned = std::array::from_fn(|a| std::array::from_fn(|b| entry(a, b)));
        self.add_kinetic(&turned, factor);
    }

    /// S_{n−m} += weight·a*_n b_m for all pairs of waves.
    pub(super) fn add_pair(
        &mut self,
        waves: &[[i32; 3]],
        a: &[Complex<f64>],
        b: &[Complex<f64>],
        weight: f64,
    ) {
        let centre = self.offset(self.half);
        let places: Vec<isize> = waves.iter().map(|n| self.offset(*n)).collect();
        for (i, left) in a.iter().enumerate() {
            let left = weight * left.conj();
            let base = centre + places[i];
            for (j, right) in b.iter().enumerate() {
                self.values[(base - places[j]) as usize] += left * right;
            }
        }
    }

    /// Adds a level: its S and its K.
    fn add_level(&mut self, levels: &Levels, level: usize, weight: f64) {
        let c = levels.coefficients(level);
        self.add_pair(&levels.waves, &c, &c, weight);
        for (n, c) in levels.waves.iter().zip(&c) {
            let q = add(levels.k, real(*n));
            let part = weight * c.norm_sqr();
            for a in 0..3 {
                for b in 0..3 {
                    self.kinetic[a][b] += part * q[a] * q[b];
                }
            }
        }
    }
}

impl Levels {
    /// The density averaged over a set of levels.
    ///
    /// # Errors
    /// `BudgetSpent` where it would be too large.
    pub fn density(&self, set: Range<usize>) -> Result<Density, Error> {
        let set = set.start..set.end.min(self.vectors.ncols());
        let share = 1.0 / set.len().max(1) as f64;
        let mut weights = vec![0.0; set.end];
        weights[set].fill(share);
        self.weighted(&weights, extent(&self.waves))
    }

    /// The density with these weights, in a room of this size.
    pub(super) fn weighted(&self, weights: &[f64], half: [i32; 3]) -> Result<Density, Error> {
        let mut density = Density::empty(half)?;
        for (level, weight) in weights.iter().enumerate().take(self.vectors.ncols()) {
            if *weight != 0.0 {
                density.add_level(self, level, *weight);
            }
        }
        Ok(density)
    }
}

impl Waves<'_> {
    /// Room for the differences of all waves |k+G|² ≤ cut.
    pub(super) fn room(&self, cut: f64) -> [i32; 3] {
        std::array::from_fn(|i| {
            let length = dot(self.frame.direct[i], self.frame.direct[i]).sqrt();
            (cut.max(0.0).sqrt() * length / PI * (1.0 + 1e-6)).floor() as i32
        })
    }
}
