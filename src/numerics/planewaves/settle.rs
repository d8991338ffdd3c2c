//! What a cut leaves out of a level, and how well that is known.
//!
//! To second order a level falls by
//!
//! ```text
//! δ = Σ_{|k+G|² > C} |r_G|² / (|k+G|² + V(0) − E),   r_G = Σ_G' V(G−G') c_G'
//! ```
//!
//! when the waves outside come in. Where V ends at a near radius R the sum is finite. Else it is taken up to |k+G|² = αC, and
//! its outermost shell is continued with the weight bound(g)²·g^{d−1}/g², g = |G|. The settled level is E − δ. The error
//! stated is δ times the share by which such a prediction failed between the last two cuts (three times
//! that, and never less than a quarter, nor than twice the potential over the energy at the cut), plus rounding. On the
//! fourteen form-factor models of the tests no error is more than three quarters of what is stated.

use super::basis::{Waves, extent};
use super::eigen::Scalar;
use super::lattice::{add, real};
use super::levels::{Basis, FARTHEST};
use super::{Budget, Decay, Error, Estimate, Levels};
use faer::Mat;
use nalgebra::Complex;
use rustc_hash::FxHashMap;
use std::ops::Range;

/// No larger cut tells how much of δ is uncertain.
pub(super) const UNTRIED: f64 = f64::INFINITY;

/// A level's prediction at one cut.
#[derive(Clone, Copy, Debug, Default)]
pub(super) struct Prediction {
    /// E − δ.
    pub value: f64,
    /// δ.
    pub left_out: f64,
    /// Rounding of the eigenproblem.
    pub rounding: f64,
    /// The least share of δ that is uncertain.
    pub share: f64,
}

impl Prediction {
    /// The estimate without another cut to judge by: half of δ, or more where the cut is low.
    pub fn unjudged(&self) -> Estimate {
        self.known_to(UNTRIED)
    }

    /// The estimate where this share of δ is uncertain; [`UNTRIED`] where nothing tells.
    pub fn known_to(&self, share: f64) -> Estimate {
        let share = if share == UNTRIED {
            self.share.max(0.5)
        } else {
            share
        };
        Estimate {
            value: self.value,
            error: share * self.left_out + self.rounding,
        }
    }

    /// The estimate, judged by the prediction at a lower cut; by δ itself where there is none.
    pub fn judged_by(&self, lower: Option<&Prediction>) -> Estimate {
        let share = match lower {
            Some(lower) if lower.left_out > lower.rounding => {
                (3.0 * (self.value - lower.value).abs() / lower.left_out).max(self.share)
            }
            Some(_) => self.share,
            None => 1.0,
        };
        Estimate {
            value: self.value,
            error: share * self.left_out + self.rounding,
        }
    }
}

/// Levels at one k with what is known of them.
#[derive(Clone, Debug)]
pub struct SettledLevels {
    /// The energies, rising but for rounding.
    pub energies: Vec<Estimate>,
    /// The last solve.
    pub levels: Levels,
    /// Whether every energy is known as well as was asked for.
    pub settled: bool,
}

/// A wave beyond the cut.
struct Far {
    /// |k+G|² + V(0).
    above: f64,
    /// It stands for so many like it.
    weight: f64,
}

impl Far {
    /// Its distance above a level. A level above the cut has no meaning, but must not divide by zero.
    fn below(&self, energy: f64, cut: f64) -> f64 {
        (self.above - energy).max(1e-3 * cut)
    }
}

/// Waves beyond the cut and r_G of each, level by level.
struct Outside {
    waves: Vec<Far>,
    couplings: Vec<Complex<f64>>,
}

impl Outside {
    fn chunks(&self, levels: usize) -> impl Iterator<Item = (&Far, &[Complex<f64>])> {
        self.waves.iter().zip(self.couplings.chunks(levels.max(1)))
    }
}

impl Waves<'_> {
    /// The lowest `bands` levels at `k`, the cut raised until each is known to `tolerance` or the budget's largest
    /// basis is reached.
    ///
    /// # Errors
    /// `NotFinite`, `Cancelled`; `BudgetSpent` where not even the first cut fits.
    pub fn settled_at(
        &self,
        k: [f64; 3],
        bands: usize,
        tolerance: f64,
        budget: &Budget,
    ) -> Result<SettledLevels, Error> {
        if !(k.iter().all(|x| x.abs() <= FARTHEST) && tolerance > 0.0 && tolerance.is_finite())
            || bands == 0
        {
            return Err(Error::NotFinite);
        }
        let k = self.inside(k);
        let mut cut = self.first_cut(bands, f64::INFINITY, budget)?;
        let mut lower: Option<Vec<Prediction>> = None;
        loop {
            let levels = self.solve_on(&self.basis(k, cut), k, bands, true, budget)?;
            let predictions = self.predict(&levels, cut)?;
            let at = |j: usize| lower.as_ref().and_then(|l: &Vec<Prediction>| l.get(j));
            let energies: Vec<Estimate> = predictions
                .iter()
                .enumerate()
                .map(|(j, p)| p.judged_by(at(j)))
                .collect();
            let settled = energies.iter().all(|e| e.error <= tolerance);
            let rounded = predictions.iter().all(|p| p.left_out <= 0.1 * p.rounding);
            let next = self.frame.cut_for(1.6 * self.frame.expected(cut));
            if settled
                || rounded
                || self.frame.expected(next) * 1.25 + 20.0 > budget.max_basis as f64
            {
                return Ok(SettledLevels {
                    energies,
                    levels,
                    settled,
                });
            }
            (lower, cut) = (Some(predictions), next);
        }
    }

    /// Predictions for the lowest levels of a solve at `cut` on a basis centred at its k.
    pub(super) fn predict(&self, levels: &Levels, cut: f64) -> Result<Vec<Prediction>, Error> {
        let left_out = self.left_out(levels, cut)?;
        let size = levels.waves.len() as f64;
        let span = cut + self.mean.abs() + self.swing;
        let rounding = f64::EPSILON * span * (8.0 + 2.0 * size.sqrt());
        Ok(levels
            .energies
            .iter()
            .zip(left_out)
            .map(|(energy, left_out)| {
                let above = (cut + self.mean - energy).max(1e-3 * cut);
                Prediction {
                    value: energy - left_out,
                    left_out,
                    rounding,
                    share: (2.0 * self.swing / above).max(0.25),
                }
            })
            .collect())
    }

    /// δ of each level.
    fn left_out(&self, levels: &Levels, cut: f64) -> Result<Vec<f64>, Error> {
        let outside = self.outside(levels, cut)?;
        let count = levels.energies.len();
        let mut sums = vec![0.0; count];
        for (wave, row) in outside.chunks(count) {
            for (j, coupling) in row.iter().enumerate() {
                let below = wave.below(levels.energies[j], cut);
                sums[j] += wave.weight * coupling.norm_sqr() / below;
            }
        }
        if sums.iter().all(|x| x.is_finite()) {
            Ok(sums)
        } else {
            Err(Error::NotFinite)
        }
    }

    /// δ as a matrix between some levels, each at its own energy; δ of each is its diagonal.
    pub(super) fn left_out_between(
        &self,
        levels: &Levels,
        range: Range<usize>,
        cut: f64,
    ) -> Result<Mat<Complex<f64>>, Error> {
        let outside = self.outside(levels, cut)?;
        let count = range.len();
        let mut sums = Mat::<Complex<f64>>::zeros(count, count);
        let mut scaled = vec![Complex::new(0.0, 0.0); count];
        for (wave, row) in outside.chunks(levels.energies.len()) {
            for (j, scaled) in scaled.iter_mut().enumerate() {
                let level = range.start + j;
                let below = wave.below(levels.energies[level], cut);
                *scaled = row[level] * (wave.weight / below).sqrt();
            }
            for i in 0..count {
                for j in 0..count {
                    sums[(i, j)] += scaled[i].conj() * scaled[j];
                }
            }
        }
        Ok(sums)
    }

    /// The waves beyond the cut that count, and how the levels couple to them.
    fn outside(&self, levels: &Levels, cut: f64) -> Result<Outside, Error> {
        let far = cut * [16.0, 6.0, 3.5][self.frame.dimension - 1];
        let (shells, ends) = match self.potential.decay {
            Decay::Finite { radius } => {
                let whole = (cut.sqrt() + radius).powi(2);
                let ends = self.few.is_some() || whole <= 2.0 * far;
                (if ends { whole } else { far }, ends)
            }
            Decay::Bounded(_) => (far, false),
        };
        let inside = levels.waves.len();
        let all = Basis {
            waves: self.frame.waves(levels.k, shells),
            reach: (cut.sqrt() + shells.sqrt()) * (1.0 + 1e-9),
        };
        let outside = all.waves.get(inside..).unwrap_or(&[]);
        let beyond = match self.potential.decay {
            _ if ends => 0.0,
            Decay::Bounded(bound) => tail(bound, self.frame.dimension, shells),
            // Components of unknown fall: as much again as in the last octave.
            Decay::Finite { .. } => 1.0,
        };
        let place = |n: &[i32; 3]| {
            let kinetic = self.frame.square(add(levels.k, real(*n)));
            let last = kinetic > 0.5 * shells;
            Far {
                above: kinetic + self.mean,
                weight: if last { 1.0 + beyond } else { 1.0 },
            }
        };
        Ok(Outside {
            waves: outside.iter().map(place).collect(),
            couplings: self.couplings(levels, outside, &all)?,
        })
    }

    /// r_G for every wave outside, level by level, but for a phase of each wave.
    fn couplings(
        &self,
        levels: &Levels,
        outside: &[[i32; 3]],
        all: &Basis,
    ) -> Result<Vec<Complex<f64>>, Error> {
        if let Some(few) = &self.few {
            return Ok(self.couplings_of_few(levels, outside, few));
        }
        if self.is_real() {
            self.couplings_as::<f64>(levels, outside, all)
        } else {
            self.couplings_as::<Complex<f64>>(levels, outside, all)
        }
    }

    /// The same where V has few components, by going from the waves inside along each of them.
    fn couplings_of_few(
        &self,
        levels: &Levels,
        outside: &[[i32; 3]],
        few: &[([i32; 3], Complex<f64>)],
    ) -> Vec<Complex<f64>> {
        let count = levels.energies.len();
        let places: FxHashMap<[i32; 3], usize> =
            outside.iter().enumerate().map(|(i, n)| (*n, i)).collect();
        let mut sums = vec![Complex::new(0.0, 0.0); outside.len() * count];
        for (i, n) in levels.waves.iter().enumerate() {
            for (q, value) in few {
                let Some(place) = places.get(&[n[0] + q[0], n[1] + q[1], n[2] + q[2]]) else {
                    continue;
                };
                for j in 0..count {
                    sums[place * count + j] += value * levels.vectors[(i, j)];
                }
            }
        }
        sums
    }

    fn couplings_as<T: Scalar>(
        &self,
        levels: &Levels,
        outside: &[[i32; 3]],
        all: &Basis,
    ) -> Result<Vec<Complex<f64>>, Error> {
        let table = self.table(all.reach, extent(&all.waves))?;
        let inside = &levels.waves;
        let gauged = Mat::<T>::from_fn(inside.len(), levels.energies.len(), |i, j| {
            T::from_complex(levels.vectors[(i, j)] * self.gauge(inside[i]).conj())
        });
        let mut result = Vec::with_capacity(outside.len() * levels.energies.len());
        // A few hundred rows at a time, so that the strip stays in the cache.
        for strip in outside.chunks(256) {
            let rows = table.rectangle::<T>(strip, inside);
            let coupled = &rows * &gauged;
            for i in 0..strip.len() {
                result.extend((0..levels.energies.len()).map(|j| coupled[(i, j)].to_complex()));
            }
        }
        Ok(result)
    }
}

/// The sum beyond |k+G|² = `square`, as a multiple of the one over its last octave: ∫ bound² g^{d−3} dg over both.
fn tail(bound: &(dyn Fn(f64) -> f64 + Sync), dimension: usize, square: f64) -> f64 {
    let weight = |g: f64| bound(g).powi(2) * g.powi(dimension as i32 - 3);
    let step = 2f64.powf(0.0625);
    let integral = |from: f64, pieces: usize| -> f64 {
        (0..pieces)
            .map(|i| {
                let low = from * step.powi(i as i32);
                let middle = low * step.sqrt();
                weight(middle) * low * (step - 1.0)
            })
            .filter(|piece| piece.is_finite())
            .sum()
    };
    // Half an octave of g is an octave of g²; beyond, twenty octaves of g.
    let shell = integral((0.5 * square).sqrt(), 8);
    let beyond = integral(square.sqrt(), 320);
    // A bound that is zero by the last shell adds nothing; one that does not fall is cut off at the factor of a
    // δ-function's components in that dimension.
    if shell > 0.0 {
        (beyond / shell).min(10.0)
    } else {
        0.0
    }
}
