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
mod lattice_picture;
mod layout;
mod lines;
mod meet;
mod picture;
mod probe;
mod quantity;
mod range;
mod risk;
mod scale;
mod slopes;
mod solve;
mod types;
mod worst;
mod zone_cell;
mod zone_density;
mod zone_field;
mod zone_names;
mod zone_quantity;
mod zone_range;
mod zone_shapes;
mod zone_slopes;
mod zone_solve;

use std::sync::Arc;

use crate::model::{Crystal, CrystalRef};

pub use assess::{Rebuild, class_word, gap_word};
pub use lattice_picture::{LatticePicture, PathRun};
pub use meet::Wanted;
pub use picture::{EdgeWave, Picture, potential_line};
pub use types::*;

use assess::Assessor;
use cache::Cache;
use chain::Chain;
use effort::budget;
use zone_solve::{Effort, zone_solution};

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
        if let Some(unsolved) = impossible(crystal) {
            return Err(unsolved);
        }
        let fingerprint = fingerprint::fingerprint(crystal);
        if let Some(answer) = self.cache.get(fingerprint) {
            return answer;
        }
        let answer = match crystal.dimension {
            1 => solve::chain_solution(crystal, &budget(cancelled)),
            _ => zone_solution(crystal, Effort::Fine, cancelled),
        }
        .map(Arc::new);
        self.cache.put(fingerprint, &answer);
        answer
    }

    /// What is known of a crystal's bands without any work.
    pub fn known(&self, crystal: &Crystal) -> Option<Result<Arc<Solution>, Unsolved>> {
        match impossible(crystal) {
            Some(unsolved) => Some(Err(unsolved)),
            None => self.cache.get(fingerprint::fingerprint(crystal)),
        }
    }

    /// A quick answer with wider error bounds; the fine one where it is known, or as quick to have (one dimension).
    ///
    /// # Errors
    /// [`Unsolved`] says why there is none.
    pub fn solve_coarse(
        &self,
        crystal: &Crystal,
        cancelled: &Cancelled<'_>,
    ) -> Result<Arc<Solution>, Unsolved> {
        match self.known(crystal) {
            Some(answer) => answer,
            None if crystal.dimension == 1 => self.solve(crystal, cancelled),
            None => zone_solution(crystal, Effort::Coarse, cancelled).map(Arc::new),
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
        if crystal.dimension > 1 {
            return zone_slopes::sensitivities(self, crystal, bands, cancelled);
        }
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
        if crystal.dimension > 1 {
            return Err(Unsolved::Dimension(crystal.dimension));
        }
        let solution = self.solve(crystal, cancelled)?;
        picture::picture(crystal, &solution, points, cancelled)
    }

    /// What a picture of a two- or three-dimensional crystal is drawn from.
    ///
    /// # Errors
    /// [`Unsolved`] says why there is none.
    pub fn lattice_picture(
        &self,
        crystal: &Crystal,
        cancelled: &Cancelled<'_>,
    ) -> Result<LatticePicture, Unsolved> {
        match impossible(crystal) {
            Some(unsolved) => Err(unsolved),
            None if crystal.dimension == 1 => Err(Unsolved::Dimension(1)),
            None => lattice_picture::lattice_picture(crystal, cancelled),
        }
    }
}

/// Why a crystal cannot be solved whatever the effort, if so.
fn impossible(crystal: &Crystal) -> Option<Unsolved> {
    match crystal.dimension {
        _ if crystal.broken => Some(Unsolved::BrokenModel),
        1..=3 => None,
        _ => Some(Unsolved::BrokenModel),
    }
}
