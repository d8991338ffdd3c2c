//! Numbers that carry their exact derivatives with respect to what the file says.
//!
//! The derivatives are sparse: a crystal of a thousand layers has thousands of
//! parameters, yet each of its numbers depends on a handful.

use std::ops::{Add, Div, Mul, Neg, Sub};

use super::hash::mix;
use super::{Place, Scalar};

/// Names something that a number can depend on: a literal, a named value, a material's field, a tolerance.
/// A hash of kind and place, so that the same literal has the same name wherever it is used.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub struct ParameterId(pub u64);

/// The sorts of parameter as they enter its identity.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum ParameterSort {
    /// A number in the text.
    Literal = 11,
    /// A named value.
    Name = 12,
    /// A material's field.
    Field = 13,
    /// A tolerance.
    Draw = 14,
}

impl ParameterId {
    /// The position variables `x`, `y`, `z` of a profile, and `q` of a form factor (as the first).
    pub const POSITION: [Self; 3] = [Self(1), Self(2), Self(3)];

    /// The identity of what is written at a place (its first byte counts).
    #[must_use]
    pub fn of(sort: ParameterSort, place: Place) -> Self {
        Self(mix(&[
            sort as u64,
            place.file.0,
            place.section.0,
            u64::from(place.span.start),
        ]))
    }
}

/// A value in SI units and its derivatives.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Dual {
    /// The value.
    pub value: f64,
    /// Derivatives with respect to parameters, sorted by parameter, zero where absent.
    pub slopes: Vec<(ParameterId, f64)>,
}

impl Dual {
    /// A number that depends on nothing.
    #[must_use]
    pub fn constant(value: f64) -> Self {
        Self {
            value,
            slopes: Vec::new(),
        }
    }

    /// A parameter itself: derivative 1.
    #[must_use]
    pub fn parameter(value: f64, id: ParameterId) -> Self {
        Self {
            value,
            slopes: vec![(id, 1.0)],
        }
    }

    /// Its derivative with respect to one parameter.
    #[must_use]
    pub fn slope(&self, id: ParameterId) -> f64 {
        self.slopes
            .binary_search_by_key(&id, |(of, _)| *of)
            .ok()
            .and_then(|index| self.slopes.get(index))
            .map_or(0.0, |(_, slope)| *slope)
    }

    /// The same number, its derivative with respect to one more parameter increased.
    #[must_use]
    pub fn with_slope(mut self, id: ParameterId, slope: f64) -> Self {
        match self.slopes.binary_search_by_key(&id, |(of, _)| *of) {
            Ok(index) => {
                if let Some(entry) = self.slopes.get_mut(index) {
                    entry.1 += slope;
                }
            }
            Err(index) => self.slopes.insert(index, (id, slope)),
        }
        self
    }

    /// The sum of many; the derivatives are sorted once.
    #[must_use]
    pub fn sum<'d>(parts: impl IntoIterator<Item = &'d Self>) -> Self {
        let mut value = 0.0;
        let mut all: Vec<(ParameterId, f64)> = Vec::new();
        for part in parts {
            value += part.value;
            all.extend_from_slice(&part.slopes);
        }
        all.sort_unstable_by_key(|(id, _)| *id);
        let mut slopes: Vec<(ParameterId, f64)> = Vec::with_capacity(all.len());
        for (id, slope) in all {
            match slopes.last_mut() {
                Some(last) if last.0 == id => last.1 += slope,
                _ => slopes.push((id, slope)),
            }
        }
        Self { value, slopes }
    }

    /// `value` with the derivatives `a`·self + `b`·other.
    fn merge(value: f64, left: &Self, a: f64, right: &Self, b: f64) -> Self {
        if right.slopes.is_empty() {
            return left.scaled_slopes(value, a);
        }
        if left.slopes.is_empty() {
            return right.scaled_slopes(value, b);
        }
        let mut slopes = Vec::with_capacity(left.slopes.len() + right.slopes.len());
        let mut others = right.slopes.iter().peekable();
        for (id, slope) in &left.slopes {
            while let Some((other, extra)) = others.next_if(|(other, _)| other < id) {
                slopes.push((*other, b * extra));
            }
            let shared = others.next_if(|(other, _)| other == id);
            slopes.push((*id, a * slope + shared.map_or(0.0, |(_, extra)| b * extra)));
        }
        slopes.extend(others.map(|(other, extra)| (*other, b * extra)));
        Self { value, slopes }
    }

    fn scaled_slopes(&self, value: f64, factor: f64) -> Self {
        let slopes = self
            .slopes
            .iter()
            .map(|(id, slope)| (*id, factor * slope))
            .collect();
        Self { value, slopes }
    }
}

impl Scalar for Dual {
    fn number(value: f64) -> Self {
        Self::constant(value)
    }
    fn value(&self) -> f64 {
        self.value
    }
    fn lift(dual: &Dual) -> Self {
        dual.clone()
    }
    fn chain(&self, value: f64, slope: impl FnOnce() -> f64) -> Self {
        if self.slopes.is_empty() {
            return Self::constant(value);
        }
        self.scaled_slopes(value, slope())
    }
    fn plus(&self, other: &Self) -> Self {
        Self::merge(self.value + other.value, self, 1.0, other, 1.0)
    }
    fn minus(&self, other: &Self) -> Self {
        Self::merge(self.value - other.value, self, 1.0, other, -1.0)
    }
    fn times(&self, other: &Self) -> Self {
        Self::merge(
            self.value * other.value,
            self,
            other.value,
            other,
            self.value,
        )
    }
    fn over(&self, other: &Self) -> Self {
        let value = self.value / other.value;
        let inverse = 1.0 / other.value;
        Self::merge(value, self, inverse, other, -value * inverse)
    }
    fn power(&self, exponent: &Self) -> Self {
        let (u, n) = (self.value, exponent.value);
        let value = u.powf(n);
        let of_base = if n == 0.0 { 0.0 } else { n * u.powf(n - 1.0) };
        // The exponent of a base that is not positive can only be a fixed whole number.
        let of_exponent = if u > 0.0 { value * u.ln() } else { 0.0 };
        Self::merge(value, self, of_base, exponent, of_exponent)
    }
}

macro_rules! operator {
    ($trait:ident, $method:ident, $with:ident) => {
        impl $trait for &Dual {
            type Output = Dual;
            fn $method(self, other: &Dual) -> Dual {
                Scalar::$with(self, other)
            }
        }
        impl $trait for Dual {
            type Output = Dual;
            fn $method(self, other: Dual) -> Dual {
                Scalar::$with(&self, &other)
            }
        }
        impl $trait<f64> for &Dual {
            type Output = Dual;
            fn $method(self, other: f64) -> Dual {
                Scalar::$with(self, &Dual::constant(other))
            }
        }
    };
}
operator!(Add, add, plus);
operator!(Sub, sub, minus);
operator!(Mul, mul, times);
operator!(Div, div, over);

impl Neg for &Dual {
    type Output = Dual;
    fn neg(self) -> Dual {
        self.scaled_slopes(-self.value, -1.0)
    }
}
