//! Edits of several files as the client takes them.

use std::collections::HashMap;

use tower_lsp::lsp_types::{
    DocumentChanges, OneOf, OptionalVersionedTextDocumentIdentifier, TextDocumentEdit, TextEdit,
    Url, WorkspaceEdit,
};

use super::abilities::Abilities;
use super::files::{Files, path_of};

/// With the versions that they hold for, where the client can tell that they no longer do.
pub(super) fn workspace_edit(
    changes: HashMap<Url, Vec<TextEdit>>,
    files: &Files,
    abilities: &Abilities,
) -> WorkspaceEdit {
    if !abilities.document_changes {
        return WorkspaceEdit {
            changes: Some(changes),
            ..WorkspaceEdit::default()
        };
    }
    let mut changes: Vec<(Url, Vec<TextEdit>)> = changes.into_iter().collect();
    changes.sort_by(|one, other| one.0.cmp(&other.0));
    let edit = |(uri, edits): (Url, Vec<TextEdit>)| {
        let version = files.open.get(&path_of(&uri)).map(|file| file.version);
        TextDocumentEdit {
            text_document: OptionalVersionedTextDocumentIdentifier { uri, version },
            edits: edits.into_iter().map(OneOf::Left).collect(),
        }
    };
    let changes = changes.into_iter().map(edit).collect();
    WorkspaceEdit {
        document_changes: Some(DocumentChanges::Edits(changes)),
        ..WorkspaceEdit::default()
    }
}
