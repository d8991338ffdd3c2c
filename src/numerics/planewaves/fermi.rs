//! The Fermi level: the zone's simplices refined until it settles.
//!
//! A coarse mesh is solved; between its points levels come from `nearby.rs`, and the simplices of `surface.rs` are divided
//! until the level E settles. What linear simplices leave is of second order in their size, so that two divisions give
//! E′ + (E′ − E)/3. The whole of that last term is stated as error, with what the one before leads one to expect, what
//! crossing bands may leave, how far levels between the mesh's points were from solves there, and what the cut-off left
//! uncertain. In one dimension whole meshes are compared instead.

use super::basis::Waves;
use super::closing::Wanted;
use super::settle::{Prediction, UNTRIED};
use super::states::{Filled, States};
use super::{Budget, Error, Estimate};
use rayon::prelude::*;

/// A Fermi level.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Fermi {
    /// The level up to which states are filled; at a gap, its lower edge.
    pub level: Estimate,
    /// States per cell and unit of energy there, one state a level; its error is an estimate, not a bound, near
    /// singularities.
    pub density: Estimate,
    /// The sum of the filled levels' energies per cell, by the coarse mesh alone: known less well than the level.
    pub energy: Estimate,
    /// Whether the level is known as well as was asked for.
    pub settled: bool,
}

/// What bands that cross leave on simplices of this fineness, in the natural unit times its square, by dimension.
pub(super) const CROSSING: [f64; 3] = [0.02, 1.0, 0.6];

/// Points that symmetry does not make equal in the finest mesh.
const MOST_POINTS: usize = 2500;

impl Waves<'_> {
    /// The Fermi level at which `levels` levels per cell are filled (particles over the states a level holds; it need
    /// not be whole). For whole bands with a gap above, this is the gap's lower edge.
    ///
    /// # Errors
    /// `NotFinite` where `levels` is not positive; `BudgetSpent` where not even the first mesh fits; `Cancelled`.
    pub fn fermi(&self, levels: f64, tolerance: f64, budget: &Budget) -> Result<Fermi, Error> {
        if !(levels > 0.0 && levels < 1e4 && tolerance > 0.0 && tolerance.is_finite()) {
            return Err(Error::NotFinite);
        }
        let (cut, share) = self.cut_for_states(levels, tolerance, budget)?;
        if self.frame.dimension == 1 {
            return self.fermi_of_chain(levels, tolerance, (cut, share), budget);
        }
        let sizes: &[usize] = match self.frame.dimension {
            2 => &[8, 12, 16, 24, 32, 48],
            _ => &[6, 8, 12, 16, 24],
        };
        let wanted = Wanted {
            levels,
            tolerance,
            cut,
            share,
        };
        let mut bands = levels.ceil() as usize + [2, 4, 6][self.frame.dimension - 1];
        let mut best: Option<Fermi> = None;
        let mut passed: Option<usize> = None;
        let most = MOST_POINTS * self.operations();
        let few = |size: &&usize| size.pow(self.frame.dimension as u32) <= most;
        let sizes: Vec<usize> = sizes.iter().take_while(few).copied().collect();
        for size in &sizes {
            let last = sizes.last() == Some(size);
            let found = match self.closed_in(*size, &mut bands, wanted, !last, budget) {
                Err(Error::BudgetSpent) if best.is_some() || passed.is_some() => break,
                other => other?,
            };
            let Some(found) = found else {
                continue;
            };
            let Some(fermi) = found.fermi else {
                passed = Some(*size);
                continue;
            };
            passed = None;
            // A finer mesh helps only where the levels in between were what is uncertain.
            let done = fermi.settled || found.between < 0.2 * fermi.level.error;
            if best.is_none_or(|other| fermi.level.error < other.level.error) {
                best = Some(fermi);
            }
            if done {
                break;
            }
        }
        if let Some(size) = passed {
            // The work allowed did not reach further: that mesh it must be.
            let budget = Budget::new(budget.cancelled, budget.max_basis, usize::MAX);
            let found = self.closed_in(size, &mut bands, wanted, false, &budget)?;
            best = best.or(found.and_then(|found| found.fermi));
        }
        best.ok_or(Error::BudgetSpent)
    }
}

impl Waves<'_> {
    /// The level in one dimension, by meshes refined until it settles.
    fn fermi_of_chain(
        &self,
        levels: f64,
        tolerance: f64,
        (cut, share): (f64, f64),
        budget: &Budget,
    ) -> Result<Fermi, Error> {
        let mut last: Option<(f64, Filled)> = None;
        let mut before = 0.0;
        let mut best: Option<Fermi> = None;
        for size in [24_usize, 48, 96, 192, 384, 768] {
            let states = match self.enough_states(levels, size, cut, share, budget) {
                Err(Error::BudgetSpent) if best.is_some() => break,
                other => other?,
            };
            let filled = states.fill(levels);
            let cut_off = states.error_below(levels);
            if let Some((coarser, lower)) = last {
                let ratio = size as f64 / coarser;
                let mut found = self.refined(&filled, &lower, ratio, cut_off, levels);
                let change = (filled.level - lower.level).abs() / (ratio * ratio - 1.0);
                // Two meshes may agree by chance: what the last change promises counts too.
                let crossing = CROSSING[0] * self.frame.unit() / (size * size) as f64;
                found.level.error += before / (ratio * ratio) + crossing;
                before = change;
                let settled = found.level.error <= tolerance;
                best = Some(Fermi { settled, ..found });
                if settled {
                    break;
                }
            }
            last = Some((size as f64, filled));
        }
        best.ok_or(Error::BudgetSpent)
    }

    /// What two meshes tell, `finer` with `ratio` times the points along an edge of `coarser`.
    fn refined(
        &self,
        finer: &Filled,
        coarser: &Filled,
        ratio: f64,
        cut_off: f64,
        levels: f64,
    ) -> Fermi {
        let change = (finer.level - coarser.level) / (ratio * ratio - 1.0);
        // Blöchl's correction has taken the second order off the energy. Two meshes may agree by chance, so a quarter of
        // that correction counts too.
        let energy_change = (finer.energy - coarser.energy).abs() + 0.25 * finer.curved.abs();
        Fermi {
            level: Estimate {
                value: finer.level + change,
                error: change.abs() + cut_off + 1e-13 * self.frame.unit(),
            },
            density: Estimate {
                value: finer.density.value,
                error: finer.density.error + (finer.density.value - coarser.density.value).abs(),
            },
            energy: Estimate {
                value: finer.energy,
                error: energy_change + cut_off * levels.max(1.0),
            },
            settled: false,
        }
    }

    /// A cut at which the levels up to the filling are known to half the tolerance, or the largest that is affordable,
    /// and the share of what it leaves out that is uncertain: twice the worst by which predictions at some points fail
    /// a larger cut's.
    fn cut_for_states(
        &self,
        levels: f64,
        tolerance: f64,
        budget: &Budget,
    ) -> Result<(f64, f64), Error> {
        let bands = levels.ceil() as usize + 2;
        let largest = (budget.max_basis as f64 / 1.3)
            .min([200.0_f64, 500.0, 400.0][self.frame.dimension - 1].max(2.5 * bands as f64));
        let mut cut = self.first_cut(bands, f64::INFINITY, budget)?;
        let mut here = self.probed(bands, cut, budget)?;
        loop {
            let larger = self.frame.cut_for(1.5 * self.frame.expected(cut));
            if self.frame.expected(larger) > largest {
                return Ok((cut, UNTRIED));
            }
            let there = self.probed(bands, larger, budget)?;
            let (mut worst, mut share) = (0.0_f64, 0.0_f64);
            for (lower, upper) in here.iter().zip(&there) {
                let miss = (lower.value - upper.value).abs() + upper.judged_by(Some(lower)).error;
                worst = worst.max(2.0 * miss);
                share = share.max(2.0 * miss / lower.left_out.max(lower.rounding));
            }
            if worst <= 0.5 * tolerance {
                return Ok((cut, share.max(0.05)));
            }
            (cut, here) = (larger, there);
        }
    }

    /// Predictions for the lowest levels at some points of the zone, one after another.
    fn probed(&self, bands: usize, cut: f64, budget: &Budget) -> Result<Vec<Prediction>, Error> {
        let probes = [
            [0.0; 3],
            [0.5, 0.0, 0.0],
            [0.5; 3],
            [0.25, 0.125, 0.375],
            [0.375, 0.25, -0.125],
        ];
        let solved: Vec<Vec<Prediction>> = probes
            .par_iter()
            .map(|k| {
                let k = self.inside(*k);
                let levels = self.solve_on(&self.basis(k, cut), k, bands, true, budget)?;
                self.predict(&levels, cut)
            })
            .collect::<Result<_, Error>>()?;
        Ok(solved.into_iter().flatten().collect())
    }

    /// States with so many bands that the filling ends below the top of the last.
    fn enough_states(
        &self,
        levels: f64,
        size: usize,
        cut: f64,
        share: f64,
        budget: &Budget,
    ) -> Result<States, Error> {
        let mut bands = levels.ceil() as usize + 1;
        for _ in 0..6 {
            let states = self.states_known(bands, size, (cut, share), budget)?;
            let level = states.fill(levels).level;
            // The first band left out may begin below the last one's top, not below its own bottom.
            let deepest = states
                .simplices
                .iter()
                .skip(bands - 1)
                .step_by(bands)
                .map(|(corner, _)| corner[0])
                .fold(f64::INFINITY, f64::min);
            if level <= deepest {
                return Ok(states);
            }
            bands += 2;
        }
        Err(Error::BudgetSpent)
    }
}
