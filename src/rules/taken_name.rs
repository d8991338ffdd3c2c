//! # What it finds
//! A name that cannot be given, as it means something else already: a unit, a constant, a function, a clause word,
//! another thing of the same sort, or `x`, `y`, `z` beside a profile that uses the position.
//!
//! # Why it matters
//! A reader could take the one for the other. The name keeps its earlier meaning.
//!
//! # Example
//! ```cren
//! let nm = 5.4 nm
//!     ^^
//!
//! crystal tern
//!   lattice chain 8.0 nm
//!   cosine 1 = 20 meV
//! ```
//!
//! # Instead
//! ```cren
//! let well = 5.4 nm
//!
//! crystal tern
//!   lattice chain well
//!   cosine 1 = 20 meV
//! ```
//!
//! # Fix
//! None: a good name is for the author to find.

use super::{Finding, Level, Rule, Subject, Tier};
use crate::model::TroubleKind;

/// The rule.
pub const RULE: Rule = Rule {
    name: "taken-name",
    group: "names",
    level: Level::Error,
    tier: Tier::Model,
    waivable: false,
    source: include_str!("taken_name.rs"),
    check,
};

fn check(subject: &Subject<'_>, findings: &mut Vec<Finding>) {
    for trouble in subject.troubles {
        if let TroubleKind::TakenName { name, holder } = &trouble.kind {
            let message = format!("`{name}` is taken: it is {holder}");
            let finding = Finding::of_trouble(&RULE, trouble, message);
            findings.push(finding.help("choose another name"));
        }
    }
}

#[cfg(test)]
mod tests {
    use super::super::fixture::{messages, silent};
    use super::RULE;

    #[test]
    fn units_functions_and_clause_words_are_taken() {
        for name in ["meV", "sqrt", "within", "hbar", "period"] {
            assert_eq!(
                messages(&RULE, &format!("let {name} = 3 nm\n")).len(),
                1,
                "{name}"
            );
        }
    }

    #[test]
    fn a_single_letter_may_be_a_name_though_it_is_a_unit() {
        silent(&RULE, "let s = 8\nlet h = 3 nm\n");
    }
}
