//! The one bridge from a [`crate::model::Crystal`] to numbers with uncertainties.
//!
//! Everything that leaves this room is in SI units. A [`Solver`] keeps what it has solved by content, so that a
//! crystal that is read again unchanged, or moved to another line, costs nothing.

mod assess;
mod cache;
mod chain;
mod effort;
mod field;
mod filling;
mod fingerprint;
mod layout;
mod meet;
mod picture;
mod probe;
mod quantity;
mod range;
mod scale;
mod slopes;
mod solve;
mod types;
mod worst;

use std::sync::Arc;

use crate::model::{Crystal, CrystalRef};

pub use assess::{Rebuild, class_word, gap_word};
pub use meet::Wanted;
pub use picture::{EdgeWave, Picture, potential_line};
pub use types::*;

use assess::Assessor;
use cache::Cache;
use chain::Chain;
use effort::budget;

/// Asked again and again during long work; `true` stops it.
pub type Cancelled<'a> = dyn Fn() -> bool + Sync + 'a;

/// Solves crystals and remembers what it solved; shared by threads.
#[derive(Default)]
pub struct Solver {
    cache: Cache,
}

impl Solver {
    /// The bands of a crystal.
    ///
    /// # Errors
    /// [`Unsolved`] says why there are none.
    pub fn solve(
        &self,
        crystal: &Crystal,
        cancelled: &Cancelled<'_>,
    ) -> Result<Arc<Solution>, Unsolved> {
        match crystal.dimension {
            _ if crystal.broken => return Err(Unsolved::BrokenModel),
            1 => {}
            0 => return Err(Unsolved::BrokenModel),
            dimension => return Err(Unsolved::Dimension(dimension)),
        }
        let fingerprint = fingerprint::fingerprint(crystal);
        if let Some(answer) = self.cache.get(fingerprint) {
            return answer;
        }
        let answer = solve::chain_solution(crystal, &budget(cancelled)).map(Arc::new);
        self.cache.put(fingerprint, &answer);
        answer
    }

    /// What is known of a crystal's bands without any work.
    pub fn known(&self, crystal: &Crystal) -> Option<Result<Arc<Solution>, Unsolved>> {
        match crystal.dimension {
            _ if crystal.broken => Some(Err(Unsolved::BrokenModel)),
            1 => self.cache.get(fingerprint::fingerprint(crystal)),
            0 => Some(Err(Unsolved::BrokenModel)),
            dimension => Some(Err(Unsolved::Dimension(dimension))),
        }
    }

    /// Exact derivatives of the lowest gaps, widths and edges (of `bands` bands) by everything the crystal depends on.
    ///
    /// # Errors
    /// [`Unsolved`] says why there are none.
    pub fn sensitivities(
        &self,
        crystal: &Crystal,
        bands: usize,
        cancelled: &Cancelled<'_>,
    ) -> Result<Vec<Sensitivity>, Unsolved> {
        self.solve(crystal, cancelled)?;
        let budget = budget(cancelled);
        Chain::new(crystal, &budget)?.sensitivities(bands, &budget)
    }

    /// What became of a crystal's targets and measures. `rebuild` gives this or another crystal at a setting of the
    /// tolerances.
    ///
    /// # Errors
    /// [`Unsolved::Cancelled`] when the work was overtaken.
    pub fn assess(
        &self,
        of: CrystalRef,
        crystal: &Arc<Crystal>,
        rebuild: &Rebuild<'_>,
        cancelled: &Cancelled<'_>,
    ) -> Result<(Vec<Assessment>, Vec<MeasureValue>), Unsolved> {
        let assessor = Assessor {
            solver: self,
            of,
            crystal,
            rebuild,
            cancelled,
        };
        let targets = assessor.targets().ok_or(Unsolved::Cancelled)?;
        Ok((targets, assessor.measures()))
    }

    /// What a picture of a one-dimensional crystal is drawn from, with about `points` points a line.
    ///
    /// # Errors
    /// [`Unsolved`] says why there is none.
    pub fn picture(
        &self,
        crystal: &Crystal,
        points: usize,
        cancelled: &Cancelled<'_>,
    ) -> Result<Picture, Unsolved> {
        let solution = self.solve(crystal, cancelled)?;
        picture::picture(crystal, &solution, points, cancelled)
    }
}
