//! Outline of a document and names of the workspace.

use tower_lsp::lsp_types::{
    DocumentSymbol, DocumentSymbolResponse, Location, SymbolInformation, SymbolKind,
};

use super::abilities::Abilities;
use super::files::Files;
use super::positions;
use super::scene::Scene;
use crate::report::FileSource;
use crate::report::editor_outline::{Outline, OutlineSort, outline};
use crate::text::{LineIndex, Span};

/// Names that a search of the workspace gives, at most.
const MOST_SYMBOLS: usize = 2000;

/// The outline of a document.
pub(super) fn document(scene: &Scene) -> DocumentSymbolResponse {
    let outline = outline(scene.tree());
    if scene.abilities.nested_symbols {
        return DocumentSymbolResponse::Nested(
            outline
                .into_iter()
                .map(|item| nested(scene, item))
                .collect(),
        );
    }
    let uri = &scene.view.file.uri;
    let locate = |span| Location::new(uri.clone(), scene.range(span));
    let mut flat = Vec::new();
    for item in outline {
        flatten(&item, None, &locate, &mut flat);
    }
    DocumentSymbolResponse::Flat(flat)
}

fn kind(sort: OutlineSort) -> SymbolKind {
    match sort {
        OutlineSort::Material => SymbolKind::CLASS,
        OutlineSort::Crystal => SymbolKind::STRUCT,
        OutlineSort::Value => SymbolKind::VARIABLE,
        OutlineSort::Measure => SymbolKind::PROPERTY,
    }
}

// The type has a field that it asks not to be used and cannot be made without.
#[allow(deprecated)]
fn nested(scene: &Scene, item: Outline) -> DocumentSymbol {
    let children: Vec<DocumentSymbol> = item
        .children
        .into_iter()
        .map(|child| nested(scene, child))
        .collect();
    DocumentSymbol {
        name: item.name,
        detail: Some(item.detail).filter(|detail| !detail.is_empty()),
        kind: kind(item.sort),
        tags: None,
        deprecated: None,
        range: scene.range(item.whole.cover(item.name_span)),
        selection_range: scene.range(item.name_span),
        children: (!children.is_empty()).then_some(children),
    }
}

/// The same without nesting, which older clients want and the workspace's list has.
#[allow(deprecated)]
fn flatten(
    item: &Outline,
    container: Option<&str>,
    locate: &dyn Fn(Span) -> Location,
    found: &mut Vec<SymbolInformation>,
) {
    found.push(SymbolInformation {
        name: item.name.clone(),
        kind: kind(item.sort),
        tags: None,
        deprecated: None,
        location: locate(item.name_span),
        container_name: container.map(str::to_owned),
    });
    for child in &item.children {
        flatten(child, Some(&item.name), locate, found);
    }
}

/// The names of the workspace that hold the letters of `query` in their order.
pub(super) fn workspace(
    files: &Files,
    abilities: &Abilities,
    query: &str,
) -> Vec<SymbolInformation> {
    let mut found = Vec::new();
    for path in files.all() {
        let (Ok(tree), Some(uri)) = (files.tree(&path), files.uri(&path)) else {
            continue;
        };
        let lines = LineIndex::new(&tree.text);
        let locate = |span| {
            Location::new(
                uri.clone(),
                positions::range(&lines, span, abilities.encoding()),
            )
        };
        for item in outline(&tree) {
            flatten(&item, None, &locate, &mut found);
        }
    }
    found.retain(|symbol| holds(&symbol.name, query));
    found.truncate(MOST_SYMBOLS);
    found
}

fn holds(name: &str, query: &str) -> bool {
    let mut letters = name.chars().flat_map(char::to_lowercase);
    query
        .chars()
        .flat_map(char::to_lowercase)
        .all(|wanted| letters.any(|letter| letter == wanted))
}
