//! What a cut leaves out of a level, and how well that is known.
//!
//! To second order a level falls by
//!
//! ```text
//! δ = Σ_{|k+G|² > C} |r_G|² / (|k+G|² + V(0) − E),   r_G = Σ_G' V(G−G') c_G'
//! ```
//!
//! when the waves outside come in. Where V ends at a radius R the sum is finite. Else it is taken up to |k+G|² = αC, and
//! its outermost shell is continued with the weight bound(g)²·g^{d−1}/g², g = |G|. The settled level is E − δ. The error
//! stated is δ times the share by which such a prediction failed between the last two cuts (twice that, and never less
//! than a tenth, nor than the potential over the energy at the cut), plus rounding.

use super::basis::{Waves, extent};
use super::lattice::{add, real};
use super::levels::Basis;
use super::{Decay, Error, Estimate, Levels};
use nalgebra::Complex;

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
    /// The estimate, judged by the prediction at a lower cut; by δ itself where there is none.
    pub fn judged_by(&self, lower: Option<&Prediction>) -> Estimate {
        let share = match lower {
            Some(lower) if lower.left_out > lower.rounding => {
                (2.0 * (self.value - lower.value).abs() / lower.left_out).max(self.share)
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

impl Waves<'_> {
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
                    share: (self.swing / above).max(0.1),
                }
            })
            .collect())
    }

    /// δ of each level.
    fn left_out(&self, levels: &Levels, cut: f64) -> Result<Vec<f64>, Error> {
        let shells = match self.potential.decay {
            Decay::Finite { radius } => (cut.sqrt() + radius).powi(2),
            Decay::Bounded(_) => cut * [16.0, 6.0, 3.5][self.frame.dimension - 1],
        };
        let inside = levels.waves.len();
        let all = Basis {
            waves: self.frame.waves(levels.k, shells),
            reach: (cut.sqrt() + shells.sqrt()) * (1.0 + 1e-9),
        };
        let outside = all.waves.get(inside..).unwrap_or(&[]);
        let couplings = self.couplings(levels, outside, &all)?;
        let mut sums = vec![0.0; levels.energies.len()];
        let mut shell = vec![0.0; levels.energies.len()];
        for (n, row) in outside
            .iter()
            .zip(couplings.chunks(levels.energies.len().max(1)))
        {
            let kinetic = self.frame.square(add(levels.k, real(*n)));
            for (j, coupling) in row.iter().enumerate() {
                // A level above the cut has no meaning, but must not divide by zero.
                let below = (kinetic + self.mean - levels.energies[j]).max(1e-3 * cut);
                sums[j] += coupling / below;
                if kinetic > 0.5 * shells {
                    shell[j] += coupling / below;
                }
            }
        }
        if let Decay::Bounded(bound) = self.potential.decay {
            let share = tail(bound, self.frame.dimension, shells);
            for (sum, shell) in sums.iter_mut().zip(shell) {
                *sum += share * shell;
            }
        }
        if sums.iter().all(|x| x.is_finite()) {
            Ok(sums)
        } else {
            Err(Error::NotFinite)
        }
    }

    /// |r_G|² for every wave outside, level by level.
    fn couplings(
        &self,
        levels: &Levels,
        outside: &[[i32; 3]],
        all: &Basis,
    ) -> Result<Vec<f64>, Error> {
        let table = self.table(all.reach, extent(&all.waves))?;
        let count = levels.energies.len();
        let gauged: Vec<Vec<Complex<f64>>> = levels
            .waves
            .iter()
            .enumerate()
            .map(|(i, n)| {
                let phase = self.gauge(*n).conj();
                (0..count).map(|j| levels.vectors[(i, j)] * phase).collect()
            })
            .collect();
        let mut result = Vec::with_capacity(outside.len() * count);
        let mut sums = vec![Complex::new(0.0, 0.0); count];
        for n in outside {
            sums.fill(Complex::new(0.0, 0.0));
            for (inner, coefficients) in levels.waves.iter().zip(&gauged) {
                let value = table.get([n[0] - inner[0], n[1] - inner[1], n[2] - inner[2]]);
                if value.re == 0.0 && value.im == 0.0 {
                    continue;
                }
                for (sum, c) in sums.iter_mut().zip(coefficients) {
                    *sum += value * c;
                }
            }
            result.extend(sums.iter().map(|sum| sum.norm_sqr()));
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
