//! # What it finds
//! A crystal whose bands could not be worked out: the numbers did not settle within the budget.
//!
//! # Why it matters
//! Nothing is known of its bands; saying nothing would look like all is well.
//!
//! # Example
//! None that stays one: what does not settle today may settle in a later version.
//!
//! # Instead
//! ```cren
//! crystal tern
//!   mass 0.067 me
//!   lattice chain 8.0 nm
//!   cosine 1 = 20 meV
//! ```
//!
//! # Fix
//! None: fewer `bands`, or a smoother potential.

use super::{Finding, Level, Rule, Subject, Tier};
use crate::bands::Unsolved;

/// The rule.
pub const RULE: Rule = Rule {
    name: "not-converged",
    group: "physics",
    level: Level::Warning,
    tier: Tier::Bands,
    waivable: true,
    source: include_str!("not_converged.rs"),
    check,
};

fn check(subject: &Subject<'_>, findings: &mut Vec<Finding>) {
    let Some(Err(unsolved)) = subject.bands else {
        return;
    };
    let finding = |message: String| Finding::new(&RULE, subject.heading(), message);
    match unsolved {
        Unsolved::NotConverged(reason) => findings.push(
            finding(format!("the bands did not settle: {reason}"))
                .help("ask for fewer `bands`, or smooth the potential"),
        ),
        Unsolved::BrokenModel | Unsolved::Dimension(_) | Unsolved::Cancelled => {}
    }
}

#[cfg(test)]
mod tests {
    use super::super::fixture::unsolved;
    use super::RULE;
    use crate::bands::Unsolved;

    #[test]
    fn a_solver_that_gives_up_is_heard() {
        let found = unsolved(
            &RULE,
            Unsolved::NotConverged("4096 plane waves were not enough".into()),
        );
        assert_eq!(
            found,
            ["the bands did not settle: 4096 plane waves were not enough"]
        );
    }

    #[test]
    fn a_broken_model_is_spoken_of_by_its_errors_and_a_cancelled_one_comes_again() {
        assert!(unsolved(&RULE, Unsolved::BrokenModel).is_empty());
        assert!(unsolved(&RULE, Unsolved::Cancelled).is_empty());
    }
}
