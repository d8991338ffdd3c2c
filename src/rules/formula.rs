//! What rules ask of the formulas of targets.

use crate::model::{Quantity, TargetFormula};
use crate::syntax::Operator;

/// Whether two formulas say the same, wherever they stand.
#[must_use]
pub fn same(one: &TargetFormula, other: &TargetFormula) -> bool {
    use TargetFormula::{Binary, Call, Constant, Negative, Quantity};
    match (one, other) {
        (Constant(one), Constant(other)) => one.value == other.value,
        (Quantity(one), Quantity(other)) => one.of == other.of && one.kind == other.kind,
        (Negative(one), Negative(other)) => same(one, other),
        (Binary(operator, left, right), Binary(other, other_left, other_right)) => {
            operator == other && same(left, other_left) && same(right, other_right)
        }
        (Call(name, arguments), Call(other, others)) => {
            let pairs = arguments.iter().zip(others);
            name == other
                && arguments.len() == others.len()
                && pairs.into_iter().all(|(one, other)| same(one, other))
        }
        _ => false,
    }
}

/// The value of a formula without quantities and functions.
#[must_use]
pub fn value(formula: &TargetFormula) -> Option<f64> {
    match formula {
        TargetFormula::Constant(dual) => Some(dual.value),
        TargetFormula::Negative(inner) => Some(-value(inner)?),
        TargetFormula::Binary(operator, left, right) => {
            let (left, right) = (value(left)?, value(right)?);
            Some(match operator {
                Operator::Add => left + right,
                Operator::Subtract => left - right,
                Operator::Multiply => left * right,
                Operator::Divide => left / right,
                Operator::Power => left.powf(right),
            })
        }
        TargetFormula::Quantity(_) | TargetFormula::Call(..) => None,
    }
}

/// All quantities of a formula.
pub fn quantities<'f>(formula: &'f TargetFormula, found: &mut Vec<&'f Quantity>) {
    match formula {
        TargetFormula::Constant(_) => {}
        TargetFormula::Quantity(quantity) => found.push(quantity),
        TargetFormula::Negative(inner) => quantities(inner, found),
        TargetFormula::Binary(_, left, right) => {
            quantities(left, found);
            quantities(right, found);
        }
        TargetFormula::Call(_, arguments) => {
            arguments.iter().for_each(|part| quantities(part, found))
        }
    }
}
