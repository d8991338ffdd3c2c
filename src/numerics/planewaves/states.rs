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
use super::lattice::{dot, real};
use super::mesh::Mesh;
use super::{Budget, Error, Estimate};
use rustc_hash::FxHashMap;

/// A Fermi level.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Fermi {
    /// The level up to which states are filled; at a gap, its lower edge.
    pub level: Estimate,
    /// States per cell and unit of energy there, one state a level.
    pub density: f64,
    /// The sum of the filled levels' energies per cell.
    pub energy: Estimate,
    /// Whether the level is known as well as was asked for.
    pub settled: bool,
}

/// The levels on a mesh, cut into simplices.
#[derive(Clone, Debug)]
pub struct States {
    dimension: usize,
    /// Sorted corner energies (the first d+1) and the share of the zone they stand for.
    simplices: Vec<([f64; 4], f64)>,
    /// Bounds of all energies.
    range: (f64, f64),
    /// A bound on what the cut-off left uncertain in any of the energies.
    error: f64,
}

impl Waves<'_> {
    /// The lowest `bands` levels on a mesh of about `most` points along the longest reciprocal vector.
    ///
    /// # Errors
    /// `NotFinite`, `BudgetSpent`, `Cancelled`.
    pub fn states(&self, bands: usize, most: usize, cut: f64, budget: &Budget) -> Result<States, Error> {
        let mesh = self.mesh(most);
        let (energies, error) = self.settled_on(&mesh, bands, cut, budget)?;
        let corners = self.simplices(&mesh);
        let mut shares: FxHashMap<Vec<usize>, f64> = FxHashMap::default();
        let total = (mesh.of.len() * corners.len()) as f64;
        for place in 0..mesh.of.len() {
            let base = mesh.indices(place).map(|x| x as i64);
            for simplex in &corners {
                let mut points: Vec<usize> = simplex
                    .iter()
                    .map(|c| mesh.of[mesh.wrapped(std::array::from_fn(|i| base[i] + c[i]))])
                    .collect();
                points.sort_unstable();
                *shares.entry(points).or_default() += 1.0 / total;
            }
        }
        let mut simplices = Vec::with_capacity(shares.len() * bands);
        let mut range = (f64::INFINITY, f64::NEG_INFINITY);
        let mut ordered: Vec<(Vec<usize>, f64)> = shares.into_iter().collect();
        ordered.sort_by(|a, b| a.0.cmp(&b.0));
        for (points, share) in ordered {
            for band in 0..bands {
                let mut corner = [f64::INFINITY; 4];
                for (slot, point) in corner.iter_mut().zip(&points) {
                    *slot = energies[*point].get(band).copied().ok_or(Error::NotFinite)?;
                    range = (range.0.min(*slot), range.1.max(*slot));
                }
                corner.sort_by(f64::total_cmp);
                simplices.push((corner, share));
            }
        }
        Ok(States { dimension: self.frame.dimension, simplices, range, error })
    }

    /// The corners, in steps of the mesh, of the simplices that fill a cell, cut along its shortest diagonal.
    fn simplices(&self, mesh: &Mesh) -> Vec<Vec<[i64; 3]>> {
        let d = self.frame.dimension;
        let length = |signs: [i32; 3]| {
            let way = std::array::from_fn(|i| if i < d { f64::from(signs[i]) / mesh.size[i] as f64 } else { 0.0 });
            self.frame.square(way)
        };
        let all = [[1, 1, 1], [1, 1, -1], [1, -1, 1], [-1, 1, 1]];
        let choices = [1, 2, 4][d - 1];
        let in_plane: [[i32; 3]; 4] = if d == 2 { [[1, 1, 0], [1, -1, 0], [0; 3], [0; 3]] } else { all };
        let signs = in_plane[..choices].iter().copied().min_by(|a, b| length(*a).total_cmp(&length(*b))).unwrap_or([1; 3]);
        let orders: &[&[usize]] = match d {
            1 => &[&[0]],
            2 => &[&[0, 1], &[1, 0]],
            _ => &[&[0, 1, 2], &[0, 2, 1], &[1, 0, 2], &[1, 2, 0], &[2, 0, 1], &[2, 1, 0]],
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

    /// The Fermi level at which `levels` levels per cell are filled (particles over the states a level holds; it need
    /// not be whole). For whole bands with a gap above, this is the gap's lower edge.
    ///
    /// # Errors
    /// `NotFinite` where `levels` is not positive; `BudgetSpent` where not even two meshes fit; `Cancelled`.
    pub fn fermi(&self, levels: f64, tolerance: f64, budget: &Budget) -> Result<Fermi, Error> {
        if !(levels > 0.0 && levels < 1e4 && tolerance > 0.0 && tolerance.is_finite()) {
            return Err(Error::NotFinite);
        }
        let cut = self.cut_for_states(levels, tolerance, budget)?;
        let sizes: &[usize] = match self.frame.dimension {
            1 => &[24, 48, 96, 192, 384, 768],
            2 => &[12, 24, 48, 96, 192],
            _ => &[6, 12, 24, 32, 48],
        };
        let mut last: Option<(f64, Fermi, States)> = None;
        let mut best: Option<Fermi> = None;
        for size in sizes {
            let states = match self.enough_states(levels, *size, cut, budget) {
                Err(Error::BudgetSpent) if best.is_some() => break,
                other => other?,
            };
            let raw = states.fill(levels);
            if let Some((coarser, lower, _)) = &last {
                let factor = 1.0 / ((*size as f64 / coarser).powi(2) - 1.0);
                let further = |fine: f64, coarse: f64, cut_off: f64| {
                    let change = (fine - coarse) * factor;
                    Estimate { value: fine + change, error: change.abs() + cut_off + 1e-13 * self.frame.unit() }
                };
                let level = further(raw.level.value, lower.level.value, states.error);
                // Blöchl's correction has taken the second order off the energy already.
                let change = (raw.energy.value - lower.energy.value).abs();
                let energy = Estimate { value: raw.energy.value, error: change + states.error * levels.max(1.0) };
                let settled = level.error <= tolerance;
                best = Some(Fermi { level, density: raw.density, energy, settled });
                if settled {
                    break;
                }
            }
            last = Some((*size as f64, raw, states));
        }
        best.ok_or(Error::BudgetSpent)
    }

    /// A cut at which the levels up to the filling are known to half the tolerance, or the largest that is affordable.
    fn cut_for_states(&self, levels: f64, tolerance: f64, budget: &Budget) -> Result<f64, Error> {
        let bands = levels.ceil() as usize + 2;
        let probes = [[0.0; 3], [0.5, 0.0, 0.0], [0.5; 3], [0.25, 0.125, 0.375]].map(|k| self.inside(k));
        let largest = (budget.max_basis as f64 / 1.3).min([200.0_f64, 500.0, 400.0][self.frame.dimension - 1].max(2.5 * bands as f64));
        let mut cut = self.first_cut(bands);
        loop {
            let mut worst: f64 = 0.0;
            for k in probes {
                let solved = self.solve_on(&self.basis(k, cut), k, bands, true, budget)?;
                worst = self.predict(&solved, cut)?.iter().map(|p| p.unjudged().error).fold(worst, f64::max);
            }
            let larger = self.frame.cut_for(1.4 * self.frame.expected(cut));
            if worst <= 0.5 * tolerance || self.frame.expected(larger) > largest {
                return Ok(cut);
            }
            cut = larger;
        }
    }

    /// States with so many bands that the filling ends below the top of the last.
    fn enough_states(&self, levels: f64, size: usize, cut: f64, budget: &Budget) -> Result<States, Error> {
        let mut bands = levels.ceil() as usize + 1;
        for _ in 0..6 {
            let states = self.states(bands, size, cut, budget)?;
            let level = states.fill(levels).level.value;
            // The first band left out may begin below the last one's top, not below its own bottom.
            let deepest = states.simplices.iter().skip(bands - 1).step_by(bands).map(|(corner, _)| corner[0]).fold(f64::INFINITY, f64::min);
            if level <= deepest {
                return Ok(states);
            }
            bands += 2;
        }
        Err(Error::BudgetSpent)
    }
}

impl States {
    /// States per cell below an energy, one a level.
    pub fn number(&self, energy: f64) -> f64 {
        self.simplices.iter().map(|(corner, share)| share * number(&corner[..=self.dimension], energy)).sum()
    }

    /// States per cell and unit of energy at an energy.
    pub fn density(&self, energy: f64) -> f64 {
        self.simplices.iter().map(|(corner, share)| share * density(&corner[..=self.dimension], energy)).sum()
    }

    /// The energies of all states filled up to `energy`, per cell, with Blöchl's correction.
    pub fn energy(&self, energy: f64) -> f64 {
        let d = self.dimension as f64;
        let factor = 1.0 / (2.0 * (d + 1.0) * (d + 2.0));
        self.simplices
            .iter()
            .map(|(corner, share)| {
                let corner = &corner[..=self.dimension];
                let square: f64 = corner.iter().map(|e| e * e).sum();
                let sum: f64 = corner.iter().sum();
                let curved = density(corner, energy) * factor * ((d + 1.0) * square - sum * sum);
                share * (energy * number(corner, energy) - integral(corner, energy) - curved)
            })
            .sum()
    }

    /// The level at which this many levels per cell are filled; the lower edge where a range of energies does.
    fn fill(&self, levels: f64) -> Fermi {
        let (mut low, mut high) = self.range;
        let slack = 1e-12 * levels;
        for _ in 0..200 {
            let middle = 0.5 * (low + high);
            if middle <= low || middle >= high {
                break;
            }
            if self.number(middle) < levels - slack {
                low = middle;
            } else {
                high = middle;
            }
        }
        let exact = |value: f64| Estimate { value, error: self.error };
        Fermi { level: exact(high), density: self.density(high), energy: exact(self.energy(high)), settled: false }
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
    let (gap, over) = (|i: usize, j: usize| e[j] - e[i], |i: usize| (x - e[i]).abs());
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
        for (node, weight) in [(-0.6_f64.sqrt(), 5.0 / 9.0), (0.0, 8.0 / 9.0), (0.6_f64.sqrt(), 5.0 / 9.0)] {
            sum += half * weight * number(e, middle + half * node);
        }
    }
    sum
}

/// −∫ E(k) cos(2πk·R) over the zone by the mesh, R in cells.
pub(super) fn fourier(mesh: &Mesh, energies: &[f64], cell: [i32; 3]) -> f64 {
    let sum: f64 = (0..mesh.of.len())
        .map(|place| {
            let turn = 2.0 * std::f64::consts::PI * dot(mesh.point(place), real(cell));
            energies[mesh.of[place]] * turn.cos()
        })
        .sum();
    -sum / mesh.of.len() as f64
}

#[cfg(test)]
mod tests {
    use super::*;

    /// The number of states is what a fine grid of the simplex counts, and the density its slope.
    #[test]
    fn shares_of_simplices_are_volumes() {
        for corner in [vec![0.0, 1.0], vec![-0.3, 0.5, 0.9], vec![0.1, 0.25, 0.6, 1.0]] {
            let d = corner.len() - 1;
            let n = [4000_usize, 400, 90][d - 1];
            let mut inside: Vec<f64> = Vec::new();
            for i in 0..n.pow(d as u32) {
                let t: Vec<f64> = (0..d).map(|j| ((i / n.pow(j as u32) % n) as f64 + 0.5) / n as f64).collect();
                if t.iter().sum::<f64>() < 1.0 {
                    inside.push(corner[0] + (0..d).map(|j| t[j] * (corner[j + 1] - corner[0])).sum::<f64>());
                }
            }
            for step in 1..20 {
                let x = corner[0] + (corner[d] - corner[0]) * f64::from(step) / 20.0;
                let counted = inside.iter().filter(|e| **e < x).count() as f64 / inside.len() as f64;
                assert!((number(&corner, x) - counted).abs() < 0.01, "{d}D {x}: {} {counted}", number(&corner, x));
                let slope = (number(&corner, x + 1e-5) - number(&corner, x - 1e-5)) / 2e-5;
                assert!((density(&corner, x) - slope).abs() < 1e-6, "{d}D {x}");
                let area = (integral(&corner, x + 1e-4) - integral(&corner, x - 1e-4)) / 2e-4;
                assert!((number(&corner, x) - area).abs() < 1e-6);
            }
        }
    }
}
