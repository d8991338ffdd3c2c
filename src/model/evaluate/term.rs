//! What an expression comes to: a value where nothing in it varies, else a formula.

use crate::model::formula::{binary, whole_power};
use crate::model::functions::apply;
use crate::model::{Dual, Formula, Quantity, Scalar, TargetFormula};
use crate::syntax::Operator;

/// Values, variables and quantities, combined.
#[derive(Clone, Debug)]
pub(crate) enum Term {
    Constant(Dual),
    Variable(usize),
    Quantity(Box<Quantity>),
    Negative(Box<Term>),
    Binary(Operator, Box<Term>, Box<Term>),
    Call(&'static str, Vec<Term>),
}

impl Term {
    pub(super) fn negative(self) -> Self {
        match self {
            Self::Constant(value) => Self::Constant(-&value),
            other => Self::Negative(Box::new(other)),
        }
    }

    pub(super) fn binary(operator: Operator, left: Self, right: Self) -> Self {
        match (left, right) {
            (Self::Constant(left), Self::Constant(right)) => {
                Self::Constant(combine(operator, &left, &right))
            }
            (left, right) => Self::Binary(operator, Box::new(left), Box::new(right)),
        }
    }

    pub(super) fn call(name: &'static str, arguments: Vec<Self>) -> Self {
        let values: Vec<Dual> = arguments
            .iter()
            .filter_map(|one| one.value().cloned())
            .collect();
        if values.len() == arguments.len() {
            return Self::Constant(apply(name, &values));
        }
        Self::Call(name, arguments)
    }

    /// The value, where nothing varies.
    pub(crate) fn value(&self) -> Option<&Dual> {
        match self {
            Self::Constant(value) => Some(value),
            _ => None,
        }
    }

    /// As a formula of the position; quantities of bands cannot be part of one.
    pub(crate) fn into_formula(self) -> Option<Formula> {
        Some(match self {
            Self::Constant(value) => Formula::Constant(value),
            Self::Variable(index) => Formula::Variable(index),
            Self::Quantity(_) => return None,
            Self::Negative(inner) => Formula::Negative(Box::new(inner.into_formula()?)),
            Self::Binary(operator, left, right) => Formula::Binary(
                operator,
                Box::new(left.into_formula()?),
                Box::new(right.into_formula()?),
            ),
            Self::Call(name, arguments) => Formula::Call(
                name,
                arguments
                    .into_iter()
                    .map(Self::into_formula)
                    .collect::<Option<_>>()?,
            ),
        })
    }

    /// As a formula of band quantities; variables cannot be part of one.
    pub(crate) fn into_target(self) -> Option<TargetFormula> {
        Some(match self {
            Self::Constant(value) => TargetFormula::Constant(value),
            Self::Variable(_) => return None,
            Self::Quantity(quantity) => TargetFormula::Quantity(*quantity),
            Self::Negative(inner) => TargetFormula::Negative(Box::new(inner.into_target()?)),
            Self::Binary(operator, left, right) => TargetFormula::Binary(
                operator,
                Box::new(left.into_target()?),
                Box::new(right.into_target()?),
            ),
            Self::Call(name, arguments) => TargetFormula::Call(
                name,
                arguments
                    .into_iter()
                    .map(Self::into_target)
                    .collect::<Option<_>>()?,
            ),
        })
    }
}

fn combine(operator: Operator, left: &Dual, right: &Dual) -> Dual {
    let n = right.value;
    let whole = right.slopes.is_empty() && n.fract() == 0.0 && n.abs() <= 64.0;
    if operator == Operator::Power && whole {
        return whole_power(left, n);
    }
    binary(operator, left, right)
}

impl TargetFormula {
    /// The value, given that of each quantity; `None` where one of them has none.
    pub fn evaluate<S: Scalar>(
        &self,
        quantity: &mut impl FnMut(&Quantity) -> Option<S>,
    ) -> Option<S> {
        Some(match self {
            Self::Constant(value) => S::lift(value),
            Self::Quantity(wanted) => quantity(wanted)?,
            Self::Negative(inner) => inner.evaluate(quantity)?.negative(),
            Self::Binary(operator, left, right) => binary(
                *operator,
                &left.evaluate(quantity)?,
                &right.evaluate(quantity)?,
            ),
            Self::Call(name, arguments) => {
                let mut values = Vec::with_capacity(arguments.len());
                for argument in arguments {
                    values.push(argument.evaluate(quantity)?);
                }
                apply(name, &values)
            }
        })
    }

    /// Every quantity in it.
    #[must_use]
    pub fn quantities(&self) -> Vec<&Quantity> {
        match self {
            Self::Constant(_) => Vec::new(),
            Self::Quantity(quantity) => vec![quantity],
            Self::Negative(inner) => inner.quantities(),
            Self::Binary(_, left, right) => {
                let mut all = left.quantities();
                all.extend(right.quantities());
                all
            }
            Self::Call(_, arguments) => arguments.iter().flat_map(Self::quantities).collect(),
        }
    }
}
