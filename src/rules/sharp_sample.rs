//! # What it finds
//! A table too coarse for its own shape: the curve through its samples swings beyond them, or it has so few that no
//! shape shows.
//!
//! # Why it matters
//! Between the samples the potential is then made by the interpolation and not by the data.
//!
//! # Example
//! ```cren
//! crystal tern
//!   lattice chain 8.0 nm
//!   mass 0.067 me
//!   table "wall.csv" in nm, meV
//!   ^^^^^^^^^^^^^^^^^^^^^^^^^^^
//! ```
//! ```csv wall.csv
//! 0,0
//! 1,0
//! 2,0
//! 3,235
//! 4,235
//! 5,235
//! 6,0
//! 7,0
//! ```
//!
//! # Instead
//! ```cren
//! crystal tern
//!   lattice chain 8.0 nm
//!   mass 0.067 me
//!   table "wall.csv" in nm, meV by line
//! ```
//! ```csv wall.csv
//! 0,0
//! 1,0
//! 2,0
//! 3,235
//! 4,235
//! 5,235
//! 6,0
//! 7,0
//! ```
//!
//! # Fix
//! Straight lines between the samples (`by line`), if the shape really is that.

use super::{Finding, Fix, Level, Replacement, Rule, Subject, Tier, words};
use crate::model::shape::spline::CubicPiece;
use crate::model::{Crystal, Table};
use crate::text::Span;

/// The rule.
pub const RULE: Rule = Rule {
    name: "sharp-sample",
    group: "continuity",
    level: Level::Warning,
    tier: Tier::Model,
    waivable: true,
    source: include_str!("sharp_sample.rs"),
    check,
};

/// A curve that swings beyond its samples by more than this part of their swing is not held by them (common practice).
const OVERSHOOT: f64 = 0.05;
/// Fewer samples than this show no shape (common practice).
const FEWEST: usize = 4;
/// Points between two samples at which the curve is looked at.
const BETWEEN: u32 = 8;

fn check(subject: &Subject<'_>, findings: &mut Vec<Finding>) {
    findings.extend(finding(subject));
}

fn finding(subject: &Subject<'_>) -> Option<Finding> {
    let crystal = subject.crystal?;
    let table = crystal.potential.table.as_ref()?;
    if !subject.holds(table.place) {
        return None;
    }
    if table.positions.len() < FEWEST {
        let message = format!(
            "{} samples are too few to show a shape",
            table.positions.len()
        );
        return Some(
            Finding::new(&RULE, table.place, message).help("give more samples of the cell"),
        );
    }
    if table.straight {
        return None;
    }
    let beyond = overshoot(crystal, table)?;
    let message = format!(
        "the curve through these samples swings {} beyond them near {}",
        words::energy(crystal, beyond.by),
        words::length(beyond.at)
    );
    Some(
        Finding::new(&RULE, table.place, message)
            .help("give more samples where the potential is steep, or join them `by line`")
            .fix(by_line(subject, table)),
    )
}

struct Beyond {
    by: f64,
    at: f64,
}

/// How far and where the periodic spline leaves the range of its samples, if by much.
fn overshoot(crystal: &Crystal, table: &Table) -> Option<Beyond> {
    let period = crystal.period()?.value;
    let lowest = table.energies.iter().copied().fold(f64::INFINITY, f64::min);
    let highest = table
        .energies
        .iter()
        .copied()
        .fold(f64::NEG_INFINITY, f64::max);
    let mut most = Beyond { by: 0.0, at: 0.0 };
    for (at, value) in curve(&table.pieces(period)) {
        let by = (value - highest).max(lowest - value);
        if by > most.by {
            most = Beyond { by, at };
        }
    }
    (most.by > OVERSHOOT * (highest - lowest)).then_some(most)
}

/// Points between the samples: positions and values of the curve.
fn curve(pieces: &[CubicPiece]) -> impl Iterator<Item = (f64, f64)> + '_ {
    pieces.iter().flat_map(|piece| {
        (1..BETWEEN).map(move |step| {
            let part = f64::from(step) / f64::from(BETWEEN);
            let x = piece.start + (piece.end - piece.start) * part;
            (x, piece.at(x))
        })
    })
}

fn by_line(subject: &Subject<'_>, table: &Table) -> Option<Fix> {
    let statement = subject.statement_at(table.place)?;
    let crate::syntax::StatementKind::Table { by, .. } = &statement.kind else {
        return None;
    };
    let edit = match by {
        Some(word) => Replacement::new(subject.place(word.span), "line"),
        None => {
            let end = Span::new(statement.span.end, statement.span.end);
            Replacement::new(subject.place(end), " by line")
        }
    };
    Some(Fix::guess("join the samples by straight lines", edit))
}

#[cfg(test)]
mod tests {
    use super::super::fixture::{messages_with, silent_with};
    use super::RULE;

    const TEXT: &str = "crystal a\n  lattice chain 8 nm\n  table \"t.csv\" in nm, meV\n";

    #[test]
    fn a_box_drawn_with_a_spline_overshoots() {
        let file = "0,0\n1,0\n2,0\n3,9\n4,9\n5,9\n6,0\n7,0\n";
        assert_eq!(messages_with(&RULE, TEXT, &[("t.csv", file)]).len(), 1);
        let straight = TEXT.replace("meV\n", "meV by line\n");
        silent_with(&RULE, &straight, &[("t.csv", file)]);
    }

    #[test]
    fn eight_samples_of_a_cosine_hold_it() {
        let rows = (0..8).map(|n| {
            let x = f64::from(n);
            format!("{x},{}\n", 9.0 * (std::f64::consts::TAU * x / 8.0).cos())
        });
        silent_with(&RULE, TEXT, &[("t.csv", &rows.collect::<String>())]);
    }
}
