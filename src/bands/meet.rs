//! The value of one number at which a target is met.
//!
//! Newton's method on the margin m(p) of the limit that fails, from today's value p₀ towards the side where m rises,
//! with its derivative; a bracket (m < 0, m ≥ 0) once found is
//! never left. A margin that turns before it reaches zero, or is still below zero at 0.3 p₀ or 3 p₀, has no such value.

use std::sync::Arc;

use crate::model::{Crystal, CrystalRef, ParameterId, Setting};

use super::assess::Assessor;
use super::probe::{Measures, Probe, Side, doubt, margin_of};
use super::{Assessment, Cancelled, Rebuild, Solver};

/// Derivatives by parameter.
type Slopes = Vec<(ParameterId, f64)>;

/// How far a number may go, as parts of what it is.
const BOUNDS: [f64; 2] = [0.3, 3.0];
/// One step of the search goes no farther than this part of the number.
const STRIDE: f64 = 0.35;
/// A root this near, as a part of the way to it, is near enough: the number is rounded after.
const NEAR: f64 = 0.01;
/// Steps to find a bracket, and to close it.
const STEPS: usize = 12;

/// A target to be met by changing one number.
pub struct Wanted<'a> {
    /// Its crystal.
    pub of: CrystalRef,
    /// The same, built.
    pub crystal: &'a Arc<Crystal>,
    /// Gives a crystal at a setting.
    pub rebuild: &'a Rebuild<'a>,
    /// Which of the crystal's targets.
    pub index: usize,
    /// Stops the work.
    pub cancelled: &'a Cancelled<'a>,
}

/// Where in the tolerances, as in [`Assessment::corner`].
type Corner = [(ParameterId, f64)];

/// The margin at one value of a number.
#[derive(Clone, Copy)]
struct Point {
    value: f64,
    /// From the failing limit, numerical error taken off.
    margin: f64,
    slope: f64,
}

impl Solver {
    /// How the margin of a target moves with each of some numbers (identity and value), at a corner of its tolerances.
    /// Per SI unit of each; `None` where it cannot be tested.
    #[must_use]
    pub fn pulls(
        &self,
        wanted: &Wanted<'_>,
        numbers: &[(ParameterId, f64)],
        corner: &Corner,
    ) -> Option<Vec<f64>> {
        let assessor = wanted.assessor(self, wanted.crystal, wanted.rebuild);
        let (_, _, slopes) = margin(&assessor, wanted.index, corner, None, numbers)?;
        let pulls = numbers.iter().map(|(id, _)| slope(&slopes, *id));
        Some(pulls.collect())
    }

    /// The value nearest to today's, within 0.3 to 3 times of it, at which the target's failing limit is just kept at
    /// a corner of its tolerances, and whether larger values keep it better; `None` where there is none.
    #[must_use]
    pub fn meeting(
        &self,
        wanted: &Wanted<'_>,
        number: (ParameterId, f64),
        corner: &Corner,
    ) -> Option<(f64, bool)> {
        let assessor = wanted.assessor(self, wanted.crystal, wanted.rebuild);
        let (side, _, _) = margin(&assessor, wanted.index, corner, None, &[number])?;
        let (id, today) = number;
        let start = self.point(wanted, number, corner, side)?;
        if start.margin >= 0.0 || start.slope == 0.0 {
            return None;
        }
        let look = |value: f64| self.point(wanted, (id, value), corner, side);
        let (below, above) = bracket(start, today, &look)?;
        let met = close(below, above, today, &look)?;
        Some((met.value, start.slope > 0.0))
    }

    /// What becomes of a target with one number replaced.
    #[must_use]
    pub fn assess_with(
        &self,
        wanted: &Wanted<'_>,
        number: (ParameterId, f64),
    ) -> Option<Assessment> {
        wanted.with(number, |crystal, rebuild| {
            wanted.assessor(self, crystal, rebuild).target(wanted.index)
        })
    }

    fn point(
        &self,
        wanted: &Wanted<'_>,
        (id, value): (ParameterId, f64),
        corner: &Corner,
        side: Side,
    ) -> Option<Point> {
        let (_, margin, slopes) = wanted.with((id, value), |crystal, rebuild| {
            let assessor = wanted.assessor(self, crystal, rebuild);
            margin(&assessor, wanted.index, corner, Some(side), &[(id, value)])
        })?;
        let slope = slope(&slopes, id);
        (margin.is_finite() && slope.is_finite()).then_some(Point {
            value,
            margin,
            slope,
        })
    }
}

impl Wanted<'_> {
    fn assessor<'b>(
        &'b self,
        solver: &'b Solver,
        crystal: &'b Arc<Crystal>,
        rebuild: &'b Rebuild<'b>,
    ) -> Assessor<'b> {
        Assessor {
            solver,
            of: self.of,
            crystal,
            rebuild,
            cancelled: self.cancelled,
        }
    }

    /// The crystal with one number replaced, and what rebuilds it so.
    fn with<T>(
        &self,
        (id, value): (ParameterId, f64),
        then: impl FnOnce(&Arc<Crystal>, &Rebuild<'_>) -> Option<T>,
    ) -> Option<T> {
        let rebuild = |of: CrystalRef, setting: &Setting| {
            let mut setting = setting.clone();
            setting.overrides.entry(id).or_insert(value);
            (self.rebuild)(of, &setting)
        };
        let crystal = rebuild(self.of, &Setting::default())?;
        if crystal.broken || (self.cancelled)() {
            return None;
        }
        then(&crystal, &rebuild)
    }
}

/// The margin of one limit, or of the one that fails most, numerical error taken off, with its derivatives by these
/// numbers among others.
fn margin(
    assessor: &Assessor<'_>,
    index: usize,
    corner: &Corner,
    side: Option<Side>,
    numbers: &[(ParameterId, f64)],
) -> Option<(Side, f64, Slopes)> {
    let (draws, point): (Vec<ParameterId>, Vec<f64>) = corner.iter().copied().unzip();
    let mut probe = Probe::new(assessor, Measures::Target(index), &draws);
    probe.numbers = numbers;
    let reading = probe.at(&point).ok()?;
    let sides = [Side::Lower, Side::Upper].into_iter();
    let margins = sides
        .filter(|one| side.is_none_or(|side| side == *one))
        .filter_map(|side| {
            let (value, slopes) = margin_of(&reading, side)?;
            Some((side, value - doubt(&reading, side), slopes))
        });
    margins.min_by(|one, other| one.1.total_cmp(&other.1))
}

fn slope(slopes: &[(ParameterId, f64)], id: ParameterId) -> f64 {
    let found = slopes.binary_search_by_key(&id, |(known, _)| *known).ok();
    found
        .and_then(|index| slopes.get(index))
        .map_or(0.0, |(_, slope)| *slope)
}

/// The first point at which the margin is not below zero, and the last before it.
fn bracket(
    start: Point,
    today: f64,
    look: &dyn Fn(f64) -> Option<Point>,
) -> Option<(Point, Point)> {
    let [one, other] = BOUNDS.map(|bound| bound * today);
    let (low, high) = (one.min(other), one.max(other));
    let stride = STRIDE * today.abs();
    let mut below = start;
    for _ in 0..STEPS {
        // A hair farther than the tangent says, so that a straight margin is bracketed at once.
        let step = -1.001 * below.margin / below.slope;
        let value = (below.value + step.clamp(-stride, stride)).clamp(low, high);
        if value == below.value {
            return None;
        }
        let next = look(value)?;
        if next.margin >= 0.0 {
            return Some((below, next));
        }
        if next.slope * start.slope <= 0.0 {
            return None;
        }
        below = next;
    }
    None
}

/// A point at which the margin is hardly above zero.
fn close(
    mut below: Point,
    mut above: Point,
    today: f64,
    look: &dyn Fn(f64) -> Option<Point>,
) -> Option<Point> {
    for _ in 0..STEPS {
        let way = NEAR * (above.value - today).abs();
        let ahead = above.margin / above.slope;
        if ahead.abs() <= way || (above.value - below.value).abs() <= way {
            break;
        }
        let newton = above.value - ahead;
        let inside = (newton - below.value) * (newton - above.value) < 0.0;
        let middle = 0.5 * (below.value + above.value);
        let next = look(if inside { newton } else { middle })?;
        match next.margin >= 0.0 {
            true => above = next,
            false => below = next,
        }
    }
    Some(above)
}
