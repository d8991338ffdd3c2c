//! Positions: lengths or fractions, wrapped into the cell.

use super::crystal::CrystalBuild;
use crate::model::evaluate::Context;
use crate::model::{Dual, Scalar, Trouble, TroubleKind};
use crate::syntax::Position;

/// A position this close to the far face of the cell, as a share of its edge, lies on it.
const ON_THE_FACE: f64 = 1e-12;

impl<'w> CrystalBuild<'_, 'w> {
    /// A position in Cartesian metres within the conventional cell.
    pub(super) fn position(
        &mut self,
        word: &str,
        position: &'w Position,
        context: &Context<'_, 'w>,
    ) -> Option<Vec<Dual>> {
        let dimension = self.crystal.dimension;
        if dimension == 0 {
            return None;
        }
        if position.entries.len() != dimension {
            let needs = match dimension {
                1 => "one position".to_owned(),
                several => format!("a position of {several} entries"),
            };
            return self
                .evaluator
                .wrong_dimension(word, needs, context.place(position.span));
        }
        let mut place = vec![Dual::constant(0.0); dimension];
        for (axis, entry) in position.entries.iter().enumerate() {
            let (value, is_length) = self.evaluator.length_or_number(entry, context)?;
            if is_length {
                if let Some(part) = place.get_mut(axis) {
                    *part = part.plus(&value);
                }
                continue;
            }
            // Along the cell's edge.
            let edge = self.crystal.conventional.get(axis)?;
            for (part, along) in place.iter_mut().zip(edge) {
                *part = part.plus(&value.times(along));
            }
        }
        self.wrapped(place, position, context)
    }

    fn wrapped(
        &mut self,
        place: Vec<Dual>,
        position: &Position,
        context: &Context<'_, 'w>,
    ) -> Option<Vec<Dual>> {
        let edges = &self.crystal.conventional;
        if edges.len() != place.len() {
            return None;
        }
        let values: Vec<f64> = place.iter().map(|part| part.value).collect();
        let fractions = fractions_of(edges, &values)?;
        let turns: Vec<f64> = fractions
            .iter()
            .map(|fraction| turns_of(*fraction))
            .collect();
        if turns.iter().all(|turn| *turn == 0.0) {
            return Some(place);
        }
        let mut inside = place;
        for (turn, edge) in turns.iter().zip(edges) {
            for (part, along) in inside.iter_mut().zip(edge) {
                *part = part.minus(&along.scaled(*turn));
            }
        }
        let kind = TroubleKind::OutsideCell {
            inside: fractions
                .iter()
                .zip(&turns)
                .map(|(fraction, turn)| (fraction - turn).max(0.0))
                .collect(),
            fractions,
        };
        self.evaluator
            .report(Trouble::new(kind, context.place(position.span)));
        Some(inside)
    }
}

/// How many cells to go back.
fn turns_of(fraction: f64) -> f64 {
    let turns = (fraction + ON_THE_FACE).floor();
    if turns.is_finite() { turns } else { 0.0 }
}

/// A Cartesian position in fractions of edges (one to three of them), by Cramer's rule.
pub(crate) fn fractions_of(edges: &[Vec<Dual>], position: &[f64]) -> Option<Vec<f64>> {
    let whole = super::lattice::volume(edges);
    if whole == 0.0 || !whole.is_finite() {
        return None;
    }
    let constant: Vec<Dual> = position
        .iter()
        .map(|value| Dual::constant(*value))
        .collect();
    let fractions = (0..edges.len()).map(|axis| {
        let mut replaced = edges.to_vec();
        if let Some(row) = replaced.get_mut(axis) {
            row.clone_from(&constant);
        }
        super::lattice::volume(&replaced) / whole
    });
    Some(fractions.collect())
}
