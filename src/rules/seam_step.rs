//! # What it finds
//! A profile or a table whose value at the end of the cell differs from that at its beginning, so that the potential
//! jumps from every cell to the next. Layers may jump; formulas rarely mean to.
//!
//! # Why it matters
//! The crystal repeats the cell as it is written, the jump included. A period that does not match the formula is the
//! usual cause.
//!
//! # Example
//! ```cren
//! crystal tern
//!   lattice chain 8.0 nm
//!   mass 0.067 me
//!   profile = 3 meV * (x / (1 nm))^2
//!             ^^^^^^^^^^^^^^^^^^^^^^
//! ```
//!
//! # Instead
//! ```cren
//! crystal tern
//!   lattice chain 8.0 nm
//!   mass 0.067 me
//!   profile -4.0 nm to 4.0 nm = 3 meV * (x / (1 nm))^2
//! ```
//!
//! # Fix
//! None for a single formula. Of several pieces, one that is off by the same amount at both of its ends is shifted.

use super::stretch::{joints, swing};
use super::words::Trade;
use super::{Finding, Level, Rule, Subject, Tier, join_step, words};
use crate::model::{Crystal, Dimension, Dual, ProfilePiece};

/// The rule.
pub const RULE: Rule = Rule {
    name: "seam-step",
    group: "periodicity",
    level: Level::Warning,
    tier: Tier::Model,
    waivable: true,
    source: include_str!("seam_step.rs"),
    check,
};

fn check(subject: &Subject<'_>, findings: &mut Vec<Finding>) {
    let Some(crystal) = subject.crystal else {
        return;
    };
    if crystal.dimension == 1 {
        findings.extend(along_a_chain(subject, crystal));
        findings.extend(of_table(subject, crystal));
    } else {
        findings.extend(across_faces(subject, crystal));
    }
}

fn along_a_chain(subject: &Subject<'_>, crystal: &Crystal) -> Option<Finding> {
    let swing = swing(crystal)?;
    let joints = joints(crystal);
    let seam = joints.iter().find(|joint| joint.seam)?;
    if !seam.steps(&swing) {
        return None;
    }
    let [before, after] = seam.numbers();
    let place = subject.where_to_speak(seam.left.formula_place, &[&before, &after])?;
    let finding = step_finding(crystal, place, seam.step(), seam.before.0, seam.after.0);
    let finding = match seam.left.place == seam.right.place {
        true => finding,
        false => finding.related(seam.right.formula_place, "the cell begins here"),
    };
    Some(finding.fix(join_step::shift_fix(subject, crystal, &joints)))
}

/// A table whose last sample, one period after the first, has another potential.
fn of_table(subject: &Subject<'_>, crystal: &Crystal) -> Option<Finding> {
    let table = crystal.potential.table.as_ref()?;
    let (first, last) = (*table.energies.first()?, table.closing?);
    let largest = table
        .energies
        .iter()
        .fold(first.abs(), |most, energy| most.max(energy.abs()));
    if (first - last).abs() <= SAMPLE_ROUNDING * largest || !subject.holds(table.place) {
        return None;
    }
    Some(step_finding(
        crystal,
        table.place,
        first - last,
        last,
        first,
    ))
}

fn step_finding(
    crystal: &Crystal,
    place: crate::model::Place,
    step: f64,
    before: f64,
    after: f64,
) -> Finding {
    let trade = Trade::of(crystal);
    let [before, after] = words::apart([before, after], Dimension::ENERGY, trade);
    let size = words::energy(crystal, step.abs());
    let message = format!("the potential jumps by {size} from one cell to the next");
    Finding::new(&RULE, place, message).help(format!(
        "it ends the cell at {after_end} and begins it at {begin}; check the period",
        after_end = before,
        begin = after
    ))
}

/// Samples are written with six digits or more; two closer than this are equal.
const SAMPLE_ROUNDING: f64 = 1e-6;
/// How many points of each face are compared, along each of its edges.
const FACE_POINTS: usize = 5;

fn across_faces(subject: &Subject<'_>, crystal: &Crystal) -> Option<Finding> {
    let piece = crystal.potential.profile.first()?;
    let (step, from, to) = largest_face_step(crystal, piece)?;
    let numbers: Vec<&Dual> = crystal.vectors.iter().flatten().collect();
    let place = subject.where_to_speak(piece.formula_place, &numbers)?;
    Some(step_finding(crystal, place, step, from, to))
}

/// The largest difference between opposite faces of the primitive cell, with the two values.
fn largest_face_step(crystal: &Crystal, piece: &ProfilePiece) -> Option<(f64, f64, f64)> {
    let mut largest: Option<(f64, f64, f64)> = None;
    let mut magnitude: f64 = 0.0;
    for (axis, vector) in crystal.vectors.iter().enumerate() {
        for fractions in face(crystal.dimension, axis) {
            let near = cartesian(crystal, &fractions);
            let mut far = near;
            for (entry, along) in far.iter_mut().zip(vector) {
                *entry += along.value;
            }
            let (from, to) = (piece.formula.at(&far), piece.formula.at(&near));
            let step = (to - from).abs();
            magnitude = magnitude.max(from.abs()).max(to.abs());
            if largest.is_none_or(|(most, _, _)| step > most) {
                largest = Some((step, from, to));
            }
        }
    }
    largest.filter(|(step, _, _)| step.is_finite() && *step > super::stretch::ROUNDING * magnitude)
}

/// Points of the face where the fraction along `axis` is zero; off any mirror line, so that no symmetry hides a step.
fn face(dimension: usize, axis: usize) -> Vec<[f64; 3]> {
    let mut points = vec![[0.0; 3]];
    for other in (0..dimension).filter(|other| *other != axis) {
        points = points
            .iter()
            .flat_map(|point| (0..FACE_POINTS).map(move |step| (*point, step)))
            .map(|(mut point, step)| {
                if let Some(entry) = point.get_mut(other) {
                    *entry = (small(step) + 0.317) / small(FACE_POINTS);
                }
                point
            })
            .collect();
    }
    points
}

fn small(count: usize) -> f64 {
    u32::try_from(count).map_or(f64::NAN, f64::from)
}

fn cartesian(crystal: &Crystal, fractions: &[f64; 3]) -> [f64; 3] {
    let mut position = [0.0; 3];
    for (vector, fraction) in crystal.vectors.iter().zip(fractions) {
        for (entry, along) in position.iter_mut().zip(vector) {
            *entry += fraction * along.value;
        }
    }
    position
}

#[cfg(test)]
mod tests {
    use super::super::fixture::{messages, messages_with, silent, silent_with};
    use super::RULE;

    #[test]
    fn the_jump_is_measured() {
        let text = "crystal a\n  lattice chain 8 nm\n  profile = 3 meV * (x/(1 nm))^2\n";
        let message = "the potential jumps by 192 meV from one cell to the next";
        assert_eq!(messages(&RULE, text), [message]);
    }

    #[test]
    fn a_plane_wave_profile_that_does_not_fit_jumps_over_a_face() {
        let text = "crystal a\n  lattice square 8 nm\n  profile = 3 meV * cos(2*pi*x/(8 nm)) * cos(2*pi*y/(7 nm))\n";
        assert_eq!(messages(&RULE, text).len(), 1);
        silent(&RULE, &text.replace("7 nm", "4 nm"));
    }

    #[test]
    fn rounding_at_the_seam_is_no_jump() {
        silent(
            &RULE,
            "crystal a\n  lattice chain 8 nm\n  profile = 3 meV * cos(2*pi*x/period)^2\n",
        );
        silent(
            &RULE,
            "crystal a\n  lattice chain 8 nm\n  profile -4 nm to 4 nm = 3 meV * (x/(1 nm))^2\n",
        );
    }

    #[test]
    fn a_table_whose_last_sample_is_not_its_first_jumps() {
        let text = "crystal a\n  lattice chain 4 nm\n  table \"t.csv\" in nm, meV\n";
        let rows = "0,0\n1,5\n2,9\n3,5\n4,";
        let open = [("t.csv", &*format!("{rows}2\n"))];
        let message = "the potential jumps by 2 meV from one cell to the next";
        assert_eq!(messages_with(&RULE, text, &open), [message]);
        silent_with(&RULE, text, &[("t.csv", &format!("{rows}0\n"))]);
    }

    #[test]
    fn layers_may_jump() {
        silent(
            &RULE,
            "crystal a\n  mass 1 me\n  layer 4 nm at 0\n  layer 4 nm at 0 to 9 meV\n",
        );
    }
}
