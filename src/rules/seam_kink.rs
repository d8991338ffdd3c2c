//! # What it finds
//! A profile whose slope at the end of the cell differs from that at its beginning, though its value does not.
//!
//! # Why it matters
//! The potential has a corner at every cell's end. That is allowed; a period that does not match the formula looks
//! just like it.
//!
//! # Example
//! ```cren
//! crystal tern
//!   lattice chain 8.0 nm
//!   mass 0.067 me
//!   profile = 30 meV * sin(pi * x / period)
//!             ^^^^^^^^^^^^^^^^^^^^^^^^^^^^^
//! ```
//! Also found: `off-lattice-wave`.
//!
//! # Instead
//! ```cren
//! crystal tern
//!   lattice chain 8.0 nm
//!   mass 0.067 me
//!   profile = 30 meV * sin(pi * x / period)^2
//! ```
//!
//! # Fix
//! None.

use super::stretch::{joints, swing};
use super::{Finding, Level, Rule, Subject, Tier, words};

/// The rule.
pub const RULE: Rule = Rule {
    name: "seam-kink",
    group: "periodicity",
    level: Level::Note,
    tier: Tier::Model,
    waivable: true,
    source: include_str!("seam_kink.rs"),
    check,
};

fn check(subject: &Subject<'_>, findings: &mut Vec<Finding>) {
    findings.extend(finding(subject));
}

fn finding(subject: &Subject<'_>) -> Option<Finding> {
    let crystal = subject.crystal?;
    let swing = swing(crystal)?;
    let joints = joints(crystal);
    let seam = joints.iter().find(|joint| joint.seam)?;
    if seam.steps(&swing) || !seam.bends(&swing) {
        return None;
    }
    let [before, after] = seam.numbers();
    let place = subject.where_to_speak(seam.left.formula_place, &[&before, &after])?;
    let slope =
        |joule_per_metre: f64| format!("{} per nm", words::energy(crystal, joule_per_metre * 1e-9));
    let message = format!(
        "the potential has a corner between one cell and the next: its slope goes from {} to {}",
        slope(seam.before.1),
        slope(seam.after.1)
    );
    Some(
        Finding::new(&RULE, place, message)
            .help("fine if the corner is meant; otherwise check the period"),
    )
}

#[cfg(test)]
mod tests {
    use super::super::fixture::{messages, silent};
    use super::RULE;

    #[test]
    fn the_slopes_on_both_sides_are_said() {
        let text =
            "crystal a\n  lattice chain 8 nm\n  profile -4 nm to 4 nm = 3 meV * (x/(1 nm))^2\n";
        let message = "the potential has a corner between one cell and the next: its slope goes from 24 meV per nm to -24 meV per nm";
        assert_eq!(messages(&RULE, text), [message]);
    }

    #[test]
    fn a_smooth_seam_is_silent_and_a_step_is_another_rules_matter() {
        silent(
            &RULE,
            "crystal a\n  lattice chain 8 nm\n  profile = 3 meV * cos(2*pi*x/period)\n",
        );
        silent(
            &RULE,
            "crystal a\n  lattice chain 8 nm\n  profile = 3 meV * (x/(1 nm))^2\n",
        );
    }
}
