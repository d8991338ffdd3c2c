//! The plan of a search for extrema: cut-offs, the mesh, and the levels that extrema share.

use super::basis::Waves;
use super::levels::Basis;
use super::mesh::Mesh;
use super::settle::Prediction;
use super::{Budget, Error, Levels};
use rustc_hash::FxHashMap;
use std::sync::{Arc, Mutex, OnceLock, PoisonError};

/// The cut-offs to go through.
pub(super) struct Plan {
    pub bands: usize,
    /// Levels to solve for.
    pub count: usize,
    pub mesh: Mesh,
    /// The cut of the search.
    pub cut: f64,
    /// Settle to this.
    pub tolerance: Option<f64>,
    pub solved: Solved,
}

impl Plan {
    /// A step of the mesh along each reciprocal vector.
    pub fn spacing(&self, dimension: usize) -> [f64; 3] {
        std::array::from_fn(|i| {
            if i < dimension {
                1.0 / self.mesh.size[i] as f64
            } else {
                0.0
            }
        })
    }
}

/// A point solved at one cut.
pub(super) struct Point {
    pub basis: Basis,
    pub levels: Levels,
    pub predictions: Vec<Prediction>,
}

type Key = ([i64; 3], u64);
type Slot = Arc<OnceLock<Result<Arc<Point>, Error>>>;

/// Points solved so far: many extrema share one.
///
/// *Invariant*: nothing that is done for a point shares work with other threads, or a thread that waits for one point
/// could be given another that waits for the first.
#[derive(Default)]
pub(super) struct Solved(Mutex<FxHashMap<Key, Slot>>);

impl Solved {
    /// A point, solved where it has not been.
    pub fn at(
        &self,
        waves: &Waves,
        k: [f64; 3],
        cut: f64,
        count: usize,
        budget: &Budget,
    ) -> Result<Arc<Point>, Error> {
        let key = (k.map(|x| (x * 1e11).round() as i64), cut.to_bits());
        let slot = Arc::clone(
            self.0
                .lock()
                .unwrap_or_else(PoisonError::into_inner)
                .entry(key)
                .or_default(),
        );
        slot.get_or_init(|| {
            let basis = waves.basis(k, cut);
            let levels = waves.solve_on(&basis, k, count, true, budget)?;
            let predictions = waves.predict(&levels, cut)?;
            Ok(Arc::new(Point {
                basis,
                levels,
                predictions,
            }))
        })
        .clone()
    }
}

impl Waves<'_> {
    /// The first cut and mesh.
    pub(super) fn plan(
        &self,
        bands: usize,
        tolerance: Option<f64>,
        budget: &Budget,
    ) -> Result<Plan, Error> {
        let d = self.frame.dimension;
        let quick = [80.0, 130.0, 180.0][d - 1];
        let cut = if tolerance.is_some() {
            let first = self.first_cut(bands, f64::INFINITY, budget)?;
            self.search_cut(bands, first, budget)?
        } else {
            self.first_cut(bands, quick, budget)?
        };
        let many = self.operations() >= 8;
        // Bands that need a large basis are narrow ones, which a coarse mesh resolves.
        let size = self.frame.expected(cut);
        let most = match d {
            1 => 48,
            2 if tolerance.is_none() || size > 200.0 => 12,
            2 => 24,
            _ if size > 300.0 => 4,
            _ if size > 170.0 || (tolerance.is_none() && !many) => 8,
            _ => 12,
        };
        Ok(Plan {
            bands,
            count: bands + 3,
            mesh: self.mesh(most),
            cut,
            tolerance,
            solved: Solved::default(),
        })
    }

    /// A cut with room above the wanted bands: enough waves, and kinetic energies above the potential's size; less of
    /// the latter where it would take more than `most` waves.
    pub(super) fn first_cut(&self, bands: usize, most: f64, budget: &Budget) -> Result<f64, Error> {
        let d = self.frame.dimension;
        let waves = 2.0 * (bands + 3) as f64 + [8.0, 16.0, 30.0][d - 1];
        let largest = budget.max_basis as f64 / 1.3;
        if waves > largest {
            return Err(Error::BudgetSpent);
        }
        let free = self.frame.cut_for((bands + 3) as f64);
        let wanted = self.frame.expected(free + 2.0 * self.swing).max(waves);
        Ok(self
            .frame
            .cut_for(wanted.min(most.max(1.5 * waves)).min(largest)))
    }

    /// The cut at which the zone is searched: what is left out is small beside the narrowest band, or the basis is no
    /// longer small.
    fn search_cut(&self, bands: usize, first: f64, budget: &Budget) -> Result<f64, Error> {
        let d = self.frame.dimension;
        let probes =
            [[0.0; 3], [0.5, 0.0, 0.0], [0.5; 3], [0.25, 0.125, 0.375]].map(|k| self.inside(k));
        // Predictions are better than the levels themselves by about ten; they are used where they are cheap.
        let fair = if self.few.is_some() { 0.1 } else { 0.02 };
        let largest = [120.0_f64, 300.0, 420.0][d - 1]
            .max(2.5 * bands as f64)
            .min(budget.max_basis as f64 / 1.3);
        let mut cut = first;
        for _ in 0..16 {
            let mut levels: Vec<Vec<Prediction>> = Vec::new();
            for k in probes {
                let solved = self.solve_on(&self.basis(k, cut), k, bands + 1, true, budget)?;
                levels.push(self.predict(&solved, cut)?);
            }
            let good = (0..=bands).all(|band| {
                let at = |f: &dyn Fn(&Prediction) -> f64| -> Vec<f64> {
                    levels.iter().filter_map(|l| l.get(band)).map(f).collect()
                };
                let (values, left_out) = (at(&|p| p.value), at(&|p| p.left_out));
                let high = values.iter().copied().fold(f64::NEG_INFINITY, f64::max);
                let low = values.iter().copied().fold(f64::INFINITY, f64::min);
                let worst = left_out.iter().copied().fold(0.0, f64::max);
                worst <= (fair * (high - low)).min(1e-3 * self.frame.unit())
            });
            let larger = self.frame.cut_for(1.4 * self.frame.expected(cut));
            if good || self.frame.expected(larger) > largest {
                break;
            }
            cut = larger;
        }
        Ok(cut)
    }
}
