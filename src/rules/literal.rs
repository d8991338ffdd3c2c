//! A number with its unit as it stands in the text, for rules that rewrite it.

use crate::model::{Dimension, unit};
use crate::syntax::{Expression, ExpressionKind, Value};
use crate::text::Span;

/// A number and its unit, as written.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Literal {
    /// The number, sign included.
    pub number: f64,
    /// One of its unit in SI (1 for a bare number).
    pub unit_size: f64,
    /// Its dimension.
    pub dimension: Dimension,
    /// Where the unit stands, if there is one.
    pub unit: Option<Span>,
    /// The whole of it, sign included.
    pub span: Span,
}

impl Literal {
    /// Its size in SI.
    #[must_use]
    pub fn size(&self) -> f64 {
        self.number * self.unit_size
    }

    /// The unit as written in the section's text; empty for a bare number.
    #[must_use]
    pub fn unit_text<'t>(&self, text: &'t str) -> &'t str {
        self.unit.map_or("", |span| span.of(text))
    }
}

/// The literal that a value is, its tolerance aside; nothing for a sum, a name, or a unit that the file defines.
#[must_use]
pub fn of_value(value: &Value) -> Option<Literal> {
    of_expression(&value.expression)
}

/// The literal that an expression is.
#[must_use]
pub fn of_expression(expression: &Expression) -> Option<Literal> {
    match &expression.kind {
        ExpressionKind::Negative(inner) => {
            let inner = of_expression(inner)?;
            Some(Literal {
                number: -inner.number,
                span: expression.span,
                ..inner
            })
        }
        ExpressionKind::Number { value, unit, .. } => match unit {
            None => Some(Literal {
                number: *value,
                unit_size: 1.0,
                dimension: Dimension::NUMBER,
                unit: None,
                span: expression.span,
            }),
            Some(used) if used.power == 1 => {
                let known = unit::find(&used.name.text)?;
                Some(Literal {
                    number: *value,
                    unit_size: known.size,
                    dimension: known.dimension,
                    unit: Some(used.span),
                    span: expression.span,
                })
            }
            Some(_) => None,
        },
        _ => None,
    }
}
