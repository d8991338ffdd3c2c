//! # What it finds
//! A quantity of the right dimension and an implausible size for what it is, where another unit would make it
//! plausible: eV for meV, um for nm, nm for angstrom, `u` for `me`. Electrons and atoms are told apart. Also layers
//! whose edges hardly differ, one energy a few hundred times smaller than the others and in a unit of its own, a cell so
//! long that its potential dwarfs the kinetic energy, samples of a table in another unit than it says, and a bare lattice angle above π or a
//! bare phase above 2π, which are likely degrees.
//!
//! # Why it matters
//! A wrong unit passes every check of dimensions and moves the bands by powers of ten.
//!
//! # Example
//! ```cren
//! crystal tern
//!   mass 0.067 u
//!        ^^^^^^^
//!   lattice chain 8.0 nm
//!   cosine 1 = 20 meV
//! ```
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
//! The likely unit, to be looked at.

use std::f64::consts::{PI, TAU};

use super::plausible::{self, Kind, Setting};
use super::stated::{self, Stated};
use super::subject::parameter;
use super::words::Trade;
use super::{
    Finding, Fix, Level, Replacement, Rule, Subject, Tier, gather, literal, slip_beside, words,
};
use crate::model::{Crystal, Parameter, ParameterKind, Place, Wave, unit};
use crate::syntax::{StatementKind, Value};

/// The rule.
pub const RULE: Rule = Rule {
    name: "unit-slip",
    group: "units",
    level: Level::Warning,
    tier: Tier::Model,
    waivable: true,
    source: include_str!("unit_slip.rs"),
    check,
};

fn check(subject: &Subject<'_>, findings: &mut Vec<Finding>) {
    findings.extend(sizes(subject));
    findings.extend(lattice_angles(subject));
    if let Some(crystal) = subject.crystal {
        findings.extend(slip_beside::findings(subject, crystal));
        findings.extend(table(subject, crystal));
        let waves = crystal.potential.waves.iter();
        findings.extend(waves.filter_map(|wave| phase(subject, crystal, wave)));
    }
}

/// Sizes that another unit would explain. With an odd mass or cell, nothing else can be judged by it.
fn sizes(subject: &Subject<'_>) -> Vec<Finding> {
    let stated = stated::quantities(subject);
    let setting = subject
        .crystal
        .map_or_else(|| of_material(&stated), stated::setting);
    for first in [Kind::Mass, Kind::LatticeLength] {
        let slips = slips(&stated, &setting, |kind| kind == first);
        if !slips.is_empty() {
            return slips;
        }
    }
    slips(&stated, &setting, |_| true)
}

fn of_material(stated: &[Stated]) -> Setting {
    let mass = stated.iter().find(|stated| stated.kind == Kind::Mass);
    Setting {
        mass: mass.map_or(Setting::default().mass, |mass| mass.value),
        ..Setting::default()
    }
}

fn slips(stated: &[Stated], setting: &Setting, of: impl Fn(Kind) -> bool) -> Vec<Finding> {
    let judged = stated.iter().filter(|stated| of(stated.kind));
    judged.filter_map(|stated| slip(stated, setting)).collect()
}

fn slip(stated: &Stated, setting: &Setting) -> Option<Finding> {
    if plausible::is_plausible(stated.kind, stated.value, setting) {
        return None;
    }
    let number = stated.number.as_ref()?;
    let unit = likely_unit(stated, setting)?;
    let instead = rewritten(number, unit)?;
    let what = plausible::in_words(stated.kind);
    let message = match plausible::allowed(stated.kind, setting) {
        Some((lowest, highest)) => {
            let dimension = number.dimension;
            let side = match stated.value.abs() > highest {
                true => format!(
                    "at most about {}",
                    words::quantity(highest, dimension, Trade::default())
                ),
                false => format!(
                    "at least about {}",
                    words::quantity(lowest, dimension, Trade::default())
                ),
            };
            format!(
                "`{}` is an unlikely size for {what}, usually {side}",
                number.text
            )
        }
        None => format!("`{}` is an unlikely size for {what}", number.text),
    };
    let fix = Fix::guess(
        format!("write `{instead}`"),
        Replacement::new(number.place, instead.clone()),
    );
    let finding = Finding::new(&RULE, stated.place, message)
        .help(format!("is `{instead}` meant?"))
        .fix(fix);
    Some(match number.place == stated.place {
        true => finding,
        false => finding.related(number.place, gather::NUMBER),
    })
}

/// The unit that would make a quantity one that is often written.
#[must_use]
pub fn likely_unit(stated: &Stated, setting: &Setting) -> Option<&'static str> {
    let number = stated.number.as_ref()?;
    let (written, size) = number
        .unit
        .as_ref()
        .map_or(("", 1.0), |(name, size)| (name.as_str(), *size));
    if matches!(written, "Er" | "ML") {
        return None;
    }
    let units = plausible::usual_units(stated.kind, setting).iter().copied();
    let mut likely = units.filter(|name| *name != written).filter(|name| {
        unit::find(name).is_some_and(|unit| {
            let value = stated.value * unit.size / size;
            plausible::is_typical(stated.kind, value, setting)
        })
    });
    likely.next()
}

/// The number as written, with another unit.
pub(super) fn rewritten(number: &Parameter, unit: &str) -> Option<String> {
    let digits = match &number.unit {
        Some((written, _)) => number.text.strip_suffix(written.as_str())?.trim_end(),
        None => number.text.as_str(),
    };
    Some(format!("{digits} {unit}"))
}

/// Samples in another unit of energy than the table says.
fn table(subject: &Subject<'_>, crystal: &Crystal) -> Option<Finding> {
    let table = crystal.potential.table.as_ref()?;
    let largest = table
        .energies
        .iter()
        .fold(0.0_f64, |most, energy| most.max(energy.abs()));
    let setting = stated::setting(crystal);
    if plausible::is_plausible(Kind::Energy, largest, &setting) {
        return None;
    }
    let StatementKind::Table { energy_unit, .. } = &subject.statement_at(table.place)?.kind else {
        return None;
    };
    let written = energy_unit.span.of(&subject.entry.section.text);
    let size = unit::find(written)?.size;
    let mut units = plausible::usual_units(Kind::Energy, &setting).iter();
    let instead = units.find(|name| {
        let unit = unit::find(name).map_or(0.0, |unit| unit.size);
        plausible::is_typical(Kind::Energy, largest * unit / size, &setting)
    })?;
    let place = subject.place(energy_unit.span);
    let shown = words::energy(crystal, largest);
    let message =
        format!("in `{written}`, these samples reach {shown}, an unlikely potential in this cell");
    let fix = Fix::guess(
        format!("write `{instead}`"),
        Replacement::new(place, *instead),
    );
    Some(
        Finding::new(&RULE, place, message)
            .help(format!("are they in `{instead}`?"))
            .fix(fix),
    )
}

/// Bare angles of the lattice that no cell has in radians.
fn lattice_angles(subject: &Subject<'_>) -> Vec<Finding> {
    let statements = &subject.entry.section.statements;
    let angles = statements
        .iter()
        .flat_map(|statement| match &statement.kind {
            StatementKind::Lattice(form) => form.angles.as_slice(),
            _ => &[],
        });
    angles
        .filter_map(|angle| bare_angle(subject, angle))
        .collect()
}

fn bare_angle(subject: &Subject<'_>, angle: &Value) -> Option<Finding> {
    let number = literal::of_value(angle).filter(|number| number.unit.is_none())?;
    let above = number.number.abs() > PI;
    above.then(|| {
        degrees(
            subject.place(number.span),
            number.span.of(&subject.entry.section.text),
            "a lattice angle above π",
        )
    })
}

fn degrees(place: Place, text: &str, what: &str) -> Finding {
    let instead = format!("{text} deg");
    let edit = Replacement::new(place, instead.clone());
    Finding::new(
        &RULE,
        place,
        format!("a bare `{text}` is in radians, and {what} is unlikely"),
    )
    .help(format!("is `{instead}` meant?"))
    .fix(Fix::guess(format!("write `{instead}`"), edit))
}

/// A bare phase of more than one turn.
fn phase(subject: &Subject<'_>, crystal: &Crystal, wave: &Wave) -> Option<Finding> {
    let turns = wave.phase.value.abs() / TAU;
    if turns <= 1.0 {
        return None;
    }
    let sources: Vec<&Parameter> = wave
        .phase
        .slopes
        .iter()
        .filter_map(|(id, _)| parameter(crystal, *id))
        .collect();
    let statement = subject.statement_at(wave.place)?;
    let StatementKind::Wave {
        phase: Some(value), ..
    } = &statement.kind
    else {
        return None;
    };
    let written = value.span.of(&subject.entry.section.text);
    let says_angle = |text: &str| ["pi", "deg", "rad"].iter().any(|word| text.contains(word));
    if says_angle(written) || sources.iter().any(|source| says_angle(&source.text)) {
        return None;
    }
    let number = sources
        .into_iter()
        .find(|source| source.kind == ParameterKind::Literal && source.unit.is_none())?;
    let finding = degrees(number.place, &number.text, "a phase above 2π");
    Some(match subject.holds(number.place) {
        true => finding,
        false => Finding {
            place: subject.place(value.span),
            ..finding
        }
        .related(number.place, gather::NUMBER),
    })
}

#[cfg(test)]
mod tests {
    use super::super::fixture::{fixed, messages, messages_with, silent};
    use super::RULE;

    fn electron(statement: &str, instead: &str) {
        let base = "crystal a\n  mass 0.067 me\n  monolayer 0.283 nm\n  temperature 77 K\n  layer 5.4 nm at 0\n  layer 2.6 nm at 235 meV\n";
        check_slip(base, statement, instead);
    }

    fn atom(statement: &str, instead: &str) {
        let base = "crystal a\n  mass 86.909 u\n  lattice chain 426 nm\n  recoil 852 nm\n  temperature 50 nK\n  depth 1 = 10 neV\n";
        check_slip(base, statement, instead);
    }

    /// `statement` stands in a sound text in place of `instead`, and the fix leads back.
    fn check_slip(base: &str, statement: &str, instead: &str) {
        assert!(base.contains(instead), "{instead}");
        silent(&RULE, base);
        let text = base.replace(instead, statement);
        assert_eq!(messages(&RULE, &text).len(), 1, "{statement}");
        assert_eq!(fixed(&RULE, &text), base, "{statement}");
    }

    #[test]
    fn slips_of_electrons_are_found_and_mended() {
        electron("mass 0.067 u", "mass 0.067 me");
        electron("mass 0.067 kg", "mass 0.067 me");
        electron("layer 5.4 um", "layer 5.4 nm");
        electron("layer 5.4 pm", "layer 5.4 nm");
        electron("235 eV", "235 meV");
        electron("235 keV", "235 meV");
    }

    #[test]
    fn slips_of_atoms_are_found_and_mended() {
        atom("mass 86.909 me", "mass 86.909 u");
        atom("chain 426 mm", "chain 426 nm");
        atom("temperature 50 K", "temperature 50 nK");
        atom("depth 1 = 10 meV", "depth 1 = 10 neV");
        atom("recoil 852 um", "recoil 852 nm");
    }

    #[test]
    fn nanometre_for_angstrom_is_found_where_atoms_make_the_cell() {
        let base = "crystal a\n  lattice fcc 5.43 angstrom\n  atom A at (0, 0, 0)\n  formfactor A 3 = -0.21 Ry\n";
        check_slip(base, "5.43 nm", "5.43 angstrom");
        let monolayer = "crystal a\n  mass 1 me\n  monolayer 2.83 angstrom\n  layer 9 ML at 0\n";
        check_slip(monolayer, "2.83 nm", "2.83 angstrom");
    }

    #[test]
    fn bare_angles_that_are_degrees_are_found_and_mended() {
        let phase = "crystal a\n  lattice chain 5 nm\n  cosine 1 = 1 meV phase 90 deg\n";
        check_slip(phase, "phase 90\n", "phase 90 deg\n");
        let angle =
            "crystal a\n  lattice oblique 5 nm by 4 nm angle 80 deg\n  cosine (1, 0) = 1 meV\n";
        check_slip(angle, "angle 80\n", "angle 80 deg\n");
    }

    #[test]
    fn angles_that_name_their_unit_or_pi_are_silent() {
        for phase in ["phase 7*pi/2", "phase 400 deg", "phase 6.2", "phase 9 rad"] {
            silent(
                &RULE,
                &format!("crystal a\n  lattice chain 5 nm\n  cosine 1 = 1 meV {phase}\n"),
            );
        }
    }

    #[test]
    fn edges_that_hardly_differ_are_found_and_mended() {
        let material =
            |name: &str, edge: &str| format!("material {name}\n  mass 0.067 me\n  edge {edge}\n");
        let layers = "crystal a\n  layer 5 nm of m\n  layer 3 nm of n\n";
        let sound = format!(
            "{}{}{layers}",
            material("m", "0 eV"),
            material("n", "0.235 eV")
        );
        check_slip(&sound, "0.235 meV", "0.235 eV");
        // Far apart, the same edges hold an electron well.
        let wide = "crystal a\n  layer 500 nm of m\n  layer 300 nm of n\n";
        silent(
            &RULE,
            &format!(
                "{}{}{wide}",
                material("m", "0 eV"),
                material("n", "0.235 meV")
            ),
        );
    }

    #[test]
    fn samples_in_another_unit_are_found() {
        let text = "crystal a\n  mass 0.067 me\n  lattice chain 8 nm\n  table \"t.csv\" in nm, eV by line\n";
        let file = [("t.csv", "0,0\n2,0\n3,235\n5,235\n6,0\n")];
        assert_eq!(messages_with(&RULE, text, &file).len(), 1);
        assert!(messages_with(&RULE, &text.replace("eV by", "meV by"), &file).is_empty());
    }

    #[test]
    fn the_steps_of_a_staircase_may_be_thin() {
        let step = |edge: u32| format!("  layer 0.01 nm at {edge} meV\n");
        let steps: String = (0..40).map(step).collect();
        silent(
            &RULE,
            &format!("crystal a\n  mass 0.067 me\n  layer 5 nm at 0\n{steps}"),
        );
    }

    #[test]
    fn the_materials_number_is_the_materials_affair() {
        let text = "material m\n  mass 0.067 u\n  edge 235 eV\ncrystal a\n  layer 5 nm of m\n";
        let found = messages(&RULE, text);
        assert_eq!(found.len(), 1, "{found:?}");
    }

    #[test]
    fn honest_models_of_many_kinds_are_silent() {
        for text in [
            "crystal a\n  mass 86.909 u\n  lattice chain 532 nm\n  recoil 1064 nm\n  depth 1 = 1e-11 eV\n",
            "crystal a\n  mass 132.9 u\n  lattice square 2 um\n  recoil 4 um\n  depth star (1, 0) = 40 Er\n",
            "crystal a\n  mass 1.008 u\n  lattice chain 0.255 nm\n  cosine 1 = 100 meV\n",
            "crystal a\n  mass 5e-5 me\n  carriers bosons\n  lattice chain 3 um\n  cosine 1 = 2 meV\n",
            "crystal a\n  mass 0.067 me\n  lattice chain 300 nm\n  cosine 1 = 1 meV\n",
            "crystal a\n  lattice chain 2.5 angstrom\n  cosine 1 = 5 eV\n  site gaussian -40 eV sigma 0.03 nm at 0\n",
            "crystal a\n  mass 0.067 me\n  layer 1 nm at 0\n  layer 1000 nm at 1 eV\n",
            "crystal a\n  mass 0.067 me\n  temperature 20 mK\n  layer 5 nm at 0 to 100 ueV\n",
            "crystal a\n  lattice chain 0.4 nm\n  cosine 1 = 0 eV\n  require width 1 >= 1e-30 eV\n",
        ] {
            silent(&RULE, text);
        }
    }
}
