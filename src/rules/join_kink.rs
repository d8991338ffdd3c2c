//! # What it finds
//! A corner of the potential where one piece of a profile ends and the next begins.
//!
//! # Why it matters
//! Corners are allowed. Where two pieces were meant to run into each other smoothly, one of them is off.
//!
//! # Example
//! ```cren
//! crystal tern
//!   lattice chain 8.0 nm
//!   mass 0.067 me
//!   profile 0 to 4.0 nm = 5 meV * x / (1 nm)
//!   profile 4.0 nm to 8.0 nm = 5 meV * (8 - x / (1 nm))
//!                              ^^^^^^^^^^^^^^^^^^^^^^^^
//! ```
//!
//! # Instead
//! ```cren
//! crystal tern
//!   lattice chain 8.0 nm
//!   mass 0.067 me
//!   profile 0 to 4.0 nm = 10 meV * (1 - cos(2*pi*x/period))
//!   profile 4.0 nm to 8.0 nm = 10 meV * (1 - cos(2*pi*x/period))
//! ```
//!
//! # Fix
//! None.

use super::stretch::{Joint, joints, swing};
use super::{Finding, Level, Rule, Subject, Tier, words};
use crate::model::Crystal;

/// The rule.
pub const RULE: Rule = Rule {
    name: "join-kink",
    group: "continuity",
    level: Level::Note,
    tier: Tier::Model,
    waivable: true,
    source: include_str!("join_kink.rs"),
    check,
};

fn check(subject: &Subject<'_>, findings: &mut Vec<Finding>) {
    let Some(crystal) = subject.crystal else {
        return;
    };
    let Some(swing) = swing(crystal) else {
        return;
    };
    let joints = joints(crystal);
    let kinks = joints
        .iter()
        .filter(|joint| !joint.seam && !joint.steps(&swing) && joint.bends(&swing));
    findings.extend(kinks.filter_map(|joint| finding(subject, crystal, joint)));
}

fn finding(subject: &Subject<'_>, crystal: &Crystal, joint: &Joint<'_>) -> Option<Finding> {
    let [left, right] = joint.numbers();
    let place = subject.where_to_speak(joint.right.formula_place, &[&left, &right])?;
    let slope =
        |joule_per_metre: f64| format!("{} per nm", words::energy(crystal, joule_per_metre * 1e-9));
    let message = format!(
        "the potential has a corner at {}: its slope goes from {} to {}",
        words::length(joint.right.range[0].value),
        slope(joint.before.1),
        slope(joint.after.1)
    );
    Some(
        Finding::new(&RULE, place, message)
            .help("fine if the corner is meant")
            .related(joint.left.formula_place, "the piece to the left"),
    )
}

#[cfg(test)]
mod tests {
    use super::super::fixture::{messages, silent};
    use super::RULE;

    #[test]
    fn a_corner_between_pieces_is_noted() {
        let text = "crystal a\n  lattice chain 8 nm\n  profile 0 to 4 nm = 5 meV*x/(1 nm)\n  profile 4 nm to 8 nm = 5 meV*(8 - x/(1 nm))\n";
        let message =
            "the potential has a corner at 4 nm: its slope goes from 5 meV per nm to -5 meV per nm";
        assert_eq!(messages(&RULE, text), [message]);
    }

    #[test]
    fn pieces_of_one_smooth_curve_are_silent() {
        let wave = "9 meV * cos(2*pi*x/period)";
        let text = format!(
            "crystal a\n  lattice chain 8 nm\n  profile 0 to 3 nm = {wave}\n  profile 3 nm to 8 nm = {wave}\n"
        );
        silent(&RULE, &text);
    }
}
