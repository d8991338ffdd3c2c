//! The lowest eigenpairs of a large Hermitian matrix by a block iteration.
//!
//! Locally optimal block conjugate gradients (Knyazev, SIAM J. Sci. Comput. 23, 517 (2001)): with the vectors X, their
//! residuals R = HX − XΘ divided by the distance of the diagonal from Θ, and the last step P, the matrix is diagonalised
//! on the span of [X, P, R]. The start is the exact solution on the leading block: rows are sorted by kinetic energy,
//! so that the rest is a small correction.
//!
//! An eigenvalue is off by at most |r|²/gap, and by |r| at worst. Gives up, with `None`, after a fixed number of rounds.

use super::Error;
use super::eigen::{Pairs, Scalar, lowest};
use faer::linalg::matmul::matmul;
use faer::{Accum, Mat, Par};

/// Vectors carried beyond those wanted, so that a cluster at the end is not cut.
const GUARD: usize = 4;
const ROUNDS: usize = 60;

/// The lowest `count` pairs of a matrix with sorted diagonal; residuals below `tolerance`.
pub(super) fn lowest_of_large<T: Scalar>(
    matrix: &Mat<T>,
    count: usize,
    tolerance: f64,
) -> Result<Option<Pairs<T>>, Error> {
    let n = matrix.nrows();
    let block = count + GUARD;
    let lead = (3 * block).max(160).min(n / 2);
    if 4 * block > n || lead < block {
        return Ok(None);
    }
    let start = lowest(
        matrix.as_ref().submatrix(0, 0, lead, lead).to_owned(),
        block,
        true,
    )?;
    let mut values = start.values;
    let mut vectors = Mat::<T>::zeros(n, block);
    vectors
        .as_mut()
        .submatrix_mut(0, 0, lead, block)
        .copy_from(&start.vectors);
    let mut images = product(matrix, &vectors);
    let mut last: Option<Mat<T>> = None;
    let diagonal: Vec<f64> = (0..n).map(|i| matrix[(i, i)].to_complex().re).collect();
    let softest = 0.02 * (diagonal[n - 1] - diagonal[0]).abs().max(f64::MIN_POSITIVE);
    for _ in 0..ROUNDS {
        let residuals = Mat::<T>::from_fn(n, block, |i, j| {
            T::from_complex(images[(i, j)].to_complex() - vectors[(i, j)].to_complex() * values[j])
        });
        let norms: Vec<f64> = (0..block).map(|j| norm(&residuals, j)).collect();
        if norms.iter().any(|x| !x.is_finite()) {
            return Err(Error::NotFinite);
        }
        if norms[..count].iter().all(|x| *x <= tolerance) {
            values.truncate(count);
            let vectors = vectors.as_ref().subcols(0, count).to_owned();
            return Ok(Some(Pairs { values, vectors }));
        }
        let open: Vec<usize> = (0..block).filter(|j| norms[*j] > 0.1 * tolerance).collect();
        let space = span(
            &vectors,
            last.as_ref(),
            &residuals,
            &open,
            &norms,
            &diagonal,
            &values,
            softest,
        );
        let mapped = product(matrix, &space);
        let mut small = Mat::<T>::zeros(space.ncols(), space.ncols());
        matmul(
            small.as_mut(),
            Accum::Replace,
            space.adjoint(),
            mapped.as_ref(),
            T::from_complex(1.0.into()),
            Par::Seq,
        );
        let solved = small
            .self_adjoint_eigen(faer::Side::Lower)
            .map_err(|_| Error::NotFinite)?;
        let turn = solved.U().subcols(0, block).to_owned();
        values = (0..block).map(|j| solved.S()[j].to_complex().re).collect();
        let next = product(&space, &turn);
        images = product(&mapped, &turn);
        // The step: what of the new vectors is not in the old ones.
        let overlap = vectors.adjoint() * &next;
        last = Some(&next - &vectors * overlap);
        vectors = next;
    }
    Ok(None)
}

fn product<T: Scalar>(left: &Mat<T>, right: &Mat<T>) -> Mat<T> {
    let mut result = Mat::<T>::zeros(left.nrows(), right.ncols());
    matmul(
        result.as_mut(),
        Accum::Replace,
        left.as_ref(),
        right.as_ref(),
        T::from_complex(1.0.into()),
        Par::Seq,
    );
    result
}

fn norm<T: Scalar>(matrix: &Mat<T>, column: usize) -> f64 {
    (0..matrix.nrows())
        .map(|i| matrix[(i, column)].to_complex().norm_sqr())
        .sum::<f64>()
        .sqrt()
}

/// An orthonormal basis of the vectors, the last step and the preconditioned residuals of the open ones.
#[allow(clippy::too_many_arguments)]
fn span<T: Scalar>(
    vectors: &Mat<T>,
    last: Option<&Mat<T>>,
    residuals: &Mat<T>,
    open: &[usize],
    norms: &[f64],
    diagonal: &[f64],
    values: &[f64],
    softest: f64,
) -> Mat<T> {
    let (n, block) = (vectors.nrows(), vectors.ncols());
    let steps: Vec<usize> = last.map_or(Vec::new(), |last| {
        open.iter()
            .copied()
            .filter(|j| norm(last, *j) > 0.0)
            .collect()
    });
    let lengths: Vec<f64> = last.map_or(Vec::new(), |last| {
        steps.iter().map(|j| norm(last, *j)).collect()
    });
    let width = block + steps.len() + open.len();
    let mut all = Mat::<T>::from_fn(n, width, |i, j| {
        if j < block {
            return vectors[(i, j)];
        }
        if j < block + open.len() {
            let level = open[j - block];
            let below = (diagonal[i] - values[level]).max(softest);
            return T::from_complex(
                residuals[(i, level)].to_complex() / (below * norms[level]) * softest,
            );
        }
        let which = j - block - open.len();
        last.map_or(T::from_complex(0.0.into()), |last| {
            T::from_complex(last[(i, steps[which])].to_complex() / lengths[which])
        })
    });
    // Once against the vectors first, so that nearly dependent columns keep their digits.
    for _ in 0..2 {
        let rest = all.as_ref().subcols(block, width - block).to_owned();
        let overlap = vectors.adjoint() * &rest;
        let left = &rest - vectors * overlap;
        all.as_mut()
            .subcols_mut(block, width - block)
            .copy_from(&left);
    }
    all.qr().compute_thin_Q()
}

#[cfg(test)]
mod tests {
    use super::*;
    use nalgebra::Complex;

    /// A kinetic diagonal with decaying couplings, against the direct reduction.
    #[test]
    fn the_iteration_agrees_with_the_reduction() {
        let n = 420;
        let entry = |i: usize, j: usize| {
            let far = i.abs_diff(j) as f64;
            let kinetic = if i == j { 0.08 * i as f64 } else { 0.0 };
            Complex::new(
                kinetic + 0.6 / (1.0 + far * far),
                if i == j {
                    0.0
                } else {
                    0.3 * (i as f64 - j as f64).signum() / (1.0 + far).powi(2)
                },
            )
        };
        let complex = Mat::<Complex<f64>>::from_fn(n, n, entry);
        let real = Mat::<f64>::from_fn(n, n, |i, j| entry(i, j).re);
        let wanted = lowest(complex.clone(), 7, false).expect("values").values;
        let found = lowest_of_large(&complex, 7, 1e-9)
            .expect("no error")
            .expect("settles");
        let wanted_real = lowest(real.clone(), 7, false).expect("values").values;
        let found_real = lowest_of_large(&real, 7, 1e-9)
            .expect("no error")
            .expect("settles");
        for j in 0..7 {
            assert!(
                (wanted[j] - found.values[j]).abs() < 1e-12,
                "{} {}",
                wanted[j],
                found.values[j]
            );
            assert!((wanted_real[j] - found_real.values[j]).abs() < 1e-12);
        }
    }
}
