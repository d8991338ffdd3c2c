//! A point inside each band.
//!
//! Sought between the last entry of the ledger with N ≤ n and the first with N ≥ n + 1: by interpolation in N while
//! other bands lie between, by Newton's step on D once the neighbouring gaps are reached, by twice that step where it did
//! not halve the bracket (so that a band narrower than the arithmetic separates comes between close neighbours in a
//! dozen sweeps, not in as many as the arithmetic has bits), and by halving where that did not either.

use super::budget::GRADIENT;
use super::cell::SolveError;
use super::gradient::{COARSE, gradient};
use super::scalar::Scalar;
use super::search::{Finder, PATIENCE, is_positive};
use super::sweep::Reading;
use super::uncertainty::units;

/// Rounding of D that hides nothing.
const TRUSTED: f64 = 1e-4;

/// Noise of D above which a reading inside a band means nothing.
const NOISY: f64 = 0.1;
/// A band point is taken when N is at least this far from whole.
const INSIDE: f64 = 0.02;

/// How the next energy on the way into a band is chosen; each kind after the one before has not halved the bracket.
#[derive(Clone, Copy, PartialEq)]
enum Step {
    /// Newton's step on D from the nearer end.
    Newton,
    /// Twice Newton's step: a root of D near that end is then between close neighbours, though the band about it be
    /// narrower than the arithmetic separates.
    Past,
    Halve,
}

impl Step {
    fn next(self) -> Self {
        match self {
            Step::Newton => Step::Past,
            Step::Past => Step::Halve,
            Step::Halve => Step::Newton,
        }
    }
}

/// A reading inside a band, or, of a band narrower than the arithmetic can separate or hidden in its noise,
/// the reading nearest to it.
pub(crate) enum Inside<T> {
    At(Reading<T>),
    Unresolved(Reading<T>),
}

impl<T: Scalar> Inside<T> {
    /// The reading; `None` for an unresolved band in an arithmetic that has a finer one.
    pub fn accept(self) -> Option<Reading<T>> {
        match self {
            Inside::At(reading) => Some(reading),
            Inside::Unresolved(reading) => (T::UNIT < f64::UNIT).then_some(reading),
        }
    }
}

impl<T: Scalar> Finder<'_, T> {
    /// A reading inside band `band`. The ledger must surround it.
    pub fn inside(&mut self, band: usize) -> Result<Inside<T>, SolveError> {
        let (low, high) = (band as f64, (band + 1) as f64);
        let mut step = Step::Newton;
        for _ in 0..PATIENCE {
            let first = self.readings.partition_point(|r| r.states <= low);
            let last = self.readings.partition_point(|r| r.states < high);
            if let Some(found) = self.best_inside(first, last, low) {
                return Ok(if found.noise() < NOISY {
                    Inside::At(found)
                } else {
                    Inside::Unresolved(found)
                });
            }
            if first == 0 || last >= self.readings.len() {
                return Err(SolveError::NoBracket);
            }
            let (left, right) = (self.readings[first - 1], self.readings[last]);
            let width = (right.energy - left.energy).leading();
            let resolution = self
                .resolution(left.energy)
                .max(self.resolution(right.energy));
            if width <= 2.0 * resolution {
                // a point too near an edge is better than none
                let inner = self
                    .readings
                    .get(first)
                    .filter(|r| first < last && r.noise() < NOISY);
                let size = |r: &Reading<T>| r.discriminant().abs();
                let nearest = if size(&left) < size(&right) {
                    left
                } else {
                    right
                };
                return Ok(inner.map_or(Inside::Unresolved(nearest), |r| Inside::At(*r)));
            }
            let next = self.propose_inside(first, last, low, step);
            self.read(next)?;
            let first = self.readings.partition_point(|r| r.states <= low);
            let last = self.readings.partition_point(|r| r.states < high);
            let remaining = if first == 0 || last >= self.readings.len() {
                width
            } else {
                (self.readings[last].energy - self.readings[first - 1].energy).leading()
            };
            step = if remaining <= 0.5 * width {
                Step::Newton
            } else {
                step.next()
            };
        }
        Err(SolveError::NoBracket)
    }

    /// log₂ of the rounding of D at a reading, where it may be more than the last matrix shows; `None` elsewhere. Behind
    /// several thick walls the product grows on the way to e^{Σκl} and comes back in a band: the rounding of the way
    /// stays, and only the factors with the rest around each tell it.
    pub fn doubt(&self, reading: &Reading<T>) -> Result<Option<f64>, SolveError> {
        let energy = reading.energy.leading();
        if self.ready.decay(energy) + T::UNIT.ln() < TRUSTED.ln() {
            return Ok(None);
        }
        self.meter.sweep::<f64>(self.ready, energy, GRADIENT)?;
        let around = gradient(self.ready, energy, &COARSE);
        let doubt = (units(T::UNIT < f64::UNIT) * around.rounding_of_factors).log2();
        Ok(Some(doubt + around.exponent as f64))
    }

    /// Whether a finer arithmetic is not called for at a reading in a band.
    pub fn trusts(&self, reading: &Reading<T>) -> Result<bool, SolveError> {
        if T::UNIT < f64::UNIT {
            return Ok(true);
        }
        Ok(self
            .doubt(reading)?
            .is_none_or(|doubt| doubt < TRUSTED.log2()))
    }

    /// The entry of first..last nearest to the middle of the band, if well inside.
    fn best_inside(&self, first: usize, last: usize, low: f64) -> Option<Reading<T>> {
        let distance = |r: &Reading<T>| (r.states - low - 0.5).abs();
        let inside = self.readings.get(first..last)?.iter();
        let best = inside.min_by(|a, b| distance(a).total_cmp(&distance(b)))?;
        (distance(best) <= 0.5 - INSIDE).then_some(*best)
    }

    /// Next energy to try on the way into a band.
    fn propose_inside(&self, first: usize, last: usize, low: f64, kind: Step) -> T {
        let (left, right) = (&self.readings[first - 1], &self.readings[last]);
        let middle = (left.energy + right.energy).times(0.5);
        if first < last {
            // some entry just inside an edge: between the two on either side of the band's middle
            let split =
                first + self.readings[first..last].partition_point(|r| r.states < low + 0.5);
            return (self.readings[split - 1].energy + self.readings[split].energy).times(0.5);
        }
        if kind == Step::Halve {
            return middle;
        }
        let width = (right.energy - left.energy).leading();
        let step_from = |r: &Reading<T>| {
            let trace = r.trace();
            -(trace.value / trace.slope)
        };
        let within = |step: T, direction: f64| {
            let size = step.leading() * direction;
            size.is_finite() && size > 0.0 && size < width
        };
        let mut best: Option<(f64, T, T)> = None;
        for (reading, adjacent, direction) in [
            (left, left.states == low, 1.0),
            (right, right.states == low + 1.0, -1.0),
        ] {
            let step = step_from(reading);
            if adjacent && within(step, direction) {
                let size = step.leading().abs();
                if best.is_none_or(|(other, ..)| size < other) {
                    best = Some((size, step, reading.energy));
                }
            }
        }
        if let Some((size, step, energy)) = best {
            let resolution = self.resolution(energy);
            if (kind == Step::Newton && size > resolution) || size >= 0.25 * width {
                return energy + step;
            }
            let past = step.leading().signum() * (2.0 * size).max(8.0 * resolution);
            return energy + T::constant(past);
        }
        if kind == Step::Past {
            return middle;
        }
        if left.states < low || right.states > low + 1.0 {
            let share = (low + 0.5 - left.states) / (right.states - left.states);
            return left.energy + T::constant(width * share.clamp(0.1, 0.9));
        }
        middle
    }

    /// A reading inside band `band`, with points in the gaps on both sides in the ledger, so that between those
    /// D is monotone.
    pub fn isolate(&mut self, band: usize) -> Result<Inside<T>, SolveError> {
        self.surround(band + 1)?;
        let found = self.inside(band)?;
        let (Inside::At(middle) | Inside::Unresolved(middle)) = found;
        let (Inside::At(above) | Inside::Unresolved(above)) = self.inside(band + 1)?;
        self.gap_point(middle, above, is_positive(band + 1))?;
        if band > 0 {
            let (Inside::At(below) | Inside::Unresolved(below)) = self.inside(band - 1)?;
            self.gap_point(below, middle, is_positive(band))?;
        }
        Ok(found)
    }
}
