//! # What it finds
//! A jump of the potential where one piece of a profile ends and the next begins. Above a twentieth of the profile's
//! swing it is likely meant, and only noted.
//!
//! # Why it matters
//! A small jump is usually a number that was rounded or changed on one side only.
//!
//! # Example
//! ```cren
//! crystal tern
//!   lattice chain 8.0 nm
//!   mass 0.067 me
//!   profile 0 to 4.0 nm = 20 meV * cos(2*pi*x/period)
//!   profile 4.0 nm to 8.0 nm = 20 meV * cos(2*pi*x/period) + 0.5 meV
//!                              ^^^^^^^^^^^^^^^^^^^^^^^^^^^^^^^^^^^^^
//! ```
//! Also found: `seam-step`.
//!
//! # Instead
//! ```cren
//! crystal tern
//!   lattice chain 8.0 nm
//!   mass 0.067 me
//!   profile 0 to 4.0 nm = 20 meV * cos(2*pi*x/period)
//!   profile 4.0 nm to 8.0 nm = 20 meV * cos(2*pi*x/period)
//! ```
//!
//! # Fix
//! A piece that is off by the same amount at both of its ends is shifted by a constant.

use super::stretch::{Joint, Swing, joints, swing};
use super::words::Trade;
use super::{Finding, Fix, Level, Replacement, Rule, Subject, Tier, words};
use crate::model::{Crystal, Dimension, ProfilePiece};

/// The rule.
pub const RULE: Rule = Rule {
    name: "join-step",
    group: "continuity",
    level: Level::Warning,
    tier: Tier::Model,
    waivable: true,
    source: include_str!("join_step.rs"),
    check,
};

/// A jump above this part of the profile's swing is likely meant (common practice).
pub const MEANT: f64 = 0.05;

fn check(subject: &Subject<'_>, findings: &mut Vec<Finding>) {
    let Some(crystal) = subject.crystal else {
        return;
    };
    let Some(swing) = swing(crystal) else {
        return;
    };
    let joints = joints(crystal);
    let steps = joints
        .iter()
        .filter(|joint| !joint.seam && joint.steps(&swing));
    findings.extend(steps.filter_map(|joint| finding(subject, crystal, &swing, joint, &joints)));
}

fn finding(
    subject: &Subject<'_>,
    crystal: &Crystal,
    swing: &Swing,
    joint: &Joint<'_>,
    joints: &[Joint<'_>],
) -> Option<Finding> {
    let [left, right] = joint.numbers();
    let place = subject.where_to_speak(joint.right.formula_place, &[&left, &right])?;
    let at = words::length(joint.right.range[0].value);
    let size = words::energy(crystal, joint.step().abs());
    let message = format!("the potential jumps by {size} at {at}");
    let trade = Trade::of(crystal);
    let [before, after] = words::apart([left.value, right.value], Dimension::ENERGY, trade);
    let finding = Finding::new(&RULE, place, message)
        .help(format!(
            "it is {before} to the left and {after} to the right"
        ))
        .related(joint.left.formula_place, "the piece to the left");
    if joint.step().abs() > MEANT * swing.height {
        return Some(finding.at_level(Level::Note));
    }
    Some(finding.fix(shift_fix(subject, crystal, joints)))
}

/// Shifts the one piece whose two ends are off by the same constant, where all else fits.
pub fn shift_fix(subject: &Subject<'_>, crystal: &Crystal, joints: &[Joint<'_>]) -> Option<Fix> {
    let swing = swing(crystal)?;
    let off: Vec<&Joint<'_>> = joints.iter().filter(|joint| joint.steps(&swing)).collect();
    let [one, other] = off.as_slice() else {
        return None;
    };
    let closes = (one.step() + other.step()).abs() <= super::stretch::ROUNDING * swing.magnitude;
    // Of the two stretches between the steps, the later one is the piece to move.
    let piece = one.right;
    if !closes || piece.place != other.left.place {
        return None;
    }
    shift(subject, crystal, piece, -one.step())
}

fn shift(subject: &Subject<'_>, crystal: &Crystal, piece: &ProfilePiece, by: f64) -> Option<Fix> {
    if !subject.holds(piece.formula_place) {
        return None;
    }
    let unit = words::unit_for(by, Dimension::ENERGY, Trade::of(crystal))?;
    let amount = words::number(by.abs() / unit.size, 12);
    let sign = if by < 0.0 { '-' } else { '+' };
    let name = unit.name.replace('µ', "u");
    let text = format!("{sign} {amount} {name}");
    let end = crate::text::Span::new(piece.formula_place.span.end, piece.formula_place.span.end);
    let edit = Replacement::new(subject.place(end), format!(" {text}"));
    Some(Fix::guess(format!("shift this piece: add `{text}`"), edit))
}

#[cfg(test)]
mod tests {
    use super::super::fixture::{fixed, levels, messages, silent};
    use super::RULE;
    use crate::rules::Level;

    const PIECES: &str = "crystal a\n  lattice chain 8 nm\n  profile 0 to 4 nm = 9 meV * cos(2*pi*x/period)\n  profile 4 nm to 8 nm = 9 meV * cos(2*pi*x/period)";

    #[test]
    fn a_piece_that_is_off_by_a_constant_is_shifted() {
        let text = format!("{PIECES} + 0.5 meV\n");
        assert_eq!(
            messages(&RULE, &text),
            ["the potential jumps by 0.5 meV at 4 nm"]
        );
        let mended = fixed(&RULE, &text);
        assert!(mended.contains("+ 0.5 meV - 0.5 meV"), "{mended}");
        silent(&RULE, &mended);
    }

    #[test]
    fn a_large_jump_is_likely_meant() {
        assert_eq!(levels(&RULE, &format!("{PIECES} + 5 meV\n")), [Level::Note]);
        assert_eq!(
            levels(&RULE, &format!("{PIECES} + 0.5 meV\n")),
            [Level::Warning]
        );
    }

    #[test]
    fn pieces_that_meet_are_silent() {
        silent(&RULE, &format!("{PIECES}\n"));
    }
}
