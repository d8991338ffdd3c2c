//! Short notes that an editor shows between the text: the lowest gaps behind a heading, a layer's
//! thickness in monolayers, a target's value and margin. Neutral: bytes and text.
//!
//! *Invariant*: a section whose bands are not known for the text at hand shows none of their numbers.

use std::path::Path;

use super::analysis::{Analysis, FileAnalysis, SectionAnalysis};
use super::hover::monolayers;
use super::locate::Locator;
use super::show_text;
use super::units::{Scale, Trade, tell_in};
use super::words;
use crate::bands::{Gap, GapKind, TargetState};
use crate::model::Crystal;
use crate::syntax::Entry;
use crate::text::Span;

/// Gaps behind a heading.
const LOWEST: usize = 3;

/// A note at a byte of the file.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Hint {
    /// The absolute byte that it stands behind.
    pub offset: u32,
    /// The note.
    pub label: String,
    /// What it means.
    pub tooltip: String,
}

/// The hints of a file within a range of bytes, in order of place.
#[must_use]
pub fn hints(analysis: &Analysis, path: &Path, range: Span) -> Vec<Hint> {
    let Some(file) = analysis.file(path) else {
        return Vec::new();
    };
    let locator = Locator::new(analysis);
    let mut hints = Vec::new();
    for (entry, section) in file.tree.entries.iter().zip(&file.sections) {
        let end = entry.start + u32::try_from(entry.section.text.len()).unwrap_or(u32::MAX);
        if entry.start > range.end || end < range.start {
            continue;
        }
        if let Some(crystal) = section.crystal.as_deref() {
            of_crystal(&locator, file, entry, section, crystal, &mut hints);
        }
    }
    hints.retain(|hint| range.touches(hint.offset));
    hints.sort_by_key(|hint| hint.offset);
    hints
}

fn of_crystal(
    locator: &Locator<'_>,
    file: &FileAnalysis,
    entry: &Entry,
    section: &SectionAnalysis,
    crystal: &Crystal,
    hints: &mut Vec<Hint>,
) {
    let trade = Trade::of(crystal);
    hints.extend(gaps(entry, section, &trade));
    hints.extend(layers(file, entry, crystal));
    if section.solution().is_some() {
        hints.extend(targets(locator, file, entry, section, crystal));
    }
}

fn gaps(entry: &Entry, section: &SectionAnalysis, trade: &Trade) -> Option<Hint> {
    let solution = section.solution()?;
    let lowest = solution.gaps.get(..LOWEST.min(solution.gaps.len()))?;
    let largest = lowest
        .iter()
        .map(|gap| gap.size.value.abs())
        .fold(0.0, f64::max);
    let scale = trade.energy(largest);
    let told: Vec<String> = lowest.iter().map(|gap| gap_told(gap, &scale)).collect();
    let tilde = if solution.fine { "" } else { "≈ " };
    let one_unit = lowest.iter().all(|gap| gap.kind != GapKind::Closed);
    let label = match one_unit {
        true => format!("gaps {tilde}{} {}", told.join(", "), scale.name),
        false => format!("gaps {tilde}{} ({})", told.join(", "), scale.name),
    };
    let heading = entry.section.heading;
    let end = entry
        .section
        .lines
        .iter()
        .find(|line| line.span.touches(heading.start));
    Some(Hint {
        offset: entry.start + end.map_or(heading.end, |line| line.content.end),
        label,
        tooltip: "the gaps above the lowest bands".to_owned(),
    })
}

fn gap_told(gap: &Gap, scale: &Scale) -> String {
    let bare = Scale {
        factor: scale.factor,
        name: String::new(),
    };
    match gap.kind {
        GapKind::Closed => "closed".to_owned(),
        _ => tell_in(gap.size, &bare),
    }
}

fn layers<'a>(
    file: &'a FileAnalysis,
    entry: &'a Entry,
    crystal: &'a Crystal,
) -> impl Iterator<Item = Hint> + 'a {
    let mut told = Vec::new();
    let layers = crystal.potential.layers.iter();
    layers.filter_map(move |layer| {
        let here = layer.length_place.file == file.file && layer.length_place.section == entry.id;
        if !here || layer.in_monolayers || told.contains(&layer.length_place) {
            return None;
        }
        told.push(layer.length_place);
        Some(Hint {
            offset: entry.start + layer.length_place.span.end,
            label: format!("{} ML", monolayers(layer)?),
            tooltip: "the thickness in monolayers".to_owned(),
        })
    })
}

fn targets<'a>(
    locator: &'a Locator<'_>,
    file: &'a FileAnalysis,
    entry: &'a Entry,
    section: &'a SectionAnalysis,
    crystal: &'a Crystal,
) -> impl Iterator<Item = Hint> + 'a {
    let trade = Trade::of(crystal);
    let own = section
        .targets
        .iter()
        .filter(|target| target.place.file == file.file && target.place.section == entry.id);
    own.map(move |target| {
        let value = match (&target.found, target.value) {
            (Some(found), _) => found.clone(),
            (None, Some(value)) => trade.tell(value, words::target_dimension(target)),
            (None, None) => String::new(),
        };
        let mut parts = vec![value];
        parts.extend(show_text::margin(target, &trade));
        if target.state != TargetState::Met {
            parts.push(words::target_state_spoken(target.state).to_owned());
        }
        parts.retain(|part| !part.is_empty());
        Hint {
            offset: entry.start + target.place.span.end,
            label: parts.join(", "),
            tooltip: show_text::outcome(locator, crystal, target, &trade),
        }
    })
}
