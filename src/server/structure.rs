//! Folding, growing selections and links.

use tower_lsp::lsp_types::{
    DocumentLink, FoldingRange, FoldingRangeKind, Position, Range, SelectionRange,
};

use super::scene::Scene;
use crate::report::editor_links::links;
use crate::report::editor_outline::{FoldSort, folds, selections};

/// What folds.
pub(super) fn folding(scene: &Scene) -> Vec<FoldingRange> {
    let fold = |(span, sort)| {
        let range = scene.range(span);
        let kind = match sort {
            FoldSort::Section => FoldingRangeKind::Region,
            FoldSort::Comment => FoldingRangeKind::Comment,
            FoldSort::Uses => FoldingRangeKind::Imports,
        };
        (range.start.line < range.end.line).then(|| FoldingRange {
            start_line: range.start.line,
            end_line: range.end.line,
            kind: Some(kind),
            ..FoldingRange::default()
        })
    };
    folds(scene.tree()).into_iter().filter_map(fold).collect()
}

/// What a growing selection takes at each position.
pub(super) fn selection(scene: &Scene, positions: &[Position]) -> Vec<SelectionRange> {
    positions
        .iter()
        .map(|position| grown(scene, *position))
        .collect()
}

fn grown(scene: &Scene, position: Position) -> SelectionRange {
    let spans = selections(scene.tree(), scene.offset(position));
    let outward = spans.into_iter().rev().map(|span| scene.range(span));
    let grown = outward.fold(None, |parent, range| {
        Some(SelectionRange {
            range,
            parent: parent.map(Box::new),
        })
    });
    grown.unwrap_or(SelectionRange {
        range: Range::new(position, position),
        parent: None,
    })
}

/// The files that the document names.
pub(super) fn document_links(scene: &Scene) -> Vec<DocumentLink> {
    let link = |(span, path): (_, std::path::PathBuf)| {
        let target = scene.view.files.uri(&path)?;
        Some(DocumentLink {
            range: scene.range(span),
            target: Some(target),
            tooltip: None,
            data: None,
        })
    };
    links(scene.tree(), &scene.path())
        .into_iter()
        .filter_map(link)
        .collect()
}
