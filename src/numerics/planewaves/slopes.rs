//! First and second derivatives of a level with respect to k, on the axes of the lattice.
//!
//! With p = ∂H/∂k = 2(k+G), on a basis that does not move with k,
//!
//! ```text
//! ∂E/∂kₓ      = ⟨c|pₓ|c⟩                                             (Hellmann–Feynman)
//! ∂²E/∂kₓ∂k_y = 2δₓ_y + 2 Re⟨pₓc|u_y⟩,   (H − E) u_y = −(1 − |c⟩⟨c|) p_y c   (k·p)
//! ```
//!
//! The linear system is bordered with c, so that it is regular exactly where the level is simple. Both are
//! meaningless within a degenerate set, and the caller keeps away from one.

use super::basis::Waves;
use super::eigen::Scalar;
use super::lattice::{add, real};
use super::levels::Basis;
use super::{Budget, Error, Levels};
use faer::Mat;
use faer::linalg::solvers::Solve;
use nalgebra::Complex;

/// A symmetric matrix on the axes; zero beyond the dimension.
pub(super) type Tensor = [[f64; 3]; 3];

impl Waves<'_> {
    /// p = 2(k+G) on the axes, for every wave.
    pub(super) fn momenta(&self, levels: &Levels) -> Vec<[f64; 3]> {
        let at = |n: &[i32; 3]| {
            self.frame
                .on_axes(self.frame.wave(add(levels.k, real(*n))))
                .map(|x| 2.0 * x)
        };
        levels.waves.iter().map(at).collect()
    }

    /// dE/dk of one level.
    pub(super) fn velocity(&self, levels: &Levels, level: usize) -> [f64; 3] {
        let mut sum = [0.0; 3];
        for (i, p) in self.momenta(levels).iter().enumerate() {
            let weight = levels.vectors[(i, level)].norm_sqr();
            for x in 0..3 {
                sum[x] += weight * p[x];
            }
        }
        sum
    }

    /// How fast levels that cross at this point part: Σ over their pairs of Re vₓ v_y*, with v = ⟨a|p|b⟩ less its mean
    /// over the diagonal. Where it vanishes along a direction they stay together, to first order.
    pub(super) fn parting(&self, levels: &Levels, group: std::ops::Range<usize>) -> Tensor {
        let momenta = self.momenta(levels);
        let pairs = |a: usize, b: usize| -> [Complex<f64>; 3] {
            let mut sum = [Complex::new(0.0, 0.0); 3];
            for (i, p) in momenta.iter().enumerate() {
                let weight = levels.vectors[(i, a)].conj() * levels.vectors[(i, b)];
                for x in 0..3 {
                    sum[x] += weight * p[x];
                }
            }
            sum
        };
        let size = group.len().max(1) as f64;
        let mut mean = [Complex::new(0.0, 0.0); 3];
        for a in group.clone() {
            let own = pairs(a, a);
            for x in 0..3 {
                mean[x] += own[x] / size;
            }
        }
        let mut tensor = [[0.0; 3]; 3];
        for a in group.clone() {
            for b in group.clone() {
                let mut v = pairs(a, b);
                if a == b {
                    v = std::array::from_fn(|x| v[x] - mean[x]);
                }
                for x in 0..3 {
                    for y in 0..3 {
                        tensor[x][y] += (v[x] * v[y].conj()).re;
                    }
                }
            }
        }
        tensor
    }

    /// d²E/dk² of one level.
    pub(super) fn curvature(
        &self,
        basis: &Basis,
        levels: &Levels,
        level: usize,
        budget: &Budget,
    ) -> Result<Tensor, Error> {
        budget.spend(levels.waves.len())?;
        if self.is_real() {
            self.curvature_as::<f64>(basis, levels, level)
        } else {
            self.curvature_as::<Complex<f64>>(basis, levels, level)
        }
    }

    fn curvature_as<T: Scalar>(
        &self,
        basis: &Basis,
        levels: &Levels,
        level: usize,
    ) -> Result<Tensor, Error> {
        let d = self.frame.dimension;
        let (bordered, c) = self.bordered::<T>(levels, level, basis.reach)?;
        let momenta = self.momenta(levels);
        let n = c.len();
        // The border takes up the part of p c along c.
        let right = Mat::<T>::from_fn(n + 1, d, |i, x| {
            T::from_complex(if i < n { -c[i] * momenta[i][x] } else { zero() })
        });
        let solved = bordered.partial_piv_lu().solve(&right);
        let mut tensor = [[0.0; 3]; 3];
        for x in 0..d {
            for y in 0..d {
                let sum: f64 = (0..n)
                    .map(|i| (c[i].conj() * momenta[i][x] * solved[(i, y)].to_complex()).re)
                    .sum();
                tensor[x][y] = 2.0 * sum + if x == y { 2.0 } else { 0.0 };
            }
        }
        let symmetric =
            std::array::from_fn(|x| std::array::from_fn(|y| 0.5 * (tensor[x][y] + tensor[y][x])));
        if symmetric.iter().flatten().all(|x: &f64| x.is_finite()) {
            Ok(symmetric)
        } else {
            Err(Error::NotFinite)
        }
    }
}

impl Waves<'_> {
    /// H − E bordered with c, and c, both in the gauge of the matrices; `reach` bounds the differences of the waves.
    pub(super) fn bordered<T: Scalar>(
        &self,
        levels: &Levels,
        level: usize,
        reach: f64,
    ) -> Result<(Mat<T>, Vec<Complex<f64>>), Error> {
        let n = levels.waves.len();
        let matrix = self.matrix::<T>(&levels.waves, levels.k, reach)?;
        let c: Vec<Complex<f64>> = (0..n)
            .map(|i| levels.vectors[(i, level)] * self.gauge(levels.waves[i]).conj())
            .collect();
        let energy = Complex::new(levels.energies[level], 0.0);
        let bordered = Mat::<T>::from_fn(n + 1, n + 1, |i, j| {
            T::from_complex(match (i < n, j < n) {
                (true, true) => matrix[(i, j)].to_complex() - if i == j { energy } else { zero() },
                (true, false) => c[i],
                (false, true) => c[j].conj(),
                (false, false) => zero(),
            })
        });
        Ok((bordered, c))
    }
}

fn zero() -> Complex<f64> {
    Complex::new(0.0, 0.0)
}

/// Eigenvalues and vectors (rows) of the leading block of a symmetric tensor.
pub(super) fn principal(tensor: &Tensor, dimension: usize) -> Vec<(f64, [f64; 3])> {
    let matrix = nalgebra::DMatrix::from_fn(dimension, dimension, |i, j| tensor[i][j]);
    let Some(eigen) = nalgebra::SymmetricEigen::try_new(matrix, f64::EPSILON, 300) else {
        return Vec::new();
    };
    (0..dimension)
        .map(|j| {
            let vector = std::array::from_fn(|i| {
                if i < dimension {
                    eigen.eigenvectors[(i, j)]
                } else {
                    0.0
                }
            });
            (eigen.eigenvalues[j], vector)
        })
        .collect()
}
