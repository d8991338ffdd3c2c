//! What the workers do: analyse one document and word its findings for the client.

use std::panic::{AssertUnwindSafe, catch_unwind};
use std::path::PathBuf;
use std::sync::Arc;
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
}

/// What came of a [`Job`].
pub(super) struct Checked {
    pub(super) path: PathBuf,
    pub(super) depth: Depth,
    pub(super) generation: u64,
    /// `None` where the analysis met a fault of ours.
    pub(super) analysis: Option<Arc<Analysis>>,
    pub(super) diagnostics: Vec<Diagnostic>,
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
    } = job;
    let work = || {
        if let (Some(slow), true) = (slow, depth > Depth::Cheap) {
            dawdle(slow, &cancel);
        }
        let analysis = analyse(analyst, &files, &path, depth, &cancel);
        let diagnostics = findings::of_file(&analysis, &files, &path, &abilities);
        (analysis, diagnostics)
    };
    let done = catch_unwind(AssertUnwindSafe(work))
        .inspect_err(|_| log!("a fault while analysing {}", path.display()))
        .ok();
    let (analysis, diagnostics) = done.unzip();
    let whole = |analysis: &Analysis| {
        let file = analysis.file(&path);
        file.is_some_and(|file| file.depth >= Tier::Bands)
    };
    let depth = match depth {
        // Nothing took long, or a fault would only come again.
        Depth::Rough if analysis.as_ref().is_none_or(whole) => Depth::Dear,
        depth => depth,
    };
    Checked {
        path,
        depth,
        generation,
        analysis: analysis.map(Arc::new),
        diagnostics: diagnostics.unwrap_or_default(),
    }
}

fn analyse(
    analyst: &Analyst,
    files: &Files,
    path: &PathBuf,
    depth: Depth,
    cancel: &Cancel,
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
    match depth {
        Depth::Rough => analyst.analyse_quickly(&request),
        Depth::Cheap | Depth::Dear => analyst.analyse(&request),
    }
}

/// For tests: work that takes this long unless it is stopped.
fn dawdle(time: Duration, cancel: &Cancel) {
    let end = Instant::now() + time;
    while Instant::now() < end && !cancel.is_cancelled() {
        std::thread::sleep(Duration::from_millis(1));
    }
}
