//! # What it finds
//! A `let` or a material that nothing uses, in a file that has crystals and that no known file `use`s.
//!
//! # Why it matters
//! It is either left over, or was meant to be used where another number stands now.
//!
//! # Example
//! ```cren
//! let well = 5.4 nm
//!     ^^^^
//!
//! crystal tern
//!   lattice chain 8.0 nm
//!   cosine 1 = 20 meV
//! ```
//!
//! # Instead
//! ```cren
//! let cell = 8.0 nm
//!
//! crystal tern
//!   lattice chain cell
//!   cosine 1 = 20 meV
//! ```
//!
//! # Fix
//! An unused `let` is taken out.

use super::file::Uses;
use super::{FileSubject, Finding, Fix, Level, Replacement, Rule, Subject, Tier};
use crate::model::words::holder_of;
use crate::model::{NameSort, Place};
use crate::syntax::{Entry, SectionKind, StatementKind, Word};
use crate::text::Span;

/// The rule.
pub const RULE: Rule = Rule {
    name: "unused-name",
    group: "names",
    level: Level::Warning,
    tier: Tier::Model,
    waivable: true,
    source: include_str!("unused_name.rs"),
    check,
};

/// Whether a name is used shows only in the whole file: see [`file_check`].
fn check(_: &Subject<'_>, _: &mut Vec<Finding>) {}

/// Finds the names of a file that nothing uses.
pub fn file_check(file: &FileSubject<'_>, findings: &mut Vec<Finding>) {
    let mut sections = file.tree.entries.iter().map(|entry| &entry.section);
    let has_crystals = sections
        .clone()
        .any(|section| section.kind == SectionKind::Crystal);
    // A line that does not read may be the one that uses a name.
    let unreadable = sections.any(|section| !section.problems.is_empty());
    if file.used_by_others || !has_crystals || unreadable {
        return;
    }
    let uses = Uses::of(file);
    for entry in &file.tree.entries {
        findings.extend(material(file, &uses, entry));
        findings.extend(names(file, &uses, entry));
    }
}

fn material(file: &FileSubject<'_>, uses: &Uses<'_>, entry: &Entry) -> Option<Finding> {
    if entry.section.kind != SectionKind::Material {
        return None;
    }
    let name = entry.section.name.as_ref()?;
    let place = file.place(entry, name.span);
    if uses.may_use(place, NameSort::Material) {
        return None;
    }
    Some(unused(
        place,
        format!("nothing uses the material `{}`", name.text),
    ))
}

fn names<'a>(
    file: &'a FileSubject<'_>,
    uses: &'a Uses<'_>,
    entry: &'a Entry,
) -> impl Iterator<Item = Finding> + 'a {
    let statements = entry.section.statements.iter();
    statements.filter_map(move |statement| {
        let StatementKind::Let { name, .. } = &statement.kind else {
            return None;
        };
        let place = file.place(entry, name.span);
        if holder_of(&name.text).is_some() {
            return None;
        }
        if uses.may_use(place, NameSort::Value) || may_be_inherited(uses, entry, name) {
            return None;
        }
        let fix = take_out(file, entry, statement.span);
        Some(unused(place, format!("nothing uses `{}`", name.text)).fix(fix))
    })
}

/// A `let` under a heading with `like` also replaces that name in all that is taken over.
fn may_be_inherited(uses: &Uses<'_>, entry: &Entry, name: &Word) -> bool {
    entry.section.like.is_some() && uses.mentions(&name.text)
}

fn unused(place: Place, message: String) -> Finding {
    Finding {
        unused: true,
        ..Finding::new(&RULE, place, message).help("use it, or take it out")
    }
}

fn take_out(file: &FileSubject<'_>, entry: &Entry, statement: Span) -> Option<Fix> {
    let mut lines = entry.section.lines.iter();
    let line =
        lines.find(|line| line.span.start <= statement.start && statement.end <= line.span.end)?;
    let edit = Replacement::new(file.place(entry, line.span), "");
    Some(Fix::guess("take this line out", edit))
}

#[cfg(test)]
mod tests {
    use super::super::fixture::{messages, silent};
    use super::RULE;

    #[test]
    fn a_let_and_a_material_that_nothing_uses_are_found() {
        let text =
            "let a = 3 nm\nmaterial m\n  mass 1 me\n  edge 0 eV\ncrystal c\n  lattice chain 5 nm\n";
        let found = messages(&RULE, text);
        assert_eq!(found, ["nothing uses `a`", "nothing uses the material `m`"]);
    }

    #[test]
    fn where_a_name_is_misspelt_none_is_called_unused() {
        silent(
            &RULE,
            "material wall\n  mass 1 me\n  edge 0 eV\ncrystal c\n  layer 5 nm of wal\n",
        );
        silent(
            &RULE,
            "material wall\n  mass 1 me\n  edge 0 eV\ncrystal c\n  layer 5 nm off wall\n",
        );
    }

    #[test]
    fn a_file_of_materials_alone_is_a_shelf() {
        silent(
            &RULE,
            "let a = 3 nm\nmaterial m\n  mass 1 me\n  edge 0 eV\n",
        );
    }

    #[test]
    fn a_let_that_replaces_an_inherited_one_is_used() {
        let text =
            "crystal c\n  let a = 3 nm\n  lattice chain a\ncrystal d like c\n  let a = 4 nm\n";
        silent(&RULE, text);
    }
}
