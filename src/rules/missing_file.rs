//! # What it finds
//! A `use` or `table` whose file cannot be read, or lies outside the workspace.
//!
//! # Why it matters
//! Whatever was to come from there is missing.
//!
//! # Example
//! ```cren
//! use "shelf.cren"
//!     ^^^^^^^^^^^^
//!
//! crystal tern
//!   lattice chain 8.0 nm
//!   cosine 1 = 20 meV
//! ```
//!
//! # Instead
//! ```cren
//! use "materials.cren"
//!
//! crystal tern
//!   layer 8.0 nm of basin
//! ```
//! ```cren materials.cren
//! material basin
//!   mass 0.067 me
//!   edge 0 meV
//! ```
//!
//! # Fix
//! None: the path is relative to the file that names it.

use super::{Finding, Level, Rule, Subject, Tier};
use crate::model::TroubleKind;

/// The rule.
pub const RULE: Rule = Rule {
    name: "missing-file",
    group: "names",
    level: Level::Error,
    tier: Tier::Model,
    waivable: false,
    source: include_str!("missing_file.rs"),
    check,
};

fn check(subject: &Subject<'_>, findings: &mut Vec<Finding>) {
    for trouble in subject.troubles {
        if let TroubleKind::MissingFile { path, why } = &trouble.kind {
            let message = format!("`{path}` cannot be read: {why}");
            findings.push(Finding::of_trouble(&RULE, trouble, message).help(
                "a path is relative to the file that names it, and stays inside the workspace",
            ));
        }
    }
}

#[cfg(test)]
mod tests {
    use super::super::fixture::{messages, messages_with, silent_with};
    use super::RULE;

    #[test]
    fn a_file_that_is_not_there_is_found() {
        let found = messages(&RULE, "use \"none.cren\"\n");
        assert_eq!(found.len(), 1, "{found:?}");
        assert!(
            found
                .iter()
                .all(|text| text.starts_with("`none.cren` cannot be read"))
        );
    }

    #[test]
    fn a_table_that_is_not_there_is_found_and_one_that_is_there_is_not() {
        let text = "crystal a\n  lattice chain 4 nm\n  table \"t.csv\" in nm, meV\n";
        assert_eq!(messages_with(&RULE, text, &[]).len(), 1);
        silent_with(&RULE, text, &[("t.csv", "0,0\n1,5\n2,0\n3,-5\n4,0\n")]);
    }
}
