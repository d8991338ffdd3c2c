//! Prints an expression with all its brackets.
use crenate::syntax::{
    Expression, ExpressionKind, Operator, Statement, StatementKind, Value, read,
};

pub fn expression(expression: &Expression) -> String {
    match &expression.kind {
        ExpressionKind::Number { value, unit, .. } => match unit {
            Some(unit) if unit.power != 1 => {
                format!("{value}[{}^{}]", unit.name.text, unit.power)
            }
            Some(unit) => format!("{value}[{}]", unit.name.text),
            None => value.to_string(),
        },
        ExpressionKind::Name(name) => name.clone(),
        ExpressionKind::Negative(inner) => format!("(-{})", self::expression(inner)),
        ExpressionKind::Binary {
            operator,
            left,
            right,
            ..
        } => {
            let sign = match operator {
                Operator::Add => '+',
                Operator::Subtract => '-',
                Operator::Multiply => '*',
                Operator::Divide => '/',
                Operator::Power => '^',
            };
            format!(
                "({}{sign}{})",
                self::expression(left),
                self::expression(right)
            )
        }
        ExpressionKind::Call {
            function,
            arguments,
        } => {
            let arguments: Vec<_> = arguments.iter().map(self::expression).collect();
            format!("{}({})", function.text, arguments.join(","))
        }
        ExpressionKind::Quantity(quantity) => format!("{:?}", quantity.kind),
    }
}

pub fn value(value: &Value) -> String {
    match &value.tolerance {
        Some(tolerance) => format!(
            "{} ± {}",
            expression(&value.expression),
            expression(tolerance)
        ),
        None => expression(&value.expression),
    }
}

/// The one statement of a text.
pub fn statement(text: &str) -> Statement {
    let tree = read(text);
    let statements: Vec<_> = tree
        .entries
        .iter()
        .flat_map(|entry| entry.section.statements.clone())
        .collect();
    assert_eq!(statements.len(), 1, "{text}: {:?}", super::problems(&tree));
    statements[0].clone()
}

/// The value of `let a = …`.
pub fn of_let(text: &str) -> String {
    match statement(&format!("let a = {text}")).kind {
        StatementKind::Let { value, .. } => self::value(&value),
        other => panic!("{other:?}"),
    }
}

#[test]
fn operators_bind_as_the_format_says() {
    for (text, shape) in [
        ("-2^2", "(-(2^2))"),
        ("2^-1", "(2^(-1))"),
        ("2^3^2", "(2^(3^2))"),
        ("2^-3^2*4", "((2^(-(3^2)))*4)"),
        ("1 - 2 - 3", "((1-2)-3)"),
        ("1 - 2*3/4", "(1-((2*3)/4))"),
        ("-a*b", "((-a)*b)"),
        ("2*-a", "(2*(-a))"),
        ("1/2 nm", "(1/2[nm])"),
        ("0.2 nm^-1", "0.2[nm^-1]"),
        ("2 nm^2 * 3", "(2[nm^2]*3)"),
        ("1e3nm", "1000[nm]"),
        ("1eV", "1[eV]"),
        ("1e", "1[e]"),
        ("5 e", "5[e]"),
        (".5", "0.5"),
        ("6.0", "6"),
        ("1e−3", "0.001"),
        ("1e5e", "100000[e]"),
        ("2 eV*nm", "(2[eV]*nm)"),
        ("1/nm", "(1/nm)"),
        ("nm^-2", "(nm^(-2))"),
        ("2^3 nm", "(2^3[nm])"),
        ("(5 nm)^n", "(5[nm]^n)"),
        ("3 − 2", "(3-2)"),
        ("5 nm ± 0.1 nm", "5[nm] ± 0.1[nm]"),
        ("5 + 3 +/- 2*1 %", "(5+3) ± (2*1[%])"),
        (
            "5 µm + 1 μm + 2 Å + 3 \u{212b}",
            "(((5[µm]+1[μm])+2[Å])+3[Å])",
        ),
        ("unknown(1, (2))", "unknown(1,2)"),
        ("e\u{301}", "é"),
        ("gap", "gap"),
        ("gap*2", "(gap*2)"),
        ("gap - 1", "(gap-1)"),
        ("fermi", "fermi"),
        ("1 \\ # why\n\t+ \u{2003}2", "(1+2)"),
    ] {
        assert_eq!(of_let(text), shape, "{text}");
    }
}
