//! A flag that says that work is not wanted any more.

use std::sync::Arc;
use std::sync::atomic::{AtomicBool, Ordering};

/// Shared by whoever works and whoever may stop it.
#[derive(Clone, Debug, Default)]
pub(super) struct Cancel(Arc<AtomicBool>);

impl Cancel {
    /// Asks the work to stop.
    pub(super) fn cancel(&self) {
        self.0.store(true, Ordering::Relaxed);
    }

    /// Whether it was asked to.
    pub(super) fn is_cancelled(&self) -> bool {
        self.0.load(Ordering::Relaxed)
    }
}
