//! A worker thread and what waits for it.

use std::collections::VecDeque;
use std::path::{Path, PathBuf};
use std::sync::Arc;
use std::sync::mpsc::{Sender, channel};
use std::time::{Duration, Instant};

use tokio::sync::oneshot;
use tower_lsp::lsp_types::{
    NumberOrString, ProgressParams, ProgressParamsValue, WorkDoneProgress, WorkDoneProgressBegin,
    WorkDoneProgressCreateParams, WorkDoneProgressEnd, notification, request,
};

use super::abilities::Abilities;
use super::cancel::Cancel;
use super::checker::{self, Job};
use super::log::log;
use super::outgoing::Outgoing;
use super::owner::Message;
use crate::report::Analyst;

/// Work that takes longer than this tells the user so.
const LONG_WORK: Duration = Duration::from_millis(500);

/// One worker: it does one job at a time, and the owner keeps the queue.
pub(super) struct Lane {
    /// Documents that wait, the first first.
    pub(super) queue: VecDeque<PathBuf>,
    jobs: Sender<Job>,
    running: Option<Running>,
}

struct Running {
    path: PathBuf,
    cancel: Cancel,
    since: Instant,
    /// Ends the progress report when dropped.
    progress: Option<oneshot::Sender<()>>,
}

impl Lane {
    /// Starts the worker.
    pub(super) fn start(
        name: &str,
        owner: Sender<Message>,
        analyst: Arc<Analyst>,
        slow: Option<Duration>,
    ) -> Self {
        let (jobs, inbox) = channel::<Job>();
        let work = move || {
            while let Ok(job) = inbox.recv() {
                if owner
                    .send(Message::Checked(checker::check(&analyst, job, slow)))
                    .is_err()
                {
                    return;
                }
            }
        };
        if let Err(error) = std::thread::Builder::new().name(name.into()).spawn(work) {
            log!("no thread for the work: {error}");
        }
        Self {
            queue: VecDeque::new(),
            jobs,
            running: None,
        }
    }

    /// Stops what is running; its result comes all the same, and is ignored.
    pub(super) fn cancel(&mut self) {
        if let Some(running) = &mut self.running {
            running.cancel.cancel();
            running.progress = None;
        }
    }

    /// Serves a waiting document next.
    pub(super) fn hurry(&mut self, path: &Path) {
        if let Some(index) = self.queue.iter().position(|waiting| waiting == path) {
            self.queue.swap(0, index);
        }
    }

    /// Gives the worker its next job, if it is idle and there is one.
    pub(super) fn pump(&mut self, job: impl FnOnce(PathBuf, Cancel) -> Job) {
        if self.running.is_some() {
            return;
        }
        if let Some(path) = self.queue.pop_front() {
            let cancel = Cancel::default();
            let running = Running {
                path: path.clone(),
                cancel: cancel.clone(),
                since: Instant::now(),
                progress: None,
            };
            self.running = Some(running);
            let _ = self.jobs.send(job(path, cancel));
        }
    }

    /// The worker is idle again; whether its work was stopped.
    pub(super) fn done(&mut self) -> bool {
        let running = self.running.take();
        running.is_some_and(|running| running.cancel.is_cancelled())
    }

    /// When the user is to be told that work is going on.
    pub(super) fn progress_due(&self, abilities: &Abilities) -> Option<Instant> {
        let running = self.running.as_ref().filter(|_| abilities.progress)?;
        let untold = running.progress.is_none() && !running.cancel.is_cancelled();
        untold.then(|| running.since + LONG_WORK)
    }

    /// Tells the user about long work.
    pub(super) fn show_progress(
        &mut self,
        abilities: &Abilities,
        outgoing: &Outgoing,
        runtime: &tokio::runtime::Handle,
    ) {
        if self
            .progress_due(abilities)
            .is_none_or(|due| due > Instant::now())
        {
            return;
        }
        let Some(running) = &mut self.running else {
            return;
        };
        let (sender, done) = oneshot::channel();
        running.progress = Some(sender);
        let name = running
            .path
            .file_name()
            .unwrap_or_default()
            .to_string_lossy()
            .into_owned();
        runtime.spawn(report(outgoing.clone(), name, done));
    }
}

/// One progress report, from its creation to the end of the work.
async fn report(outgoing: Outgoing, name: String, done: oneshot::Receiver<()>) {
    let token = NumberOrString::String(format!("crenate/bands/{name}"));
    let create = WorkDoneProgressCreateParams {
        token: token.clone(),
    };
    if outgoing
        .request::<request::WorkDoneProgressCreate>(create)
        .await
        .is_none()
    {
        return;
    }
    let tell = |progress| {
        let value = ProgressParamsValue::WorkDone(progress);
        outgoing.notify::<notification::Progress>(ProgressParams {
            token: token.clone(),
            value,
        });
    };
    tell(WorkDoneProgress::Begin(WorkDoneProgressBegin {
        title: "crenate".into(),
        cancellable: Some(true),
        message: Some(format!("solving the bands of {name}")),
        percentage: None,
    }));
    let _ = done.await;
    tell(WorkDoneProgress::End(WorkDoneProgressEnd { message: None }));
}
