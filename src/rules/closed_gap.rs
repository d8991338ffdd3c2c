//! # What it finds
//! A gap that is closed, to within what can be resolved, though it holds the Fermi level or a target names it.
//!
//! # Why it matters
//! Such a gap closes by symmetry or by a coincidence of thicknesses; the smallest change of the crystal opens it.
//!
//! # Example
//! ```cren
//! crystal tern
//!   mass 1 me
//!   lattice chain 0.4 nm
//!   filling 4
//!   ^^^^^^^^^
//!   cosine 1 = 0 meV
//! ```
//!
//! # Instead
//! ```cren
//! crystal tern
//!   mass 1 me
//!   lattice chain 0.4 nm
//!   filling 4
//!   cosine 1 = 500 meV
//! ```
//!
//! # Fix
//! None. If closure is the aim, say so: `require gap 2 closed`.

use super::named_gaps::{NamedGap, named_gaps};
use super::words::Trade;
use super::{Finding, Level, Rule, Subject, Tier, words};
use crate::bands::GapKind;
use crate::model::{Crystal, Dimension};

/// The rule.
pub const RULE: Rule = Rule {
    name: "closed-gap",
    group: "physics",
    level: Level::Warning,
    tier: Tier::Bands,
    waivable: true,
    source: include_str!("closed_gap.rs"),
    check,
};

fn check(subject: &Subject<'_>, findings: &mut Vec<Finding>) {
    let (Some(crystal), Some(Ok(solution))) = (subject.crystal, subject.bands) else {
        return;
    };
    for named in named_gaps(subject, crystal, solution) {
        if named.gap.kind == GapKind::Closed && !named.closure_wanted {
            findings.push(finding(crystal, &named));
        }
    }
}

fn finding(crystal: &Crystal, named: &NamedGap) -> Finding {
    let bound = named.gap.size.value.abs() + named.gap.size.uncertainty;
    let band = named.band;
    let message = match named.fermi {
        true => format!("gap {band}, which holds the Fermi level, is closed"),
        false => format!("gap {band} is closed"),
    };
    Finding::new(&RULE, named.place, message).help(format!(
        "it is below {}; if that is the aim, write `require gap {band} closed`",
        words::bound(bound, Dimension::ENERGY, Trade::of(crystal))
    ))
}

#[cfg(test)]
mod tests {
    use super::super::fixture::solved;
    use super::RULE;
    use crate::bands::GapKind;

    #[test]
    fn a_closed_gap_that_a_target_names_is_found() {
        let found = solved(
            &RULE,
            "  require gap 2 >= 5 meV\n",
            2,
            GapKind::Closed,
            0.0,
            1e-15,
        );
        assert_eq!(found, ["gap 2 is closed"]);
    }

    #[test]
    fn closure_that_is_wanted_and_gaps_that_nobody_names_are_silent() {
        for target in [
            "  require gap 2 closed\n",
            "  require gap 2 <= 1 meV\n",
            "  require gap 1 >= 5 meV\n",
        ] {
            assert!(
                solved(&RULE, target, 2, GapKind::Closed, 0.0, 1e-15).is_empty(),
                "{target}"
            );
        }
    }

    #[test]
    fn a_small_gap_is_not_closed() {
        assert!(
            solved(
                &RULE,
                "  require gap 2 >= 0 meV\n",
                2,
                GapKind::Direct,
                1e-9,
                1e-15
            )
            .is_empty()
        );
    }
}
