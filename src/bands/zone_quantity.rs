//! Levels and hoppings of two- and three-dimensional crystals.

use crate::model::Crystal;
use crate::numerics::planewaves::{Density, Error, Estimate};

use super::quantity::Untested;
use super::zone_field::ZoneField;
use super::zone_slopes::{Slopes, kernel_k};
use super::zone_solve::{Effort, Zone, unsolved, with_zone, zone_budget};
use super::{Cancelled, Measured};

/// Hoppings to this, in the largest |bᵢ|², in two and three dimensions.
const HOPPING: [f64; 2] = [1e-9, 1e-7];
/// No hop goes farther: cells along one vector.
const FARTHEST: i64 = 1000;

/// The level of a band (from 1) at a point in fractions of the primitive reciprocal vectors.
pub(super) fn level(
    crystal: &Crystal,
    number: usize,
    k: &[f64],
    cancelled: &Cancelled<'_>,
) -> Result<Measured, Untested> {
    let field = ZoneField::new(crystal)?;
    let found = with_zone(&field, |zone| {
        let budget = zone_budget(&field, number, Effort::Fine, cancelled);
        let found = zone
            .waves
            .settled_at(kernel_k(k), number, zone.tolerance(), &budget)
            .map_err(unsolved)?;
        let energy = found.energies.get(number.wrapping_sub(1)).copied();
        let energy = energy.map(|energy| zone.energy(energy));
        energy.ok_or_else(|| unsolved(Error::BudgetSpent))
    })?;
    Ok(found)
}

/// J_R of a band (from 1), R in cells of the primitive vectors, and its derivatives where they are wanted.
pub(super) fn hopping(
    crystal: &Crystal,
    number: usize,
    hop: &[i64],
    with_slopes: bool,
    cancelled: &Cancelled<'_>,
) -> Result<(Measured, Slopes), Untested> {
    if hop.iter().any(|cells| cells.abs() > FARTHEST) {
        return Err(Untested::Because("the hop is too far".into()));
    }
    let cell = std::array::from_fn(|axis| {
        let cells = hop.get(axis).copied().unwrap_or(0);
        i32::try_from(cells).unwrap_or(0)
    });
    let field = ZoneField::new(crystal)?;
    let found = with_zone(&field, |zone| {
        match zone.hopping(number.saturating_sub(1), cell, with_slopes, cancelled) {
            Err(Error::Touching) => Ok(None),
            Err(error) => Err(unsolved(error)),
            Ok((found, None)) => Ok(Some((zone.energy(found), Slopes::new()))),
            Ok((found, Some(density))) => {
                Ok(Some((zone.energy(found), zone.dual(&density)?.slopes)))
            }
        }
    })?;
    found.ok_or_else(|| {
        Untested::Because(format!(
            "band {number} touches another, so it has no hopping of its own"
        ))
    })
}

impl Zone<'_> {
    fn hopping(
        &self,
        band: usize,
        cell: [i32; 3],
        with_slopes: bool,
        cancelled: &Cancelled<'_>,
    ) -> Result<(Estimate, Option<Density>), Error> {
        let budget = zone_budget(self.field, band + 1, Effort::Fine, cancelled);
        let [flat, solid] = HOPPING;
        let share = if self.field.dimension == 2 {
            flat
        } else {
            solid
        };
        let tolerance = share * self.unit;
        if with_slopes {
            let (found, density) = self.waves.hopping_density(band, cell, tolerance, &budget)?;
            return Ok((found, Some(density)));
        }
        let found = self.waves.hopping(band, &[cell], tolerance, &budget)?;
        let first = found.first().copied().ok_or(Error::NotFinite)?;
        Ok((first, None))
    }
}
