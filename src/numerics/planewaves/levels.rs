//! Levels at one wave vector on a given basis.

use super::basis::Waves;
use super::eigen::{Scalar, lowest};
use super::iterate::lowest_of_large;
use super::{Budget, Error};
use faer::Mat;
use nalgebra::Complex;

/// The lowest levels at one k on one basis.
#[derive(Clone, Debug)]
pub struct Levels {
    /// The wave vector, in fractions of the primitive reciprocal vectors.
    pub k: [f64; 3],
    /// The plane waves.
    pub waves: Vec<[i32; 3]>,
    /// The energies, rising.
    pub energies: Vec<f64>,
    /// Coefficients c_G of each level, as columns; no columns where only energies were asked for.
    pub(super) vectors: Mat<Complex<f64>>,
}

/// Wave vectors farther out lose the digits of their place in the zone.
pub(super) const FARTHEST: f64 = 1e6;
/// Matrices larger than this are solved by iteration.
const LARGE: usize = 400;
/// Residuals of the iteration, in the natural unit: squared, they are below rounding.
pub(super) const RESIDUAL: f64 = 2e-9;

/// A set of plane waves: those with |k+G|² ≤ cut at the k it was made for.
#[derive(Clone, Debug)]
pub(super) struct Basis {
    pub waves: Vec<[i32; 3]>,
    /// Differences |G−G'| do not exceed this.
    pub reach: f64,
}

impl Waves<'_> {
    pub(super) fn basis(&self, k: [f64; 3], cut: f64) -> Basis {
        Basis {
            waves: self.frame.waves(k, cut),
            reach: 2.0 * cut.max(0.0).sqrt() * (1.0 + 1e-9),
        }
    }

    /// The lowest `bands` levels at `k` with all plane waves |k+G|² ≤ `cut`; fewer where the basis is smaller.
    ///
    /// # Errors
    /// `NotFinite`, `BudgetSpent`, `Cancelled`.
    pub fn levels_at(
        &self,
        k: [f64; 3],
        bands: usize,
        cut: f64,
        budget: &Budget,
    ) -> Result<Levels, Error> {
        if !(k.iter().all(|x| x.abs() <= FARTHEST) && cut.is_finite()) {
            return Err(Error::NotFinite);
        }
        let k = self.inside(k);
        if self.frame.expected(cut) > 2.0 * budget.max_basis as f64 + 100.0 {
            return Err(Error::BudgetSpent);
        }
        self.solve_on(&self.basis(k, cut), k, bands, true, budget)
    }

    /// Sets the entries beyond the dimension to zero.
    pub(super) fn inside(&self, k: [f64; 3]) -> [f64; 3] {
        std::array::from_fn(|i| if i < self.frame.dimension { k[i] } else { 0.0 })
    }

    /// The lowest levels at k on a basis that need not be centred there.
    pub(super) fn solve_on(
        &self,
        basis: &Basis,
        k: [f64; 3],
        bands: usize,
        vectors: bool,
        budget: &Budget,
    ) -> Result<Levels, Error> {
        budget.spend(basis.waves.len())?;
        if self.is_real() {
            self.solve_as::<f64>(basis, k, bands, vectors)
        } else {
            self.solve_as::<Complex<f64>>(basis, k, bands, vectors)
        }
    }

    fn solve_as<T: Scalar>(
        &self,
        basis: &Basis,
        k: [f64; 3],
        bands: usize,
        vectors: bool,
    ) -> Result<Levels, Error> {
        let waves = basis.waves.clone();
        if waves.is_empty() {
            return Ok(Levels {
                k,
                waves,
                energies: Vec::new(),
                vectors: Mat::zeros(0, 0),
            });
        }
        let matrix = self.matrix::<T>(&waves, k, basis.reach)?;
        let iterated = if waves.len() > LARGE {
            lowest_of_large(&matrix, bands, RESIDUAL * self.frame.unit())?
        } else {
            None
        };
        let pairs = match iterated {
            Some(pairs) => pairs,
            None => lowest(matrix, bands, vectors)?,
        };
        let gauge: Vec<Complex<f64>> = waves.iter().map(|n| self.gauge(*n)).collect();
        let vectors = Mat::from_fn(waves.len(), pairs.vectors.ncols(), |i, j| {
            pairs.vectors[(i, j)].to_complex() * gauge[i]
        });
        Ok(Levels {
            k,
            waves,
            energies: pairs.values,
            vectors,
        })
    }
}

impl Levels {
    /// c_G of one level on `waves`, in the gauge of the potential as given; empty where only energies were asked for.
    pub fn coefficients(&self, level: usize) -> Vec<Complex<f64>> {
        if level >= self.vectors.ncols() {
            return Vec::new();
        }
        (0..self.waves.len())
            .map(|i| self.vectors[(i, level)])
            .collect()
    }
}
