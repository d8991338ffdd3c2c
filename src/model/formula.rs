//! Values of formulas.

use super::functions::apply;
use super::{Dual, Formula, Scalar};
use crate::syntax::Operator;

impl Formula {
    /// The value at a position in metre (entries past the dimension are ignored).
    #[must_use]
    pub fn at(&self, position: &[f64; 3]) -> f64 {
        self.evaluate(position)
    }

    /// The value with its derivatives with respect to all that the formula and the position depend on.
    #[must_use]
    pub fn dual_at(&self, position: &[Dual; 3]) -> Dual {
        self.evaluate(position)
    }

    /// The value for either kind of number.
    #[must_use]
    pub fn evaluate<S: Scalar>(&self, position: &[S; 3]) -> S {
        match self {
            Self::Constant(value) => S::lift(value),
            Self::Variable(index) => position
                .get(*index)
                .cloned()
                .unwrap_or_else(|| S::number(f64::NAN)),
            Self::Negative(inner) => inner.evaluate(position).negative(),
            Self::Binary(Operator::Power, base, exponent) => {
                power(&base.evaluate(position), exponent, position)
            }
            Self::Binary(operator, left, right) => binary(
                *operator,
                &left.evaluate(position),
                &right.evaluate(position),
            ),
            Self::Call(name, arguments) => match arguments.as_slice() {
                [only] => apply(name, &[only.evaluate(position)]),
                several => {
                    let values: Vec<S> = several.iter().map(|one| one.evaluate(position)).collect();
                    apply(name, &values)
                }
            },
        }
    }

    /// Whether it depends on the position.
    #[must_use]
    pub fn varies(&self) -> bool {
        match self {
            Self::Constant(_) => false,
            Self::Variable(_) => true,
            Self::Negative(inner) => inner.varies(),
            Self::Binary(_, left, right) => left.varies() || right.varies(),
            Self::Call(_, arguments) => arguments.iter().any(Self::varies),
        }
    }
}

/// `left ∘ right`.
#[must_use]
pub fn binary<S: Scalar>(operator: Operator, left: &S, right: &S) -> S {
    match operator {
        Operator::Add => left.plus(right),
        Operator::Subtract => left.minus(right),
        Operator::Multiply => left.times(right),
        Operator::Divide => left.over(right),
        Operator::Power => left.power(right),
    }
}

/// Whole powers by multiplication: exact for negative bases, and fast.
fn power<S: Scalar>(base: &S, exponent: &Formula, position: &[S; 3]) -> S {
    if let Formula::Constant(fixed) = exponent {
        let n = fixed.value;
        if fixed.slopes.is_empty() && n.fract() == 0.0 && n.abs() <= 64.0 {
            return whole_power(base, n);
        }
    }
    base.power(&exponent.evaluate(position))
}

/// `base` to a whole power of at most 64 in magnitude.
#[must_use]
pub fn whole_power<S: Scalar>(base: &S, exponent: f64) -> S {
    #[expect(
        clippy::cast_possible_truncation,
        reason = "the caller keeps it within 64"
    )]
    let n = exponent as i32;
    let u = base.value();
    base.chain(u.powi(n), || {
        if n == 0 {
            0.0
        } else {
            f64::from(n) * u.powi(n - 1)
        }
    })
}
