//! What may stand where the cursor is.

use std::path::Path;

use super::analysis::Analysis;
use super::editor_expected::dimension_after;
use super::editor_outline::word_at;
use crate::model::Dimension;
use crate::model::constants::CONSTANTS;
use crate::model::unit::UNITS;
use crate::rules;
use crate::syntax::{Section, SectionId, SectionKind, StatementKind, Tree, words};
use crate::text::Span;

/// The sorts of proposal.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum ProposalSort {
    /// A statement word or a clause word.
    Keyword,
    /// A material.
    Material,
    /// A crystal.
    Crystal,
    /// A named value or measure.
    Value,
    /// A constant.
    Constant,
    /// A function.
    Function,
    /// A unit.
    Unit,
    /// A quantity of the bands.
    Quantity,
    /// A word out of a fixed choice.
    Choice,
    /// A rule.
    Rule,
}

/// Something that may be written.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Proposal {
    /// What is written.
    pub label: String,
    /// What it is, in a few words.
    pub detail: String,
    /// Its sort.
    pub sort: ProposalSort,
}

/// What may stand at a byte.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Proposals {
    /// The word that is being written, in bytes of the text.
    pub replaces: Span,
    /// What may stand there; the client leaves out what does not fit the word.
    pub proposals: Vec<Proposal>,
    /// Where a file's path is being written instead: what stands of it before the cursor.
    pub path: Option<String>,
}

/// Where the cursor is.
struct Place<'t> {
    id: SectionId,
    section: &'t Section,
    /// The words of the line before the one that is being written.
    typed: Vec<&'t str>,
    analysis: Option<&'t Analysis>,
    path: &'t Path,
    tree: &'t Tree,
}

/// What may stand at a byte of the file at `path`.
#[must_use]
pub fn proposals(
    tree: &Tree,
    analysis: Option<&Analysis>,
    path: &Path,
    offset: u32,
) -> Option<Proposals> {
    let (_, entry) = tree.entry_at(offset)?;
    let section = &entry.section;
    let byte = offset.checked_sub(entry.start)?;
    // An empty text has no line yet.
    let line = section
        .line_at(byte)
        .map_or(Span::default(), |line| line.span);
    let before = Span::new(line.start, byte).of(&section.text);
    if let Some(written) = open_string(before) {
        let first = before.split_whitespace().next();
        let path = matches!(first, Some("use" | "table")).then(|| written.to_owned())?;
        let start =
            offset - u32::try_from(written.rsplit('/').next().unwrap_or(written).len()).ok()?;
        return Some(Proposals {
            replaces: Span::new(start, offset),
            proposals: Vec::new(),
            path: Some(path),
        });
    }
    if before.contains('#') {
        return None;
    }
    let word = word_at(&section.text, byte);
    let word = if starts_with_digit(word.of(&section.text)) {
        Span::new(byte, byte)
    } else {
        word
    };
    let typed = Span::new(line.start, word.start.max(line.start)).of(&section.text);
    let typed = typed
        .split_whitespace()
        .filter(|word| *word != "\\")
        .collect();
    let place = Place {
        id: entry.id,
        section,
        typed,
        analysis,
        path,
        tree,
    };
    Some(Proposals {
        replaces: entry.absolute(word),
        proposals: place.proposals(),
        path: None,
    })
}

/// What stands of a string that is still open.
fn open_string(before: &str) -> Option<&str> {
    let quotes = before.matches('"').count();
    (quotes % 2 == 1)
        .then(|| before.rsplit('"').next())
        .flatten()
}

fn starts_with_digit(word: &str) -> bool {
    word.starts_with(|first: char| first.is_ascii_digit() || first == '.')
}

fn proposal(label: impl Into<String>, detail: impl Into<String>, sort: ProposalSort) -> Proposal {
    Proposal {
        label: label.into(),
        detail: detail.into(),
        sort,
    }
}

fn choices(words: &[&str], detail: &str) -> Vec<Proposal> {
    words
        .iter()
        .map(|word| proposal(*word, detail, ProposalSort::Choice))
        .collect()
}

impl Place<'_> {
    fn proposals(&self) -> Vec<Proposal> {
        let Some((first, rest)) = self.typed.split_first() else {
            return self.statements();
        };
        let last = rest.last().copied();
        match (*first, last) {
            ("material", Some("like")) => self.sections(SectionKind::Material),
            ("crystal", Some("like")) => self.sections(SectionKind::Crystal),
            ("material" | "crystal", Some(_)) if rest.len() == 1 => vec![proposal(
                "like",
                "takes what another says",
                ProposalSort::Keyword,
            )],
            ("material" | "crystal" | "let" | "atom", None) => Vec::new(),
            ("lattice", None) => self.lattices(),
            ("site", None) => choices(words::SHAPES, "a shape"),
            ("carriers", None) => choices(&["fermions", "bosons"], "what moves"),
            ("waive", None) => self.rules(),
            ("layer" | "stack", Some("of" | "to")) => self.sections(SectionKind::Material),
            ("require" | "measure", Some("of")) => self.sections(SectionKind::Crystal),
            ("require", None) => [self.wanted(), choices(words::CLASSES, "a class")].concat(),
            ("require" | "measure", Some("at")) if self.typed.contains(&"level") => self.points(),
            (_, Some(last)) if starts_with_digit(last) => {
                [self.units(), self.clauses(first)].concat()
            }
            ("require" | "measure", _) => [self.wanted(), self.clauses(first)].concat(),
            _ => [self.values(), self.clauses(first)].concat(),
        }
    }

    fn statements(&self) -> Vec<Proposal> {
        let headings = [
            ("material", "material NAME [like NAME]"),
            ("crystal", "crystal NAME [like NAME]"),
        ];
        let own = words::statements_in(self.section.kind)
            .map(|word| proposal(word.word, word.summary, ProposalSort::Keyword));
        own.chain(headings.map(|(word, form)| proposal(word, form, ProposalSort::Keyword)))
            .collect()
    }

    /// The words that join the parts of a statement, taken from the forms of it.
    fn clauses(&self, first: &str) -> Vec<Proposal> {
        let Some(word) = words::statement(first) else {
            return Vec::new();
        };
        let known = |part: &&str| words::is_clause(part) || words::FIXED.contains(part);
        let parts = word
            .form
            .split([' ', '[', ']', '|', ','])
            .skip(1)
            .filter(known);
        let mut parts: Vec<&str> = parts.collect();
        if first == "require" {
            parts.extend(["between", "within", "and", "of"]);
        }
        parts.sort_unstable();
        parts.dedup();
        parts
            .into_iter()
            .map(|part| proposal(part, word.form, ProposalSort::Keyword))
            .collect()
    }

    fn lattices(&self) -> Vec<Proposal> {
        words::LATTICES
            .iter()
            .map(|kind| proposal(kind.word, kind.form, ProposalSort::Choice))
            .collect()
    }

    fn rules(&self) -> Vec<Proposal> {
        let waivable = rules::all().iter().filter(|rule| rule.waivable);
        waivable
            .map(|rule| proposal(rule.name, rule.summary(), ProposalSort::Rule))
            .collect()
    }

    /// The units of the number that ends the line; all where its place does not say what it is.
    fn units(&self) -> Vec<Proposal> {
        let before = self
            .typed
            .split_last()
            .map_or(&[][..], |(_, before)| before);
        let meant = dimension_after(before);
        let own = [
            ("Er", "recoil energy", Dimension::ENERGY),
            ("ML", "monolayers", Dimension::LENGTH),
        ];
        let units = UNITS
            .iter()
            .map(|unit| (unit.name, unit.about, unit.dimension))
            .chain(own);
        units
            .filter(|(_, _, dimension)| meant.is_none_or(|meant| meant == *dimension))
            .map(|(name, about, _)| proposal(name, about, ProposalSort::Unit))
            .collect()
    }

    /// The named points of this crystal's zone.
    fn points(&self) -> Vec<Proposal> {
        let file = self.analysis.and_then(|analysis| analysis.file(self.path));
        let section = file.and_then(|file| {
            let mut sections = file.sections.iter();
            sections.find(|section| section.section == self.id)
        });
        let crystal = section.and_then(|section| section.crystal.as_ref());
        let points = crystal.map(|crystal| crystal.zone_points());
        let points = points.unwrap_or_else(|| vec![("centre", Vec::new())]);
        let detail = "a point of the zone";
        points
            .into_iter()
            .map(|(name, _)| proposal(name, detail, ProposalSort::Choice))
            .collect()
    }

    fn wanted(&self) -> Vec<Proposal> {
        let quantities = words::QUANTITIES
            .iter()
            .map(|word| proposal(*word, "a quantity of the bands", ProposalSort::Quantity));
        quantities.chain(self.values()).collect()
    }

    /// Named values in sight, constants and functions.
    fn values(&self) -> Vec<Proposal> {
        let mut found: Vec<Proposal> = Vec::new();
        let preamble = self.tree.entries.first().map(|entry| &*entry.section);
        let used = self
            .used_trees()
            .filter_map(|tree| tree.entries.first())
            .map(|entry| &*entry.section);
        for section in std::iter::once(self.section).chain(preamble).chain(used) {
            for statement in &section.statements {
                let (name, value) = match &statement.kind {
                    StatementKind::Let { name, value } => (name, value.span),
                    StatementKind::Measure { name, expression }
                        if std::ptr::eq(section, self.section) =>
                    {
                        (name, expression.span)
                    }
                    _ => continue,
                };
                if !found.iter().any(|known| known.label == name.text) {
                    found.push(proposal(
                        &name.text,
                        value.of(&section.text),
                        ProposalSort::Value,
                    ));
                }
            }
        }
        let constants = CONSTANTS
            .iter()
            .map(|constant| proposal(constant.name, constant.about, ProposalSort::Constant));
        let functions = words::FUNCTIONS
            .iter()
            .map(|name| proposal(*name, "a function", ProposalSort::Function));
        found
            .into_iter()
            .chain(constants)
            .chain(functions)
            .collect()
    }

    /// The materials or crystals in sight.
    fn sections(&self, kind: SectionKind) -> Vec<Proposal> {
        let sort = if kind == SectionKind::Material {
            ProposalSort::Material
        } else {
            ProposalSort::Crystal
        };
        let mut found: Vec<Proposal> = Vec::new();
        for tree in std::iter::once(self.tree).chain(self.used_trees()) {
            for entry in tree
                .entries
                .iter()
                .filter(|entry| entry.section.kind == kind)
            {
                if std::ptr::eq(&*entry.section, self.section) {
                    continue;
                }
                if let Some(name) = entry
                    .section
                    .name
                    .as_ref()
                    .filter(|name| !found.iter().any(|known| known.label == name.text))
                {
                    found.push(proposal(
                        &name.text,
                        entry.section.heading.of(&entry.section.text),
                        sort,
                    ));
                }
            }
        }
        found
    }

    /// The files that this file uses.
    fn used_trees(&self) -> impl Iterator<Item = &Tree> {
        let world = self.analysis.map(|analysis| &analysis.world);
        let own = self
            .analysis
            .and_then(|analysis| analysis.file(self.path))
            .and_then(|file| world?.file(file.file));
        let used = own.map_or(&[][..], |own| own.uses.as_slice());
        used.iter()
            .filter_map(move |id| world?.file(*id))
            .map(|file| &*file.tree)
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::syntax::read;

    /// The labels proposed at `|`.
    fn labels(text: &str) -> Vec<String> {
        let offset = u32::try_from(text.find('|').expect("a cursor")).expect("a short text");
        let tree = read(&text.replace('|', ""));
        let found = proposals(&tree, None, Path::new("/a.cren"), offset);
        found
            .into_iter()
            .flat_map(|found| found.proposals)
            .map(|proposal| proposal.label)
            .collect()
    }

    fn offers(text: &str, label: &str) -> bool {
        labels(text).iter().any(|known| known == label)
    }

    #[test]
    fn a_line_starts_with_what_its_section_allows() {
        assert!(offers("crystal a\n  la|", "layer") && offers("crystal a\n  |", "crystal"));
        assert!(!offers("material a\n  |", "layer") && offers("material a\n  |", "edge"));
        assert!(offers("|", "use") && !offers("|", "edge"));
    }

    #[test]
    fn names_units_and_choices_stand_where_they_belong() {
        let wall = "material wall\n  mass 1 me\n";
        assert_eq!(
            labels(&format!("{wall}crystal a\n  layer 5 nm of w|")),
            ["wall"]
        );
        assert!(offers("crystal a\n  layer 5 |", "nm") && offers("crystal a\n  layer 5 |", "of"));
        assert!(offers("material a\n  edge 1 |", "meV") && !offers("material a\n  edge 1 |", "nm"));
        assert!(offers("crystal a\n  layer 2 * 1 |", "nm"));
        assert!(offers("crystal a\n  lattice |", "fcc"));
        assert!(offers("let s = 8 nm\ncrystal a\n  layer |", "s"));
        assert!(
            offers("crystal a\n  require |", "gap")
                && offers("crystal a\n  require |", "insulator")
        );
        assert!(offers("crystal a\n  waive |", "thin-layer"));
        assert!(labels("crystal a\n  layer 5 nm # |").is_empty());
    }

    #[test]
    fn a_path_is_completed_as_one() {
        let tree = read("use \"../par");
        let found = proposals(&tree, None, Path::new("/a.cren"), 11).expect("a place");
        assert_eq!(
            (found.path.as_deref(), found.replaces),
            (Some("../par"), Span::new(8, 11))
        );
    }
}
