//! Rules that see a whole file, and the waivers.

use std::sync::Arc;

use super::{Finding, Level, Rule, Tier, find, gather, idle_waiver, unused_name};
use crate::model::{FileId, NameSort, Place, Reference};
use crate::syntax::{Entry, SectionId, StatementKind, Tree};
use crate::text::Span;
use rustc_hash::{FxHashMap, FxHashSet};

/// A whole file, and what is known of it.
pub struct FileSubject<'a> {
    /// The file.
    pub file: FileId,
    /// Its statements.
    pub tree: &'a Tree,
    /// The names that its sections use.
    pub references: &'a [&'a [Reference]],
    /// Whether a known file `use`s this one.
    pub used_by_others: bool,
}

impl FileSubject<'_> {
    /// A span of one of its sections as a place.
    #[must_use]
    pub fn place(&self, entry: &Entry, span: Span) -> Place {
        Place {
            file: self.file,
            section: entry.id,
            span,
        }
    }
}

/// The names that a file uses, for many questions.
pub struct Uses<'a> {
    definitions: FxHashSet<(NameSort, Place)>,
    /// Sorts of which a name that nothing defines is used: it may mean any of that sort.
    unknown: FxHashSet<NameSort>,
    values: FxHashSet<&'a str>,
}

impl<'a> Uses<'a> {
    /// Of a file.
    #[must_use]
    pub fn of(file: &FileSubject<'a>) -> Self {
        let mut uses = Self {
            definitions: FxHashSet::default(),
            unknown: FxHashSet::default(),
            values: FxHashSet::default(),
        };
        for reference in file.references.iter().copied().flatten() {
            match reference.definition {
                Some(place) => uses.definitions.insert((reference.sort, place)),
                None => uses.unknown.insert(reference.sort),
            };
            if reference.sort == NameSort::Value {
                uses.values.insert(&reference.name);
            }
        }
        uses
    }

    /// Whether a name that is defined at `definition` is used, or may be meant where a name of that sort is unknown.
    #[must_use]
    pub fn may_use(&self, definition: Place, sort: NameSort) -> bool {
        self.unknown.contains(&sort) || self.definitions.contains(&(sort, definition))
    }

    /// Whether a value of that name is used anywhere in the file.
    #[must_use]
    pub fn mentions(&self, name: &str) -> bool {
        self.values.contains(name)
    }
}

/// What shows only in the whole file, waivers not yet applied.
#[must_use]
pub fn file_findings(subject: &FileSubject<'_>) -> Vec<Finding> {
    let mut findings = Vec::new();
    unused_name::file_check(subject, &mut findings);
    findings
}

/// A `waive` with a reason.
struct Waiver<'a> {
    /// The rule it names.
    rule: &'a str,
    /// The section it serves; `None` for the whole file.
    section: Option<&'a Entry>,
    /// The statement.
    place: Place,
    /// Its line.
    line: Place,
    used: bool,
}

/// The findings of a file without those that its waivers silence, with those on the waivers themselves, in order of
/// place, each once. A waiver is called idle only if its rule has been run to `depth` on all that it serves.
#[must_use]
pub fn apply_waivers(
    file: FileId,
    tree: &Tree,
    findings: Vec<Arc<Finding>>,
    depth: Tier,
) -> Vec<Arc<Finding>> {
    let mut waivers = waivers(file, tree);
    let errors: Vec<Place> = findings
        .iter()
        .filter(|finding| finding.level == Level::Error)
        .map(|finding| finding.place)
        .collect();
    let mut kept: Vec<Arc<Finding>> = Vec::with_capacity(findings.len());
    for finding in findings {
        if !silenced(&finding, &mut waivers) {
            kept.push(finding);
        }
    }
    let idle = waivers.iter().filter(|waiver| !waiver.used);
    let idle: Vec<_> = idle
        .filter_map(|waiver| idle_finding(waiver, &errors, depth).map(Arc::new))
        .collect();
    kept.extend(idle.into_iter().filter(|finding| {
        let own = Some(finding.place.section);
        !waivers.iter().any(|waiver| {
            waiver.rule == "idle-waiver" && waiver.section.is_none_or(|entry| Some(entry.id) == own)
        })
    }));
    in_order(tree, gather::at_their_numbers(file, kept))
}

/// The waivers of a file that give a reason.
fn waivers(file: FileId, tree: &Tree) -> Vec<Waiver<'_>> {
    let mut all = Vec::new();
    for (index, entry) in tree.entries.iter().enumerate() {
        let place = |span| Place {
            file,
            section: entry.id,
            span,
        };
        for statement in &entry.section.statements {
            let StatementKind::Waive { rule, reason } = &statement.kind else {
                continue;
            };
            if reason
                .as_ref()
                .is_none_or(|reason| reason.text.trim().is_empty())
            {
                continue;
            }
            let mut lines = entry.section.lines.iter();
            let line = lines.find(|line| {
                line.span.start <= statement.span.start && statement.span.end <= line.span.end
            });
            all.push(Waiver {
                rule: &rule.text,
                section: (index > 0).then_some(entry),
                place: place(statement.span),
                line: place(line.map_or(statement.span, |line| line.span)),
                used: false,
            });
        }
    }
    all
}

fn silenced(finding: &Finding, waivers: &mut [Waiver<'_>]) -> bool {
    if waivers.is_empty() || !can_be_waived(finding) {
        return false;
    }
    let mut silenced = false;
    for waiver in waivers {
        let serves = waiver
            .section
            .is_none_or(|entry| entry.id == finding.place.section);
        if serves && waiver.rule == finding.rule {
            waiver.used = true;
            silenced = true;
        }
    }
    silenced
}

/// Errors cannot be waived, but for a missed target.
fn can_be_waived(finding: &Finding) -> bool {
    let waivable = find(finding.rule).is_some_and(|rule| rule.waivable);
    waivable && (finding.level < Level::Error || finding.rule == super::target_missed::RULE.name)
}

fn idle_finding(waiver: &Waiver<'_>, errors: &[Place], depth: Tier) -> Option<Finding> {
    let rule: &Rule = find(waiver.rule)?;
    if !rule.waivable {
        return Some(idle_waiver::finding(
            rule.name,
            false,
            waiver.place,
            waiver.line,
        ));
    }
    // What an error hides cannot be known, so a waiver may yet be needed.
    let serves = |place: &Place| waiver.section.is_none_or(|entry| entry.id == place.section);
    if rule.tier > depth || errors.iter().any(serves) {
        return None;
    }
    Some(idle_waiver::finding(
        rule.name,
        true,
        waiver.place,
        waiver.line,
    ))
}

/// By place, and each finding once.
fn in_order(tree: &Tree, mut findings: Vec<Arc<Finding>>) -> Vec<Arc<Finding>> {
    let entries = tree.entries.iter().enumerate();
    let positions: FxHashMap<SectionId, usize> =
        entries.map(|(index, entry)| (entry.id, index)).collect();
    let order = |finding: &Arc<Finding>| {
        let position = positions.get(&finding.place.section);
        (position.copied().unwrap_or(usize::MAX), finding.place.span)
    };
    findings.sort_by_cached_key(order);
    let mut kept: Vec<Arc<Finding>> = Vec::with_capacity(findings.len());
    for finding in findings {
        let twin = |other: &Arc<Finding>| {
            (other.rule, other.place, &other.message)
                == (finding.rule, finding.place, &finding.message)
        };
        let same_place = kept
            .iter()
            .rev()
            .take_while(|other| other.place == finding.place);
        let known = same_place.into_iter().any(twin);
        if !known {
            kept.push(finding);
        }
    }
    kept
}
