//! # What it finds
//! A bare number where a length, an energy or another quantity with a unit is wanted. A zero needs none.
//!
//! # Why it matters
//! Five nanometres and five ångströms make very different crystals; the file should say which.
//!
//! # Example
//! ```cren
//! crystal tern
//!   lattice chain 8.0
//!                 ^^^
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
//! The unit that the section writes elsewhere for such a quantity, or the usual one of the trade.

use super::{Finding, Fix, Level, Replacement, Rule, Subject, Tier, words};
use crate::model::{Dimension, Place, Trouble, TroubleKind, unit};
use crate::text::Span;

/// The rule.
pub const RULE: Rule = Rule {
    name: "missing-unit",
    group: "units",
    level: Level::Error,
    tier: Tier::Model,
    waivable: false,
    source: include_str!("missing_unit.rs"),
    check,
};

fn check(subject: &Subject<'_>, findings: &mut Vec<Finding>) {
    let troubles = subject.troubles.iter();
    findings.extend(troubles.filter_map(|trouble| finding(subject, trouble)));
}

fn finding(subject: &Subject<'_>, trouble: &Trouble) -> Option<Finding> {
    let TroubleKind::MissingUnit { wanted, number } = &trouble.kind else {
        return None;
    };
    let (what, example) = words::dimension_words(*wanted).unwrap_or(("a quantity with a unit", ""));
    let message = format!("`{number}` has no unit; {what} is wanted here");
    let unit = usual_unit(subject, *wanted).unwrap_or(example);
    let help =
        (!unit.is_empty()).then(|| format!("write the unit behind it, such as `{number} {unit}`"));
    Some(
        Finding::of_trouble(&RULE, trouble, message)
            .help_if(help)
            .fix(fix(trouble.place, unit)),
    )
}

fn fix(place: Place, unit: &str) -> Option<Fix> {
    if unit.is_empty() {
        return None;
    }
    let end = Place {
        span: Span::new(place.span.end, place.span.end),
        ..place
    };
    let edit = Replacement::new(end, format!(" {unit}"));
    Some(Fix::guess(format!("write `{unit}` behind it"), edit))
}

/// The unit of that dimension that the section writes first.
fn usual_unit(subject: &Subject<'_>, wanted: Dimension) -> Option<&'static str> {
    let text: &str = &subject.entry.section.text;
    let mut words = text.split(|c: char| c.is_whitespace() || "()*/^,=±".contains(c));
    words.find_map(|word| {
        let bare = word.trim_start_matches(|c: char| c.is_ascii_digit() || c == '.');
        let unit = unit::find(bare).filter(|unit| unit.dimension == wanted)?;
        Some(unit.name)
    })
}

#[cfg(test)]
mod tests {
    use super::super::fixture::{fixed, messages, silent};
    use super::RULE;

    #[test]
    fn the_unit_written_elsewhere_is_offered() {
        let text = "crystal a\n  lattice chain 8\n  site gaussian 3 meV sigma 2 angstrom at 0\n";
        assert_eq!(
            messages(&RULE, text),
            ["`8` has no unit; a length is wanted here"]
        );
        assert!(fixed(&RULE, text).contains("lattice chain 8 angstrom\n"));
    }

    #[test]
    fn a_zero_needs_no_unit() {
        silent(
            &RULE,
            "crystal a\n  mass 1 me\n  layer 4 nm at 0\n  layer 4 nm at 5 meV\n",
        );
    }
}
