//! The Fermi level from one coarse mesh: solved, and closed in on between its points.
//!
//! Levels at a point are kept apart from others by how far a free particle's energy changes within the point's cell: none
//! of those left out may come to the Fermi level there. How well levels in between are known is found by solves at corners
//! of the cells, where they are worst. See `fermi.rs` for what is made of it.

use super::basis::Waves;
use super::fermi::{CROSSING, Fermi};
use super::lattice::dot;
use super::levels::Basis;
use super::mesh::Mesh;
use super::nearby::Nearby;
use super::surface::{Corner, Surface};
use super::surroundings::{Piece, cell};
use super::{Budget, Error, Estimate, Levels};
use rayon::prelude::*;
use std::ops::Range;

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
pub(super) struct Closed {
    /// `None` where the mesh is too coarse to be worth it.
    pub fermi: Option<Fermi>,
    /// How far levels between the mesh's points were from solves.
    pub between: f64,
}

/// What is asked for.
#[derive(Clone, Copy)]
pub(super) struct Wanted {
    /// Levels filled per cell.
    pub levels: f64,
    pub tolerance: f64,
    pub cut: f64,
    /// The share of what the cut leaves out that is uncertain.
    pub share: f64,
}

impl Waves<'_> {
    /// The level from one mesh and the levels between its points; `None` where these are not to be had.
    pub(super) fn closed_in(
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
            let surface = Surface::new(self, &solved.mesh, &near, guess, budget)?;
            let first = surface.level(wanted.levels);
            // The levels are good near the guess only.
            if (first - guess).abs() > 0.3 * CLEAR[1] * self.frame.unit() {
                guess = first;
                continue;
            }
            let between =
                self.missed(&surface.corners(), &solved.mesh, guess, wanted.cut, budget)?;
            let cut_off = solved.uncertain(guess, 0.2 * self.frame.unit());
            // A finer mesh helps where the levels in between are what is most uncertain.
            let reached = self.reached(&surface);
            if hasty && between > 0.4 * wanted.tolerance.max(cut_off).max(reached) {
                return Ok(Some(Closed {
                    fermi: None,
                    between,
                }));
            }
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
            let points = self.solved_on(&mesh, *bands, wanted.cut, budget)?;
            let known: Vec<Vec<Estimate>> = points
                .par_iter()
                .map(|(_, at)| {
                    let known = self.predict(at, wanted.cut)?;
                    Ok(known.iter().map(|p| p.known_to(wanted.share)).collect())
                })
                .collect::<Result<_, Error>>()?;
            let energies: Vec<Vec<f64>> = known
                .iter()
                .map(|at| rising(at.iter().map(|e| e.value)))
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

    /// Every irreducible point of a mesh with its basis and its lowest levels.
    pub(super) fn solved_on(
        &self,
        mesh: &Mesh,
        bands: usize,
        cut: f64,
        budget: &Budget,
    ) -> Result<Vec<(Basis, Levels)>, Error> {
        mesh.points
            .par_iter()
            .map(|k| {
                let basis = self.basis(*k, cut);
                let solved = self.solve_on(&basis, *k, bands, true, budget)?;
                Ok((basis, solved))
            })
            .collect()
    }

    /// What the divisions that are worth it will leave uncertain, or so.
    fn reached(&self, surface: &Surface) -> f64 {
        let d = self.frame.dimension;
        let more = MOST_PLACES as f64 / surface.places() as f64;
        let finest = surface.fineness() * more.powf(1.0 / (d - 1) as f64);
        2.0 * CROSSING[d - 1] * self.frame.unit() / finest.powi(2)
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
        let close = 0.03 * self.frame.unit();
        let chosen = self.nearest_to(guess, corners, mesh);
        let worst: Vec<f64> = chosen
            .par_iter()
            .map(|(nearest, k, corner)| {
                let count = corner.below + corner.energies.len() + 1;
                let at = self.solve_on(&self.basis(*k, cut), *k, count, true, budget)?;
                let exact = rising(self.predict(&at, cut)?.iter().map(|p| p.value));
                Ok(corner.wrong_by(&exact, guess, nearest.max(close) * (1.0 + 1e-9)))
            })
            .collect::<Result<_, Error>>()?;
        // Errors of order q⁴ average over a cell to less than half of what they are at its corners.
        Ok(0.5 * worst.into_iter().fold(0.0, f64::max))
    }

    /// A few corners that symmetry does not make equal, with the levels nearest to an energy: how near, and where.
    fn nearest_to<'c>(
        &self,
        energy: f64,
        corners: &'c [Corner],
        mesh: &Mesh,
    ) -> Vec<(f64, [f64; 3], &'c Corner)> {
        let mut order: Vec<(f64, [f64; 3], &Corner)> = corners
            .iter()
            .filter(|corner| corner.place != [0.0; 3])
            .map(|corner| {
                let apart = corner.energies.iter().map(|e| (e - energy).abs());
                let moved = self.frame.off_axes(corner.place);
                let start = mesh.points[corner.point];
                let k = std::array::from_fn(|i| start[i] + moved[i]);
                (apart.fold(f64::INFINITY, f64::min), k, corner)
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
        chosen
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

impl Corner {
    /// How far its levels within `close` of an energy are from these; one more or less on either side counts as wrong by
    /// all of that.
    fn wrong_by(&self, exact: &[f64], energy: f64, close: f64) -> f64 {
        let within = |e: f64| (e - energy).abs() <= close;
        let mut worst = 0.0_f64;
        for (index, exact) in exact.iter().enumerate() {
            let found = index.checked_sub(self.below);
            match found.and_then(|index| self.energies.get(index)) {
                Some(found) if within(*found) || within(*exact) => {
                    worst = worst.max((exact - found).abs());
                }
                None if within(*exact) => worst = worst.max(close),
                _ => {}
            }
        }
        worst
    }
}

/// Sorted.
pub(super) fn rising(energies: impl Iterator<Item = f64>) -> Vec<f64> {
    let mut energies: Vec<f64> = energies.collect();
    energies.sort_by(f64::total_cmp);
    energies
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
