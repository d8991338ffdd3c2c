//! # What it finds
//! A `require` that holds at the nominal values and fails somewhere within the tolerances.
//!
//! # Why it matters
//! Of the crystals that are made to this design, some will miss the target.
//!
//! # Example
//! ```cren
//! material basin
//!   mass 0.067 me
//!   edge 0 meV
//!
//! material wall
//!   mass 0.092 me
//!   edge 235 meV ± 25 meV
//!
//! crystal tern
//!   layer 5.4 nm of basin
//!   layer 2.6 nm ± 0.3 nm of wall
//!   require gap 1 >= 125 meV
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
//!   edge 235 meV ± 25 meV
//!
//! crystal tern
//!   layer 5.4 nm of basin
//!   layer 2.6 nm ± 0.3 nm of wall
//!   require gap 1 >= 60 meV
//! ```
//!
//! # Fix
//! None. The message names the tolerance that spends most of the margin.

use super::subject::parameter;
use super::target_missed::{at_target, halves};
use super::words::Trade;
use super::{Finding, Level, Rule, Subject, Tier, words};
use crate::bands::{Assessment, TargetState};
use crate::model::{Crystal, Parameter, ParameterKind};

/// The rule.
pub const RULE: Rule = Rule {
    name: "target-at-risk",
    group: "targets",
    level: Level::Warning,
    tier: Tier::Bands,
    waivable: true,
    source: include_str!("target_at_risk.rs"),
    check,
};

/// A corner is spelled out up to this many tolerances.
const NAMED: usize = 3;

fn check(subject: &Subject<'_>, findings: &mut Vec<Finding>) {
    let at_risk = subject
        .targets
        .iter()
        .filter(|target| target.state == TargetState::AtRisk);
    findings.extend(at_risk.map(|target| finding(subject, target)));
}

fn finding(subject: &Subject<'_>, target: &Assessment) -> Finding {
    let finding = at_target(&RULE, subject, target, message(subject, target));
    let Some(crystal) = subject.crystal else {
        return finding;
    };
    let driver = target.driver.and_then(|id| parameter(crystal, id));
    let finding = finding.help_if(help(crystal, target, driver));
    match driver {
        Some(driver) => finding.related(driver.place, "this tolerance spends most of the margin"),
        None => finding,
    }
}

fn message(subject: &Subject<'_>, target: &Assessment) -> String {
    let (what, _) = halves(&target.text);
    let trade = Trade::here(subject);
    let Some(worst) = target.worst else {
        return format!(
            "`{}` holds, but not everywhere within the tolerances",
            target.text
        );
    };
    if let Some(found) = &target.found {
        let worst = words::quantity(worst, target.dimension, trade);
        return format!(
            "`{what}` holds ({found}), but the gap closes within the tolerances ({worst} at worst)"
        );
    }
    let Some((limit, side)) = nearest_limit(target, worst) else {
        return format!(
            "`{}` holds, but not everywhere within the tolerances",
            target.text
        );
    };
    let nominal = target.value.map_or(f64::NAN, |value| value.value);
    let shown = words::apart([nominal, worst, limit], target.dimension, trade);
    let off = words::quantity((worst - limit).abs(), target.dimension, trade);
    let [nominal, worst, limit] = shown;
    format!(
        "`{what}` is {nominal}, but within the tolerances it comes to {worst}, {off} {side} the limit of {limit}"
    )
}

/// The limit that the worst value breaks; where the limits move too, the one it is nearest to.
fn nearest_limit(target: &Assessment, worst: f64) -> Option<(f64, &'static str)> {
    let (lower, upper) = target.limits;
    let broken_lower = lower.filter(|limit| worst < *limit);
    let broken_upper = upper.filter(|limit| worst > *limit);
    match (broken_lower, broken_upper) {
        (Some(limit), _) => Some((limit, "below")),
        (None, Some(limit)) => Some((limit, "above")),
        (None, None) => None,
    }
}

fn help(crystal: &Crystal, target: &Assessment, driver: Option<&Parameter>) -> Option<String> {
    let driver = driver?;
    let alone = target.corner.len() == 1;
    let corner = corner(crystal, target);
    let spends = match alone {
        true => format!("`{}` is the one tolerance it has", driver.text),
        false => format!("`{}` spends most of the margin", driver.text),
    };
    Some(match corner {
        Some(corner) if !alone => format!("{spends}; the worst case has {corner}"),
        _ => spends,
    })
}

/// The worst case in words, where few tolerances take part.
fn corner(crystal: &Crystal, target: &Assessment) -> Option<String> {
    let draws: Vec<_> = target
        .corner
        .iter()
        .filter(|(_, draw)| *draw != 0.0)
        .collect();
    if draws.is_empty() || draws.len() > NAMED {
        return None;
    }
    let named = draws.iter().map(|(id, draw)| {
        let parameter =
            parameter(crystal, *id).filter(|found| found.kind == ParameterKind::Draw)?;
        Some(format!("`{}` {}", parameter.text, end(*draw)))
    });
    Some(words::listed(&named.collect::<Option<Vec<_>>>()?))
}

fn end(draw: f64) -> &'static str {
    if draw >= 1.0 - 1e-9 {
        "at its upper end"
    } else if draw <= -1.0 + 1e-9 {
        "at its lower end"
    } else {
        "inside its interval"
    }
}

#[cfg(test)]
mod tests {
    use super::super::fixture::{assessed, electronvolts};
    use super::RULE;
    use crate::bands::TargetState;

    #[test]
    fn nominal_worst_and_limit_are_said() {
        let found = assessed(&RULE, |target| {
            target.text = "gap 1 >= 60 meV".to_owned();
            target.state = TargetState::AtRisk;
            target.value = Some(electronvolts(0.0621));
            target.worst = Some(electronvolts(0.0573).value);
            target.limits = (Some(electronvolts(0.06).value), None);
        });
        let message = "`gap 1` is 62.1 meV, but within the tolerances it comes to 57.3 meV, 2.7 meV below the limit of 60 meV";
        assert_eq!(found, [message]);
    }

    #[test]
    fn a_target_that_holds_everywhere_is_silent() {
        let found = assessed(&RULE, |target| {
            target.state = TargetState::Met;
            target.worst = Some(1.0);
        });
        assert!(found.is_empty());
    }
}
