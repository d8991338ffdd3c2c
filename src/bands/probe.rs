//! A target's value, limits and margin at any point of the box of tolerances.

use std::cell::RefCell;
use std::sync::Arc;
use std::sync::atomic::{AtomicUsize, Ordering};

use rustc_hash::FxHashMap;

use crate::model::{Crystal, CrystalRef, Limits, ParameterId, Setting, TargetFormula, Wish};

use super::assess::Assessor;
use super::effort::MOST_QUESTIONS;
use super::quantity::{Leaf, Untested, sum_slopes};
use super::worst::{self, Sample};

/// Step of the differences used for quantities without exact derivatives (masses, hoppings), in half widths.
const STEP: f64 = 1e-4;

/// Which limit a margin is measured from.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Side {
    /// value − lower limit
    Lower,
    /// upper limit − value
    Upper,
}

/// What a probe measures.
#[derive(Clone, Copy)]
pub(super) enum Measures<'a> {
    /// The target of this index, as the crystal rebuilt at each point says it.
    Target(usize),
    /// An expression that does not itself depend on the tolerances.
    Formula(&'a TargetFormula),
}

/// Measures along the box of tolerances.
pub(super) struct Probe<'a> {
    pub assessor: &'a Assessor<'a>,
    pub measures: Measures<'a>,
    pub draws: &'a [ParameterId],
}

/// The least margin over the box of tolerances.
pub(super) struct Least {
    /// At the nominal values.
    pub centre: Sample,
    /// At the worst ones found.
    pub worst: Sample,
    /// Whether the search came to its end.
    pub complete: bool,
}

/// How a least margin is searched for.
#[derive(Clone, Copy)]
pub(super) struct Search {
    /// Whether there are exact derivatives.
    pub exact: bool,
    /// Whether the margin is smooth at the nominal values.
    pub smooth: bool,
    /// A margin at or below this cannot be undercut.
    pub floor: f64,
    /// How many points of the box may be looked at.
    pub most: usize,
    /// Whether only corners are looked at: where each point is dear and its derivatives are not known.
    pub corners: bool,
}

/// Value and limits at one point.
pub(super) struct Reading {
    pub value: Leaf,
    pub lower: Option<Leaf>,
    pub upper: Option<Leaf>,
}

impl Probe<'_> {
    /// Value and limits at a point of the box.
    pub fn at(&self, point: &[f64], with_slopes: bool) -> Result<Reading, Untested> {
        let setting = self.setting(point);
        let built: RefCell<FxHashMap<CrystalRef, Option<Arc<Crystal>>>> = RefCell::default();
        let crystals = |of: CrystalRef| {
            if let Some(crystal) = built.borrow().get(&of) {
                return crystal.clone();
            }
            let crystal = self.assessor.at(of, &setting);
            built.borrow_mut().insert(of, crystal.clone());
            crystal
        };
        let evaluation = self.assessor.evaluation(&crystals, with_slopes);
        match self.measures {
            Measures::Formula(formula) => Ok(Reading {
                value: evaluation.formula(formula)?,
                lower: None,
                upper: None,
            }),
            Measures::Target(index) => {
                let gone =
                    || Untested::Because("the model has errors within its tolerances".into());
                let own = crystals(self.assessor.of).ok_or_else(gone)?;
                let Some(Wish::Compare {
                    expression, limits, ..
                }) = own.targets.get(index).map(|target| &target.wish)
                else {
                    return Err(gone());
                };
                let limit = |limit: &Option<(TargetFormula, bool)>| {
                    limit
                        .as_ref()
                        .map(|(formula, _)| evaluation.formula(formula))
                        .transpose()
                };
                let Limits { lower, upper } = limits;
                Ok(Reading {
                    value: evaluation.formula(expression)?,
                    lower: limit(lower)?,
                    upper: limit(upper)?,
                })
            }
        }
    }

    fn setting(&self, point: &[f64]) -> Setting {
        let mut setting = Setting::default();
        for (draw, at) in self.draws.iter().zip(point) {
            if *at != 0.0 {
                setting.draws.insert(*draw, *at);
            }
        }
        setting
    }

    /// The margin from one limit, with its derivatives by the tolerances; `None` without such a limit.
    fn margin(
        &self,
        point: &[f64],
        side: Side,
        exact: bool,
    ) -> Result<Option<(f64, Vec<f64>)>, Untested> {
        let reading = self.at(point, exact)?;
        let Some((value, slopes)) = margin_of(&reading, side) else {
            return Ok(None);
        };
        if exact {
            return Ok(Some((value, self.by_draw(&slopes))));
        }
        let mut by_draw = Vec::with_capacity(point.len());
        for axis in 0..point.len() {
            let mut ends = [0.0; 2];
            for (end, step) in ends.iter_mut().zip([-STEP, STEP]) {
                let mut moved = point.to_vec();
                if let Some(at) = moved.get_mut(axis) {
                    *at += step;
                }
                *end = margin_of(&self.at(&moved, false)?, side).map_or(value, |(value, _)| value);
            }
            by_draw.push((ends[1] - ends[0]) / (2.0 * STEP));
        }
        Ok(Some((value, by_draw)))
    }

    fn by_draw(&self, slopes: &[(ParameterId, f64)]) -> Vec<f64> {
        let slope = |draw: &ParameterId| {
            let found = slopes
                .binary_search_by_key(draw, |(id, _)| *id)
                .ok()
                .and_then(|index| slopes.get(index));
            found.map_or(0.0, |(_, slope)| *slope)
        };
        self.draws.iter().map(slope).collect()
    }

    /// The least margin over the box; `None` without such a limit.
    pub fn least_margin(&self, side: Side, search: Search) -> Result<Option<Least>, Untested> {
        let asked = AtomicUsize::new(0);
        let overtaken = self.assessor.cancelled;
        let hook = || overtaken() || asked.fetch_add(1, Ordering::Relaxed) >= MOST_QUESTIONS;
        let assessor = Assessor {
            cancelled: &hook,
            ..*self.assessor
        };
        let limited = Probe {
            assessor: &assessor,
            ..*self
        };
        match limited.search(side, search) {
            Err(Untested::Cancelled) if !overtaken() => Err(Untested::Because(
                "the work allowed was spent in the search for the worst case".into(),
            )),
            found => found,
        }
    }

    fn search(&self, side: Side, search: Search) -> Result<Option<Least>, Untested> {
        if search.corners {
            return self.least_corner(side, search.most);
        }
        let exact = search.exact;
        if self
            .margin(&vec![0.0; self.draws.len()], side, exact)?
            .is_none()
        {
            return Ok(None);
        }
        let mut failure = None;
        let mut seen: Vec<Sample> = Vec::new();
        let mut evaluate = |point: &[f64]| {
            if seen.len() >= search.most {
                return None;
            }
            match self.margin(point, side, exact) {
                Ok(Some((value, slopes))) => {
                    seen.push(Sample {
                        point: point.to_vec(),
                        value,
                        slopes: slopes.clone(),
                    });
                    Some((value, slopes))
                }
                Ok(None) => None,
                Err(untested) => {
                    failure = Some(untested);
                    None
                }
            }
        };
        let found = worst::least(self.draws.len(), search.floor, search.smooth, &mut evaluate);
        if let Some(untested) = failure {
            return Err(untested);
        }
        if let Some((centre, worst)) = found {
            return Ok(Some(Least {
                centre,
                worst,
                complete: true,
            }));
        }
        let lowest = seen
            .iter()
            .filter(|sample| sample.value.is_finite())
            .min_by(|a, b| a.value.total_cmp(&b.value));
        Ok(seen.first().zip(lowest).map(|(centre, worst)| Least {
            centre: centre.clone(),
            worst: worst.clone(),
            complete: false,
        }))
    }
}

impl Probe<'_> {
    /// The least margin at the corners of the box (and its centre); slopes are half the mean differences along each axis.
    fn least_corner(&self, side: Side, most: usize) -> Result<Option<Least>, Untested> {
        let count = self.draws.len();
        let value = |point: &[f64]| -> Result<Option<f64>, Untested> {
            let reading = self.at(point, false)?;
            Ok(margin_of(&reading, side).map(|(value, _)| value))
        };
        let Some(centre) = value(&vec![0.0; count])? else {
            return Ok(None);
        };
        let complete = count < 12 && 1 << count <= most;
        // Too many: the corners that differ from the nominal values in one tolerance.
        let points: Vec<Vec<f64>> = match complete {
            true => (0..1_usize << count)
                .map(|bits| {
                    let sign = |axis: usize| if bits >> axis & 1 == 1 { 1.0 } else { -1.0 };
                    (0..count).map(sign).collect()
                })
                .collect(),
            false => (0..2 * count.min(most / 2))
                .map(|index| {
                    let mut point = vec![0.0; count];
                    if let Some(at) = point.get_mut(index / 2) {
                        *at = if index % 2 == 0 { -1.0 } else { 1.0 };
                    }
                    point
                })
                .collect(),
        };
        let mut slopes = vec![0.0; count];
        let mut worst = (vec![0.0; count], centre);
        let share = 1.0 / if complete { points.len() as f64 } else { 2.0 };
        for point in points {
            let found = value(&point)?.unwrap_or(centre);
            for (slope, at) in slopes.iter_mut().zip(&point) {
                *slope += share * at * found;
            }
            if found < worst.1 {
                worst = (point, found);
            }
        }
        let sample = |point: Vec<f64>, value: f64| Sample {
            point,
            value,
            slopes: slopes.clone(),
        };
        Ok(Some(Least {
            centre: sample(vec![0.0; count], centre),
            worst: sample(worst.0, worst.1),
            complete,
        }))
    }
}

/// A margin and its derivatives by all parameters.
pub(super) fn margin_of(reading: &Reading, side: Side) -> Option<(f64, Vec<(ParameterId, f64)>)> {
    let zero = Leaf::default();
    let (limit, sign) = match side {
        Side::Lower => (
            reading
                .lower
                .as_ref()
                .or(reading.upper.is_none().then_some(&zero))?,
            1.0,
        ),
        Side::Upper => (reading.upper.as_ref()?, -1.0),
    };
    let value = sign * (reading.value.value.value - limit.value.value);
    Some((
        value,
        sum_slopes(&[(sign, &reading.value.slopes), (-sign, &limit.slopes)]),
    ))
}
