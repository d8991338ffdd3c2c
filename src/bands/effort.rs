//! What solving a crystal may cost, so that nothing a file says can keep anyone waiting.
//!
//! Work is counted as the numerics count it (`numerics::Budget`), never timed: the answer to a file does not depend on
//! how busy the machine is.

use crate::model::{Crystal, Formula, SiteShape};
use crate::numerics::Budget;

use super::Unsolved;

/// What one crystal's bands, level or hopping may cost: about a second.
pub(super) const MOST_WORK: usize = 10_000_000;
/// Times that the hook is asked (64 of work each) in the search for one target's worst case: about two seconds.
pub(super) const MOST_QUESTIONS: usize = 300_000;
/// Products of numbers with derivatives in the derivatives of one crystal.
pub(super) const MOST_PRODUCTS: usize = 100_000_000;
/// A formula is counted no further than this.
const LARGEST_FORMULA: usize = 100_000;

/// A budget of the standard size with this hook.
pub(super) fn budget<'a>(cancelled: &'a (dyn Fn() -> bool + Sync)) -> Budget<'a> {
    Budget {
        max_work: MOST_WORK,
        cancelled,
    }
}

/// How many terms one value of the smooth potential adds up.
pub(super) fn terms(crystal: &Crystal) -> usize {
    let potential = &crystal.potential;
    let waves: usize = potential.waves.iter().map(|wave| wave.indices.len()).sum();
    let bells = potential
        .sites
        .iter()
        .filter(|site| !matches!(site.shape, SiteShape::Box(_)))
        .count();
    let formula = potential
        .profile
        .iter()
        .map(|piece| size(&piece.formula, LARGEST_FORMULA))
        .max()
        .unwrap_or(0);
    1 + waves + 2 * bells + formula / 4
}

/// The operations in a formula, counted up to a limit.
fn size(formula: &Formula, limit: usize) -> usize {
    let parts: Vec<&Formula> = match formula {
        Formula::Constant(_) | Formula::Variable(_) => return 1,
        Formula::Negative(inner) => vec![inner],
        Formula::Binary(_, left, right) => vec![left, right],
        Formula::Call(_, arguments) => arguments.iter().collect(),
    };
    let mut sum = 1;
    for part in parts {
        if sum >= limit {
            break;
        }
        sum += size(part, limit - sum);
    }
    sum
}

/// Spent before the bands settled.
pub(super) fn spent() -> Unsolved {
    Unsolved::NotConverged("the work allowed was spent before the bands settled".into())
}
