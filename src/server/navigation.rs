//! Definition, uses and renaming.

use std::collections::HashMap;
use std::path::PathBuf;

use tower_lsp::jsonrpc::{Error, Result};
use tower_lsp::lsp_types::{
    DocumentHighlight, DocumentHighlightKind, GotoDefinitionResponse, Location,
    PrepareRenameResponse, Range, TextEdit, Url, WorkspaceEdit,
};

use super::edits;
use super::scene::Scene;
use crate::report::Analysis;
use crate::report::editor_names::{Named, check_new_name, file_at, named_at, uses};
use crate::text::Span;

/// Where the name at a byte is given, or the start of the file that is named there.
pub(super) fn definition(scene: &Scene, offset: u32) -> Option<GotoDefinitionResponse> {
    let analysis = scene.analysis()?;
    let path = scene.path();
    if let Some((_, target)) = file_at(analysis, &path, offset) {
        let uri = scene.view.files.uri(&target)?;
        return Some(GotoDefinitionResponse::Scalar(Location::new(
            uri,
            Range::default(),
        )));
    }
    let named = named_at(analysis, &path, offset)?;
    let location = scene.locations()?.of(&named.definition)?;
    Some(GotoDefinitionResponse::Scalar(location))
}

/// The other places in the document that mean the name at a byte.
pub(super) fn highlights(scene: &Scene, offset: u32) -> Option<Vec<DocumentHighlight>> {
    let analysis = scene.analysis()?;
    let path = scene.path();
    let named = named_at(analysis, &path, offset)?;
    let here = uses(analysis, &named, true)
        .into_iter()
        .filter(|(file, _)| *file == path);
    let highlight = |(_, span)| DocumentHighlight {
        range: scene.range(span),
        kind: Some(DocumentHighlightKind::TEXT),
    };
    Some(here.map(highlight).collect())
}

/// Every place in the workspace that means the name at a byte; `workspace` is the analysis of all its files.
pub(super) fn references(
    scene: &Scene,
    workspace: &Analysis,
    offset: u32,
    with_definition: bool,
) -> Option<Vec<Location>> {
    let named = named_at(workspace, &scene.path(), offset)?;
    let found = uses(workspace, &named, with_definition);
    Some(locations(scene, workspace, &found))
}

fn locations(scene: &Scene, workspace: &Analysis, found: &[(PathBuf, Span)]) -> Vec<Location> {
    let mut locations =
        super::findings::Locations::new(workspace, &scene.view.files, &scene.abilities);
    found
        .iter()
        .filter_map(|(path, span)| locations.span(path, *span))
        .collect()
}

/// The word that a renaming at a byte would change.
pub(super) fn prepare(scene: &Scene, offset: u32) -> Option<PrepareRenameResponse> {
    let Named { name, word, .. } = named_at(scene.analysis()?, &scene.path(), offset)?;
    Some(PrepareRenameResponse::RangeWithPlaceholder {
        range: scene.range(word),
        placeholder: name,
    })
}

/// The edits that give the name at a byte another.
pub(super) fn rename(
    scene: &Scene,
    workspace: &Analysis,
    offset: u32,
    new: &str,
) -> Result<Option<WorkspaceEdit>> {
    let Some(named) = named_at(workspace, &scene.path(), offset) else {
        return Ok(None);
    };
    check_new_name(workspace, &named, new).map_err(Error::invalid_params)?;
    let found = uses(workspace, &named, true);
    let mut changes: HashMap<Url, Vec<TextEdit>> = HashMap::new();
    for Location { uri, range } in locations(scene, workspace, &found) {
        changes
            .entry(uri)
            .or_default()
            .push(TextEdit::new(range, new.to_owned()));
    }
    Ok(Some(edits::workspace_edit(
        changes,
        &scene.view.files,
        &scene.abilities,
    )))
}
