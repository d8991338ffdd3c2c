//! Bands of a two- or three-dimensional crystal: the plane-wave kernel's answer in SI units, with named points.

use nalgebra::Complex;

use crate::model::Crystal;
use crate::numerics::planewaves::{
    self, Accuracy, Budget, Decay, Error, Estimate, Lattice, Potential, Waves,
};

use super::filling::{Filled, class};
use super::solve::{MOST_BANDS, filled, gap_above};
use super::zone_field::ZoneField;
use super::zone_names::ZoneNames;
use super::{Band, Cancelled, Extremum, Gap, GapKind, MassAxis, Measured, Solution, Unsolved};

/// How much work an answer may take.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Effort {
    /// As good as is worth waiting for.
    Fine,
    /// A first answer while one types.
    Coarse,
}

/// What edges are settled to, in the largest |bᵢ|²: where the components end, in two and three dimensions, and where
/// they do not.
const SETTLED: [f64; 3] = [1e-10, 1e-6, 1e-5];
/// An answer whose edges are less certain than this, in the largest |bᵢ|², is none.
const USELESS: f64 = 0.05;
/// The Fermi level of a metal, in the largest |bᵢ|², in two and three dimensions.
const FERMI: [f64; 2] = [5e-6, 4e-5];

/// The sum of the cubes of all bases, coarse and fine: about a second and some ten seconds of one core.
const COST: [f64; 2] = [2e9, 2e10];

/// A crystal with its plane waves, and the unit |b|² of its tolerances.
pub(super) struct Zone<'a> {
    pub field: &'a ZoneField<'a>,
    pub waves: Waves<'a>,
    /// The largest |bᵢ|² in the scale's units.
    pub unit: f64,
}

/// The largest basis, and how many eigenproblems may be solved.
pub(super) fn zone_budget<'a>(
    field: &ZoneField<'_>,
    bands: usize,
    effort: Effort,
    cancelled: &'a Cancelled<'a>,
) -> Budget<'a> {
    let (basis, solves) = match (field.dimension, effort, field.ends.is_some()) {
        (2, Effort::Coarse, _) => (320, 8_000),
        (_, Effort::Coarse, _) => (420, 8_000),
        (2, Effort::Fine, true) => (700, 40_000),
        (2, Effort::Fine, false) => (1000, 40_000),
        (_, Effort::Fine, true) => (400, 20_000),
        (_, Effort::Fine, false) => (1000, 20_000),
    };
    // Room for as many bands as are asked for, up to where matrices take seconds each.
    let basis = basis.max((4 * bands + 60).min(1400));
    Budget::new(cancelled, basis, solves).within(match effort {
        Effort::Coarse => COST[0],
        Effort::Fine => COST[1],
    })
}

/// Why the kernel gave up, for the user.
pub(super) fn unsolved(error: Error) -> Unsolved {
    let why = match error {
        Error::Cancelled => return Unsolved::Cancelled,
        Error::FlatLattice => return Unsolved::BrokenModel,
        Error::NotFinite => "the potential, a length or a mass is not finite",
        Error::BudgetSpent => "these bands want more plane waves or more work than is allowed",
        Error::Touching => "the band touches another",
    };
    Unsolved::NotConverged(why.into())
}

/// Makes a field's plane waves and hands them on.
pub(super) fn with_zone<R>(
    field: &ZoneField<'_>,
    then: impl FnOnce(&Zone<'_>) -> Result<R, Unsolved>,
) -> Result<R, Unsolved> {
    let scaled: Vec<[f64; 3]> = field
        .cell
        .vectors
        .iter()
        .map(|row| row.map(|entry| entry / field.scale.length))
        .collect();
    let lattice = Lattice::new(&scaled).map_err(unsolved)?;
    let components = |n: [i32; 3]| -> Complex<f64> { field.dimensionless(n) };
    let bound = |g: f64| field.bound(g / field.scale.length) / field.scale.energy;
    let decay = match field.ends {
        Some(radius) => Decay::Finite {
            radius: radius * field.scale.length * (1.0 + 1e-9),
        },
        None => Decay::Bounded(&bound),
    };
    resolvable(field)?;
    let potential = Potential {
        components: &components,
        decay,
    };
    let waves = Waves::new(&lattice, potential).map_err(unsolved)?;
    let unit = lattice
        .reciprocal()
        .iter()
        .map(|row| row.iter().map(|entry| entry * entry).sum())
        .fold(0.0, f64::max);
    then(&Zone { field, waves, unit })
}

/// A wave finer than a twentieth or so of the cell is past what plane waves are used for here.
fn resolvable(field: &ZoneField<'_>) -> Result<(), Unsolved> {
    let most = field
        .cell
        .radius_for(if field.dimension == 2 { 6400.0 } else { 9600.0 });
    match field.ends {
        Some(ends) if ends > most => Err(Unsolved::NotConverged(
            "the potential varies on lengths far below the cell's".into(),
        )),
        _ => Ok(()),
    }
}

/// Solves a crystal of dimension 2 or 3.
pub(super) fn zone_solution(
    crystal: &Crystal,
    effort: Effort,
    cancelled: &Cancelled<'_>,
) -> Result<Solution, Unsolved> {
    let field = ZoneField::new(crystal)?;
    let count = crystal.bands.clamp(1, MOST_BANDS);
    let budget = zone_budget(&field, count, effort, cancelled);
    with_zone(&field, |zone| {
        let accuracy = match effort {
            Effort::Coarse => Accuracy::Coarse,
            Effort::Fine => Accuracy::Settled(zone.tolerance()),
        };
        let found = match zone.waves.zone(count, accuracy, &budget) {
            // What the budget allows, with its wider bounds, is better than nothing.
            Err(Error::BudgetSpent) if effort == Effort::Fine => {
                let budget = zone_budget(&field, count, Effort::Coarse, cancelled);
                zone.waves.zone(count, Accuracy::Coarse, &budget)
            }
            found => found,
        };
        let found = found.map_err(unsolved)?;
        zone.check(&found)?;
        let names = ZoneNames::new(crystal, &zone.waves);
        let bands: Vec<Band> = found
            .bands
            .iter()
            .map(|band| Band {
                bottom: zone.extremum(&names, &band.bottom),
                top: zone.extremum(&names, &band.top),
                width: zone.spread(band.width),
            })
            .collect();
        let gaps: Vec<Gap> = found.gaps.iter().map(|gap| zone.gap(gap)).collect();
        let filled = filled(crystal);
        let fermi = match filled {
            Some(filled) => zone.fermi(filled, &bands, &gaps, effort, cancelled)?,
            None => None,
        };
        Ok(Solution {
            potential: super::zone_range::potential_range(&field, cancelled)?,
            class: filled.and_then(|filled| class(filled, gap_above(filled, &gaps))),
            bands,
            gaps,
            fermi,
            fine: effort == Effort::Fine,
        })
    })
}

impl Zone<'_> {
    /// What edges are settled to.
    pub fn tolerance(&self) -> f64 {
        let [flat, solid, endless] = SETTLED;
        let share = match (self.field.ends, self.field.dimension) {
            (None, _) => endless,
            (Some(_), 2) => flat,
            (Some(_), _) => solid,
        };
        self.unit * share
    }

    /// An energy in joule; what a profile's grid missed counts as uncertain.
    pub fn energy(&self, estimate: Estimate) -> Measured {
        let scale = self.field.scale.energy;
        Measured {
            value: estimate.value * scale,
            uncertainty: estimate.error * scale + self.field.missed,
        }
    }

    /// A difference of two energies.
    fn spread(&self, estimate: Estimate) -> Measured {
        let mut spread = self.energy(estimate);
        spread.uncertainty += self.field.missed;
        spread
    }

    fn check(&self, found: &planewaves::Zone) -> Result<(), Unsolved> {
        let edges = found.bands.iter().flat_map(|band| [band.bottom, band.top]);
        let worst = edges.map(|edge| edge.energy.error).fold(0.0, f64::max);
        let missed = self.field.missed / self.field.scale.energy;
        if worst + missed <= USELESS * self.unit {
            return Ok(());
        }
        Err(Unsolved::NotConverged(format!(
            "{} plane waves leave the edges uncertain by a twentieth of the energy scale of the cell or more",
            found.basis
        )))
    }

    fn extremum(&self, names: &ZoneNames<'_>, found: &planewaves::Extremum) -> Extremum {
        let k: Vec<f64> = found.k.iter().take(self.field.dimension).copied().collect();
        let mass = self.field.scale.mass;
        Extremum {
            energy: self.energy(found.energy),
            point: names.name(found.k),
            k,
            mass: found.mass.map(|estimate| Measured {
                value: estimate.value * mass,
                uncertainty: estimate.error * mass,
            }),
            axes: self.axes(found),
        }
    }

    /// The masses along the principal axes; each is known at least as well, relatively, as as many times the mean mass.
    fn axes(&self, found: &planewaves::Extremum) -> Vec<MassAxis> {
        let dimension = self.field.dimension;
        let Some(mean) = found.mass else {
            return Vec::new();
        };
        let share = dimension as f64 * (mean.error / mean.value).abs();
        let principal = found.principal(dimension).into_iter();
        principal
            .map(|(inverse, along)| {
                let mass = self.field.scale.mass / inverse;
                MassAxis {
                    mass: Measured {
                        value: mass,
                        uncertainty: mass.abs() * share,
                    },
                    along: along.iter().take(dimension).copied().collect(),
                }
            })
            .collect()
    }

    fn gap(&self, found: &planewaves::Gap) -> Gap {
        let size = self.spread(found.size);
        let kind = match found.kind {
            planewaves::GapKind::Closed => GapKind::Closed,
            // Less certain than the kernel thought, where a profile was not resolved.
            _ if size.value.abs() <= size.uncertainty => GapKind::Closed,
            planewaves::GapKind::Direct => GapKind::Direct,
            planewaves::GapKind::Indirect => GapKind::Indirect,
            planewaves::GapKind::Overlap => GapKind::Overlap,
        };
        Gap { size, kind }
    }

    /// The Fermi level: in the middle of an open gap, else where the filling ends.
    fn fermi(
        &self,
        filled: Filled,
        bands: &[Band],
        gaps: &[Gap],
        effort: Effort,
        cancelled: &Cancelled<'_>,
    ) -> Result<Option<Measured>, Unsolved> {
        let levels = match filled {
            Filled::None => return Ok(None),
            Filled::Whole(whole) => {
                let top = whole.checked_sub(1).and_then(|index| bands.get(index));
                let Some((top, gap)) = top.zip(gap_above(filled, gaps)) else {
                    return Ok(None);
                };
                if gap.kind != GapKind::Overlap {
                    return Ok(Some(Measured {
                        value: top.top.energy.value + 0.5 * gap.size.value,
                        uncertainty: top.top.energy.uncertainty + 0.5 * gap.size.uncertainty,
                    }));
                }
                whole as f64
            }
            Filled::Part(part) if part < bands.len() as f64 => part,
            Filled::Part(_) => return Ok(None),
        };
        let [flat, solid] = FERMI;
        let share = match (self.field.dimension, effort) {
            (_, Effort::Coarse) => 1e-2,
            (2, Effort::Fine) => flat,
            _ => solid,
        };
        let budget = zone_budget(self.field, bands.len(), effort, cancelled);
        let found = self
            .waves
            .fermi(levels, share * self.unit, &budget)
            .map_err(unsolved)?;
        Ok(Some(self.energy(found.level)))
    }
}
