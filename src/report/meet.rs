//! "5.4 nm → 5.31 nm meets gap 1 >= 130 meV": the one number to change so that a target is met.
//!
//! Each number that moves the target is solved for at the worst values of the tolerances (at the nominal ones where
//! there are none), rounded to few digits on the side that keeps the limit, and offered only once a whole assessment of
//! the edited text says that the target is met.

use std::sync::Arc;

use rayon::prelude::*;

use super::actions::{Action, ActionKind, Asked};
use super::analysis::{FileAnalysis, SectionAnalysis};
use super::locate::Locator;
use super::trial;
use crate::bands::{Assessment, TargetState, Wanted};
use crate::model::{
    Crystal, CrystalRef, Parameter, ParameterId, ParameterKind, Place, Setting, Wish, build_crystal,
};

/// Numbers that are solved for.
const NUMBERS: usize = 6;
/// The worst values of the tolerances move with the number: so often they are found anew.
const ROUNDS: usize = 4;
/// Rounding may add this part of the way.
const SPARE: f64 = 0.15;
/// Most significant digits written.
const DIGITS: usize = 6;
/// Numbers of digits tried out in full.
const TRIES: usize = 3;

/// The numbers of which one alone, changed, meets the target of this index; those that move it most come first.
pub(super) fn meet(
    asked: &Asked<'_>,
    file: &FileAnalysis,
    section: &SectionAnalysis,
    index: usize,
) -> Vec<Action> {
    let (Some(crystal), Some(target)) = (&section.crystal, section.targets.get(index)) else {
        return Vec::new();
    };
    let compares = crystal
        .targets
        .get(index)
        .is_some_and(|target| matches!(target.wish, Wish::Compare { .. }));
    if !compares || !matches!(target.state, TargetState::Missed | TargetState::AtRisk) {
        return Vec::new();
    }
    let rebuild = |of: CrystalRef, setting: &Setting| {
        let world = &asked.analysis.world;
        Some(Arc::new(
            build_crystal(world, of, setting, asked.source).crystal,
        ))
    };
    let of = CrystalRef {
        file: file.file,
        section: section.section,
    };
    let wanted = Wanted {
        of,
        crystal,
        rebuild: &rebuild,
        index,
        cancelled: asked.cancel,
    };
    let bench = Bench {
        asked,
        file,
        section,
        target,
        wanted: &wanted,
    };
    let numbers = bench.strongest(&candidates(crystal));
    let actions: Vec<Option<Action>> = numbers
        .par_iter()
        .map(|number| bench.action(number))
        .collect();
    actions.into_iter().flatten().collect()
}

/// The written numbers that may be changed: those with a unit, and whole named values and fields; not those of targets.
fn candidates(crystal: &Crystal) -> Vec<&Parameter> {
    let all = &crystal.parameters;
    let is_whole = |number: &Parameter| {
        all.iter().any(|other| {
            matches!(
                other.kind,
                ParameterKind::Name(_) | ParameterKind::Field(..)
            ) && other.place == number.place
        })
    };
    let wishes = || {
        let targets = crystal.targets.iter().map(|target| target.place);
        targets.chain(crystal.measures.iter().map(|measure| measure.place))
    };
    all.iter()
        .filter(|number| number.kind == ParameterKind::Literal && number.value != 0.0)
        .filter(|number| number.unit.is_some() || is_whole(number))
        .filter(|number| !wishes().any(|wish| covers(&wish, &number.place)))
        .collect()
}

fn covers(outer: &Place, inner: &Place) -> bool {
    outer.file == inner.file
        && outer.section == inner.section
        && outer.span.start <= inner.span.start
        && inner.span.end <= outer.span.end
}

/// A target to be met, and all that is at hand for it.
struct Bench<'a> {
    asked: &'a Asked<'a>,
    file: &'a FileAnalysis,
    section: &'a SectionAnalysis,
    target: &'a Assessment,
    wanted: &'a Wanted<'a>,
}

impl Bench<'_> {
    /// The numbers whose relative change moves the margin most.
    fn strongest<'p>(&self, candidates: &[&'p Parameter]) -> Vec<&'p Parameter> {
        let numbers: Vec<(ParameterId, f64)> = candidates
            .iter()
            .map(|number| (number.id, number.value))
            .collect();
        let solver = self.asked.analyst.solver();
        let Some(pulls) = solver.pulls(self.wanted, &numbers, &self.target.corner) else {
            return Vec::new();
        };
        let mut ranked: Vec<(f64, &Parameter)> = candidates
            .iter()
            .zip(pulls)
            .map(|(number, pull)| ((pull * number.value).abs(), *number))
            .filter(|(pull, _)| pull.is_finite() && *pull > 0.0)
            .collect();
        ranked.sort_by(|one, other| other.0.total_cmp(&one.0));
        ranked.truncate(NUMBERS);
        ranked.into_iter().map(|(_, number)| number).collect()
    }

    fn action(&self, number: &Parameter) -> Option<Action> {
        let written = Written::of(number)?;
        let solver = self.asked.analyst.solver();
        let mut corner = self.target.corner.clone();
        for _ in 0..ROUNDS {
            let id = (number.id, number.value);
            let (value, upward) = solver.meeting(self.wanted, id, &corner)?;
            let rounded = written.rounded(value, upward);
            let first = rounded.first()?;
            let there = (number.id, first.parse::<f64>().ok()? * written.factor);
            let assessed = solver.assess_with(self.wanted, there)?;
            if assessed.state != TargetState::Met && assessed.corner != corner {
                corner = assessed.corner;
                continue;
            }
            return rounded
                .iter()
                .take(TRIES)
                .find_map(|digits| self.tried(number, &written, digits));
        }
        None
    }

    /// The action that writes these digits, where the edited text meets the target.
    fn tried(&self, number: &Parameter, written: &Written, digits: &str) -> Option<Action> {
        let (path, span) = self.asked.analysis.absolute(&number.place)?;
        let text = format!("{digits}{}", written.rest);
        let edits = vec![(path.to_owned(), span, text.clone())];
        let after = trial::targets(self.asked, self.file, self.section.section, &edits)?;
        if after.get(self.wanted.index)?.state != TargetState::Met {
            return None;
        }
        let before = self.section.targets.iter();
        let lost = before
            .zip(&after)
            .filter(|(before, after)| {
                before.state == TargetState::Met && after.state != TargetState::Met
            })
            .map(|(before, _)| before.text.as_str())
            .next();
        let lost = lost.map_or(String::new(), |lost| format!(", no longer {lost}"));
        let line = Locator::new(self.asked.analysis).line(&number.place);
        Some(Action {
            title: format!(
                "{} → {text} meets {}{lost} (line {line})",
                number.text, self.target.text
            ),
            kind: ActionKind::Mend,
            edits,
            preferred: false,
            rule: Some(match self.target.state {
                TargetState::Missed => "target-missed",
                _ => "target-at-risk",
            }),
        })
    }
}

/// A number as it is written.
struct Written {
    /// The number without its unit.
    digits: f64,
    /// What stands behind the digits: the blank and the unit.
    rest: String,
    /// One of the unit in SI.
    factor: f64,
    /// Whether whole numbers of the unit are wanted first.
    counts: bool,
}

impl Written {
    fn of(number: &Parameter) -> Option<Self> {
        let text = number.text.as_str();
        let is_part = |character: char| character.is_ascii_digit() || ".eE+-".contains(character);
        let end = text
            .find(|character| !is_part(character))
            .unwrap_or(text.len());
        let (digits, end) = (1..=end)
            .rev()
            .find_map(|end| Some((text.get(..end)?.parse::<f64>().ok()?, end)))?;
        let written = Self {
            digits,
            rest: text.get(end..)?.to_owned(),
            factor: number.value / digits,
            counts: number.unit.as_ref().is_some_and(|(unit, _)| unit == "ML"),
        };
        (digits != 0.0 && written.factor.is_finite()).then_some(written)
    }

    /// The value in fewer and then in more digits, each rounded up or down as said and near enough.
    fn rounded(&self, value: f64, upward: bool) -> Vec<String> {
        let value = value / self.factor;
        let upward = upward == (self.factor > 0.0);
        let way = (value - self.digits).abs();
        let first_place = value.abs().log10().floor() as i32;
        let mut found: Vec<String> = Vec::new();
        for digits in 1..=DIGITS as i32 {
            let places = digits - 1 - first_place;
            let size = 10_f64.powi(places);
            let whole = match upward {
                true => (value * size).ceil(),
                false => (value * size).floor(),
            };
            let rounded = whole / size;
            let counted = self.counts && places == 0;
            let near = (rounded - value).abs() <= SPARE * way || counted;
            if near && rounded * value > 0.0 && rounded != self.digits {
                found.push(plain(rounded, places));
            }
        }
        found.dedup();
        found
    }
}

/// A number with so many places behind the point, idle zeros left out.
fn plain(value: f64, places: i32) -> String {
    if !(-3..=9).contains(&places) {
        return format!("{value:e}");
    }
    let text = format!("{value:.*}", usize::try_from(places).unwrap_or(0));
    match text.contains('.') {
        true => text.trim_end_matches('0').trim_end_matches('.').to_owned(),
        false => text,
    }
}

#[cfg(test)]
#[allow(clippy::indexing_slicing)]
mod tests {
    use super::*;

    fn written(digits: f64, unit: &str, factor: f64) -> Written {
        Written {
            digits,
            rest: format!(" {unit}"),
            factor,
            counts: unit == "ML",
        }
    }

    #[test]
    fn rounding_keeps_to_its_side() {
        let length = written(5.4, "nm", 1e-9);
        assert_eq!(length.rounded(5.3142e-9, false)[0], "5.31");
        assert_eq!(length.rounded(5.3142e-9, true)[0], "5.32");
        assert_eq!(written(-3.0, "meV", 1.0).rounded(-2.0, true)[0], "-2");
        assert_eq!(written(235.0, "meV", 1.0).rounded(412.3, true)[0], "420");
        assert_eq!(written(9.0, "ML", 1.0).rounded(9.2, true)[0], "10");
    }
}
