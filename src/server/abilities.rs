//! What the client can do, as far as it changes what we send.

use tower_lsp::lsp_types::{
    ClientCapabilities, CodeActionClientCapabilities, DiagnosticTag, MarkupKind,
    PositionEncodingKind, PublishDiagnosticsClientCapabilities, TextDocumentClientCapabilities,
    WorkspaceClientCapabilities,
};

use crate::text::Encoding;

/// The client's abilities; all absent until `initialize`.
#[derive(Clone, Debug, Default)]
pub(super) struct Abilities {
    /// Columns count bytes, not UTF-16 units.
    pub(super) bytes: bool,
    pub(super) hover_markdown: bool,
    pub(super) signature_offsets: bool,
    pub(super) action_literals: bool,
    pub(super) action_preferred: bool,
    pub(super) document_changes: bool,
    pub(super) nested_symbols: bool,
    pub(super) finding_related: bool,
    pub(super) finding_link: bool,
    pub(super) finding_unnecessary: bool,
    /// The client fetches diagnostics itself and can be told when to do so again.
    pub(super) pulls: bool,
    pub(super) refresh_hints: bool,
    pub(super) watch: bool,
    pub(super) progress: bool,
    pub(super) show_document: bool,
}

impl Abilities {
    /// Reads them off what the client sent.
    pub(super) fn new(client: &ClientCapabilities) -> Self {
        let mut abilities = Self {
            bytes: offers_bytes(client),
            ..Self::default()
        };
        if let Some(text) = &client.text_document {
            abilities.read_text(text);
        }
        if let Some(workspace) = &client.workspace {
            abilities.read_workspace(workspace);
        }
        if let Some(window) = &client.window {
            abilities.progress = window.work_done_progress == Some(true);
            let show = window.show_document.as_ref();
            abilities.show_document = show.is_some_and(|show| show.support);
        }
        let pulls = client
            .text_document
            .as_ref()
            .is_some_and(|text| text.diagnostic.is_some());
        abilities.pulls &= pulls;
        abilities
    }

    /// How positions within a line are counted.
    pub(super) fn encoding(&self) -> Encoding {
        if self.bytes {
            Encoding::Utf8
        } else {
            Encoding::Utf16
        }
    }

    fn read_text(&mut self, text: &TextDocumentClientCapabilities) {
        let formats = text
            .hover
            .as_ref()
            .and_then(|hover| hover.content_format.as_deref());
        self.hover_markdown = prefers_markdown(formats);
        let signature = text
            .signature_help
            .as_ref()
            .and_then(|help| help.signature_information.as_ref());
        let parameter = signature.and_then(|signature| signature.parameter_information.as_ref());
        self.signature_offsets =
            parameter.is_some_and(|parameter| parameter.label_offset_support == Some(true));
        let symbol = text.document_symbol.as_ref();
        self.nested_symbols =
            symbol.is_some_and(|symbol| symbol.hierarchical_document_symbol_support == Some(true));
        if let Some(action) = &text.code_action {
            self.read_actions(action);
        }
        if let Some(publish) = &text.publish_diagnostics {
            self.read_findings(publish);
        }
    }

    fn read_actions(&mut self, action: &CodeActionClientCapabilities) {
        self.action_literals = action.code_action_literal_support.is_some();
        self.action_preferred = action.is_preferred_support == Some(true);
    }

    fn read_findings(&mut self, publish: &PublishDiagnosticsClientCapabilities) {
        self.finding_related = publish.related_information == Some(true);
        self.finding_link = publish.code_description_support == Some(true);
        let tags = publish.tag_support.as_ref();
        self.finding_unnecessary =
            tags.is_some_and(|tags| tags.value_set.contains(&DiagnosticTag::UNNECESSARY));
    }

    fn read_workspace(&mut self, workspace: &WorkspaceClientCapabilities) {
        let edit = workspace.workspace_edit.as_ref();
        self.document_changes = edit.is_some_and(|edit| edit.document_changes == Some(true));
        let watched = workspace.did_change_watched_files.as_ref();
        self.watch = watched.is_some_and(|watched| watched.dynamic_registration == Some(true));
        let hints = workspace.inlay_hint.as_ref();
        self.refresh_hints = hints.is_some_and(|hints| hints.refresh_support == Some(true));
        let pulled = workspace.diagnostic.as_ref();
        self.pulls = pulled.is_some_and(|pulled| pulled.refresh_support == Some(true));
    }
}

/// Bytes where the client offers them, as our texts are in bytes; else the encoding that every client has.
fn offers_bytes(client: &ClientCapabilities) -> bool {
    let offered = client
        .general
        .as_ref()
        .and_then(|general| general.position_encodings.as_ref());
    offered.is_some_and(|offered| offered.contains(&PositionEncodingKind::UTF8))
}

/// The first format in the client's list is the one that it likes best.
fn prefers_markdown(formats: Option<&[MarkupKind]>) -> bool {
    formats.is_some_and(|formats| {
        formats.contains(&MarkupKind::Markdown) && formats.first() != Some(&MarkupKind::PlainText)
    })
}
