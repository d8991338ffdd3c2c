//! The lowest eigenpairs of a dense Hermitian matrix, real or complex.
//!
//! Householder reflections take the matrix to a real tridiagonal T (Golub & Van Loan, *Matrix Computations*, 8.3).
//! Counting sign changes of the Sturm sequence
//!
//! ```text
//! q₁ = d₁ − x,   qᵢ = dᵢ − x − eᵢ₋₁²/qᵢ₋₁,   number of eigenvalues below x = number of qᵢ < 0
//! ```
//!
//! brackets each wanted eigenvalue (Barth, Martin & Wilkinson, Numer. Math. 9, 386 (1967)); inverse iteration gives its vector, those of
//! a cluster made orthogonal to each other (Peters & Wilkinson, in *Handbook for Automatic Computation II* (1971)).
//! A result whose residual or orthogonality is poor is replaced by that of a full decomposition.

use super::Error;
use super::tridiagonal::{inverse_iteration, sturm};
use faer::dyn_stack::{MemBuffer, MemStack};
use faer::linalg::evd::tridiag::{tridiag_in_place, tridiag_in_place_scratch};
use faer::linalg::householder::{
    apply_block_householder_sequence_on_the_left_in_place_scratch,
    apply_block_householder_sequence_on_the_left_in_place_with_conj,
};
use faer::traits::ComplexField;
use faer::{Conj, Mat, Par, Side};
use nalgebra::Complex;

/// `f64` or `Complex<f64>`.
pub(super) trait Scalar: ComplexField<Real = f64> + Copy + Send + Sync + 'static {
    fn from_complex(value: Complex<f64>) -> Self;
    fn to_complex(self) -> Complex<f64>;
}

impl Scalar for f64 {
    fn from_complex(value: Complex<f64>) -> Self {
        value.re
    }
    fn to_complex(self) -> Complex<f64> {
        Complex::new(self, 0.0)
    }
}

impl Scalar for Complex<f64> {
    fn from_complex(value: Complex<f64>) -> Self {
        value
    }
    fn to_complex(self) -> Complex<f64> {
        self
    }
}

/// Eigenvalues in rising order and their orthonormal vectors as columns.
pub(super) struct Pairs<T> {
    pub values: Vec<f64>,
    pub vectors: Mat<T>,
}

/// Matrices this small are decomposed in full.
const SMALL: usize = 12;

/// The lowest `count` eigenpairs of a finite Hermitian matrix (both triangles filled); fewer where it is smaller.
/// With `vectors` false the vectors are left out (no columns).
///
/// # Errors
/// `NotFinite` where the decomposition does not converge.
pub(super) fn lowest<T: Scalar>(
    matrix: Mat<T>,
    count: usize,
    vectors: bool,
) -> Result<Pairs<T>, Error> {
    let n = matrix.nrows();
    let count = count.min(n);
    if n <= SMALL {
        return full(&matrix, count);
    }
    let reduced = Reduced::new(matrix.clone());
    let values = sturm(&reduced.diagonal, &reduced.beside, count);
    if !vectors {
        return Ok(Pairs {
            values,
            vectors: Mat::zeros(n, 0),
        });
    }
    match inverse_iteration(&reduced.diagonal, &reduced.beside, &values) {
        Some(columns) => Ok(Pairs {
            vectors: reduced.back(&columns),
            values,
        }),
        None => full(&matrix, count),
    }
}

/// By a full decomposition.
fn full<T: Scalar>(matrix: &Mat<T>, count: usize) -> Result<Pairs<T>, Error> {
    let n = matrix.nrows();
    let decomposed = matrix
        .self_adjoint_eigen(Side::Lower)
        .map_err(|_| Error::NotFinite)?;
    let values = (0..count)
        .map(|j| decomposed.S()[j].to_complex().re)
        .collect();
    let vectors = Mat::from_fn(n, count, |i, j| decomposed.U()[(i, j)]);
    Ok(Pairs { values, vectors })
}

/// A matrix reduced to tridiagonal form.
struct Reduced<T> {
    reflected: Mat<T>,
    factors: Mat<T>,
    diagonal: Vec<f64>,
    /// Moduli beside the diagonal.
    beside: Vec<f64>,
}

impl<T: Scalar> Reduced<T> {
    fn new(mut matrix: Mat<T>) -> Self {
        let n = matrix.nrows();
        let block = faer::linalg::qr::no_pivoting::factor::recommended_block_size::<T>(n, n);
        let mut factors = Mat::<T>::zeros(block, n - 1);
        let mut memory = MemBuffer::new(tridiag_in_place_scratch::<T>(
            n,
            Par::Seq,
            Default::default(),
        ));
        tridiag_in_place(
            matrix.as_mut(),
            factors.as_mut(),
            Par::Seq,
            MemStack::new(&mut memory),
            Default::default(),
        );
        let diagonal = (0..n).map(|i| matrix[(i, i)].to_complex().re).collect();
        let beside = (1..n)
            .map(|i| matrix[(i, i - 1)].to_complex().norm())
            .collect();
        Self {
            reflected: matrix,
            factors,
            diagonal,
            beside,
        }
    }

    /// Vectors of the matrix from those of its tridiagonal form.
    fn back(&self, columns: &[Vec<f64>]) -> Mat<T> {
        let n = self.diagonal.len();
        let mut phase = Complex::new(1.0, 0.0);
        let mut phases = vec![phase; n];
        for i in 1..n {
            let next = self.reflected[(i, i - 1)].to_complex() * phase;
            phase = if next.norm() > 0.0 {
                next / next.norm()
            } else {
                Complex::new(1.0, 0.0)
            };
            phases[i] = phase;
        }
        let mut vectors = Mat::<T>::from_fn(n, columns.len(), |i, j| {
            T::from_complex(phases[i] * columns[j][i])
        });
        let scratch = apply_block_householder_sequence_on_the_left_in_place_scratch::<T>(
            n - 1,
            self.factors.nrows(),
            columns.len(),
        );
        let mut memory = MemBuffer::new(scratch);
        apply_block_householder_sequence_on_the_left_in_place_with_conj(
            self.reflected.as_ref().submatrix(1, 0, n - 1, n - 1),
            self.factors.as_ref(),
            Conj::No,
            vectors.as_mut().subrows_mut(1, n - 1),
            Par::Seq,
            MemStack::new(&mut memory),
        );
        vectors
    }
}

#[cfg(test)]
mod tests {
    use super::super::tridiagonal::random;
    use super::*;

    fn check<T: Scalar>(matrix: Mat<T>, count: usize) {
        let n = matrix.nrows();
        let wanted = full(&matrix, n).expect("a full decomposition").values;
        let found = lowest(matrix.clone(), count, true).expect("the lowest pairs");
        let scale = wanted.iter().fold(1.0, |a: f64, x| a.max(x.abs()));
        for j in 0..count {
            assert!(
                (found.values[j] - wanted[j]).abs() < 1e-13 * scale,
                "{} {}",
                found.values[j],
                wanted[j]
            );
        }
        let image = &matrix * &found.vectors;
        for j in 0..count {
            for i in 0..n {
                let r = image[(i, j)].to_complex()
                    - found.vectors[(i, j)].to_complex() * found.values[j];
                assert!(r.norm() < 1e-12 * scale, "residual {}", r.norm());
            }
            for other in 0..count {
                let overlap: Complex<f64> = (0..n)
                    .map(|i| {
                        found.vectors[(i, j)].to_complex().conj()
                            * found.vectors[(i, other)].to_complex()
                    })
                    .sum();
                let wanted = if j == other { 1.0 } else { 0.0 };
                assert!((overlap - wanted).norm() < 1e-12, "overlap {overlap}");
            }
        }
    }

    #[test]
    fn random_matrices_agree_with_a_full_decomposition() {
        let mut seed = 77;
        for n in [5, 13, 40, 90] {
            let half = Mat::<Complex<f64>>::from_fn(n, n, |_, _| {
                Complex::new(random(&mut seed), random(&mut seed))
            });
            let complex = &half + half.adjoint();
            let real = Mat::<f64>::from_fn(n, n, |i, j| complex[(i, j)].re);
            check(complex, 4.min(n));
            check(real, 9.min(n));
        }
    }

    #[test]
    fn degenerate_and_diagonal_matrices_keep_orthogonal_vectors() {
        check(
            Mat::<f64>::from_fn(30, 30, |i, j| if i == j { (i / 6) as f64 } else { 0.0 }),
            14,
        );
        check(
            Mat::<f64>::from_fn(40, 40, |i, j| if i == j { 3.0 } else { 1.0 }),
            9,
        );
        check(Mat::<f64>::zeros(20, 20), 5);
    }
}
