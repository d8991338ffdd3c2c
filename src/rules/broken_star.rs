//! # What it finds
//! Waves that are part of a star: some of the reciprocal vectors that the lattice's own symmetry makes equal are
//! written, others are not.
//!
//! # Why it matters
//! The potential then has less symmetry than its lattice. That may be meant; a forgotten line looks just like it.
//!
//! # Example
//! ```cren
//! crystal tern
//!   lattice square 8.0 nm
//!   mass 0.067 me
//!   cosine (1, 0) = 20 meV
//!   ^^^^^^^^^^^^^^^^^^^^^^
//! ```
//!
//! # Instead
//! ```cren
//! crystal tern
//!   lattice square 8.0 nm
//!   mass 0.067 me
//!   cosine star (1, 0) = 20 meV
//! ```
//!
//! # Fix
//! A single `cosine` or `depth` without a phase becomes a `star`, to be looked at.

use super::{Finding, Fix, Level, Replacement, Rule, Subject, Tier, words};
use crate::model::shape::symmetry::{point_operations, star};
use crate::model::{Crystal, Wave};
use crate::syntax::{StatementKind, WaveKind};
use crate::text::Span;

/// The rule.
pub const RULE: Rule = Rule {
    name: "broken-star",
    group: "periodicity",
    level: Level::Note,
    tier: Tier::Model,
    waivable: true,
    source: include_str!("broken_star.rs"),
    check,
};

fn check(subject: &Subject<'_>, findings: &mut Vec<Finding>) {
    let Some(crystal) = subject.crystal.filter(|crystal| crystal.dimension >= 2) else {
        return;
    };
    // Without a lattice nothing is equivalent.
    if crystal.vectors.is_empty() || crystal.potential.waves.iter().all(|wave| wave.star) {
        return;
    }
    let operations = point_operations(&crystal.primitive_values());
    let written: Vec<&[i64]> = crystal
        .potential
        .waves
        .iter()
        .flat_map(|wave| &wave.indices)
        .map(Vec::as_slice)
        .collect();
    let mut spoken: Vec<Vec<i64>> = Vec::new();
    for wave in crystal.potential.waves.iter().filter(|wave| !wave.star) {
        let Some(index) = wave.indices.first() else {
            continue;
        };
        if contains(&spoken, index) || index.iter().all(|entry| *entry == 0) {
            continue;
        }
        let star = star(index, crystal.centring(), &operations);
        findings.extend(finding(subject, crystal, wave, &star, &written));
        spoken.extend(star);
    }
}

fn finding(
    subject: &Subject<'_>,
    crystal: &Crystal,
    wave: &Wave,
    star: &[Vec<i64>],
    written: &[&[i64]],
) -> Option<Finding> {
    let missing: Vec<&Vec<i64>> = star
        .iter()
        .filter(|index| !written.iter().any(|other| is_pair(index, other)))
        .collect();
    if missing.is_empty() {
        return None;
    }
    let numbers: Vec<_> = crystal
        .conventional
        .iter()
        .flatten()
        .chain([&wave.energy])
        .collect();
    let place = subject.where_to_speak(wave.place, &numbers)?;
    let index = wave.indices.first()?;
    let message = format!(
        "{} of the {} equivalents of {} are not written",
        missing.len(),
        star.len(),
        words::index(index)
    );
    let some: Vec<_> = missing
        .iter()
        .take(3)
        .map(|index| words::index(&upright(index)))
        .collect();
    let more = if missing.len() > 3 { " …" } else { "" };
    let alone = missing.len() + 1 == star.len();
    Some(
        Finding::new(&RULE, place, message)
            .help(format!(
                "the lattice makes it equal to {}{more}{}",
                some.join(", "),
                if takes_star(wave) {
                    "; `star` writes them all"
                } else {
                    ""
                }
            ))
            .fix(if alone { fix(subject, wave) } else { None }),
    )
}

/// Whether the statement has a form with `star`, which takes no phase.
fn takes_star(wave: &Wave) -> bool {
    wave.kind != WaveKind::Fourier && wave.phase.value == 0.0
}

/// The one of ±G whose first index that is not zero is positive.
fn upright(index: &[i64]) -> Vec<i64> {
    let first = index.iter().find(|entry| **entry != 0);
    let sign = if first.is_some_and(|entry| *entry < 0) {
        -1
    } else {
        1
    };
    index.iter().map(|entry| sign * entry).collect()
}

fn contains(all: &[Vec<i64>], index: &[i64]) -> bool {
    all.iter().any(|other| is_pair(other, index))
}

/// Whether two indices are equal or opposite.
fn is_pair(one: &[i64], other: &[i64]) -> bool {
    let opposite = |(a, b): (&i64, &i64)| *a == -*b;
    one == other || (one.len() == other.len() && one.iter().zip(other).all(opposite))
}

fn fix(subject: &Subject<'_>, wave: &Wave) -> Option<Fix> {
    let statement = subject.statement_at(wave.place)?;
    let StatementKind::Wave {
        phase: None,
        star: None,
        kind,
        ..
    } = &statement.kind
    else {
        return None;
    };
    if *kind == WaveKind::Fourier {
        return None;
    }
    let end = Span::new(statement.word.end, statement.word.end);
    let edit = Replacement::new(subject.place(end), " star");
    Some(Fix::guess("write its whole star", edit))
}

#[cfg(test)]
mod tests {
    use super::super::fixture::{fixed, messages, silent};
    use super::RULE;

    #[test]
    fn what_is_missing_of_a_star_is_counted_and_can_be_added() {
        let text = "crystal a\n  lattice hexagonal 5 nm\n  cosine (1, 0) = 1 meV\n";
        assert_eq!(
            messages(&RULE, text),
            ["2 of the 3 equivalents of (1, 0) are not written"]
        );
        let mended = fixed(&RULE, text);
        assert!(mended.contains("cosine star (1, 0)"), "{mended}");
        silent(&RULE, &mended);
    }

    #[test]
    fn a_star_written_out_is_whole() {
        silent(
            &RULE,
            "crystal a\n  lattice hexagonal 5 nm\n  cosine (1, 0) = 1 meV\n  cosine (0, 1) = 1 meV\n  cosine (1, -1) = 1 meV\n",
        );
    }

    #[test]
    fn a_lattice_without_symmetry_has_no_stars_to_break() {
        silent(
            &RULE,
            "crystal a\n  lattice oblique 5 nm by 4 nm angle 80 deg\n  cosine (1, 0) = 1 meV\n",
        );
    }
}
