//! Where names are given and used: definition, uses, new names.

use std::path::{Path, PathBuf};

use unicode_ident::{is_xid_continue, is_xid_start};
use unicode_normalization::UnicodeNormalization;

use super::analysis::{Analysis, FileAnalysis};
use crate::model::words::holder_of;
use crate::model::{FileId, NameSort, Place};
use crate::syntax::{Entry, StatementKind, Word};
use crate::text::Span;

/// A name under the cursor.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Named {
    /// The name.
    pub name: String,
    /// Its sort.
    pub sort: NameSort,
    /// The word under the cursor, in bytes of its file.
    pub word: Span,
    /// Where the name is given.
    pub definition: Place,
}

/// The name that a byte of a file touches: where it is used or given.
#[must_use]
pub fn named_at(analysis: &Analysis, path: &Path, offset: u32) -> Option<Named> {
    let file = analysis.file(path)?;
    let (entry, _) = file.section_at(offset)?;
    let used = used_at(file, entry, offset);
    used.or_else(|| {
        given(file.file, entry)
            .into_iter()
            .find(|named| named.word.touches(offset))
    })
}

fn used_at(file: &FileAnalysis, entry: &Entry, offset: u32) -> Option<Named> {
    let (_, section) = file.section_at(entry.start)?;
    let byte = offset.checked_sub(entry.start)?;
    let here = |place: &Place| {
        place.file == file.file && place.section == entry.id && place.span.touches(byte)
    };
    let mut found = section
        .references
        .iter()
        .filter(|reference| here(&reference.place));
    let reference = found.find(|reference| reference.definition.is_some())?;
    Some(Named {
        name: reference.name.clone(),
        sort: reference.sort,
        word: entry.absolute(reference.place.span),
        definition: reference.definition?,
    })
}

/// The names that a section gives.
fn given(file: FileId, entry: &Entry) -> Vec<Named> {
    let named = |word: &Word, sort| Named {
        name: word.text.clone(),
        sort,
        word: entry.absolute(word.span),
        definition: Place {
            file,
            section: entry.id,
            span: word.span,
        },
    };
    let own = match entry.section.kind {
        crate::syntax::SectionKind::Material => NameSort::Material,
        _ => NameSort::Crystal,
    };
    let heading = entry.section.name.iter().map(|name| named(name, own));
    let inside = entry
        .section
        .statements
        .iter()
        .filter_map(|statement| match &statement.kind {
            StatementKind::Let { name, .. } => Some(named(name, NameSort::Value)),
            StatementKind::Measure { name, .. } => Some(named(name, NameSort::Measure)),
            StatementKind::Atom { name, .. } => Some(named(name, NameSort::Atom)),
            _ => None,
        });
    heading.chain(inside).collect()
}

/// The file that a `use` or `table` under the cursor names, with the string's place.
#[must_use]
pub fn file_at(analysis: &Analysis, path: &Path, offset: u32) -> Option<(Span, PathBuf)> {
    super::editor_links::links(&analysis.file(path)?.tree, path)
        .into_iter()
        .find(|(span, _)| span.touches(offset))
}

/// Every place that means this name, in the analysed files: where it is given first, then where it is used,
/// each as path and bytes.
#[must_use]
pub fn uses(analysis: &Analysis, named: &Named, with_definition: bool) -> Vec<(PathBuf, Span)> {
    let mut places = Vec::new();
    if with_definition {
        places.push(named.definition);
    }
    for file in &analysis.files {
        for section in &file.sections {
            let same = section
                .references
                .iter()
                .filter(|reference| reference.definition == Some(named.definition));
            places.extend(same.map(|reference| reference.place));
        }
    }
    let mut found: Vec<(PathBuf, Span)> = Vec::new();
    for place in places {
        let Some((path, span)) = analysis.absolute(&place) else {
            continue;
        };
        if !found
            .iter()
            .any(|(known, seen)| known == path && *seen == span)
        {
            found.push((path.to_owned(), span));
        }
    }
    found
}

/// Checks a new name.
///
/// # Errors
/// What is wrong with it, in words.
pub fn check_new_name(analysis: &Analysis, named: &Named, new: &str) -> Result<(), String> {
    let mut letters = new.chars();
    let starts = letters
        .next()
        .is_some_and(|first| first == '_' || is_xid_start(first));
    if !starts || !letters.all(is_xid_continue) {
        return Err(format!(
            "`{new}` is no name: names are letters, digits and `_`, and start with no digit"
        ));
    }
    if matches!(named.sort, NameSort::Value | NameSort::Measure) {
        if let Some(holder) = holder_of(new) {
            return Err(format!("`{new}` is {holder}"));
        }
    }
    let new: String = new.nfc().collect();
    let plain = |sort| {
        if sort == NameSort::Measure {
            NameSort::Value
        } else {
            sort
        }
    };
    let taken = analysis.files.iter().any(|file| {
        let others = file
            .tree
            .entries
            .iter()
            .flat_map(|entry| given(file.file, entry));
        let others = others.filter(|other| {
            plain(other.sort) == plain(named.sort) && other.definition != named.definition
        });
        let near = |other: &Named| {
            other.definition.section == named.definition.section || is_shared(named)
        };
        let mut others =
            others.filter(|other| other.definition.file == named.definition.file && near(other));
        others.any(|other| other.name == new)
    });
    if taken {
        return Err(format!("`{new}` is given already in that file"));
    }
    Ok(())
}

/// Materials and crystals share one list in a file; values are the section's own.
fn is_shared(named: &Named) -> bool {
    matches!(named.sort, NameSort::Material | NameSort::Crystal)
}
