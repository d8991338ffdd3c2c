//! What formulas compute with: plain numbers, or numbers with derivatives.

use super::Dual;

/// Arithmetic shared by `f64` (fast) and [`Dual`] (with derivatives).
pub trait Scalar: Clone {
    /// A number that depends on nothing.
    fn number(value: f64) -> Self;
    /// Its value.
    fn value(&self) -> f64;
    /// A number with its derivatives, or without where they are not kept.
    fn lift(dual: &Dual) -> Self;
    /// A function of self: its value, and its derivative at self.
    #[must_use]
    fn chain(&self, value: f64, slope: impl FnOnce() -> f64) -> Self;
    /// Sum.
    #[must_use]
    fn plus(&self, other: &Self) -> Self;
    /// Difference.
    #[must_use]
    fn minus(&self, other: &Self) -> Self;
    /// Product.
    #[must_use]
    fn times(&self, other: &Self) -> Self;
    /// Quotient.
    #[must_use]
    fn over(&self, other: &Self) -> Self;
    /// Power.
    #[must_use]
    fn power(&self, exponent: &Self) -> Self;

    /// Negative.
    #[must_use]
    fn negative(&self) -> Self {
        self.chain(-self.value(), || -1.0)
    }
    /// A multiple.
    #[must_use]
    fn scaled(&self, factor: f64) -> Self {
        self.chain(factor * self.value(), || factor)
    }
    /// A shift.
    #[must_use]
    fn shifted(&self, by: f64) -> Self {
        self.chain(self.value() + by, || 1.0)
    }
    /// Square.
    #[must_use]
    fn squared(&self) -> Self {
        let value = self.value();
        self.chain(value * value, || 2.0 * value)
    }
    /// Square root.
    #[must_use]
    fn root(&self) -> Self {
        let root = self.value().sqrt();
        self.chain(root, || 0.5 / root)
    }
    /// Exponential.
    #[must_use]
    fn exponential(&self) -> Self {
        let value = self.value().exp();
        self.chain(value, || value)
    }
    /// Sine.
    #[must_use]
    fn sine(&self) -> Self {
        let value = self.value();
        self.chain(value.sin(), || value.cos())
    }
    /// Cosine.
    #[must_use]
    fn cosine(&self) -> Self {
        let value = self.value();
        self.chain(value.cos(), || -value.sin())
    }
}

impl Scalar for f64 {
    fn number(value: f64) -> Self {
        value
    }
    fn value(&self) -> f64 {
        *self
    }
    fn lift(dual: &Dual) -> Self {
        dual.value
    }
    fn chain(&self, value: f64, _slope: impl FnOnce() -> f64) -> Self {
        value
    }
    fn plus(&self, other: &Self) -> Self {
        self + other
    }
    fn minus(&self, other: &Self) -> Self {
        self - other
    }
    fn times(&self, other: &Self) -> Self {
        self * other
    }
    fn over(&self, other: &Self) -> Self {
        self / other
    }
    fn power(&self, exponent: &Self) -> Self {
        self.powf(*exponent)
    }
}
