//! The Fermi surface closed in on: the zone's simplices divided where the level may cross them.
//!
//! Every irreducible mesh point's cell (`surroundings.rs`) is cut into simplices, whose corners have the levels that
//! `nearby.rs` finds. Those that the level may cross are divided into 2^d by the middles of their edges (Bey, Computing
//! 55, 355 (1995)), again and again; of the others all or nothing is filled. In the smallest, levels are linear
//! (`states.rs`), which is wrong by second order in their size: a division leaves a quarter of the error.
//!
//! A simplex may be crossed where none of its corners says so: by a level that bends, and by one that turns where it meets
//! others. Energies within `BENT` times the square of the longest edge of a corner's count as crossed, and where another
//! level is as near that they may meet, those that a free particle has no farther away than any point of the simplex is
//! from some corner (`FARTHEST` of the edge; √(3/8) in a regular tetrahedron).

use super::basis::Waves;
use super::lattice::dot;
use super::mesh::Mesh;
use super::nearby::Nearby;
use super::states::{Corners, States};
use super::surroundings::{Piece, cell, distinct};
use super::{Budget, Error};
use rayon::prelude::*;
use rustc_hash::FxHashMap;

/// Levels bend by up to this much between corners, times the square of the edge: four times what free particles do.
const BENT: f64 = 1.0;
/// No point of a simplex is farther from all its corners than this share of its longest edge.
const FARTHEST: f64 = 0.62;

/// A simplex by its corners' numbers, and the share of the zone it stands for.
type Simplex = ([u32; 4], f64);

/// The cell of one mesh point.
struct Patch<'n> {
    near: &'n Nearby,
    places: Vec<[f64; 3]>,
    /// The levels at every place, one after another.
    energies: Vec<f64>,
    middles: FxHashMap<(u32, u32), u32>,
    simplices: Vec<Simplex>,
    /// Filled states in simplices that are no longer divided.
    filled: f64,
}

/// What is filled and what the level may cross.
pub(super) struct Crossed {
    /// States per cell that lie below in any case.
    pub filled: f64,
    pub states: States,
}

/// The zone cut into simplices.
pub(super) struct Surface<'n> {
    dimension: usize,
    patches: Vec<Patch<'n>>,
    /// How many simplices an undivided zone would have.
    whole: f64,
    /// Slope of a free particle's energy at the level.
    speed: f64,
}

/// A corner of a cell with its levels.
pub(super) struct Corner {
    /// The mesh point that it was seen from.
    pub point: usize,
    pub place: [f64; 3],
    /// How many levels lie below these.
    pub below: usize,
    pub energies: Vec<f64>,
}

impl<'n> Surface<'n> {
    /// The cells of all irreducible points of a mesh, for levels near `level`.
    pub fn new(
        waves: &Waves,
        mesh: &Mesh,
        near: &'n [Nearby],
        level: f64,
        budget: &Budget,
    ) -> Result<Self, Error> {
        let frame = &waves.frame;
        let pieces = cell(frame, mesh.size)?;
        let total = mesh.of.len() as f64;
        let patches: Vec<Patch> = near
            .par_iter()
            .enumerate()
            .map(|(point, near)| {
                if (budget.cancelled)() {
                    return Err(Error::Cancelled);
                }
                let group = waves.symmetry.little_group(mesh.points[point]);
                let own = distinct(frame, &pieces, &group);
                let share = mesh.weights[point] / total;
                Ok(Patch::new(near, &own, share, frame.dimension))
            })
            .collect::<Result<_, Error>>()?;
        let kinetic = (level - waves.mean + waves.swing).max(0.1 * frame.unit());
        Ok(Self {
            dimension: frame.dimension,
            patches,
            whole: total * pieces.len() as f64,
            speed: 2.0 * kinetic.sqrt(),
        })
    }

    /// Points along an edge of a mesh of as many simplices as the zone is cut into.
    pub fn fineness(&self) -> f64 {
        let each = if self.dimension == 2 { 2.0 } else { 6.0 };
        (self.whole / each).powf(1.0 / self.dimension as f64)
    }

    /// How many places have been looked at.
    pub fn places(&self) -> usize {
        self.patches.iter().map(|patch| patch.places.len()).sum()
    }

    /// The level at which so many levels per cell are filled, while nothing has been given up.
    pub fn level(&self, levels: f64) -> f64 {
        let all = self.crossed((f64::NEG_INFINITY, f64::INFINITY));
        all.states.fill_from(levels, all.filled)
    }

    /// The corners of all cells: what is farthest from where levels were solved.
    pub fn corners(&self) -> Vec<Corner> {
        let mut found = Vec::new();
        for (point, patch) in self.patches.iter().enumerate() {
            let (below, count) = (patch.near.below, patch.near.count);
            for (index, place) in patch.places.iter().enumerate() {
                found.push(Corner {
                    point,
                    place: *place,
                    below,
                    energies: patch.energies[index * count..(index + 1) * count].to_vec(),
                });
            }
        }
        found
    }

    /// Divides every simplex.
    pub fn divide(&mut self, budget: &Budget) -> Result<(), Error> {
        let d = self.dimension;
        self.patches.par_iter_mut().try_for_each(|patch| {
            if (budget.cancelled)() {
                return Err(Error::Cancelled);
            }
            patch.divide(d);
            Ok(())
        })?;
        self.whole *= (1 << d) as f64;
        Ok(())
    }

    /// Gives up the simplices that no level between these energies crosses.
    pub fn prune(&mut self, window: (f64, f64)) {
        let (d, speed) = (self.dimension, self.speed);
        self.patches
            .par_iter_mut()
            .for_each(|patch| patch.prune(window, d, speed));
    }

    /// The states as they are cut now, those that cannot reach into the window counted only.
    pub fn crossed(&self, window: (f64, f64)) -> Crossed {
        let mut filled = 0.0;
        let mut simplices = Vec::new();
        for patch in &self.patches {
            filled += patch.filled;
            let count = patch.near.count;
            for (corners, share) in &patch.simplices {
                for band in 0..count {
                    let own = patch.corner_energies(corners, band, self.dimension);
                    if own[self.dimension] <= window.0 {
                        filled += share;
                    } else if own[0] < window.1 {
                        simplices.push((own, *share));
                    }
                }
            }
        }
        Crossed {
            filled,
            states: States::of(self.dimension, simplices, window),
        }
    }
}

impl<'n> Patch<'n> {
    fn new(near: &'n Nearby, pieces: &[Piece], weight: f64, d: usize) -> Self {
        let mut patch = Self {
            near,
            places: Vec::new(),
            energies: Vec::new(),
            middles: FxHashMap::default(),
            simplices: Vec::new(),
            filled: near.below as f64 * weight,
        };
        if near.count == 0 {
            return patch;
        }
        for piece in pieces {
            let mut corners = [0; 4];
            for (slot, place) in corners.iter_mut().zip(&piece.corners[..=d]) {
                let size = dot(*place, *place);
                let same = |other: &[f64; 3]| {
                    (0..3).map(|x| (other[x] - place[x]).powi(2)).sum::<f64>() <= 1e-16 * size
                };
                *slot = match patch.places.iter().position(same) {
                    Some(index) => index as u32,
                    None => patch.add(*place),
                };
            }
            patch.simplices.push((corners, piece.share * weight));
        }
        patch
    }

    fn add(&mut self, place: [f64; 3]) -> u32 {
        self.places.push(place);
        self.energies.extend(self.near.levels(place));
        self.places.len() as u32 - 1
    }

    fn middle(&mut self, a: u32, b: u32) -> u32 {
        let key = (a.min(b), a.max(b));
        if let Some(known) = self.middles.get(&key) {
            return *known;
        }
        let (one, other) = (self.places[a as usize], self.places[b as usize]);
        let found = self.add(std::array::from_fn(|x| 0.5 * (one[x] + other[x])));
        self.middles.insert(key, found);
        found
    }

    fn divide(&mut self, d: usize) {
        let old = std::mem::take(&mut self.simplices);
        let part = 1.0 / (1 << d) as f64;
        for ([a, b, c, e], share) in old {
            let share = share * part;
            let (ab, ac, bc) = (self.middle(a, b), self.middle(a, c), self.middle(b, c));
            if d == 2 {
                let children = [
                    [a, ab, ac, 0],
                    [ab, b, bc, 0],
                    [ac, bc, c, 0],
                    [ab, bc, ac, 0],
                ];
                self.simplices.extend(children.map(|child| (child, share)));
                continue;
            }
            let (ae, be, ce) = (self.middle(a, e), self.middle(b, e), self.middle(c, e));
            let children = [
                [a, ab, ac, ae],
                [ab, b, bc, be],
                [ac, bc, c, ce],
                [ae, be, ce, e],
                [ab, ac, ae, be],
                [ab, ac, bc, be],
                [ac, ae, be, ce],
                [ac, bc, be, ce],
            ];
            self.simplices.extend(children.map(|child| (child, share)));
        }
    }

    fn prune(&mut self, (low, high): (f64, f64), d: usize, speed: f64) {
        let count = self.near.count;
        let old = std::mem::take(&mut self.simplices);
        for (corners, share) in old {
            let edge = self.longest(&corners, d);
            let mut below = 0;
            let mut crossed = false;
            for band in 0..count {
                let own = self.corner_energies(&corners, band, d);
                let near = self.apart(&corners, band, d) < 2.0 * FARTHEST * speed * edge;
                let turn = if near { FARTHEST * speed * edge } else { 0.0 };
                let slack = turn.max(BENT * edge * edge);
                if own[d] + slack <= low {
                    below += 1;
                } else if own[0] - slack < high {
                    crossed = true;
                }
            }
            if crossed {
                self.simplices.push((corners, share));
            } else {
                self.filled += share * f64::from(below);
            }
        }
    }

    /// A band's energies at the corners, rising.
    fn corner_energies(&self, corners: &[u32; 4], band: usize, d: usize) -> Corners {
        let count = self.near.count;
        let mut own = [f64::INFINITY; 4];
        for (slot, corner) in own.iter_mut().zip(&corners[..=d]) {
            *slot = self.energies[*corner as usize * count + band];
        }
        own.sort_by(f64::total_cmp);
        own
    }

    /// How near a band comes to another at the corners.
    fn apart(&self, corners: &[u32; 4], band: usize, d: usize) -> f64 {
        let count = self.near.count;
        let mut least = f64::INFINITY;
        for corner in &corners[..=d] {
            let own = &self.energies[*corner as usize * count..(*corner as usize + 1) * count];
            if band + 1 < count {
                least = least.min(own[band + 1] - own[band]);
            }
            if band > 0 {
                least = least.min(own[band] - own[band - 1]);
            }
        }
        least
    }

    fn longest(&self, corners: &[u32; 4], d: usize) -> f64 {
        let mut longest = 0.0_f64;
        for i in 0..=d {
            for j in 0..i {
                let (a, b) = (
                    self.places[corners[i] as usize],
                    self.places[corners[j] as usize],
                );
                let way: [f64; 3] = std::array::from_fn(|x| a[x] - b[x]);
                longest = longest.max(dot(way, way));
            }
        }
        longest.sqrt()
    }
}
