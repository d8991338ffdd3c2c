//! The Fermi level: the zone's simplices refined until it settles.
//!
//! A coarse mesh is solved; between its points levels come from `nearby.rs`, and the simplices of `surface.rs` are divided
//! until the level E settles. What linear simplices leave is of second order in their size, so that two divisions give
//! E′ + (E′ − E)/3. The whole of that last term is stated as error, with what the one before leads one to expect, what
//! crossing bands may leave, how far levels between the mesh's points were from solves there, and what the cut-off left
//! uncertain. In one dimension whole meshes are compared instead.

use super::basis::Waves;
use super::levels::Basis;
use super::mesh::Mesh;
use super::nearby::Nearby;
use super::settle::{Prediction, UNTRIED};
use super::states::{Filled, States};
use super::surface::{Corner, Surface};
use super::{Budget, Error, Estimate, Levels};
use rayon::prelude::*;

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
/// Levels this far above the Fermi level, in the natural unit, may count as far.
const CLEAR: f64 = 0.12;
/// Solves that levels between the mesh's points are held against.
const CHECKS: usize = 10;

/// A mesh solved for levels in between.
struct Solved {
    mesh: Mesh,
    points: Vec<(Basis, Levels)>,
    /// Levels less what the cut leaves out, with their errors.
    known: Vec<Vec<Estimate>>,
}

/// A level with what was made of it.
struct Closed {
    fermi: Fermi,
    /// How far levels between the mesh's points were from solves.
    between: f64,
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
        let mut best: Option<Closed> = None;
        for size in sizes {
            let found = match self.closed_in(levels, *size, tolerance, (cut, share), budget) {
                Err(Error::BudgetSpent) if best.is_some() => break,
                other => other?,
            };
            let Some(found) = found else {
                continue;
            };
            let better = best
                .as_ref()
                .is_none_or(|other| found.fermi.level.error < other.fermi.level.error);
            // A finer mesh helps only where the levels in between were what is uncertain.
            let done = found.fermi.settled || found.between < 0.2 * found.fermi.level.error;
            if better {
                best = Some(found);
            }
            if done {
                break;
            }
        }
        best.map(|found| found.fermi).ok_or(Error::BudgetSpent)
    }

    /// The level from one mesh and the levels between its points; `None` where these are not to be had.
    fn closed_in(
        &self,
        levels: f64,
        size: usize,
        tolerance: f64,
        (cut, share): (f64, f64),
        budget: &Budget,
    ) -> Result<Option<Closed>, Error> {
        let Some((solved, guess, counts)) = self.solved_for(levels, size, (cut, share), budget)?
        else {
            return Ok(None);
        };
        let near: Option<Vec<Nearby>> = solved
            .points
            .par_iter()
            .zip(&counts)
            .map(|((basis, at), count)| self.nearby(basis, at, (*count, guess), cut, budget))
            .collect::<Result<_, Error>>()?;
        let Some(near) = near else {
            return Ok(None);
        };
        let surface = Surface::new(self, &solved.mesh, &near, guess)?;
        let between = self.missed(&surface.corners(), &solved.mesh, guess, cut, budget)?;
        let cut_off = solved.uncertain(guess, 0.2 * self.frame.unit());
        let fermi = self.divided(surface, levels, guess, tolerance, between + cut_off, budget)?;
        Ok(Some(Closed { fermi, between }))
    }

    /// A mesh solved with levels enough above the filling, the level there by its own simplices, and for each point how
    /// many levels are to be kept apart from all above; `None` where they cannot be.
    #[allow(clippy::type_complexity)]
    fn solved_for(
        &self,
        levels: f64,
        size: usize,
        (cut, share): (f64, f64),
        budget: &Budget,
    ) -> Result<Option<(Solved, f64, Vec<usize>)>, Error> {
        let clear = CLEAR * self.frame.unit();
        let mut bands = levels.ceil() as usize + [2, 4, 6][self.frame.dimension - 1];
        for _ in 0..4 {
            let mesh = self.mesh(size);
            let points: Vec<(Basis, Levels)> = mesh
                .points
                .par_iter()
                .map(|k| {
                    let basis = self.basis(*k, cut);
                    let solved = self.solve_on(&basis, *k, bands, true, budget)?;
                    Ok((basis, solved))
                })
                .collect::<Result<_, Error>>()?;
            let known: Vec<Vec<Estimate>> = points
                .par_iter()
                .map(|(_, at)| {
                    let known = self.predict(at, cut)?;
                    Ok(known.iter().map(|p| p.known_to(share)).collect())
                })
                .collect::<Result<_, Error>>()?;
            let least = known.iter().map(Vec::len).min().unwrap_or(0);
            let energies: Vec<Vec<f64>> = known
                .iter()
                .map(|at| {
                    let mut energies: Vec<f64> = at.iter().map(|e| e.value).collect();
                    energies.sort_by(f64::total_cmp);
                    energies
                })
                .collect();
            let guess = self
                .states_of(&mesh, &energies, least, Vec::new())?
                .fill(levels.min(least as f64))
                .level;
            let counts: Option<Vec<usize>> = points
                .iter()
                .map(|(_, at)| kept(&at.energies, guess + clear))
                .collect();
            let solved = Solved {
                mesh,
                points,
                known,
            };
            match counts {
                Some(counts) => return Ok(Some((solved, guess, counts))),
                None => bands += 4,
            }
        }
        Ok(None)
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
                let count = corner.energies.len();
                let at = self.solve_on(&self.basis(*k, cut), *k, count, true, budget)?;
                let mut exact: Vec<f64> = self.predict(&at, cut)?.iter().map(|p| p.value).collect();
                exact.sort_by(f64::total_cmp);
                let close = nearest.max(0.03 * unit) * (1.0 + 1e-9);
                let rows = exact.iter().zip(&corner.energies);
                Ok(rows
                    .filter(|(_, e)| (**e - guess).abs() <= close)
                    .map(|(exact, e)| (exact - e).abs())
                    .fold(0.0, f64::max))
            })
            .collect::<Result<_, Error>>()?;
        Ok(worst.into_iter().fold(0.0, f64::max))
    }

    /// Divides the surface's simplices until the level settles; `known` is what else is uncertain.
    fn divided(
        &self,
        mut surface: Surface,
        levels: f64,
        guess: f64,
        tolerance: f64,
        known: f64,
        budget: &Budget,
    ) -> Result<Fermi, Error> {
        let (unit, d) = (self.frame.unit(), self.frame.dimension);
        let everything = (f64::NEG_INFINITY, f64::INFINITY);
        // Twice without leaving anything out, for the energy of all filled states.
        let first = surface.crossed(everything).states.fill(levels);
        let mut places = surface.places();
        surface.divide(budget)?;
        let states = surface.crossed(everything).states;
        let second = states.fill(levels);
        let mut found = self.refined(&second, &first, 2.0, known, levels);
        let mut before = (first.level - guess).abs();
        let mut change = second.level - first.level;
        let mut level = second.level;
        let mut smooth = second.density.value;
        loop {
            let crossing = CROSSING[d - 1] * unit / surface.fineness().powi(2);
            found.level = Estimate {
                value: level + change / 3.0,
                error: (change.abs() + 0.25 * before) / 3.0 + crossing + known + 1e-13 * unit,
            };
            found.settled = found.level.error <= tolerance;
            let grown = surface.places() - places;
            places = surface.places();
            // What is known otherwise sets how far it is worth going.
            let good = (change.abs() + 0.25 * before) / 3.0 + crossing < 0.1 * known;
            if found.settled || good || places + (1 << (d - 1)) * grown > MOST_PLACES {
                return Ok(found);
            }
            let width = 2.0 * change.abs() + 2.0 * crossing;
            let window = (level - width, level + width);
            surface.prune(window);
            surface.divide(budget)?;
            let crossed = surface.crossed(window);
            let next = crossed.states.fill_from(levels, crossed.filled);
            // Outside the window nothing is known: what was found stands.
            if (next - level).abs() > 0.9 * width {
                return Ok(found);
            }
            let denser = crossed.states.density_within(next, 0.5 * width);
            found.density = Estimate {
                value: denser,
                error: (denser - smooth).abs() + (denser - crossed.states.density(next)).abs(),
            };
            smooth = denser;
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

/// How many of these levels to keep, the first left out being above `clear` and as far from the last kept as may be.
fn kept(energies: &[f64], clear: f64) -> Option<usize> {
    (1..energies.len())
        .filter(|count| energies[*count] > clear)
        .max_by(|a, b| {
            let gap = |count: usize| energies[count] - energies[count - 1];
            gap(*a).total_cmp(&gap(*b)).then(b.cmp(a))
        })
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
