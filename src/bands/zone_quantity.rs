//! Levels and hoppings of two- and three-dimensional crystals.

use crate::model::Crystal;
use crate::numerics::planewaves::Error;

use super::quantity::Untested;
use super::zone_field::ZoneField;
use super::zone_slopes::kernel_k;
use super::zone_solve::{Effort, unsolved, with_zone, zone_budget};
use super::{Cancelled, Measured, Unsolved};

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

/// J_R of a band (from 1), R in cells of the primitive vectors.
pub(super) fn hopping(
    crystal: &Crystal,
    number: usize,
    hop: &[i64],
    cancelled: &Cancelled<'_>,
) -> Result<Measured, Untested> {
    if hop.iter().any(|cells| cells.abs() > FARTHEST) {
        return Err(Untested::Because("the hop is too far".into()));
    }
    let cells = std::array::from_fn(|axis| {
        let cells = hop.get(axis).copied().unwrap_or(0);
        i32::try_from(cells).unwrap_or(0)
    });
    let field = ZoneField::new(crystal)?;
    let found = with_zone(&field, |zone| {
        let budget = zone_budget(&field, number, Effort::Fine, cancelled);
        let [flat, solid] = HOPPING;
        let share = if field.dimension == 2 { flat } else { solid };
        let found = zone.waves.hopping(
            number.saturating_sub(1),
            &[cells],
            share * zone.unit,
            &budget,
        );
        match found {
            Err(Error::Touching) => Ok(None),
            Err(error) => Err(unsolved(error)),
            Ok(found) => match found.first() {
                Some(found) => Ok(Some(zone.energy(*found))),
                None => Err(Unsolved::BrokenModel),
            },
        }
    })?;
    found.ok_or_else(|| {
        Untested::Because(format!(
            "band {number} touches another, so it has no hopping of its own"
        ))
    })
}
