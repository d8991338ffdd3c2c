//! How the mass at the extremum of a simple level answers to the potential and to the lattice.
//!
//! With T = ∂²E/∂k∂k at an extremum, W = T⁻¹, and everything at fixed fractions of k,
//!
//! ```text
//! d ln|det T| = tr W dT + (what the metric does),   dT_xy = ∂_x∂_y dE + Σ_z T_xyz dk_z,   dk = −W ∂(dE)
//!             = Σ_xy W_xy ∂_x∂_y dE + Σ_z g_z ∂_z dE,   g_z = −Σ W_xy T_xye W_ez
//! ```
//!
//! and dE is the level's own answer (`density.rs`), whose derivatives by k follow from those of its state. On a basis that
//! does not move with k, p = ∂H/∂k = 2(k+G), and with ⟨c|u⟩ = 0, to keep the norm ⟨c|v_xy⟩ = −Re⟨u_x|u_y⟩,
//!
//! ```text
//! (H − E) u_x  = −(p_x − E_x) c
//! (H − E) v_xy = −(p_x − E_x) u_y − (p_y − E_y) u_x − (2δ_xy − E_xy) c
//! E_xyz = 2 Re[ ⟨u_x|p_y − E_y|u_z⟩ + ⟨u_y|p_z − E_z|u_x⟩ + ⟨u_z|p_x − E_x|u_y⟩ ]        (Wigner's 2n+1)
//! ```
//!
//! Only W-weighted sums are needed, so v is solved for once. Meaningless within a degenerate set.

use super::basis::{Waves, extent};
use super::density::Density;
use super::eigen::Scalar;
use super::lattice::{add, real};
use super::slopes::Tensor;
use super::{Budget, Error, Levels};
use faer::Mat;
use faer::linalg::solvers::Solve;
use nalgebra::Complex;

/// A column of complex numbers.
type Column = Vec<Complex<f64>>;

/// A state and its derivatives by k.
struct Answer {
    c: Column,
    /// u_x for each axis.
    first: Vec<Column>,
    /// Σ W_xy v_xy.
    second: Column,
    /// W.
    inverse: Tensor,
    /// g.
    drift: [f64; 3],
}

impl Waves<'_> {
    /// The density with which ln|det ∂²E/∂k∂k| of a simple level answers at its extremum, k in fractions: the levels
    /// must have been solved there. An energy less than that of a level: its unit is one over energy.
    ///
    /// # Errors
    /// `Touching` where a curvature vanishes; `NotFinite`; `BudgetSpent`; `Cancelled`.
    pub fn mass_density(
        &self,
        levels: &Levels,
        level: usize,
        budget: &Budget,
    ) -> Result<Density, Error> {
        if level >= levels.vectors.ncols() {
            return Err(Error::NotFinite);
        }
        budget.spend(levels.waves.len())?;
        let answer = if self.is_real() {
            self.answer::<f64>(levels, level)?
        } else {
            self.answer::<Complex<f64>>(levels, level)?
        };
        self.gathered(levels, &answer)
    }

    fn answer<T: Scalar>(&self, levels: &Levels, level: usize) -> Result<Answer, Error> {
        let d = self.frame.dimension;
        let squares = levels
            .waves
            .iter()
            .map(|n| self.frame.square(add(levels.k, real(*n))));
        let reach = 2.0 * squares.fold(0.0, f64::max).sqrt() * (1.0 + 1e-9);
        let (bordered, c) = self.bordered::<T>(levels, level, reach)?;
        let momenta = self.momenta(levels);
        let n = c.len();
        let lu = bordered.partial_piv_lu();
        let solve = |right: &Column| -> Column {
            let right = Mat::<T>::from_fn(n + 1, 1, |i, _| T::from_complex(right[i]));
            let solved = lu.solve(&right);
            (0..n).map(|i| solved[(i, 0)].to_complex()).collect()
        };
        let velocity = self.velocity(levels, level);
        // (p_x − E_x) applied.
        let pushed = |x: usize, state: &Column| -> Column {
            let pairs = state.iter().zip(&momenta);
            pairs.map(|(s, p)| (p[x] - velocity[x]) * s).collect()
        };
        let first: Vec<Column> = (0..d)
            .map(|x| {
                let mut right: Column = pushed(x, &c).iter().map(|z| -z).collect();
                right.push(Complex::new(0.0, 0.0));
                solve(&right)
            })
            .collect();
        let delta = |x: usize, y: usize| if x == y { 2.0 } else { 0.0 };
        let bend = |x: usize, y: usize| delta(x, y) + 2.0 * overlap(&pushed(x, &c), &first[y]);
        let curvature: Vec<Vec<f64>> = (0..d)
            .map(|x| (0..d).map(|y| 0.5 * (bend(x, y) + bend(y, x))).collect())
            .collect();
        let inverse = inverse_of(&curvature)?;
        let third = |x: usize, y: usize, z: usize| {
            2.0 * (overlap(&first[x], &pushed(y, &first[z]))
                + overlap(&first[y], &pushed(z, &first[x]))
                + overlap(&first[z], &pushed(x, &first[y])))
        };
        let drift = std::array::from_fn(|z| {
            let mut sum = 0.0;
            for (x, y, e) in triples(d) {
                sum -= inverse[x][y] * third(x, y, e) * inverse[e][z];
            }
            sum
        });
        let mut right = vec![Complex::new(0.0, 0.0); n + 1];
        for (x, y) in pairs(d) {
            let weight = inverse[x][y];
            let left = delta(x, y) - curvature[x][y];
            for (i, pushed) in pushed(x, &first[y]).iter().enumerate() {
                right[i] -= weight * (2.0 * pushed + left * c[i]);
            }
            right[n] -= weight * overlap(&first[x], &first[y]);
        }
        let second = solve(&right);
        Ok(Answer {
            c,
            first,
            second,
            inverse,
            drift,
        })
    }

    /// Σ W_xy ∂_x∂_y + Σ g_x ∂_x of the level's density.
    fn gathered(&self, levels: &Levels, answer: &Answer) -> Result<Density, Error> {
        let d = self.frame.dimension;
        let gauged = |column: &Column| -> Column {
            let pairs = column.iter().zip(&levels.waves);
            pairs.map(|(z, n)| z * self.gauge(*n)).collect()
        };
        let c = gauged(&answer.c);
        let first: Vec<Column> = answer.first.iter().map(gauged).collect();
        let mut moved = gauged(&answer.second);
        for (x, u) in first.iter().enumerate() {
            for (sum, u) in moved.iter_mut().zip(u) {
                *sum += answer.drift[x] * u;
            }
        }
        let mut density = Density::empty(extent(&levels.waves))?;
        density.add_pair(&levels.waves, &moved, &c, 1.0);
        density.add_pair(&levels.waves, &c, &moved, 1.0);
        for (x, y) in pairs(d) {
            let weight = 2.0 * answer.inverse[x][y];
            density.add_pair(&levels.waves, &first[x], &first[y], weight);
        }
        // How the fractions of k+G move along each axis.
        let ways: Vec<[f64; 3]> = (0..d)
            .map(|x| {
                self.frame
                    .off_axes(std::array::from_fn(|i| f64::from(u8::from(i == x))))
            })
            .collect();
        for (i, n) in levels.waves.iter().enumerate() {
            let q = add(levels.k, real(*n));
            let held = c[i].norm_sqr();
            let rise: Vec<f64> = first
                .iter()
                .map(|u| 2.0 * (c[i].conj() * u[i]).re)
                .collect();
            let mut bent = 2.0 * (c[i].conj() * moved[i]).re;
            for (x, y) in pairs(d) {
                bent += 2.0 * answer.inverse[x][y] * (first[x][i].conj() * first[y][i]).re;
            }
            for (a, b) in pairs(d) {
                let turn = |way: &[f64; 3]| way[a] * q[b] + q[a] * way[b];
                let mut sum = bent * q[a] * q[b];
                for (x, y) in pairs(d) {
                    let both = ways[x][a] * ways[y][b] + ways[y][a] * ways[x][b];
                    sum += answer.inverse[x][y] * (2.0 * rise[x] * turn(&ways[y]) + held * both);
                }
                for (x, way) in ways.iter().enumerate() {
                    sum += answer.drift[x] * held * turn(way);
                }
                density.kinetic[a][b] += sum;
            }
        }
        Ok(density)
    }
}

/// Re⟨a|b⟩
fn overlap(a: &Column, b: &Column) -> f64 {
    a.iter().zip(b).map(|(a, b)| (a.conj() * b).re).sum()
}

fn pairs(d: usize) -> impl Iterator<Item = (usize, usize)> {
    (0..d).flat_map(move |x| (0..d).map(move |y| (x, y)))
}

fn triples(d: usize) -> impl Iterator<Item = (usize, usize, usize)> {
    pairs(d).flat_map(move |(x, y)| (0..d).map(move |z| (x, y, z)))
}

fn inverse_of(curvature: &[Vec<f64>]) -> Result<Tensor, Error> {
    let d = curvature.len();
    let matrix = nalgebra::DMatrix::from_fn(d, d, |x, y| curvature[x][y]);
    let inverse = matrix.try_inverse().ok_or(Error::Touching)?;
    let entry = |x: usize, y: usize| if x < d && y < d { inverse[(x, y)] } else { 0.0 };
    let tensor: Tensor = std::array::from_fn(|x| std::array::from_fn(|y| entry(x, y)));
    match tensor.iter().flatten().all(|x| x.is_finite()) {
        true => Ok(tensor),
        false => Err(Error::Touching),
    }
}
