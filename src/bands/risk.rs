//! What the tolerances do to a crystal's targets: which of them count, and the search for the worst case.

use crate::model::{
    CrystalRef, ParameterId, ParameterKind, Quantity, QuantityKind, Setting, Target, TargetFormula,
    Wish,
};

use super::assess::{Assessor, limits, state};
use super::filling::Filled;
use super::lines::Sample;
use super::probe::{Measures, Probe, Search, Side};
use super::quantity::Untested;
use super::worst::Least;
use super::{Assessment, TargetState, solve};

/// Tolerances past this many are taken at their corners by sign alone.
const MOST_TOLERANCES: usize = 24;

/// Points of the box of tolerances that are looked at for one target, in two and three dimensions: each is a solve of the
/// whole zone.
const MOST_POINTS: [usize; 2] = [120, 40];

impl Assessor<'_> {
    /// Adds the worst case over the tolerances.
    pub fn worst(
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
        let there = probe.at(&worst.point)?;
        assessment.worst = Some(there.value.value.value);
        note_corner(assessment, probe.draws, &centre, &worst);
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
        self.search_in(dimension, smooth)
    }

    fn search_in(&self, dimension: usize, smooth: bool) -> Search {
        Search {
            smooth,
            floor: f64::NEG_INFINITY,
            most: match dimension {
                0 | 1 => usize::MAX,
                2 => MOST_POINTS[0],
                _ => MOST_POINTS[1],
            },
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
        let beside =
            |number: usize| top(number) || number < solution.bands.len() && bottom(number + 1);
        match quantity.kind {
            QuantityKind::Gap(number) => beside(number),
            QuantityKind::Width(number) => top(number) || bottom(number),
            QuantityKind::Top(number) | QuantityKind::MassTop(number) => top(number),
            QuantityKind::Bottom(number) | QuantityKind::MassBottom(number) => bottom(number),
            // What is summed over a zone is smooth, and a hopping is that of a band that touches no other.
            QuantityKind::Hopping(..) => false,
            QuantityKind::Fermi => match solve::filled(&crystal) {
                Some(Filled::Whole(whole)) => beside(whole),
                _ => false,
            },
            QuantityKind::Level(..) => true,
        }
    }

    /// The tolerances that reach any crystal that a target speaks of.
    pub fn draws(&self, target: &Target) -> Vec<ParameterId> {
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

    /// Puts a target at risk where a gap closes within the tolerances.
    pub fn keeps_gap(
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
        let smooth = !self.is_kinked(&gap);
        let gap = TargetFormula::Quantity(gap);
        let probe = Probe::new(self, Measures::Formula(&gap), &draws);
        let dimension = self
            .at(of, &Setting::default())
            .map_or(self.crystal.dimension, |crystal| crystal.dimension);
        let search = Search {
            floor: 0.0,
            ..self.search_in(dimension, smooth)
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
