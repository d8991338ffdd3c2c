//! Hover, inlay hints, code actions and the standard layout.

use std::collections::HashMap;

use tower_lsp::lsp_types::{
    CodeAction, CodeActionKind, CodeActionOrCommand, CodeActionParams, Diagnostic, Hover,
    HoverContents, InlayHint, InlayHintLabel, InlayHintTooltip, MarkupContent, MarkupKind,
    NumberOrString, Range, TextEdit, Url,
};

use super::edits;
use super::scene::Scene;
use crate::report::actions::{Action, ActionKind, Asked, actions};
use crate::report::editor_format;
use crate::report::hints::hints;
use crate::report::hover::{self, hover};
use crate::text::Span;

/// What is to be said about a byte.
pub(super) fn hovered(scene: &Scene, offset: u32) -> Option<Hover> {
    let found = hover(&scene.analyst, scene.analysis()?, &scene.path(), offset)?;
    let (kind, value) = match scene.abilities.hover_markdown {
        true => (MarkupKind::Markdown, found.markdown),
        false => (MarkupKind::PlainText, found.plain),
    };
    Some(Hover {
        contents: HoverContents::Markup(MarkupContent { kind, value }),
        range: Some(scene.range(found.span)),
    })
}

/// Whether more is to be said about a byte once the bands are fully known.
pub(super) fn waits(scene: &Scene, offset: u32) -> bool {
    let analysis = scene.analysis();
    analysis.is_some_and(|analysis| hover::waits(analysis, &scene.path(), offset))
}

/// The notes within some bytes.
pub(super) fn hinted(scene: &Scene, within: Span) -> Option<Vec<InlayHint>> {
    let found = hints(scene.analysis()?, &scene.path(), within);
    let hint = found.into_iter().map(|hint| InlayHint {
        position: scene.position(hint.offset),
        label: InlayHintLabel::String(hint.label),
        kind: None,
        text_edits: None,
        tooltip: Some(hint.tooltip)
            .filter(|tooltip| !tooltip.is_empty())
            .map(InlayHintTooltip::String),
        padding_left: Some(true),
        padding_right: Some(false),
        data: None,
    });
    Some(hint.collect())
}

/// What can be done within the range that the client names.
pub(super) fn offered(
    scene: &Scene,
    params: &CodeActionParams,
) -> Option<Vec<CodeActionOrCommand>> {
    // A client that knows only commands would need one that we carry out: it gets none.
    if !scene.abilities.action_literals {
        return Some(Vec::new());
    }
    let wanted = |kind: &CodeActionKind| {
        let only = params.context.only.as_deref();
        only.is_none_or(|only| only.iter().any(|wanted| includes(wanted, kind)))
    };
    let overtaken = &scene.view.file.overtaken;
    let asked = Asked {
        analyst: &scene.analyst,
        source: &*scene.view.files,
        analysis: scene.analysis()?,
        cancel: &|| overtaken.is_cancelled(),
    };
    let found = actions(&asked, &scene.path(), scene.span(params.range));
    let found = found
        .into_iter()
        .filter(|action| wanted(&kind(action.kind)));
    Some(
        found
            .filter_map(|action| {
                Some(CodeActionOrCommand::CodeAction(worded(
                    scene, params, action,
                )?))
            })
            .collect(),
    )
}

/// Kinds are paths: `refactor` includes `refactor.extract`.
fn includes(wanted: &CodeActionKind, kind: &CodeActionKind) -> bool {
    let rest = kind.as_str().strip_prefix(wanted.as_str());
    wanted.as_str().is_empty() || rest.is_some_and(|rest| rest.is_empty() || rest.starts_with('.'))
}

fn kind(kind: ActionKind) -> CodeActionKind {
    match kind {
        ActionKind::Mend => CodeActionKind::QUICKFIX,
        ActionKind::Extract => CodeActionKind::REFACTOR_EXTRACT,
        ActionKind::Rewrite => CodeActionKind::REFACTOR_REWRITE,
    }
}

fn worded(scene: &Scene, params: &CodeActionParams, action: Action) -> Option<CodeAction> {
    let mut locations = scene.locations()?;
    let mut changes: HashMap<Url, Vec<TextEdit>> = HashMap::new();
    for (path, span, text) in action.edits {
        let location = locations.span(&path, span)?;
        changes
            .entry(location.uri)
            .or_default()
            .push(TextEdit::new(location.range, text));
    }
    let mends: Vec<Diagnostic> = action
        .rule
        .map(|rule| mended(params, rule))
        .unwrap_or_default();
    Some(CodeAction {
        title: action.title,
        kind: Some(kind(action.kind)),
        diagnostics: (!mends.is_empty()).then_some(mends),
        edit: Some(edits::workspace_edit(
            changes,
            &scene.view.files,
            &scene.abilities,
        )),
        is_preferred: (scene.abilities.action_preferred && action.preferred).then_some(true),
        ..CodeAction::default()
    })
}

/// Those of the client's diagnostics that an action for `rule` would mend.
fn mended(params: &CodeActionParams, rule: &str) -> Vec<Diagnostic> {
    let meant = |diagnostic: &&Diagnostic| {
        let named = matches!(&diagnostic.code, Some(NumberOrString::String(code)) if code == rule);
        named && touch(diagnostic.range, params.range)
    };
    params
        .context
        .diagnostics
        .iter()
        .filter(meant)
        .cloned()
        .collect()
}

fn touch(one: Range, other: Range) -> bool {
    one.start <= other.end && other.start <= one.end
}

/// The edits that bring the document into the standard layout.
pub(super) fn formatted(scene: &Scene) -> Vec<TextEdit> {
    let edits = editor_format::edits(scene.tree()).into_iter();
    edits
        .map(|(span, text)| TextEdit::new(scene.range(span), text))
        .collect()
}
