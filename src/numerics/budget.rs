//! How much work a caller allows, the hook that may stop it, and the meter of both.
//!
//! The unit of work is one factor of one sweep in `f64`: the transfer matrix of a layer or a delta with its
//! derivative by energy, multiplied on (some 50 ns). A part of a smooth step is worth [`PART`] of them, the same
//! in double-double [`EXACT`] times as much, and so on; measured ratios, rounded. A sweep that would pass the limit is
//! not begun, so that no cell, however long, wild or deep, takes longer than its budget says.

use super::cell::{Ready, SolveError};
use super::scalar::Scalar;
use std::cell::Cell as Counter;

/// Work in a part of a smooth step or ramp.
pub(crate) const PART: usize = 10;
/// Work in double-double, relative to `f64`.
pub(crate) const EXACT: usize = 12;
/// Work of a sweep with its second derivative, relative to one with its first.
pub(crate) const SECOND: usize = 3;
/// Work of a gradient by everything in the cell, relative to a sweep.
pub(crate) const GRADIENT: usize = 5;
/// Work of the bounds at one edge, relative to a sweep.
pub(crate) const BOUND: usize = 10;
/// The hook is asked once for this much work: some microseconds.
const QUESTION: usize = 64;

/// How much work is allowed, and a hook that may stop it.
#[derive(Clone, Copy)]
pub struct Budget<'a> {
    /// The greatest work: layers and deltas times sweeps, smooth steps counting for more (for a mesh: samples of the potential).
    pub max_work: usize,
    /// Asked at first and then once for every 64 of work, before it is done; `true` stops with
    /// [`SolveError::Cancelled`]. So whoever counts the questions counts the work.
    pub cancelled: &'a (dyn Fn() -> bool + Sync),
}

impl Default for Budget<'_> {
    fn default() -> Self {
        Budget {
            max_work: 100_000_000,
            cancelled: &|| false,
        }
    }
}

/// Counts sweeps and work against a budget.
pub(crate) struct Meter<'a> {
    budget: &'a Budget<'a>,
    work: Counter<usize>,
    sweeps: Counter<usize>,
}

impl<'a> Meter<'a> {
    pub fn new(budget: &'a Budget<'a>) -> Self {
        Meter {
            budget,
            work: Counter::new(0),
            sweeps: Counter::new(0),
        }
    }

    /// Books this much work before it is done.
    pub fn spend(&self, work: usize) -> Result<(), SolveError> {
        let before = self.work.get();
        let total = before.saturating_add(work);
        if total > self.budget.max_work {
            return Err(SolveError::BudgetSpent);
        }
        let first = usize::from(before == 0);
        for _ in before / QUESTION..total / QUESTION + first {
            if (self.budget.cancelled)() {
                return Err(SolveError::Cancelled);
            }
        }
        self.work.set(total);
        Ok(())
    }

    /// Books `times` the work of a sweep at an energy, in the arithmetic of `T`.
    pub fn sweep<T: Scalar>(
        &self,
        ready: &Ready,
        energy: f64,
        times: usize,
    ) -> Result<(), SolveError> {
        let exact = if T::UNIT < f64::UNIT { EXACT } else { 1 };
        self.sweeps.set(self.sweeps.get() + 1);
        self.spend(ready.work(energy).saturating_mul(exact * times))
    }

    pub fn sweeps(&self) -> usize {
        self.sweeps.get()
    }

    pub fn work(&self) -> usize {
        self.work.get()
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use std::sync::atomic::{AtomicUsize, Ordering};

    #[test]
    fn work_past_the_limit_is_not_begun_and_long_work_asks_often() {
        let asked = AtomicUsize::new(0);
        let hook = || {
            asked.fetch_add(1, Ordering::Relaxed);
            false
        };
        let budget = Budget {
            max_work: 100_000,
            cancelled: &hook,
        };
        let meter = Meter::new(&budget);
        assert_eq!(meter.spend(60_000), Ok(()));
        assert_eq!(asked.load(Ordering::Relaxed), 1 + 60_000 / QUESTION);
        assert_eq!(meter.spend(60_000), Err(SolveError::BudgetSpent));
        assert_eq!(meter.work(), 60_000);
        assert_eq!(meter.spend(40_000), Ok(()));
        assert_eq!(meter.spend(1), Err(SolveError::BudgetSpent));
    }
}
