//! Reads a whole text, or reads it again after an edit.

use std::hash::Hasher;
use std::sync::Arc;

use rustc_hash::{FxHashMap, FxHasher};

use super::section::{hash_text, read_section};
use super::split::{Cut, cut};
use super::{Entry, Section, SectionId, SectionKind, Tree};

/// Reads a text. Never fails: what cannot be read is among the problems of its section.
#[must_use]
pub fn read(text: &str) -> Tree {
    tree(text, |kind, part, hash| {
        Arc::new(read_section(kind, part, hash))
    })
}

/// Reads a text that is likely much the same as that of `previous`: a section whose text stands there too is shared, not read.
///
/// The result equals that of [`read`]; the cost of an edit in one section is that of cutting and hashing the text.
#[must_use]
pub fn reread(text: &str, previous: &Tree) -> Tree {
    let known: FxHashMap<u64, &Arc<Section>> = previous
        .entries
        .iter()
        .map(|entry| (entry.section.hash, &entry.section))
        .collect();
    tree(text, |kind, part, hash| match known.get(&hash) {
        Some(section) if section.kind == kind && *section.text == *part => Arc::clone(section),
        _ => Arc::new(read_section(kind, part, hash)),
    })
}

fn tree(text: &str, section: impl Fn(SectionKind, &str, u64) -> Arc<Section>) -> Tree {
    let mut seen = FxHashMap::default();
    let entries = cut(text)
        .into_iter()
        .map(|Cut { kind, start, end }| {
            let part = text.get(start..end).unwrap_or("");
            let section = section(kind, part, hash_text(part));
            Entry {
                start: u32::try_from(start).unwrap_or(u32::MAX),
                id: identify(&section, &mut seen),
                section,
            }
        })
        .collect();
    Tree {
        text: Arc::from(text),
        entries,
    }
}

/// The section's stable name: kind, name and how many of the same kind and name stand before it.
fn identify(section: &Section, seen: &mut FxHashMap<u64, u64>) -> SectionId {
    let mut hasher = FxHasher::default();
    hasher.write_u8(match section.kind {
        SectionKind::Preamble => 0,
        SectionKind::Material => 1,
        SectionKind::Crystal => 2,
    });
    if let Some(name) = &section.name {
        hasher.write_u8(1);
        hasher.write(name.text.as_bytes());
    }
    let before = seen.entry(hasher.finish()).or_insert(0);
    hasher.write_u64(*before);
    *before += 1;
    SectionId(hasher.finish())
}
