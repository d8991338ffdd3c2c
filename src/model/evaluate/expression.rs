//! Operators and functions: dimensions, and results that are not finite.

use super::{Context, Evaluator, Term, Typed};
use crate::model::functions::{ArgumentRule, FUNCTIONS, function};
use crate::model::words::nearest;
use crate::model::{Dimension, Dual, TroubleKind};
use crate::syntax::{Expression, ExpressionKind, Operator, Word};

/// Below this many bytes of stack an expression goes on in a new piece of it, of `STACK_MORE` bytes: how deep a text nests
/// must not depend on the thread that reads it.
const STACK_LEFT: usize = 256 << 10;
const STACK_MORE: usize = 4 << 20;

impl<'w> Evaluator<'w> {
    /// What an expression comes to.
    pub(crate) fn expression(
        &mut self,
        expression: &'w Expression,
        context: &Context<'_, 'w>,
    ) -> Option<Typed> {
        if self.depth >= super::DEEPEST {
            return self.bad(
                context.place(expression.span),
                format!(
                    "this is too long, or nests too deep: more than {} steps",
                    super::DEEPEST
                ),
            );
        }
        self.depth += 1;
        let result = stacker::maybe_grow(STACK_LEFT, STACK_MORE, || {
            self.dispatch(expression, context)
        });
        self.depth -= 1;
        result
    }

    fn dispatch(&mut self, expression: &'w Expression, context: &Context<'_, 'w>) -> Option<Typed> {
        match &expression.kind {
            ExpressionKind::Number {
                value,
                digits,
                unit,
            } => self.number(expression.span, *value, *digits, unit.as_ref(), context),
            ExpressionKind::Name(name) => self.name(name, expression.span, context),
            ExpressionKind::Negative(inner) => {
                let inner = self.expression(inner, context)?;
                Some(Typed {
                    term: inner.term.negative(),
                    ..inner
                })
            }
            ExpressionKind::Binary {
                operator,
                left,
                right,
                ..
            } => self.binary(expression, *operator, left, right, context),
            ExpressionKind::Call {
                function,
                arguments,
            } => self.call(expression, function, arguments, context),
            ExpressionKind::Quantity(quantity) => self.quantity(quantity, context),
        }
    }

    fn binary(
        &mut self,
        whole: &'w Expression,
        operator: Operator,
        left: &'w Expression,
        right: &'w Expression,
        context: &Context<'_, 'w>,
    ) -> Option<Typed> {
        let a = self.expression(left, context);
        let b = match operator {
            Operator::Power => self.exponent(right, context),
            _ => self.expression(right, context),
        };
        let (a, b) = (a?, b?);
        let dimension = match operator {
            Operator::Add | Operator::Subtract => {
                self.common_dimension(&[(left, &a), (right, &b)], context)?
            }
            Operator::Multiply => a.dimension * b.dimension,
            Operator::Divide => a.dimension / b.dimension,
            Operator::Power => self.power_dimension(whole, right, &a, &b, context)?,
        };
        let words = match (a.term.value(), b.term.value()) {
            (Some(a), Some(b)) => not_finite_words(operator, a.value, b.value),
            _ => "is not finite",
        };
        self.finite(
            Term::binary(operator, a.term, b.term),
            dimension,
            whole,
            words,
            context,
        )
    }

    /// The exponent of a power; a literal there is a fixed number, not one that the results could move with.
    fn exponent(&mut self, expression: &'w Expression, context: &Context<'_, 'w>) -> Option<Typed> {
        let fixed = match &expression.kind {
            ExpressionKind::Number {
                value, unit: None, ..
            } => Some(*value),
            ExpressionKind::Negative(inner) => match &inner.kind {
                ExpressionKind::Number {
                    value, unit: None, ..
                } => Some(-*value),
                _ => None,
            },
            _ => None,
        };
        match fixed {
            Some(value) if value.is_finite() => Some(Typed::new(
                Term::Constant(Dual::constant(value)),
                Dimension::NUMBER,
            )),
            _ => self.expression(expression, context),
        }
    }

    fn power_dimension(
        &mut self,
        whole: &'w Expression,
        right: &'w Expression,
        base: &Typed,
        exponent: &Typed,
        context: &Context<'_, 'w>,
    ) -> Option<Dimension> {
        if !exponent.dimension.is_number() {
            return self.wrong(right, "a number", exponent.dimension, context);
        }
        if base.dimension.is_number() {
            return Some(Dimension::NUMBER);
        }
        let fixed = exponent.term.value().map(|value| value.value);
        let dimension = fixed.and_then(|value| base.dimension.power(value));
        if dimension.is_none() {
            let text = context.spot.text(whole.span);
            let found = base.dimension.words();
            return self.bad(
                context.place(whole.span),
                format!("`{text}`: {found} to this power has no dimension"),
            );
        }
        dimension
    }

    /// The one dimension of several operands; a literal zero takes that of the others.
    pub(super) fn common_dimension(
        &mut self,
        operands: &[(&'w Expression, &Typed)],
        context: &Context<'_, 'w>,
    ) -> Option<Dimension> {
        // A bare number beside a quantity lacks its unit, whichever comes first.
        let leading = operands
            .iter()
            .find(|(expression, typed)| !typed.zero && !is_bare(expression))
            .or_else(|| operands.iter().find(|(_, typed)| !typed.zero));
        let Some((_, leading)) = leading else {
            return Some(Dimension::NUMBER);
        };
        let wanted = leading.dimension;
        let mut agreed = Some(wanted);
        for (expression, typed) in operands {
            if !typed.zero && typed.dimension != wanted {
                agreed = self.mismatch(expression, wanted, typed.dimension, context);
            }
        }
        agreed
    }

    /// Notes that one dimension is wanted and another found.
    pub(super) fn mismatch<T>(
        &mut self,
        expression: &'w Expression,
        wanted: Dimension,
        found: Dimension,
        context: &Context<'_, 'w>,
    ) -> Option<T> {
        if found.is_number() && is_bare(expression) {
            let number = context.spot.text(expression.span).to_owned();
            let kind = TroubleKind::MissingUnit { wanted, number };
            return self.fail(kind, context.place(expression.span));
        }
        self.wrong(expression, &wanted.words(), found, context)
    }

    pub(super) fn wrong<T>(
        &mut self,
        expression: &'w Expression,
        wanted: &str,
        found: Dimension,
        context: &Context<'_, 'w>,
    ) -> Option<T> {
        let kind = TroubleKind::WrongUnit {
            wanted: wanted.to_owned(),
            found: found.words(),
        };
        self.fail(kind, context.place(expression.span))
    }

    fn call(
        &mut self,
        whole: &'w Expression,
        name: &'w Word,
        arguments: &'w [Expression],
        context: &Context<'_, 'w>,
    ) -> Option<Typed> {
        let Some(known) = function(&name.text) else {
            let kind = TroubleKind::UnknownName {
                name: name.text.clone(),
                wanted: "function",
                nearest: nearest(&name.text, FUNCTIONS.iter().map(|one| one.name)),
            };
            return self.fail(kind, context.place(name.span));
        };
        let values: Vec<Option<Typed>> = arguments
            .iter()
            .map(|argument| self.expression(argument, context))
            .collect();
        let values: Vec<Typed> = values.into_iter().collect::<Option<_>>()?;
        let Some(first) = values.first() else {
            return self.bad(
                context.place(whole.span),
                format!("`{}` needs an argument", known.name),
            );
        };
        if known.rule != ArgumentRule::Alike && values.len() != 1 {
            let what = format!("`{}` takes one argument, not {}", known.name, values.len());
            return self.bad(context.place(whole.span), what);
        }
        let operands: Vec<(&Expression, &Typed)> = arguments.iter().zip(&values).collect();
        let dimension = match known.rule {
            ArgumentRule::Number => self.number_wanted(&operands, context)?,
            ArgumentRule::Same | ArgumentRule::Alike => {
                self.common_dimension(&operands, context)?
            }
            ArgumentRule::Root => first.dimension.power(0.5).unwrap_or_default(),
        };
        let words = first.term.value().map_or("is not finite", |value| {
            call_not_finite_words(known.name, value.value)
        });
        let terms = values.into_iter().map(|value| value.term).collect();
        self.finite(
            Term::call(known.name, terms),
            dimension,
            whole,
            words,
            context,
        )
    }

    fn number_wanted(
        &mut self,
        operands: &[(&'w Expression, &Typed)],
        context: &Context<'_, 'w>,
    ) -> Option<Dimension> {
        for (expression, typed) in operands {
            if !typed.dimension.is_number() {
                return self.wrong(expression, "a number", typed.dimension, context);
            }
        }
        Some(Dimension::NUMBER)
    }

    /// The term, unless it is a value that is not finite.
    fn finite(
        &mut self,
        term: Term,
        dimension: Dimension,
        whole: &'w Expression,
        words: &str,
        context: &Context<'_, 'w>,
    ) -> Option<Typed> {
        if term.value().is_none_or(|value| value.value.is_finite()) {
            return Some(Typed::new(term, dimension));
        }
        let text = context.spot.text(whole.span);
        let what = format!("`{text}` {words}");
        self.fail(TroubleKind::NotFinite { what }, context.place(whole.span))
    }
}

fn not_finite_words(operator: Operator, left: f64, right: f64) -> &'static str {
    match operator {
        Operator::Divide if right == 0.0 => "divides by zero",
        Operator::Power if left == 0.0 => "divides by zero",
        Operator::Power if left < 0.0 && right.fract() != 0.0 => {
            "takes a power that is not whole of a negative number"
        }
        _ => "is too large for a number",
    }
}

fn call_not_finite_words(name: &str, argument: f64) -> &'static str {
    match name {
        "sqrt" if argument < 0.0 => "takes the root of a negative number",
        "log" | "log10" if argument == 0.0 => "takes the logarithm of zero",
        "log" | "log10" if argument < 0.0 => "takes the logarithm of a negative number",
        "asin" | "acos" if argument.abs() > 1.0 => {
            "asks for an angle whose sine or cosine is above 1"
        }
        _ => "is too large for a number",
    }
}

/// Whether an expression is made of numbers without units alone.
pub(crate) fn is_bare(expression: &Expression) -> bool {
    match &expression.kind {
        ExpressionKind::Number { unit, .. } => unit.is_none(),
        ExpressionKind::Name(name) => name == "pi",
        ExpressionKind::Negative(inner) => is_bare(inner),
        ExpressionKind::Binary { left, right, .. } => is_bare(left) && is_bare(right),
        ExpressionKind::Call { arguments, .. } => arguments.iter().all(is_bare),
        ExpressionKind::Quantity(_) => false,
    }
}
