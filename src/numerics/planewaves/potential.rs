//! What the caller gives: the potential by its Fourier components, and how much work may be done.

use super::Error;
use nalgebra::Complex;
use std::sync::atomic::{AtomicU64, AtomicUsize, Ordering};

/// How the components end or fall off, as a function of |G|.
#[derive(Clone, Copy)]
pub enum Decay<'a> {
    /// V(G) = 0 for |G| above the radius.
    Finite {
        /// The largest |G| with a component.
        radius: f64,
    },
    /// |V(G)| ≤ c·bound(|G|) for some c: only the shape of the fall counts, so a rough envelope will do. It must be
    /// positive and not rise with |G|.
    Bounded(&'a (dyn Fn(f64) -> f64 + Sync)),
}

/// A periodic potential V(r) = Σ V(G) e^{iG·r}.
#[derive(Clone, Copy)]
pub struct Potential<'a> {
    /// V(G) for integer triples on the primitive reciprocal vectors (entries beyond the dimension are zero), in the
    /// units of k². Must be Hermitian.
    pub components: &'a (dyn Fn([i32; 3]) -> Complex<f64> + Sync),
    /// How they end.
    pub decay: Decay<'a>,
}

/// How much work may be done, and whether it is still wanted.
pub struct Budget<'a> {
    /// Asked before every eigenproblem.
    pub cancelled: &'a (dyn Fn() -> bool + Sync),
    /// The largest number of plane waves.
    pub max_basis: usize,
    /// The largest number of eigenproblems and linear solves.
    pub max_eigensolves: usize,
    /// The largest sum over all eigenproblems of the cube of their number of plane waves, to which their time is
    /// proportional (about 3·10⁹ a second).
    pub max_cost: f64,
    spent: AtomicUsize,
    cost: AtomicU64,
}

impl<'a> Budget<'a> {
    /// A fresh budget.
    pub fn new(
        cancelled: &'a (dyn Fn() -> bool + Sync),
        max_basis: usize,
        max_eigensolves: usize,
    ) -> Self {
        Self {
            cancelled,
            max_basis,
            max_eigensolves,
            max_cost: f64::INFINITY,
            spent: AtomicUsize::new(0),
            cost: AtomicU64::new(0),
        }
    }

    /// The same budget with a bound on the cost of all problems together.
    #[must_use]
    pub fn within(self, max_cost: f64) -> Self {
        Self { max_cost, ..self }
    }

    /// The eigenproblems solved so far.
    pub fn spent(&self) -> usize {
        self.spent.load(Ordering::Relaxed)
    }

    /// Asks for one more problem of this size.
    pub(super) fn spend(&self, basis: usize) -> Result<(), Error> {
        if (self.cancelled)() {
            return Err(Error::Cancelled);
        }
        let before = self.spent.fetch_add(1, Ordering::Relaxed);
        let cube = (basis as u64).saturating_pow(3);
        let cost = self.cost.fetch_add(cube, Ordering::Relaxed) as f64;
        if cost > self.max_cost {
            return Err(Error::BudgetSpent);
        }
        if basis > self.max_basis || before >= self.max_eigensolves {
            return Err(Error::BudgetSpent);
        }
        Ok(())
    }
}
