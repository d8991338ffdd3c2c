//! Double-double numbers: an unevaluated sum of two `f64`, 106 bits, unit 2⁻¹⁰⁴ or better.
//!
//! Sums by Knuth's and Dekker's exact transformations, products by Dekker's splitting
//! (Dekker, Numer. Math. 18, 224 (1971); Knuth, *The Art of Computer Programming* 2, 4.2.2;
//! error bounds: Joldes, Muller & Popescu, ACM Trans. Math. Softw. 44, 15 (2017)). The splitting
//! is used rather than a fused multiply-add, which is a slow call on machines built for the
//! baseline instruction set.
//!
//! Valid for magnitudes between about 2⁻⁹⁰⁰ and 2⁹⁹⁰; the sweep keeps its numbers far inside.

use super::scalar::{Scalar, power_of_two};
use std::ops::{Add, Div, Mul, Neg, Sub};
use std::sync::LazyLock;

/// high + low, |low| ≤ ulp(high)/2.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(crate) struct Double {
    pub high: f64,
    pub low: f64,
}

#[inline(always)]
fn two_sum(a: f64, b: f64) -> (f64, f64) {
    let sum = a + b;
    let rest = sum - a;
    (sum, (a - (sum - rest)) + (b - rest))
}

#[inline(always)]
fn quick_two_sum(a: f64, b: f64) -> (f64, f64) {
    let sum = a + b;
    (sum, b - (sum - a))
}

#[inline(always)]
fn split(a: f64) -> (f64, f64) {
    let c = 134_217_729.0 * a;
    let high = c - (c - a);
    (high, a - high)
}

#[inline(always)]
fn two_product(a: f64, b: f64) -> (f64, f64) {
    let product = a * b;
    let (ah, al) = split(a);
    let (bh, bl) = split(b);
    (product, ((ah * bh - product) + ah * bl + al * bh) + al * bl)
}

impl Double {
    pub const ZERO: Double = Double {
        high: 0.0,
        low: 0.0,
    };

    #[inline(always)]
    pub fn new(high: f64) -> Self {
        Double { high, low: 0.0 }
    }

    /// Rounded to the nearest `f64`.
    pub fn round(self) -> f64 {
        self.high + self.low
    }
}

impl Add for Double {
    type Output = Self;
    #[inline(always)]
    fn add(self, other: Self) -> Self {
        let (s, e) = two_sum(self.high, other.high);
        let (t, f) = two_sum(self.low, other.low);
        let (s, e) = quick_two_sum(s, e + t);
        let (high, low) = quick_two_sum(s, e + f);
        Double { high, low }
    }
}

impl Neg for Double {
    type Output = Self;
    #[inline(always)]
    fn neg(self) -> Self {
        Double {
            high: -self.high,
            low: -self.low,
        }
    }
}

impl Sub for Double {
    type Output = Self;
    #[inline(always)]
    fn sub(self, other: Self) -> Self {
        self + (-other)
    }
}

impl Mul for Double {
    type Output = Self;
    #[inline(always)]
    fn mul(self, other: Self) -> Self {
        let (p, e) = two_product(self.high, other.high);
        let (high, low) = quick_two_sum(p, e + (self.high * other.low + self.low * other.high));
        Double { high, low }
    }
}

impl Div for Double {
    type Output = Self;
    fn div(self, other: Self) -> Self {
        let first = self.high / other.high;
        let rest = self - other.times(first);
        let second = rest.high / other.high;
        let rest = rest - other.times(second);
        let third = rest.high / other.high;
        let (high, low) = quick_two_sum(first, second);
        Double { high, low } + Double::new(third)
    }
}

static RECIPROCALS: LazyLock<Vec<Double>> = LazyLock::new(|| {
    (0..128)
        .map(|n| Double::new(1.0) / Double::new((n as f64).max(1.0)))
        .collect()
});

impl Scalar for Double {
    type Real = Double;
    fn real(value: Double) -> Double {
        value
    }
    fn lift(value: Double) -> Self {
        value
    }
    fn real_times(value: Double, factor: Double) -> Double {
        value * factor
    }
    fn real_plus(value: Double, other: Double) -> Double {
        value + other
    }
    #[inline(always)]
    fn scaled(self, factor: Double) -> Self {
        self * factor
    }
    fn reciprocal(n: usize) -> Double {
        RECIPROCALS[n]
    }
    const UNIT: f64 = 1.0 / (1u128 << 104) as f64;
    fn constant(value: f64) -> Self {
        Double::new(value)
    }
    fn leading(self) -> f64 {
        self.high
    }
    fn to_double(self) -> Double {
        self
    }
    fn magnitude(self) -> f64 {
        self.high.abs()
    }
    fn absolute(self) -> Self {
        if self.high < 0.0 { -self } else { self }
    }
    #[inline(always)]
    fn times(self, factor: f64) -> Self {
        let (p, e) = two_product(self.high, factor);
        let (high, low) = quick_two_sum(p, e + self.low * factor);
        Double { high, low }
    }
    fn shifted(self, power: i64) -> Self {
        let factor = power_of_two(power);
        Double {
            high: self.high * factor,
            low: self.low * factor,
        }
    }
    fn entire(self, count: usize) -> ([Self; 6], i64) {
        super::entire::entire_double(self, count)
    }
}
