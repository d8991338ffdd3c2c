//! The sweep: the product of all transfer matrices over one cell at an energy, and what it tells.
//!
//! * D = tr M, and by the product rule D′ (and D″ with a dual over a dual).
//! * Distance from an edge, s D − 2 with s = ±1, in two forms: directly, and from
//!   D² − 4 = (M₁₁ − M₂₂)² + 4 M₁₂ M₂₁, whose terms are small one by one near a closing gap
//!   (det M = 1). The form with the smaller rounding is taken.
//! * The count of zeros in (0, a] of the solution that starts as (0, 1): the number c of Dirichlet
//!   eigenvalues at or below E (Sturm; Magnus & Winkler, *Hill's Equation*, §2.1). The n-th of them
//!   lies in the closure of gap n. Hence the integrated states N(E) = ka/π, extended: within a
//!   band c + acos(±D/2)/π, + for even c; in a gap the integer of {c, c+1} that is even for D ≥ 2,
//!   odd for D ≤ −2. Where rounding shifts c by one (a Dirichlet eigenvalue at an edge), the two
//!   readings agree, so N is continuous whatever c was.

use super::budget::Meter;
use super::cell::{Ready, SolveError};
use super::element::{Matrix, factors};
use super::scalar::{Dual, Scalar, power_of_two};
use std::f64::consts::PI;

/// What a sweep at an energy gives. All of the matrix is to be multiplied with 2^`exponent`.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Reading<T> {
    pub energy: T,
    /// the cell's matrix and its derivative by energy
    pub matrix: Matrix<Dual<T>>,
    pub exponent: i64,
    /// zeros of the Dirichlet solution in (0, a]
    pub count: usize,
    /// units of rounding that the factors' entries gather, relative to the largest terms
    pub weight: f64,
    /// N(E)
    pub states: f64,
}

/// Largest magnitude before the product is brought back into range.
const LARGE: f64 = 1e60;

/// Product over the cell of any scalar.
pub(crate) struct Product<T> {
    pub matrix: Matrix<T>,
    pub exponent: i64,
    pub count: usize,
    pub weight: f64,
}

/// Product over the cell of any scalar, with exponent and zero count. An entry of a factor is wrong by a few units, and
/// by √|z| more from the rounding of z.
pub(crate) fn product<T: Scalar>(ready: &Ready, energy: T) -> Product<T> {
    let mut state = Matrix::identity();
    let mut exponent = 0;
    let mut count = 0;
    let mut weight = 4.0;
    for element in &ready.elements {
        factors(element, energy, |matrix, shift, z| {
            let next = matrix.product(&state);
            count += zeros(&state, &next, (-z).max(0.0).sqrt());
            weight += 4.0 + 4.0 * z.abs().sqrt();
            state = next;
            exponent += shift;
            let size = state.magnitude();
            if size > LARGE {
                let shift = size.log2().floor() as i64;
                state = state.shifted(-shift);
                exponent += shift;
            }
        });
    }
    Product {
        matrix: state,
        exponent,
        count,
        weight,
    }
}

/// Sign just right of a point.
fn sign<T: Scalar>(state: &Matrix<T>) -> bool {
    let (u, v) = (state.b.leading(), state.d.leading());
    if u == 0.0 { v > 0.0 } else { u > 0.0 }
}

/// Zeros of the second column's u in a factor of the given phase, its right end included.
/// Without phase there is at most one. With phase θ = √(m(E−V)) l the number is one of the
/// integers in (θ/π − 1, θ/π + 1]; the change of sign decides which.
fn zeros<T: Scalar>(before: &Matrix<T>, after: &Matrix<T>, phase: f64) -> usize {
    let odd = sign(before) != sign(after);
    if phase < PI * (1.0 - 1e-6) {
        return usize::from(odd);
    }
    let turns = phase / PI;
    let whole = turns.floor();
    let near = (turns - turns.round()).abs() < 1e-6;
    if !near {
        let whole = whole as usize;
        return if (whole % 2 == 1) == odd {
            whole
        } else {
            whole + 1
        };
    }
    // close to a whole number of half turns: where the solution started decides
    let round = turns.round() as usize;
    if (round % 2 == 1) == odd {
        return round;
    }
    // the start angle is far from 0 in the first case, near 0 (or π) in the second
    let late = before.b.leading() != 0.0 && starts_late(before);
    if late { round + 1 } else { round - 1 }
}

/// Is the start angle of the Prüfer phase in its second half, (π/2, π)?
fn starts_late<T: Scalar>(before: &Matrix<T>) -> bool {
    (before.b.leading() > 0.0) != (before.d.leading() > 0.0)
}

/// A sweep with derivative.
pub(crate) fn read<T: Scalar>(
    ready: &Ready,
    energy: T,
    meter: &Meter,
) -> Result<Reading<T>, SolveError> {
    meter.sweep::<T>(ready, energy.leading(), 1)?;
    if energy.leading() <= ready.least_energy {
        return Err(SolveError::MassOutOfRange);
    }
    let Product {
        matrix,
        exponent,
        count,
        weight,
    } = product(ready, Dual::variable(energy));
    if !matrix.magnitude().is_finite() {
        return Err(SolveError::NotFinite);
    }
    let mut reading = Reading {
        energy,
        matrix,
        exponent,
        count,
        weight,
        states: 0.0,
    };
    reading.states = reading.integrated_states();
    Ok(reading)
}

impl<T: Scalar> Reading<T> {
    /// tr M without its exponent.
    pub fn trace(&self) -> Dual<T> {
        self.matrix.a + self.matrix.d
    }

    /// D as `f64`; ±∞ beyond the range.
    pub fn discriminant(&self) -> f64 {
        self.trace().value.leading() * power_of_two(self.exponent)
    }

    /// D′ as `f64`; ±∞ beyond the range.
    pub fn slope(&self) -> f64 {
        self.trace().slope.leading() * power_of_two(self.exponent)
    }

    /// Rounding to expect of D itself, without the exponent.
    fn scaled_noise(&self) -> f64 {
        let size = self.matrix.a.value.leading().abs() + self.matrix.d.value.leading().abs();
        T::UNIT * self.weight * (size + 2.0 * power_of_two(-self.exponent))
    }

    /// Rounding to expect of D itself.
    pub fn noise(&self) -> f64 {
        self.scaled_noise() * power_of_two(self.exponent)
    }

    /// Is s D − 2 above `height`, beyond doubt?
    pub fn rises(&self, positive: bool, height: f64) -> bool {
        let excess = self.excess(positive).0.leading();
        excess > 4.0 * self.scaled_noise() && excess * power_of_two(self.exponent) > height
    }

    /// s D − 2, without the exponent, in the better form; and the rounding to expect of it
    /// for entries with a relative error of a unit.
    pub fn excess(&self, positive: bool) -> (T, f64) {
        let m = &self.matrix;
        let two = T::constant(2.0).shifted(-self.exponent);
        let trace = m.a.value + m.d.value;
        let signed = if positive { trace } else { -trace };
        let direct = signed - two;
        let size = |x: T| x.leading().abs();
        let direct_noise = size(m.a.value) + size(m.d.value) + two.leading();
        let denominator = signed + two;
        if denominator.leading() <= two.leading() {
            return (direct, T::UNIT * direct_noise);
        }
        let difference = m.a.value - m.d.value;
        let square = difference * difference;
        let cross = (m.b.value * m.c.value).times(4.0);
        let noise = 2.0 * size(difference) * (size(m.a.value) + size(m.d.value))
            + size(square)
            + 4.0 * size(cross);
        let factored_noise = noise / denominator.leading();
        if factored_noise < direct_noise {
            ((square + cross) / denominator, T::UNIT * factored_noise)
        } else {
            (direct, T::UNIT * direct_noise)
        }
    }

    fn integrated_states(&self) -> f64 {
        let positive = self.trace().value.leading() >= 0.0;
        let (excess, _) = self.excess(positive);
        let excess = excess.leading() * power_of_two(self.exponent);
        let even = self.count % 2 == 0;
        if excess >= 0.0 {
            // an even gap has D > 0
            return (self.count + usize::from(even != positive)) as f64;
        }
        // angle from the nearer edge: |D|/2 = cos θ, −excess = 4 sin²(θ/2)
        let angle = 2.0 * (0.5 * (-excess).sqrt()).min(1.0).asin() / PI;
        // c + acos(±D/2)/π is c + angle where ±D > 0, else c + 1 − angle
        if even == positive {
            self.count as f64 + angle
        } else {
            (self.count + 1) as f64 - angle
        }
    }
}

#[cfg(test)]
mod tests {
    use super::super::cell::{Cell, Mass, Piece, prepare};
    use super::super::double::Double;
    use super::*;

    /// det M = 1 at every energy, and N(E) never falls.
    #[test]
    fn determinant_is_one_and_states_never_fall() {
        let mass = |value: f64| Mass { value, slope: 0.01 };
        let cell = Cell {
            pieces: vec![
                Piece::Flat {
                    length: 0.8,
                    potential: 3.0,
                    mass: mass(0.5),
                },
                Piece::Delta { strength: -1.5 },
                Piece::Ramp {
                    length: 1.1,
                    potential: [0.0, 7.0],
                    mass: [mass(1.0), mass(0.4)],
                },
                Piece::Smooth {
                    length: 0.9,
                    samples: (0..13).map(|i| f64::from(i).sin()).collect(),
                    mass: [mass(0.4), mass(0.6)],
                },
            ],
        };
        let ready = prepare(&cell).expect("a sound cell");
        let mut last = 0.0;
        for i in 0..600 {
            let energy = -5.0 + 0.1 * f64::from(i);
            let whole = product(&ready, Double::new(energy));
            let m = whole.matrix.shifted(whole.exponent);
            let determinant = m.a * m.d - m.b * m.c - Double::new(1.0);
            let size = m.a.high.abs() * m.d.high.abs() + m.b.high.abs() * m.c.high.abs();
            assert!(
                determinant.high.abs() < 1e-28 * size,
                "{energy}: {determinant:?}"
            );
            let budget = super::super::Budget::default();
            let states = read(&ready, energy, &Meter::new(&budget))
                .expect("a sweep")
                .states;
            assert!(states >= last, "{energy}: {states} after {last}");
            last = states;
        }
        assert!(last > 5.0);
    }
}
