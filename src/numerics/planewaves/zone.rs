//! Band edges, widths, masses and gaps over the whole zone.

use super::basis::Waves;
use super::extrema::{Kind, Search, Seat, Spot, Target, descent, distance, starts};
use super::levels::Basis;
use super::mesh::Mesh;
use super::settle::Prediction;
use super::slopes::{Tensor, principal};
use super::{Budget, Error, Estimate, Lattice, Levels, Potential};
use rayon::prelude::*;
use rustc_hash::FxHashMap;
use std::sync::{Arc, Mutex, OnceLock, PoisonError};

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
    /// The least distance between the two bands at one k; zero within its error where they touch.
    pub direct: Estimate,
    /// Where that is.
    pub direct_k: [f64; 3],
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

/// An extremum with its levels at the last cut.
struct Found {
    spot: Spot,
    target: Target,
    /// The target's function (energy, its negative, separation).
    value: Estimate,
    tensor: Option<(Tensor, f64)>,
    basis: usize,
}

/// The cut-offs to go through.
struct Plan {
    bands: usize,
    /// Levels to solve for.
    count: usize,
    mesh: Mesh,
    /// The cut of the search.
    cut: f64,
    /// Settle to this.
    tolerance: Option<f64>,
    solved: Solved,
}

/// A point solved at one cut.
struct Point {
    basis: Basis,
    levels: Levels,
    predictions: Vec<Prediction>,
}

type Key = ([i64; 3], u64);
type Slot = Arc<OnceLock<Result<Arc<Point>, Error>>>;

/// Points solved so far: many extrema share one.
#[derive(Default)]
struct Solved(Mutex<FxHashMap<Key, Slot>>);

impl Solved {
    fn at(
        &self,
        waves: &Waves,
        k: [f64; 3],
        cut: f64,
        count: usize,
        budget: &Budget,
    ) -> Result<Arc<Point>, Error> {
        let key = (k.map(|x| (x * 1e11).round() as i64), cut.to_bits());
        let slot = Arc::clone(
            self.0
                .lock()
                .unwrap_or_else(PoisonError::into_inner)
                .entry(key)
                .or_default(),
        );
        slot.get_or_init(|| {
            let basis = waves.basis(k, cut);
            let levels = waves.solve_on(&basis, k, count, true, budget)?;
            let predictions = waves.predict(&levels, cut)?;
            Ok(Arc::new(Point {
                basis,
                levels,
                predictions,
            }))
        })
        .clone()
    }
}

/// Second derivatives are taken on bases up to this size.
const LARGEST_FOR_MASSES: usize = 450;

impl Waves<'_> {
    /// See [`solve`].
    ///
    /// # Errors
    /// As [`solve`].
    pub fn zone(&self, bands: usize, accuracy: Accuracy, budget: &Budget) -> Result<Zone, Error> {
        let tolerance = match accuracy {
            Accuracy::Coarse => None,
            Accuracy::Settled(tolerance) => Some(tolerance),
        };
        if bands == 0 || bands > 10_000 || tolerance.is_some_and(|t| !(t.is_finite() && t > 0.0)) {
            return Err(Error::NotFinite);
        }
        let plan = self.plan(bands, tolerance, budget)?;
        let energies = self.energies_on(&plan.mesh, plan.count, plan.cut, budget)?;
        let targets: Vec<Target> = (0..=bands)
            .flat_map(|band| {
                [Kind::Bottom, Kind::Top, Kind::Separation].map(|kind| Target { kind, band })
            })
            .filter(|target| target.band < bands || target.kind == Kind::Bottom)
            .collect();
        let found: Vec<Found> = targets
            .par_iter()
            .map(|target| self.extremum(*target, &plan, &energies, budget))
            .collect::<Result<_, _>>()?;
        Ok(self.assemble(bands, &found, tolerance, budget))
    }

    /// The first cut and mesh.
    fn plan(&self, bands: usize, tolerance: Option<f64>, budget: &Budget) -> Result<Plan, Error> {
        let d = self.frame.dimension;
        let cut = self.first_cut(bands);
        let cut = if tolerance.is_some() {
            self.search_cut(bands, cut, budget)?
        } else {
            cut
        };
        let many = self.operations() >= 8;
        // Bands that need a large basis are narrow ones, which a coarse mesh resolves.
        let size = self.frame.expected(cut);
        let most = match d {
            1 => 48,
            2 if tolerance.is_none() || size > 200.0 => 12,
            2 => 24,
            _ if size > 300.0 => 4,
            _ if size > 170.0 || (tolerance.is_none() && !many) => 8,
            _ => 12,
        };
        Ok(Plan {
            bands,
            count: bands + 3,
            mesh: self.mesh(most),
            cut,
            tolerance,
            solved: Solved::default(),
        })
    }

    /// A cut with room above the wanted bands: enough waves, and kinetic energies above the potential's size.
    pub(super) fn first_cut(&self, bands: usize) -> f64 {
        let d = self.frame.dimension;
        let extra = [8.0, 16.0, 30.0][d - 1];
        let by_count = self.frame.cut_for(2.0 * (bands + 3) as f64 + extra);
        let free = self.frame.cut_for((bands + 3) as f64);
        by_count.max(free + 2.0 * self.swing)
    }

    /// The cut at which the zone is searched: what is left out is small beside the narrowest band, or the basis is no
    /// longer small.
    fn search_cut(&self, bands: usize, first: f64, budget: &Budget) -> Result<f64, Error> {
        let d = self.frame.dimension;
        let probes =
            [[0.0; 3], [0.5, 0.0, 0.0], [0.5; 3], [0.25, 0.125, 0.375]].map(|k| self.inside(k));
        // Predictions are better than the levels themselves by about ten; they are used where they are cheap.
        let fair = if self.few.is_some() { 0.1 } else { 0.02 };
        let largest = [120.0_f64, 300.0, 420.0][d - 1]
            .max(2.5 * bands as f64)
            .min(budget.max_basis as f64 / 1.3);
        let mut cut = first;
        for _ in 0..16 {
            let mut levels: Vec<Vec<Prediction>> = Vec::new();
            for k in probes {
                let solved = self.solve_on(&self.basis(k, cut), k, bands + 1, true, budget)?;
                levels.push(self.predict(&solved, cut)?);
            }
            let good = (0..=bands).all(|band| {
                let at = |f: &dyn Fn(&Prediction) -> f64| -> Vec<f64> {
                    levels.iter().filter_map(|l| l.get(band)).map(f).collect()
                };
                let (values, left_out) = (at(&|p| p.value), at(&|p| p.left_out));
                let high = values.iter().copied().fold(f64::NEG_INFINITY, f64::max);
                let low = values.iter().copied().fold(f64::INFINITY, f64::min);
                let worst = left_out.iter().copied().fold(0.0, f64::max);
                worst <= (fair * (high - low)).min(1e-3 * self.frame.unit())
            });
            let larger = self.frame.cut_for(1.4 * self.frame.expected(cut));
            if good || self.frame.expected(larger) > largest {
                break;
            }
            cut = larger;
        }
        Ok(cut)
    }

    /// Searches for one extremum and settles it.
    fn extremum(
        &self,
        target: Target,
        plan: &Plan,
        energies: &[Vec<f64>],
        budget: &Budget,
    ) -> Result<Found, Error> {
        let unit = self.frame.unit();
        let spots = self.spots(target, plan, energies, budget)?;
        let mut best: Option<Found> = None;
        for spot in spots {
            // One that is worse by more than both their errors at this cut need not be settled.
            let found = self.settle(target, spot, plan, budget)?;
            let better = best
                .as_ref()
                .is_none_or(|other| found.value.value < other.value.value - 1e-12 * unit);
            if better {
                best = Some(found);
            }
        }
        best.ok_or(Error::NotFinite)
    }

    /// The extrema found at the search cut that may be the least, best first.
    fn spots(
        &self,
        target: Target,
        plan: &Plan,
        energies: &[Vec<f64>],
        budget: &Budget,
    ) -> Result<Vec<Spot>, Error> {
        let unit = self.frame.unit();
        let spacing = std::array::from_fn(|i| {
            if i < self.frame.dimension {
                1.0 / plan.mesh.size[i] as f64
            } else {
                0.0
            }
        });
        let mut spots: Vec<Spot> = Vec::new();
        let most = if plan.tolerance.is_some() { 6 } else { 3 };
        for (point, _, floor) in starts(&plan.mesh, energies, target, 1e-11 * unit)
            .into_iter()
            .take(most)
        {
            let best = spots
                .iter()
                .map(|spot| spot.value)
                .fold(f64::INFINITY, f64::min);
            if floor > best + 1e-3 * unit {
                continue;
            }
            let start = plan.mesh.points[point];
            let search = Search {
                waves: self,
                target,
                basis: self.basis(start, plan.cut),
                count: plan.count,
                spacing,
                budget,
            };
            let spot = search.run(start)?;
            // Plateaus and symmetric copies lead to one another's value.
            if !spots
                .iter()
                .any(|other| (other.value - spot.value).abs() < 1e-11 * unit)
            {
                spots.push(spot);
            }
        }
        spots.sort_by(|a, b| a.value.total_cmp(&b.value));
        let best = spots.first().map_or(0.0, |spot| spot.value);
        // What the search cut leaves out may reorder extrema this close.
        let margin = if plan.tolerance.is_some() { 4e-3 } else { 1e-3 } * unit;
        spots.retain(|spot| spot.value <= best + margin);
        spots.truncate(3);
        Ok(spots)
    }

    /// Raises the cut at one extremum until its value is known to the tolerance.
    fn settle(
        &self,
        target: Target,
        spot: Spot,
        plan: &Plan,
        budget: &Budget,
    ) -> Result<Found, Error> {
        let mut spot = spot;
        spot.k = self.symmetry.canonical(&self.frame, self.tidy(spot.k));
        let mut lower: Option<Arc<Point>> = None;
        let mut count = self.frame.expected(plan.cut);
        let mut cut = plan.cut;
        let mut tensors: Vec<Tensor> = Vec::new();
        loop {
            let point = plan.solved.at(self, spot.k, cut, plan.count, budget)?;
            let (levels, predictions) = (&point.levels, &point.predictions);
            let polished = self.polish(target, &mut spot, &point, &mut tensors, budget)?;
            let mut value = self.judge(
                target,
                levels,
                predictions,
                lower.as_ref().map(|l| l.predictions.as_slice()),
            );
            value.value -= polished;
            value.error += 0.5 * polished;
            if let Seat::Creased(rise) = spot.seat {
                value.error += rise + predictions.first().map_or(0.0, |p| p.left_out);
            }
            let next = self.frame.cut_for(1.6 * count);
            let room = self.frame.expected(next) * 1.25 + 20.0 <= budget.max_basis as f64;
            let enough = plan
                .tolerance
                .is_none_or(|tolerance| value.error <= tolerance);
            // A first cut without one below it is judged by δ alone; masses need two cuts.
            let masses =
                target.kind == Kind::Separation || tensors.len() >= 2 || tensors.is_empty();
            if !room
                || (enough && masses)
                || (plan.tolerance.is_none() && lower.is_some())
                || lower_is_rounding(predictions, plan, masses)
            {
                let tensor = self.mass_of(&tensors, &levels, target, &value);
                return Ok(Found {
                    spot,
                    target,
                    value,
                    tensor,
                    basis: levels.waves.len(),
                });
            }
            lower = Some(Arc::clone(&point));
            (cut, count) = (next, self.frame.expected(next));
        }
    }

    /// Moves a smooth extremum to where this basis has it; returns how much lower it lies than what was solved.
    fn polish(
        &self,
        target: Target,
        spot: &mut Spot,
        point: &Point,
        tensors: &mut Vec<Tensor>,
        budget: &Budget,
    ) -> Result<f64, Error> {
        let unit = self.frame.unit();
        let levels = &point.levels;
        if !target.simple(&levels.energies, 1e-5 * unit)
            || target.kind == Kind::Separation && spot.seat != Seat::Smooth
        {
            return Ok(0.0);
        }
        if levels.waves.len() <= LARGEST_FOR_MASSES || tensors.is_empty() {
            let search = Search {
                waves: self,
                target,
                basis: point.basis.clone(),
                count: levels.energies.len(),
                spacing: [0.0; 3],
                budget,
            };
            tensors.push(search.slopes(levels)?.1);
        }
        let Some(curvature) = tensors.last() else {
            return Ok(0.0);
        };
        let mut slope = [0.0; 3];
        for (level, sign) in target.levels() {
            let velocity = self.velocity(levels, level);
            for x in 0..3 {
                slope[x] += sign * velocity[x];
            }
        }
        let step = descent(&slope, curvature, self.frame.dimension, 0.02 * unit.sqrt());
        if spot.seat != Seat::Smooth || step.saddle || step.gain < 1e-15 * unit {
            return Ok(0.0);
        }
        let moved = self.frame.from_axes(step.parts);
        spot.k = std::array::from_fn(|i| spot.k[i] + moved[i]);
        Ok(step.gain)
    }

    /// The target's function with its error.
    fn judge(
        &self,
        target: Target,
        levels: &Levels,
        predictions: &[Prediction],
        lower: Option<&[Prediction]>,
    ) -> Estimate {
        let at = |level: usize| {
            predictions
                .get(level)
                .map(|p| p.judged_by(lower.and_then(|l| l.get(level))))
        };
        let raw = target.value(&levels.energies);
        let mut sum = Estimate::default();
        for (level, sign) in target.levels() {
            let estimate = at(level).unwrap_or(Estimate {
                value: f64::NAN,
                error: f64::INFINITY,
            });
            sum.value += sign * estimate.value;
            sum.error += estimate.error;
        }
        let rounding = predictions.first().map_or(0.0, |p| p.rounding);
        // Levels that symmetry holds together on this basis are held together by it on every basis.
        if target.kind == Kind::Separation && raw <= 4.0 * rounding {
            return Estimate {
                value: 0.0,
                error: 4.0 * rounding,
            };
        }
        sum
    }

    /// The curvature of a simple level and the error of its entries.
    fn mass_of(
        &self,
        tensors: &[Tensor],
        levels: &Levels,
        target: Target,
        value: &Estimate,
    ) -> Option<(Tensor, f64)> {
        let last = tensors.last()?;
        let apart = distance(&levels.energies, target.band);
        if target.kind == Kind::Separation
            || apart < 1e-5 * self.frame.unit()
            || apart < 10.0 * value.error
        {
            return None;
        }
        let entries = |f: &dyn Fn(usize, usize) -> f64| {
            (0..3)
                .flat_map(|x| (0..3).map(move |y| (x, y)))
                .map(|(x, y)| f(x, y).abs())
                .fold(0.0, f64::max)
        };
        let change = match tensors.len() {
            0 | 1 => entries(&|x, y| last[x][y]) * 0.1,
            n => entries(&|x, y| last[x][y] - tensors[n - 2][x][y]),
        };
        // The k·p sum is inverse in the distances between levels, which are known to their errors.
        let coupled = entries(&|x, y| last[x][y] - if x == y { 2.0 } else { 0.0 });
        let error = 2.0 * change
            + 4.0 * coupled * (value.error + f64::EPSILON * self.frame.unit() * 10.0) / apart;
        Some((*last, error))
    }

    fn assemble(
        &self,
        bands: usize,
        found: &[Found],
        tolerance: Option<f64>,
        budget: &Budget,
    ) -> Zone {
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
                get(Kind::Separation, band),
                get(Kind::Bottom, band + 1),
            );
            let (Some(bottom), Some(top), Some(separation), Some(next)) = parts else {
                continue;
            };
            let (low, high) = (self.extremum_of(bottom), self.extremum_of(top));
            zone.bands.push(Band {
                bottom: low,
                top: high,
                width: difference(high.energy, low.energy),
            });
            zone.gaps.push(self.gap(top, next, separation));
        }
        zone
    }

    fn gap(&self, top: &Found, next: &Found, separation: &Found) -> Gap {
        let (high, low) = (self.extremum_of(top), self.extremum_of(next));
        let mut size = difference(low.energy, high.energy);
        let same = (0..3).all(|i| (low.k[i] - high.k[i]).abs() < 1e-6);
        let direct = separation.value;
        // Edges at one k that touch there: what is left out is left out of both alike.
        if same && size.value.abs() <= size.error && direct.value.abs() <= direct.error {
            size = Estimate {
                value: size.value.clamp(-direct.error, direct.error),
                error: direct.error,
            };
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
        Gap {
            size,
            kind,
            direct,
            direct_k: self.symmetry.canonical(&self.frame, separation.spot.k),
        }
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

    /// Rounds a wave vector that is a simple fraction but for rounding.
    fn tidy(&self, k: [f64; 3]) -> [f64; 3] {
        let near = k.map(|x| (x * 24.0).round() / 24.0);
        if (0..3).all(|i| (near[i] - k[i]).abs() < 1e-7) {
            near
        } else {
            k
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

fn lower_is_rounding(predictions: &[Prediction], plan: &Plan, masses: bool) -> bool {
    masses
        && plan.tolerance.is_some()
        && predictions
            .iter()
            .take(plan.bands + 1)
            .all(|p| p.left_out <= 0.1 * p.rounding)
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
