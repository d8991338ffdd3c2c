//! # What it finds
//! A position outside the cell. It is wrapped back into it.
//!
//! # Why it matters
//! Nothing is lost, as the cell repeats; but a number meant in nanometres and read as a fraction shows up here.
//!
//! # Example
//! ```cren
//! crystal tern
//!   lattice chain 8.0 nm
//!   mass 0.067 me
//!   site gaussian 30 meV sigma 1 nm at 1.25
//!                                      ^^^^
//! ```
//!
//! # Instead
//! ```cren
//! crystal tern
//!   lattice chain 8.0 nm
//!   mass 0.067 me
//!   site gaussian 30 meV sigma 1 nm at 0.25
//! ```
//!
//! # Fix
//! The same position inside the cell, where it is written in fractions.

use super::{Finding, Fix, Level, Replacement, Rule, Subject, Tier, words};
use crate::model::{Trouble, TroubleKind};
use crate::syntax::{Position, StatementKind};

/// The rule.
pub const RULE: Rule = Rule {
    name: "outside-cell",
    group: "cell",
    level: Level::Note,
    tier: Tier::Model,
    waivable: true,
    source: include_str!("outside_cell.rs"),
    check,
};

fn check(subject: &Subject<'_>, findings: &mut Vec<Finding>) {
    for trouble in subject.troubles {
        if let TroubleKind::OutsideCell { fractions, inside } = &trouble.kind {
            let (written, inside) = (words::fractions(fractions), words::fractions(inside));
            let message = format!("this position is outside the cell; it is taken as {inside}");
            findings.push(
                Finding::of_trouble(&RULE, trouble, message)
                    .help(format!("in fractions of the cell it is {written}"))
                    .fix(fix(subject, trouble, inside)),
            );
        }
    }
}

fn fix(subject: &Subject<'_>, trouble: &Trouble, inside: String) -> Option<Fix> {
    let position = position(&subject.statement_at(trouble.place)?.kind)?;
    let bare =
        |entry| super::literal::of_value(entry).is_some_and(|literal| literal.unit.is_none());
    if !position.entries.iter().all(bare) {
        return None;
    }
    let place = subject.place(position.span);
    let title = format!("write {inside}");
    Some(Fix::safe(title, Replacement::new(place, inside)))
}

fn position(kind: &StatementKind) -> Option<&Position> {
    match kind {
        StatementKind::Delta { at, .. }
        | StatementKind::Site { at, .. }
        | StatementKind::Atom { at, .. } => Some(at),
        _ => None,
    }
}

#[cfg(test)]
mod tests {
    use super::super::fixture::{fixed, messages, silent};
    use super::RULE;

    #[test]
    fn fractions_are_written_inside() {
        let text =
            "crystal a\n  lattice square 4 nm\n  site gaussian 3 meV sigma 1 nm at (1.25, -0.5)\n";
        assert_eq!(messages(&RULE, text).len(), 1);
        assert!(fixed(&RULE, text).ends_with("at (0.25, 0.5)\n"));
    }

    #[test]
    fn the_origin_is_inside() {
        silent(
            &RULE,
            "crystal a\n  lattice chain 4 nm\n  delta 1 eV*nm at 0\n  delta 1 eV*nm at 0.5\n",
        );
    }
}
