//! The levels near a solved wave vector, at energies near a given one.
//!
//! With the states ψ (the set P) at k₀ whose energies ε are near an energy s, all others the set Q, and p = ∂H/∂k =
//! 2(k₀+G),
//!
//! ```text
//! φ_n(q) = ψ_n + Σ_x q_x w_nx,    (H − s) w_nx = −Q p_x ψ_n
//! S = φ†φ = 1 + Σ q_x q_y w_x†w_y
//! φ†H(k₀+q)φ = ε + q·ψ†pψ + q² S + Σ q_x q_y (ψ†p_y w_x + s w_x†w_y) + Σ q_x q_y q_z w_x†p_y w_z
//! ```
//!
//! Levels at k₀ + q are those of this small pencil. At E = s it is Löwdin's partition (J. Chem. Phys. 19, 1396 (1951))
//! to third order in q, so that levels near s are wrong by order q⁴ only; crossings within P stay crossings; and as many
//! levels lie below s as states of Q do and levels of the pencil (Haynsworth, Linear Algebra Appl. 1, 73 (1968)). What
//! the cut leaves out, δ of `settle.rs`, is taken off as a matrix on P.
//!
//! Failure mode: a level of Q that comes to s within |q|. Its error is not known from within: the caller compares with
//! solves.

use super::basis::Waves;
use super::eigen::Scalar;
use super::lattice::{add, real};
use super::levels::Basis;
use super::{Budget, Error, Levels};
use faer::linalg::solvers::Solve;
use faer::{Mat, Side};
use nalgebra::{Complex, DMatrix};
use std::ops::Range;

/// A solved point and what its neighbourhood is found from.
pub(super) struct Nearby {
    /// How many levels lie below those that it gives.
    pub below: usize,
    /// How many levels it gives.
    pub count: usize,
    pencil: Kind,
}

/// Real where the crystal has a centre of inversion.
enum Kind {
    Real(Pencil<f64>),
    Complex(Pencil<Complex<f64>>),
}

/// Coefficient matrices of the powers of q.
struct Pencil<T: nalgebra::ComplexField> {
    dimension: usize,
    /// H at q = 0, then by x, by x ≤ y, by x ≤ y ≤ z.
    constant: DMatrix<T>,
    linear: Vec<DMatrix<T>>,
    square: Vec<DMatrix<T>>,
    cubic: Vec<DMatrix<T>>,
    /// S beyond the identity by x ≤ y.
    overlap: Vec<DMatrix<T>>,
}

impl Nearby {
    /// The levels at k₀ + q, q on the axes of the lattice.
    pub fn levels(&self, q: [f64; 3]) -> Vec<f64> {
        match &self.pencil {
            Kind::Real(pencil) => pencil.levels(q),
            Kind::Complex(pencil) => pencil.levels(q),
        }
    }
}

impl Waves<'_> {
    /// The neighbourhood of a point solved at `cut`, of a range of its levels, for energies near `near`; `None` where
    /// levels above the range do not lie above that.
    pub(super) fn nearby(
        &self,
        basis: &Basis,
        levels: &Levels,
        (range, near): (Range<usize>, f64),
        cut: f64,
        budget: &Budget,
    ) -> Result<Option<Nearby>, Error> {
        budget.spend(levels.waves.len())?;
        let left_out = self.left_out_between(levels, range.clone(), cut)?;
        let (below, count) = (range.start, range.len());
        let given = (range, near);
        let pencil = if self.is_real() {
            self.pencil::<f64>(basis, levels, given, &left_out)?
                .map(Kind::Real)
        } else {
            self.pencil::<Complex<f64>>(basis, levels, given, &left_out)?
                .map(Kind::Complex)
        };
        Ok(pencil.map(|pencil| Nearby {
            below,
            count,
            pencil,
        }))
    }

    fn pencil<T: Scalar + nalgebra::ComplexField<RealField = f64>>(
        &self,
        basis: &Basis,
        levels: &Levels,
        (range, near): (Range<usize>, f64),
        left_out: &Mat<Complex<f64>>,
    ) -> Result<Option<Pencil<T>>, Error> {
        let (n, d) = (levels.waves.len(), self.frame.dimension);
        let of = <T as Scalar>::from_complex;
        let number = |x: f64| of(Complex::new(x, 0.0));
        let (below, count) = (range.start, range.len());
        let all = Mat::<T>::from_fn(n, range.end, |i, j| {
            of(levels.vectors[(i, j)] * self.gauge(levels.waves[i]).conj())
        });
        let states = all.as_ref().subcols(below, count).to_owned();
        let lower = all.as_ref().subcols(0, below).to_owned();
        let momenta: Vec<[f64; 3]> = levels
            .waves
            .iter()
            .map(|g| {
                let wave = self.frame.wave(add(levels.k, real(*g)));
                self.frame.on_axes(wave).map(|x| 2.0 * x)
            })
            .collect();
        let times = |axis: usize, of: &Mat<T>| {
            Mat::<T>::from_fn(n, of.ncols(), |i, j| number(momenta[i][axis]) * of[(i, j)])
        };
        let moved: Vec<Mat<T>> = (0..d).map(|x| times(x, &states)).collect();
        // H − s with all states up to those of P raised out of the way, so that it is positive.
        let mut raised = self.matrix::<T>(&levels.waves, levels.k, basis.reach)?;
        let lift = self.frame.unit() + near.abs();
        let lifted = Mat::<T>::from_fn(n, range.end, |i, j| {
            all[(i, j)] * number(lift + near - levels.energies[j])
        });
        raised += &lifted * all.adjoint();
        for i in 0..n {
            raised[(i, i)] -= number(near);
        }
        let Ok(factors) = raised.llt(Side::Lower) else {
            return Ok(None);
        };
        let above = |of: &Mat<T>| of - &all * (all.adjoint() * of);
        let answers: Vec<Mat<T>> = moved
            .iter()
            .map(|moved| {
                let parts = lower.adjoint() * moved;
                let shares = Mat::<T>::from_fn(below, count, |i, j| {
                    parts[(i, j)] * number(1.0 / (near - levels.energies[i]))
                });
                above(&factors.solve(-above(moved))) + &lower * shares
            })
            .collect();
        let small = |left: &Mat<T>, right: &Mat<T>| {
            let product = left.adjoint() * right;
            DMatrix::<T>::from_fn(count, count, |i, j| product[(i, j)])
        };
        let hermitian = |m: DMatrix<T>| (&m + m.adjoint()) * number(0.5);
        let energies = DMatrix::from_fn(count, count, |i, j| {
            let kept = if i == j {
                levels.energies[below + i]
            } else {
                0.0
            };
            of(Complex::new(kept, 0.0) - left_out[(i, j)])
        });
        let mut pencil = Pencil {
            dimension: d,
            constant: hermitian(energies),
            linear: moved.iter().map(|m| hermitian(small(&states, m))).collect(),
            square: Vec::new(),
            cubic: Vec::new(),
            overlap: Vec::new(),
        };
        for x in 0..d {
            for y in x..d {
                // The sum over both orders of x ≠ y.
                let both = number(if x == y { 1.0 } else { 2.0 });
                let overlap = hermitian(small(&answers[x], &answers[y])) * both;
                let bent = hermitian(small(&moved[y], &answers[x])) * both;
                pencil.square.push(bent + &overlap * number(near));
                pencil.overlap.push(overlap);
            }
        }
        for x in 0..d {
            for y in x..d {
                for z in y..d {
                    let orders = [
                        [x, y, z],
                        [y, z, x],
                        [z, x, y],
                        [x, z, y],
                        [y, x, z],
                        [z, y, x],
                    ];
                    let mut sum = DMatrix::<T>::zeros(count, count);
                    let mut seen: Vec<[usize; 3]> = Vec::new();
                    for order in orders {
                        if !seen.contains(&order) {
                            seen.push(order);
                            let [a, b, c] = order;
                            sum += small(&answers[a], &times(b, &answers[c]));
                        }
                    }
                    pencil.cubic.push(hermitian(sum));
                }
            }
        }
        Ok(Some(pencil))
    }
}

impl<T: Scalar + nalgebra::ComplexField<RealField = f64>> Pencil<T> {
    fn levels(&self, q: [f64; 3]) -> Vec<f64> {
        let d = self.dimension;
        let number = |x: f64| <T as Scalar>::from_complex(Complex::new(x, 0.0));
        let count = self.constant.nrows();
        let square: f64 = q.iter().map(|x| x * x).sum();
        let mut matrix = self.constant.clone();
        let mut overlap = DMatrix::<T>::identity(count, count);
        let (mut second, mut third) = (0, 0);
        for x in 0..d {
            add_to(&mut matrix, &self.linear[x], number(q[x]));
            for y in x..d {
                let share = q[x] * q[y];
                add_to(&mut matrix, &self.square[second], number(share));
                add_to(&mut overlap, &self.overlap[second], number(share));
                second += 1;
                for z in y..d {
                    add_to(&mut matrix, &self.cubic[third], number(share * q[z]));
                    third += 1;
                }
            }
        }
        add_to(&mut matrix, &overlap, number(square));
        // S is the identity and what is no less than zero, so that it has a factor.
        if let Some(factor) = overlap.cholesky() {
            let lower = factor.l_dirty();
            lower.solve_lower_triangular_mut(&mut matrix);
            matrix.adjoint_mut();
            lower.solve_lower_triangular_mut(&mut matrix);
        }
        let mut levels: Vec<f64> = matrix.symmetric_eigenvalues().iter().copied().collect();
        levels.sort_by(f64::total_cmp);
        levels
    }
}

fn add_to<T: nalgebra::ComplexField>(sum: &mut DMatrix<T>, part: &DMatrix<T>, share: T) {
    for (sum, part) in sum.iter_mut().zip(part.iter()) {
        *sum += part.clone() * share.clone();
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::numerics::planewaves::{Decay, Lattice, Potential};

    /// Levels near s are wrong by order q⁴, with low levels left out and kept, real and complex.
    #[test]
    fn errors_fall_as_the_fourth_power_of_the_distance() {
        let lattice = Lattice::new(&[[1.0, 0.0, 0.0], [0.3, 1.1, 0.0]]).expect("a lattice");
        let budget = Budget::new(&|| false, 500, 1000);
        for turn in [0.0, 0.9] {
            let components = |n: [i32; 3]| {
                let size = (-0.25 * f64::from(n[0] * n[0] + n[1] * n[1])).exp();
                let odd = f64::from((n[0] + 2 * n[1]).signum());
                Complex::new(-9.0, turn * 4.0 * odd) * size * if n == [0; 3] { 0.0 } else { 1.0 }
            };
            let potential = Potential {
                components: &components,
                decay: Decay::Finite { radius: 60.0 },
            };
            let waves = Waves::new(&lattice, potential).expect("waves");
            assert_eq!(waves.is_real(), turn == 0.0);
            let k = [0.17, 0.31, 0.0];
            let basis = waves.basis(k, 1500.0);
            let levels = waves.solve_on(&basis, k, 8, true, &budget).expect("levels");
            for (range, level) in [(0..4, 2), (2..5, 3)] {
                let first = range.start;
                let near = waves
                    .nearby(
                        &basis,
                        &levels,
                        (range, levels.energies[level]),
                        1500.0,
                        &budget,
                    )
                    .expect("no error")
                    .expect("levels above are above");
                let error = |step: f64| {
                    let q = [0.6 * step, -0.8 * step, 0.0];
                    let moved = waves.frame.off_axes(q);
                    let there = std::array::from_fn(|i| k[i] + moved[i]);
                    let exact = waves
                        .solve_on(&basis, there, 8, false, &budget)
                        .expect("levels");
                    let left_out = waves.left_out_between(&levels, level..level + 1, 1500.0);
                    let left_out = left_out.expect("no error")[(0, 0)].re;
                    (near.levels(q)[level - first] - exact.energies[level] + left_out).abs()
                };
                assert!(error(0.0) < 1e-10);
                let (wide, half) = (error(0.4), error(0.2));
                assert!(wide < 2e-2 && half > 1e-9, "{wide} {half}");
                assert!(half < wide / 10.0, "{turn} {level}: {wide} {half}");
            }
        }
    }
}
