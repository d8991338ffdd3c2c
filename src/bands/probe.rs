//! A target's value, limits and margin at any point of the box of tolerances.

use std::cell::RefCell;
use std::rc::Rc;
use std::sync::Arc;
use std::sync::atomic::{AtomicUsize, Ordering};

use rustc_hash::FxHashMap;

use crate::model::{Crystal, CrystalRef, Limits, ParameterId, Setting, TargetFormula, Wish};

use super::assess::Assessor;
use super::effort::MOST_QUESTIONS;
use super::lines::Sample;
use super::quantity::{Beside, Leaf, Untested, sum_slopes};
use super::worst::{self, Least};

/// Step of the differences used for quantities without exact derivatives, in half widths.
const STEP: f64 = 1e-4;
/// The same as a part of a number.
const PART: f64 = 1e-5;

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
    /// Numbers, with their values, by which derivatives are wanted instead; exact ones are by all there is.
    pub numbers: &'a [(ParameterId, f64)],
    /// What was read already.
    known: RefCell<FxHashMap<Vec<u64>, Rc<Reading>>>,
}

/// How a least margin is searched for.
#[derive(Clone, Copy)]
pub(super) struct Search {
    /// Whether the margin is smooth at the nominal values.
    pub smooth: bool,
    /// A margin at or below this cannot be undercut.
    pub floor: f64,
    /// How many points of the box may be looked at.
    pub most: usize,
}

/// Value and limits at one point.
pub(super) struct Reading {
    pub value: Leaf,
    pub lower: Option<Leaf>,
    pub upper: Option<Leaf>,
}

impl<'a> Probe<'a> {
    /// A probe that has read nothing.
    pub fn new(
        assessor: &'a Assessor<'a>,
        measures: Measures<'a>,
        draws: &'a [ParameterId],
    ) -> Self {
        Self {
            assessor,
            measures,
            draws,
            numbers: &[],
            known: RefCell::default(),
        }
    }

    /// Value and limits at the nominal values; with derivatives where there are tolerances and these can be had.
    pub fn nominal(&self) -> Result<Rc<Reading>, Untested> {
        let centre = vec![0.0; self.draws.len()];
        if self.draws.is_empty() {
            return self.read(&centre, false).map(Rc::new);
        }
        match self.at(&centre) {
            Err(Untested::Because(_)) => self.read(&centre, false).map(Rc::new),
            found => found,
        }
    }

    /// Value and limits at a point of the box, with derivatives.
    pub fn at(&self, point: &[f64]) -> Result<Rc<Reading>, Untested> {
        let key = key(point);
        if let Some(reading) = self.known.borrow().get(&key) {
            return Ok(Rc::clone(reading));
        }
        let reading = Rc::new(self.read(point, true)?);
        self.known.borrow_mut().insert(key, Rc::clone(&reading));
        Ok(reading)
    }

    /// The same from anew, with derivatives or without.
    pub fn read(&self, point: &[f64], with_slopes: bool) -> Result<Reading, Untested> {
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
        let steps: Vec<(ParameterId, f64)> = match self.numbers {
            [] => self.draws.iter().map(|draw| (*draw, STEP)).collect(),
            numbers => {
                let steps = numbers.iter().map(|(id, value)| (*id, PART * value));
                steps.filter(|(_, step)| *step != 0.0).collect()
            }
        };
        let moved = |of: CrystalRef, id: ParameterId, step: f64| {
            let mut setting = setting.clone();
            match self.numbers.iter().find(|(number, _)| *number == id) {
                Some((_, value)) => setting.overrides.insert(id, value + step),
                None => {
                    let at = setting.draws.get(&id).copied().unwrap_or(0.0);
                    setting.draws.insert(id, at + step)
                }
            };
            self.assessor.at(of, &setting)
        };
        let beside = Beside {
            steps: &steps,
            moved: &moved,
        };
        let evaluation = self
            .assessor
            .evaluation(&crystals, with_slopes.then_some(&beside));
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
    fn margin(&self, point: &[f64], side: Side) -> Result<Option<Sample>, Untested> {
        let reading = self.at(point)?;
        let Some((value, slopes)) = margin_of(&reading, side) else {
            return Ok(None);
        };
        Ok(Some(Sample {
            point: point.to_vec(),
            value,
            slopes: self.by_draw(&slopes),
            doubt: doubt(&reading, side),
            seats: reading.value.seats.clone(),
        }))
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
            measures: self.measures,
            draws: self.draws,
            numbers: self.numbers,
            known: RefCell::new(self.known.take()),
        };
        let found = limited.search(side, search);
        self.known.replace(limited.known.take());
        match found {
            Err(Untested::Cancelled) if !overtaken() => Err(Untested::Because(
                "the work allowed was spent in the search for the worst case".into(),
            )),
            found => found,
        }
    }

    fn search(&self, side: Side, search: Search) -> Result<Option<Least>, Untested> {
        if self.margin(&vec![0.0; self.draws.len()], side)?.is_none() {
            return Ok(None);
        }
        let mut failure = None;
        let mut seen: Vec<Sample> = Vec::new();
        let mut left = search.most;
        let mut evaluate = |point: &[f64]| {
            if !self.known.borrow().contains_key(&key(point)) {
                left = left.checked_sub(1)?;
            }
            match self.margin(point, side) {
                Ok(Some(sample)) => {
                    seen.push(sample.clone());
                    Some(sample)
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
        if let Some(found) = found {
            return Ok(Some(found));
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

/// A point by its bits; both zeros are one.
fn key(point: &[f64]) -> Vec<u64> {
    point.iter().map(|at| (at + 0.0).to_bits()).collect()
}

/// The numerical error of a margin.
pub(super) fn doubt(reading: &Reading, side: Side) -> f64 {
    let limit = match side {
        Side::Lower => &reading.lower,
        Side::Upper => &reading.upper,
    };
    let limit = limit.as_ref().map_or(0.0, |limit| limit.value.uncertainty);
    reading.value.value.uncertainty + limit
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
