//! The protocol's methods, one short handler each.

use serde_json::Value;
use tower_lsp::LanguageServer;
use tower_lsp::jsonrpc::Result;
use tower_lsp::lsp_types::{
    CodeActionParams, CodeActionResponse, CodeLens, CodeLensParams, CompletionParams,
    CompletionResponse, DidChangeTextDocumentParams, DidChangeWatchedFilesParams,
    DidChangeWorkspaceFoldersParams, DidCloseTextDocumentParams, DidOpenTextDocumentParams,
    DocumentDiagnosticParams, DocumentDiagnosticReport, DocumentDiagnosticReportResult,
    DocumentFormattingParams, DocumentHighlight, DocumentHighlightParams, DocumentLink,
    DocumentLinkParams, DocumentSymbolParams, DocumentSymbolResponse, ExecuteCommandParams,
    FoldingRange, FoldingRangeParams, FullDocumentDiagnosticReport, GotoDefinitionParams,
    GotoDefinitionResponse, Hover, HoverParams, InitializeParams, InitializeResult,
    InitializedParams, InlayHint, InlayHintParams, Location, PrepareRenameResponse,
    ReferenceParams, RelatedFullDocumentDiagnosticReport, RenameParams, SelectionRange,
    SelectionRangeParams, SemanticTokensParams, SemanticTokensRangeParams,
    SemanticTokensRangeResult, SemanticTokensResult, ServerInfo, SignatureHelp,
    SignatureHelpParams, SymbolInformation, TextDocumentPositionParams, TextEdit,
    WorkDoneProgressCancelParams, WorkspaceEdit, WorkspaceFolder, WorkspaceSymbolParams,
};

use super::backend::Backend;
use super::checker::Depth;
use super::files::path_of;
use super::owner::Message;
use super::{
    capabilities, completion, findings, navigation, offers, structure, symbols, tokens, views,
};

#[tower_lsp::async_trait]
impl LanguageServer for Backend {
    async fn initialize(&self, params: InitializeParams) -> Result<InitializeResult> {
        let abilities = self.meet(&params);
        Ok(InitializeResult {
            capabilities: capabilities::offered(&abilities),
            server_info: Some(ServerInfo {
                name: env!("CARGO_PKG_NAME").to_owned(),
                version: Some(env!("CARGO_PKG_VERSION").to_owned()),
            }),
        })
    }

    async fn initialized(&self, _: InitializedParams) {
        self.watch_files();
    }

    async fn shutdown(&self) -> Result<()> {
        Ok(())
    }

    async fn did_open(&self, params: DidOpenTextDocumentParams) {
        let document = params.text_document;
        self.owner.tell(Message::Open {
            uri: document.uri,
            version: document.version,
            text: document.text,
        });
    }

    async fn did_change(&self, params: DidChangeTextDocumentParams) {
        let document = params.text_document;
        self.owner.tell(Message::Change {
            uri: document.uri,
            version: document.version,
            changes: params.content_changes,
        });
    }

    async fn did_close(&self, params: DidCloseTextDocumentParams) {
        self.owner.tell(Message::Close {
            uri: params.text_document.uri,
        });
    }

    async fn did_change_watched_files(&self, params: DidChangeWatchedFilesParams) {
        let paths = params
            .changes
            .iter()
            .map(|change| path_of(&change.uri))
            .collect();
        self.owner.tell(Message::Disk(paths));
    }

    async fn did_change_workspace_folders(&self, params: DidChangeWorkspaceFoldersParams) {
        let paths = |folders: Vec<WorkspaceFolder>| {
            folders.iter().map(|folder| path_of(&folder.uri)).collect()
        };
        let (added, removed) = (paths(params.event.added), paths(params.event.removed));
        self.owner.tell(Message::Folders { added, removed });
    }

    async fn diagnostic(
        &self,
        params: DocumentDiagnosticParams,
    ) -> Result<DocumentDiagnosticReportResult> {
        let uri = params.text_document.uri;
        let found = self.look(&uri, Some(Depth::Dear), |scene| {
            Some(findings::of_file(
                scene.analysis()?,
                &scene.view.files,
                &scene.path(),
                &scene.abilities,
            ))
        });
        let items = found.await?.unwrap_or_default();
        let full_document_diagnostic_report = FullDocumentDiagnosticReport {
            result_id: None,
            items,
        };
        let report = RelatedFullDocumentDiagnosticReport {
            related_documents: None,
            full_document_diagnostic_report,
        };
        Ok(DocumentDiagnosticReport::Full(report).into())
    }

    async fn hover(&self, params: HoverParams) -> Result<Option<Hover>> {
        let TextDocumentPositionParams {
            text_document,
            position,
        } = params.text_document_position_params;
        let uri = &text_document.uri;
        let first = self.look(uri, Some(Depth::Rough), move |scene| {
            let offset = scene.offset(position);
            Some((views::hovered(scene, offset), views::waits(scene, offset)))
        });
        match first.await? {
            Some((_, true)) => {
                self.look(uri, Some(Depth::Dear), move |scene| {
                    views::hovered(scene, scene.offset(position))
                })
                .await
            }
            first => Ok(first.and_then(|(hover, _)| hover)),
        }
    }

    async fn inlay_hint(&self, params: InlayHintParams) -> Result<Option<Vec<InlayHint>>> {
        let uri = params.text_document.uri;
        let found = self.look(&uri, Some(Depth::Rough), move |scene| {
            Some((
                views::hinted(scene, scene.span(params.range)),
                scene.settled(),
            ))
        });
        let Some((hints, settled)) = found.await? else {
            return Ok(None);
        };
        if !settled {
            // They are asked for again when the finer values are there.
            self.owner.tell(Message::Owe(path_of(&uri)));
        }
        Ok(hints)
    }

    async fn code_action(&self, params: CodeActionParams) -> Result<Option<CodeActionResponse>> {
        let uri = params.text_document.uri.clone();
        self.look(&uri, Some(Depth::Dear), move |scene| {
            views::offered(scene, &params)
        })
        .await
    }

    async fn completion(&self, params: CompletionParams) -> Result<Option<CompletionResponse>> {
        let TextDocumentPositionParams {
            text_document,
            position,
        } = params.text_document_position;
        let found = self.look(&text_document.uri, Some(Depth::Cheap), move |scene| {
            completion::complete(scene, scene.offset(position))
        });
        Ok(found.await?.map(CompletionResponse::Array))
    }

    async fn signature_help(&self, params: SignatureHelpParams) -> Result<Option<SignatureHelp>> {
        let TextDocumentPositionParams {
            text_document,
            position,
        } = params.text_document_position_params;
        self.look(&text_document.uri, None, move |scene| {
            completion::help(scene, scene.offset(position))
        })
        .await
    }

    async fn goto_definition(
        &self,
        params: GotoDefinitionParams,
    ) -> Result<Option<GotoDefinitionResponse>> {
        let TextDocumentPositionParams {
            text_document,
            position,
        } = params.text_document_position_params;
        self.look(&text_document.uri, Some(Depth::Cheap), move |scene| {
            navigation::definition(scene, scene.offset(position))
        })
        .await
    }

    async fn document_highlight(
        &self,
        params: DocumentHighlightParams,
    ) -> Result<Option<Vec<DocumentHighlight>>> {
        let TextDocumentPositionParams {
            text_document,
            position,
        } = params.text_document_position_params;
        self.look(&text_document.uri, Some(Depth::Cheap), move |scene| {
            navigation::highlights(scene, scene.offset(position))
        })
        .await
    }

    async fn references(&self, params: ReferenceParams) -> Result<Option<Vec<Location>>> {
        let TextDocumentPositionParams {
            text_document,
            position,
        } = params.text_document_position;
        let with_definition = params.context.include_declaration;
        self.look(&text_document.uri, None, move |scene| {
            navigation::references(
                scene,
                &scene.workspace(),
                scene.offset(position),
                with_definition,
            )
        })
        .await
    }

    async fn prepare_rename(
        &self,
        params: TextDocumentPositionParams,
    ) -> Result<Option<PrepareRenameResponse>> {
        let TextDocumentPositionParams {
            text_document,
            position,
        } = params;
        self.look(&text_document.uri, Some(Depth::Cheap), move |scene| {
            navigation::prepare(scene, scene.offset(position))
        })
        .await
    }

    async fn rename(&self, params: RenameParams) -> Result<Option<WorkspaceEdit>> {
        let TextDocumentPositionParams {
            text_document,
            position,
        } = params.text_document_position;
        let renamed = self.look(&text_document.uri, None, move |scene| {
            Some(navigation::rename(
                scene,
                &scene.workspace(),
                scene.offset(position),
                &params.new_name,
            ))
        });
        renamed.await?.unwrap_or(Ok(None))
    }

    async fn document_symbol(
        &self,
        params: DocumentSymbolParams,
    ) -> Result<Option<DocumentSymbolResponse>> {
        self.look(&params.text_document.uri, None, |scene| {
            Some(symbols::document(scene))
        })
        .await
    }

    async fn symbol(
        &self,
        params: WorkspaceSymbolParams,
    ) -> Result<Option<Vec<SymbolInformation>>> {
        let files = self.files().await;
        let abilities = self.abilities();
        self.work(move || Some(symbols::workspace(&files, &abilities, &params.query)))
            .await
    }

    async fn folding_range(&self, params: FoldingRangeParams) -> Result<Option<Vec<FoldingRange>>> {
        self.look(&params.text_document.uri, None, |scene| {
            Some(structure::folding(scene))
        })
        .await
    }

    async fn selection_range(
        &self,
        params: SelectionRangeParams,
    ) -> Result<Option<Vec<SelectionRange>>> {
        self.look(&params.text_document.uri, None, move |scene| {
            Some(structure::selection(scene, &params.positions))
        })
        .await
    }

    async fn document_link(&self, params: DocumentLinkParams) -> Result<Option<Vec<DocumentLink>>> {
        self.look(&params.text_document.uri, None, |scene| {
            Some(structure::document_links(scene))
        })
        .await
    }

    async fn code_lens(&self, params: CodeLensParams) -> Result<Option<Vec<CodeLens>>> {
        let uri = params.text_document.uri;
        self.look(&uri, Some(Depth::Cheap), offers::lenses).await
    }

    async fn execute_command(&self, params: ExecuteCommandParams) -> Result<Option<Value>> {
        self.carry_out(params).await
    }

    async fn formatting(&self, params: DocumentFormattingParams) -> Result<Option<Vec<TextEdit>>> {
        self.look(&params.text_document.uri, None, |scene| {
            Some(views::formatted(scene))
        })
        .await
    }

    async fn semantic_tokens_full(
        &self,
        params: SemanticTokensParams,
    ) -> Result<Option<SemanticTokensResult>> {
        let found = self.look(&params.text_document.uri, None, |scene| {
            Some(tokens::semantic(scene, None))
        });
        Ok(found.await?.map(SemanticTokensResult::Tokens))
    }

    async fn semantic_tokens_range(
        &self,
        params: SemanticTokensRangeParams,
    ) -> Result<Option<SemanticTokensRangeResult>> {
        let within = params.range;
        let found = self.look(&params.text_document.uri, None, move |scene| {
            Some(tokens::semantic(scene, Some(scene.span(within))))
        });
        Ok(found.await?.map(SemanticTokensRangeResult::Tokens))
    }
}

impl Backend {
    /// The user does not want to wait for the bands.
    pub(super) async fn stop_work(&self, _: WorkDoneProgressCancelParams) {
        self.owner.tell(Message::StopWork);
    }

    /// For tests: a fault in a request.
    pub(super) async fn panic(&self) -> Result<Value> {
        self.work(|| panic!("as asked")).await
    }
}
