//! What would come of a crystal if a text were edited so: tried out, and nothing kept but the bands' cache.

use std::path::PathBuf;
use std::sync::Arc;

use super::actions::Asked;
use super::analysis::FileAnalysis;
use super::overlay::Overlay;
use crate::bands::Assessment;
use crate::model::{CrystalRef, FileSource, Setting, World, build_crystal};
use crate::rules::{self, Level, Subject, Tier};
use crate::syntax::{Entry, SectionId};
use crate::text::Span;

/// Replacements in absolute bytes, by file.
pub(super) type Edits = [(PathBuf, Span, String)];

/// What becomes of a crystal's targets with the edits made; `None` where that adds a mistake or cannot be tested.
pub(super) fn targets(
    asked: &Asked<'_>,
    file: &FileAnalysis,
    section: SectionId,
    edits: &Edits,
) -> Option<Vec<Assessment>> {
    let index = file
        .tree
        .entries
        .iter()
        .position(|entry| entry.id == section)?;
    let before = mistakes(asked, &asked.analysis.world, file, index, asked.source)?;
    let edited = edited(asked, edits)?;
    let world = World::gather(&edited, std::slice::from_ref(&file.path));
    if mistakes(asked, &world, file, index, &edited)? > before {
        return None;
    }
    let of = CrystalRef {
        file: file.file,
        section: entry(&world, file, index)?.id,
    };
    let rebuild = |of: CrystalRef, setting: &Setting| {
        Some(Arc::new(
            build_crystal(&world, of, setting, &edited).crystal,
        ))
    };
    let crystal = rebuild(of, &Setting::nominal())?;
    let solver = asked.analyst.solver();
    let assessed = solver.assess(of, &crystal, &rebuild, asked.cancel);
    assessed.ok().map(|(targets, _)| targets)
}

fn entry<'w>(world: &'w World, file: &FileAnalysis, index: usize) -> Option<&'w Entry> {
    world.file(file.file)?.tree.entries.get(index)
}

/// How many errors the rules find in a section, bands aside.
fn mistakes(
    asked: &Asked<'_>,
    world: &World,
    file: &FileAnalysis,
    index: usize,
    source: &dyn FileSource,
) -> Option<usize> {
    if (asked.cancel)() {
        return None;
    }
    let entry = entry(world, file, index)?;
    let of = CrystalRef {
        file: file.file,
        section: entry.id,
    };
    let built = build_crystal(world, of, &Setting::nominal(), source);
    let findings = rules::section_findings(
        &Subject {
            world,
            file: file.file,
            entry,
            troubles: &built.troubles,
            references: &built.references,
            crystal: Some(&built.crystal),
            bands: None,
            targets: &[],
            measures: &[],
        },
        Tier::Model,
    );
    let errors = findings
        .iter()
        .filter(|finding| finding.level == Level::Error);
    Some(errors.count())
}

/// Files as they are, but for the edited ones; `None` where an edit has no place in them.
fn edited<'a>(asked: &Asked<'a>, edits: &Edits) -> Option<Overlay<'a>> {
    let mut texts: Vec<(PathBuf, String)> = Vec::new();
    let mut edits: Vec<_> = edits.iter().collect();
    // From the end of each file on, so that those before keep their places.
    edits.sort_by_key(|(_, span, _)| std::cmp::Reverse((span.start, span.end)));
    for (path, span, new) in edits {
        if !texts.iter().any(|(known, _)| known == path) {
            let files = asked.analysis.world.files().iter();
            let file = files.into_iter().find(|file| file.path == *path)?;
            texts.push((path.clone(), file.tree.text.to_string()));
        }
        let (_, text) = texts.iter_mut().find(|(known, _)| known == path)?;
        let range = span.start as usize..span.end as usize;
        text.get(range.clone())?;
        text.replace_range(range, new);
    }
    let mut files = Overlay::of(asked.source);
    for (path, text) in &texts {
        files.keep(path, text);
    }
    Some(files)
}
