//! Search and settling of single extrema.
//!
//! An extremum is searched for at one cut on the whole mesh; then the cut is raised at that extremum alone. A smooth one
//! moves with the cut: its remaining fall, ½ g·|H|⁻¹·g with the slope g and curvature H, is taken off, and half of it
//! counts as error. One on a crease carries the rise of its last pattern as error.

use super::basis::Waves;
use super::extrema::{Kind, Search, Seat, Spot, Target, descent, distance, starts};
use super::plan::{Plan, Point};
use super::settle::Prediction;
use super::slopes::Tensor;
use super::{Budget, Error, Estimate, Levels};
use std::sync::Arc;

/// An extremum with its levels at the last cut.
pub(super) struct Found {
    pub spot: Spot,
    pub target: Target,
    /// The target's function (energy, its negative, separation).
    pub value: Estimate,
    pub tensor: Option<(Tensor, f64)>,
    pub basis: usize,
}

/// Second derivatives are taken on bases up to this size.
const LARGEST_FOR_MASSES: usize = 450;
/// Creases are searched anew on bases up to this size.
const LARGEST_FOR_CREASES: usize = 260;
/// Levels this near, in the natural unit, may part into narrow basins.
const CROWDED: f64 = 0.05;

impl Waves<'_> {
    /// Searches for one extremum and settles it.
    pub(super) fn extremum(
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
        let spacing = plan.spacing(self.frame.dimension);
        let mut spots: Vec<Spot> = Vec::new();
        let most = if plan.tolerance.is_some() { 6 } else { 3 };
        let mut from: Vec<([f64; 3], f64)> = starts(&plan.mesh, energies, target, 1e-11 * unit)
            .into_iter()
            .take(most)
            .map(|(point, _, floor)| (plan.mesh.points[point], floor))
            .collect();
        if plan.tolerance.is_some() {
            from.extend(self.beside_crossings(target, plan, energies, budget)?);
        }
        for (start, floor) in from {
            let best = spots
                .iter()
                .map(|spot| spot.value)
                .fold(f64::INFINITY, f64::min);
            if floor > best + 1e-3 * unit {
                continue;
            }
            let search = Search {
                waves: self,
                target,
                basis: self.basis(start, plan.cut),
                centre: start,
                cut: plan.cut,
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

    /// Starts beside the lowest points of the mesh at which several levels come together: weak potentials part them into
    /// basins narrower than a step of the mesh.
    fn beside_crossings(
        &self,
        target: Target,
        plan: &Plan,
        energies: &[Vec<f64>],
        budget: &Budget,
    ) -> Result<Vec<([f64; 3], f64)>, Error> {
        let d = self.frame.dimension;
        let unit = self.frame.unit();
        // Where the crystal has more symmetry, such points are singled out by it, and the basins lie on its axes.
        if d < 3 || target.kind == Kind::Separation || self.operations() > 2 {
            return Ok(Vec::new());
        }
        let value = |point: &usize| target.value(&energies[*point]);
        let crowded = |point: &usize| {
            let here = energies[*point][target.band];
            let near = |level: &&f64| (**level - here).abs() < CROWDED * unit;
            energies[*point].iter().filter(near).count() > 2
        };
        let mut points: Vec<usize> = (0..plan.mesh.points.len()).collect();
        points.sort_by(|a, b| value(a).total_cmp(&value(b)));
        let spacing = plan.spacing(d);
        let mut found: Vec<([f64; 3], f64)> = Vec::new();
        for point in points.into_iter().take(2).filter(crowded) {
            let centre = plan.mesh.points[point];
            let basis = self.basis(centre, plan.cut);
            let steps = (0..27).map(|at| [at % 3, at / 3 % 3, at / 9].map(|x| f64::from(x) - 1.0));
            for step in steps.filter(|step| step.iter().any(|x| *x != 0.0)) {
                let k = std::array::from_fn(|i| centre[i] + 0.36 * spacing[i] * step[i]);
                let levels = self.solve_on(&basis, k, plan.count, false, budget)?;
                found.push((k, target.value(&levels.energies)));
            }
        }
        found.sort_by(|a, b| a.1.total_cmp(&b.1));
        found.truncate(3);
        Ok(found)
    }

    /// The distance from a band to the next at one k, settled as an extremum there is.
    pub(super) fn apart_at(
        &self,
        k: [f64; 3],
        band: usize,
        plan: &Plan,
        budget: &Budget,
    ) -> Result<Estimate, Error> {
        let target = Target {
            kind: Kind::Separation,
            band,
        };
        let spot = Spot {
            k,
            value: 0.0,
            seat: Seat::Pinned,
        };
        Ok(self.settle(target, spot, plan, budget)?.value)
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
        let mut lower: Option<(Arc<Point>, f64)> = None;
        let mut count = self.frame.expected(plan.cut);
        let mut cut = plan.cut;
        let mut tensors: Vec<Tensor> = Vec::new();
        // The cut at which a crease was searched last: it lies as well as the levels were known there.
        let mut searched = plan.cut;
        let mut misplaced = f64::INFINITY;
        loop {
            let point = plan.solved.at(self, spot.k, cut, plan.count, budget)?;
            let (levels, predictions) = (&point.levels, &point.predictions);
            if cut == searched {
                misplaced = left_out(target, predictions);
            }
            let polished = self.polish(target, &mut spot, &point, plan, &mut tensors, budget)?;
            let mut value = self.judge(
                target,
                levels,
                predictions,
                lower.as_ref().map(|(l, _)| l.predictions.as_slice()),
            );
            value.value -= polished;
            value.error += 0.5 * polished;
            let known = value.error;
            let apart = target.simple(&levels.energies, 1e-5 * self.frame.unit());
            if spot.seat == Seat::Smooth && !apart {
                // Levels cross on this basis where they did not on that of the search.
                spot.seat = Seat::Creased(0.0);
            }
            if let Seat::Creased(rise) = spot.seat {
                value.error += rise + misplaced;
            }
            let next = self.frame.cut_for(1.6 * count);
            let room = self.frame.expected(next) * 1.25 + 20.0 <= budget.max_basis as f64;
            let enough = plan.tolerance.is_none_or(|tolerance| known <= tolerance);
            // A first cut without one below it is judged by δ alone; masses need two cuts.
            let massless = target.kind == Kind::Separation || !apart;
            let masses = massless || tensors.len() >= 2 || tensors.is_empty();
            if !room
                || (enough && masses)
                || (plan.tolerance.is_none() && lower.is_some())
                || lower_is_rounding(predictions, plan, masses)
            {
                let elsewhere = matches!(spot.seat, Seat::Creased(_))
                    && plan.tolerance.is_some_and(|t| value.error > t)
                    && cut > searched
                    && levels.waves.len() <= LARGEST_FOR_CREASES;
                if elsewhere && self.replace(target, &mut spot, cut, plan, budget)? {
                    searched = cut;
                    lower = match lower {
                        Some((_, cut)) => {
                            Some((plan.solved.at(self, spot.k, cut, plan.count, budget)?, cut))
                        }
                        None => None,
                    };
                    continue;
                }
                let tensor = self.mass_of(&tensors, levels, target, &value);
                return Ok(Found {
                    spot,
                    target,
                    value,
                    tensor,
                    basis: levels.waves.len(),
                });
            }
            lower = Some((Arc::clone(&point), cut));
            (cut, count) = (next, self.frame.expected(next));
        }
    }

    /// Searches along a crease anew at a larger cut; false where the budget has no room for that.
    fn replace(
        &self,
        target: Target,
        spot: &mut Spot,
        cut: f64,
        plan: &Plan,
        budget: &Budget,
    ) -> Result<bool, Error> {
        let search = Search {
            waves: self,
            target,
            basis: self.basis(spot.k, cut),
            centre: spot.k,
            cut,
            count: plan.count,
            spacing: plan.spacing(self.frame.dimension).map(|x| 0.2 * x),
            budget,
        };
        match search.crease(spot.k) {
            Err(Error::BudgetSpent) => Ok(false),
            Err(error) => Err(error),
            Ok(found) => {
                *spot = found;
                Ok(true)
            }
        }
    }

    /// Moves a smooth extremum to where this basis has it; returns how much lower it lies than what was solved.
    fn polish(
        &self,
        target: Target,
        spot: &mut Spot,
        point: &Point,
        plan: &Plan,
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
                centre: levels.k,
                cut: plan.cut,
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
        if step.gain > 1e-4 * unit {
            // Too far for the curvature here to be trusted.
            spot.seat = Seat::Creased(step.gain.min(unit));
            return Ok(0.0);
        }
        let moved = self.frame.off_axes(step.parts);
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
        // Levels do not pass through one another.
        if target.kind == Kind::Separation && sum.value < 0.0 {
            sum = Estimate {
                value: 0.0,
                error: sum.error.max(-sum.value),
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

    /// Rounds a wave vector that is a simple fraction but for rounding.
    pub(super) fn tidy(&self, k: [f64; 3]) -> [f64; 3] {
        let near = k.map(|x| (x * 24.0).round() / 24.0);
        if (0..3).all(|i| (near[i] - k[i]).abs() < 1e-7) {
            near
        } else {
            k
        }
    }
}

/// What a cut leaves out of the levels of a target.
fn left_out(target: Target, predictions: &[Prediction]) -> f64 {
    let of = |level: usize| predictions.get(level).map_or(f64::INFINITY, |p| p.left_out);
    target
        .levels()
        .into_iter()
        .map(|(level, _)| of(level))
        .sum()
}

fn lower_is_rounding(predictions: &[Prediction], plan: &Plan, masses: bool) -> bool {
    masses
        && plan.tolerance.is_some()
        && predictions
            .iter()
            .take(plan.bands + 1)
            .all(|p| p.left_out <= 0.1 * p.rounding)
}
