//! Values: tolerances, and the dimension that a place wants.

use super::{Context, Evaluator, Term, Typed, is_bare};
use crate::model::dual::ParameterSort;
use crate::model::{Dimension, Dual, Parameter, ParameterId, ParameterKind, Scalar};
use crate::syntax::{Expression, ExpressionKind, Operator, Value};

impl<'w> Evaluator<'w> {
    /// A value of the wanted dimension (any, where none is wanted).
    pub(crate) fn value(
        &mut self,
        value: &'w Value,
        wanted: Option<Dimension>,
        context: &Context<'_, 'w>,
    ) -> Option<Typed> {
        let nominal = self.expression(&value.expression, context)?;
        let Some(tolerance) = &value.tolerance else {
            return self.settle(nominal, &value.expression, wanted, context);
        };
        let (half, dimension) = self.half_width(&value.expression, &nominal, tolerance, context)?;
        let nominal = Typed {
            dimension,
            zero: nominal.zero && dimension.is_number(),
            ..nominal
        };
        let nominal = self.settle(nominal, &value.expression, wanted, context)?;
        let place = context.place(value.span);
        let id = ParameterId::of(ParameterSort::Draw, place);
        let shift = half
            .scaled(self.setting.draw(id))
            .with_slope(id, half.value);
        self.note_parameter(Parameter {
            id,
            kind: ParameterKind::Draw,
            place,
            text: context.spot.text(value.span).to_owned(),
            value: half.value,
            dimension: nominal.dimension,
            unit: None,
        });
        let term = Term::binary(Operator::Add, nominal.term, Term::Constant(shift));
        Some(Typed::new(term, nominal.dimension))
    }

    /// Half the width of the interval that a tolerance spans, and the dimension of both sides.
    fn half_width(
        &mut self,
        left: &'w Expression,
        nominal: &Typed,
        tolerance: &'w Expression,
        context: &Context<'_, 'w>,
    ) -> Option<(Dual, Dimension)> {
        let right = self.expression(tolerance, context)?;
        let place = context.place(tolerance.span);
        let (Some(centre), Some(half)) = (nominal.term.value(), right.term.value()) else {
            return self.bad(
                place,
                "a tolerance stands only beside a value that is fixed",
            );
        };
        let relative = is_relative(left, tolerance);
        let dimension = if relative {
            nominal.dimension * right.dimension
        } else {
            self.common_dimension(&[(left, nominal), (tolerance, &right)], context)?
        };
        if relative && !right.dimension.is_number() {
            return self.wrong(tolerance, "a number", right.dimension, context);
        }
        if half.value < 0.0 {
            let text = context.spot.text(tolerance.span);
            return self.bad(
                place,
                format!("a tolerance is not negative, and `{text}` is"),
            );
        }
        let half = if relative {
            half.times(&magnitude(centre))
        } else {
            half.clone()
        };
        Some((half, dimension))
    }

    /// Checks that a term has the wanted dimension.
    pub(crate) fn settle(
        &mut self,
        typed: Typed,
        expression: &'w Expression,
        wanted: Option<Dimension>,
        context: &Context<'_, 'w>,
    ) -> Option<Typed> {
        match wanted {
            Some(wanted) if typed.zero => Some(Typed {
                dimension: wanted,
                ..typed
            }),
            Some(wanted) if typed.dimension != wanted => {
                self.mismatch(expression, wanted, typed.dimension, context)
            }
            _ => Some(typed),
        }
    }

    /// The number that a value of the wanted dimension comes to, in SI units.
    pub(crate) fn quantity_of(
        &mut self,
        value: &'w Value,
        wanted: Dimension,
        context: &Context<'_, 'w>,
    ) -> Option<Dual> {
        let typed = self.value(value, Some(wanted), context)?;
        match typed.term {
            Term::Constant(value) => Some(value),
            _ => self.bad(context.place(value.span), "a fixed value is wanted here"),
        }
    }

    /// The same where it must be positive; `what` names it ("a thickness").
    pub(crate) fn positive(
        &mut self,
        value: &'w Value,
        wanted: Dimension,
        what: &str,
        context: &Context<'_, 'w>,
    ) -> Option<Dual> {
        let found = self.quantity_of(value, wanted, context)?;
        let text = context.spot.text(value.span);
        if found.value <= 0.0 || found.value.is_nan() {
            let reason = format!("{what} is positive, and `{text}` is not");
            return self.bad(context.place(value.span), reason);
        }
        if !self.stays_positive(&found) {
            return self.bad(context.place(value.span), past_zero(what, text));
        }
        Some(found)
    }

    /// Whether a positive number is positive over its tolerances too, to first order in them.
    pub(crate) fn stays_positive(&self, found: &Dual) -> bool {
        let slopes = found
            .slopes
            .iter()
            .filter(|(id, _)| self.draws.contains(id));
        let fall: f64 = slopes.map(|(_, slope)| slope.abs()).sum();
        !self.setting.draws.is_empty() || fall < found.value
    }

    /// A length, or a bare number; says which.
    pub(crate) fn length_or_number(
        &mut self,
        value: &'w Value,
        context: &Context<'_, 'w>,
    ) -> Option<(Dual, bool)> {
        let typed = self.value(value, None, context)?;
        let is_length = typed.dimension == Dimension::LENGTH;
        if !is_length && !typed.dimension.is_number() {
            return self.wrong(&value.expression, "a length", typed.dimension, context);
        }
        match typed.term {
            Term::Constant(value) => Some((value, is_length)),
            _ => self.bad(context.place(value.span), "a fixed value is wanted here"),
        }
    }
}

/// Whether a tolerance (or a `within`) is a share of the value beside it: a literal in `%`, unless that value is itself one.
pub(crate) fn is_relative(left: &Expression, tolerance: &Expression) -> bool {
    has_percent(tolerance) && !is_percent(left)
}

fn is_percent(expression: &Expression) -> bool {
    match &expression.kind {
        ExpressionKind::Number {
            unit: Some(unit), ..
        } => unit.name.text == "%",
        ExpressionKind::Negative(inner) => is_percent(inner),
        _ => false,
    }
}

/// A literal in `%`, alone or as a factor beside bare numbers.
fn has_percent(expression: &Expression) -> bool {
    if is_percent(expression) {
        return true;
    }
    match &expression.kind {
        ExpressionKind::Binary {
            operator: Operator::Multiply,
            left,
            right,
            ..
        } => (has_percent(left) && is_bare(right)) || (is_bare(left) && has_percent(right)),
        ExpressionKind::Binary {
            operator: Operator::Divide,
            left,
            right,
            ..
        } => has_percent(left) && is_bare(right),
        _ => false,
    }
}

fn magnitude(value: &Dual) -> Dual {
    if value.value < 0.0 {
        -value
    } else {
        value.clone()
    }
}

/// Why a positive number whose tolerance reaches zero is none.
pub(crate) fn past_zero(what: &str, text: &str) -> String {
    format!("{what} is positive, and `{text}` reaches zero within its tolerance")
}
