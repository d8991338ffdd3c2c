//! # What it finds
//! A `recoil` wavelength in a chain that is not twice the period.
//!
//! # Why it matters
//! Light that is sent back on itself makes a lattice of half its wavelength. With beams at an angle the ratio differs,
//! and `Er` is then not the usual unit of that lattice; swapping spacing and wavelength is a common slip.
//!
//! # Example
//! ```cren
//! crystal tern
//!   mass 86.909 u
//!   lattice chain 426 nm
//!   recoil 426 nm
//!   ^^^^^^^^^^^^^
//!   depth 1 = 10 Er
//! ```
//!
//! # Instead
//! ```cren
//! crystal tern
//!   mass 86.909 u
//!   lattice chain 426 nm
//!   recoil 852 nm
//!   depth 1 = 10 Er
//! ```
//!
//! # Fix
//! Twice the period, to be looked at.

use super::{Finding, Fix, Level, Replacement, Rule, Subject, Tier, words};
use crate::syntax::StatementKind;

/// The rule.
pub const RULE: Rule = Rule {
    name: "odd-recoil",
    group: "physics",
    level: Level::Note,
    tier: Tier::Model,
    waivable: true,
    source: include_str!("odd_recoil.rs"),
    check,
};

/// A wavelength this close to twice the period is meant to be it: wavelengths are written with six digits at most.
const CLOSE: f64 = 1e-5;

fn check(subject: &Subject<'_>, findings: &mut Vec<Finding>) {
    findings.extend(finding(subject));
}

fn finding(subject: &Subject<'_>) -> Option<Finding> {
    let crystal = subject.crystal?;
    let recoil = crystal.recoil.as_ref()?;
    let period = crystal.period()?;
    let twice = 2.0 * period.value;
    let ratio = recoil.wavelength.value / twice;
    if !ratio.is_finite() || (ratio - 1.0).abs() <= CLOSE {
        return None;
    }
    let place = subject.where_to_speak(recoil.place, &[&recoil.wavelength, period])?;
    let message = format!(
        "the recoil wavelength of {} is not twice the period of {}",
        words::length(recoil.wavelength.value),
        words::length(period.value)
    );
    Some(
        Finding::new(&RULE, place, message)
            .help(format!(
                "a retro-reflected beam would have {}",
                words::length(twice)
            ))
            .fix(fix(subject, place, twice)),
    )
}

fn fix(subject: &Subject<'_>, place: crate::model::Place, twice: f64) -> Option<Fix> {
    let StatementKind::Recoil(value) = &subject.statement_at(place)?.kind else {
        return None;
    };
    let literal = super::literal::of_value(value)?;
    let unit = literal.unit_text(&subject.entry.section.text);
    let text = format!("{} {unit}", words::number(twice / literal.unit_size, 9));
    let title = format!("write `{text}`");
    Some(Fix::guess(
        title,
        Replacement::new(subject.place(literal.span), text),
    ))
}

#[cfg(test)]
mod tests {
    use super::super::fixture::{fixed, messages, silent};
    use super::RULE;

    fn text(recoil: &str) -> String {
        format!(
            "crystal a\n  mass 87 u\n  lattice chain 426 nm\n  recoil {recoil}\n  depth 1 = 10 Er\n"
        )
    }

    #[test]
    fn the_spacing_in_place_of_the_wavelength_is_found_and_mended() {
        let message = "the recoil wavelength of 426 nm is not twice the period of 426 nm";
        assert_eq!(messages(&RULE, &text("426 nm")), [message]);
        assert_eq!(fixed(&RULE, &text("426 nm")), text("852 nm"));
    }

    #[test]
    fn twice_the_period_is_usual() {
        silent(&RULE, &text("852 nm"));
        silent(&RULE, &text("0.852 um"));
    }
}
