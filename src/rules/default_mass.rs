//! # What it finds
//! Layers, or a recoil, in a crystal where no mass is stated anywhere: the default of 1 me is used.
//!
//! # Why it matters
//! In layers an effective mass is nearly always meant, with a recoil the mass of an atom; the free electron's mass
//! gives bands that look reasonable and are wrong.
//!
//! # Example
//! ```cren
//! crystal tern
//!         ^^^^
//!   layer 5.4 nm at 0 meV
//!   layer 2.6 nm at 235 meV
//! ```
//!
//! # Instead
//! ```cren
//! crystal tern
//!   mass 0.067 me
//!   layer 5.4 nm at 0 meV
//!   layer 2.6 nm at 235 meV
//! ```
//!
//! # Fix
//! The default is written out, to be looked at.

use super::{Finding, Fix, Level, Rule, Subject, Tier};
use crate::model::Crystal;

/// The rule.
pub const RULE: Rule = Rule {
    name: "default-mass",
    group: "physics",
    level: Level::Warning,
    tier: Tier::Model,
    waivable: true,
    source: include_str!("default_mass.rs"),
    check,
};

fn check(subject: &Subject<'_>, findings: &mut Vec<Finding>) {
    let Some(crystal) = subject.crystal else {
        return;
    };
    let Some(what) = uses_default(crystal) else {
        return;
    };
    let message = format!("no mass is stated for {what}, so 1 me is used");
    let fix = subject
        .first_line("mass 1 me")
        .map(|edit| Fix::guess("say `mass 1 me`", edit));
    findings.push(
        Finding::new(&RULE, subject.heading(), message)
            .help("state the carrier's mass with `mass`, in the crystal or in its materials")
            .fix(fix),
    );
}

/// What takes the default mass, where it is rarely meant.
fn uses_default(crystal: &Crystal) -> Option<&'static str> {
    if crystal.mass_place.is_some() {
        return None;
    }
    // A layer that has its own mass has a parameter in it, or differs from the default.
    let defaulted = |mass_origin: &str| mass_origin.contains("default");
    let layers = &crystal.potential.layers;
    if layers.iter().any(|layer| defaulted(&layer.mass_origin)) {
        return Some("these layers");
    }
    let all_have_their_own = !layers.is_empty();
    (crystal.recoil.is_some() && !all_have_their_own).then_some("the recoil")
}

#[cfg(test)]
mod tests {
    use super::super::fixture::{fixed, messages, silent};
    use super::RULE;

    #[test]
    fn layers_without_any_mass_are_found() {
        let text = "crystal a\n  layer 5 nm at 0\n  layer 3 nm at 9 meV\n";
        assert_eq!(
            messages(&RULE, text),
            ["no mass is stated for these layers, so 1 me is used"]
        );
        assert!(fixed(&RULE, text).starts_with("crystal a\n  mass 1 me\n  layer"));
        silent(&RULE, &fixed(&RULE, text));
    }

    #[test]
    fn a_recoil_without_a_mass_is_found() {
        let text = "crystal a\n  lattice chain 400 nm\n  recoil 800 nm\n  depth 1 = 9 Er\n";
        assert_eq!(
            messages(&RULE, text),
            ["no mass is stated for the recoil, so 1 me is used"]
        );
    }

    #[test]
    fn a_free_electron_in_a_cosine_is_usual_and_layers_may_say_their_own_mass() {
        silent(
            &RULE,
            "crystal a\n  lattice chain 0.4 nm\n  cosine 1 = 1 eV\n",
        );
        silent(
            &RULE,
            "crystal a\n  layer 5 nm at 0 mass 0.07 me\n  layer 3 nm at 9 meV mass 0.09 me\n",
        );
    }
}
