//! The Fermi level: the zone's simplices refined until it settles.
//!
//! A coarse mesh is solved; between its points levels come from `nearby.rs`, and the simplices of `surface.rs` are divided
//! until the level E settles. What linear simplices leave is of second order in their size, so that two divisions give
//! E′ + (E′ − E)/3. The whole of that last term is stated as error, with what the one before leads one to expect, what
//! crossing bands may leave, how far levels between the mesh's points were from solves there, and what the cut-off left
//! uncertain. In one dimension whole meshes are compared instead.

use super::basis::Waves;
use super::lattice::dot;
use super::levels::Basis;
use super::mesh::Mesh;
use super::nearby::Nearby;
use super::settle::{Prediction, UNTRIED};
use super::states::{Filled, States};
use super::surface::{Corner, Surface};
use super::surroundings::{Piece, cell};
use super::{Budget, Error, Estimate, Levels};
use rayon::prelude::*;
use std::ops::Range;

/// A Fermi level.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Fermi {
    /// The level up to which states are filled; at a gap, its lower edge.
    pub level: Estimate,
    /// States per cell and unit of energy there, one state a level; its error is an estimate, not a bound, near
    /// singularities.
    pub density: Estimate,
    /// The sum of the filled levels' energies per cell.
    pub energy: Estimate,
    /// Whether the level is known as well as was asked for.
    pub settled: bool,
}

/// What bands that cross leave on simplices of this fineness, in the natural unit times its square, by dimension.
const CROSSING: [f64; 3] = [0.02, 1.0, 0.6];
/// Places looked at on the way to one level: about a second of one core.
const MOST_PLACES: usize = 250_000;
/// Levels farther than this below and above the Fermi level, in the natural unit, may count as far.
const CLEAR: [f64; 2] = [0.25, 0.12];
/// Solves that levels between the mesh's points are held against.
const CHECKS: usize = 10;

/// A mesh solved for levels in between.
struct Solved {
    mesh: Mesh,
    points: Vec<(Basis, Levels)>,
    /// Levels less what the cut leaves out, with their errors.
    known: Vec<Vec<Estimate>>,
    /// The energy of all filled states by the mesh's own simplices.
    energy: Estimate,
}

/// A level with what was made of it.
struct Closed {
    /// `None` where the mesh is too coarse to be worth it.
    fermi: Option<Fermi>,
    /// How far levels between the mesh's points were from solves.
    between: f64,
}

/// What is asked for.
#[derive(Clone, Copy)]
struct Wanted {
    levels: f64,
    tolerance: f64,
    cut: f64,
    /// The share of what the cut leaves out that is uncertain.
    share: f64,
}

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
        for size in sizes {
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

    /// The level from one mesh and the levels between its points; `None` where these are not to be had.
    fn closed_in(
        &self,
        size: usize,
        bands: &mut usize,
        wanted: Wanted,
        hasty: bool,
        budget: &Budget,
    ) -> Result<Option<Closed>, Error> {
        let Some((solved, mut guess)) = self.solved_for(size, bands, wanted, budget)? else {
            return Ok(None);
        };
        let radius = radius(&cell(&self.frame, solved.mesh.size)?);
        for _ in 0..4 {
            let ranges = solved
                .points
                .iter()
                .map(|(_, at)| self.kept(at, guess, radius));
            let Some(ranges) = ranges.collect::<Option<Vec<_>>>() else {
                return Ok(None);
            };
            let near: Option<Vec<Nearby>> = solved
                .points
                .par_iter()
                .zip(ranges)
                .map(|((basis, at), range)| {
                    self.nearby(basis, at, (range, guess), wanted.cut, budget)
                })
                .collect::<Result<_, Error>>()?;
            let Some(near) = near else {
                return Ok(None);
            };
            let surface = Surface::new(self, &solved.mesh, &near, guess)?;
            let first = surface.level(wanted.levels);
            // The levels are good near the guess only.
            if (first - guess).abs() > 0.3 * CLEAR[1] * self.frame.unit() {
                guess = first;
                continue;
            }
            let between =
                self.missed(&surface.corners(), &solved.mesh, guess, wanted.cut, budget)?;
            if hasty && between > 0.4 * wanted.tolerance {
                return Ok(Some(Closed {
                    fermi: None,
                    between,
                }));
            }
            let cut_off = solved.uncertain(guess, 0.2 * self.frame.unit());
            let mut fermi = self.divided(surface, wanted, guess, between + cut_off, budget)?;
            fermi.energy = solved.energy;
            fermi.energy.error += cut_off * wanted.levels.max(1.0);
            return Ok(Some(Closed {
                fermi: Some(fermi),
                between,
            }));
        }
        Ok(None)
    }

    /// A mesh solved with levels enough above the filling, and the level there by its own simplices; `None` where the
    /// levels do not reach far enough.
    fn solved_for(
        &self,
        size: usize,
        bands: &mut usize,
        wanted: Wanted,
        budget: &Budget,
    ) -> Result<Option<(Solved, f64)>, Error> {
        let mesh = self.mesh(size);
        let radius = radius(&cell(&self.frame, mesh.size)?);
        for _ in 0..5 {
            let points: Vec<(Basis, Levels)> = mesh
                .points
                .par_iter()
                .map(|k| {
                    let basis = self.basis(*k, wanted.cut);
                    let solved = self.solve_on(&basis, *k, *bands, true, budget)?;
                    Ok((basis, solved))
                })
                .collect::<Result<_, Error>>()?;
            let known: Vec<Vec<Estimate>> = points
                .par_iter()
                .map(|(_, at)| {
                    let known = self.predict(at, wanted.cut)?;
                    Ok(known.iter().map(|p| p.known_to(wanted.share)).collect())
                })
                .collect::<Result<_, Error>>()?;
            let energies: Vec<Vec<f64>> = known
                .iter()
                .map(|at| {
                    let mut energies: Vec<f64> = at.iter().map(|e| e.value).collect();
                    energies.sort_by(f64::total_cmp);
                    energies
                })
                .collect();
            let least = energies.iter().map(Vec::len).min().unwrap_or(0);
            if (least as f64) < wanted.levels {
                return Ok(None);
            }
            let filled = self
                .states_of(&mesh, &energies, least, Vec::new())?
                .fill(wanted.levels);
            if points
                .iter()
                .all(|(_, at)| self.kept(at, filled.level, radius).is_some())
            {
                let solved = Solved {
                    mesh,
                    points,
                    known,
                    energy: Estimate {
                        value: filled.energy,
                        error: filled.curved.abs(),
                    },
                };
                return Ok(Some((solved, filled.level)));
            }
            *bands += 4;
        }
        Ok(None)
    }

    /// The levels at a point that may come to an energy within `radius` of it; `None` where there may be more.
    fn kept(&self, at: &Levels, near: f64, radius: f64) -> Option<Range<usize>> {
        let [lower, upper] = CLEAR.map(|x| x * self.frame.unit());
        // A free particle's wave vector at that energy above the lowest potential, or so; it moves by the radius.
        let floor = self.mean - self.swing;
        let wave = (near - floor).max(0.0).sqrt();
        let high = floor + (wave + radius).powi(2) + upper;
        let low = floor + (wave - radius).max(0.0).powi(2) - lower;
        let gap = |count: usize| at.energies[count] - at.energies[count - 1];
        let end = (1..at.energies.len())
            .filter(|count| at.energies[*count] > high)
            .take(4)
            .max_by(|a, b| gap(*a).total_cmp(&gap(*b)).then(b.cmp(a)))?;
        let below = at.energies.iter().filter(|e| **e < low).count();
        let start = (1..=below.min(end))
            .rev()
            .filter(|count| *count < at.energies.len())
            .take(2)
            .max_by(|a, b| gap(*a).total_cmp(&gap(*b)).then(a.cmp(b)))
            .unwrap_or(0);
        Some(start..end)
    }

    /// How far the levels at cell corners near the guess are from solves there.
    fn missed(
        &self,
        corners: &[Corner],
        mesh: &Mesh,
        guess: f64,
        cut: f64,
        budget: &Budget,
    ) -> Result<f64, Error> {
        let unit = self.frame.unit();
        let close = 0.03 * unit;
        let nearest = |corner: &Corner| {
            corner
                .energies
                .iter()
                .map(|e| (e - guess).abs())
                .fold(f64::INFINITY, f64::min)
        };
        let mut order: Vec<(f64, [f64; 3], &Corner)> = corners
            .iter()
            .filter(|corner| corner.place != [0.0; 3])
            .map(|corner| {
                let moved = self.frame.off_axes(corner.place);
                let start = mesh.points[corner.point];
                let k = std::array::from_fn(|i| start[i] + moved[i]);
                (nearest(corner), k, corner)
            })
            .collect();
        order.sort_by(|a, b| a.0.total_cmp(&b.0));
        let mut chosen: Vec<(f64, [f64; 3], &Corner)> = Vec::new();
        for entry in order {
            if chosen.len() >= CHECKS {
                break;
            }
            if !chosen.iter().any(|other| self.same_point(other.1, entry.1)) {
                chosen.push(entry);
            }
        }
        let worst: Vec<f64> = chosen
            .par_iter()
            .map(|(nearest, k, corner)| {
                let count = corner.below + corner.energies.len() + 1;
                let at = self.solve_on(&self.basis(*k, cut), *k, count, true, budget)?;
                let mut exact: Vec<f64> = self.predict(&at, cut)?.iter().map(|p| p.value).collect();
                exact.sort_by(f64::total_cmp);
                let close = nearest.max(close) * (1.0 + 1e-9);
                let within = |e: f64| (e - guess).abs() <= close;
                // A level more or less on either side counts as wrong by how near it came.
                let mut worst = 0.0_f64;
                for (index, exact) in exact.iter().enumerate() {
                    let found = index
                        .checked_sub(corner.below)
                        .and_then(|index| corner.energies.get(index));
                    match found {
                        Some(found) if within(*found) || within(*exact) => {
                            worst = worst.max((exact - found).abs());
                        }
                        None if within(*exact) => worst = worst.max(close),
                        _ => {}
                    }
                }
                Ok(worst)
            })
            .collect::<Result<_, Error>>()?;
        // Errors of order q⁴ average over a cell to less than half of what they are at its corners.
        Ok(0.5 * worst.into_iter().fold(0.0, f64::max))
    }

    /// Divides the surface's simplices until the level settles; `known` is what else is uncertain.
    fn divided(
        &self,
        mut surface: Surface,
        wanted: Wanted,
        guess: f64,
        known: f64,
        budget: &Budget,
    ) -> Result<Fermi, Error> {
        let (unit, d) = (self.frame.unit(), self.frame.dimension);
        let first = surface.level(wanted.levels);
        let mut places = surface.places();
        surface.divide(budget)?;
        let mut level = surface.level(wanted.levels);
        let mut before = (first - guess).abs();
        let mut change = level - first;
        let mut density: Option<Estimate> = None;
        loop {
            let crossing = CROSSING[d - 1] * unit / surface.fineness().powi(2);
            let width = 2.0 * change.abs() + 2.0 * crossing;
            let window = (level - width, level + width);
            let states = surface.crossed(window).states;
            let smooth = states.density_within(level, 0.5 * width);
            let point = states.density(level);
            let apart = density.map_or(smooth, |coarser| (smooth - coarser.value).abs());
            density = Some(Estimate {
                value: smooth,
                error: apart + (smooth - point).abs(),
            });
            let open = (change.abs() + 0.25 * before) / 3.0 + crossing;
            let error = open + known + 1e-13 * unit;
            let found = Fermi {
                level: Estimate {
                    value: level + change / 3.0,
                    error,
                },
                density: density.unwrap_or_default(),
                energy: Estimate::default(),
                settled: error <= wanted.tolerance,
            };
            let grown = surface.places() - places;
            places = surface.places();
            // What is uncertain otherwise sets how far it is worth going.
            let enough = found.settled || open < 0.1 * known;
            if enough || places + (1 << (d - 1)) * grown > MOST_PLACES {
                return Ok(found);
            }
            surface.prune(window);
            surface.divide(budget)?;
            let crossed = surface.crossed(window);
            let next = crossed.states.fill_from(wanted.levels, crossed.filled);
            // Outside the window nothing is known: what was found stands.
            if (next - level).abs() > 0.9 * width {
                return Ok(found);
            }
            (before, change, level) = (change.abs(), next - level, next);
        }
    }
}

impl Solved {
    /// The largest error of a level this near the Fermi level.
    fn uncertain(&self, level: f64, near: f64) -> f64 {
        let all = || self.known.iter().flatten();
        all()
            .filter(|e| (e.value - level).abs() <= near)
            .map(|e| e.error)
            .fold(0.0, f64::max)
    }
}

/// The largest distance of a corner from the middle.
fn radius(cell: &[Piece]) -> f64 {
    cell.iter()
        .flat_map(|piece| piece.corners)
        .map(|corner| dot(corner, corner).sqrt())
        .fold(0.0, f64::max)
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
