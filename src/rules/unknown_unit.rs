//! # What it finds
//! A word after a number that is no unit, or a unit that is not known at that place: `Er` without a `recoil`, `ML`
//! without a `monolayer`.
//!
//! # Why it matters
//! The number has no size.
//!
//! # Example
//! ```cren
//! crystal tern
//!   lattice chain 8.0 nn
//!                     ^^
//!   cosine 1 = 20 meV
//! ```
//!
//! # Instead
//! ```cren
//! crystal tern
//!   lattice chain 8.0 nm
//!   cosine 1 = 20 meV
//! ```
//!
//! # Fix
//! The closest unit; before a constant or a name, the `*` that was meant.

use super::{Finding, Fix, Level, Replacement, Rule, Subject, Tier};
use crate::model::{Trouble, TroubleKind, unit};

/// The rule.
pub const RULE: Rule = Rule {
    name: "unknown-unit",
    group: "units",
    level: Level::Error,
    tier: Tier::Model,
    waivable: false,
    source: include_str!("unknown_unit.rs"),
    check,
};

fn check(subject: &Subject<'_>, findings: &mut Vec<Finding>) {
    findings.extend(subject.troubles.iter().filter_map(finding));
}

fn finding(trouble: &Trouble) -> Option<Finding> {
    let TroubleKind::UnknownUnit { unit, why, instead } = &trouble.kind else {
        return None;
    };
    let message = match why {
        Some(why) => format!("`{unit}` is no unit here: {why}"),
        None => format!("`{unit}` is not a unit"),
    };
    let usual = nearest_usual(unit).filter(|_| why.is_none());
    let instead = instead.as_deref().map(|text| match usual {
        Some(usual) if unit::is_unit(text) => usual,
        _ => text,
    });
    let help = instead.map(|text| format!("did you mean `{text}`?"));
    Some(
        Finding::of_trouble(&RULE, trouble, message)
            .help_if(help)
            .fix(instead.map(|text| fix(trouble, text))),
    )
}

/// Of the units that are equally close, the one that the trade uses most.
fn nearest_usual(word: &str) -> Option<&'static str> {
    let distance = |unit: &&unit::Unit| strsim::damerau_levenshtein(word, unit.name);
    unit::UNITS
        .iter()
        .min_by_key(distance)
        .map(|unit| unit.name)
}

/// Putting the missing `*` before a name only says what was written; another unit is a guess.
fn fix(trouble: &Trouble, instead: &str) -> Fix {
    let title = format!("write `{instead}`");
    let edit = Replacement::new(trouble.place, instead);
    if instead.starts_with('*') {
        return Fix::safe(title, edit);
    }
    Fix::guess(title, edit)
}

#[cfg(test)]
mod tests {
    use super::super::fixture::{fixed, messages, silent};
    use super::RULE;

    #[test]
    fn the_closest_unit_is_offered() {
        let text = "let a = 5 meVV\n";
        assert_eq!(messages(&RULE, text), ["`meVV` is not a unit"]);
        assert_eq!(fixed(&RULE, text), "let a = 5 meV\n");
        assert_eq!(fixed(&RULE, "let a = 5 nn\n"), "let a = 5 nm\n");
    }

    #[test]
    fn a_name_after_a_number_wants_a_star() {
        assert!(fixed(&RULE, "let b = 3 nm\nlet a = 2 b\n").contains("let a = 2 * b"));
    }

    #[test]
    fn a_recoil_makes_its_unit() {
        assert_eq!(
            messages(
                &RULE,
                "crystal c\n  mass 87 u\n  lattice chain 400 nm\n  cosine 1 = 2 Er\n"
            )
            .len(),
            1
        );
        silent(
            &RULE,
            "crystal c\n  mass 87 u\n  lattice chain 400 nm\n  recoil 800 nm\n  cosine 1 = 2 Er\n",
        );
    }
}
