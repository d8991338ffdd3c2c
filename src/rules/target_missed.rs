//! # What it finds
//! A `require` that does not hold at the nominal values.
//!
//! # Why it matters
//! The crystal as written does not do what its designer wants.
//!
//! # Example
//! ```cren
//! material basin
//!   mass 0.067 me
//!   edge 0 meV
//!
//! material wall
//!   mass 0.092 me
//!   edge 235 meV
//!
//! crystal tern
//!   layer 5.4 nm of basin
//!   layer 2.6 nm of wall
//!   require gap 1 >= 600 meV
//!   ^^^^^^^^^^^^^^^^^^^^^^^^
//! ```
//!
//! # Instead
//! ```cren
//! material basin
//!   mass 0.067 me
//!   edge 0 meV
//!
//! material wall
//!   mass 0.092 me
//!   edge 235 meV
//!
//! crystal tern
//!   layer 5.4 nm of basin
//!   layer 2.6 nm of wall
//!   require gap 1 >= 60 meV
//! ```
//!
//! # Fix
//! None: either the crystal or the wish has to change. While the design is under way, this error alone may be waived.

use super::subject::parameter;
use super::words::Trade;
use super::{Finding, Level, Rule, Subject, Tier, words};
use crate::bands::{Assessment, TargetState};
use crate::model::Place;

/// The rule.
pub const RULE: Rule = Rule {
    name: "target-missed",
    group: "targets",
    level: Level::Error,
    tier: Tier::Bands,
    waivable: true,
    source: include_str!("target_missed.rs"),
    check,
};

fn check(subject: &Subject<'_>, findings: &mut Vec<Finding>) {
    let missed = subject
        .targets
        .iter()
        .filter(|target| target.state == TargetState::Missed);
    for target in missed {
        let finding = at_target(&RULE, subject, target, message(subject, target));
        let finding = finding.help_if(help(subject, target));
        let driver = subject
            .crystal
            .zip(target.driver)
            .and_then(|(crystal, id)| parameter(crystal, id));
        findings.push(match driver {
            Some(driver) => finding.related(driver.place, "the tolerance that matters most here"),
            None => finding,
        });
    }
}

fn message(subject: &Subject<'_>, target: &Assessment) -> String {
    let (what, _) = halves(&target.text);
    if let Some(found) = &target.found {
        return match target.text.starts_with("gap ") {
            true => format!("`{what}` is required, and the gap is {found}"),
            false => format!("`{what}` is required, and this is a {found}"),
        };
    }
    let Some(value) = target.value else {
        return format!("`{}` does not hold", target.text);
    };
    let Some((limit, side)) = broken_limit(target, value.value) else {
        return format!("`{}` does not hold", target.text);
    };
    let trade = Trade::here(subject);
    let [shown, shown_limit] = words::apart([value.value, limit], target.dimension, trade);
    let off = words::quantity((value.value - limit).abs(), target.dimension, trade);
    format!("`{what}` is {shown}, {off} {side} the limit of {shown_limit}")
}

/// The worst case, where there are tolerances.
fn help(subject: &Subject<'_>, target: &Assessment) -> Option<String> {
    let Some(worst) = target.worst else {
        return target.reason.clone();
    };
    let worst = words::quantity(worst, target.dimension, Trade::here(subject));
    Some(format!(
        "at the worst values of the tolerances it comes to {worst}"
    ))
}

/// The limit that a value breaks, and on which side of it the value lies.
fn broken_limit(target: &Assessment, value: f64) -> Option<(f64, &'static str)> {
    let (lower, upper) = target.limits;
    let below = lower
        .filter(|limit| value < *limit)
        .map(|limit| (limit, "below"));
    below.or_else(|| {
        upper
            .filter(|limit| value > *limit)
            .map(|limit| (limit, "above"))
    })
}

/// What is required, and the relation behind it.
pub fn halves(text: &str) -> (&str, &str) {
    let relations = [" >=", " <=", " ≥", " ≤", " >", " <", " =", " between "];
    let first = relations
        .iter()
        .filter_map(|relation| text.find(relation))
        .min();
    match first.and_then(|at| text.split_at_checked(at)) {
        Some((what, relation)) => (what.trim(), relation.trim()),
        None => (text.trim(), ""),
    }
}

/// A finding at a target; at the heading, where the target is inherited.
pub fn at_target(
    rule: &Rule,
    subject: &Subject<'_>,
    target: &Assessment,
    message: String,
) -> Finding {
    let place: Place = target.place;
    if subject.holds(place) {
        return Finding::new(rule, place, message);
    }
    Finding::new(rule, subject.heading(), message).related(place, "required here")
}

#[cfg(test)]
mod tests {
    use super::super::fixture::{assessed, electronvolts};
    use super::{RULE, halves};
    use crate::bands::TargetState;

    #[test]
    fn the_shortfall_is_said() {
        let found = assessed(&RULE, |target| {
            target.text = "gap 1 >= 60 meV".to_owned();
            target.state = TargetState::Missed;
            target.value = Some(electronvolts(0.0542));
            target.limits = (Some(electronvolts(0.06).value), None);
        });
        assert_eq!(
            found,
            ["`gap 1` is 54.2 meV, 5.8 meV below the limit of 60 meV"]
        );
    }

    #[test]
    fn a_class_is_named() {
        let found = assessed(&RULE, |target| {
            target.text = "insulator".to_owned();
            target.state = TargetState::Missed;
            target.found = Some("metal".to_owned());
        });
        assert_eq!(found, ["`insulator` is required, and this is a metal"]);
    }

    #[test]
    fn a_target_at_risk_is_not_missed() {
        assert!(assessed(&RULE, |target| target.state = TargetState::AtRisk).is_empty());
    }

    #[test]
    fn a_requirement_is_cut_at_its_relation() {
        assert_eq!(halves("width 1 = 32 meV within 8 meV").0, "width 1");
        assert_eq!(halves("line between 1 meV and 2 meV").0, "line");
        assert_eq!(halves("gap 1 direct"), ("gap 1 direct", ""));
    }
}
