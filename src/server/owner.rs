//! The way to the one owner of what changes: messages in, snapshots out.

use std::path::PathBuf;
use std::sync::Arc;
use std::sync::mpsc::{Sender, channel};
use std::time::Duration;

use tokio::sync::oneshot;
use tower_lsp::lsp_types::{TextDocumentContentChangeEvent, Url};

use super::abilities::Abilities;
use super::checker::{Checked, Depth};
use super::files::{Files, Uses};
use super::lane::Lane;
use super::log::log;
use super::outgoing::Outgoing;
use super::record::{Answer, Want};
use super::state::State;
use crate::report::Analyst;

/// What the owner is told.
pub(super) enum Message {
    /// The client is known: what it can do and its folders.
    Start(Arc<Abilities>, Vec<PathBuf>),
    /// A document is opened.
    Open {
        uri: Url,
        version: i32,
        text: String,
    },
    /// A document changes.
    Change {
        uri: Url,
        version: i32,
        changes: Vec<TextDocumentContentChangeEvent>,
    },
    /// A document is closed.
    Close { uri: Url },
    /// Files may have changed on the disk.
    Disk(Vec<PathBuf>),
    /// Workspace folders come and go.
    Folders {
        added: Vec<PathBuf>,
        removed: Vec<PathBuf>,
    },
    /// Somebody wants to look at a document.
    Want(Want),
    /// Somebody wants to look at all files.
    WantFiles(oneshot::Sender<Arc<Files>>),
    /// A request was answered before the bands were known.
    Owe(PathBuf),
    /// What the files in the folders use is known.
    Surveyed(Uses),
    /// The client's user wants the long work to stop.
    StopWork,
    /// A worker is done.
    Checked(Checked),
    /// The session is over.
    End,
}

/// The handle of the owner; the owner ends with it.
pub(super) struct Owner(Sender<Message>);

impl Owner {
    /// Starts the owner and its workers. Must be called within a tokio runtime.
    pub(super) fn start(
        outgoing: Outgoing,
        analyst: &Arc<Analyst>,
        slow: Option<Duration>,
    ) -> Self {
        let (sender, inbox) = channel();
        let runtime = tokio::runtime::Handle::current();
        let lane = |name| Lane::start(name, sender.clone(), Arc::clone(analyst), slow);
        let lanes = [lane("cheap"), lane("bands")];
        let state = State::new((sender.clone(), inbox), outgoing, runtime, lanes);
        std::thread::Builder::new()
            .name("owner".into())
            .spawn(move || state.run())
            .map_or_else(|error| log!("no thread for the documents: {error}"), drop);
        Self(sender)
    }

    /// Tells the owner something; never waits.
    pub(super) fn tell(&self, message: Message) {
        // The owner is gone only when the session is over.
        let _ = self.0.send(message);
    }

    /// Asks to look at all files as they are now.
    pub(super) fn want_files(&self) -> oneshot::Receiver<Arc<Files>> {
        let (reply, receiver) = oneshot::channel();
        self.tell(Message::WantFiles(reply));
        receiver
    }

    /// Asks to look at a document as it is now.
    pub(super) fn want(&self, uri: &Url, depth: Option<Depth>) -> oneshot::Receiver<Answer> {
        let (reply, receiver) = oneshot::channel();
        self.tell(Message::Want(Want {
            uri: uri.clone(),
            depth,
            reply,
        }));
        receiver
    }
}

impl Drop for Owner {
    fn drop(&mut self) {
        self.tell(Message::End);
    }
}
