//! # What it finds
//! A gap below its own uncertainty, or below kT at the crystal's temperature, though it holds the Fermi level or a
//! target names it.
//!
//! # Why it matters
//! A gap below kT does not keep its bands apart: carriers are lifted over it.
//!
//! # Example
//! ```cren
//! crystal tern
//!   mass 1 me
//!   lattice chain 0.4 nm
//!   temperature 300 K
//!   filling 2
//!   ^^^^^^^^^
//!   cosine 1 = 20 meV
//! ```
//!
//! # Instead
//! ```cren
//! crystal tern
//!   mass 1 me
//!   lattice chain 0.4 nm
//!   temperature 4.2 K
//!   filling 2
//!   cosine 1 = 20 meV
//! ```
//!
//! # Fix
//! None.

use super::named_gaps::{NamedGap, named_gaps};
use super::words::Trade;
use super::{Finding, Level, Rule, Subject, Tier, words};
use crate::bands::GapKind;
use crate::model::constants::BOLTZMANN;
use crate::model::{Crystal, Dimension};

/// The rule.
pub const RULE: Rule = Rule {
    name: "narrow-gap",
    group: "physics",
    level: Level::Warning,
    tier: Tier::Bands,
    waivable: true,
    source: include_str!("narrow_gap.rs"),
    check,
};

fn check(subject: &Subject<'_>, findings: &mut Vec<Finding>) {
    let (Some(crystal), Some(Ok(solution))) = (subject.crystal, subject.bands) else {
        return;
    };
    for named in named_gaps(subject, crystal, solution) {
        let open = matches!(named.gap.kind, GapKind::Direct | GapKind::Indirect);
        if open && !named.closure_wanted {
            findings.extend(finding(crystal, &named));
        }
    }
}

fn finding(crystal: &Crystal, named: &NamedGap) -> Option<Finding> {
    let size = named.gap.size;
    let what = match named.fermi {
        true => format!("gap {}, which holds the Fermi level,", named.band),
        false => format!("gap {}", named.band),
    };
    let trade = Trade::of(crystal);
    if size.value <= size.uncertainty {
        let [size, bound] = words::apart([size.value, size.uncertainty], Dimension::ENERGY, trade);
        let message = format!("{what} is {size}, below its own uncertainty of {bound}");
        return Some(Finding::new(&RULE, named.place, message));
    }
    let temperature = crystal.temperature.as_ref()?.value;
    let thermal = BOLTZMANN * temperature;
    if size.value >= thermal {
        return None;
    }
    let [shown, limit] = words::apart([size.value, thermal], Dimension::ENERGY, trade);
    let kelvin = words::quantity(temperature, Dimension::TEMPERATURE, Trade::default());
    let message = format!("{what} is {shown}, less than kT = {limit} at {kelvin}");
    Some(Finding::new(&RULE, named.place, message).help("carriers are lifted over such a gap"))
}

#[cfg(test)]
mod tests {
    use super::super::fixture::solved;
    use super::RULE;
    use crate::bands::GapKind;

    const WARM: &str = "  temperature 300 K\n  require gap 1 >= 5 meV\n";

    #[test]
    fn a_gap_below_kt_is_found() {
        // kT at 300 K is 25.85 meV (CODATA 2022: 8.617333262e-5 eV/K).
        let found = solved(&RULE, WARM, 1, GapKind::Direct, 0.020, 1e-9);
        assert_eq!(
            found,
            ["gap 1 is 20 meV, less than kT = 25.85 meV at 300 K"]
        );
    }

    #[test]
    fn a_gap_below_its_uncertainty_is_found() {
        let cold = "  require gap 1 >= 0 meV\n";
        assert_eq!(solved(&RULE, cold, 1, GapKind::Direct, 1e-6, 1e-5).len(), 1);
    }

    #[test]
    fn a_gap_above_kt_is_silent_and_so_is_one_that_nobody_names() {
        assert!(solved(&RULE, WARM, 1, GapKind::Direct, 0.026, 1e-9).is_empty());
        let other = "  temperature 300 K\n  require gap 2 >= 5 meV\n";
        assert!(solved(&RULE, other, 1, GapKind::Direct, 0.020, 1e-9).is_empty());
    }
}
