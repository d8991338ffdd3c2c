//! # What it finds
//! A `fourier` component whose partner at −G is missing or is not its complex conjugate.
//!
//! # Why it matters
//! The potential would not be real, so its energies would not be either.
//!
//! # Example
//! ```cren
//! crystal tern
//!   lattice chain 8.0 nm
//!   mass 0.067 me
//!   fourier 1 = 20 meV phase 0.5
//!   ^^^^^^^^^^^^^^^^^^^^^^^^^^^^
//! ```
//!
//! # Instead
//! ```cren
//! crystal tern
//!   lattice chain 8.0 nm
//!   mass 0.067 me
//!   fourier 1 = 20 meV phase 0.5
//!   fourier -1 = 20 meV phase -0.5
//! ```
//!
//! # Fix
//! The missing partner is written below; one that does not match is replaced, to be looked at.

use super::{Finding, Fix, Level, Replacement, Rule, Subject, Tier, words};
use crate::model::{Place, Trouble, TroubleKind};

/// The rule.
pub const RULE: Rule = Rule {
    name: "lone-component",
    group: "periodicity",
    level: Level::Error,
    tier: Tier::Model,
    waivable: false,
    source: include_str!("lone_component.rs"),
    check,
};

fn check(subject: &Subject<'_>, findings: &mut Vec<Finding>) {
    for trouble in subject.troubles {
        if let TroubleKind::LoneComponent { index, partner } = &trouble.kind {
            findings.extend(match trouble.related.first() {
                None => Some(alone(subject, trouble, index, partner)),
                Some((other, _)) => unequal(trouble, *other, index, partner),
            });
        }
    }
}

fn alone(subject: &Subject<'_>, trouble: &Trouble, index: &[i64], partner: &str) -> Finding {
    let [own, other] = both(index);
    let message = format!("the component at {own} stands alone: its partner at {other} is missing");
    Finding::of_trouble(&RULE, trouble, message)
        .help(format!("a real potential has `{partner}` beside it"))
        .fix(write_below(subject, trouble, partner))
}

/// Two partners that do not match are one finding, at the later of them.
fn unequal(trouble: &Trouble, other: Place, index: &[i64], partner: &str) -> Option<Finding> {
    let neighbours = (other.file, other.section) == (trouble.place.file, trouble.place.section);
    if neighbours && other.span < trouble.place.span {
        return None;
    }
    let [own, opposite] = both(index);
    let message =
        format!("the components at {own} and {opposite} are not complex conjugates of each other");
    let fix = Fix::guess(
        format!("write `{partner}`"),
        Replacement::new(other, partner),
    );
    Some(
        Finding::new(
            &RULE,
            if neighbours { other } else { trouble.place },
            message,
        )
        .help(format!("a real potential has `{partner}` here"))
        .related(
            if neighbours { trouble.place } else { other },
            "the other component",
        )
        .fix(neighbours.then_some(fix)),
    )
}

/// An index and its opposite, as the format writes them.
fn both(index: &[i64]) -> [String; 2] {
    let opposite: Vec<i64> = index.iter().map(|entry| -entry).collect();
    [words::index(index), words::index(&opposite)]
}

fn write_below(subject: &Subject<'_>, trouble: &Trouble, partner: &str) -> Option<Fix> {
    if !subject.holds(trouble.place) {
        return None;
    }
    let edit = subject.line_below(trouble.place.span, partner)?;
    Some(Fix::safe(format!("add `{partner}`"), edit))
}

#[cfg(test)]
mod tests {
    use super::super::fixture::{fixed, messages, silent};
    use super::RULE;

    #[test]
    fn the_partner_is_written_below_and_then_all_is_well() {
        let text = "crystal a\n  lattice chain 8 nm\n  fourier 1 = 3 meV phase 0.5 # first\n  title \"t\"\n";
        assert_eq!(messages(&RULE, text).len(), 1);
        let mended = fixed(&RULE, text);
        assert!(
            mended.contains("# first\n  fourier -1 = 3 meV phase -0.5"),
            "{mended}"
        );
        silent(&RULE, &mended);
    }

    #[test]
    fn partners_that_do_not_match_are_one_finding() {
        let text = "crystal a\n  lattice chain 8 nm\n  fourier 1 = 3 meV phase 0.5\n  fourier -1 = 4 meV\n";
        let message = "the components at 1 and -1 are not complex conjugates of each other";
        assert_eq!(messages(&RULE, text), [message]);
        let mended = fixed(&RULE, text);
        assert!(
            mended.ends_with("\n  fourier -1 = 3 meV phase -0.5\n"),
            "{mended}"
        );
        silent(&RULE, &mended);
    }

    #[test]
    fn a_pair_is_real() {
        silent(
            &RULE,
            "crystal a\n  lattice chain 8 nm\n  fourier 1 = 3 meV\n  fourier -1 = 3 meV\n",
        );
    }
}
