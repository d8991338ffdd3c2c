//! The protocol's methods, one short handler each.

use serde_json::Value;
use tower_lsp::LanguageServer;
use tower_lsp::jsonrpc::Result;
use tower_lsp::lsp_types::{
    DidChangeTextDocumentParams, DidChangeWatchedFilesParams, DidChangeWorkspaceFoldersParams, DidCloseTextDocumentParams,
    DidOpenTextDocumentParams, InitializeParams, InitializeResult, InitializedParams, ServerInfo,
    WorkDoneProgressCancelParams,
};

use super::backend::Backend;
use super::capabilities;
use super::files::path_of;
use super::owner::Message;

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
        self.owner.tell(Message::Open { uri: document.uri, version: document.version, text: document.text });
    }

    async fn did_change(&self, params: DidChangeTextDocumentParams) {
        let document = params.text_document;
        self.owner.tell(Message::Change { uri: document.uri, version: document.version, changes: params.content_changes });
    }

    async fn did_close(&self, params: DidCloseTextDocumentParams) {
        self.owner.tell(Message::Close { uri: params.text_document.uri });
    }

    async fn did_change_watched_files(&self, params: DidChangeWatchedFilesParams) {
        let paths = params.changes.iter().map(|change| path_of(&change.uri)).collect();
        self.owner.tell(Message::Disk(paths));
    }

    async fn did_change_workspace_folders(&self, params: DidChangeWorkspaceFoldersParams) {
        let paths = |folders: Vec<tower_lsp::lsp_types::WorkspaceFolder>| folders.iter().map(|folder| path_of(&folder.uri)).collect();
        let (added, removed) = (paths(params.event.added), paths(params.event.removed));
        self.owner.tell(Message::Folders { added, removed });
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
