//! What becomes of a crystal's measures and targets, at the nominal values and over the box of tolerances.

use std::sync::Arc;

use crate::model::{ClassWish, Crystal, CrystalRef, Dimension, GapWish, Setting, Target, Wish};

use super::filling::Filled;
use super::probe::{Measures, Probe, Reading};
use super::quantity::{Beside, Crystals, Evaluation, Untested};
use super::{
    Assessment, Class, GapKind, MeasureValue, Measured, Solution, Solver, TargetState, solve,
};

/// Gives a crystal at a setting of its tolerances; `None` where it cannot be built.
pub type Rebuild<'a> = dyn Fn(CrystalRef, &Setting) -> Option<Arc<Crystal>> + Sync + 'a;

/// What a crystal's statements ask for.
pub(super) struct Assessor<'a> {
    pub solver: &'a Solver,
    pub of: CrystalRef,
    pub crystal: &'a Arc<Crystal>,
    pub rebuild: &'a Rebuild<'a>,
    pub cancelled: &'a (dyn Fn() -> bool + Sync),
}

impl Assessor<'_> {
    /// The values of the measures, in order.
    pub fn measures(&self) -> Vec<MeasureValue> {
        let nominal = Setting::default();
        let crystals = |of| self.at(of, &nominal);
        let evaluation = self.evaluation(&crystals, None);
        let measures = self.crystal.measures.iter();
        measures
            .map(|measure| MeasureValue {
                place: measure.place,
                name: measure.name.clone(),
                value: evaluation
                    .formula(&measure.expression)
                    .map(|leaf| leaf.value)
                    .map_err(words),
                dimension: measure.dimension,
            })
            .collect()
    }

    /// What became of each target, in order; `None` when the work was overtaken.
    pub fn targets(&self) -> Option<Vec<Assessment>> {
        (0..self.crystal.targets.len())
            .map(|index| self.target(index))
            .collect()
    }

    pub fn evaluation<'b>(
        &'b self,
        crystals: &'b Crystals<'b>,
        beside: Option<&'b Beside<'b>>,
    ) -> Evaluation<'b> {
        Evaluation {
            solver: self.solver,
            crystals,
            cancelled: self.cancelled,
            beside,
        }
    }

    /// A crystal at a setting; this one's nominal self is at hand.
    pub fn at(&self, of: CrystalRef, setting: &Setting) -> Option<Arc<Crystal>> {
        if of == self.of && setting.is_nominal() {
            return Some(Arc::clone(self.crystal));
        }
        (self.rebuild)(of, setting)
    }

    /// What became of one target; `None` when the work was overtaken.
    pub fn target(&self, index: usize) -> Option<Assessment> {
        let target = self.crystal.targets.get(index)?;
        let found = match &target.wish {
            Wish::Compare { dimension, .. } => self.compare(index, target, *dimension),
            Wish::Class(wish) => self.class(target, *wish),
            Wish::GapIs { of, band, kind } => self.gap_is(target, *of, *band, *kind),
        };
        match found {
            Ok(assessment) => Some(assessment),
            Err(Untested::Cancelled) => None,
            Err(Untested::Because(reason)) => Some(Assessment {
                reason: Some(reason),
                ..blank(target, TargetState::Untestable)
            }),
        }
    }

    fn compare(
        &self,
        index: usize,
        target: &Target,
        dimension: Dimension,
    ) -> Result<Assessment, Untested> {
        let draws = self.draws(target);
        let probe = Probe::new(self, Measures::Target(index), &draws);
        let nominal = probe.nominal()?;
        let limits = limits(&nominal);
        let mut assessment = Assessment {
            state: state(nominal.value.value, limits),
            value: Some(nominal.value.value),
            dimension,
            limits: (
                limits.0.map(|limit| limit.value),
                limits.1.map(|limit| limit.value),
            ),
            ..blank(target, TargetState::Met)
        };
        if assessment.state == TargetState::Undecided {
            assessment.reason = Some("the limit lies inside the value's uncertainty".into());
        }
        if draws.is_empty() {
            return Ok(assessment);
        }
        match self.worst(&probe, target, &mut assessment) {
            // What is missed already needs no worst case.
            Err(Untested::Because(_)) if assessment.state == TargetState::Missed => {}
            found => found?,
        }
        Ok(assessment)
    }

    fn class(&self, target: &Target, wish: ClassWish) -> Result<Assessment, Untested> {
        let solution = self.solver.solve(self.crystal, self.cancelled)?;
        let class = solution
            .class
            .ok_or_else(|| no_class(self.crystal, &solution))?;
        let mut assessment = blank(
            target,
            if fits(class, wish) {
                TargetState::Met
            } else {
                TargetState::Missed
            },
        );
        assessment.found = Some(class_word(class).to_string());
        let whole = match solve::filled(self.crystal) {
            Some(Filled::Whole(whole)) => whole,
            _ => return Ok(assessment),
        };
        let wants_gap = matches!(wish, ClassWish::Insulator | ClassWish::Semiconductor);
        if assessment.state == TargetState::Met && wants_gap {
            self.keeps_gap(self.of, whole, &mut assessment)?;
        }
        Ok(assessment)
    }

    fn gap_is(
        &self,
        target: &Target,
        of: CrystalRef,
        band: usize,
        wish: GapWish,
    ) -> Result<Assessment, Untested> {
        let crystal = self.at(of, &Setting::default()).ok_or_else(no_crystal)?;
        let solution = self.solver.solve(&crystal, self.cancelled)?;
        let gap = solution.gaps.get(band.wrapping_sub(1)).ok_or_else(|| {
            Untested::Because(format!(
                "it speaks of gap {band}, and {} bands are solved",
                solution.bands.len()
            ))
        })?;
        let fits = matches!(
            (gap.kind, wish),
            (GapKind::Direct, GapWish::Direct)
                | (GapKind::Indirect, GapWish::Indirect)
                | (GapKind::Closed, GapWish::Closed)
        );
        let mut assessment = blank(
            target,
            if fits {
                TargetState::Met
            } else {
                TargetState::Missed
            },
        );
        assessment.found = Some(gap_word(gap.kind).to_string());
        assessment.value = Some(gap.size);
        assessment.dimension = Dimension::ENERGY;
        if fits && wish != GapWish::Closed {
            self.keeps_gap(of, band, &mut assessment)?;
        }
        Ok(assessment)
    }
}

pub(super) fn limits(reading: &Reading) -> (Option<Measured>, Option<Measured>) {
    (
        reading.lower.as_ref().map(|leaf| leaf.value),
        reading.upper.as_ref().map(|leaf| leaf.value),
    )
}

/// Whether a value is within its limits, outside, or too near to tell.
pub(super) fn state(value: Measured, limits: (Option<Measured>, Option<Measured>)) -> TargetState {
    let margins = [
        limits.0.map(|limit| {
            (
                value.value - limit.value,
                value.uncertainty + limit.uncertainty,
            )
        }),
        limits.1.map(|limit| {
            (
                limit.value - value.value,
                value.uncertainty + limit.uncertainty,
            )
        }),
    ];
    let margins = margins.into_iter().flatten();
    let mut state = TargetState::Met;
    for (margin, uncertainty) in margins {
        if margin < -uncertainty {
            return TargetState::Missed;
        }
        // Rounding of the limit itself is not a doubt: a value equal to its limit to the last digit counts as inside.
        if margin < uncertainty {
            state = TargetState::Undecided;
        }
    }
    state
}

fn blank(target: &Target, state: TargetState) -> Assessment {
    Assessment {
        place: target.place,
        text: target.text.clone(),
        state,
        reason: None,
        value: None,
        dimension: Dimension::NUMBER,
        limits: (None, None),
        worst: None,
        corner: Vec::new(),
        driver: None,
        found: None,
    }
}

fn words(untested: Untested) -> String {
    match untested {
        Untested::Cancelled => "the work was overtaken".into(),
        Untested::Because(reason) => reason,
    }
}

fn no_crystal() -> Untested {
    Untested::Because("its crystal cannot be read".into())
}

fn no_class(crystal: &Crystal, solution: &Solution) -> Untested {
    let reason = match (&crystal.filling, crystal.bosons) {
        (_, true) => "bosons have no class".to_string(),
        (None, _) => "the crystal says no `filling`".to_string(),
        (Some(_), _) => format!(
            "the filling is not within the {} bands solved",
            solution.bands.len()
        ),
    };
    Untested::Because(reason)
}

fn fits(class: Class, wish: ClassWish) -> bool {
    match wish {
        ClassWish::Metal => class == Class::Metal,
        ClassWish::Semimetal => class == Class::Semimetal,
        ClassWish::Semiconductor => class == Class::Semiconductor,
        ClassWish::Insulator => matches!(class, Class::Semiconductor | Class::Insulator),
    }
}

/// The word for a class.
#[must_use]
pub fn class_word(class: Class) -> &'static str {
    match class {
        Class::Metal => "metal",
        Class::Semimetal => "semimetal",
        Class::Semiconductor => "semiconductor",
        Class::Insulator => "insulator",
    }
}

/// The word for a kind of gap.
#[must_use]
pub fn gap_word(kind: GapKind) -> &'static str {
    match kind {
        GapKind::Direct => "direct",
        GapKind::Indirect => "indirect",
        GapKind::Closed => "closed",
        GapKind::Overlap => "overlap",
    }
}
