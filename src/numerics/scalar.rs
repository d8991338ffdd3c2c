//! Numbers a sweep can run on: `f64`, [`Double`](super::double::Double), and duals over either.
//!
//! A dual x + x′ε (ε² = 0) carries a derivative by the product rule; a dual over a dual carries
//! the second derivative in `slope.slope`. No differences are taken anywhere.

use std::ops::{Add, Div, Mul, Neg, Sub};

/// What the transfer matrices need of a number.
pub(crate) trait Scalar:
    Copy
    + Add<Output = Self>
    + Sub<Output = Self>
    + Mul<Output = Self>
    + Div<Output = Self>
    + Neg<Output = Self>
{
    /// The real numbers underneath: `f64` or `Double`.
    type Real: Copy;
    /// Relative rounding unit of the leading part.
    const UNIT: f64;
    /// A constant.
    fn constant(value: f64) -> Self;
    /// The leading part, rounded to `f64`.
    fn leading(self) -> f64;
    /// The value as a `Double`, derivatives dropped.
    fn to_double(self) -> super::double::Double;
    /// Largest magnitude among all parts, derivatives included.
    fn magnitude(self) -> f64;
    /// The magnitude of each part by itself, derivatives included.
    fn absolute(self) -> Self;
    /// Product with an `f64`.
    fn times(self, factor: f64) -> Self;
    /// A `Double` rounded to a real.
    fn real(value: super::double::Double) -> Self::Real;
    /// A real as a constant.
    fn lift(value: Self::Real) -> Self;
    /// Product of two reals.
    fn real_times(value: Self::Real, factor: Self::Real) -> Self::Real;
    /// Sum of two reals.
    fn real_plus(value: Self::Real, other: Self::Real) -> Self::Real;
    /// Product with a real.
    fn scaled(self, factor: Self::Real) -> Self;
    /// 1/n as a real, n ≥ 1 and below 128.
    fn reciprocal(n: usize) -> Self::Real;
    /// Product with 2^`power`; a result below the range is zero.
    fn shifted(self, power: i64) -> Self;
    /// The functions of [`entire`](super::entire): f₀ … f_{count−1} at `self`, and the power of
    /// two they all are to be multiplied with. `count` is at most 6 less the depth of duals.
    fn entire(self, count: usize) -> ([Self; 6], i64);
}

/// 2^`power` as `f64`, 0 or ∞ outside the range.
pub(crate) fn power_of_two(power: i64) -> f64 {
    if power < -1022 {
        if power < -1074 {
            0.0
        } else {
            f64::from_bits(1u64 << (power + 1074))
        }
    } else if power > 1023 {
        f64::INFINITY
    } else {
        f64::from_bits(((power + 1023) as u64) << 52)
    }
}

impl Scalar for f64 {
    type Real = f64;
    fn real(value: super::double::Double) -> f64 {
        value.round()
    }
    fn lift(value: f64) -> Self {
        value
    }
    fn real_times(value: f64, factor: f64) -> f64 {
        value * factor
    }
    #[inline(always)]
    fn real_plus(value: f64, other: f64) -> f64 {
        value + other
    }
    #[inline(always)]
    fn scaled(self, factor: f64) -> Self {
        self * factor
    }
    #[inline(always)]
    fn reciprocal(n: usize) -> f64 {
        1.0 / n as f64
    }
    const UNIT: f64 = f64::EPSILON / 2.0;
    fn constant(value: f64) -> Self {
        value
    }
    fn leading(self) -> f64 {
        self
    }
    fn to_double(self) -> super::double::Double {
        super::double::Double::new(self)
    }
    fn magnitude(self) -> f64 {
        self.abs()
    }
    fn absolute(self) -> Self {
        self.abs()
    }
    fn times(self, factor: f64) -> Self {
        self * factor
    }
    fn shifted(self, power: i64) -> Self {
        self * power_of_two(power)
    }
    fn entire(self, count: usize) -> ([Self; 6], i64) {
        super::entire::entire_single(self, count)
    }
}

/// A value and its derivative.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Dual<S> {
    pub value: S,
    pub slope: S,
}

impl<S: Scalar> Dual<S> {
    /// The variable itself: slope one.
    pub fn variable(value: S) -> Self {
        Dual {
            value,
            slope: S::constant(1.0),
        }
    }
}

impl<S: Scalar> Add for Dual<S> {
    type Output = Self;
    fn add(self, other: Self) -> Self {
        Dual {
            value: self.value + other.value,
            slope: self.slope + other.slope,
        }
    }
}

impl<S: Scalar> Sub for Dual<S> {
    type Output = Self;
    fn sub(self, other: Self) -> Self {
        Dual {
            value: self.value - other.value,
            slope: self.slope - other.slope,
        }
    }
}

impl<S: Scalar> Mul for Dual<S> {
    type Output = Self;
    fn mul(self, other: Self) -> Self {
        Dual {
            value: self.value * other.value,
            slope: self.value * other.slope + self.slope * other.value,
        }
    }
}

impl<S: Scalar> Div for Dual<S> {
    type Output = Self;
    fn div(self, other: Self) -> Self {
        let value = self.value / other.value;
        Dual {
            value,
            slope: (self.slope - value * other.slope) / other.value,
        }
    }
}

impl<S: Scalar> Neg for Dual<S> {
    type Output = Self;
    fn neg(self) -> Self {
        Dual {
            value: -self.value,
            slope: -self.slope,
        }
    }
}

impl<S: Scalar> Scalar for Dual<S> {
    type Real = S::Real;
    fn real(value: super::double::Double) -> S::Real {
        S::real(value)
    }
    fn lift(value: S::Real) -> Self {
        Dual {
            value: S::lift(value),
            slope: S::constant(0.0),
        }
    }
    fn real_times(value: S::Real, factor: S::Real) -> S::Real {
        S::real_times(value, factor)
    }
    #[inline(always)]
    fn real_plus(value: S::Real, other: S::Real) -> S::Real {
        S::real_plus(value, other)
    }
    #[inline(always)]
    fn scaled(self, factor: S::Real) -> Self {
        Dual {
            value: self.value.scaled(factor),
            slope: self.slope.scaled(factor),
        }
    }
    #[inline(always)]
    fn reciprocal(n: usize) -> S::Real {
        S::reciprocal(n)
    }
    const UNIT: f64 = S::UNIT;
    fn constant(value: f64) -> Self {
        Dual {
            value: S::constant(value),
            slope: S::constant(0.0),
        }
    }
    fn leading(self) -> f64 {
        self.value.leading()
    }
    fn to_double(self) -> super::double::Double {
        self.value.to_double()
    }
    fn magnitude(self) -> f64 {
        self.value.magnitude().max(self.slope.magnitude())
    }
    fn absolute(self) -> Self {
        Dual {
            value: self.value.absolute(),
            slope: self.slope.absolute(),
        }
    }
    fn times(self, factor: f64) -> Self {
        Dual {
            value: self.value.times(factor),
            slope: self.slope.times(factor),
        }
    }
    fn shifted(self, power: i64) -> Self {
        Dual {
            value: self.value.shifted(power),
            slope: self.slope.shifted(power),
        }
    }
    /// f_n′ = f_{n+1} / (2(2n+1)).
    fn entire(self, count: usize) -> ([Self; 6], i64) {
        let (base, exponent) = self.value.entire(count + 1);
        let mut result = [Self::constant(0.0); 6];
        for n in 0..count {
            let derivative = base[n + 1].times(0.5) * self.slope / S::constant((2 * n + 1) as f64);
            result[n] = Dual {
                value: base[n],
                slope: derivative,
            };
        }
        (result, exponent)
    }
}
