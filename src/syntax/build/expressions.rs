//! Values, expressions, positions and indices.

use pest::iterators::Pair;

use super::{Builder, Built, Children, Failure, normal, plain_digits};
use crate::syntax::grammar::{OPERATORS, Rule};
use crate::syntax::{Expression, ExpressionKind, Index, Operator, Position, UnitUse, Value};
use crate::text::Span;

/// Deepest tree of operators and calls: whoever walks it may recurse.
const DEPTH_LIMIT: usize = 512;

/// Longest chain of `^` in a row, which the reader itself recurses on.
const POWER_LIMIT: usize = 64;

/// An expression, with its place, brackets included, and its depth.
struct Piece {
    expression: Expression,
    outer: Span,
    depth: usize,
}

impl Builder {
    pub(super) fn value(self, pair: Pair<'_, Rule>) -> Built<Value> {
        let span = self.span(&pair);
        let mut children = Children::of(pair);
        let expression = self.expression(children.take(Rule::expression)?)?;
        let tolerance = match children.take_if(Rule::plus_minus) {
            Some(_) => Some(Box::new(self.expression(children.take(Rule::tolerance)?)?)),
            None => None,
        };
        Ok(Value {
            span,
            expression,
            tolerance,
        })
    }

    pub(super) fn position(self, pair: Pair<'_, Rule>) -> Built<Position> {
        let inner = Children::of(pair).any()?;
        if inner.as_rule() == Rule::tuple {
            return self.tuple(inner);
        }
        let value = self.value(inner)?;
        Ok(Position {
            span: value.span,
            entries: vec![value],
            bracketed: false,
        })
    }

    /// A `tuple` or `vector` pair.
    pub(super) fn tuple(self, pair: Pair<'_, Rule>) -> Built<Position> {
        let span = self.span(&pair);
        let entries = pair
            .into_inner()
            .filter(|inner| inner.as_rule() == Rule::value)
            .map(|inner| self.value(inner))
            .collect::<Built<Vec<_>>>()?;
        Ok(Position {
            span,
            entries,
            bracketed: true,
        })
    }

    pub(super) fn index(self, pair: Pair<'_, Rule>) -> Built<Index> {
        let span = self.span(&pair);
        let entries = pair
            .into_inner()
            .filter(|inner| inner.as_rule() == Rule::integer)
            .map(|inner| self.integer(&inner))
            .collect::<Built<Vec<_>>>()?;
        Ok(Index { span, entries })
    }

    /// An `expression` or `tolerance` pair.
    pub(super) fn expression(self, pair: Pair<'_, Rule>) -> Built<Expression> {
        self.piece(pair).map(|piece| piece.expression)
    }

    fn piece(self, pair: Pair<'_, Rule>) -> Built<Piece> {
        self.hold_power_limit(&pair)?;
        OPERATORS
            .map_primary(|primary| self.primary(primary))
            .map_prefix(|operator, operand| self.negative(&operator, operand?))
            .map_infix(|left, operator, right| self.binary(left?, &operator, right?))
            .parse(pair.into_inner())
    }

    fn hold_power_limit(self, pair: &Pair<'_, Rule>) -> Built<()> {
        let mut run = 0;
        for inner in pair.clone().into_inner() {
            match inner.as_rule() {
                Rule::caret => run += 1,
                Rule::add | Rule::subtract | Rule::multiply | Rule::divide => run = 0,
                _ => {}
            }
            if run > POWER_LIMIT {
                return Err(Failure::TooDeep(self.span(&inner)));
            }
        }
        Ok(())
    }

    fn primary(self, pair: Pair<'_, Rule>) -> Built<Piece> {
        let outer = self.span(&pair);
        let leaf = |kind| Piece {
            expression: Expression { span: outer, kind },
            outer,
            depth: 1,
        };
        match pair.as_rule() {
            Rule::group => {
                let mut children = Children::of(pair);
                children.take(Rule::open)?;
                let inner = self.piece(children.take(Rule::expression)?)?;
                Ok(Piece { outer, ..inner })
            }
            Rule::bare | Rule::united => self.number(pair).map(leaf),
            Rule::value_name => Ok(leaf(ExpressionKind::Name(normal(pair.as_str())))),
            Rule::call => self.call(pair, outer),
            Rule::quantity => self.quantity_or_name(pair).map(leaf),
            _ => Err(Failure::Broken),
        }
    }

    fn quantity_or_name(self, pair: Pair<'_, Rule>) -> Built<ExpressionKind> {
        let span = self.span(&pair);
        // `fermi` alone is a name like any other where no quantity may stand.
        if !self.quantities && pair.as_str().trim_end() == "fermi" {
            return Ok(ExpressionKind::Name("fermi".to_owned()));
        }
        if !self.quantities {
            return Err(Failure::QuantityOutsideTarget(span));
        }
        self.quantity(pair).map(ExpressionKind::Quantity)
    }

    fn number(self, pair: Pair<'_, Rule>) -> Built<ExpressionKind> {
        let mut children = Children::of(pair);
        let decimal = children.take(Rule::decimal)?;
        let value = plain_digits(decimal.as_str())
            .parse()
            .map_err(|_| Failure::Broken)?;
        let unit = match children.take_if(Rule::unit_use) {
            Some(unit) => Some(self.unit(unit)?),
            None => None,
        };
        Ok(ExpressionKind::Number {
            value,
            digits: self.span(&decimal),
            unit,
        })
    }

    fn unit(self, pair: Pair<'_, Rule>) -> Built<UnitUse> {
        let span = self.span(&pair);
        let mut children = Children::of(pair);
        let name = self.word(&children.any()?);
        let power = match children.take_if(Rule::caret) {
            Some(_) => plain_digits(children.take(Rule::unit_power)?.as_str())
                .parse()
                .map_err(|_| Failure::Broken)?,
            None => 1,
        };
        Ok(UnitUse { name, power, span })
    }

    fn call(self, pair: Pair<'_, Rule>, outer: Span) -> Built<Piece> {
        let mut children = Children::of(pair);
        let function = self.word(&children.take(Rule::value_name)?);
        let mut depth = 0;
        let mut arguments = Vec::new();
        for inner in children
            .pairs
            .filter(|inner| inner.as_rule() == Rule::expression)
        {
            let argument = self.piece(inner)?;
            depth = depth.max(argument.depth);
            arguments.push(argument.expression);
        }
        self.deeper(
            ExpressionKind::Call {
                function,
                arguments,
            },
            outer,
            depth,
        )
    }

    fn negative(self, operator: &Pair<'_, Rule>, operand: Piece) -> Built<Piece> {
        let outer = self.span(operator).cover(operand.outer);
        self.deeper(
            ExpressionKind::Negative(Box::new(operand.expression)),
            outer,
            operand.depth,
        )
    }

    fn binary(self, left: Piece, operator: &Pair<'_, Rule>, right: Piece) -> Built<Piece> {
        let operator_span = self.span(operator);
        let operator = match operator.as_rule() {
            Rule::add => Operator::Add,
            Rule::subtract => Operator::Subtract,
            Rule::multiply => Operator::Multiply,
            Rule::divide => Operator::Divide,
            Rule::caret => Operator::Power,
            _ => return Err(Failure::Broken),
        };
        let outer = left.outer.cover(right.outer);
        let depth = left.depth.max(right.depth);
        self.deeper(
            ExpressionKind::Binary {
                operator,
                left: Box::new(left.expression),
                right: Box::new(right.expression),
                operator_span,
            },
            outer,
            depth,
        )
    }

    fn deeper(self, kind: ExpressionKind, outer: Span, depth: usize) -> Built<Piece> {
        let expression = Expression { span: outer, kind };
        if depth >= DEPTH_LIMIT {
            return Err(Failure::TooDeep(outer));
        }
        Ok(Piece {
            expression,
            outer,
            depth: depth + 1,
        })
    }
}
