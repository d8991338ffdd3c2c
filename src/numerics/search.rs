//! Brackets by zero count, roots by safeguarded Newton steps. No grid of energies is ever scanned.
//!
//! Every sweep is kept in a ledger ordered by energy, where N(E) never falls. For each band a point
//! inside it (n < N < n + 1) is sought (`interior`). Between points in two neighbouring bands s D has one
//! maximum and no other stationary point; either a point with s D > 2 turns up on the way to it, or the maximum itself is found as the simple root of D′, well
//! conditioned even where the gap is closed. Edges and levels are roots of s D − 2 = −4 sin²(θ/2),
//! θ = distance of ka from the edge.

use super::budget::{Meter, SECOND};
use super::cell::{Ready, SolveError};
use super::scalar::{Dual, Scalar, power_of_two};
use super::sweep::{Reading, product, read};

/// Steps after which a search gives up.
pub(super) const PATIENCE: usize = 400;
/// s D − 2 above which a gap is wide: its edges are found apart.
const WIDE: f64 = 1e-4;
/// D′ relative to its size in the bands at which the top of s D is as good as found.
const SETTLED: f64 = 1e-5;

/// An energy from both sides.
fn less<T: Scalar>(a: T, b: T) -> bool {
    (a - b).leading() < 0.0
}

/// The ledger of one search.
pub(crate) struct Finder<'a, T> {
    pub ready: &'a Ready,
    pub meter: &'a Meter<'a>,
    pub(super) readings: Vec<Reading<T>>,
}

/// Where s D is greatest between two bands, or a point of a wide gap.
pub(crate) enum GapPoint<T> {
    Wide(T),
    Narrow(T),
    /// rounding hides whether there is a gap
    Noisy(T),
}

/// What a root search is after: N = `states` reached from below (`upper`: the edge at the upper
/// end of a gap, where N = states still holds just below it), with s D − 2 = `depth`.
#[derive(Clone, Copy)]
pub(crate) struct Target<T> {
    pub states: f64,
    pub upper: bool,
    pub positive: bool,
    pub depth: T,
    /// this close to `states` the sign of the residual tells the side, more finely than N
    pub margin: f64,
}

/// The sign of D at the edges next to gap `gap` − 1, that is where N = `gap`.
pub(crate) fn is_positive(gap: usize) -> bool {
    gap % 2 == 0
}

impl<T: Scalar> Target<T> {
    /// The edge where N = `gap`: its upper end (a bottom of a band) or its lower (a top).
    pub fn edge(gap: usize, upper: bool) -> Self {
        Target {
            states: gap as f64,
            upper,
            positive: is_positive(gap),
            depth: T::constant(0.0),
            margin: 0.0,
        }
    }

    fn is_left(&self, reading: &Reading<T>) -> bool {
        if (reading.states - self.states).abs() < self.margin {
            let above = self.residual(reading).0.leading() > 0.0;
            return above == self.upper;
        }
        if self.upper {
            reading.states <= self.states
        } else {
            reading.states < self.states
        }
    }

    /// s D − 2 − depth, its derivative, and its noise, without the exponent.
    pub fn residual(&self, reading: &Reading<T>) -> (T, T, f64) {
        let (excess, noise) = reading.excess(self.positive);
        let slope = reading.trace().slope;
        let slope = if self.positive { slope } else { -slope };
        (excess - self.depth.shifted(-reading.exponent), slope, noise)
    }
}

impl<'a, T: Scalar> Finder<'a, T> {
    pub fn new(ready: &'a Ready, meter: &'a Meter<'a>) -> Self {
        Finder {
            ready,
            meter,
            readings: Vec::with_capacity(64),
        }
    }

    /// A sweep, kept in the ledger, or what the ledger has.
    pub fn read(&mut self, energy: T) -> Result<Reading<T>, SolveError> {
        let place = self.readings.partition_point(|r| less(r.energy, energy));
        if let Some(known) = self.readings.get(place).filter(|r| !less(energy, r.energy)) {
            return Ok(*known);
        }
        let reading = read(self.ready, energy, self.meter)?;
        self.readings.insert(place, reading);
        Ok(reading)
    }

    /// Size of one unit in the last place of energies near `energy`.
    pub fn resolution(&self, energy: T) -> f64 {
        2.0 * T::UNIT * energy.leading().abs().max(f64::MIN_POSITIVE)
    }

    /// Makes the ledger reach from below the first band to above band `band`.
    pub fn surround(&mut self, band: usize) -> Result<(), SolveError> {
        let ready = self.ready;
        let step = ready.kinetic_scale() + (ready.ceiling - ready.floor) + ready.delta_depth;
        if self.readings.first().is_none_or(|r| r.states > 0.0) {
            self.reach_down(step)?;
        }
        let wanted = (band + 1) as f64;
        if self.readings.last().is_some_and(|r| r.states >= wanted) {
            return Ok(());
        }
        let mean = 0.5 * (ready.ceiling + ready.floor);
        let mut above = mean + ready.kinetic_scale() * ((band + 1) * (band + 1)) as f64;
        above = above.max(ready.least_energy + step);
        for _ in 0..PATIENCE {
            if self.read(T::constant(above))?.states >= wanted {
                return Ok(());
            }
            above += 0.5 * (above - ready.floor).abs().max(step);
            if !above.is_finite() {
                break;
            }
        }
        Err(SolveError::NoBracket)
    }

    /// Downwards from the lowest potential until no level lies below; towards, never past, the energy
    /// at which a mass would vanish.
    fn reach_down(&mut self, step: f64) -> Result<(), SolveError> {
        let lowest = self.ready.least_energy;
        let mut below = self.ready.floor - 1e-3 * self.ready.kinetic_scale();
        if below <= lowest {
            below = lowest + 1e-6 * (lowest.abs() + self.ready.kinetic_scale());
        }
        let mut step = step.max(self.ready.floor.abs() * 1e-12);
        for _ in 0..PATIENCE {
            if self.read(T::constant(below))?.states <= 0.0 {
                return Ok(());
            }
            let next = below - step;
            step *= 2.0;
            below = if next > lowest {
                next
            } else {
                0.5 * (below + lowest)
            };
            if !below.is_finite() {
                break;
            }
            if lowest.is_finite()
                && below - lowest <= 1e-9 * (lowest.abs() + self.ready.kinetic_scale())
            {
                return Err(SolveError::MassOutOfRange);
            }
        }
        Err(SolveError::NoBracket)
    }

    /// The energies next to and inside each of the lowest bands, for a search in a finer arithmetic.
    pub fn seeds(&self, bands: usize) -> Vec<f64> {
        let mut seeds = Vec::with_capacity(2 * bands);
        for band in 0..=bands {
            let first = self.readings.partition_point(|r| r.states <= band as f64);
            let last = self
                .readings
                .partition_point(|r| r.states < (band + 1) as f64);
            let around = self.readings.get(first.saturating_sub(1)..=last);
            let energies = around.unwrap_or_default().iter();
            seeds.extend(energies.map(|r| r.energy.leading()));
        }
        seeds
    }

    /// Reads at the energies that a coarser search left.
    pub fn sow(&mut self, seeds: &[f64]) -> Result<(), SolveError> {
        for energy in seeds {
            self.read(T::constant(*energy))?;
        }
        Ok(())
    }

    /// Does s D rise above 2 here, beyond the doubt of `doubt` too?
    fn rises(&self, reading: &Reading<T>, positive: bool) -> Result<bool, SolveError> {
        if !reading.rises(positive, WIDE) {
            return Ok(false);
        }
        let excess = reading.excess(positive).0.leading().log2() + reading.exponent as f64;
        let doubt = self.doubt(reading)?.filter(|doubt| doubt.is_finite());
        Ok(doubt.is_none_or(|doubt| excess > doubt + 2.0))
    }

    /// A point in the gap between readings in neighbouring bands, or where s D is greatest.
    pub fn gap_point(
        &mut self,
        left: Reading<T>,
        right: Reading<T>,
        positive: bool,
    ) -> Result<GapPoint<T>, SolveError> {
        let (mut left, mut right) = (left, right);
        // entries already in the gap
        for r in &self.readings {
            let between = less(left.energy, r.energy) && less(r.energy, right.energy);
            if between && self.rises(r, positive)? {
                return Ok(GapPoint::Wide(r.energy));
            }
        }
        let signed = |r: &Reading<T>| {
            let slope = r.trace().slope.leading() * power_of_two(r.exponent);
            if positive { slope } else { -slope }
        };
        let (mut up, mut down) = (signed(&left), signed(&right));
        let steepest = up.abs().max(down.abs());
        let mut halve = false;
        for _ in 0..PATIENCE {
            let width = (right.energy - left.energy).leading();
            let middle = (left.energy + right.energy).times(0.5);
            if width <= 4.0 * self.resolution(middle) {
                return Ok(GapPoint::Narrow(middle));
            }
            let share = up / (up - down);
            let energy = if halve || !share.is_finite() {
                middle
            } else {
                let least = (self.resolution(middle) / width).min(0.25);
                left.energy + T::constant(width * share.clamp(least, 1.0 - least))
            };
            let reading = self.read(energy)?;
            if self.rises(&reading, positive)? {
                return Ok(GapPoint::Wide(energy));
            }
            if reading.noise() > WIDE && T::UNIT == f64::UNIT {
                return Ok(GapPoint::Noisy(energy));
            }
            let slope = signed(&reading);
            // near enough for Newton's steps by D″
            if slope.abs() <= SETTLED * steepest {
                return Ok(GapPoint::Narrow(energy));
            }
            if slope > 0.0 {
                // Illinois: an end kept twice counts half
                down *= if up > 0.0 && less(left.energy, energy) {
                    0.5
                } else {
                    1.0
                };
                left = reading;
                up = slope;
            } else {
                up *= 0.5;
                right = reading;
                down = slope;
            }
            halve = !halve && (right.energy - left.energy).leading() > 0.6 * width;
        }
        Err(SolveError::NoBracket)
    }

    /// D′/D″ at an energy, D″, and the power of two of D″.
    pub fn curvature(&self, energy: T) -> Result<(T, f64, i64), SolveError> {
        self.meter
            .sweep::<T>(self.ready, energy.leading(), SECOND)?;
        let variable = Dual {
            value: Dual::variable(energy),
            slope: Dual::constant(1.0),
        };
        let whole = product(self.ready, variable);
        let second = (whole.matrix.a + whole.matrix.d).slope;
        Ok((
            second.value / second.slope,
            second.slope.leading(),
            whole.exponent,
        ))
    }

    /// Of the two entries around a root the one whose Newton step is the shorter and stays between them.
    fn nearest(&self, target: &Target<T>, split: usize) -> Option<T> {
        let (left, right) = (&self.readings[split - 1], &self.readings[split]);
        let width = (right.energy - left.energy).leading();
        let step = |r: &Reading<T>, direction: f64| {
            let (residual, slope, _) = target.residual(r);
            let size = -(residual / slope).leading() * direction;
            (size > 0.0 && size < width).then_some((size, r.energy))
        };
        let both = [step(left, 1.0), step(right, -1.0)].into_iter().flatten();
        both.min_by(|a, b| a.0.total_cmp(&b.0))
            .map(|(_, energy)| energy)
    }

    /// The root of a target, from `start`, within what the ledger brackets. Gives the root and the
    /// reading nearest to it.
    pub fn root(&mut self, target: Target<T>, start: T) -> Result<(T, Reading<T>), SolveError> {
        let split = self.readings.partition_point(|r| target.is_left(r));
        if split == 0 || split >= self.readings.len() {
            return Err(SolveError::NoBracket);
        }
        let mut low = self.readings[split - 1].energy;
        let mut high = self.readings[split].energy;
        let mut energy = self.nearest(&target, split).unwrap_or(start);
        let mut previous = f64::INFINITY;
        for _ in 0..PATIENCE {
            if less(energy, low) || less(high, energy) {
                energy = (low + high).times(0.5);
            }
            let reading = self.read(energy)?;
            let (residual, slope, noise) = target.residual(&reading);
            if target.is_left(&reading) {
                low = energy;
            } else {
                high = energy;
            }
            let resolution = self.resolution(energy);
            let step = -(residual / slope);
            let size = step.leading().abs();
            if size <= resolution || residual.leading().abs() <= 2.0 * noise {
                let refined = energy + step;
                let kept = size.is_finite() && size <= 64.0 * resolution;
                return Ok((if kept { refined } else { energy }, reading));
            }
            let width = (high - low).leading();
            if width <= 2.0 * resolution {
                return Ok((energy, reading));
            }
            energy = if size.is_finite() && size < 0.6 * previous {
                energy + step
            } else {
                (low + high).times(0.5)
            };
            previous = if size.is_finite() {
                size.min(width)
            } else {
                width
            };
        }
        Err(SolveError::NoBracket)
    }
}
