//! Sizes that are likely slips of a unit only beside the others of their crystal: a part of `unit-slip`.

use super::plausible::{self, Kind, Setting};
use super::stated::{self, Stated};
use super::unit_slip::{RULE, rewritten};
use super::{Finding, Fix, Replacement, Subject, stretch, words};
use crate::model::constants::ELECTRONVOLT;
use crate::model::{Crystal, Parameter, unit};

/// All of a crystal.
pub(super) fn findings(subject: &Subject<'_>, crystal: &Crystal) -> Vec<Finding> {
    let stated = stated::quantities(subject);
    let mut findings = small_parts(crystal, &stated);
    findings.extend(weak_layers(subject, crystal));
    findings.extend(long_cell(crystal, &stated));
    findings
}

/// An energy below this part of the largest one beside it does hardly anything (common practice).
const SMALL: f64 = 1.0 / 300.0;
/// Energies of one potential mostly lie within this factor of the largest (common practice).
const ALIKE: f64 = 50.0;

/// Energies far below the largest of their potential, in a unit that no large one has, and alike in theirs.
fn small_parts(crystal: &Crystal, stated: &[Stated]) -> Vec<Finding> {
    let energies = || stated.iter().filter(|stated| stated.kind == Kind::Energy);
    let Some(largest) =
        energies().max_by(|one, other| one.value.abs().total_cmp(&other.value.abs()))
    else {
        return Vec::new();
    };
    let Some((unit, size)) = largest
        .number
        .as_ref()
        .and_then(|number| number.unit.as_ref())
    else {
        return Vec::new();
    };
    let small = |stated: &&Stated| stated.value.abs() < SMALL * largest.value.abs();
    let large = energies().filter(|stated| !small(stated));
    let units: Vec<&str> = large.filter_map(unit_of).collect();
    let odd = energies().filter(small).filter(|stated| {
        stated.value != 0.0 && unit_of(stated).is_some_and(|unit| !units.contains(&unit))
    });
    let slip = |stated: &Stated| {
        let number = stated.number.as_ref()?;
        let meant = stated.value.abs() * size / number.unit.as_ref()?.1 / largest.value.abs();
        if !(1.0 / ALIKE..=ALIKE).contains(&meant) {
            return None;
        }
        let times = largest.value.abs() / stated.value.abs();
        let message = format!(
            "`{}` is {} times smaller than the largest energy of this potential",
            number.text,
            roughly(times)
        );
        let finding = meant_instead(stated.place, number, unit, message)?;
        Some(finding.related(
            largest.place,
            format!("the largest: {}", words::energy(crystal, largest.value)),
        ))
    };
    odd.filter_map(slip).collect()
}

/// A large ratio to two digits.
fn roughly(times: f64) -> String {
    let step = 10f64.powf(times.abs().log10().floor() - 1.0);
    words::number((times / step).round() * step, 2)
}

fn unit_of(stated: &Stated) -> Option<&str> {
    let (unit, _) = stated.number.as_ref()?.unit.as_ref()?;
    Some(unit.as_str())
}

/// A finding that guesses at another unit of a number.
fn meant_instead(
    place: crate::model::Place,
    number: &Parameter,
    unit: &str,
    message: String,
) -> Option<Finding> {
    let instead = rewritten(number, unit)?;
    let edit = Replacement::new(number.place, instead.clone());
    Some(
        Finding::new(&RULE, place, message)
            .help(format!("is `{instead}` meant?"))
            .fix(Fix::guess(format!("write `{instead}`"), edit)),
    )
}

/// An electron's potential rarely exceeds so many times h²/(8·m·a²), a the distance over which it repeats (common
/// practice: walls of 0.3 eV every micrometre come to some 10⁵ at the mass of GaAs).
const DEEPEST: f64 = 2e5;
/// The same over a whole cell, in which a profile may rise and fall many times.
const DEEPEST_OF_PROFILE: f64 = 1e8;
/// Below this the potential would hardly do anything.
const SHALLOWEST: f64 = 1e-3;

/// A cell in whose length the potential dwarfs the kinetic energy of electrons, as it would not in another unit.
fn long_cell(crystal: &Crystal, stated: &[Stated]) -> Option<Finding> {
    let setting = stated::setting(crystal);
    let depth = depth(crystal, &setting)?;
    let length = stated
        .iter()
        .find(|stated| stated.kind == Kind::LatticeLength)?;
    if depth.times <= depth.most
        || !setting.moves_electrons()
        || !plausible::is_plausible(Kind::LatticeLength, length.value, &setting)
    {
        return None;
    }
    let number = length.number.as_ref()?;
    let (written, size) = number.unit.as_ref()?;
    let mut units = plausible::usual_units(Kind::LatticeLength, &setting)
        .iter()
        .copied();
    let meant = units.find(|name| {
        let shorter = unit::find(name).map_or(1.0, |unit| unit.size) / size;
        let times = depth.times * shorter * shorter;
        *name != written.as_str() && (SHALLOWEST..=depth.most).contains(&times)
    })?;
    let message = format!(
        "in a cell of `{}` this potential is {} times the kinetic energy at the zone's edge",
        number.text,
        roughly(depth.times)
    );
    meant_instead(length.place, number, meant, message)
}

/// How many times the kinetic energy a potential comes to, and how many are still usual.
struct Depth {
    times: f64,
    most: f64,
}

fn depth(crystal: &Crystal, setting: &Setting) -> Option<Depth> {
    let kinetic = setting.kinetic()?;
    let waves = crystal.potential.waves.iter().map(|wave| {
        let indices = wave
            .indices
            .iter()
            .flatten()
            .map(|index| index.unsigned_abs());
        let turns = indices.max().unwrap_or(1).max(1) as f64;
        wave.energy.value.abs() / (turns * turns)
    });
    let sites = crystal.potential.sites.iter();
    let number = sites.len().max(1) as f64;
    let sites = sites.map(|site| site.energy.value.abs() / (number * number));
    let largest = waves.chain(sites).fold(0.0, f64::max);
    let swing = stretch::swing(crystal).map_or(0.0, |swing| swing.height);
    [(largest, DEEPEST), (swing, DEEPEST_OF_PROFILE)]
        .map(|(energy, most)| Depth {
            times: energy / kinetic,
            most,
        })
        .into_iter()
        .find(|depth| depth.times > depth.most)
}

/// Layers of materials whose edges differ by less than this are hardly layers.
const WEAK: f64 = 1e-3 * ELECTRONVOLT;
/// Nor are those whose edges differ by less than this part of the kinetic scale of the cell.
const WEAK_RATIO: f64 = 1e-2;

/// Materials whose edges hardly differ, where a thousandfold edge would be usual: meV for eV.
fn weak_layers(subject: &Subject<'_>, crystal: &Crystal) -> Option<Finding> {
    let edges = || {
        let layers = crystal
            .potential
            .layers
            .iter()
            .filter(|layer| layer.materials.is_some());
        layers.flat_map(|layer| layer.edge.iter().map(move |edge| (layer, edge)))
    };
    let lowest = edges()
        .map(|(_, edge)| edge.value)
        .fold(f64::INFINITY, f64::min);
    let highest = edges()
        .map(|(_, edge)| edge.value)
        .fold(f64::NEG_INFINITY, f64::max);
    let setting = stated::setting(crystal);
    let contrast = highest - lowest;
    let weak = contrast > 0.0 && contrast < WEAK && contrast < WEAK_RATIO * setting.kinetic()?;
    if !weak || !setting.moves_electrons() {
        return None;
    }
    let (layer, edge) =
        edges().max_by(|(_, one), (_, other)| one.value.abs().total_cmp(&other.value.abs()))?;
    let number = stated::number_behind(crystal, edge)?;
    let (written, size) = number.unit.as_ref()?;
    let stronger = ["meV", "eV"].into_iter().find(|name| {
        let unit = unit::find(name).map_or(0.0, |unit| unit.size);
        *name != written.as_str() && (0.01..=5.0).contains(&(contrast * unit / size / ELECTRONVOLT))
    })?;
    let instead = rewritten(number, stronger)?;
    let place = subject.where_to_speak(layer.place, &[edge])?;
    let message = format!(
        "the edges of these layers differ by only {}",
        words::energy(crystal, contrast)
    );
    let edit = Replacement::new(number.place, instead.clone());
    Some(
        Finding::new(&RULE, place, message)
            .help(format!("is `{instead}` meant for the edge?"))
            .related(number.place, "the edge is stated here")
            .fix(Fix::guess(format!("write `{instead}`"), edit)),
    )
}

#[cfg(test)]
mod tests {
    use super::super::fixture::{fixed, messages, silent};
    use super::RULE;

    #[test]
    fn an_energy_in_a_unit_of_its_own_far_below_the_others_is_a_slip() {
        let text = "crystal a\n  mass 0.1 me\n  lattice chain 1.2 nm\n  cosine 1 = 500 meV\n  cosine 2 = 200 ueV\n";
        assert_eq!(
            messages(&RULE, text),
            ["`200 ueV` is 2500 times smaller than the largest energy of this potential"]
        );
        assert!(fixed(&RULE, text).contains("cosine 2 = 200 meV"));
    }

    #[test]
    fn small_energies_in_the_unit_of_the_others_are_meant() {
        silent(
            &RULE,
            "crystal a\n  mass 0.1 me\n  lattice chain 1.2 nm\n  cosine 1 = 500 meV\n  cosine 2 = 0.2 meV\n",
        );
        silent(
            &RULE,
            "crystal a\n  mass 0.1 me\n  lattice chain 1.2 nm\n  cosine 1 = 0.5 eV\n  cosine 2 = 20 meV\n",
        );
        silent(
            &RULE,
            "crystal a\n  mass 0.1 me\n  lattice chain 1.2 nm\n  cosine 1 = 0.5 eV\n  cosine 2 = 200 ueV\n  cosine 3 = 900 ueV\n  cosine 4 = 80000 ueV\n",
        );
    }

    #[test]
    fn a_cell_a_thousand_times_too_long_is_a_slip() {
        for (cell, potential) in [
            ("3", "cosine 1 = 80 meV"),
            ("3.0", "profile -period/2 to period/2 = 80 meV * (x/1 nm)^2"),
        ] {
            let crystal = |unit: &str| {
                format!("crystal a\n  mass 0.3 me\n  lattice chain {cell} {unit}\n  {potential}\n")
            };
            assert_eq!(messages(&RULE, &crystal("um")).len(), 1, "{potential}");
            assert_eq!(fixed(&RULE, &crystal("um")), crystal("nm"));
            silent(&RULE, &crystal("nm"));
        }
    }

    #[test]
    fn long_cells_with_many_periods_or_soft_potentials_are_meant() {
        silent(
            &RULE,
            "crystal a\n  mass 0.067 me\n  lattice chain 5 um\n  cosine 500 = 235 meV\n",
        );
        silent(
            &RULE,
            "crystal a\n  mass 0.067 me\n  lattice chain 5 um\n  profile = 235 meV*cos(2*pi*x/10 nm)\n",
        );
        silent(
            &RULE,
            "crystal a\n  mass 0.067 me\n  lattice chain 1 um\n  cosine 1 = 1 meV\n",
        );
    }
}
