//! The crystals that a section speaks of in its measures and targets.

use super::{
    BandQuantity, Expression, ExpressionKind, Relation, Requirement, Section, StatementKind, Value,
    Word,
};

/// The names behind `of` in the quantities of a section, in order; found once, as they are asked for with every edit.
pub(super) fn mentions(section: &Section) -> Vec<Word> {
    let mut names = Vec::new();
    for statement in &section.statements {
        match &statement.kind {
            StatementKind::Measure { expression, .. } => mentioned(expression, &mut names),
            StatementKind::Require(requirement) => in_requirement(requirement, &mut names),
            _ => {}
        }
    }
    names.into_iter().cloned().collect()
}

/// The crystals that an expression speaks of.
fn mentioned<'e>(expression: &'e Expression, names: &mut Vec<&'e Word>) {
    match &expression.kind {
        ExpressionKind::Number { .. } | ExpressionKind::Name(_) => {}
        ExpressionKind::Negative(inner) => mentioned(inner, names),
        ExpressionKind::Binary { left, right, .. } => {
            mentioned(left, names);
            mentioned(right, names);
        }
        ExpressionKind::Call { arguments, .. } => {
            for argument in arguments {
                mentioned(argument, names);
            }
        }
        ExpressionKind::Quantity(quantity) => in_quantity(quantity, names),
    }
}

fn in_quantity<'e>(quantity: &'e BandQuantity, names: &mut Vec<&'e Word>) {
    names.extend(quantity.of.iter());
}

fn in_value<'e>(value: &'e Value, names: &mut Vec<&'e Word>) {
    mentioned(&value.expression, names);
    if let Some(tolerance) = &value.tolerance {
        mentioned(tolerance, names);
    }
}

fn in_requirement<'e>(requirement: &'e Requirement, names: &mut Vec<&'e Word>) {
    match requirement {
        Requirement::Compare {
            expression,
            relation,
        } => {
            mentioned(expression, names);
            for value in values_of(relation) {
                in_value(value, names);
            }
        }
        Requirement::Class(_) => {}
        Requirement::GapIs { quantity, .. } => in_quantity(quantity, names),
    }
}

fn values_of(relation: &Relation) -> Vec<&Value> {
    match relation {
        Relation::AtLeast(value)
        | Relation::AtMost(value)
        | Relation::Above(value)
        | Relation::Below(value) => vec![value],
        Relation::Near { value, within } => vec![value, within],
        Relation::Between(low, high) => vec![low, high],
    }
}
