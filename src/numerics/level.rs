//! Levels at given k, and their inverse: states, Fermi energy.

use super::budget::{BOUND, Budget, Meter};
use super::cell::{Bounded, Cell, Ready, SolveError, prepare};
use super::double::Double;
use super::interior::Inside;
use super::scalar::Scalar;
use super::search::{Finder, Target, is_positive};
use super::solve::find;
use super::sweep::read;
use super::uncertainty::{a_priori, level_bound};
use std::f64::consts::PI;

/// E_n(k) for band `band` at `ka` in [0, π] (taken by symmetry from outside it).
pub fn level(cell: &Cell, band: usize, ka: f64, budget: &Budget) -> Result<Bounded, SolveError> {
    let ready = prepare(cell)?;
    let meter = Meter::new(budget);
    at_share(&ready, band, share_of(band, ka)?, &meter)
}

/// The share of a band below the level at ka.
fn share_of(band: usize, ka: f64) -> Result<f64, SolveError> {
    if !ka.is_finite() {
        return Err(SolveError::NotFinite);
    }
    let turns = (ka / PI).abs() % 2.0;
    let share = if turns > 1.0 { 2.0 - turns } else { turns };
    Ok(if band % 2 == 0 { share } else { 1.0 - share })
}

/// The energy of the level of a band at ka.
pub(crate) fn level_energy(
    ready: &Ready,
    band: usize,
    ka: f64,
    meter: &Meter,
) -> Result<Double, SolveError> {
    let share = share_of(band, ka)?;
    if let Some(edge) = edge_at(ready, band, share, meter)? {
        return Ok(edge);
    }
    inner_level(ready, band, share, meter)
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
            error: level_bound(&ready, gap.lower.energy.round())
                .max(level_bound(&ready, gap.upper.energy.round())),
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
    let error = a_priori(&ready, energy);
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

/// D(E) = 2 cos ka at an energy: |D| < 2 in a band, beyond in a gap. Infinite where it leaves the range of `f64`.
pub fn discriminant(cell: &Cell, energy: f64, budget: &Budget) -> Result<Bounded, SolveError> {
    if !energy.is_finite() {
        return Err(SolveError::NotFinite);
    }
    let ready = prepare(cell)?;
    let meter = Meter::new(budget);
    let value = read(&ready, Double::constant(energy), &meter)?.discriminant();
    let error = super::uncertainty::discriminant_error(&ready, energy) + f64::EPSILON * value.abs();
    Ok(Bounded { value, error })
}

/// A band narrower than this share of its energy is followed as E = mean − half width · cos ka, which it is to rounding.
const COSINE_BAND: f64 = 1e-9;

/// `points` pairs (ka, E_n), ka ascending from 0 to π, closer together near the edges; for pictures. Energies are chosen
/// and ka is computed, one sweep a point.
pub fn dispersion(
    cell: &Cell,
    band: usize,
    points: usize,
    budget: &Budget,
) -> Result<Vec<[f64; 2]>, SolveError> {
    let ready = prepare(cell)?;
    let meter = Meter::new(budget);
    let raw = find(&ready, band + 1, &meter)?;
    let bottom = if band == 0 {
        raw.bottom.energy
    } else {
        raw.gaps[band - 1].upper.energy
    };
    let top = raw.gaps[band].lower.energy;
    let half = (top - bottom).times(0.5).round();
    let (bottom, top) = (bottom.round(), top.round());
    let narrow = half <= COSINE_BAND * bottom.abs().max(top.abs());
    let last = points.max(2) - 1;
    let mut curve = Vec::with_capacity(last + 1);
    for i in 0..=last {
        let angle = PI * i as f64 / last as f64;
        let energy = if i == last {
            top
        } else {
            bottom + half * (1.0 - angle.cos())
        };
        let share = match i {
            0 => 0.0,
            _ if i == last => 1.0,
            _ if narrow => angle / PI,
            _ => (read(&ready, energy, &meter)?.states - band as f64).clamp(0.0, 1.0),
        };
        let filled = if band % 2 == 0 { share } else { 1.0 - share };
        curve.push([filled * PI, energy]);
    }
    if band % 2 == 1 {
        curve.reverse();
    }
    Ok(curve)
}

/// The level of a band at which a share of it, 0 to 1, lies below.
pub(crate) fn at_share(
    ready: &Ready,
    band: usize,
    share: f64,
    meter: &Meter,
) -> Result<Bounded, SolveError> {
    let energy = match edge_at(ready, band, share, meter)? {
        Some(edge) => edge,
        None => inner_level(ready, band, share, meter)?,
    };
    meter.sweep::<f64>(ready, energy.round(), BOUND)?;
    Ok(Bounded {
        value: energy.round(),
        error: level_bound(ready, energy.round()),
    })
}

/// The band's edge, for a share of 0 or 1.
fn edge_at(
    ready: &Ready,
    band: usize,
    share: f64,
    meter: &Meter,
) -> Result<Option<Double>, SolveError> {
    if share > 0.0 && share < 1.0 {
        return Ok(None);
    }
    let raw = find(ready, band + 1, meter)?;
    Ok(Some(if share >= 1.0 {
        raw.gaps[band].lower.energy
    } else if band == 0 {
        raw.bottom.energy
    } else {
        raw.gaps[band - 1].upper.energy
    }))
}

fn inner_level(
    ready: &Ready,
    band: usize,
    share: f64,
    meter: &Meter,
) -> Result<Double, SolveError> {
    match root_at::<f64>(ready, band, share, meter)? {
        Some(found) => Ok(found),
        None => root_at::<Double>(ready, band, share, meter)?.ok_or(SolveError::NoBracket),
    }
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
        upper: gap == band,
        positive: is_positive(gap),
        depth: T::constant(-4.0 * sine * sine),
        margin: 1e-3 * share.min(1.0 - share),
    }
}

fn root_at<T: Scalar>(
    ready: &Ready,
    band: usize,
    share: f64,
    meter: &Meter,
) -> Result<Option<Double>, SolveError> {
    let mut finder = Finder::<T>::new(ready, meter);
    let start = match finder.isolate(band)? {
        Inside::At(reading) => reading.energy,
        Inside::Unresolved(reading) => {
            return Ok((T::UNIT < f64::UNIT).then(|| reading.energy.to_double()));
        }
    };
    let (energy, _) = finder.root(level_target(band, share), start)?;
    Ok(Some(energy.to_double()))
}
