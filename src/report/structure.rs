//! What a crystal is, in one line: its lattice, its scales, its potential.

use super::units::{self, BOLTZMANN, Trade, exact};
use crate::bands::Solution;
use crate::model::shape::centring::LatticeKind;
use crate::model::{Crystal, Dimension};

/// What repeats, who moves, and between which energies.
pub(super) fn structure(crystal: &Crystal, solution: Option<&Solution>, trade: &Trade) -> String {
    let mut parts = vec![cell(crystal, trade)];
    if let Some(recoil) = &crystal.recoil {
        let energy = Trade {
            recoil: None,
            atoms: true,
        }
        .tell_energy(exact(recoil.energy.value));
        parts.push(format!("1 Er = {energy}"));
    }
    if let Some(solution) = solution {
        parts.push(potential(solution, trade));
    }
    if let Some(temperature) = &crystal.temperature {
        let told = trade.tell_exact(temperature.value, Dimension::TEMPERATURE);
        let thermal = trade.tell_energy(exact(temperature.value * BOLTZMANN));
        parts.push(format!("{told} (kT = {thermal})"));
    }
    parts.join(" · ")
}

/// The lattice in words: its kind with the lengths and angles that it takes.
#[must_use]
pub fn cell(crystal: &Crystal, trade: &Trade) -> String {
    let vectors = crystal.conventional_values();
    let told: Vec<String> = vectors
        .iter()
        .map(|vector| trade.tell_exact(length(vector), Dimension::LENGTH))
        .collect();
    let word = match (crystal.dimension, crystal.lattice_kind.as_deref()) {
        (_, Some(kind)) if told.is_empty() => return kind.to_owned(),
        (1, _) => return format!("period {}", told.join("")),
        (0, None) => return "no lattice".to_owned(),
        (_, Some(kind)) => kind.to_owned(),
        (dimension, None) => format!("{dimension}D"),
    };
    let kind = crystal.kind();
    let own = kind.map_or(told.len(), |kind| kind.lengths);
    let mut sizes = told.get(..own).unwrap_or_default().join(" by ");
    if let (Some(axis), true) = (told.last(), kind.is_some_and(|kind| kind.axis)) {
        sizes += &format!(" axis {axis}");
    }
    let angles = angles(kind, &vectors);
    format!("{word}, {}", [vec![sizes], angles].concat().join(", "))
}

fn length(vector: &[f64]) -> f64 {
    vector.iter().map(|entry| entry * entry).sum::<f64>().sqrt()
}

/// The angles that a kind of lattice takes, in its order; all of them for free vectors.
fn angles(kind: Option<&LatticeKind>, vectors: &[Vec<f64>]) -> Vec<String> {
    let pairs: &[(usize, usize)] = match (kind.map(|kind| kind.angles), vectors.len()) {
        (Some(0), _) => &[],
        (Some(1), 3) if kind.is_some_and(|kind| kind.lengths > 1) => &[(0, 2)],
        (Some(1), _) | (None, 2) => &[(0, 1)],
        (_, 3) => &[(1, 2), (0, 2), (0, 1)],
        _ => &[],
    };
    let told = pairs.iter().filter_map(|(first, second)| {
        let (first, second) = (vectors.get(*first)?, vectors.get(*second)?);
        let product: f64 = first.iter().zip(second).map(|(a, b)| a * b).sum();
        let angle = (product / (length(first) * length(second))).acos();
        Some(format!("{}°", units::digits(angle.to_degrees(), 0.0)))
    });
    told.collect()
}

/// Lowest, mean and highest of the potential.
#[must_use]
pub fn potential(solution: &Solution, trade: &Trade) -> String {
    let range = &solution.potential;
    let size = range
        .lowest
        .abs()
        .max(range.highest.abs())
        .max(range.mean.abs());
    let scale = trade.energy(size);
    // A mean that cancels to rounding is nought.
    let number = |value: f64| match value.abs() < 1e-13 * size {
        true => "0".to_owned(),
        false => units::digits(value / scale.factor, 0.0),
    };
    let (lowest, mean, highest) = (
        number(range.lowest),
        number(range.mean),
        number(range.highest),
    );
    match lowest == highest && lowest == mean {
        true => format!("potential {lowest} {} throughout", scale.name),
        false => format!(
            "potential {lowest} to {highest} {}, mean {mean} {}",
            scale.name, scale.name
        ),
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::model::Dual;

    fn told(kind: &str, vectors: &[&[f64]]) -> String {
        let row = |row: &&[f64]| {
            row.iter()
                .map(|entry| Dual::constant(entry * 1e-9))
                .collect()
        };
        let crystal = Crystal {
            dimension: vectors.len(),
            lattice_kind: Some(kind.to_owned()),
            conventional: vectors.iter().map(row).collect(),
            ..Crystal::default()
        };
        cell(&crystal, &Trade::default())
    }

    #[test]
    fn a_lattice_is_told_by_what_it_takes() {
        let upright: &[&[f64]] = &[&[0.5, 0.0, 0.0], &[0.0, 0.5, 0.0], &[0.0, 0.0, 0.7]];
        assert_eq!(
            told("tetragonal", upright),
            "tetragonal, 0.5 nm axis 0.7 nm"
        );
        assert_eq!(
            told("orthorhombic", upright),
            "orthorhombic, 0.5 nm by 0.5 nm by 0.7 nm"
        );
        let root = 0.75_f64.sqrt();
        let leaning: &[&[f64]] = &[&[0.5, 0.0], &[0.35, 0.7 * root]];
        assert_eq!(told("oblique", leaning), "oblique, 0.5 nm by 0.7 nm, 60°");
        let slanted: &[&[f64]] = &[&[0.5, 0.0, 0.0], &[0.0, 0.4, 0.0], &[-0.3, 0.0, 0.6 * root]];
        assert_eq!(
            told("monoclinic", slanted),
            "monoclinic, 0.5 nm by 0.4 nm by 0.6 nm, 120°"
        );
        assert_eq!(told("vectors", leaning), "vectors, 0.5 nm by 0.7 nm, 60°");
    }
}
