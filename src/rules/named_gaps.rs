//! The gaps that matter to a crystal's designer: those that a target names, and the one that holds the Fermi level.

use crate::bands::{Class, Gap, Solution};
use crate::model::{
    ClassWish, Crystal, CrystalRef, GapWish, Limits, Place, QuantityKind, Target, TargetFormula,
    Wish,
};
use crate::syntax::StatementKind;

use super::Subject;
use super::formula::{quantities, value};

/// A gap that matters.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct NamedGap {
    /// The band below it, from 1.
    pub band: usize,
    /// The gap.
    pub gap: Gap,
    /// What makes it matter: a target, or the filling.
    pub place: Place,
    /// Whether it holds the Fermi level, and no target names it.
    pub fermi: bool,
    /// Whether the crystal's designer wants it closed.
    pub closure_wanted: bool,
}

/// The gaps that matter, by band, each once.
#[must_use]
pub fn named_gaps(subject: &Subject<'_>, crystal: &Crystal, solution: &Solution) -> Vec<NamedGap> {
    let own = CrystalRef {
        file: subject.file,
        section: subject.entry.id,
    };
    let mut found: Vec<NamedGap> = Vec::new();
    for target in &crystal.targets {
        for band in gaps_of(target, own) {
            add(
                subject,
                crystal,
                solution,
                &mut found,
                band,
                Some(target.place),
            );
        }
    }
    if let Some(band) = fermi_gap(crystal, solution) {
        add(subject, crystal, solution, &mut found, band, None);
    }
    found.sort_by_key(|named| named.band);
    found
}

fn add(
    subject: &Subject<'_>,
    crystal: &Crystal,
    solution: &Solution,
    found: &mut Vec<NamedGap>,
    band: usize,
    target: Option<Place>,
) {
    let gap = band
        .checked_sub(1)
        .and_then(|index| solution.gaps.get(index));
    let Some(gap) = gap.filter(|_| found.iter().all(|named| named.band != band)) else {
        return;
    };
    let own = target.filter(|place| subject.holds(*place));
    let filling = target.is_none().then(|| filling_place(subject)).flatten();
    let holds_fermi = fermi_gap(crystal, solution) == Some(band);
    found.push(NamedGap {
        band,
        gap: *gap,
        place: own.or(filling).unwrap_or_else(|| subject.heading()),
        fermi: target.is_none(),
        closure_wanted: closure_wanted(crystal, band, holds_fermi),
    });
}

fn filling_place(subject: &Subject<'_>) -> Option<Place> {
    let mut fillings = subject.statements(|kind| matches!(kind, StatementKind::Filling(_)));
    fillings
        .next()
        .map(|statement| subject.place(statement.span))
}

/// The gaps of the crystal itself that a target names.
fn gaps_of(target: &Target, own: CrystalRef) -> Vec<usize> {
    match &target.wish {
        Wish::Class(_) => Vec::new(),
        Wish::GapIs { of, band, .. } => (*of == own).then_some(*band).into_iter().collect(),
        Wish::Compare { expression, .. } => {
            let mut all = Vec::new();
            quantities(expression, &mut all);
            let own = all.into_iter().filter(|quantity| quantity.of == own);
            own.filter_map(|quantity| match quantity.kind {
                QuantityKind::Gap(band) => Some(band),
                _ => None,
            })
            .collect()
        }
    }
}

/// The gap above the last filled band, where whole bands are filled.
#[must_use]
pub fn fermi_gap(crystal: &Crystal, solution: &Solution) -> Option<usize> {
    if solution.class? == Class::Metal {
        return None;
    }
    let filled = crystal.filling.as_ref()?.value / f64::from(crystal.degeneracy.max(1));
    let bands = filled.round();
    if !(1.0..=1e6).contains(&bands) {
        return None;
    }
    #[expect(
        clippy::cast_possible_truncation,
        clippy::cast_sign_loss,
        reason = "between 1 and 1e6"
    )]
    Some(bands as usize)
}

/// Whether a target is met by that gap being closed.
fn closure_wanted(crystal: &Crystal, band: usize, holds_fermi: bool) -> bool {
    crystal.targets.iter().any(|target| match &target.wish {
        Wish::Class(class) => {
            holds_fermi && matches!(class, ClassWish::Metal | ClassWish::Semimetal)
        }
        Wish::GapIs { band: of, kind, .. } => *of == band && *kind == GapWish::Closed,
        Wish::Compare {
            expression, limits, ..
        } => {
            let gap = matches!(expression, TargetFormula::Quantity(quantity) if quantity.kind == QuantityKind::Gap(band));
            gap && allows_zero(limits)
        }
    })
}

fn allows_zero(limits: &Limits) -> bool {
    let lower = limits
        .lower
        .as_ref()
        .map(|(formula, _)| value(formula).unwrap_or(f64::NAN));
    let upper = limits
        .upper
        .as_ref()
        .map(|(formula, _)| value(formula).unwrap_or(f64::NAN));
    // A gap that may be anything above zero is not wanted closed.
    upper.is_some_and(|upper| upper >= 0.0) && lower.is_none_or(|lower| lower <= 0.0)
}
