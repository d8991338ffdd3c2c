//! Exact derivatives of levels, edges and gaps in two and three dimensions (Hellmann–Feynman).
//!
//! With the coefficients c_G of a level held, its energy is a sum of numbers that the model knows with derivatives:
//!
//! ```text
//! E = (ħ²/2m) Σ_ab K_ab b_a·b_b + Σ_G S_G V(G) + Σ_r ρ(r) V_profile(r)/N
//! K_ab = Σ_G |c_G|² (k+G)_a (k+G)_b,   S_G = Σ_G' c*_{G'+G} c_G',   ρ = |ψ|²
//! ```
//!
//! k and r are in fractions of the cell, and c varies in second order only. An edge is an extremum in k, so that it may
//! stand still too. Within a degenerate set the average is meant, as for changes that keep the symmetry.

use nalgebra::Complex;
use std::f64::consts::PI;

use crate::model::{Crystal, Dual, ParameterId, Scalar};
use crate::numerics::planewaves::Levels;

use super::quantity::sum_slopes;
use super::zone_cell::{ZoneCell, dot};
use super::zone_field::ZoneField;
use super::zone_solve::{Effort, Zone, unsolved, with_zone, zone_budget};
use super::{Cancelled, Extremum, Feature, Sensitivity, Solver, Unsolved};

/// Derivatives by parameter, in joule per SI unit.
pub(super) type Slopes = Vec<(ParameterId, f64)>;

/// Levels this close, in the largest |bᵢ|², are one set.
const TOGETHER: f64 = 1e-6;
/// Levels are settled to this, in the largest |bᵢ|²: derivatives need no more.
const SETTLED: f64 = 1e-6;
/// Grid points along each vector at which a profile's derivatives are summed, in two and three dimensions.
const GRID: [usize; 2] = [96, 32];

/// Of the level of a band (counted from 1) at a point.
pub(super) fn level_slopes(
    crystal: &Crystal,
    band: usize,
    k: &[f64],
    cancelled: &Cancelled<'_>,
) -> Result<Slopes, Unsolved> {
    let field = ZoneField::new(crystal)?;
    with_zone(&field, |zone| zone.level_slopes(band, k, cancelled))
}

/// Of one feature.
pub(super) fn feature_slopes(
    solver: &Solver,
    crystal: &Crystal,
    feature: Feature,
    cancelled: &Cancelled<'_>,
) -> Result<Slopes, Unsolved> {
    let found = several(solver, crystal, &[feature], cancelled)?;
    Ok(found.into_iter().next().unwrap_or_default())
}

/// Of the gaps, widths, bottoms and tops of the lowest `bands` bands.
pub(super) fn sensitivities(
    solver: &Solver,
    crystal: &Crystal,
    bands: usize,
    cancelled: &Cancelled<'_>,
) -> Result<Vec<Sensitivity>, Unsolved> {
    let features: Vec<Feature> = (1..=bands)
        .flat_map(|band| {
            [
                Feature::Gap(band),
                Feature::Width(band),
                Feature::Bottom(band),
                Feature::Top(band),
            ]
        })
        .collect();
    let slopes = several(solver, crystal, &features, cancelled)?;
    let pairs = features.into_iter().zip(slopes);
    Ok(pairs
        .map(|(feature, slopes)| Sensitivity { feature, slopes })
        .collect())
}

fn several(
    solver: &Solver,
    crystal: &Crystal,
    features: &[Feature],
    cancelled: &Cancelled<'_>,
) -> Result<Vec<Slopes>, Unsolved> {
    let edges: Vec<[(f64, usize, bool); 2]> = features.iter().map(|one| edges(*one)).collect();
    let needed = edges.iter().flatten().filter(|(factor, ..)| *factor != 0.0);
    let most = needed.map(|(_, band, _)| *band).max().unwrap_or(0);
    // The gap above the last band needs the next one's bottom.
    let solution = if most > crystal.bands {
        let wider = Crystal {
            bands: most,
            ..crystal.clone()
        };
        solver.solve(&wider, cancelled)?
    } else {
        solver.solve(crystal, cancelled)?
    };
    let field = ZoneField::new(crystal)?;
    with_zone(&field, |zone| {
        let mut known: Vec<((usize, bool), Slopes)> = Vec::new();
        let mut found = Vec::new();
        for pair in &edges {
            let mut parts: Vec<(f64, Slopes)> = Vec::new();
            for (factor, band, top) in pair.iter().filter(|(factor, ..)| *factor != 0.0) {
                let key = (*band, *top);
                if !known.iter().any(|(other, _)| *other == key) {
                    let edge = solution.bands.get(band.wrapping_sub(1));
                    let edge = edge.map(|band| if *top { &band.top } else { &band.bottom });
                    let slopes = match edge {
                        Some(Extremum { k, .. }) => zone.level_slopes(*band, k, cancelled)?,
                        None => Slopes::new(),
                    };
                    known.push((key, slopes));
                }
                if let Some((_, slopes)) = known.iter().find(|(other, _)| *other == key) {
                    parts.push((*factor, slopes.clone()));
                }
            }
            found.push(sum_slopes(&parts));
        }
        Ok(found)
    })
}

/// A feature as a sum of edges: factor, band from 1, whether its top.
fn edges(feature: Feature) -> [(f64, usize, bool); 2] {
    let none = (0.0, 0, false);
    match feature {
        Feature::Gap(band) => [(1.0, band + 1, false), (-1.0, band, true)],
        Feature::Width(band) => [(1.0, band, true), (-1.0, band, false)],
        Feature::Bottom(band) => [(1.0, band, false), none],
        Feature::Top(band) => [(1.0, band, true), none],
    }
}

/// A wave vector of as many entries as the kernel's.
pub(super) fn kernel_k(k: &[f64]) -> [f64; 3] {
    std::array::from_fn(|axis| k.get(axis).copied().unwrap_or(0.0))
}

impl Zone<'_> {
    fn level_slopes(
        &self,
        band: usize,
        k: &[f64],
        cancelled: &Cancelled<'_>,
    ) -> Result<Slopes, Unsolved> {
        let budget = zone_budget(self.field, band, Effort::Fine, cancelled);
        // Two more levels, so that a degenerate set is whole.
        let found = self
            .waves
            .settled_at(kernel_k(k), band + 2, SETTLED * self.unit, &budget)
            .map_err(unsolved)?;
        let energy = self.dual(&found.levels, band.saturating_sub(1))?;
        Ok(energy.slopes)
    }

    /// The energy of a level, in joule, with its derivatives.
    pub fn dual(&self, levels: &Levels, level: usize) -> Result<Dual, Unsolved> {
        let cell = ZoneCell::<Dual>::new(self.field.crystal).ok_or(Unsolved::BrokenModel)?;
        let set = levels.degenerate_with(level, TOGETHER * self.unit);
        let set = set.start..set.end.min(levels.energies.len());
        let mut parts = self.kinetic(&cell, levels, set.clone());
        parts.extend(self.potential(&cell, levels, set.clone()));
        parts.extend(self.profile(&cell, levels, set));
        Ok(Dual::sum(&parts))
    }

    fn kinetic(
        &self,
        cell: &ZoneCell<Dual>,
        levels: &Levels,
        set: std::ops::Range<usize>,
    ) -> Vec<Dual> {
        let weights = weights(levels, set);
        let scale = self.field.scale;
        // ħ²/2 over the mass with its derivatives.
        let factor = Dual::constant(scale.energy * scale.length * scale.length * scale.mass)
            .over(&self.field.crystal.mass);
        let mut parts = Vec::new();
        for (a, first) in cell.reciprocal.iter().enumerate() {
            for (b, second) in cell.reciprocal.iter().enumerate() {
                let along = |n: &[i32; 3], axis: usize| {
                    let index = n.get(axis).copied().unwrap_or(0);
                    f64::from(index) + levels.k.get(axis).copied().unwrap_or(0.0)
                };
                let share: f64 = levels
                    .waves
                    .iter()
                    .zip(&weights)
                    .map(|(n, weight)| weight * along(n, a) * along(n, b))
                    .sum();
                parts.push(dot(first, second).times(&factor).scaled(share));
            }
        }
        parts
    }

    fn potential(
        &self,
        cell: &ZoneCell<Dual>,
        levels: &Levels,
        set: std::ops::Range<usize>,
    ) -> Vec<Dual> {
        let farthest = levels
            .waves
            .iter()
            .map(|n| self.field.length_of(*n))
            .fold(0.0, f64::max);
        let reach = 2.0 * farthest;
        let radius = self.field.ends.map_or(reach, |ends| ends.min(reach));
        // One of ±G: V(−G)·S(−G) is the conjugate of V(G)·S(G).
        let half: Vec<[i32; 3]> = self
            .field
            .cell
            .indices(radius)
            .into_iter()
            .filter(|n| *n >= [0; 3])
            .collect();
        let responses = levels.responses(set, &half);
        half.iter()
            .zip(responses)
            .map(|(n, response)| {
                let twice = if *n == [0; 3] { 1.0 } else { 2.0 };
                let (real, imaginary) = self.field.component(cell, *n);
                real.scaled(twice * response.re)
                    .minus(&imaginary.scaled(twice * response.im))
            })
            .collect()
    }

    fn profile(
        &self,
        cell: &ZoneCell<Dual>,
        levels: &Levels,
        set: std::ops::Range<usize>,
    ) -> Vec<Dual> {
        let Some(piece) = self.field.crystal.potential.profile.first() else {
            return Vec::new();
        };
        let dimension = self.field.dimension;
        let size = GRID.get(dimension - 2).copied().unwrap_or(1);
        let total = size.pow(u32::try_from(dimension).unwrap_or(1));
        let states: Vec<Vec<Complex<f64>>> = set.map(|level| levels.coefficients(level)).collect();
        let share = 1.0 / (total * states.len().max(1)) as f64;
        let roots: Vec<Complex<f64>> = (0..size)
            .map(|step| Complex::cis(2.0 * PI * step as f64 / size as f64))
            .collect();
        let point = |index: usize, axis: usize| {
            if axis < dimension {
                index / size.pow(u32::try_from(axis).unwrap_or(0)) % size
            } else {
                0
            }
        };
        (0..total)
            .map(|index| {
                let at: [usize; 3] = std::array::from_fn(|axis| point(index, axis));
                let turns: Vec<Complex<f64>> = levels
                    .waves
                    .iter()
                    .map(|n| {
                        let steps: i64 = n
                            .iter()
                            .zip(at)
                            .map(|(n, at)| i64::from(*n) * at as i64)
                            .sum();
                        let place = steps.rem_euclid(size as i64);
                        let place = usize::try_from(place).unwrap_or(0);
                        roots.get(place).copied().unwrap_or_default()
                    })
                    .collect();
                let density: f64 = states
                    .iter()
                    .map(|state| {
                        let pairs = state.iter().zip(&turns);
                        pairs
                            .map(|(c, turn)| c * turn)
                            .sum::<Complex<f64>>()
                            .norm_sqr()
                    })
                    .sum();
                let place = cell.place(at.map(|at| at as f64 / size as f64));
                piece.formula.dual_at(&place).scaled(share * density)
            })
            .collect()
    }
}

/// |c_G|² averaged over a set.
fn weights(levels: &Levels, set: std::ops::Range<usize>) -> Vec<f64> {
    let count = set.len().max(1) as f64;
    let mut sums = vec![0.0; levels.waves.len()];
    for level in set {
        for (sum, c) in sums.iter_mut().zip(levels.coefficients(level)) {
            *sum += c.norm_sqr() / count;
        }
    }
    sums
}
