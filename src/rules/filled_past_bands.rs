//! # What it finds
//! A filling that needs more bands than `bands` allows.
//!
//! # Why it matters
//! The Fermi level lies above all bands that are solved, so there is no Fermi level and no class.
//!
//! # Example
//! ```cren
//! crystal tern
//!   mass 1 me
//!   lattice chain 0.4 nm
//!   cosine 1 = 500 meV
//!   bands 2
//!   filling 6
//!   ^^^^^^^^^
//! ```
//!
//! # Instead
//! ```cren
//! crystal tern
//!   mass 1 me
//!   lattice chain 0.4 nm
//!   cosine 1 = 500 meV
//!   filling 6
//! ```
//!
//! # Fix
//! `bands` is raised to what the filling needs.

use super::{Finding, Fix, Level, Replacement, Rule, Subject, Tier, words};
use crate::syntax::StatementKind;

/// The rule.
pub const RULE: Rule = Rule {
    name: "filled-past-bands",
    group: "physics",
    level: Level::Error,
    tier: Tier::Model,
    waivable: false,
    source: include_str!("filled_past_bands.rs"),
    check,
};

fn check(subject: &Subject<'_>, findings: &mut Vec<Finding>) {
    findings.extend(finding(subject));
}

fn finding(subject: &Subject<'_>) -> Option<Finding> {
    let crystal = subject.crystal?;
    let filling = crystal.filling.as_ref()?.value;
    let needed = (filling / f64::from(crystal.degeneracy.max(1)) - 1e-9).ceil();
    let solved = crystal.bands;
    let enough = u32::try_from(solved).is_ok_and(|solved| needed <= f64::from(solved));
    if crystal.bosons || !needed.is_finite() || enough {
        return None;
    }
    let mut fillings = subject.statements(|kind| matches!(kind, StatementKind::Filling(_)));
    let place = fillings
        .next()
        .map_or_else(|| subject.heading(), |found| subject.place(found.span));
    let message = format!(
        "{} particles fill {needed} bands, and only {solved} are solved",
        words::number(filling, 6)
    );
    let finding = Finding::new(&RULE, place, message).help(format!(
        "ask for at least {needed} bands, or leave `bands` out"
    ));
    Some(finding.fix(fix(subject, needed)))
}

fn fix(subject: &Subject<'_>, needed: f64) -> Option<Fix> {
    let mut stated = subject.statements(|kind| matches!(kind, StatementKind::Bands(_)));
    let StatementKind::Bands(count) = &stated.next()?.kind else {
        return None;
    };
    let edit = Replacement::new(subject.place(count.span), format!("{needed}"));
    Some(Fix::safe(format!("write `bands {needed}`"), edit))
}

#[cfg(test)]
mod tests {
    use super::super::fixture::{fixed, messages, silent};
    use super::RULE;

    fn text(bands: &str, filling: &str) -> String {
        format!(
            "crystal a\n  mass 1 me\n  lattice chain 0.4 nm\n  cosine 1 = 1 eV\n  bands {bands}\n  filling {filling}\n"
        )
    }

    #[test]
    fn the_bands_are_raised() {
        assert_eq!(
            messages(&RULE, &text("2", "5")),
            ["5 particles fill 3 bands, and only 2 are solved"]
        );
        assert_eq!(fixed(&RULE, &text("2", "5")), text("3", "5"));
    }

    #[test]
    fn bands_that_are_just_full_are_enough() {
        silent(&RULE, &text("3", "6"));
    }
}
