//! The handlers: each turns a request into a question to the owner and to a view of the analysis.
//!
//! *Invariant*: a notification's handler sends to the owner before its first
//! wait, so that edits keep their order; a request's handler waits for results
//! and for threads, never for the client.

use std::path::PathBuf;
use std::sync::{Arc, OnceLock};
use std::time::Duration;

use tokio::sync::Semaphore;
use tokio::time::timeout;
use tower_lsp::jsonrpc::{Error, Result};
use tower_lsp::lsp_types::{
    DidChangeWatchedFilesRegistrationOptions, FileSystemWatcher, GlobPattern, InitializeParams,
    Registration, RegistrationParams, Url,
    notification::{DidChangeWatchedFiles, Notification},
    request,
};

use super::Settings;
use super::abilities::Abilities;
use super::checker::Depth;
use super::files::{Files, path_of};
use super::log::log;
use super::outgoing::Outgoing;
use super::owner::{Message, Owner};
use super::record::{Answer, View};
use super::scene::Scene;
use crate::report::Analyst;

/// Views made at the same time, at most.
const VIEWS_AT_ONCE: usize = 4;

/// How long a request waits for the bands before it is answered without them.
const PATIENCE: Duration = Duration::from_millis(1500);

/// The server as the protocol sees it.
pub(super) struct Backend {
    pub(super) outgoing: Outgoing,
    pub(super) owner: Owner,
    pub(super) analyst: Arc<Analyst>,
    abilities: OnceLock<Arc<Abilities>>,
    views: Arc<Semaphore>,
    patience: Duration,
}

impl Backend {
    /// A server that has not met its client yet.
    pub(super) fn new(outgoing: Outgoing, settings: &Settings) -> Self {
        let analyst = Arc::new(Analyst::default());
        Self {
            owner: Owner::start(outgoing.clone(), &analyst, settings.slow_bands),
            outgoing,
            analyst,
            abilities: OnceLock::new(),
            views: Arc::new(Semaphore::new(VIEWS_AT_ONCE)),
            patience: settings.patience.unwrap_or(PATIENCE),
        }
    }

    /// What the client can do.
    pub(super) fn abilities(&self) -> Arc<Abilities> {
        self.abilities.get().cloned().unwrap_or_default()
    }

    /// Meets the client.
    pub(super) fn meet(&self, params: &InitializeParams) -> Arc<Abilities> {
        let abilities = Arc::new(Abilities::new(&params.capabilities));
        let _ = self.abilities.set(Arc::clone(&abilities));
        self.owner
            .tell(Message::Start(Arc::clone(&abilities), folders(params)));
        abilities
    }

    /// Asks to be told of files that change on the disk, where the client can tell.
    pub(super) fn watch_files(&self) {
        if !self.abilities().watch {
            return;
        }
        let watcher = |pattern: &str| FileSystemWatcher {
            glob_pattern: GlobPattern::String(pattern.to_owned()),
            kind: None,
        };
        let options = DidChangeWatchedFilesRegistrationOptions {
            watchers: vec![watcher("**/*.cren"), watcher("**/*.csv")],
        };
        let registration = Registration {
            id: "crenate/files".to_owned(),
            method: DidChangeWatchedFiles::METHOD.to_owned(),
            register_options: serde_json::to_value(options).ok(),
        };
        self.outgoing
            .ask::<request::RegisterCapability>(RegistrationParams {
                registrations: vec![registration],
            });
    }

    /// The document as it is now, with what is known of it; with less than `depth` where that takes too long.
    pub(super) async fn view(&self, uri: &Url, depth: Option<Depth>) -> Result<Option<View>> {
        let wanted = self.owner.want(uri, depth);
        let answer = match timeout(self.patience, wanted).await {
            Ok(answer) => answer,
            Err(_) => {
                self.owner.tell(Message::Owe(path_of(uri)));
                self.owner.want(uri, Some(Depth::Cheap)).await
            }
        };
        match answer {
            Ok(Answer::View(view)) => Ok(Some(view)),
            Ok(Answer::Stale) => Err(Error::content_modified()),
            Ok(Answer::Nothing) | Err(_) => Ok(None),
        }
    }

    /// All files as they are now.
    pub(super) async fn files(&self) -> Arc<Files> {
        self.owner.want_files().await.unwrap_or_default()
    }

    /// Makes a view of a document on a thread for such work.
    pub(super) async fn look<T, F>(
        &self,
        uri: &Url,
        depth: Option<Depth>,
        make: F,
    ) -> Result<Option<T>>
    where
        T: Send + 'static,
        F: FnOnce(&Scene) -> Option<T> + Send + 'static,
    {
        let Some(view) = self.view(uri, depth).await? else {
            return Ok(None);
        };
        let scene = Scene {
            view,
            analyst: Arc::clone(&self.analyst),
            abilities: self.abilities(),
        };
        let overtaken = scene.view.file.overtaken.clone();
        let made = self.work(move || make(&scene)).await?;
        if overtaken.is_cancelled() {
            return Err(Error::content_modified());
        }
        Ok(made)
    }

    /// Runs work that may take a moment; a fault in it is an error of this request alone.
    pub(super) async fn work<T: Send + 'static>(
        &self,
        work: impl FnOnce() -> T + Send + 'static,
    ) -> Result<T> {
        let permit = Arc::clone(&self.views)
            .acquire_owned()
            .await
            .map_err(|_| Error::internal_error())?;
        let work = move || {
            let made = work();
            drop(permit);
            made
        };
        tokio::task::spawn_blocking(work).await.map_err(|error| {
            log!("a request met a fault: {error}");
            Error::internal_error()
        })
    }
}

/// The workspace folders, in either of the ways in which clients name them.
fn folders(params: &InitializeParams) -> Vec<PathBuf> {
    let folders = params
        .workspace_folders
        .iter()
        .flatten()
        .map(|folder| path_of(&folder.uri));
    let folders: Vec<PathBuf> = folders.collect();
    if !folders.is_empty() {
        return folders;
    }
    match &params.root_uri {
        Some(root) => vec![path_of(root)],
        None => root_path(params).into_iter().collect(),
    }
}

/// The folder of a client that names it by path alone, as the first ones did.
#[allow(deprecated, reason = "it is read for the sake of such clients")]
fn root_path(params: &InitializeParams) -> Option<PathBuf> {
    let path = params.root_path.as_deref().map(PathBuf::from)?;
    path.is_absolute().then_some(path)
}
