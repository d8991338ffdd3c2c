//! # What it finds
//! Layers, pieces of a profile, or samples that do not add up to the period; and a table whose rows make no cell.
//!
//! # Why it matters
//! Between the end of the cell and its next copy the potential would be unknown, or written twice.
//!
//! # Example
//! ```cren
//! material basin
//!   mass 0.067 me
//!   edge 0 meV
//!
//! material wall
//!   mass 0.092 me
//!   edge 235 meV
//!
//! crystal tern
//!   lattice chain 8.0 nm
//!   ^^^^^^^^^^^^^^^^^^^^
//!   layer 5.4 nm of basin
//!   layer 2.4 nm of wall
//! ```
//!
//! # Instead
//! ```cren
//! material basin
//!   mass 0.067 me
//!   edge 0 meV
//!
//! material wall
//!   mass 0.092 me
//!   edge 235 meV
//!
//! crystal tern
//!   lattice chain 8.0 nm
//!   layer 5.4 nm of basin
//!   layer 2.6 nm of wall
//! ```
//!
//! # Fix
//! The period is set to the sum of the layers, or the last layer takes up the rest.

use super::words::Trade;
use super::{Finding, Fix, Level, Replacement, Rule, Subject, Tier, words};
use crate::model::{Dimension, Trouble, TroubleKind};
use crate::syntax::{ExpressionKind, LayerPart, StatementKind, Value};

/// The rule.
pub const RULE: Rule = Rule {
    name: "open-cell",
    group: "cell",
    level: Level::Error,
    tier: Tier::Model,
    waivable: false,
    source: include_str!("open_cell.rs"),
    check,
};

fn check(subject: &Subject<'_>, findings: &mut Vec<Finding>) {
    for trouble in subject.troubles {
        match &trouble.kind {
            TroubleKind::OpenCell { sum, period, parts } => {
                findings.push(open(subject, trouble, *sum, *period, parts));
            }
            TroubleKind::BadTable { what } => {
                let message = format!("this table makes no cell: {what}");
                findings.push(Finding::of_trouble(&RULE, trouble, message));
            }
            _ => {}
        }
    }
}

fn open(subject: &Subject<'_>, trouble: &Trouble, sum: f64, period: f64, parts: &str) -> Finding {
    let [shown_sum, shown_period] =
        words::apart([sum, period], Dimension::LENGTH, Trade::default());
    let rest = words::length((period - sum).abs());
    let much = if sum < period {
        "short of"
    } else {
        "more than"
    };
    let message =
        format!("the {parts} add up to {shown_sum}, {rest} {much} the period of {shown_period}");
    let finding = Finding::of_trouble(&RULE, trouble, message);
    if parts != "layers" {
        return finding.help("the pieces must cover one period, once");
    }
    finding
        .help(
            "change a layer or the lattice; without `lattice`, the period is the sum of the layers",
        )
        .fix(longer_lattice(subject, sum))
        .fix(last_layer(subject, period - sum))
}

/// Sets the lattice's length to the sum of the layers.
fn longer_lattice(subject: &Subject<'_>, sum: f64) -> Option<Fix> {
    let statements = &subject.entry.section.statements;
    let length = statements
        .iter()
        .find_map(|statement| match &statement.kind {
            StatementKind::Lattice(form) => form.lengths.first(),
            _ => None,
        })?;
    let text = written_like(subject, length, sum)?;
    let place = subject.place(length.expression.span);
    Some(Fix::guess(
        format!("make the period {text}"),
        Replacement::new(place, text),
    ))
}

/// Gives the rest of the cell to the last layer.
fn last_layer(subject: &Subject<'_>, rest: f64) -> Option<Fix> {
    let statements = &subject.entry.section.statements;
    let last = statements
        .iter()
        .rev()
        .find_map(|statement| match &statement.kind {
            StatementKind::Layer(part) => Some(Some(part)),
            StatementKind::Stack { .. } => Some(None),
            _ => None,
        })??;
    let now = thickness(subject, last)?;
    let wanted = now + rest;
    if wanted <= 0.0 {
        return None;
    }
    let text = written_like(subject, &last.length, wanted)?;
    let place = subject.place(last.length.expression.span);
    Some(Fix::guess(
        format!("make the last layer {text}"),
        Replacement::new(place, text),
    ))
}

/// The thickness of a layer as written, where the crystal's layer has no rate to change it.
fn thickness(subject: &Subject<'_>, part: &LayerPart) -> Option<f64> {
    let layers = &subject.crystal?.potential.layers;
    let place = subject.place(part.span);
    let length = layers
        .iter()
        .find(|layer| layer.place == place)?
        .length
        .value;
    let written = super::literal::of_value(&part.length)?;
    let same = (written.size() - length).abs() <= 1e-9 * length.abs();
    same.then_some(length)
}

/// A length in the unit of the literal that it replaces.
fn written_like(subject: &Subject<'_>, value: &Value, metre: f64) -> Option<String> {
    let ExpressionKind::Number { unit: Some(_), .. } = &value.expression.kind else {
        return None;
    };
    let literal = super::literal::of_value(value)?;
    let number = words::number(metre / literal.unit_size, 9);
    let unit = literal.unit_text(&subject.entry.section.text);
    Some(format!("{number} {unit}"))
}

#[cfg(test)]
mod tests {
    use super::super::fixture::{fixed, messages, silent};
    use super::RULE;

    #[test]
    fn what_is_missing_is_said_and_the_period_can_follow() {
        let text = "crystal a\n  mass 1 me\n  lattice chain 8 nm\n  layer 5.4 nm at 0\n  layer 2.4 nm at 9 meV\n";
        let message = "the layers add up to 7.8 nm, 0.2 nm short of the period of 8 nm";
        assert_eq!(messages(&RULE, text), [message]);
        assert!(fixed(&RULE, text).contains("lattice chain 7.8 nm\n"));
    }

    #[test]
    fn decimal_sums_are_not_held_to_the_last_bit() {
        let text = "crystal a\n  mass 1 me\n  lattice chain 0.3 nm\n  layer 0.1 nm at 0\n  layer 0.2 nm at 9 meV\n";
        silent(&RULE, text);
    }
}
