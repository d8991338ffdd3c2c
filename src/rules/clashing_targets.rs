//! # What it finds
//! Requirements of one crystal on the same quantity that cannot both hold.
//!
//! # Why it matters
//! No change of the crystal can ever meet them.
//!
//! # Example
//! ```cren
//! crystal tern
//!   mass 1 me
//!   lattice chain 0.4 nm
//!   cosine 1 = 500 meV
//!   require width 1 <= 2 eV
//!   require width 1 >= 3 eV
//!   ^^^^^^^^^^^^^^^^^^^^^^^
//! ```
//! Also found: `target-missed`.
//!
//! # Instead
//! ```cren
//! crystal tern
//!   mass 1 me
//!   lattice chain 0.4 nm
//!   cosine 1 = 500 meV
//!   require width 1 between 1 eV and 3 eV
//! ```
//!
//! # Fix
//! None.

use super::formula::{same, value};
use super::{Finding, Level, Rule, Subject, Tier};
use crate::model::{
    ClassWish, Dimension, GapWish, Limits, QuantityKind, Target, TargetFormula, Wish,
};

/// The rule.
pub const RULE: Rule = Rule {
    name: "clashing-targets",
    group: "targets",
    level: Level::Error,
    tier: Tier::Model,
    waivable: false,
    source: include_str!("clashing_targets.rs"),
    check,
};

fn check(subject: &Subject<'_>, findings: &mut Vec<Finding>) {
    let Some(crystal) = subject.crystal else {
        return;
    };
    for (index, target) in crystal.targets.iter().enumerate() {
        let earlier = crystal.targets.iter().take(index);
        let other = earlier.into_iter().find(|other| clash(other, target));
        if let Some(other) = other {
            findings.push(finding(subject, target, other));
        }
    }
}

fn finding(subject: &Subject<'_>, target: &Target, other: &Target) -> Finding {
    let message = format!("`{}` and `{}` cannot both hold", other.text, target.text);
    let place = match subject.holds(target.place) {
        true => target.place,
        false => subject.heading(),
    };
    Finding::new(&RULE, place, message).related(other.place, "the other requirement")
}

fn clash(one: &Target, other: &Target) -> bool {
    match (&one.wish, &other.wish) {
        (Wish::Class(one), Wish::Class(other)) => classes_clash(*one, *other),
        (
            Wish::GapIs { of, band, kind },
            Wish::GapIs {
                of: other_of,
                band: other_band,
                kind: other_kind,
            },
        ) => of == other_of && band == other_band && kind != other_kind,
        (
            Wish::Compare {
                expression, limits, ..
            },
            Wish::Compare {
                expression: other_expression,
                limits: other_limits,
                ..
            },
        ) => same(expression, other_expression) && apart(limits, other_limits),
        (
            Wish::Compare {
                expression,
                limits,
                dimension,
            },
            gap @ Wish::GapIs { .. },
        )
        | (
            gap @ Wish::GapIs { .. },
            Wish::Compare {
                expression,
                limits,
                dimension,
            },
        ) => *dimension == Dimension::ENERGY && closure_clashes(expression, limits, gap),
        _ => false,
    }
}

/// A semiconductor is an insulator too.
fn classes_clash(one: ClassWish, other: ClassWish) -> bool {
    let insulating = |wish| matches!(wish, ClassWish::Semiconductor | ClassWish::Insulator);
    one != other && !(insulating(one) && insulating(other))
}

/// A gap that is to be closed cannot be above zero, one that is to be open cannot be at most zero.
fn closure_clashes(expression: &TargetFormula, limits: &Limits, gap: &Wish) -> bool {
    let (TargetFormula::Quantity(quantity), Wish::GapIs { of, band, kind }) = (expression, gap)
    else {
        return false;
    };
    if quantity.of != *of || quantity.kind != QuantityKind::Gap(*band) {
        return false;
    }
    let Some(interval) = interval(limits) else {
        return false;
    };
    match kind {
        GapWish::Closed => interval.lower > 0.0 || interval.upper < 0.0,
        GapWish::Direct | GapWish::Indirect => interval.upper < 0.0,
    }
}

/// The values that limits allow.
#[derive(Clone, Copy, Debug, PartialEq)]
struct Interval {
    lower: f64,
    lower_allowed: bool,
    upper: f64,
    upper_allowed: bool,
}

impl Interval {
    fn is_empty(&self) -> bool {
        self.lower > self.upper
            || (self.lower >= self.upper && !(self.lower_allowed && self.upper_allowed))
    }

    fn meet(&self, other: &Self) -> Self {
        let (lower, lower_allowed) = match self.lower.total_cmp(&other.lower) {
            std::cmp::Ordering::Greater => (self.lower, self.lower_allowed),
            std::cmp::Ordering::Less => (other.lower, other.lower_allowed),
            std::cmp::Ordering::Equal => (self.lower, self.lower_allowed && other.lower_allowed),
        };
        let (upper, upper_allowed) = match self.upper.total_cmp(&other.upper) {
            std::cmp::Ordering::Less => (self.upper, self.upper_allowed),
            std::cmp::Ordering::Greater => (other.upper, other.upper_allowed),
            std::cmp::Ordering::Equal => (self.upper, self.upper_allowed && other.upper_allowed),
        };
        Self {
            lower,
            lower_allowed,
            upper,
            upper_allowed,
        }
    }
}

/// The interval of limits that are plain values; nothing where a limit depends on the bands.
fn interval(limits: &Limits) -> Option<Interval> {
    let (lower, lower_allowed) = match &limits.lower {
        Some((formula, allowed)) => (value(formula)?, *allowed),
        None => (f64::NEG_INFINITY, true),
    };
    let (upper, upper_allowed) = match &limits.upper {
        Some((formula, allowed)) => (value(formula)?, *allowed),
        None => (f64::INFINITY, true),
    };
    Some(Interval {
        lower,
        lower_allowed,
        upper,
        upper_allowed,
    })
}

fn apart(one: &Limits, other: &Limits) -> bool {
    match (interval(one), interval(other)) {
        (Some(one), Some(other)) => {
            !one.is_empty() && !other.is_empty() && one.meet(&other).is_empty()
        }
        _ => false,
    }
}

#[cfg(test)]
mod tests {
    use super::super::fixture::{messages, silent};
    use super::RULE;

    fn crystal(targets: &str) -> String {
        format!("crystal a\n  mass 1 me\n  lattice chain 0.4 nm\n  cosine 1 = 500 meV\n{targets}")
    }

    #[test]
    fn limits_that_exclude_each_other_clash() {
        let text = crystal("  require gap 1 >= 3 eV\n  require gap 1 < 3 eV\n");
        assert_eq!(
            messages(&RULE, &text),
            ["`gap 1 >= 3 eV` and `gap 1 < 3 eV` cannot both hold"]
        );
    }

    #[test]
    fn classes_and_kinds_of_gap_clash() {
        let text = crystal("  filling 2\n  require metal\n  require insulator\n");
        assert_eq!(messages(&RULE, &text).len(), 1);
        let text = crystal("  require gap 1 closed\n  require gap 1 >= 1 meV\n");
        assert_eq!(messages(&RULE, &text).len(), 1);
    }

    #[test]
    fn limits_that_touch_can_both_hold() {
        silent(
            &RULE,
            &crystal("  require gap 1 >= 3 eV\n  require gap 1 <= 3 eV\n"),
        );
        silent(
            &RULE,
            &crystal("  require gap 1 >= 3 eV\n  require gap 2 <= 2 eV\n"),
        );
        silent(
            &RULE,
            &crystal("  filling 2\n  require semiconductor\n  require insulator\n"),
        );
    }
}
