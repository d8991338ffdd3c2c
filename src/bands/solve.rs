//! The bands of one crystal.

use crate::model::Crystal;
use crate::numerics::{self, BandEdge, Bounded, Budget, Wave};

use super::chain::{Chain, unsolved};
use super::filling::{Filled, class};
use super::{Band, Extremum, Gap, GapKind, Measured, Solution, Unsolved};

/// More bands than this are not solved for: no use of the format needs them.
pub(super) const MOST_BANDS: usize = 400;

/// Solves a crystal of dimension 1.
pub(super) fn chain_solution(crystal: &Crystal, budget: &Budget<'_>) -> Result<Solution, Unsolved> {
    let chain = Chain::new(crystal, budget)?;
    let count = crystal.bands.clamp(1, MOST_BANDS);
    let found = numerics::solve(&chain.cell, count, budget).map_err(unsolved)?;
    let bands: Vec<Band> = found
        .bands
        .iter()
        .take(count)
        .map(|band| Band {
            bottom: extremum(&chain, &band.bottom),
            top: extremum(&chain, &band.top),
            width: chain.energy(band.width),
        })
        .collect();
    let gaps: Vec<Gap> = found
        .gaps
        .iter()
        .take(count)
        .map(|gap| Gap {
            size: chain.energy(gap.size),
            kind: if gap.closed {
                GapKind::Closed
            } else {
                GapKind::Direct
            },
        })
        .collect();
    let filled = filled(crystal);
    let class = filled.and_then(|filled| class(filled, gap_above(filled, &gaps)));
    let fermi = match filled {
        Some(filled) => fermi(&chain, filled, &bands, &gaps, budget)?,
        None => None,
    };
    let potential = super::range::potential_range(&chain.field, budget)?;
    Ok(Solution {
        bands,
        gaps,
        potential,
        fermi,
        class,
        fine: true,
    })
}

fn extremum(chain: &Chain<'_>, edge: &BandEdge) -> Extremum {
    let (k, point) = match edge.at {
        Wave::Centre => (0.0, "centre"),
        Wave::Edge => (0.5, "edge"),
    };
    Extremum {
        energy: chain.energy(edge.energy),
        k: vec![k],
        point: Some(point.to_string()),
        mass: edge.mass.map(|mass| chain.mass(mass)),
        axes: Vec::new(),
    }
}

/// What a crystal's filling amounts to; `None` where it has none.
pub(super) fn filled(crystal: &Crystal) -> Option<Filled> {
    let particles = crystal.filling.as_ref().filter(|_| !crystal.bosons)?;
    Some(Filled::new(particles.value, crystal.degeneracy))
}

/// The gap above whole filled bands.
pub(super) fn gap_above(filled: Filled, gaps: &[Gap]) -> Option<&Gap> {
    match filled {
        Filled::Whole(bands) => gaps.get(bands.checked_sub(1)?),
        _ => None,
    }
}

/// The Fermi level: in the middle of the gap above whole bands, inside a band partly filled.
fn fermi(
    chain: &Chain<'_>,
    filled: Filled,
    bands: &[Band],
    gaps: &[Gap],
    budget: &Budget<'_>,
) -> Result<Option<Measured>, Unsolved> {
    match filled {
        Filled::None => Ok(None),
        Filled::Whole(whole) => {
            let top = whole
                .checked_sub(1)
                .and_then(|index| bands.get(index))
                .map(|band| band.top.energy);
            Ok(top.zip(gap_above(filled, gaps)).map(|(top, gap)| Measured {
                value: top.value + 0.5 * gap.size.value,
                uncertainty: top.uncertainty + 0.5 * gap.size.uncertainty,
            }))
        }
        Filled::Part(part) if part < bands.len() as f64 => {
            let level: Bounded = numerics::fermi(&chain.cell, part, budget).map_err(unsolved)?;
            Ok(Some(chain.energy(level)))
        }
        Filled::Part(_) => Ok(None),
    }
}
