//! # What it finds
//! A form factor at a |G|² that no reciprocal vector of the lattice has.
//!
//! # Why it matters
//! The value is never used: the number in front of it was meant to be another.
//!
//! # Example
//! ```cren
//! crystal tern
//!   lattice fcc 0.54 nm
//!   atom A at (0, 0, 0)
//!   formfactor A 3 = -0.2 Ry
//!   formfactor A 5 = 0.1 Ry
//!   ^^^^^^^^^^^^^^^^^^^^^^^
//! ```
//!
//! # Instead
//! ```cren
//! crystal tern
//!   lattice fcc 0.54 nm
//!   atom A at (0, 0, 0)
//!   formfactor A 3 = -0.2 Ry
//!   formfactor A 4 = 0.1 Ry
//! ```
//!
//! # Fix
//! None: the help names the nearest values that the lattice has.

use super::reciprocal::shells;
use super::{Finding, Level, Rule, Subject, Tier, words};
use crate::model::{Crystal, Formfactor, FormfactorValues};

/// The rule.
pub const RULE: Rule = Rule {
    name: "idle-formfactor",
    group: "periodicity",
    level: Level::Warning,
    tier: Tier::Model,
    waivable: true,
    source: include_str!("idle_formfactor.rs"),
    check,
};

/// Q is matched to this, by the format.
const MATCHED: f64 = 1e-6;

fn check(subject: &Subject<'_>, findings: &mut Vec<Finding>) {
    let Some(crystal) = subject.crystal else {
        return;
    };
    let formfactors = crystal.potential.formfactors.iter();
    findings.extend(formfactors.filter_map(|formfactor| finding(subject, crystal, formfactor)));
}

fn finding(subject: &Subject<'_>, crystal: &Crystal, formfactor: &Formfactor) -> Option<Finding> {
    let FormfactorValues::At { q, .. } = &formfactor.form else {
        return None;
    };
    let shells = shells(crystal, q.value)?;
    if shells
        .iter()
        .any(|shell| (shell - q.value).abs() <= MATCHED)
    {
        return None;
    }
    let vectors = crystal.conventional.iter().flatten();
    let numbers: Vec<_> = vectors.chain(std::iter::once(q)).collect();
    let place = subject.where_to_speak(formfactor.place, &numbers)?;
    let shown = words::number(q.value, 7);
    let message = format!(
        "no reciprocal vector of this lattice has |G|² = {shown}, so this value is never used"
    );
    Some(Finding::new(&RULE, place, message).help_if(nearest(&shells, q.value)))
}

fn nearest(shells: &[f64], q: f64) -> Option<String> {
    let below = shells
        .iter()
        .copied()
        .filter(|shell| *shell < q)
        .fold(f64::NEG_INFINITY, f64::max);
    let above = shells
        .iter()
        .copied()
        .filter(|shell| *shell > q)
        .fold(f64::INFINITY, f64::min);
    let near: Vec<_> = [below, above]
        .into_iter()
        .filter(|shell| shell.is_finite() && *shell > 0.0)
        .map(|shell| words::number(shell, 7))
        .collect();
    let listed = words::listed(&near);
    (!near.is_empty()).then(|| match near.len() {
        1 => format!("the nearest value that it has is {listed}"),
        _ => format!("the nearest values that it has are {listed}"),
    })
}

#[cfg(test)]
mod tests {
    use super::super::fixture::{messages, silent};
    use super::RULE;

    fn text(lattice: &str, q: &str) -> String {
        format!("crystal a\n  lattice {lattice}\n  atom A at (0,0,0)\n  formfactor A {q} = 1 eV\n")
    }

    /// |G|² of fcc: 3, 4, 8, 11, 12 … (all odd or all even); of bcc: 2, 4, 6, 8 (even sum).
    #[test]
    fn the_shells_of_cubic_lattices_are_known() {
        for q in ["3", "4", "8", "11", "12", "16", "19"] {
            silent(&RULE, &text("fcc 0.5 nm", q));
        }
        for q in ["1", "2", "5", "6", "9", "11.1"] {
            assert_eq!(messages(&RULE, &text("fcc 0.5 nm", q)).len(), 1, "{q}");
        }
        silent(&RULE, &text("bcc 0.5 nm", "2"));
        assert_eq!(messages(&RULE, &text("bcc 0.5 nm", "3")).len(), 1);
    }
}
