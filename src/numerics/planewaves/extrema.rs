//! Extrema of bands over the whole zone.
//!
//! Every point of a mesh that is no higher than its neighbours starts a search (`f` below is the energy, its negative
//! for a top, or the separation of two bands). Where the levels involved are simple the search is Newton's, with the
//! exact slopes of `slopes.rs`: steps along the principal axes by |curvature|, so that saddles are left. At crossings
//! `f` has creases, and the search of `crease.rs` is used instead. A symmetric point that is lower than every direction
//! from it at several scales is taken as it is.
//!
//! Failure mode: an extremum whose basin lies wholly between mesh points is not seen.

use super::basis::Waves;
use super::lattice::dot;
use super::levels::Basis;
use super::mesh::Mesh;
use super::slopes::{Tensor, principal};
use super::symmetry::rotate_real;
use super::{Budget, Error, Levels};

/// What is looked for.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Kind {
    /// The lowest energy of the band.
    Bottom,
    /// The highest.
    Top,
    /// The least distance to the next band.
    Separation,
}

/// An extremum looked for; `band` counts from zero.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) struct Target {
    pub kind: Kind,
    pub band: usize,
}

/// How an extremum was found.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) enum Seat {
    /// At a point from which every direction leads up.
    Pinned,
    /// Where the slope vanishes.
    Smooth,
    /// On a crease, to within this much of `f`.
    Creased(f64),
}

/// An extremum found.
#[derive(Clone, Copy, Debug)]
pub(super) struct Spot {
    pub k: [f64; 3],
    /// The function, to be made least.
    pub value: f64,
    pub seat: Seat,
}

impl Target {
    /// The function to be made least.
    pub fn value(&self, energies: &[f64]) -> f64 {
        let at = |band: usize| energies.get(band).copied().unwrap_or(f64::NAN);
        match self.kind {
            Kind::Bottom => at(self.band),
            Kind::Top => -at(self.band),
            Kind::Separation => at(self.band + 1) - at(self.band),
        }
    }

    /// The levels involved, with their signs.
    pub fn levels(&self) -> Vec<(usize, f64)> {
        match self.kind {
            Kind::Bottom => vec![(self.band, 1.0)],
            Kind::Top => vec![(self.band, -1.0)],
            Kind::Separation => vec![(self.band + 1, 1.0), (self.band, -1.0)],
        }
    }

    /// Whether the levels involved stand apart from all others.
    pub fn simple(&self, energies: &[f64], apart: f64) -> bool {
        self.levels()
            .iter()
            .all(|(level, _)| distance(energies, *level) > apart)
    }
}

/// The distance from a level to the nearest other one.
pub(super) fn distance(energies: &[f64], level: usize) -> f64 {
    let to = |other: usize| {
        energies
            .get(other)
            .map_or(f64::INFINITY, |e| (e - energies[level]).abs())
    };
    to(level + 1).min(if level > 0 {
        to(level - 1)
    } else {
        f64::INFINITY
    })
}

/// What may be left to go, in the natural unit, where a search went on and on.
pub(super) const WANDERING: f64 = 1e-2;
/// A search that ends this many steps of the mesh from its basis's centre goes on from there: one step of its own may be
/// half as long.
const FAR: f64 = 0.9;
/// Levels closer than this share of the natural unit are searched as crossings.
const APART: f64 = 1e-5;
/// Differences below this share of the natural unit are rounding.
const ROUNDING: f64 = 1e-13;

/// A search on one basis, which must not be left behind: it serves only near where it is centred.
#[derive(Clone)]
pub(super) struct Search<'w, 'a> {
    pub waves: &'w Waves<'a>,
    pub target: Target,
    pub basis: Basis,
    /// Where the basis is centred.
    pub centre: [f64; 3],
    /// Its cut.
    pub cut: f64,
    /// Levels to solve for.
    pub count: usize,
    /// A step of the mesh along each reciprocal vector.
    pub spacing: [f64; 3],
    pub budget: &'w Budget<'a>,
}

impl Search<'_, '_> {
    pub(super) fn unit(&self) -> f64 {
        self.waves.frame.unit()
    }

    fn solve(&self, k: [f64; 3], vectors: bool) -> Result<Levels, Error> {
        self.waves
            .solve_on(&self.basis, k, self.count, vectors, self.budget)
    }

    /// The slope and curvature of the function at a solved point.
    pub fn slopes(&self, levels: &Levels) -> Result<([f64; 3], Tensor), Error> {
        let mut slope = [0.0; 3];
        let mut curvature = [[0.0; 3]; 3];
        for (level, sign) in self.target.levels() {
            let velocity = self.waves.velocity(levels, level);
            let tensor = self
                .waves
                .curvature(&self.basis, levels, level, self.budget)?;
            for x in 0..3 {
                slope[x] += sign * velocity[x];
                for y in 0..3 {
                    curvature[x][y] += sign * tensor[x][y];
                }
            }
        }
        Ok((slope, curvature))
    }

    /// The extremum that a start leads to.
    pub fn run(&self, start: [f64; 3]) -> Result<Spot, Error> {
        let mut search = self.clone();
        let mut last: Option<Spot> = None;
        let mut k = start;
        // A crossing may lie on the way, or the way may lead off this basis, so searches take turns, a few times.
        for _ in 0..8 {
            if search.strayed(k, FAR) {
                search.basis = self.waves.basis(k, self.cut);
                search.centre = k;
                // Levels of another basis are not to be compared.
                last = None;
            }
            let levels = search.solve(k, true)?;
            let value = self.target.value(&levels.energies);
            // Levels that coincide cannot come nearer.
            if self.target.kind == Kind::Separation && value <= 100.0 * ROUNDING * self.unit() {
                return Ok(Spot {
                    k,
                    value,
                    seat: Seat::Pinned,
                });
            }
            if search.simple(&levels) {
                match search.newton(levels)? {
                    Ok(spot) => return Ok(spot),
                    Err(left) => k = left,
                }
                if search.drifted(k) {
                    continue;
                }
            }
            let spot = search.creep(k)?;
            let ends = search.solve(spot.k, false)?;
            let done = spot.seat == Seat::Pinned || !search.simple(&ends);
            let stuck = last.is_some_and(|last| spot.value >= last.value - ROUNDING * self.unit());
            last = Some(spot);
            // A search over creases ends where its next step would leave the basis: it may not be there yet.
            if (done || stuck) && !search.strayed(spot.k, FAR) {
                return Ok(spot);
            }
            k = spot.k;
        }
        // It went on and on: what is left to go is not known.
        let wandering = Seat::Creased(WANDERING * self.unit());
        let value = self.target.value(&search.solve(k, false)?.energies);
        Ok(Spot {
            k,
            value,
            seat: wandering,
        })
    }

    fn simple(&self, levels: &Levels) -> bool {
        self.target.simple(&levels.energies, APART * self.unit())
    }

    /// Whether a wave vector is farther from the basis's centre than a step of the mesh and a half.
    pub(super) fn drifted(&self, k: [f64; 3]) -> bool {
        self.strayed(k, 1.5)
    }

    /// The same for so many steps.
    fn strayed(&self, k: [f64; 3], steps: f64) -> bool {
        (0..3).any(|i| (k[i] - self.centre[i]).abs() > steps * self.spacing[i] + 1e-12)
    }

    /// Newton's search; the inner error is where it met a crossing, left the basis, or did not settle.
    fn newton(&self, start: Levels) -> Result<Result<Spot, [f64; 3]>, Error> {
        let frame = &self.waves.frame;
        let unit = self.unit();
        let limit = (0..3)
            .map(|i| {
                self.spacing[i]
                    * super::lattice::dot(frame.reciprocal[i], frame.reciprocal[i]).sqrt()
            })
            .fold(0.0, f64::max);
        let mut levels = start;
        for _ in 0..24 {
            let value = self.target.value(&levels.energies);
            let spot = Spot {
                k: levels.k,
                value,
                seat: Seat::Smooth,
            };
            let (slope, curvature) = self.slopes(&levels)?;
            let step = descent(&slope, &curvature, frame.dimension, limit);
            if step.gain <= ROUNDING * unit && !step.saddle {
                return Ok(Ok(spot));
            }
            let mut better = None;
            for halving in 0..8 {
                let share = 0.5f64.powi(halving);
                let moved = frame.off_axes(step.parts.map(|x| x * share));
                let tries = if step.saddle {
                    vec![1.0, -1.0]
                } else {
                    vec![1.0]
                };
                for sign in tries {
                    let k = std::array::from_fn(|i| levels.k[i] + sign * moved[i]);
                    let tried = self.solve(k, true)?;
                    if self.target.value(&tried.energies) < value - 0.01 * ROUNDING * unit {
                        better = Some(tried);
                        break;
                    }
                }
                if better.is_some() {
                    break;
                }
            }
            let Some(next) = better else {
                // No way down although the slope promises one: a crossing is near.
                let flat = step.gain <= 1e-9 * unit;
                return Ok(if flat { Ok(spot) } else { Err(spot.k) });
            };
            if !self.simple(&next) || self.drifted(next.k) {
                return Ok(Err(next.k));
            }
            levels = next;
        }
        Ok(Err(levels.k))
    }

    /// Where a start is higher than some point around it at several scales, the search over creases from the lowest of
    /// these; else the start, which is pinned. Only points that symmetry singles out are taken to be pinned: elsewhere
    /// the way down may be narrower than any choice of directions.
    fn creep(&self, start: [f64; 3]) -> Result<Spot, Error> {
        // Well above the rounding of a level, or noise would lead the search about.
        let floor = 10.0 * ROUNDING * self.unit();
        let value = self.target.value(&self.solve(start, false)?.energies);
        if !self.waves.symmetry.singles_out(start) {
            return self.crease(start);
        }
        let mut directions = self.directions(start);
        directions.extend(self.along_creases(start)?);
        for step in [0.5, 0.125, 0.031_25, 0.007_812_5] {
            let mut lower: Vec<(f64, [f64; 3])> = Vec::new();
            for direction in &directions {
                let next = std::array::from_fn(|i| start[i] + step * direction[i]);
                let found = self.target.value(&self.solve(next, false)?.energies);
                if found < value - floor {
                    lower.push((found, next));
                }
            }
            lower.sort_by(|a, b| a.0.total_cmp(&b.0));
            if let Some(spot) = self.lowest_crease(&lower)? {
                return Ok(spot);
            }
        }
        Ok(Spot {
            k: start,
            value,
            seat: Seat::Pinned,
        })
    }

    /// The lowest of the extrema that the best few starts lead to: several creases may leave one point.
    fn lowest_crease(&self, starts: &[(f64, [f64; 3])]) -> Result<Option<Spot>, Error> {
        let mut best: Option<Spot> = None;
        for (_, start) in starts.iter().take(3) {
            let spot = self.crease(*start)?;
            if best.is_none_or(|other| spot.value < other.value) {
                best = Some(spot);
            }
        }
        Ok(best)
    }

    /// Steps along which levels that cross here stay together: a crease is too narrow for other directions to lie on it.
    fn along_creases(&self, k: [f64; 3]) -> Result<Vec<[f64; 3]>, Error> {
        let levels = self.solve(k, true)?;
        let frame = &self.waves.frame;
        let near = 10.0 * APART * self.unit();
        let mut steps = Vec::new();
        for (level, _) in self.target.levels() {
            let joined =
                |other: &usize| (levels.energies[*other] - levels.energies[level]).abs() < near;
            let group: Vec<usize> = (0..levels.energies.len()).filter(joined).collect();
            let (Some(first), Some(last)) = (group.first(), group.last()) else {
                continue;
            };
            let axes = principal(
                &self.waves.parting(&levels, *first..*last + 1),
                frame.dimension,
            );
            let most = axes.iter().map(|(parted, _)| *parted).fold(0.0, f64::max);
            // Levels that part nowhere, as in deep wells, have no crease.
            if most < 1e-8 * self.unit() {
                continue;
            }
            let flat: Vec<[f64; 3]> = axes
                .into_iter()
                .filter(|(parted, _)| *parted < (1e-8 * self.unit()).min(1e-3 * most))
                .map(|(_, axis)| axis)
                .collect();
            let limit = (0..frame.dimension)
                .map(|i| self.spacing[i] * dot(frame.reciprocal[i], frame.reciprocal[i]).sqrt())
                .fold(0.0, f64::max);
            match flat.as_slice() {
                [along] => {
                    steps.extend([1.0, -1.0].map(|sign| along.map(|x| sign * limit * x)));
                }
                [one, other] => {
                    // A plane of them: a few ways in it.
                    steps.extend((0..12).map(|turn| {
                        let (sine, cosine) =
                            (f64::from(turn) * std::f64::consts::PI / 6.0).sin_cos();
                        std::array::from_fn(|x| limit * (cosine * one[x] + sine * other[x]))
                    }));
                }
                _ => {}
            }
        }
        Ok(steps
            .into_iter()
            .map(|parts| frame.off_axes(parts))
            .collect())
    }

    /// Steps to all neighbours in the mesh, one of each set that symmetry makes equal.
    fn directions(&self, k: [f64; 3]) -> Vec<[f64; 3]> {
        let d = self.waves.frame.dimension;
        let group = self.waves.symmetry.little_group(k);
        let mut all: Vec<[f64; 3]> = Vec::new();
        for place in 0..27_usize {
            let offset = [place / 9, place / 3 % 3, place % 3].map(|x| x as f64 - 1.0);
            if offset == [0.0; 3] || offset[d..].iter().any(|x| *x != 0.0) {
                continue;
            }
            let step: [f64; 3] = std::array::from_fn(|i| offset[i] * self.spacing[i]);
            let seen = group.iter().any(|m| {
                let image = rotate_real(m, step);
                all.iter()
                    .any(|other| (0..3).all(|i| (other[i] - image[i]).abs() < 1e-9))
            });
            if !seen {
                all.push(step);
            }
        }
        all
    }
}

/// A Newton step on the axes and the fall that it foresees.
pub(super) struct Step {
    pub parts: [f64; 3],
    pub gain: f64,
    /// Whether the slope vanishes while a curvature is negative.
    pub saddle: bool,
}

/// −g/|λ| along the principal axes, no longer than `limit`; along the most negative curvature at a saddle.
pub(super) fn descent(slope: &[f64; 3], curvature: &Tensor, dimension: usize, limit: f64) -> Step {
    let axes = principal(curvature, dimension);
    let mut parts = [0.0; 3];
    let mut gain = 0.0;
    let mut lowest = (0.0, [0.0; 3]);
    for (bend, axis) in &axes {
        let along = super::lattice::dot(*slope, *axis);
        // Flatter than a thousandth of the free curvature, the step is set by the limit rather than by Newton.
        let size = bend.abs().max(2e-3);
        gain += 0.5 * along * along / size;
        for x in 0..3 {
            parts[x] -= along / size * axis[x];
        }
        if *bend < lowest.0 {
            lowest = (*bend, *axis);
        }
    }
    let saddle = lowest.0 < -1e-4 && gain < 1e-10;
    if saddle {
        return Step {
            parts: lowest.1.map(|x| 0.5 * limit * x),
            gain,
            saddle,
        };
    }
    let length = super::lattice::dot(parts, parts).sqrt();
    if length > limit {
        parts = parts.map(|x| x * limit / length);
    }
    Step {
        parts,
        gain,
        saddle,
    }
}

/// Starts for one target: the mesh points that no neighbour beats, best first, and for each the least that could lie
/// near it, judged by the steepest step to a neighbour.
pub(super) fn starts(
    mesh: &Mesh,
    energies: &[Vec<f64>],
    target: Target,
    rounding: f64,
) -> Vec<(usize, f64, f64)> {
    let value = |point: usize| target.value(&energies[point]);
    let mut found: Vec<(usize, f64, f64)> = (0..mesh.points.len())
        .filter_map(|point| {
            let here = value(point);
            let mut steepest: f64 = 0.0;
            for other in mesh.neighbours(point) {
                if value(other) < here - rounding {
                    return None;
                }
                steepest = steepest.max(value(other) - here);
            }
            Some((point, here, here - steepest))
        })
        .collect();
    found.sort_by(|a, b| a.1.total_cmp(&b.1));
    found
}
