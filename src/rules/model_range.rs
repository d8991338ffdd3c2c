//! # What it finds
//! A band whose energy lies so far above the edge of the layer that holds it that the mass there is no longer the one
//! stated: above a fifth of the material's gap for a parabolic mass, above the gap itself for a `nonparabolic` one.
//!
//! # Why it matters
//! The mass grows with energy, so such a band lies lower and is narrower than it is shown.
//!
//! # Example
//! ```cren
//! crystal tern
//!   layer 4.0 nm at 0 meV mass 0.023 me
//!   layer 4.0 nm at 1 eV mass 0.023 me
//!   require width 1 >= 1 meV
//!   ^^^^^^^^^^^^^^^^^^^^^^^^
//! ```
//!
//! # Instead
//! ```cren
//! material basin
//!   mass 0.067 me
//!   nonparabolic 1.5 eV
//!   edge 0 meV
//!
//! material wall
//!   mass 0.092 me
//!   edge 235 meV
//!
//! crystal tern
//!   layer 5.4 nm of basin
//!   layer 2.6 nm of wall
//!   require width 1 >= 1 meV
//! ```
//!
//! # Fix
//! None: state the gap of the material with `nonparabolic`.

use super::formula::quantities;
use super::words::Trade;
use super::{Finding, Level, Rule, Subject, Tier, words};
use crate::bands::Solution;
use crate::model::constants::{ELECTRON_MASS, ELECTRONVOLT as EV};
use crate::model::{Crystal, CrystalRef, Layer, Place, QuantityKind, Wish};

/// The rule.
pub const RULE: Rule = Rule {
    name: "model-range",
    group: "physics",
    level: Level::Note,
    tier: Tier::Bands,
    waivable: true,
    source: include_str!("model_range.rs"),
    check,
};

/// A parabolic mass is fair up to this part of the material's gap above its edge (common practice: 10–20 %).
const PARABOLIC: f64 = 0.2;
/// An energy-dependent mass is fair up to its gap above its edge (common practice).
const NONPARABOLIC: f64 = 1.0;
/// The energy in 1/m ≈ 1 + Ep/gap (two-band k·p theory; about 22 eV in III–V compounds, from memory).
const KANE: f64 = 22.0 * EV;
/// Above this mass (in electron masses) a band is no conduction band whose gap its mass would tell.
const LIGHT: f64 = 0.2;

fn check(subject: &Subject<'_>, findings: &mut Vec<Finding>) {
    findings.extend(finding(subject));
}

fn finding(subject: &Subject<'_>) -> Option<Finding> {
    let crystal = subject.crystal?;
    let Some(Ok(solution)) = subject.bands else {
        return None;
    };
    let well = well(crystal)?;
    let (band, place) = highest_named_band(subject, crystal)?;
    let energy = band_bottom(solution, band)?;
    let law = &well.mass[0];
    let above = energy - well.edge[0].value;
    let (gap, fair, stated) = match &law.nonparabolic {
        Some((_, gap)) => (gap.value, NONPARABOLIC, true),
        None => (gap_of_mass(law.mass.value)?, PARABOLIC, false),
    };
    if above <= fair * gap {
        return None;
    }
    let share = words::number(100.0 * above / gap, 2);
    let message = format!(
        "band {band} lies {} above the edge of its well, {share} % of the material's gap of {}{}",
        words::energy(crystal, above),
        if stated { "" } else { "about " },
        words::in_unit(
            gap,
            words::unit_for(gap, crate::model::Dimension::ENERGY, Trade::default()),
            2
        )
    );
    let help = match stated {
        true => "beyond its gap, a mass that grows linearly is no longer fair",
        false => {
            "above a fifth of it the mass is no longer the one at the edge; state the gap with `nonparabolic`"
        }
    };
    Some(Finding::new(&RULE, place, message).help(help))
}

/// The layer with the lowest edge, where carriers of a solid move in layers.
fn well(crystal: &Crystal) -> Option<&Layer> {
    let layers = crystal.potential.layers.iter();
    layers.min_by(|one, other| one.edge[0].value.total_cmp(&other.edge[0].value))
}

/// The gap of a material whose electrons have that mass, where the mass tells it.
fn gap_of_mass(mass: f64) -> Option<f64> {
    let relative = mass / ELECTRON_MASS;
    (relative > 0.0 && relative < LIGHT).then(|| KANE * relative / (1.0 - relative))
}

fn band_bottom(solution: &Solution, band: usize) -> Option<f64> {
    let band = band
        .checked_sub(1)
        .and_then(|index| solution.bands.get(index))?;
    Some(band.bottom.energy.value)
}

/// The highest band that a target names or that is filled, and the statement that says so; without any, nobody asks
/// for a band.
fn highest_named_band(subject: &Subject<'_>, crystal: &Crystal) -> Option<(usize, Place)> {
    let own = CrystalRef {
        file: subject.file,
        section: subject.entry.id,
    };
    let mut highest: Option<(usize, Place)> = None;
    for target in &crystal.targets {
        let Wish::Compare { expression, .. } = &target.wish else {
            continue;
        };
        let mut all = Vec::new();
        quantities(expression, &mut all);
        let bands = all
            .into_iter()
            .filter(|quantity| quantity.of == own)
            .filter_map(|quantity| band_of(&quantity.kind));
        let band = bands.max();
        if band > highest.map(|(band, _)| band) {
            highest = band.map(|band| (band, target.place));
        }
    }
    let (band, place) = highest?;
    let place = if subject.holds(place) {
        place
    } else {
        subject.heading()
    };
    Some((band, place))
}

/// The band that a quantity speaks of; the upper one of a gap.
fn band_of(kind: &QuantityKind) -> Option<usize> {
    match kind {
        QuantityKind::Gap(band) => Some(band + 1),
        QuantityKind::Width(band)
        | QuantityKind::Bottom(band)
        | QuantityKind::Top(band)
        | QuantityKind::Level(band, _)
        | QuantityKind::MassBottom(band)
        | QuantityKind::MassTop(band)
        | QuantityKind::Hopping(band, _) => Some(*band),
        QuantityKind::Fermi => None,
    }
}

#[cfg(test)]
mod tests {
    use super::super::fixture::solved_layers;
    use super::{ELECTRON_MASS, EV, RULE, gap_of_mass};

    /// Gaps and masses of GaAs (1.52 eV, 0.067) and InAs (0.42 eV, 0.023): Vurgaftman, Meyer and Ram-Mohan,
    /// J. Appl. Phys. 89, 5815 (2001).
    #[test]
    fn the_mass_tells_the_gap_to_a_quarter() {
        for (mass, gap) in [(0.067, 1.52), (0.023, 0.42)] {
            let told = gap_of_mass(mass * ELECTRON_MASS).map_or(f64::NAN, |gap| gap / EV);
            assert!((told / gap - 1.0).abs() < 0.25, "{told} for {gap}");
        }
    }

    #[test]
    fn a_high_band_of_a_light_mass_is_noted() {
        assert_eq!(
            solved_layers(&RULE, "0.023 me", "  require width 1 >= 1 meV\n", 0.2).len(),
            1
        );
    }

    #[test]
    fn a_low_band_and_a_band_that_nobody_asks_for_are_silent() {
        assert!(solved_layers(&RULE, "0.023 me", "  require width 1 >= 1 meV\n", 0.05).is_empty());
        assert!(solved_layers(&RULE, "0.023 me", "", 0.2).is_empty());
        assert!(solved_layers(&RULE, "0.3 me", "  require width 1 >= 1 meV\n", 0.2).is_empty());
    }
}
