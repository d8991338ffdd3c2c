//! # What it finds
//! A layer that is not a whole number of monolayers; a warning where its line is written in `ML`.
//!
//! # Why it matters
//! Material comes in whole monolayers. A crystal between two of them is an average over steps of the interface.
//!
//! # Example
//! ```cren
//! crystal tern
//!   mass 0.067 me
//!   monolayer 0.283 nm
//!   layer 10 ML at 0 meV
//!   layer 4.5 ML at 235 meV
//!         ^^^^^^
//! ```
//!
//! # Instead
//! ```cren
//! crystal tern
//!   mass 0.067 me
//!   monolayer 0.283 nm
//!   layer 10 ML at 0 meV
//!   layer 5 ML at 235 meV
//! ```
//!
//! # Fix
//! The nearest whole number of monolayers, to be looked at.

use super::{Finding, Fix, Level, Replacement, Rule, Subject, Tier, words};
use crate::model::{Layer, Place};
use crate::syntax::{LayerPart, StatementKind};

/// The rule.
pub const RULE: Rule = Rule {
    name: "part-monolayer",
    group: "physics",
    level: Level::Note,
    tier: Tier::Model,
    waivable: true,
    source: include_str!("part_monolayer.rs"),
    check,
};

/// A thickness this close to a whole number of monolayers, in monolayers, is one: thicknesses are written with two or
/// three digits (common practice).
const CLOSE: f64 = 0.05;
/// The same where the thickness is written in `ML`.
const CLOSE_IN_ML: f64 = 1e-6;

fn check(subject: &Subject<'_>, findings: &mut Vec<Finding>) {
    each_layer(subject, findings, finding);
}

/// Adds what is found in each layer; the repeats of a stack are written once, and told once.
pub(super) fn each_layer(
    subject: &Subject<'_>,
    findings: &mut Vec<Finding>,
    look: impl Fn(&Subject<'_>, &Layer) -> Option<Finding>,
) {
    let Some(crystal) = subject.crystal else {
        return;
    };
    for layer in &crystal.potential.layers {
        let Some(found) = look(subject, layer) else {
            continue;
        };
        let known = |other: &Finding| (other.rule, other.place) == (found.rule, found.place);
        if !findings.iter().any(known) {
            findings.push(found);
        }
    }
}

fn finding(subject: &Subject<'_>, layer: &Layer) -> Option<Finding> {
    let monolayer = layer.monolayer.as_ref()?;
    let count = layer.length.value / monolayer.value;
    let close = if layer.in_monolayers {
        CLOSE_IN_ML
    } else {
        CLOSE
    };
    let too_thin = count < 1.0 - super::thin_layer::ROUNDING;
    if !count.is_finite() || too_thin || (count - count.round()).abs() <= close {
        return None;
    }
    let place = thickness_place(subject, layer, layer.length_place)?;
    let message = format!(
        "this layer is {} monolayers thick, not a whole number of them",
        words::number(count, 4)
    );
    let whole = words::length(count.round() * monolayer.value);
    let help = format!("the nearest is {} ML, {whole}", count.round());
    let finding = Finding::new(&RULE, place, message).help(help);
    let finding = match layer.in_monolayers {
        true => finding.at_level(Level::Warning),
        false => finding,
    };
    Some(finding.fix(whole_monolayers(subject, layer)))
}

/// Where to speak of a layer's thickness.
pub fn thickness_place(subject: &Subject<'_>, layer: &Layer, place: Place) -> Option<Place> {
    let mut numbers = vec![&layer.length];
    numbers.extend(layer.monolayer.as_ref());
    subject.where_to_speak(place, &numbers)
}

/// Writes the nearest whole number of monolayers, where the layer is written in this section and its material's rate
/// does not stretch it.
pub fn whole_monolayers(subject: &Subject<'_>, layer: &Layer) -> Option<Fix> {
    let part = part(subject, layer.place)?;
    let monolayer = layer.monolayer.as_ref()?.value;
    let whole = (layer.length.value / monolayer).round().max(1.0);
    if !layer.in_monolayers {
        let written = super::literal::of_value(&part.length)?.size();
        if (written - layer.length.value).abs() > 1e-9 * written.abs() {
            return None;
        }
    }
    let text = format!("{whole} ML");
    let place = subject.place(part.length.expression.span);
    let title = format!("write `{text}`");
    Some(Fix::guess(title, Replacement::new(place, text)))
}

/// The part of a `layer` or `stack` statement at a place.
fn part<'a>(subject: &Subject<'a>, place: Place) -> Option<&'a LayerPart> {
    match &subject.statement_at(place)?.kind {
        StatementKind::Layer(part) => Some(part),
        StatementKind::Stack { parts, .. } => parts.iter().find(|part| part.span == place.span),
        _ => None,
    }
}

#[cfg(test)]
mod tests {
    use super::super::fixture::{fixed, levels, messages, silent};
    use super::RULE;
    use crate::rules::Level;

    fn text(length: &str) -> String {
        format!(
            "crystal a\n  mass 1 me\n  monolayer 0.283 nm\n  layer 10 ML at 0\n  layer {length} at 9 meV\n"
        )
    }

    #[test]
    fn a_broken_number_of_monolayers_is_found_and_rounded() {
        assert_eq!(levels(&RULE, &text("4.5 ML")), [Level::Warning]);
        assert_eq!(levels(&RULE, &text("2.6 nm")), [Level::Note]);
        assert_eq!(
            fixed(&RULE, &text("2.6 nm ± 0.1 nm")),
            text("9 ML ± 0.1 nm")
        );
    }

    #[test]
    fn a_stack_is_found_once() {
        let stack = "material m\n  mass 1 me\n  edge 0 meV\ncrystal a\n  monolayer 0.283 nm\n  stack 5 times 2.6 nm of m, 3 ML of m\n";
        assert_eq!(messages(&RULE, stack).len(), 1);
    }

    #[test]
    fn whole_monolayers_are_silent_also_when_written_in_nanometre() {
        silent(&RULE, &text("9 ML"));
        silent(&RULE, &text("2.55 nm"));
    }
}
