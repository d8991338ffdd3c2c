//! # What it finds
//! A layer thinner than one monolayer.
//!
//! # Why it matters
//! There is no such layer: material comes in whole monolayers.
//!
//! # Example
//! ```cren
//! crystal tern
//!   mass 0.067 me
//!   monolayer 0.283 nm
//!   layer 2.83 nm at 0 meV
//!   layer 0.2 nm at 235 meV
//!         ^^^^^^^^^^^^^^^^^
//! ```
//!
//! # Instead
//! ```cren
//! crystal tern
//!   mass 0.067 me
//!   monolayer 0.283 nm
//!   layer 2.83 nm at 0 meV
//!   layer 0.283 nm at 235 meV
//! ```
//!
//! # Fix
//! One monolayer, to be looked at.

use super::part_monolayer::{each_layer, thickness_place, whole_monolayers};
use super::{Finding, Level, Rule, Subject, Tier, words};
use crate::model::Layer;

/// The rule.
pub const RULE: Rule = Rule {
    name: "thin-layer",
    group: "physics",
    level: Level::Warning,
    tier: Tier::Model,
    waivable: true,
    source: include_str!("thin_layer.rs"),
    check,
};

/// Rounding of the written thickness and monolayer.
pub const ROUNDING: f64 = 1e-3;

fn check(subject: &Subject<'_>, findings: &mut Vec<Finding>) {
    each_layer(subject, findings, finding);
}

fn finding(subject: &Subject<'_>, layer: &Layer) -> Option<Finding> {
    let monolayer = layer.monolayer.as_ref()?;
    let count = layer.length.value / monolayer.value;
    if !count.is_finite() || count <= 0.0 || count >= 1.0 - ROUNDING {
        return None;
    }
    let place = thickness_place(subject, layer, layer.place)?;
    let message = format!(
        "this layer of {} is thinner than one monolayer of {}",
        words::length(layer.length.value),
        words::length(monolayer.value)
    );
    Some(
        Finding::new(&RULE, place, message)
            .help("material comes in whole monolayers, so this is the least there is")
            .fix(whole_monolayers(subject, layer)),
    )
}

#[cfg(test)]
mod tests {
    use super::super::fixture::{messages, silent};
    use super::RULE;

    fn text(thin: &str) -> String {
        format!(
            "crystal a\n  mass 1 me\n  monolayer 0.283 nm\n  layer 2.83 nm at 0\n  layer {thin} at 9 meV\n"
        )
    }

    #[test]
    fn half_a_monolayer_is_too_thin() {
        let message = "this layer of 0.14 nm is thinner than one monolayer of 0.283 nm";
        assert_eq!(messages(&RULE, &text("0.14 nm")), [message]);
    }

    #[test]
    fn one_monolayer_is_a_layer() {
        silent(&RULE, &text("1 ML"));
        silent(&RULE, &text("0.283 nm"));
    }
}
