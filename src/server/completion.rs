//! Completion and signature help.

use std::path::Path;

use tower_lsp::lsp_types::{
    CompletionItem, CompletionItemKind, CompletionTextEdit, Documentation, ParameterInformation,
    ParameterLabel, SignatureHelp, SignatureInformation, TextEdit,
};

use super::scene::Scene;
use crate::report::editor_complete::{Proposal, ProposalSort, proposals};
use crate::report::editor_signature::{Form, signature};
use crate::text::Span;

/// Entries of a folder that are looked at, at most.
const LARGEST_FOLDER: usize = 1000;

/// What may be written at a byte.
pub(super) fn complete(scene: &Scene, offset: u32) -> Option<Vec<CompletionItem>> {
    let path = scene.path();
    let found = proposals(scene.tree(), scene.analysis(), &path, offset)?;
    if let Some(written) = found.path {
        return Some(files(scene, &path, &written, found.replaces));
    }
    let number = |(index, proposal)| item(scene, index, proposal, found.replaces);
    Some(
        found
            .proposals
            .into_iter()
            .enumerate()
            .map(number)
            .collect(),
    )
}

fn item(scene: &Scene, index: usize, proposal: Proposal, replaces: Span) -> CompletionItem {
    let kind = match proposal.sort {
        ProposalSort::Keyword => CompletionItemKind::KEYWORD,
        ProposalSort::Material => CompletionItemKind::CLASS,
        ProposalSort::Crystal => CompletionItemKind::STRUCT,
        ProposalSort::Value => CompletionItemKind::VARIABLE,
        ProposalSort::Constant => CompletionItemKind::CONSTANT,
        ProposalSort::Function => CompletionItemKind::FUNCTION,
        ProposalSort::Unit => CompletionItemKind::UNIT,
        ProposalSort::Quantity => CompletionItemKind::PROPERTY,
        ProposalSort::Choice => CompletionItemKind::ENUM_MEMBER,
        ProposalSort::Rule => CompletionItemKind::REFERENCE,
    };
    CompletionItem {
        kind: Some(kind),
        detail: Some(proposal.detail),
        // Clients sort by this text; the order here is that of likelihood.
        sort_text: Some(format!("{index:04}")),
        text_edit: Some(CompletionTextEdit::Edit(TextEdit::new(
            scene.range(replaces),
            proposal.label.clone(),
        ))),
        label: proposal.label,
        ..CompletionItem::default()
    }
}

/// The files and folders that a half-written path may go on to.
fn files(scene: &Scene, path: &Path, written: &str, replaces: Span) -> Vec<CompletionItem> {
    let folder = written.rsplit_once('/').map_or("", |(folder, _)| folder);
    let Some(folder) = path.parent().map(|parent| parent.join(folder)) else {
        return Vec::new();
    };
    let entries = std::fs::read_dir(folder)
        .into_iter()
        .flatten()
        .flatten()
        .take(LARGEST_FOLDER);
    let mut found: Vec<CompletionItem> = entries
        .filter_map(|entry| file(scene, &entry, replaces))
        .collect();
    found.sort_by(|one, other| one.label.cmp(&other.label));
    found
}

fn file(scene: &Scene, entry: &std::fs::DirEntry, replaces: Span) -> Option<CompletionItem> {
    let name = entry
        .file_name()
        .into_string()
        .ok()
        .filter(|name| !name.starts_with('.'))?;
    let is_folder = entry.file_type().is_ok_and(|sort| sort.is_dir());
    if !is_folder && !name.ends_with(".cren") && !name.ends_with(".csv") {
        return None;
    }
    let label = if is_folder { format!("{name}/") } else { name };
    let kind = if is_folder {
        CompletionItemKind::FOLDER
    } else {
        CompletionItemKind::FILE
    };
    Some(CompletionItem {
        kind: Some(kind),
        text_edit: Some(CompletionTextEdit::Edit(TextEdit::new(
            scene.range(replaces),
            label.clone(),
        ))),
        label,
        ..CompletionItem::default()
    })
}

/// How the statement at a byte is written.
pub(super) fn help(scene: &Scene, offset: u32) -> Option<SignatureHelp> {
    let found = signature(scene.tree(), offset)?;
    let active = found
        .forms
        .get(found.active)
        .and_then(|form| form.active)
        .and_then(|part| u32::try_from(part).ok());
    let forms = found.forms.iter().map(|form| SignatureInformation {
        label: form.label.to_owned(),
        documentation: Some(Documentation::String(found.summary.to_owned())),
        parameters: Some(parameters(scene, form)),
        active_parameter: None,
    });
    Some(SignatureHelp {
        signatures: forms.collect(),
        active_signature: u32::try_from(found.active).ok(),
        active_parameter: active,
    })
}

fn parameters(scene: &Scene, form: &Form) -> Vec<ParameterInformation> {
    let label = |span: &Span| {
        if !scene.abilities.signature_offsets {
            return ParameterLabel::Simple(span.of(form.label).to_owned());
        }
        // The protocol counts these in UTF-16 whatever was agreed for positions.
        let units = |byte: u32| {
            let before = form.label.get(..byte as usize).unwrap_or("");
            u32::try_from(before.encode_utf16().count()).unwrap_or_default()
        };
        ParameterLabel::LabelOffsets([units(span.start), units(span.end)])
    };
    form.parts
        .iter()
        .map(|part| ParameterInformation {
            label: label(part),
            documentation: None,
        })
        .collect()
}
