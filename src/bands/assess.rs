//! What becomes of a crystal's measures and targets, at the nominal values and over the box of tolerances.

use std::sync::Arc;

use crate::model::{
    ClassWish, Crystal, CrystalRef, Dimension, GapWish, ParameterId, ParameterKind, Quantity,
    QuantityKind, Setting, Target, TargetFormula, Wish,
};

use super::filling::Filled;
use super::probe::{Least, Measures, Probe, Reading, Search, Side};
use super::quantity::{Crystals, Evaluation, Untested};
use super::worst::Sample;
use super::{
    Assessment, Class, GapKind, MeasureValue, Measured, Solution, Solver, TargetState, solve,
};

/// Gives a crystal at a setting of its tolerances; `None` where it cannot be built.
pub type Rebuild<'a> = dyn Fn(CrystalRef, &Setting) -> Option<Arc<Crystal>> + Sync + 'a;

/// Tolerances past this many are taken at their corners by sign alone.
const MOST_TOLERANCES: usize = 24;

/// Points of the box of tolerances that are looked at for one target, in two and three dimensions: each is a solve of the
/// whole zone.
const MOST_POINTS: [usize; 2] = [120, 40];

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
        let evaluation = self.evaluation(&crystals, false);
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
        with_slopes: bool,
    ) -> Evaluation<'b> {
        Evaluation {
            solver: self.solver,
            crystals,
            cancelled: self.cancelled,
            with_slopes,
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
        let probe = Probe {
            assessor: self,
            measures: Measures::Target(index),
            draws: &draws,
        };
        let nominal = probe.at(&vec![0.0; draws.len()], false)?;
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

    /// Adds the worst case over the tolerances.
    fn worst(
        &self,
        probe: &Probe<'_>,
        target: &Target,
        assessment: &mut Assessment,
    ) -> Result<(), Untested> {
        let search = self.search(target);
        let mut least: Option<Least> = None;
        let mut complete = true;
        for side in [Side::Lower, Side::Upper] {
            let found = probe.least_margin(side, search)?;
            complete &= found.as_ref().is_none_or(|found| found.complete);
            let better = |found: &Least| {
                least
                    .as_ref()
                    .is_none_or(|least| found.worst.value < least.worst.value)
            };
            if found.as_ref().is_some_and(better) {
                least = found;
            }
        }
        let Some(Least { centre, worst, .. }) = least else {
            return Ok(());
        };
        let there = probe.at(&worst.point, false)?;
        assessment.worst = Some(there.value.value.value);
        note_corner(assessment, probe.draws, &centre, &worst);
        if search.corners && assessment.reason.is_none() {
            assessment.reason =
                Some("the worst case is the worst of the tolerances' corners".into());
        }
        if assessment.state == TargetState::Met {
            match state(there.value.value, limits(&there)) {
                TargetState::Missed => assessment.state = TargetState::AtRisk,
                TargetState::Undecided => {
                    assessment.state = TargetState::Undecided;
                    assessment.reason =
                        Some("at the worst values of the tolerances the limit lies inside the uncertainty".into());
                }
                _ if !complete => leave_open(assessment),
                _ => {}
            }
        }
        Ok(())
    }

    /// How the worst case of a target is searched for.
    fn search(&self, target: &Target) -> Search {
        let Wish::Compare { expression, .. } = &target.wish else {
            return self.search_in(self.crystal.dimension, true);
        };
        let quantities = expression.quantities();
        let nominal = Setting::default();
        let dimensions = quantities.iter().filter_map(|quantity| {
            self.at(quantity.of, &nominal)
                .map(|crystal| crystal.dimension)
        });
        let dimension = dimensions.max().unwrap_or(self.crystal.dimension);
        let smooth = !quantities.iter().any(|quantity| self.is_kinked(quantity));
        let exact = self.has_exact_slopes(target);
        Search {
            exact,
            corners: !exact && dimension > 1,
            ..self.search_in(dimension, smooth)
        }
    }

    fn search_in(&self, dimension: usize, smooth: bool) -> Search {
        Search {
            exact: true,
            smooth,
            floor: f64::NEG_INFINITY,
            most: match dimension {
                0 | 1 => usize::MAX,
                2 => MOST_POINTS[0],
                _ => MOST_POINTS[1],
            },
            corners: false,
        }
    }

    /// Whether a change may split the levels that a quantity speaks of: slopes are then one-sided.
    fn is_kinked(&self, quantity: &Quantity) -> bool {
        let Some(crystal) = self.at(quantity.of, &Setting::default()) else {
            return true;
        };
        if crystal.dimension < 2 {
            return false;
        }
        let Ok(solution) = self.solver.solve(&crystal, self.cancelled) else {
            return true;
        };
        let band = |number: usize| solution.bands.get(number.wrapping_sub(1));
        // An extremum on a crossing has no mass.
        let top = |number: usize| band(number).is_none_or(|band| band.top.mass.is_none());
        let bottom = |number: usize| band(number).is_none_or(|band| band.bottom.mass.is_none());
        match quantity.kind {
            QuantityKind::Gap(number) => {
                top(number) || number < solution.bands.len() && bottom(number + 1)
            }
            QuantityKind::Width(number) => top(number) || bottom(number),
            QuantityKind::Top(number) => top(number),
            QuantityKind::Bottom(number) => bottom(number),
            _ => true,
        }
    }

    /// Whether a target speaks only of quantities with exact derivatives.
    pub fn has_exact_slopes(&self, target: &Target) -> bool {
        let Wish::Compare { expression, .. } = &target.wish else {
            return true;
        };
        let differenced = |quantity: &&Quantity| match quantity.kind {
            QuantityKind::MassBottom(_) | QuantityKind::MassTop(_) | QuantityKind::Hopping(..) => {
                true
            }
            // A metal's, past one dimension, comes from sums over the whole zone.
            QuantityKind::Fermi => self
                .at(quantity.of, &Setting::default())
                .is_some_and(|crystal| crystal.dimension > 1),
            _ => false,
        };
        !expression.quantities().iter().any(differenced)
    }

    /// The tolerances that reach any crystal that a target speaks of.
    fn draws(&self, target: &Target) -> Vec<ParameterId> {
        let mut crystals = vec![self.of];
        if let Wish::Compare { expression, .. } = &target.wish {
            crystals.extend(expression.quantities().iter().map(|quantity| quantity.of));
        }
        if let Wish::GapIs { of, .. } = &target.wish {
            crystals.push(*of);
        }
        self.draws_of(crystals)
    }

    fn draws_of(&self, mut crystals: Vec<CrystalRef>) -> Vec<ParameterId> {
        crystals.sort_by_key(|of| (of.file, of.section));
        crystals.dedup();
        let nominal = Setting::default();
        let mut draws = Vec::new();
        for of in crystals {
            if let Some(crystal) = self.at(of, &nominal) {
                let own = crystal
                    .parameters
                    .iter()
                    .filter(|parameter| parameter.kind == ParameterKind::Draw);
                draws.extend(own.map(|parameter| parameter.id));
            }
        }
        draws.sort();
        draws.dedup();
        draws.truncate(MOST_TOLERANCES);
        draws
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

    /// Puts a target at risk where a gap closes within the tolerances.
    fn keeps_gap(
        &self,
        of: CrystalRef,
        band: usize,
        assessment: &mut Assessment,
    ) -> Result<(), Untested> {
        let draws = self.draws_of(vec![self.of, of]);
        if draws.is_empty() {
            return Ok(());
        }
        let gap = Quantity {
            of,
            place: assessment.place,
            kind: QuantityKind::Gap(band),
        };
        let gap = TargetFormula::Quantity(gap);
        let probe = Probe {
            assessor: self,
            measures: Measures::Formula(&gap),
            draws: &draws,
        };
        let dimension = self
            .at(of, &Setting::default())
            .map_or(self.crystal.dimension, |crystal| crystal.dimension);
        let quantity = Quantity {
            of,
            place: assessment.place,
            kind: QuantityKind::Gap(band),
        };
        let search = Search {
            floor: 0.0,
            ..self.search_in(dimension, !self.is_kinked(&quantity))
        };
        let Some(least) = probe.least_margin(Side::Lower, search)? else {
            return Ok(());
        };
        let Least {
            centre,
            worst,
            complete,
        } = least;
        assessment.worst = Some(worst.value);
        note_corner(assessment, &draws, &centre, &worst);
        if worst.value <= 0.0 {
            assessment.state = TargetState::AtRisk;
        } else if !complete {
            leave_open(assessment);
        }
        Ok(())
    }
}

/// The worst case is not known: what holds where it was looked for may fail elsewhere.
fn leave_open(assessment: &mut Assessment) {
    assessment.state = TargetState::Undecided;
    assessment.reason = Some(
        "the search for the worst values of the tolerances was cut short: it is not exact".into(),
    );
}

/// Writes down where the worst case lies and which tolerance spends most of the margin on the way there.
fn note_corner(
    assessment: &mut Assessment,
    draws: &[ParameterId],
    centre: &Sample,
    worst: &Sample,
) {
    assessment.corner = draws
        .iter()
        .copied()
        .zip(worst.point.iter().copied())
        .collect();
    // What one tolerance spends: the mean of its slopes at both ends of the way, times its part of the way.
    let spent = |axis: usize| {
        let slope = |sample: &Sample| sample.slopes.get(axis).copied().unwrap_or(0.0);
        let way = worst.point.get(axis).copied().unwrap_or(0.0);
        -0.5 * (slope(centre) + slope(worst)) * way
    };
    // At a kink the slopes of its two sides cancel: then the one on the way there tells.
    let begun = |axis: usize| {
        let slope = centre.slopes.get(axis).copied().unwrap_or(0.0);
        -slope * worst.point.get(axis).copied().unwrap_or(0.0)
    };
    let most = |spent: &dyn Fn(usize) -> f64| {
        (0..draws.len())
            .max_by(|a, b| spent(*a).total_cmp(&spent(*b)))
            .filter(|axis| spent(*axis) > 0.0)
    };
    assessment.driver = most(&spent)
        .or_else(|| most(&begun))
        .and_then(|axis| draws.get(axis).copied());
}

fn limits(reading: &Reading) -> (Option<Measured>, Option<Measured>) {
    (
        reading.lower.as_ref().map(|leaf| leaf.value),
        reading.upper.as_ref().map(|leaf| leaf.value),
    )
}

/// Whether a value is within its limits, outside, or too near to tell.
fn state(value: Measured, limits: (Option<Measured>, Option<Measured>)) -> TargetState {
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
