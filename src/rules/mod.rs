//! The rules: one file each, listed here in the order of the format's reference.
//!
//! A rule is a plain record with a function; its documentation is the head of its own file ([`RuleDoc`]). To add one,
//! write its file after the pattern of its neighbours and put it into the list: the registry test runs its example.

mod broken_star;
mod circular_name;
mod circular_use;
mod clashing_atoms;
mod clashing_targets;
mod closed_gap;
mod default_mass;
mod doc;
mod file;
mod filled_past_bands;
mod flat_lattice;
mod formula;
mod gather;
mod idle_formfactor;
mod idle_waiver;
mod join_kink;
mod join_step;
mod literal;
mod lone_component;
mod misplaced_statement;
mod missing_file;
mod missing_lattice;
mod missing_unit;
mod model_range;
mod named_gaps;
mod narrow_gap;
mod not_converged;
mod not_finite;
mod odd_mass;
mod odd_recoil;
mod off_lattice_wave;
mod open_cell;
mod outside_cell;
mod overlapping_pieces;
mod page;
mod part_monolayer;
mod plausible;
mod pole;
mod reasonless_waiver;
mod reciprocal;
mod repeated_statement;
mod rule;
mod seam_kink;
mod seam_step;
mod sharp_sample;
mod slip_beside;
mod stated;
mod stray_character;
mod stretch;
mod subject;
mod taken_name;
mod target_at_risk;
mod target_missed;
mod target_undecided;
mod target_untestable;
mod thin_layer;
mod unit_slip;
mod unknown_name;
mod unknown_statement;
mod unknown_unit;
mod unreadable_line;
mod unused_name;
pub mod words;
mod wrong_unit;

#[cfg(test)]
mod fixture;

pub use doc::{Mark, RuleDoc, Sample};
pub use file::{FileSubject, apply_waivers, file_findings};
pub use page::reference_page;
pub use rule::*;

/// All rules, in the order of the format's reference.
static ALL: &[Rule] = &[
    unreadable_line::RULE,
    unknown_statement::RULE,
    misplaced_statement::RULE,
    repeated_statement::RULE,
    stray_character::RULE,
    unknown_name::RULE,
    taken_name::RULE,
    circular_name::RULE,
    missing_file::RULE,
    circular_use::RULE,
    unused_name::RULE,
    unknown_unit::RULE,
    missing_unit::RULE,
    wrong_unit::RULE,
    not_finite::RULE,
    unit_slip::RULE,
    open_cell::RULE,
    overlapping_pieces::RULE,
    flat_lattice::RULE,
    missing_lattice::RULE,
    clashing_atoms::RULE,
    outside_cell::RULE,
    seam_step::RULE,
    seam_kink::RULE,
    off_lattice_wave::RULE,
    lone_component::RULE,
    broken_star::RULE,
    idle_formfactor::RULE,
    join_step::RULE,
    join_kink::RULE,
    pole::RULE,
    sharp_sample::RULE,
    odd_mass::RULE,
    default_mass::RULE,
    odd_recoil::RULE,
    closed_gap::RULE,
    narrow_gap::RULE,
    not_converged::RULE,
    thin_layer::RULE,
    part_monolayer::RULE,
    filled_past_bands::RULE,
    model_range::RULE,
    target_missed::RULE,
    target_at_risk::RULE,
    target_undecided::RULE,
    target_untestable::RULE,
    clashing_targets::RULE,
    idle_waiver::RULE,
    reasonless_waiver::RULE,
];

/// All rules, in the order of the format's reference.
#[must_use]
pub fn all() -> &'static [Rule] {
    ALL
}

/// The rule of that name.
#[must_use]
pub fn find(name: &str) -> Option<&'static Rule> {
    ALL.iter().find(|rule| rule.name == name)
}

/// What the rules up to a tier find in one section, waivers not yet applied.
#[must_use]
pub fn section_findings(subject: &Subject<'_>, up_to: Tier) -> Vec<Finding> {
    let mut findings = Vec::new();
    for rule in ALL.iter().filter(|rule| rule.tier <= up_to) {
        (rule.check)(subject, &mut findings);
    }
    findings
}
