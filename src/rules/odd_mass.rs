//! # What it finds
//! A mass that is not positive (an error), or one that no carrier has: far from electrons and from atoms alike.
//!
//! # Why it matters
//! Every energy of the crystal scales with it.
//!
//! # Example
//! ```cren
//! crystal tern
//!   mass -0.067 me
//!        ^^^^^^^^^
//!   lattice chain 8.0 nm
//!   cosine 1 = 20 meV
//! ```
//!
//! # Instead
//! ```cren
//! crystal tern
//!   mass 0.067 me
//!   lattice chain 8.0 nm
//!   cosine 1 = 20 meV
//! ```
//!
//! # Fix
//! None. Holes have a positive mass here: turn the potential upside down instead.

use super::plausible::{self, Kind, Setting};
use super::{Finding, Level, Rule, Subject, Tier, words};
use crate::model::TroubleKind;

/// The rule.
pub const RULE: Rule = Rule {
    name: "odd-mass",
    group: "physics",
    level: Level::Warning,
    tier: Tier::Model,
    waivable: true,
    source: include_str!("odd_mass.rs"),
    check,
};

fn check(subject: &Subject<'_>, findings: &mut Vec<Finding>) {
    for trouble in subject.troubles {
        if let TroubleKind::OddMass { mass } = trouble.kind {
            let message = format!("a mass of {} is not positive", words::mass(mass));
            findings.push(
                Finding::of_trouble(&RULE, trouble, message)
                    .at_level(Level::Error)
                    .help("for holes, keep the mass positive and turn the potential upside down"),
            );
        }
    }
    findings.extend(implausible(subject));
}

/// Masses of no known carrier that no other unit would explain.
fn implausible(subject: &Subject<'_>) -> Vec<Finding> {
    let stated = super::stated::quantities(subject);
    let masses = stated
        .iter()
        .filter(|stated| stated.kind == Kind::Mass && stated.value > 0.0);
    let odd = masses.filter(|stated| {
        !plausible::is_plausible(Kind::Mass, stated.value, &Setting::default())
            && super::unit_slip::likely_unit(stated, &Setting::default()).is_none()
    });
    odd.map(|stated| {
        let message = format!(
            "{} is the mass of no usual carrier",
            words::mass(stated.value)
        );
        Finding::new(&RULE, stated.place, message)
            .help("electrons have up to about 20 me, atoms about 1 u to 300 u")
    })
    .collect()
}

#[cfg(test)]
mod tests {
    use super::super::fixture::{levels, silent};
    use super::RULE;
    use crate::rules::Level;

    fn crystal(mass: &str) -> String {
        format!("crystal a\n  mass {mass}\n  lattice chain 5 nm\n  cosine 1 = 1 meV\n")
    }

    #[test]
    fn a_mass_that_is_not_positive_is_an_error() {
        assert_eq!(levels(&RULE, &crystal("-0.067 me")), [Level::Error]);
        assert_eq!(levels(&RULE, &crystal("0 me")), [Level::Error]);
    }

    #[test]
    fn a_mass_of_no_carrier_is_a_warning() {
        assert_eq!(levels(&RULE, &crystal("1e-12 me")), [Level::Warning]);
    }

    #[test]
    fn electrons_atoms_and_polaritons_are_carriers() {
        for mass in [
            "0.0135 me",
            "1 me",
            "5e-5 me",
            "1.00784 u",
            "86.909 u",
            "132.905 u",
        ] {
            silent(&RULE, &crystal(mass));
        }
    }
}
