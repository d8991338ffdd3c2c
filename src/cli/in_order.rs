//! Work on many files by all cores, its results taken in the files' order.

use std::collections::BTreeMap;
use std::io;
use std::io::IsTerminal;
use std::path::{Path, PathBuf};
use std::sync::atomic::{AtomicBool, Ordering};
use std::sync::mpsc;
use std::time::Duration;

use indicatif::{ProgressBar, ProgressDrawTarget, ProgressStyle};
use rayon::prelude::*;

/// With fewer files than this there is no progress to show.
const WORTH_A_BAR: usize = 20;

/// Does `work` on each file and hands each result to `take` in the order of the files, keeping none.
///
/// # Errors
/// The first error of `take`; the work that is left is then dropped.
pub fn each<T: Send>(
    files: &[PathBuf],
    work: impl Fn(&Path, &(dyn Fn() -> bool + Sync)) -> T + Sync,
    mut take: impl FnMut(T) -> io::Result<()>,
) -> io::Result<()> {
    let stop = AtomicBool::new(false);
    let stopped = || stop.load(Ordering::Relaxed);
    let bar = bar(files.len());
    let (sender, receiver) = mpsc::channel();
    let result = std::thread::scope(|scope| {
        scope.spawn(|| {
            let sender = sender;
            let numbered = files.iter().enumerate().par_bridge();
            numbered.for_each_with(sender, |sender, (index, file)| {
                if !stopped() {
                    // The other end is gone only when nothing is wanted any more.
                    let _ = sender.send((index, work(file, &stopped)));
                }
            });
        });
        let result = drain(&receiver, &bar, &mut take);
        stop.store(true, Ordering::Relaxed);
        result
    });
    bar.finish_and_clear();
    result
}

fn drain<T>(
    receiver: &mpsc::Receiver<(usize, T)>,
    bar: &ProgressBar,
    take: &mut impl FnMut(T) -> io::Result<()>,
) -> io::Result<()> {
    let mut waiting = BTreeMap::new();
    let mut next = 0;
    for (index, result) in receiver {
        waiting.insert(index, result);
        while let Some(result) = waiting.remove(&next) {
            next += 1;
            bar.suspend(|| take(result))?;
            bar.inc(1);
        }
    }
    Ok(())
}

/// A bar on a terminal, and nothing elsewhere.
fn bar(files: usize) -> ProgressBar {
    if files < WORTH_A_BAR || !io::stderr().is_terminal() {
        return ProgressBar::hidden();
    }
    let count = u64::try_from(files).unwrap_or(u64::MAX);
    let bar = ProgressBar::with_draw_target(Some(count), ProgressDrawTarget::stderr());
    if let Ok(style) = ProgressStyle::with_template("{bar:32} {pos} of {len} files, {eta} left") {
        bar.set_style(style);
    }
    bar.enable_steady_tick(Duration::from_millis(200));
    bar
}
