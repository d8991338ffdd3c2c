//! Number and density of states, and the Fermi level, by linear interpolation in simplices.
//!
//! The mesh's cells are cut into segments, triangles or tetrahedra, in each of which E(k) is taken as linear between its
//! corners e₁ ≤ … ≤ e_{d+1}. The share of a simplex below E is, between e₁ and e₂, Π_{j>1} (E − e₁)/(eⱼ − e₁), and its
//! like elsewhere (Blöchl, Jepsen & Andersen, Phys. Rev. B 49, 16223 (1994), appendix B). The energy of the filled
//! states has their correction for curvature,
//!
//! ```text
//! ΔU = − Σ_T D_T(E_F)/(2(d+1)(d+2)) · [ (d+1) Σ eᵢ² − (Σ eᵢ)² ]        (1/40 in 3D, their eq. 22)
//! ```
//!
//! with D_T the simplex's density of states. The number of states needs none. What is left is of second order in the
//! mesh and is taken off by comparing two meshes. Failure mode: a level of van Hove singularities converges slower; the
//! stated error, the whole of that last extrapolation, is then less generous.

use super::basis::Waves;
use super::mesh::Mesh;
use super::settle::UNTRIED;
use super::{Budget, Error, Estimate};
use rustc_hash::FxHashMap;

/// Energies at the corners of a simplex, rising; infinite beyond the dimension.
pub(super) type Corners = [f64; 4];

/// The levels on a mesh, cut into simplices.
#[derive(Clone, Debug)]
pub struct States {
    dimension: usize,
    /// Corner energies and the share of the zone they stand for.
    pub(super) simplices: Vec<(Corners, f64)>,
    /// Bounds of all energies.
    range: (f64, f64),
    /// What the cut-off left uncertain, band by band.
    errors: Vec<f64>,
}

/// The levels of one mesh filled.
#[derive(Clone, Copy, Debug)]
pub(super) struct Filled {
    pub level: f64,
    pub density: Estimate,
    /// With Blöchl's correction.
    pub energy: f64,
    /// That correction.
    pub curved: f64,
}

impl Waves<'_> {
    /// The lowest `bands` levels on a mesh of about `most` points along the longest reciprocal vector.
    ///
    /// # Errors
    /// `NotFinite`, `BudgetSpent`, `Cancelled`.
    pub fn states(
        &self,
        bands: usize,
        most: usize,
        cut: f64,
        budget: &Budget,
    ) -> Result<States, Error> {
        self.states_known(bands, most, (cut, UNTRIED), budget)
    }

    /// The same where the share of what the cut leaves out that is uncertain is known.
    pub(super) fn states_known(
        &self,
        bands: usize,
        most: usize,
        (cut, share): (f64, f64),
        budget: &Budget,
    ) -> Result<States, Error> {
        let mesh = self.mesh(most);
        let (energies, errors) = self.settled_on(&mesh, bands, (cut, share), budget)?;
        self.states_of(&mesh, &energies, bands, errors)
    }

    /// States from the levels at the irreducible points of a mesh.
    pub(super) fn states_of(
        &self,
        mesh: &Mesh,
        energies: &[Vec<f64>],
        bands: usize,
        errors: Vec<f64>,
    ) -> Result<States, Error> {
        let states = States::cut(self.frame.dimension, &self.shares(mesh), energies, bands)?;
        Ok(States { errors, ..states })
    }

    /// The simplices of a mesh by their irreducible points, sorted, and the share of the zone that each stands for.
    pub(super) fn shares(&self, mesh: &Mesh) -> Vec<(Vec<usize>, f64)> {
        let corners = self.simplices(mesh);
        let mut shares: FxHashMap<[usize; 4], f64> = FxHashMap::default();
        let total = (mesh.of.len() * corners.len()) as f64;
        for place in 0..mesh.of.len() {
            let base = mesh.indices(place).map(|x| x as i64);
            for simplex in &corners {
                let mut points = [usize::MAX; 4];
                for (slot, c) in points.iter_mut().zip(simplex) {
                    *slot = mesh.of[mesh.wrapped(std::array::from_fn(|i| base[i] + c[i]))];
                }
                points.sort_unstable();
                *shares.entry(points).or_default() += 1.0 / total;
            }
        }
        let mut ordered: Vec<([usize; 4], f64)> = shares.into_iter().collect();
        ordered.sort_by_key(|entry| entry.0);
        let corners = self.frame.dimension + 1;
        ordered
            .into_iter()
            .map(|(points, share)| (points[..corners].to_vec(), share))
            .collect()
    }

    /// The corners, in steps of the mesh, of the simplices that fill a cell, cut along its shortest diagonal.
    fn simplices(&self, mesh: &Mesh) -> Vec<Vec<[i64; 3]>> {
        let d = self.frame.dimension;
        let length = |signs: [i32; 3]| {
            let way = std::array::from_fn(|i| {
                if i < d {
                    f64::from(signs[i]) / mesh.size[i] as f64
                } else {
                    0.0
                }
            });
            self.frame.square(way)
        };
        let all = [[1, 1, 1], [1, 1, -1], [1, -1, 1], [-1, 1, 1]];
        let choices = [1, 2, 4][d - 1];
        let in_plane: [[i32; 3]; 4] = if d == 2 {
            [[1, 1, 0], [1, -1, 0], [0; 3], [0; 3]]
        } else {
            all
        };
        let signs = in_plane[..choices]
            .iter()
            .copied()
            .min_by(|a, b| length(*a).total_cmp(&length(*b)))
            .unwrap_or([1; 3]);
        let orders: &[&[usize]] = match d {
            1 => &[&[0]],
            2 => &[&[0, 1], &[1, 0]],
            _ => &[
                &[0, 1, 2],
                &[0, 2, 1],
                &[1, 0, 2],
                &[1, 2, 0],
                &[2, 0, 1],
                &[2, 1, 0],
            ],
        };
        // From one end of the diagonal to the other, one edge of the cell after another.
        orders
            .iter()
            .map(|order| {
                let mut corner = [0_i64; 3];
                let mut path = vec![corner];
                for axis in *order {
                    corner[*axis] += i64::from(signs[*axis]);
                    path.push(corner);
                }
                path
            })
            .collect()
    }
}

impl States {
    /// States with energies in `range`; that of all corners where it has no ends.
    pub(super) fn of(dimension: usize, simplices: Vec<(Corners, f64)>, range: (f64, f64)) -> Self {
        let all = simplices.iter().map(|(corner, _)| corner);
        let range = if range.0.is_finite() {
            range
        } else {
            let lowest = all.clone().map(|corner| corner[0]);
            let highest = all.map(|corner| corner[dimension]);
            (
                lowest.fold(f64::INFINITY, f64::min),
                highest.fold(f64::NEG_INFINITY, f64::max),
            )
        };
        Self {
            dimension,
            simplices,
            range,
            errors: Vec::new(),
        }
    }

    /// The lowest bands at the points of these simplices.
    pub(super) fn cut(
        dimension: usize,
        shares: &[(Vec<usize>, f64)],
        energies: &[Vec<f64>],
        bands: usize,
    ) -> Result<Self, Error> {
        let mut simplices = Vec::with_capacity(shares.len() * bands);
        let mut range = (f64::INFINITY, f64::NEG_INFINITY);
        for (points, share) in shares {
            for band in 0..bands {
                let mut corner = [f64::INFINITY; 4];
                for (slot, point) in corner.iter_mut().zip(points) {
                    *slot = energies[*point]
                        .get(band)
                        .copied()
                        .ok_or(Error::NotFinite)?;
                    range = (range.0.min(*slot), range.1.max(*slot));
                }
                corner.sort_by(f64::total_cmp);
                simplices.push((corner, *share));
            }
        }
        Ok(Self::of(dimension, simplices, range))
    }

    /// States per cell below an energy, one a level.
    pub fn number(&self, energy: f64) -> f64 {
        self.simplices
            .iter()
            .map(|(corner, share)| share * number(&corner[..=self.dimension], energy))
            .sum()
    }

    /// States per cell and unit of energy at an energy.
    pub fn density(&self, energy: f64) -> f64 {
        self.simplices
            .iter()
            .map(|(corner, share)| share * density(&corner[..=self.dimension], energy))
            .sum()
    }

    /// The same at each of some rising energies.
    pub fn densities(&self, energies: &[f64]) -> Vec<f64> {
        let mut sums = vec![0.0; energies.len()];
        for (corner, share) in &self.simplices {
            let own = &corner[..=self.dimension];
            let first = energies.partition_point(|energy| *energy <= own[0]);
            for (energy, sum) in energies.iter().zip(&mut sums).skip(first) {
                if *energy >= own[self.dimension] {
                    break;
                }
                *sum += share * density(own, *energy);
            }
        }
        sums
    }

    /// The energies of all states filled up to `energy`, per cell, with Blöchl's correction.
    pub fn energy(&self, energy: f64) -> f64 {
        let linear = |corner: &[f64]| energy * number(corner, energy) - integral(corner, energy);
        self.sum(&linear) - self.curved(energy)
    }

    /// Blöchl's correction, taken from the energy.
    fn curved(&self, energy: f64) -> f64 {
        let d = self.dimension as f64;
        let factor = 1.0 / (2.0 * (d + 1.0) * (d + 2.0));
        self.sum(&|corner| {
            let square: f64 = corner.iter().map(|e| e * e).sum();
            let sum: f64 = corner.iter().sum();
            density(corner, energy) * factor * ((d + 1.0) * square - sum * sum)
        })
    }

    /// What the cut-off left uncertain in the bands that so many levels reach.
    pub(super) fn error_below(&self, levels: f64) -> f64 {
        self.errors
            .iter()
            .take(levels.ceil() as usize + 1)
            .copied()
            .fold(0.0, f64::max)
    }

    fn sum(&self, part: &dyn Fn(&[f64]) -> f64) -> f64 {
        self.simplices
            .iter()
            .map(|(corner, share)| share * part(&corner[..=self.dimension]))
            .sum()
    }

    /// The density over a window of a few steps of the mesh, and how far it is from that at the point itself.
    fn smooth_density(&self, energy: f64) -> Estimate {
        let steps = (self.simplices.len() as f64)
            .powf(1.0 / self.dimension as f64)
            .max(8.0);
        let window = (self.range.1 - self.range.0) / steps;
        let value = (self.number(energy + window) - self.number(energy - window)) / (2.0 * window);
        Estimate {
            value,
            error: (value - self.density(energy)).abs(),
        }
    }

    /// The density over the energies this near.
    pub(super) fn density_within(&self, energy: f64, near: f64) -> f64 {
        (self.number(energy + near) - self.number(energy - near)) / (2.0 * near)
    }

    /// The level at which this many levels per cell are filled; the lower edge where a range of energies does.
    pub(super) fn fill(&self, levels: f64) -> Filled {
        let high = self.fill_from(levels, 0.0);
        Filled {
            level: high,
            density: self.smooth_density(high),
            energy: self.energy(high),
            curved: self.curved(high),
        }
    }

    /// The same where so many levels are filled in any case.
    pub(super) fn fill_from(&self, levels: f64, filled: f64) -> f64 {
        let (mut low, mut high) = self.range;
        let slack = 1e-12 * levels;
        for _ in 0..200 {
            let middle = 0.5 * (low + high);
            if middle <= low || middle >= high {
                break;
            }
            if filled + self.number(middle) < levels - slack {
                low = middle;
            } else {
                high = middle;
            }
        }
        high
    }
}

/// The share of a simplex with sorted corners below an energy.
fn number(e: &[f64], x: f64) -> f64 {
    let d = e.len() - 1;
    if x <= e[0] {
        return 0.0;
    }
    if x >= e[d] {
        return 1.0;
    }
    let ratio = |from: usize, to: usize| (x - e[from]) / (e[to] - e[from]);
    match (d, e.iter().filter(|corner| **corner <= x).count()) {
        (1, _) => ratio(0, 1),
        (2, 1) => ratio(0, 1) * ratio(0, 2),
        (2, _) => 1.0 - ratio(2, 0) * ratio(2, 1),
        (_, 1) => ratio(0, 1) * ratio(0, 2) * ratio(0, 3),
        (_, 2) => {
            // The region between e₂ and e₃ as three tetrahedra.
            let (a, b) = (ratio(0, 2), ratio(0, 3));
            let (c, f) = (ratio(1, 2), ratio(1, 3));
            b * a + (1.0 - a) * b * c + (1.0 - b) * c * f
        }
        _ => 1.0 - ratio(3, 0) * ratio(3, 1) * ratio(3, 2),
    }
}

/// Its derivative.
fn density(e: &[f64], x: f64) -> f64 {
    let d = e.len() - 1;
    if x <= e[0] || x >= e[d] {
        return 0.0;
    }
    let (gap, over) = (
        |i: usize, j: usize| e[j] - e[i],
        |i: usize| (x - e[i]).abs(),
    );
    match (d, e.iter().filter(|corner| **corner <= x).count()) {
        (1, _) => 1.0 / gap(0, 1),
        (2, 1) => 2.0 * over(0) / (gap(0, 1) * gap(0, 2)),
        (2, _) => 2.0 * over(2) / (gap(0, 2) * gap(1, 2)),
        (_, 1) => 3.0 * over(0).powi(2) / (gap(0, 1) * gap(0, 2) * gap(0, 3)),
        (_, 2) => {
            let y = over(1);
            let bend = (gap(0, 2) + gap(1, 3)) / (gap(1, 2) * gap(1, 3));
            (3.0 * gap(0, 1) + 6.0 * y - 3.0 * bend * y * y) / (gap(0, 2) * gap(0, 3))
        }
        _ => 3.0 * over(3).powi(2) / (gap(0, 3) * gap(1, 3) * gap(2, 3)),
    }
}

/// How fast the share below an energy falls as each corner rises; the sum is the density.
pub(super) fn pulls(e: &[f64], x: f64) -> [f64; 4] {
    let d = e.len() - 1;
    let mut pulls = [0.0; 4];
    if x <= e[0] || x >= e[d] {
        return pulls;
    }
    let ratio = |from: usize, to: usize| (x - e[from]) / (e[to] - e[from]);
    // A factor (x − e_from)/(e_to − e_from), `rest` being what the share has by it.
    let mut pull = |from: usize, to: usize, rest: f64| {
        let gap = e[to] - e[from];
        let r = ratio(from, to);
        pulls[from] += rest * (1.0 - r) / gap;
        pulls[to] += rest * r / gap;
    };
    // A product of factors from one corner to the others.
    let mut product = |from: usize, to: &[usize], sign: f64| {
        for one in to {
            let others = to.iter().filter(|other| *other != one);
            pull(
                from,
                *one,
                sign * others.map(|other| ratio(from, *other)).product::<f64>(),
            );
        }
    };
    match (d, e.iter().filter(|corner| **corner <= x).count()) {
        (1, _) => product(0, &[1], 1.0),
        (2, 1) => product(0, &[1, 2], 1.0),
        (2, _) => product(2, &[0, 1], -1.0),
        (_, 1) => product(0, &[1, 2, 3], 1.0),
        (_, 2) => {
            // ab + (1 − a)bc + (1 − b)cf as in the share.
            let (a, b) = (ratio(0, 2), ratio(0, 3));
            let (c, f) = (ratio(1, 2), ratio(1, 3));
            pull(0, 2, b - b * c);
            pull(0, 3, a + (1.0 - a) * c - c * f);
            pull(1, 2, (1.0 - a) * b + (1.0 - b) * f);
            pull(1, 3, (1.0 - b) * c);
        }
        _ => product(3, &[0, 1, 2], -1.0),
    }
    pulls
}

/// ∫ of the number up to an energy: polynomials of degree d + 1 between the corners, by Gauss–Legendre with three
/// points, exact to degree five.
fn integral(e: &[f64], x: f64) -> f64 {
    let d = e.len() - 1;
    let mut sum = (x - e[d]).max(0.0);
    for pair in e.windows(2) {
        let (low, high) = (pair[0], pair[1].min(x));
        if high <= low {
            continue;
        }
        let (middle, half) = (0.5 * (low + high), 0.5 * (high - low));
        for (node, weight) in [
            (-0.6_f64.sqrt(), 5.0 / 9.0),
            (0.0, 8.0 / 9.0),
            (0.6_f64.sqrt(), 5.0 / 9.0),
        ] {
            sum += half * weight * number(e, middle + half * node);
        }
    }
    sum
}

#[cfg(test)]
mod tests {
    use super::*;

    /// The number of states is what a fine grid of the simplex counts, and the density its slope.
    #[test]
    fn shares_of_simplices_are_volumes() {
        for corner in [
            vec![0.0, 1.0],
            vec![-0.3, 0.5, 0.9],
            vec![0.1, 0.25, 0.6, 1.0],
        ] {
            let d = corner.len() - 1;
            let n = [4000_usize, 400, 90][d - 1];
            let mut inside: Vec<f64> = Vec::new();
            for i in 0..n.pow(d as u32) {
                let t: Vec<f64> = (0..d)
                    .map(|j| ((i / n.pow(j as u32) % n) as f64 + 0.5) / n as f64)
                    .collect();
                if t.iter().sum::<f64>() < 1.0 {
                    inside.push(
                        corner[0]
                            + (0..d)
                                .map(|j| t[j] * (corner[j + 1] - corner[0]))
                                .sum::<f64>(),
                    );
                }
            }
            for step in 1..20 {
                let x = corner[0] + (corner[d] - corner[0]) * f64::from(step) / 20.0;
                let counted =
                    inside.iter().filter(|e| **e < x).count() as f64 / inside.len() as f64;
                assert!(
                    (number(&corner, x) - counted).abs() < 0.01,
                    "{d}D {x}: {} {counted}",
                    number(&corner, x)
                );
                let slope = (number(&corner, x + 1e-5) - number(&corner, x - 1e-5)) / 2e-5;
                assert!((density(&corner, x) - slope).abs() < 1e-6, "{d}D {x}");
                let pulled = pulls(&corner, x);
                assert!((pulled.iter().sum::<f64>() - density(&corner, x)).abs() < 1e-12);
                for (i, pull) in pulled.iter().take(d + 1).enumerate() {
                    let moved = |step: f64| {
                        let mut corner = corner.clone();
                        corner[i] += step;
                        number(&corner, x)
                    };
                    let fall = (moved(-1e-5) - moved(1e-5)) / 2e-5;
                    assert!((pull - fall).abs() < 1e-6, "{d}D {x} {i}");
                }
                let area = (integral(&corner, x + 1e-4) - integral(&corner, x - 1e-4)) / 2e-4;
                assert!((number(&corner, x) - area).abs() < 1e-6);
            }
        }
    }
}
