//! Bounds on what was found, and the masses and widths that need them.
//!
//! Each bound adds up
//! * inputs: every number handed in is known to one unit in the last place, relative 2⁻⁵²; its effect is
//!   |p ∂/∂p| from the exact gradient;
//! * rounding of the sweep, for what was not finished in double-double: an entry of a factor M_j is wrong by a few units, which
//!   moves D by at most units · Σ tr |S_j||M_j||P_j|, carried to the energy by 1/|D′|; near a closing gap, where D′
//!   vanishes, through the doublet instead (`pair`);
//! * the mesh: |δV| of each smooth step times its share of |ψ|²;
//! * the last rounding.

use super::borrow::borrow;
use super::budget::Meter;
use super::cell::{Bounded, Mass, Ready};
use super::double::Double;
use super::edges::RawEdge;
use super::element::Element;
use super::gradient::{COARSE, Gradient, gradient};
use super::pair::{Pair, pair};
use super::scalar::{Dual, Scalar, power_of_two};
use super::search::is_positive;
use super::sensitivity::{PieceSensitivity, difference, ratio, sum, width_slopes};
use super::solve::{Band, BandEdge, Bands, Gap, NARROW_WIDTH, Raw, Wave};
use super::sweep::product;

const UNIT: f64 = f64::EPSILON / 2.0;

/// Two edges closer than this share of the scale are one to a gradient in `f64`.
const SAME_IN_SINGLE: f64 = 1e-14;
/// A gap above this share of the scale is open without further question.
const OPEN: f64 = 1e-6;
/// How far off, in spacings of bands, a doublet is looked at as one double level.
const FAR: f64 = 1e-7;
/// A gap this share of that distance hides from there.
const HIDDEN: f64 = 1e-3;
/// Means by both ways agree to this share, where both hold.
const CONFIRMED: f64 = 1e-2;
/// D follows its parabola to this share there.
const PARABOLIC: f64 = 0.1;
/// Rounding carried by 1/D′ above which a level is taken for one of a doublet, relative to the spacing of bands.
const NEAR_EDGE: f64 = 1e-10;

/// A bound on the error of an energy in `f64`, before any derivative is known.
pub(crate) fn a_priori(ready: &Ready, energy: f64) -> f64 {
    let kinetic = (energy - ready.floor).abs() + ready.delta_depth;
    let scale =
        2.0 * kinetic + ready.potential_size() + ready.delta_size + (energy - ready.ceiling).abs();
    f64::EPSILON * (energy.abs() + scale * (3.0 + (ready.elements.len() as f64).sqrt()))
}

/// Σ |p| |dX/dp| over all numbers, for a relative change of one; and the mesh's part.
fn spread(ready: &Ready, slopes: &[PieceSensitivity]) -> (f64, f64) {
    let mut inputs = 0.0;
    let mut mesh = 0.0;
    let product = |m: &Mass, s: &Mass| (m.value * s.value).abs() + (m.slope * s.slope).abs();
    for (element, slope) in ready.elements.iter().zip(slopes) {
        match element {
            Element::Delta { strength } => inputs += (strength * slope.strength).abs(),
            Element::Flat {
                length,
                potential,
                mass,
            } => {
                inputs += (length * slope.length).abs() + (potential * slope.potential[0]).abs();
                inputs += product(mass, &slope.mass[0]);
            }
            Element::Polynomial(p) => {
                let size = p.range[0].abs().max(p.range[1].abs());
                let all = slope.samples.iter().chain(&slope.potential);
                inputs +=
                    (p.length * slope.length).abs() + size * all.map(|s| s.abs()).sum::<f64>();
                // a mass at either end is at most |μ₀| + |μ₁|
                let value = p.mass[0].value.abs() + p.mass[1].value.abs();
                let rate = p.mass[0].slope.abs() + p.mass[1].slope.abs();
                for end in &slope.mass {
                    inputs += (value * end.value).abs() + (rate * end.slope).abs();
                }
                mesh += p.remainder * slope.samples.iter().sum::<f64>().abs();
            }
        }
    }
    (inputs, mesh)
}

/// Bound on a level's error by the gradient in `f64` there.
pub(crate) fn level_bound(ready: &Ready, energy: f64) -> f64 {
    let found = gradient(ready, energy, &COARSE);
    let slopes = ratio(&found, |p| -p / found.energy_slope);
    let (inputs, mesh) = spread(ready, &slopes);
    let rounding = units(false) * found.rounding / found.energy_slope.abs();
    let bound = energy.abs() * UNIT + f64::EPSILON * inputs + mesh + rounding;
    if rounding < NEAR_EDGE * ready.kinetic_scale() {
        return bound;
    }
    // D′ nearly vanishes: the level is one of a doublet
    let (near, _) = pair_error(ready, energy, &pair(ready, energy, &COARSE), false);
    if near < bound || bound.is_nan() {
        near
    } else {
        bound
    }
}

/// Bound on D at a given energy by inputs and mesh, for a sweep in double-double.
pub(crate) fn discriminant_error(ready: &Ready, energy: f64) -> f64 {
    let found = gradient(ready, energy, &COARSE);
    let slopes = ratio(&found, |p| p * power_of_two(found.exponent));
    let (inputs, mesh) = spread(ready, &slopes);
    f64::EPSILON * inputs + mesh
}

/// Relative effect of inputs and mesh on the width of a narrow band about `middle`, and of rounding.
pub(crate) fn width_spread(ready: &Ready, middle: f64) -> (f64, f64) {
    let found = gradient(ready, Dual::variable(middle), &COARSE);
    let width = 4.0 / (found.energy_slope.value.abs() * power_of_two(found.exponent));
    let (inputs, mesh) = spread(ready, &width_slopes(ready, middle, &COARSE));
    (
        (f64::EPSILON * inputs + mesh) / width,
        UNIT * found.rounding_count(),
    )
}

/// Bound on the error of either of two levels in a doublet, and the rounding in it.
fn pair_error(ready: &Ready, energy: f64, found: &Pair, exact: bool) -> (f64, f64) {
    let (mean, mesh) = spread(ready, &found.means);
    let (rate, split) = spread(ready, &found.rates);
    let rounding = units(exact) * found.rounding;
    let inputs = f64::EPSILON * (mean + 0.5 * rate);
    (
        energy.abs() * UNIT + inputs + mesh + split + rounding,
        rounding,
    )
}

/// Size of a gap and the bound on it.
fn gap_bound(
    ready: &Ready,
    raw: &Raw,
    band: usize,
    doublet: Option<&Pair>,
    edges: [&EdgeBound; 2],
) -> (f64, f64) {
    let gap = raw.gaps[band];
    let [lower, upper] = edges;
    let size = (gap.upper.energy - gap.lower.energy).round().max(0.0);
    if let Some(found) = doublet {
        let (rate, mesh) = spread(ready, &found.rates);
        let rounding = units(raw.exact) * found.rounding + gap.noise;
        return (size, f64::EPSILON * rate + mesh + rounding + UNIT * size);
    }
    let (inputs, mesh) = spread(ready, &difference(&upper.slopes, &lower.slopes));
    let own = lower.rounding + upper.rounding + gap.noise;
    (size, f64::EPSILON * inputs + mesh + own + UNIT * size)
}

/// The doublet at a narrow gap.
fn doublet(ready: &Ready, raw: &Raw, band: usize) -> Option<Pair> {
    let gap = raw.gaps[band];
    let middle = (gap.lower.energy + gap.upper.energy).times(0.5);
    let size = (gap.upper.energy - gap.lower.energy).leading();
    let unresolved =
        raw.exact && size < SAME_IN_SINGLE * (middle.leading().abs() + ready.kinetic_scale());
    if !gap.narrow && !unresolved {
        return None;
    }
    let mut found = if raw.exact {
        pair(ready, middle, &COARSE)
    } else {
        pair(ready, middle.round(), &COARSE)
    };
    found.alone = unresolved;
    let far = far(ready, middle.round());
    if raw.exact && size < HIDDEN * far {
        found = confirmed(ready, middle.round(), found);
    }
    Some(found)
}

/// How far from a doublet it is one double level.
fn far(ready: &Ready, energy: f64) -> f64 {
    FAR * ready.kinetic_scale() + 1e-10 * energy.abs()
}

/// A doublet's response, or bounds on it where it was lost. Behind walls so thick that P⁻¹ … P has cancelled beyond the
/// arithmetic q_E is rounding, and everything divided by it too small. From afar D = 2s + (E − E₁)(E − E₂) D″/2 with
/// E − E₁ ≈ E − E₂, so that −∂D/∂p/D′ is the mean of both levels' dE/dp, whatever became of the doublet; no
/// level alone moves by more than twice that by a perturbation of one sign; and D wrong by δD parts the levels by at most 2√(2 δD/|D″|).
pub(crate) fn confirmed(ready: &Ready, energy: f64, found: Pair) -> Pair {
    let step = far(ready, energy);
    let [below, above] = [energy - step, energy + step].map(|e| {
        let at = gradient(ready, Dual::variable(e), &COARSE);
        let slope = at.energy_slope;
        let means = ratio(&at, |p: Dual<f64>| -0.5 * p.value / slope.value);
        // D − 2s by the parabola, as swept: else there is no doublet here
        let whole = product(ready, Double::new(e));
        let two = Double::new(-2.0 * slope.slope.signum()).shifted(-whole.exponent);
        let height = (whole.matrix.a + whole.matrix.d - two).leading();
        let parabola = 0.5 * slope.slope * step * step;
        let share = height * power_of_two(whole.exponent - at.exponent) / parabola;
        let found = (share - 1.0).abs() < PARABOLIC;
        (means, at.rounding.value / slope.slope.abs(), found)
    });
    if !(below.2 && above.2) {
        return found;
    }
    let means = sum(&below.0, &above.0);
    let size = spread(ready, &means).0;
    let apart = spread(ready, &difference(&found.means, &means)).0;
    if apart <= CONFIRMED * size || !size.is_finite() {
        return found;
    }
    let open = 2.0 * (2.0 * units(true) * below.1.max(above.1)).sqrt();
    Pair {
        rates: sum(&means, &means),
        means,
        rounding: open / units(true),
        alone: found.alone,
    }
}

/// Is the gap above `band` indistinguishable from zero?
pub(crate) fn is_closed(ready: &Ready, raw: &Raw, band: usize) -> bool {
    let gap = raw.gaps[band];
    let plain = (gap.upper.energy - gap.lower.energy).leading();
    if plain > OPEN * (ready.kinetic_scale() + ready.potential_size()) {
        return false;
    }
    let near = doublet(ready, raw, band);
    let bound = |edge: &RawEdge| edge_bound(ready, edge, band + 1, raw.exact, near.as_ref());
    let (size, error) = gap_bound(
        ready,
        raw,
        band,
        near.as_ref(),
        [&bound(&gap.lower), &bound(&gap.upper)],
    );
    size <= error
}

/// Relative rounding of an entry of a factor: of the `f64` sweep, or of the double-double one whose series and
/// doublings lose up to eight bits in a thick wall.
pub(crate) fn units(exact: bool) -> f64 {
    if exact {
        256.0 * Double::UNIT
    } else {
        10.0 * UNIT
    }
}

/// No bound at all where none could be had.
fn bound_of(error: f64) -> f64 {
    if error.is_nan() { f64::INFINITY } else { error }
}

/// What is known about an edge besides its energy.
struct EdgeBound {
    error: f64,
    rounding: f64,
    mass: Bounded,
    slopes: Vec<PieceSensitivity>,
}

/// Bounds at an edge next to gap `gap` − 1.
fn edge_bound(
    ready: &Ready,
    raw: &RawEdge,
    gap: usize,
    exact: bool,
    near: Option<&Pair>,
) -> EdgeBound {
    let energy = raw.energy.round();
    let found = gradient(ready, Dual::variable(energy), &COARSE);
    let slope = found.energy_slope;
    let slopes = ratio(&found, |p: Dual<f64>| -p.value / slope.value);
    let (inputs, mesh) = spread(ready, &slopes);
    let found_slope = if raw.slope == 0.0 {
        slope.value
    } else {
        raw.slope * power_of_two(-found.exponent)
    };
    let mut rounding = units(exact) * found.rounding.value / found_slope.abs();
    let mut error = energy.abs() * UNIT + f64::EPSILON * inputs + mesh + rounding;
    if let Some(found) = near {
        let (near, own) = pair_error(ready, energy, found, exact);
        if near < error || error.is_nan() || found.alone {
            (error, rounding) = (near, own);
        }
    }
    error += raw.noise;
    // m* = −s D′/a², the derivative of D′ along the edge
    let scale = power_of_two(found.exponent) / (ready.period * ready.period);
    let sign = if is_positive(gap) { -1.0 } else { 1.0 };
    let curvature = slope.slope * scale;
    let mass = sign * (raw.slope / (ready.period * ready.period) + curvature * raw.offset);
    let along = ratio(&found, |p: Dual<f64>| {
        scale * (p.slope - slope.slope * p.value / slope.value)
    });
    let (mass_inputs, mass_mesh) = spread(ready, &along);
    let drift = rounding.min(error) + raw.noise;
    // D′ is rounded like D, at the edge's place and by itself
    let own = if exact { 4.0 } else { found.rounding_count() };
    let mass_error = f64::EPSILON * (mass_inputs + 2.0 * mass.abs())
        + mass_mesh
        + curvature.abs() * drift * if exact { 1.0 } else { 2.0 }
        + units(exact) * found.rounding.slope * scale
        + UNIT * own * mass.abs();
    EdgeBound {
        error,
        rounding,
        mass: Bounded {
            value: mass,
            error: bound_of(mass_error),
        },
        slopes,
    }
}

impl Gradient<Dual<f64>> {
    /// Units of rounding in a sum over all factors.
    fn rounding_count(&self) -> f64 {
        8.0 + 6.0 * self.pieces.len() as f64
    }
}

/// Puts the bounds on.
pub(crate) fn finish(ready: &Ready, raw: &Raw, meter: &Meter) -> Bands {
    let count = raw.gaps.len();
    let bound = |edge: &RawEdge, gap: usize, near: Option<&Pair>| {
        edge_bound(ready, edge, gap, raw.exact, near)
    };
    let mut bands = Vec::with_capacity(count);
    let mut gaps = Vec::with_capacity(count);
    let mut bottom = raw.bottom;
    let mut below = bound(&raw.bottom, 0, None);
    let mut touching = false;
    for band in 0..count {
        let gap = raw.gaps[band];
        let near = doublet(ready, raw, band);
        let top = bound(&gap.lower, band + 1, near.as_ref());
        let next = bound(&gap.upper, band + 1, near.as_ref());
        let (size, error) = gap_bound(ready, raw, band, near.as_ref(), [&top, &next]);
        let closed = size <= error;
        gaps.push(Gap {
            size: Bounded {
                value: if closed { 0.0 } else { size },
                error: bound_of(error),
            },
            closed,
        });
        let width = width(
            ready,
            raw,
            band,
            (&bottom, &below),
            (&gap.lower, &top),
            (touching, closed),
        );
        bands.push(Band {
            bottom: edge(&bottom, &below, band, touching),
            top: edge(&gap.lower, &top, band + 1, closed),
            width,
        });
        bottom = gap.upper;
        below = next;
        touching = closed;
    }
    borrow(&mut bands, &mut gaps);
    Bands {
        bands,
        gaps,
        sweeps: meter.sweeps(),
        work: meter.work(),
    }
}

fn edge(raw: &RawEdge, bound: &EdgeBound, gap: usize, closed: bool) -> BandEdge {
    let at = if is_positive(gap) {
        Wave::Centre
    } else {
        Wave::Edge
    };
    // A mass whose sign is open tells nothing.
    let known = bound.mass.error < bound.mass.value.abs() && bound.mass.value.is_finite();
    let mass = (!closed && known).then_some(bound.mass);
    BandEdge {
        energy: Bounded {
            value: raw.energy.round(),
            error: bound_of(bound.error),
        },
        at,
        mass,
    }
}

/// The width of a band: the difference of its edges while that is accurate, else from D′ inside.
fn width(
    ready: &Ready,
    raw: &Raw,
    band: usize,
    bottom: (&RawEdge, &EdgeBound),
    top: (&RawEdge, &EdgeBound),
    touching: (bool, bool),
) -> Bounded {
    let difference_of_edges = (top.0.energy - bottom.0.energy).round();
    let (middle, _, _) = raw.inside[band];
    let isolated = !(touching.0 || touching.1);
    if let Some(value) = raw.widths[band].filter(|_| isolated) {
        let (inputs, mesh) = spread(ready, &width_slopes(ready, middle.round(), &COARSE));
        let own = UNIT * (8.0 + 6.0 * ready.elements.len() as f64) * value;
        return Bounded {
            value,
            error: bound_of(f64::EPSILON * inputs + mesh + own),
        };
    }
    let value = difference_of_edges;
    let (inputs, mesh) = if value < NARROW_WIDTH * ready.kinetic_scale() {
        spread(ready, &width_slopes(ready, middle.round(), &COARSE))
    } else {
        spread(ready, &difference(&top.1.slopes, &bottom.1.slopes))
    };
    let own = top.0.noise + bottom.0.noise + top.1.rounding + bottom.1.rounding;
    // edges in `f64` are themselves rounded
    let last = if raw.exact {
        0.0
    } else {
        2.0 * UNIT * (top.0.energy.leading().abs() + bottom.0.energy.leading().abs())
    };
    let own = own + last;
    Bounded {
        value,
        error: bound_of(f64::EPSILON * inputs + mesh + own + 2.0 * UNIT * value),
    }
}
