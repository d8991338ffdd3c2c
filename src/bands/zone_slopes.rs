//! Exact derivatives of levels, edges, gaps, hoppings, Fermi levels and masses in two and three dimensions.
//!
//! Each is a weighted sum of levels (`zone_density.rs`). An edge is an extremum in k, so that it may stand still; a hopping
//! is a Fourier coefficient of a band; a Fermi level moves with the levels at the Fermi surface; a mass has the second
//! derivatives by k of what its level does. Within a degenerate set the average is meant, as for changes that keep the
//! symmetry.

use crate::model::{Crystal, Dual, ParameterId};

use super::quantity::sum_slopes;
use super::zone_cell::ZoneCell;
use super::zone_field::ZoneField;
use super::zone_solve::{Effort, Zone, unsolved, with_zone, zone_budget};
use super::{Cancelled, Extremum, Feature, Sensitivity, Solver, Unsolved};

/// Derivatives by parameter, in joule per SI unit.
pub(super) type Slopes = Vec<(ParameterId, f64)>;

/// Levels this close, in the largest |bᵢ|², are one set.
const TOGETHER: f64 = 1e-6;
/// Levels are settled to this, in the largest |bᵢ|²: derivatives need no more.
const SETTLED: f64 = 1e-6;

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

/// Of the Fermi level at `levels` filled levels, inside bands.
pub(super) fn fermi_slopes(
    crystal: &Crystal,
    levels: f64,
    cancelled: &Cancelled<'_>,
) -> Result<Slopes, Unsolved> {
    let field = ZoneField::new(crystal)?;
    with_zone(&field, |zone| {
        let budget = zone_budget(&field, crystal.bands, Effort::Fine, cancelled);
        let density = zone.waves.fermi_density(levels, &budget);
        Ok(zone.dual(&density.map_err(unsolved)?)?.slopes)
    })
}

/// Of the mass at an extremum of a band (counted from 1), its magnitude, in kilogram per SI unit.
///
/// With E_κκ the second derivatives by the fractions of k, m = ħ² |det E_κκ|^{−1/d} (2π)² volume^{−2/d}.
pub(super) fn mass_slopes(
    crystal: &Crystal,
    band: usize,
    edge: &Extremum,
    cancelled: &Cancelled<'_>,
) -> Result<Slopes, Unsolved> {
    let mass = edge.mass.map_or(0.0, |mass| mass.value.abs());
    let field = ZoneField::new(crystal)?;
    let cell = ZoneCell::<Dual>::new(crystal).ok_or(Unsolved::BrokenModel)?;
    with_zone(&field, |zone| {
        let budget = zone_budget(&field, band, Effort::Fine, cancelled);
        let found = zone
            .waves
            .settled_at(kernel_k(&edge.k), band + 2, SETTLED * zone.unit, &budget)
            .map_err(unsolved)?;
        let density = zone
            .waves
            .mass_density(&found.levels, band.saturating_sub(1), &budget)
            .map_err(unsolved)?;
        let bent = zone.dual(&density)?;
        let share = -mass / field.dimension as f64;
        let by_volume = 2.0 * share / cell.volume.value;
        Ok(sum_slopes(&[
            (share / field.scale.energy, &bent.slopes),
            (by_volume, &cell.volume.slopes),
        ]))
    })
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
        let set = found
            .levels
            .degenerate_with(band.saturating_sub(1), TOGETHER * self.unit);
        let density = found.levels.density(set).map_err(unsolved)?;
        Ok(self.dual(&density)?.slopes)
    }
}
