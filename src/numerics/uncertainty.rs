//! Bounds on what was found.
//! (first form: a-priori bounds)

use super::cell::{Bounded, Ready};
use super::double::Double;
use super::scalar::Scalar;
use super::search::is_positive;
use super::solve::{Band, BandEdge, Bands, Gap, Raw, RawEdge, Wave};

/// Bound on the error of a level by inputs known to one unit in the last place, and by rounding.
pub(crate) fn level_error(ready: &Ready, energy: f64, exact: bool) -> f64 {
    let kinetic = (energy - ready.floor).abs() + ready.delta_depth;
    let scale =
        2.0 * kinetic + ready.potential_size() + ready.delta_size + (energy - ready.ceiling).abs();
    let rounding = if exact {
        0.0
    } else {
        2.0 + 2.0 * (ready.elements.len() as f64).sqrt()
    };
    f64::EPSILON * (energy.abs() + scale * (1.0 + rounding))
}

/// Puts the bounds on.
pub(crate) fn finish(ready: &Ready, raw: &Raw, sweeps: usize) -> Bands {
    let count = raw.gaps.len();
    let mut bands = Vec::with_capacity(count);
    let mut gaps = Vec::with_capacity(count);
    let mut bottom = raw.bottom;
    let mut bottom_closed = false;
    for band in 0..count {
        let gap = raw.gaps[band];
        let error = level_error(ready, gap.lower.energy.round(), raw.exact);
        let size = (gap.upper.energy - gap.lower.energy).round();
        let gap_error = 2.0 * error + gap.noise;
        let closed = size <= gap_error;
        gaps.push(Gap {
            size: Bounded {
                value: if closed { 0.0 } else { size },
                error: gap_error,
            },
            closed,
        });
        let width = width(ready, raw, band, bottom, gap.lower);
        bands.push(Band {
            bottom: edge(ready, bottom, band, bottom_closed, raw.exact),
            top: edge(ready, gap.lower, band + 1, closed, raw.exact),
            width,
        });
        bottom = gap.upper;
        bottom_closed = closed;
    }
    Bands {
        bands,
        gaps,
        sweeps,
    }
}

fn width(ready: &Ready, raw: &Raw, band: usize, bottom: RawEdge, top: RawEdge) -> Bounded {
    let difference = (top.energy - bottom.energy).round();
    let energy = bottom.energy.round();
    let error = level_error(ready, energy, raw.exact);
    let scale = ready.kinetic_scale().max(energy.abs());
    let (_, _, slope) = raw.inside[band];
    let narrow = 4.0 / slope.abs();
    if narrow < 1e-12 * scale {
        return Bounded {
            value: narrow,
            error: 1e-10 * narrow,
        };
    }
    Bounded {
        value: difference,
        error: (2.0 * error).min(error / scale * 1e3 * difference + f64::EPSILON * error),
    }
}

fn edge(ready: &Ready, raw: RawEdge, gap: usize, closed: bool, exact: bool) -> BandEdge {
    let energy = raw.energy.round();
    let error = level_error(ready, energy, exact);
    let sign = if is_positive(gap) { -1.0 } else { 1.0 };
    let mass = sign * raw.slope / (ready.period * ready.period);
    let at = if is_positive(gap) {
        Wave::Centre
    } else {
        Wave::Edge
    };
    let _ = Double::UNIT;
    BandEdge {
        energy: Bounded {
            value: energy,
            error,
        },
        at,
        mass: (!closed && mass.is_finite()).then_some(Bounded {
            value: mass,
            error: 1e-12 * mass.abs(),
        }),
    }
}
