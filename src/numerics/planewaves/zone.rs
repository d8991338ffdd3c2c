//! Band edges, widths, masses and gaps over the whole zone.

use super::basis::Waves;
use super::edges::Found;
use super::extrema::{Kind, Target};
use super::plan::Plan;
use super::slopes::{Tensor, principal};
use super::{Budget, Error, Estimate, Lattice, Potential};
use rayon::prelude::*;

/// A plan, the levels on its mesh, and the tolerance.
type Prepared = (Plan, Vec<Vec<f64>>, Option<f64>);

/// How far to go.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Accuracy {
    /// One cheap cut-off and a coarse mesh.
    Coarse,
    /// The cut-off is raised until every edge is known to this much (in the units of k²).
    Settled(f64),
}

/// An extremum of a band.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Extremum {
    /// Its energy.
    pub energy: Estimate,
    /// Where, in fractions of the primitive reciprocal vectors: one of the equivalent points, in the first zone,
    /// without negative entries where there is one, then the largest by its entries in turn.
    pub k: [f64; 3],
    /// ½ ∂²E/∂k∂k, Cartesian: the inverse mass over that of a free particle. `None` at a crossing.
    pub inverse_mass: Option<[[f64; 3]; 3]>,
    /// The density-of-states mass of this one extremum over that of a free particle: |m₁m₂m₃|^{1/3}, |m₁m₂|^{1/2} or
    /// |m₁|, negative at a top. `None` at a crossing or where a curvature vanishes.
    pub mass: Option<Estimate>,
}

impl Extremum {
    /// The inverse masses along the principal axes (over that of a free particle) and these axes, Cartesian, by rising
    /// inverse mass; empty at a crossing. For lattices that lie in the first `dimension` coordinates.
    pub fn principal(&self, dimension: usize) -> Vec<(f64, [f64; 3])> {
        let tensor = self.inverse_mass.as_ref();
        let mut found = tensor.map_or(Vec::new(), |tensor| principal(tensor, dimension));
        found.sort_by(|a, b| a.0.total_cmp(&b.0));
        found
    }
}

/// One band.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Band {
    /// Its lowest energy.
    pub bottom: Extremum,
    /// Its highest energy.
    pub top: Extremum,
    /// Top minus bottom.
    pub width: Estimate,
}

/// The kinds of gap.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum GapKind {
    /// Both edges at one k.
    Direct,
    /// Edges at different k.
    Indirect,
    /// None, to within the error.
    Closed,
    /// The bands overlap in energy.
    Overlap,
}

/// The gap above a band.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Gap {
    /// Bottom of the next band minus top of this one; negative where they overlap.
    pub size: Estimate,
    /// Its kind.
    pub kind: GapKind,
}

/// The least distance between two neighbouring bands at one k.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Separation {
    /// That distance; zero within its error where they touch.
    pub size: Estimate,
    /// Where it is.
    pub k: [f64; 3],
}

/// The bands over the whole zone.
#[derive(Clone, Debug, PartialEq)]
pub struct Zone {
    /// The bands, lowest first.
    pub bands: Vec<Band>,
    /// The gap above each band.
    pub gaps: Vec<Gap>,
    /// The largest number of plane waves used.
    pub basis: usize,
    /// Eigenproblems and linear solves spent.
    pub spent: usize,
    /// Whether every edge is known as well as was asked for.
    pub settled: bool,
}

/// The lowest `bands` bands of a potential on a lattice.
///
/// # Errors
/// `FlatLattice`, `NotFinite`, `Cancelled`; `BudgetSpent` where not even the coarse answer fits the budget (an answer
/// that fits but has not settled is given, with `settled` false and its errors as they are).
pub fn solve(
    lattice: &Lattice,
    potential: Potential,
    bands: usize,
    accuracy: Accuracy,
    budget: &Budget,
) -> Result<Zone, Error> {
    Waves::new(lattice, potential)?.zone(bands, accuracy, budget)
}

impl Waves<'_> {
    /// See [`solve`].
    ///
    /// # Errors
    /// As [`solve`].
    pub fn zone(&self, bands: usize, accuracy: Accuracy, budget: &Budget) -> Result<Zone, Error> {
        let (plan, energies, tolerance) = self.prepared(bands, accuracy, budget)?;
        let targets: Vec<Target> = (0..=bands)
            .flat_map(|band| [Kind::Bottom, Kind::Top].map(|kind| Target { kind, band }))
            .filter(|target| target.band < bands || target.kind == Kind::Bottom)
            .collect();
        let found: Vec<Found> = targets
            .par_iter()
            .map(|target| self.extremum(*target, &plan, &energies, budget))
            .collect::<Result<_, _>>()?;
        self.assemble(bands, &found, &plan, tolerance, budget)
    }

    /// The least distance at one k between each of the lowest `bands` bands and the next.
    ///
    /// # Errors
    /// As [`solve`].
    pub fn separations(
        &self,
        bands: usize,
        accuracy: Accuracy,
        budget: &Budget,
    ) -> Result<Vec<Separation>, Error> {
        let (plan, energies, _) = self.prepared(bands, accuracy, budget)?;
        (0..bands)
            .into_par_iter()
            .map(|band| {
                let target = Target {
                    kind: Kind::Separation,
                    band,
                };
                let found = self.extremum(target, &plan, &energies, budget)?;
                Ok(Separation {
                    size: found.value,
                    k: self.symmetry.canonical(&self.frame, found.spot.k),
                })
            })
            .collect()
    }

    /// The plan and the levels on its mesh.
    fn prepared(
        &self,
        bands: usize,
        accuracy: Accuracy,
        budget: &Budget,
    ) -> Result<Prepared, Error> {
        let tolerance = match accuracy {
            Accuracy::Coarse => None,
            Accuracy::Settled(tolerance) => Some(tolerance),
        };
        if bands == 0 || bands > 10_000 || tolerance.is_some_and(|t| !(t.is_finite() && t > 0.0)) {
            return Err(Error::NotFinite);
        }
        let plan = self.plan(bands, tolerance, budget)?;
        let energies = self.energies_on(&plan.mesh, plan.count, plan.cut, budget)?;
        Ok((plan, energies, tolerance))
    }

    fn assemble(
        &self,
        bands: usize,
        found: &[Found],
        plan: &Plan,
        tolerance: Option<f64>,
        budget: &Budget,
    ) -> Result<Zone, Error> {
        let get =
            |kind: Kind, band: usize| found.iter().find(|f| f.target == Target { kind, band });
        let mut zone = Zone {
            bands: Vec::new(),
            gaps: Vec::new(),
            basis: found.iter().map(|f| f.basis).max().unwrap_or(0),
            spent: budget.spent(),
            settled: tolerance.is_some_and(|t| found.iter().all(|f| f.value.error <= t)),
        };
        for band in 0..bands {
            let parts = (
                get(Kind::Bottom, band),
                get(Kind::Top, band),
                get(Kind::Bottom, band + 1),
            );
            let (Some(bottom), Some(top), Some(next)) = parts else {
                continue;
            };
            let (low, high) = (self.extremum_of(bottom), self.extremum_of(top));
            zone.bands.push(Band {
                bottom: low,
                top: high,
                width: difference(high.energy, low.energy),
            });
            zone.gaps.push(self.gap(top, next, plan, budget)?);
        }
        Ok(zone)
    }

    fn gap(&self, top: &Found, next: &Found, plan: &Plan, budget: &Budget) -> Result<Gap, Error> {
        let (high, low) = (self.extremum_of(top), self.extremum_of(next));
        let mut size = difference(low.energy, high.energy);
        let same = (0..3).all(|i| (low.k[i] - high.k[i]).abs() < 1e-6);
        // Edges at one k that touch there: what is left out is left out of both alike.
        if same && size.value.abs() <= size.error {
            let direct = self.apart_at(top.spot.k, top.target.band, plan, budget)?;
            if direct.value.abs() <= direct.error {
                size = Estimate {
                    value: size.value.clamp(-direct.error, direct.error),
                    error: direct.error,
                };
            }
        }
        let kind = if size.value.abs() <= size.error {
            GapKind::Closed
        } else if size.value < 0.0 {
            GapKind::Overlap
        } else if same {
            GapKind::Direct
        } else {
            GapKind::Indirect
        };
        Ok(Gap { size, kind })
    }

    fn extremum_of(&self, found: &Found) -> Extremum {
        let sign = if found.target.kind == Kind::Top {
            -1.0
        } else {
            1.0
        };
        let k = self.tidy(found.spot.k);
        let canonical = self.symmetry.canonical(&self.frame, k);
        let tensor = found
            .tensor
            .map(|(tensor, error)| (tensor.map(|row| row.map(|x| 0.5 * sign * x)), 0.5 * error));
        Extremum {
            energy: Estimate {
                value: sign * found.value.value,
                error: found.value.error,
            },
            k: canonical,
            inverse_mass: tensor.map(|(tensor, _)| self.turned_to(canonical, k, &tensor)),
            mass: tensor.and_then(|(tensor, error)| {
                density_mass(&tensor, error, self.frame.dimension, sign)
            }),
        }
    }

    /// A tensor on the axes at `from`, as a Cartesian one at its equivalent `to`.
    fn turned_to(&self, to: [f64; 3], from: [f64; 3], tensor: &Tensor) -> Tensor {
        let frame = &self.frame;
        let d = frame.dimension;
        let matches = |m: &&super::symmetry::Rotation| {
            let image = super::symmetry::rotate_real(m, from);
            (0..3).all(|i| {
                let gap = image[i] - to[i];
                (gap - gap.round()).abs() < 1e-6
            })
        };
        let Some(m) = self.symmetry.operations.iter().find(matches) else {
            return *tensor;
        };
        // R e = the wave whose fractions are M times those of e.
        let turned: [[f64; 3]; 3] = std::array::from_fn(|i| {
            if i < d {
                frame.wave(super::symmetry::rotate_real(
                    m,
                    frame.fractions(frame.axes[i]),
                ))
            } else {
                [0.0; 3]
            }
        });
        std::array::from_fn(|x| {
            std::array::from_fn(|y| {
                (0..d)
                    .flat_map(|i| (0..d).map(move |j| (i, j)))
                    .map(|(i, j)| turned[i][x] * tensor[i][j] * turned[j][y])
                    .sum()
            })
        })
    }
}

fn difference(a: Estimate, b: Estimate) -> Estimate {
    Estimate {
        value: a.value - b.value,
        error: a.error + b.error,
    }
}

/// |Π 1/wᵢ|^{1/d} with the sign of the extremum; `None` where a curvature is zero within its error or of the wrong sign.
fn density_mass(tensor: &Tensor, error: f64, dimension: usize, sign: f64) -> Option<Estimate> {
    let principal = principal(tensor, dimension);
    let mut product = 1.0;
    let mut relative = 0.0;
    for (inverse, _) in &principal {
        if inverse * sign <= 2.0 * error.max(1e-9) {
            return None;
        }
        product *= inverse.abs();
        relative += error / inverse.abs();
    }
    let value = product.powf(-1.0 / dimension as f64);
    (principal.len() == dimension).then_some(Estimate {
        value: sign * value,
        error: value * (relative / dimension as f64 + 1e-12),
    })
}
