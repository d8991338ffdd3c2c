//! Edges: the last steps on each, and the pair around a narrow gap.
//!
//! An edge found in `f64` takes a Newton step in double-double, or more where thick walls left it far off. Around a gap so narrow that s D − 2 hardly rises in it both
//! edges come from the place where s D is greatest, E* ± √(2 (s D* − 2)/|D″|), then by Newton on each.

use super::budget::Meter;
use super::cell::{Ready, SolveError};
use super::double::Double;
use super::scalar::{Scalar, power_of_two};
use super::search::{Finder, Target};
use super::sweep::{Reading, read};

/// |s D − 2| below which one Newton step leaves nothing of an edge, nor of D′ there: its square, even over the
/// 1e-4 that D rises in the narrowest gap between edges found apart, is below a unit.
const LINEAR: f64 = 1e-12;
/// Newton's steps on an edge from `f64`: each doubles the digits.
const MOST_STEPS: usize = 4;

/// An edge as found.
#[derive(Clone, Copy)]
pub(crate) struct RawEdge {
    pub energy: Double,
    /// D′, possibly beyond the range of `f64`, at `energy` − `offset`
    pub slope: f64,
    pub offset: f64,
    /// what the rounding of the arithmetic leaves open of the energy
    pub noise: f64,
}

/// A gap as found: its lower and upper edge, or closed.
#[derive(Clone, Copy)]
pub(crate) struct RawGap {
    pub lower: RawEdge,
    pub upper: RawEdge,
    /// half-gap noise where narrow: 0 for a wide gap
    pub noise: f64,
    /// found as a stationary point of D
    pub narrow: bool,
}

/// Newton's steps in double-double on an edge found in `f64`; where walls are thin, one.
pub(crate) fn settle<T: Scalar>(
    ready: &Ready,
    meter: &Meter,
    target: Target<T>,
    energy: T,
    reading: &Reading<T>,
    polish: bool,
) -> Result<RawEdge, SolveError> {
    if !polish || T::UNIT < f64::UNIT {
        return Ok(raw_edge(&target, energy, reading));
    }
    let fine = Target {
        states: target.states,
        ..Target::<Double>::edge(0, target.upper)
    };
    let fine = Target {
        positive: target.positive,
        ..fine
    };
    let mut start = energy.to_double();
    for _ in 0..MOST_STEPS {
        let reading = read(ready, start, meter)?;
        let (residual, slope, _) = fine.residual(&reading);
        let step = -(residual / slope);
        let height = residual.leading().abs() * power_of_two(reading.exponent);
        // a step that is no number ends here too
        if height.is_nan() || height <= LINEAR || !step.leading().is_finite() {
            return Ok(RawEdge {
                offset: step.leading(),
                ..raw_edge(&fine, start + step, &reading)
            });
        }
        start = start + step;
    }
    let reading = read(ready, start, meter)?;
    Ok(raw_edge(&fine, start, &reading))
}

/// An edge from the reading at or next to it; the noise of each factor adds up.
fn raw_edge<T: Scalar>(target: &Target<T>, energy: T, reading: &Reading<T>) -> RawEdge {
    let (residual, slope, noise) = target.residual(reading);
    let noise = noise / slope.leading().abs() * reading.weight;
    // what a step below the resolution of energies leaves of D′ still shows in a narrow band
    let step = -(residual / slope).leading();
    let moved = (energy - reading.energy).leading();
    let near = step.abs() <= 256.0 * T::UNIT * energy.leading().abs();
    RawEdge {
        energy: energy.to_double(),
        slope: reading.slope(),
        offset: if near { step } else { moved },
        noise: if noise.is_finite() { noise } else { 0.0 },
    }
}

/// Both edges of a gap so narrow that s D − 2 hardly rises above 0 in it, from the place where
/// s D is greatest: E* ± √(2 (s D* − 2)/|D″|), then Newton on each.
pub(crate) fn narrow_pair<T: Scalar>(
    ready: &Ready,
    meter: &Meter,
    centre: T,
    positive: bool,
) -> Result<RawGap, SolveError> {
    let finder = Finder::<T>::new(ready, meter);
    let mut centre = centre;
    let (mut curvature, mut exponent) = (0.0, 0);
    for _ in 0..6 {
        let (step, second, power) = finder.curvature(centre)?;
        (curvature, exponent) = (second, power);
        if !step.leading().is_finite() {
            break;
        }
        centre = centre - step;
        if step.leading().abs()
            <= 1e-2 * finder.resolution(centre).sqrt() * ready.kinetic_scale().sqrt()
        {
            // the next step would be below the arithmetic's resolution
            break;
        }
    }
    let reading = read(ready, centre, meter)?;
    let (excess, noise) = reading.excess(positive);
    let over_curvature = 2.0 * power_of_two(reading.exponent - exponent) / curvature.abs();
    // the half-gap's noise: rounding of the height, and of the place
    let half_noise = (reading.weight * noise * over_curvature).sqrt() + finder.resolution(centre);
    let half = (excess.leading().max(0.0) * over_curvature).sqrt();
    let middle = RawEdge {
        energy: centre.to_double(),
        slope: 0.0,
        offset: 0.0,
        noise: half_noise,
    };
    if half <= half_noise {
        return Ok(RawGap {
            lower: middle,
            upper: middle,
            noise: 2.0 * half_noise,
            narrow: true,
        });
    }
    let mut edges = [middle; 2];
    for (edge, upper) in edges.iter_mut().zip([false, true]) {
        let mut energy = centre + T::constant(if upper { half } else { -half });
        let target = Target {
            positive,
            ..Target::<T>::edge(0, upper)
        };
        let mut last = read(ready, energy, meter)?;
        let mut offset = 0.0;
        for _ in 0..4 {
            let (residual, slope, _) = target.residual(&last);
            let step = -(residual / slope);
            let size = step.leading().abs();
            if size.is_nan() || size >= 0.5 * half {
                break;
            }
            energy = energy + step;
            // Newton's next step would be about size²/half
            if size * size <= 0.1 * half * finder.resolution(energy) {
                offset = step.leading();
                break;
            }
            last = read(ready, energy, meter)?;
        }
        *edge = raw_edge(&target, energy, &last);
        edge.offset = offset;
        edge.noise += finder.resolution(energy);
    }
    let noise = edges[0].noise + edges[1].noise;
    Ok(RawGap {
        lower: edges[0],
        upper: edges[1],
        noise,
        narrow: true,
    })
}
