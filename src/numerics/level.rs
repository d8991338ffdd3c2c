//! Levels at given k, and their inverse: states, Fermi energy.

use super::cell::{Bounded, Budget, Cell, Meter, Ready, SolveError, prepare};
use super::double::Double;
use super::scalar::Scalar;
use super::search::{Finder, Inside, Target, is_positive};
use super::solve::find;
use super::sweep::read;
use super::uncertainty::level_error;
use std::f64::consts::PI;

/// E_n(k) for band `band` at `ka` in [0, π] (taken by symmetry from outside it).
pub fn level(cell: &Cell, band: usize, ka: f64, budget: &Budget) -> Result<Bounded, SolveError> {
    if !ka.is_finite() {
        return Err(SolveError::NotFinite);
    }
    let ready = prepare(cell)?;
    let meter = Meter::new(budget);
    let turns = (ka / PI).abs() % 2.0;
    let share = if turns > 1.0 { 2.0 - turns } else { turns };
    at_share(
        &ready,
        band,
        if band % 2 == 0 { share } else { 1.0 - share },
        &meter,
    )
}

/// The energy up to which `states` bands' worth of levels lie (per cell and spin state), such as
/// 1.5 for a half-filled second band. A whole number gives the middle of the gap there.
pub fn fermi(cell: &Cell, states: f64, budget: &Budget) -> Result<Bounded, SolveError> {
    if !(states.is_finite() && states >= 0.0) {
        return Err(SolveError::NotFinite);
    }
    let ready = prepare(cell)?;
    let meter = Meter::new(budget);
    let band = states.floor();
    if states == band && band > 0.0 {
        let raw = find(&ready, band as usize, &meter)?;
        let gap = raw.gaps[band as usize - 1];
        let middle = (gap.lower.energy + gap.upper.energy).times(0.5).round();
        return Ok(Bounded {
            value: middle,
            error: level_error(&ready, middle, raw.exact),
        });
    }
    at_share(&ready, band as usize, states - band, &meter)
}

/// Integrated states at an energy: ka/π, extended over the bands.
pub fn integrated_states(cell: &Cell, energy: f64, budget: &Budget) -> Result<Bounded, SolveError> {
    if !energy.is_finite() {
        return Err(SolveError::NotFinite);
    }
    let ready = prepare(cell)?;
    let meter = Meter::new(budget);
    let reading = read(&ready, energy, &meter)?;
    let error = level_error(&ready, energy, false);
    let below = read(&ready, energy - error, &meter)?.states;
    let above = read(&ready, energy + error, &meter)?.states;
    let spread = (above - reading.states)
        .abs()
        .max((reading.states - below).abs());
    Ok(Bounded {
        value: reading.states,
        error: spread + 4.0 * f64::EPSILON * (1.0 + reading.states),
    })
}

/// `points` pairs (ka, E_n) from ka = 0 to π, evenly spaced; for pictures.
pub fn dispersion(
    cell: &Cell,
    band: usize,
    points: usize,
    budget: &Budget,
) -> Result<Vec<[f64; 2]>, SolveError> {
    let ready = prepare(cell)?;
    let meter = Meter::new(budget);
    let last = points.saturating_sub(1).max(1) as f64;
    let at = |i: usize| {
        let share = i as f64 / last;
        let filled = if band % 2 == 0 { share } else { 1.0 - share };
        at_share(&ready, band, filled, &meter).map(|energy| [share * PI, energy.value])
    };
    (0..points).map(at).collect()
}

/// The level of a band at which a share of it, 0 to 1, lies below.
pub(crate) fn at_share(
    ready: &Ready,
    band: usize,
    share: f64,
    meter: &Meter,
) -> Result<Bounded, SolveError> {
    if share <= 0.0 || share >= 1.0 {
        let raw = find(ready, band + 1, meter)?;
        let edge = if share >= 1.0 {
            raw.gaps[band].lower
        } else if band == 0 {
            raw.bottom
        } else {
            raw.gaps[band - 1].upper
        };
        let value = edge.energy.round();
        return Ok(Bounded {
            value,
            error: level_error(ready, value, raw.exact),
        });
    }
    let found = match root_at::<f64>(ready, band, share, meter)? {
        Some(found) => found,
        None => root_at::<Double>(ready, band, share, meter)?.ok_or(SolveError::NoBracket)?,
    };
    let value = found.round();
    Ok(Bounded {
        value,
        error: level_error(ready, value, false),
    })
}

/// s D − 2 = −4 sin²(θ/2) with θ the distance of ka from the nearer edge.
pub(crate) fn level_target<T: Scalar>(band: usize, share: f64) -> Target<T> {
    let (gap, angle) = if share <= 0.5 {
        (band, share * PI)
    } else {
        (band + 1, (1.0 - share) * PI)
    };
    let sine = (0.5 * angle).sin();
    Target {
        states: band as f64 + share,
        upper: true,
        positive: is_positive(gap),
        depth: T::constant(-4.0 * sine * sine),
    }
}

fn root_at<T: Scalar>(
    ready: &Ready,
    band: usize,
    share: f64,
    meter: &Meter,
) -> Result<Option<Double>, SolveError> {
    let mut finder = Finder::<T>::new(ready, meter);
    finder.surround(band)?;
    let start = match finder.inside(band)? {
        Inside::At(reading) => reading.energy,
        Inside::Unresolved => return Ok(None),
    };
    let (energy, _) = finder.root(level_target(band, share), start)?;
    Ok(Some(energy.to_double()))
}
