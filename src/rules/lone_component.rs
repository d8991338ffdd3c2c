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
//! The missing partner is written below.

use super::{Finding, Fix, Level, Rule, Subject, Tier, words};
use crate::model::{Trouble, TroubleKind};

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
            findings.push(finding(subject, trouble, index, partner));
        }
    }
}

fn finding(subject: &Subject<'_>, trouble: &Trouble, index: &[i64], partner: &str) -> Finding {
    let opposite: Vec<i64> = index.iter().map(|entry| -entry).collect();
    let (own, other) = (words::index(index), words::index(&opposite));
    let missing = trouble.related.is_empty();
    let message = if missing {
        format!("the component at {own} stands alone: its partner at {other} is missing")
    } else {
        format!("the components at {own} and {other} are not complex conjugates of each other")
    };
    let finding = Finding::of_trouble(&RULE, trouble, message)
        .help(format!("a real potential has `{partner}` beside it"));
    match missing {
        true => finding.fix(write_below(subject, trouble, partner)),
        false => finding,
    }
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
    fn a_pair_is_real() {
        silent(
            &RULE,
            "crystal a\n  lattice chain 8 nm\n  fourier 1 = 3 meV\n  fourier -1 = 3 meV\n",
        );
    }
}
