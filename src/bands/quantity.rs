//! The quantities of `measure` and `require`: values, error bounds and exact derivatives, and expressions over them.

use std::sync::Arc;

use crate::model::{Crystal, CrystalRef, Dual, ParameterId, Quantity, QuantityKind, TargetFormula};
use crate::numerics;

use super::chain::{Chain, unsolved};
use super::effort::budget;
use super::filling::Filled;
use super::{
    Extremum, Feature, GapKind, Measured, Solution, Solver, Unsolved, impossible, solve,
    zone_quantity, zone_slopes,
};

/// Why a quantity has no value.
#[derive(Clone, Debug, PartialEq, Eq)]
pub(super) enum Untested {
    /// The work was overtaken.
    Cancelled,
    /// For the reason given.
    Because(String),
}

impl From<Unsolved> for Untested {
    fn from(unsolved: Unsolved) -> Self {
        match unsolved {
            Unsolved::Cancelled => Self::Cancelled,
            Unsolved::BrokenModel => because("the model has errors"),
            Unsolved::Dimension(dimension) => {
                Self::Because(format!("this is not made in {dimension} dimensions"))
            }
            Unsolved::NotConverged(why) => {
                Self::Because(format!("the bands are not converged: {why}"))
            }
        }
    }
}

fn because(why: &str) -> Untested {
    Untested::Because(why.to_string())
}

/// A value with its error bound and derivatives.
#[derive(Clone, Debug, Default)]
pub(super) struct Leaf {
    pub value: Measured,
    /// Sorted by parameter.
    pub slopes: Vec<(ParameterId, f64)>,
    /// The wave vectors of the extrema whose masses it speaks of, in two and three dimensions: masses jump where an extremum
    /// does.
    pub seats: Vec<f64>,
}

/// The crystals that an expression may speak of, at one setting of the tolerances.
pub(super) type Crystals<'a> = dyn Fn(CrystalRef) -> Option<Arc<Crystal>> + 'a;

/// Differences for quantities without exact derivatives: the masses and hoppings of chains.
pub(super) struct Beside<'a> {
    /// By what, and how far to each side.
    pub steps: &'a [(ParameterId, f64)],
    /// A crystal with one of these moved by so much.
    pub moved: &'a dyn Fn(CrystalRef, ParameterId, f64) -> Option<Arc<Crystal>>,
}

/// What evaluates expressions: the solver, the crystals, the hook, and, where derivatives are wanted, what those
/// that are not exact are made with.
pub(super) struct Evaluation<'a> {
    pub solver: &'a Solver,
    pub crystals: &'a Crystals<'a>,
    pub cancelled: &'a (dyn Fn() -> bool + Sync),
    pub beside: Option<&'a Beside<'a>>,
}

/// Leaves are numbered from here while an expression is evaluated; parameters are hashes far above.
const FIRST_LEAF: u64 = 0x10;

impl Evaluation<'_> {
    /// An expression's value, error bound and, where wanted, derivatives.
    pub fn formula(&self, formula: &TargetFormula) -> Result<Leaf, Untested> {
        let mut leaves: Vec<Leaf> = Vec::new();
        let mut failure = None;
        let value = formula.evaluate(&mut |quantity| {
            let leaf = self
                .quantity(quantity)
                .map_err(|untested| failure = Some(untested))
                .ok()?;
            let id = ParameterId(FIRST_LEAF + leaves.len() as u64);
            let number = Dual::parameter(leaf.value.value, id);
            leaves.push(leaf);
            Some(number)
        });
        match (value, failure) {
            (_, Some(untested)) => Err(untested),
            (Some(value), None) if value.value.is_finite() => Ok(collect(&value, &leaves)),
            _ => Err(because("the expression has no finite value")),
        }
    }

    fn quantity(&self, quantity: &Quantity) -> Result<Leaf, Untested> {
        let crystal =
            (self.crystals)(quantity.of).ok_or_else(|| because("its crystal cannot be read"))?;
        if let Some(unsolved) = impossible(&crystal) {
            return Err(unsolved.into());
        }
        match (&quantity.kind, crystal.dimension > 1) {
            (QuantityKind::Level(number, k), true) => self.zone_level(&crystal, *number, k),
            (QuantityKind::Hopping(number, hop), true) => self.zone_hopping(&crystal, *number, hop),
            _ => self.solved(quantity, &crystal),
        }
    }

    /// A quantity that is taken from the bands solved, or goes with them.
    fn solved(&self, quantity: &Quantity, crystal: &Crystal) -> Result<Leaf, Untested> {
        let solution = self.solver.solve(crystal, self.cancelled)?;
        let kind = &quantity.kind;
        let mut leaf = Leaf {
            value: self.value(crystal, &solution, kind)?,
            ..Leaf::default()
        };
        if let Some(beside) = self.beside {
            leaf.slopes = match self.slopes(crystal, &solution, kind)? {
                Some(exact) => exact,
                None => self.differences(quantity, beside)?,
            };
        }
        if let (Some(edge), true) = (edge(&solution, kind), crystal.dimension > 1) {
            leaf.seats = edge.k.clone();
        }
        Ok(leaf)
    }

    fn differences(
        &self,
        quantity: &Quantity,
        beside: &Beside<'_>,
    ) -> Result<Vec<(ParameterId, f64)>, Untested> {
        let at = |id: ParameterId, step: f64| -> Result<f64, Untested> {
            let gone = || because("the model has errors within its tolerances");
            let crystal = (beside.moved)(quantity.of, id, step).ok_or_else(gone)?;
            let solution = self.solver.solve(&crystal, self.cancelled)?;
            Ok(self.value(&crystal, &solution, &quantity.kind)?.value)
        };
        let mut slopes = Vec::with_capacity(beside.steps.len());
        for (id, step) in beside.steps {
            slopes.push((*id, (at(*id, *step)? - at(*id, -step)?) / (2.0 * step)));
        }
        slopes.sort_by_key(|(id, _)| *id);
        Ok(slopes)
    }

    /// A level of a plane or solid crystal: its zone need not be solved for that.
    fn zone_level(&self, crystal: &Crystal, number: usize, k: &[f64]) -> Result<Leaf, Untested> {
        if !(1..=crystal.bands).contains(&number) {
            return Err(too_few(number, crystal.bands));
        }
        let slopes = match self.beside {
            Some(_) => zone_slopes::level_slopes(crystal, number, k, self.cancelled)?,
            None => Vec::new(),
        };
        Ok(Leaf {
            value: zone_quantity::level(crystal, number, k, self.cancelled)?,
            slopes,
            ..Leaf::default()
        })
    }

    /// A hopping there, nor for that.
    fn zone_hopping(
        &self,
        crystal: &Crystal,
        number: usize,
        hop: &[i64],
    ) -> Result<Leaf, Untested> {
        if !(1..=crystal.bands).contains(&number) {
            return Err(too_few(number, crystal.bands));
        }
        let with_slopes = self.beside.is_some();
        let (value, slopes) =
            zone_quantity::hopping(crystal, number, hop, with_slopes, self.cancelled)?;
        Ok(Leaf {
            value,
            slopes,
            ..Leaf::default()
        })
    }

    fn value(
        &self,
        crystal: &Crystal,
        solution: &Solution,
        kind: &QuantityKind,
    ) -> Result<Measured, Untested> {
        let band = |number: &usize| {
            solution
                .bands
                .get(number.wrapping_sub(1))
                .ok_or_else(|| too_few(*number, solution.bands.len()))
        };
        match kind {
            QuantityKind::Gap(number) => solution
                .gaps
                .get(number.wrapping_sub(1))
                .map(|gap| gap.size)
                .ok_or_else(|| too_few(*number, solution.gaps.len())),
            QuantityKind::Width(number) => Ok(band(number)?.width),
            QuantityKind::Bottom(number) => Ok(band(number)?.bottom.energy),
            QuantityKind::Top(number) => Ok(band(number)?.top.energy),
            QuantityKind::MassBottom(number) => mass(&band(number)?.bottom),
            QuantityKind::MassTop(number) => mass(&band(number)?.top),
            QuantityKind::Fermi => solution.fermi.ok_or_else(|| no_fermi(crystal, solution)),
            QuantityKind::Level(number, k) => {
                band(number)?;
                self.level(crystal, *number, k)
            }
            QuantityKind::Hopping(number, hop) => {
                band(number)?;
                self.hopping(crystal, *number, hop)
            }
        }
    }

    fn level(&self, crystal: &Crystal, number: usize, k: &[f64]) -> Result<Measured, Untested> {
        let budget = budget(self.cancelled);
        let chain = Chain::new(crystal, &budget)?;
        let level = numerics::level(&chain.cell, number - 1, turn(k), &budget).map_err(unsolved)?;
        Ok(chain.energy(level))
    }

    fn hopping(&self, crystal: &Crystal, number: usize, hop: &[i64]) -> Result<Measured, Untested> {
        let budget = budget(self.cancelled);
        let chain = Chain::new(crystal, &budget)?;
        let cells = hop.first().map_or(0, |cells| cells.unsigned_abs());
        let cells = usize::try_from(cells).map_err(|_| because("the hop is too far"))?;
        let hopping =
            numerics::hopping(&chain.cell, number - 1, cells, &budget).map_err(unsolved)?;
        Ok(chain.energy(hopping))
    }

    /// Exact derivatives of a quantity; the masses and hoppings of chains have none.
    fn slopes(
        &self,
        crystal: &Crystal,
        solution: &Solution,
        kind: &QuantityKind,
    ) -> Result<Option<Vec<(ParameterId, f64)>>, Untested> {
        let budget = budget(self.cancelled);
        let feature = match kind {
            QuantityKind::Gap(number) => Feature::Gap(*number),
            QuantityKind::Width(number) => Feature::Width(*number),
            QuantityKind::Bottom(number) => Feature::Bottom(*number),
            QuantityKind::Top(number) => Feature::Top(*number),
            QuantityKind::Level(number, k) => {
                let chain = Chain::new(crystal, &budget)?;
                return Ok(Some(chain.level_slopes(*number, turn(k), &budget)?));
            }
            QuantityKind::Fermi => return self.fermi_slopes(crystal, solution).map(Some),
            QuantityKind::MassBottom(number) | QuantityKind::MassTop(number) => {
                return match edge(solution, kind).filter(|_| crystal.dimension > 1) {
                    Some(edge) => {
                        let found =
                            zone_slopes::mass_slopes(crystal, *number, edge, self.cancelled)?;
                        Ok(Some(found))
                    }
                    None => Ok(None),
                };
            }
            QuantityKind::Hopping(..) => return Ok(None),
        };
        self.feature_slopes(crystal, feature).map(Some)
    }

    fn feature_slopes(
        &self,
        crystal: &Crystal,
        feature: Feature,
    ) -> Result<Vec<(ParameterId, f64)>, Untested> {
        if crystal.dimension > 1 {
            let slopes =
                zone_slopes::feature_slopes(self.solver, crystal, feature, self.cancelled)?;
            return Ok(slopes);
        }
        let budget = budget(self.cancelled);
        Ok(Chain::new(crystal, &budget)?.feature_slopes(feature, &budget)?)
    }

    /// The Fermi level of a part-filled band moves with the levels at its k; that of whole bands with the middle of the
    /// gap, where there is one.
    fn fermi_slopes(
        &self,
        crystal: &Crystal,
        solution: &Solution,
    ) -> Result<Vec<(ParameterId, f64)>, Untested> {
        match solve::filled(crystal) {
            Some(Filled::Part(part)) if crystal.dimension > 1 => {
                Ok(zone_slopes::fermi_slopes(crystal, part, self.cancelled)?)
            }
            Some(Filled::Part(part)) => {
                let budget = budget(self.cancelled);
                let chain = Chain::new(crystal, &budget)?;
                let band = part.floor() as usize;
                let share = part - part.floor();
                // Levels fill from the bottom: at k = 0 in odd bands, at the zone edge in even ones.
                let share = if band % 2 == 0 { share } else { 1.0 - share };
                Ok(chain.level_slopes(band + 1, share * std::f64::consts::PI, &budget)?)
            }
            Some(Filled::Whole(whole)) => {
                let gap = solution.gaps.get(whole.wrapping_sub(1));
                if gap.is_some_and(|gap| gap.kind == GapKind::Overlap) {
                    let whole = whole as f64;
                    return Ok(zone_slopes::fermi_slopes(crystal, whole, self.cancelled)?);
                }
                let top = self.feature_slopes(crystal, Feature::Top(whole))?;
                let bottom = self.feature_slopes(crystal, Feature::Bottom(whole + 1))?;
                Ok(sum_slopes(&[(0.5, &top), (0.5, &bottom)]))
            }
            _ => Err(no_fermi(crystal, solution)),
        }
    }
}

/// ka of a point given in fractions of the reciprocal vector.
fn turn(k: &[f64]) -> f64 {
    2.0 * std::f64::consts::PI * k.first().copied().unwrap_or(0.0)
}

/// The extremum whose mass a quantity is.
fn edge<'s>(solution: &'s Solution, kind: &QuantityKind) -> Option<&'s Extremum> {
    let band = |number: &usize| solution.bands.get(number.wrapping_sub(1));
    match kind {
        QuantityKind::MassBottom(number) => Some(&band(number)?.bottom),
        QuantityKind::MassTop(number) => Some(&band(number)?.top),
        _ => None,
    }
}

fn mass(extremum: &Extremum) -> Result<Measured, Untested> {
    let mass = extremum
        .mass
        .ok_or_else(|| because("there is no mass where two bands touch"))?;
    Ok(Measured {
        value: mass.value.abs(),
        uncertainty: mass.uncertainty,
    })
}

fn too_few(number: usize, solved: usize) -> Untested {
    Untested::Because(format!(
        "it speaks of band {number}, and {solved} bands are solved"
    ))
}

fn no_fermi(crystal: &Crystal, solution: &Solution) -> Untested {
    if crystal.bosons {
        return because("bosons have no Fermi level");
    }
    match crystal.filling {
        None => because("the crystal says no `filling`"),
        Some(_) => Untested::Because(format!(
            "the filling is not within the {} bands solved",
            solution.bands.len()
        )),
    }
}

/// Replaces the leaves in a value's derivatives by what they depend on.
fn collect(value: &Dual, leaves: &[Leaf]) -> Leaf {
    let mut uncertainty = 4.0 * f64::EPSILON * value.value.abs();
    let seats = leaves
        .iter()
        .flat_map(|leaf| &leaf.seats)
        .copied()
        .collect();
    let mut parts: Vec<(f64, &[(ParameterId, f64)])> = Vec::new();
    let mut direct = Vec::new();
    for (id, slope) in &value.slopes {
        let leaf =
            id.0.checked_sub(FIRST_LEAF)
                .and_then(|index| leaves.get(usize::try_from(index).ok()?));
        match leaf {
            Some(leaf) => {
                uncertainty += slope.abs() * leaf.value.uncertainty;
                parts.push((*slope, &leaf.slopes));
            }
            None => direct.push((*id, *slope)),
        }
    }
    if let [(only, slopes)] = parts.as_slice()
        && direct.is_empty()
        && *only == 1.0
        && value.slopes.len() == 1
        && leaves.len() == 1
    {
        return Leaf {
            value: leaves
                .first()
                .map_or_else(Measured::default, |leaf| leaf.value),
            slopes: slopes.to_vec(),
            seats,
        };
    }
    parts.push((1.0, &direct));
    let slopes = sum_slopes(&parts);
    Leaf {
        value: Measured {
            value: value.value,
            uncertainty,
        },
        slopes,
        seats,
    }
}

/// Σ factor · slopes, sorted by parameter.
pub(super) fn sum_slopes<T: AsRef<[(ParameterId, f64)]>>(
    parts: &[(f64, T)],
) -> Vec<(ParameterId, f64)> {
    let mut sum = rustc_hash::FxHashMap::default();
    for (factor, slopes) in parts {
        for (id, slope) in slopes.as_ref() {
            *sum.entry(*id).or_insert(0.0) += factor * slope;
        }
    }
    let mut sum: Vec<_> = sum.into_iter().collect();
    sum.sort_by_key(|(id, _)| *id);
    sum
}
