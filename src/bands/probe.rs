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

    /// The least margin over the box, as (at the nominal values, at the worst); `None` without such a limit.
    pub fn least_margin(
        &self,
        side: Side,
        exact: bool,
        floor: f64,
    ) -> Result<Option<(Sample, Sample)>, Untested> {
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
        match limited.search(side, exact, floor) {
            Err(Untested::Cancelled) if !overtaken() => Err(Untested::Because(
                "the work allowed was spent in the search for the worst case".into(),
            )),
            found => found,
        }
    }

    fn search(
        &self,
        side: Side,
        exact: bool,
        floor: f64,
    ) -> Result<Option<(Sample, Sample)>, Untested> {
        if self
            .margin(&vec![0.0; self.draws.len()], side, exact)?
            .is_none()
        {
            return Ok(None);
        }
        let mut failure = None;
        let mut evaluate = |point: &[f64]| match self.margin(point, side, exact) {
            Ok(found) => found,
            Err(untested) => {
                failure = Some(untested);
                None
            }
        };
        let found = worst::least(self.draws.len(), floor, &mut evaluate);
        match failure {
            Some(untested) => Err(untested),
            None => Ok(found),
        }
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
