//! The one owner of what changes: open documents, and what is known of them.
//!
//! A thread of its own takes messages one at a time, so edits apply in the
//! order in which they came and a request sees exactly the edits before it.
//! Others get immutable snapshots. The owner itself never analyses: two
//! workers do, one for what is cheap and one for the bands.
//!
//! *Invariant*: a result is shown only while the text that it speaks of is the
//! current one; whatever an edit overtakes is cancelled.

use std::collections::HashMap;
use std::path::{Path, PathBuf};
use std::sync::Arc;
use std::sync::mpsc::{Receiver, RecvTimeoutError, Sender};
use std::time::{Duration, Instant};

use serde::Serialize;
use tower_lsp::lsp_types::{
    Diagnostic, TextDocumentContentChangeEvent, Url, notification, request,
};

use super::abilities::Abilities;
use super::checker::{Checked, Depth, Job};
use super::files::{Files, OpenFile, path_of};
use super::lane::Lane;
use super::log::log;
use super::outgoing::Outgoing;
use super::owner::Message;
use super::record::{Answer, Record, View, Want};
use crate::text::Document;

/// How long the cheap findings wait for the dear ones, so that a quick edit changes the picture once.
const GRACE: Duration = Duration::from_millis(40);

/// What `textDocument/publishDiagnostics` says.
#[derive(Serialize)]
struct Published<'a> {
    uri: &'a Url,
    diagnostics: &'a [Diagnostic],
    #[serde(skip_serializing_if = "Option::is_none")]
    version: Option<i32>,
}

/// What the owner's thread holds.
pub(super) struct State {
    /// For messages to itself.
    own: Sender<Message>,
    inbox: Receiver<Message>,
    outgoing: Outgoing,
    runtime: tokio::runtime::Handle,
    abilities: Arc<Abilities>,
    files: Arc<Files>,
    records: HashMap<PathBuf, Record>,
    /// Counts changes of anything; results of an earlier count are out of date.
    generation: u64,
    /// The document edited last: it is served first.
    focus: Option<PathBuf>,
    /// Whether something changed since the workers were last told.
    changed: bool,
    cheap: Lane,
    dear: Lane,
}

impl State {
    /// A state without documents.
    pub(super) fn new(
        (own, inbox): (Sender<Message>, Receiver<Message>),
        outgoing: Outgoing,
        runtime: tokio::runtime::Handle,
        [cheap, dear]: [Lane; 2],
    ) -> Self {
        Self {
            own,
            inbox,
            outgoing,
            runtime,
            abilities: Arc::default(),
            files: Arc::default(),
            records: HashMap::new(),
            generation: 0,
            focus: None,
            changed: false,
            cheap,
            dear,
        }
    }

    /// Takes messages until the session is over.
    pub(super) fn run(mut self) {
        loop {
            let first = match self.next_deadline() {
                None => self
                    .inbox
                    .recv()
                    .map_err(|_| RecvTimeoutError::Disconnected),
                Some(at) => self
                    .inbox
                    .recv_timeout(at.saturating_duration_since(Instant::now())),
            };
            let mut next = match first {
                Err(RecvTimeoutError::Disconnected) => break,
                first => first.ok(),
            };
            // A burst of edits is taken whole before any work on it starts.
            while let Some(message) = next {
                if matches!(message, Message::End) {
                    return self.stop();
                }
                self.take(message);
                next = self.inbox.try_recv().ok();
            }
            self.settle();
        }
        self.stop();
    }

    fn stop(&mut self) {
        self.cheap.cancel();
        self.dear.cancel();
    }

    fn next_deadline(&self) -> Option<Instant> {
        let due = self.records.values().filter_map(|record| record.due);
        due.chain(self.dear.progress_due(&self.abilities)).min()
    }

    fn take(&mut self, message: Message) {
        match message {
            Message::Start(abilities, folders) => {
                self.abilities = abilities;
                Arc::make_mut(&mut self.files).folders = folders;
                self.survey();
            }
            Message::Open { uri, version, text } => self.open(uri, version, &text),
            Message::Change {
                uri,
                version,
                changes,
            } => self.change(&uri, version, changes),
            Message::Close { uri } => self.close(uri),
            Message::Disk(paths) => {
                self.files.disk.forget(&paths);
                self.survey();
                self.touched();
            }
            Message::Folders { added, removed } => {
                let folders = &mut Arc::make_mut(&mut self.files).folders;
                folders.retain(|folder| !removed.contains(folder));
                folders.extend(added);
                self.survey();
                self.touched();
            }
            Message::Want(want) => self.answer_or_keep(want),
            Message::WantFiles(reply) => {
                self.freshen_all();
                let _ = reply.send(Arc::clone(&self.files));
            }
            Message::Owe(path) => self.owe(&path),
            Message::Surveyed(uses) => {
                if *self.files.uses != uses {
                    Arc::make_mut(&mut self.files).uses = Arc::new(uses);
                    self.touched();
                }
            }
            Message::StopWork => self.dear.cancel(),
            Message::Checked(checked) => self.checked(checked),
            Message::End => {}
        }
    }

    /// The client was told less than will be known: it is asked to ask anew when that is there.
    fn owe(&mut self, path: &Path) {
        let generation = self.generation;
        let Some(record) = self.records.get_mut(path) else {
            return;
        };
        if record.known(Depth::Dear, generation).is_some() {
            self.refresh();
        } else {
            record.owes = true;
        }
    }

    fn open(&mut self, uri: Url, version: i32, text: &str) {
        let path = path_of(&uri);
        let document = Document::new(text);
        let file = Arc::new(OpenFile::new(uri, version, &document));
        Arc::make_mut(&mut self.files)
            .open
            .insert(path.clone(), Arc::clone(&file));
        let record = Record {
            document,
            file,
            dirty: false,
            cheap: None,
            rough: None,
            dear: None,
            waiting: Vec::new(),
            due: Some(Instant::now() + GRACE),
            shown: None,
            owes: false,
        };
        if let Some(before) = self.records.insert(path.clone(), record) {
            before
                .waiting
                .into_iter()
                .for_each(|want| want.send(Answer::Stale));
        }
        self.focus = Some(path);
        self.touched();
    }

    fn change(&mut self, uri: &Url, version: i32, changes: Vec<TextDocumentContentChangeEvent>) {
        let path = path_of(uri);
        let Some(record) = self.records.get_mut(&path) else {
            log!("a change of a document that is not open: {uri}");
            return;
        };
        for change in changes {
            super::positions::apply(&mut record.document, change, self.abilities.encoding());
        }
        record.dirty = true;
        record.file.overtaken.cancel();
        record.file = Arc::new(record.file.with_version(version));
        record.due = Some(Instant::now() + GRACE);
        record
            .waiting
            .drain(..)
            .for_each(|want| want.send(Answer::Stale));
        self.focus = Some(path);
        self.touched();
    }

    fn close(&mut self, uri: Url) {
        let path = path_of(&uri);
        if let Some(record) = self.records.remove(&path) {
            record
                .waiting
                .into_iter()
                .for_each(|want| want.send(Answer::Nothing));
        }
        let files = Arc::make_mut(&mut self.files);
        files.open.remove(&path);
        files.disk.forget(&[path]);
        if !self.abilities.pulls {
            self.show(&uri, None, &[]);
        }
        self.touched();
    }

    /// Looks, beside other work, at what the files in the folders use.
    fn survey(&self) {
        if self.files.folders.is_empty() {
            return;
        }
        let (files, own) = (Arc::clone(&self.files), self.own.clone());
        self.runtime.spawn_blocking(move || {
            // The owner is gone only when the session is over.
            let _ = own.send(Message::Surveyed(files.survey()));
        });
    }

    fn touched(&mut self) {
        self.generation += 1;
        self.changed = true;
    }

    /// Brings the snapshot of a document up to its text.
    fn freshen(&mut self, path: &Path) {
        if let Some(record) = self.records.get_mut(path).filter(|record| record.dirty) {
            record.file = Arc::new(record.file.after(&record.document));
            record.dirty = false;
            let file = Arc::clone(&record.file);
            Arc::make_mut(&mut self.files)
                .open
                .insert(path.to_owned(), file);
        }
    }

    fn freshen_all(&mut self) {
        let dirty = self.records.iter().filter(|(_, record)| record.dirty);
        let dirty: Vec<PathBuf> = dirty.map(|(path, _)| path.clone()).collect();
        dirty.iter().for_each(|path| self.freshen(path));
    }

    fn answer_or_keep(&mut self, want: Want) {
        let path = path_of(&want.uri);
        self.freshen(&path);
        let Some(record) = self.records.get_mut(&path) else {
            return want.send(Answer::Nothing);
        };
        let known = match want.depth {
            None => Some(None),
            Some(depth) => record
                .known(depth, self.generation)
                .map(|checked| checked.analysis.clone()),
        };
        match known {
            Some(analysis) => {
                want.send(Answer::View(View {
                    files: Arc::clone(&self.files),
                    file: Arc::clone(&record.file),
                    analysis,
                }));
            }
            None => {
                record.waiting.push(want);
                self.dear.hurry(&path);
            }
        }
    }

    /// Gives the workers what is to be done and the client what is due.
    fn settle(&mut self) {
        if std::mem::take(&mut self.changed) {
            self.freshen_all();
            self.cheap.cancel();
            self.dear.cancel();
            self.cheap.queue = self.in_order();
            self.dear.queue.clear();
        }
        self.employ();
        let now = Instant::now();
        let due = |record: &Record| record.due.is_some_and(|due| due <= now);
        let paths: Vec<PathBuf> = self
            .records
            .iter()
            .filter(|(_, record)| due(record))
            .map(|(path, _)| path.clone())
            .collect();
        paths
            .iter()
            .for_each(|path| self.publish(path, Depth::Cheap));
        self.dear
            .show_progress(&self.abilities, &self.outgoing, &self.runtime);
    }

    /// Gives idle workers their next jobs.
    fn employ(&mut self) {
        let generation = self.generation;
        let (records, files, abilities) = (&self.records, &self.files, &self.abilities);
        let known = |path: &Path, depth| {
            let record = records.get(path);
            record.and_then(|record| record.known(depth, generation))
        };
        let job = |path: PathBuf, depth, cancel| Job {
            base: known(&path, Depth::Cheap).and_then(|checked| checked.analysis.clone()),
            path,
            depth,
            generation,
            files: Arc::clone(files),
            abilities: Arc::clone(abilities),
            cancel,
        };
        self.cheap
            .pump(|path, cancel| job(path, Depth::Cheap, cancel));
        self.dear.pump(|path, cancel| {
            let depth = match known(&path, Depth::Rough) {
                Some(_) => Depth::Dear,
                None => Depth::Rough,
            };
            job(path, depth, cancel)
        });
    }

    fn lane(&mut self, depth: Depth) -> &mut Lane {
        match depth {
            Depth::Cheap => &mut self.cheap,
            Depth::Rough | Depth::Dear => &mut self.dear,
        }
    }

    /// The open documents, the one edited last first, the others by name.
    fn in_order(&self) -> std::collections::VecDeque<PathBuf> {
        let mut paths: Vec<PathBuf> = self.records.keys().cloned().collect();
        paths.sort_unstable_by_key(|path| (Some(path) != self.focus.as_ref(), path.clone()));
        paths.into()
    }

    /// Takes a worker's result, if nothing has changed since.
    fn checked(&mut self, checked: Checked) {
        let (path, mut depth) = (checked.path.clone(), checked.depth);
        let stopped = self.lane(depth).done();
        if stopped && depth == Depth::Rough {
            // Whoever stopped it does not want what would follow either.
            depth = Depth::Dear;
        }
        if checked.generation != self.generation {
            return;
        }
        let Some(record) = self.records.get_mut(&path) else {
            return;
        };
        let view = View {
            files: Arc::clone(&self.files),
            file: Arc::clone(&record.file),
            analysis: checked.analysis.clone(),
        };
        for want in std::mem::take(&mut record.waiting) {
            match &view.analysis {
                _ if want.depth.is_some_and(|wanted| wanted > depth) => record.waiting.push(want),
                Some(_) => want.send(Answer::View(view.clone())),
                None => want.send(Answer::Nothing),
            }
        }
        match depth {
            Depth::Cheap => {
                record.cheap = Some(checked);
                if record.waiting.is_empty() {
                    self.dear.queue.push_back(path);
                } else {
                    self.dear.queue.push_front(path);
                }
            }
            Depth::Rough => {
                record.rough = Some(checked);
                // What is waited for, and the document that is edited, goes before the others.
                if !record.waiting.is_empty() || self.focus.as_ref() == Some(&path) {
                    self.dear.queue.push_front(path);
                } else {
                    self.dear.queue.push_back(path);
                }
            }
            Depth::Dear => {
                // What was known before is let go only once the new is on its way.
                let before = record.dear.replace(checked);
                self.publish(&path, Depth::Dear);
                drop(before);
            }
        }
    }

    /// Shows the findings of this depth, if they speak of the current text and are not shown already.
    fn publish(&mut self, path: &Path, depth: Depth) {
        let Some(record) = self.records.get_mut(path) else {
            return;
        };
        let Some(checked) = record
            .known(depth, self.generation)
            .filter(|checked| checked.analysis.is_some())
        else {
            // They are shown as soon as they come.
            record.due = None;
            return;
        };
        let version = record.file.version;
        let diagnostics = checked.diagnostics(&self.files, &self.abilities);
        record.due = None;
        let file = Arc::clone(&record.file);
        let before = record.shown.replace((version, Arc::clone(&diagnostics)));
        let owes = depth == Depth::Dear && std::mem::take(&mut record.owes);
        let elsewhere = depth == Depth::Dear && self.focus.as_deref() != Some(path);
        let differs = |before: &Arc<[Diagnostic]>| *before != diagnostics;
        let changed = elsewhere && before.as_ref().is_some_and(|(_, before)| differs(before));
        let shown = |(of, before): &(i32, _)| *of == version && !differs(before);
        if !self.abilities.pulls && !before.as_ref().is_some_and(shown) {
            self.show(&file.uri, Some(version), &diagnostics);
        }
        if owes || changed {
            self.refresh();
        }
    }

    /// Has the client ask anew for what it shows.
    fn refresh(&self) {
        if self.abilities.pulls {
            self.outgoing.ask::<request::WorkspaceDiagnosticRefresh>(());
        }
        if self.abilities.refresh_hints {
            self.outgoing.ask::<request::InlayHintRefreshRequest>(());
        }
    }

    fn show(&self, uri: &Url, version: Option<i32>, diagnostics: &[Diagnostic]) {
        self.outgoing
            .tell::<notification::PublishDiagnostics>(&Published {
                uri,
                diagnostics,
                version,
            });
    }
}
