//! What the workers do: analyse one document and word its findings for the client.

use std::panic::{AssertUnwindSafe, catch_unwind};
use std::path::{Path, PathBuf};
use std::sync::{Arc, OnceLock};
use std::time::{Duration, Instant};

use tower_lsp::lsp_types::Diagnostic;

use super::abilities::Abilities;
use super::cancel::Cancel;
use super::files::Files;
use super::findings;
use super::log::log;
use crate::report::{Analysis, Analyst, Request, Tier};

/// How much is to be known.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub(super) enum Depth {
    /// What costs little, with the dear results that are known already.
    Cheap,
    /// Quick answers with wider error bounds where the bands take long; what is had at once in full.
    Rough,
    /// Everything.
    Dear,
}

/// One document to analyse.
pub(super) struct Job {
    pub(super) path: PathBuf,
    pub(super) depth: Depth,
    pub(super) generation: u64,
    pub(super) files: Arc<Files>,
    pub(super) abilities: Arc<Abilities>,
    pub(super) cancel: Cancel,
    /// What is known of the same state of the files already, to less depth.
    pub(super) base: Option<Arc<Analysis>>,
}

/// What came of a [`Job`].
pub(super) struct Checked {
    pub(super) path: PathBuf,
    pub(super) depth: Depth,
    pub(super) generation: u64,
    /// `None` where the analysis met a fault of ours.
    pub(super) analysis: Option<Arc<Analysis>>,
    /// Its findings for the client, once they were asked for.
    worded: OnceLock<Arc<[Diagnostic]>>,
}

impl Checked {
    /// Its findings for the client. Only dear ones are worded ahead: cheap ones are rarely shown.
    pub(super) fn diagnostics(&self, files: &Files, abilities: &Abilities) -> Arc<[Diagnostic]> {
        let word = || word(self.analysis.as_deref(), files, &self.path, abilities);
        Arc::clone(self.worded.get_or_init(word))
    }
}

fn word(
    analysis: Option<&Analysis>,
    files: &Files,
    path: &Path,
    abilities: &Abilities,
) -> Arc<[Diagnostic]> {
    let work = || analysis.map(|analysis| findings::of_file(analysis, files, path, abilities));
    let worded = catch_unwind(AssertUnwindSafe(work))
        .inspect_err(|_| log!("a fault while wording {}", path.display()));
    Arc::from(worded.ok().flatten().unwrap_or_default())
}

/// Does the job. A fault in it costs its result and nothing else.
pub(super) fn check(analyst: &Analyst, job: Job, slow: Option<Duration>) -> Checked {
    let Job {
        path,
        depth,
        generation,
        files,
        abilities,
        cancel,
        base,
    } = job;
    let work = || {
        if let (Some(slow), true) = (slow, depth > Depth::Cheap) {
            dawdle(slow, &cancel);
        }
        Arc::new(analyse(
            analyst,
            &files,
            &path,
            depth,
            &cancel,
            base.as_deref(),
        ))
    };
    let analysis = catch_unwind(AssertUnwindSafe(work))
        .inspect_err(|_| log!("a fault while analysing {}", path.display()))
        .ok();
    let whole = |analysis: &Arc<Analysis>| {
        let file = analysis.file(&path);
        file.is_some_and(|file| file.depth >= Tier::Bands)
    };
    let depth = match depth {
        // Nothing took long, or a fault would only come again.
        Depth::Rough if analysis.as_ref().is_none_or(whole) => Depth::Dear,
        depth => depth,
    };
    let checked = Checked {
        path,
        depth,
        generation,
        analysis,
        worded: OnceLock::new(),
    };
    if depth == Depth::Dear {
        checked.diagnostics(&files, &abilities);
    }
    checked
}

fn analyse(
    analyst: &Analyst,
    files: &Files,
    path: &PathBuf,
    depth: Depth,
    cancel: &Cancel,
    base: Option<&Analysis>,
) -> Analysis {
    let request = Request {
        source: files,
        roots: std::slice::from_ref(path),
        depth: match depth {
            Depth::Cheap => Tier::Model,
            Depth::Rough | Depth::Dear => Tier::Bands,
        },
        cancel: &|| cancel.is_cancelled(),
    };
    match (base, depth) {
        (Some(base), Depth::Rough) => analyst.deepen_quickly(base, &request),
        (Some(base), _) => analyst.deepen(base, &request),
        (None, Depth::Rough) => analyst.analyse_quickly(&request),
        (None, _) => analyst.analyse(&request),
    }
}

/// For tests: work that takes this long unless it is stopped.
fn dawdle(time: Duration, cancel: &Cancel) {
    let end = Instant::now() + time;
    while Instant::now() < end && !cancel.is_cancelled() {
        std::thread::sleep(Duration::from_millis(1));
    }
}
