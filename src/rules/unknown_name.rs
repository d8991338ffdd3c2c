//! # What it finds
//! A name that nothing defines: of a value, a material, a crystal, an atom, a function, a zone point, a lattice or a rule.
//!
//! # Why it matters
//! What stands on that line cannot be worked out, so the crystal is not solved.
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
//!   layer 2.6 nm of wal
//!                   ^^^
//!   require gap 1 >= 60 meV
//!   layer 2.6 nm of wall
//! ```
//! Also found: `target-untestable`.
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
//! ```
//!
//! # Fix
//! The closest name of that sort, where one is close.

use super::{Finding, Fix, Level, Replacement, Rule, Subject, Tier, all, words};
use crate::model::words::nearest;
use crate::model::{Place, TroubleKind};
use crate::syntax::StatementKind;

/// The rule.
pub const RULE: Rule = Rule {
    name: "unknown-name",
    group: "names",
    level: Level::Error,
    tier: Tier::Model,
    waivable: false,
    source: include_str!("unknown_name.rs"),
    check,
};

fn check(subject: &Subject<'_>, findings: &mut Vec<Finding>) {
    for trouble in subject.troubles {
        if let TroubleKind::UnknownName {
            name,
            wanted,
            nearest,
        } = &trouble.kind
        {
            let found = finding(trouble.place, name, wanted, nearest.as_deref());
            let points = zone_points(subject).filter(|_| *wanted == "zone point");
            findings.push(Finding {
                related: trouble.related.clone(),
                help: found.help.clone().or(points),
                ..found
            });
        }
    }
    findings.extend(unknown_rules(subject));
}

/// The zone points of the crystal's lattice, in words.
fn zone_points(subject: &Subject<'_>) -> Option<String> {
    let points = subject.crystal?.zone_points();
    let names: Vec<String> = points.iter().map(|(name, _)| format!("`{name}`")).collect();
    (!names.is_empty()).then(|| format!("this lattice has {}", words::listed(&names)))
}

/// Waivers of rules that do not exist.
fn unknown_rules(subject: &Subject<'_>) -> Vec<Finding> {
    let mut found = Vec::new();
    for statement in &subject.entry.section.statements {
        let StatementKind::Waive { rule, .. } = &statement.kind else {
            continue;
        };
        let names = || all().iter().map(|rule| rule.name);
        if names().any(|name| name == rule.text) {
            continue;
        }
        let close = nearest(&rule.text, names());
        let place = subject.place(rule.span);
        found.push(finding(place, &rule.text, "rule", close.as_deref()));
    }
    found
}

fn finding(place: Place, name: &str, wanted: &str, nearest: Option<&str>) -> Finding {
    let fix = nearest.map(|close| {
        let title = format!("write `{close}`");
        Fix::guess(title, Replacement::new(place, close))
    });
    let help = nearest.map(|close| format!("did you mean `{close}`?"));
    Finding::new(
        &RULE,
        place,
        format!("there is no {wanted} called `{name}`"),
    )
    .help_if(help)
    .fix(fix)
}

#[cfg(test)]
mod tests {
    use super::super::fixture::{fixed, messages, silent};
    use super::RULE;

    #[test]
    fn the_closest_material_is_offered() {
        let text = "material basin\n  mass 1 me\n  edge 0 meV\ncrystal a\n  layer 8 nm of bassin\n";
        assert_eq!(
            messages(&RULE, text),
            ["there is no material called `bassin`"]
        );
        assert!(fixed(&RULE, text).ends_with("layer 8 nm of basin\n"));
    }

    #[test]
    fn a_waiver_of_no_rule_is_found() {
        let text = "waive seem-step because \"it is so\"\n";
        assert_eq!(
            messages(&RULE, text),
            ["there is no rule called `seem-step`"]
        );
        assert_eq!(fixed(&RULE, text), "waive seam-step because \"it is so\"\n");
    }

    #[test]
    fn order_does_not_matter() {
        silent(
            &RULE,
            "let a = b\nlet b = 3 nm\ncrystal c\n  lattice chain a\n",
        );
    }
}
