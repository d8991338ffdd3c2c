//! Hover on `cosine`, `depth` and `fourier`: the component, |G|, the minima, the first-order gap.

use std::f64::consts::PI;

use nalgebra::DMatrix;

use super::View;
use super::card::Card;
use crate::model::{Crystal, Dimension, Wave};
use crate::report::units::{self, Trade};
use crate::syntax::{Statement, WaveKind};

/// What a wave adds to the potential.
pub fn card(view: &View<'_>, statement: &Statement) -> Option<Card> {
    let crystal = view.crystal()?;
    let trade = view.trade();
    let mut waves = crystal.potential.waves.iter();
    let wave = waves
        .find(|wave| view.holds(&wave.place) && wave.place.span.start == statement.span.start)?;
    let index = wave.indices.first()?;
    let mut card = Card::new(statement.word.of(&view.entry.section.text));
    if wave.star && wave.indices.len() > 1 {
        card.say(format!("{} pairs ±G of the star", wave.indices.len()));
    }
    let size = component(wave);
    card.row(["|V(G)|".to_owned(), component_told(wave, size, &trade)]);
    if let Some(length) = wave_number(crystal, index) {
        let told = units::digits(length * 1e-9, 0.0);
        let distance = trade.tell_exact(2.0 * PI / length, Dimension::LENGTH);
        card.row([
            "|G|".to_owned(),
            format!("{told} nm^-1, wavelength {distance}"),
        ]);
    }
    if let Some(minima) = minima(crystal, wave, index, &trade) {
        card.row(["minima".to_owned(), minima]);
    }
    card.row(["2|V(G)|".to_owned(), first_order(view, index, size, &trade)]);
    Some(card)
}

/// |V(G)| in joule: half of a cosine, a quarter of a depth, all of a Fourier component.
fn component(wave: &Wave) -> f64 {
    let energy = wave.energy.value.abs();
    match wave.kind {
        WaveKind::Cosine => energy / 2.0,
        WaveKind::Depth => energy / 4.0,
        WaveKind::Fourier => energy,
    }
}

fn component_told(wave: &Wave, size: f64, trade: &Trade) -> String {
    let told = trade.tell_exact(size, Dimension::ENERGY);
    match wave.kind {
        WaveKind::Cosine => format!("{told}, half of the amplitude"),
        WaveKind::Depth => {
            let mean = trade.tell_exact(wave.energy.value / 2.0, Dimension::ENERGY);
            format!("{told}, a quarter of the depth; mean {mean}")
        }
        WaveKind::Fourier => told,
    }
}

/// |G| in inverse metre, from the conventional cell.
fn wave_number(crystal: &Crystal, index: &[i64]) -> Option<f64> {
    let size = crystal.conventional.len();
    let entries: Vec<f64> = crystal
        .conventional
        .iter()
        .flatten()
        .map(|dual| dual.value)
        .collect();
    if size == 0 || entries.len() != size * size || index.len() != size {
        return None;
    }
    // Rows are a_i; G·a_i = 2π n_i, so G solves A G = 2π n.
    let cell = DMatrix::from_row_slice(size, size, &entries);
    let turns = nalgebra::DVector::from_iterator(size, index.iter().map(|n| 2.0 * PI * *n as f64));
    let vector = cell.lu().solve(&turns)?;
    let length = vector.norm();
    (length.is_finite() && length > 0.0).then_some(length)
}

/// Where the statement's own potential is lowest.
fn minima(crystal: &Crystal, wave: &Wave, index: &[i64], trade: &Trade) -> Option<String> {
    let order = index.first().copied().filter(|_| index.len() == 1)?;
    if order == 0 {
        return None;
    }
    let period = crystal.conventional.first()?.first()?.value;
    // Lowest where the cosine is −1, or where the sine is 0; a negative energy swaps the two.
    let trough = match (wave.kind, wave.energy.value < 0.0) {
        (WaveKind::Depth, false) | (WaveKind::Cosine | WaveKind::Fourier, true) => 0.0,
        _ => PI,
    };
    let turn = (trough - wave.phase.value) / (2.0 * PI);
    let steps = order.unsigned_abs() as f64;
    let first = (turn * order.signum() as f64).rem_euclid(1.0) / steps;
    let at = trade.tell_exact((first * period * 1e21).round() / 1e21, Dimension::LENGTH);
    Some(match steps > 1.0 {
        true => {
            let apart = trade.tell_exact(period / steps, Dimension::LENGTH);
            format!("at {at} and every {apart} on")
        }
        false => format!("at {at}"),
    })
}

/// The gap to first order in the potential, beside the exact one.
fn first_order(view: &View<'_>, index: &[i64], size: f64, trade: &Trade) -> String {
    let told = format!(
        "{} to first order",
        trade.tell_exact(2.0 * size, Dimension::ENERGY)
    );
    let order = match index {
        [one] => usize::try_from(one.unsigned_abs()).unwrap_or(0),
        _ => 0,
    };
    let gap = view
        .solution()
        .and_then(|solution| solution.gaps.get(order.checked_sub(1)?));
    match gap {
        Some(gap) => format!("{told}; gap {order} is {}", trade.tell_energy(gap.size)),
        None => told,
    }
}
