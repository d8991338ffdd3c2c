//! Exact derivatives of band quantities by every number of every piece.
//!
//! At an edge or level dE/dp = −(∂D/∂p)/(∂D/∂E). Where the gap at an edge is narrow both are small, and they are
//! taken in double-double at the edge in double-double. A narrow band's width is w = 4/|D′| at its middle, and
//!   dw/dp = −w (∂D′/∂p + D″ dE/dp)/D′,
//! from the gradient over duals (the difference of two edges would cancel). At a closed gap the two bands'
//! edges are one doublet: both move with its mean, dE*/dp = −(∂D′/∂p)/D″ where D′ = 0, and the gap opens at the
//! rate |dgap/dp| = 2 √(b² − q_E q_p)/|q_E| whichever way p moves; q, b are the quadratic form N₁₁² + N₁₂N₂₁ and
//! its polar form on N = M⁻¹ ∂M (first-order degenerate perturbation theory, see `pair`). That rate is reported, ≥ 0.

use super::budget::{BOUND, Budget, GRADIENT, Meter};
use super::cell::{Cell, Mass, Ready, SolveError, prepare};
use super::double::Double;
use super::gradient::{FINE, Gradient, PieceSlope, Quadrature, gradient};
use super::pair::{Pair, pair};
use super::scalar::{Dual, Scalar};
use super::solve::{NARROW_WIDTH, Raw, find};
use super::uncertainty::is_closed;

/// What to differentiate. Bands from 0.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Quantity {
    /// The bottom of a band.
    Bottom(usize),
    /// The top of a band.
    Top(usize),
    /// The gap above a band.
    Gap(usize),
    /// The width of a band.
    Width(usize),
    /// The level of a band at ka in [0, π].
    Level(usize, f64),
}

/// Derivatives of one quantity by the numbers of one [`Piece`](super::Piece); numbers the piece
/// does not have stay 0.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct PieceSensitivity {
    /// By the length, samples kept.
    pub length: f64,
    /// By the potential at the left and right end (a `Flat` piece: all in the first).
    pub potential: [f64; 2],
    /// By the mass's value and slope at the left and right end (a `Flat` piece: all in the first).
    pub mass: [Mass; 2],
    /// By a delta's strength.
    pub strength: f64,
    /// By each sample.
    pub samples: Vec<f64>,
}

impl Default for Mass {
    fn default() -> Self {
        Mass {
            value: 0.0,
            slope: 0.0,
        }
    }
}

/// A gap below this share of the spacing of bands is differentiated in double-double.
const NARROW_GAP: f64 = 1e-4;

/// Derivatives of each quantity by the numbers of each piece: `result[quantity][piece]`.
/// Costs less than three calls of [`solve`](super::solve) on top of the one it makes.
pub fn sensitivities(
    cell: &Cell,
    quantities: &[Quantity],
    budget: &Budget,
) -> Result<Vec<Vec<PieceSensitivity>>, SolveError> {
    let ready = prepare(cell)?;
    let meter = Meter::new(budget);
    let band = |q: &Quantity| match *q {
        Quantity::Bottom(n) => n,
        Quantity::Top(n) | Quantity::Gap(n) | Quantity::Width(n) => n + 1,
        Quantity::Level(..) => 0,
    };
    let bands = quantities.iter().map(band).max().unwrap_or(0);
    let raw = find(&ready, bands, &meter)?;
    let top = raw.gaps.last().map_or(raw.bottom, |gap| gap.upper);
    meter.sweep::<f64>(&ready, top.energy.round(), BOUND * bands)?;
    let closed = (0..bands).map(|gap| is_closed(&ready, &raw, gap)).collect();
    let known = vec![[None, None]; bands + 1];
    let mut work = Work {
        ready: &ready,
        raw: &raw,
        meter: &meter,
        closed,
        known,
    };
    quantities.iter().map(|q| work.differentiate(*q)).collect()
}

/// The edges differentiated so far, so that none is twice.
struct Work<'a> {
    ready: &'a Ready,
    raw: &'a Raw,
    meter: &'a Meter<'a>,
    closed: Vec<bool>,
    /// per number of states below: the lower end of the gap there, and its upper end
    known: Vec<[Option<Vec<PieceSensitivity>>; 2]>,
}

impl Work<'_> {
    fn differentiate(&mut self, quantity: Quantity) -> Result<Vec<PieceSensitivity>, SolveError> {
        let (ready, raw, meter) = (self.ready, self.raw, self.meter);
        match quantity {
            Quantity::Bottom(band) => self.edge(band, true),
            Quantity::Top(band) => self.edge(band + 1, false),
            Quantity::Gap(gap) if self.closed[gap] => {
                self.spend_doublet(gap)?;
                Ok(self.doublet(gap).rates)
            }
            Quantity::Gap(gap) => Ok(difference(
                &self.edge(gap + 1, true)?,
                &self.edge(gap + 1, false)?,
            )),
            Quantity::Width(band) => {
                let (middle, _, slope) = raw.inside[band];
                if 4.0 / slope.abs() < NARROW_WIDTH * ready.kinetic_scale() {
                    meter.sweep::<f64>(ready, middle.round(), 2 * GRADIENT)?;
                    return Ok(width_slopes(ready, middle.round(), &FINE));
                }
                Ok(difference(
                    &self.edge(band + 1, false)?,
                    &self.edge(band, true)?,
                ))
            }
            Quantity::Level(band, ka) => {
                let energy = super::level::level_energy(ready, band, ka, meter)?;
                edge_slopes(ready, energy, false, meter)
            }
        }
    }

    /// The response of a closed gap's doublet.
    fn doublet(&self, gap: usize) -> Pair {
        let energy = self.raw.gaps[gap].lower.energy;
        if self.raw.exact {
            pair(self.ready, energy, &FINE)
        } else {
            pair(self.ready, energy.round(), &FINE)
        }
    }

    fn spend_doublet(&self, gap: usize) -> Result<(), SolveError> {
        let energy = self.raw.gaps[gap].lower.energy.round();
        if self.raw.exact {
            self.meter.sweep::<Double>(self.ready, energy, GRADIENT)
        } else {
            self.meter.sweep::<f64>(self.ready, energy, GRADIENT)
        }
    }

    /// The edge at the lower or upper end of the gap where N = `states`.
    fn edge(&mut self, states: usize, upper: bool) -> Result<Vec<PieceSensitivity>, SolveError> {
        if let Some(known) = &self.known[states][usize::from(upper)] {
            return Ok(known.clone());
        }
        let found = self.new_edge(states, upper)?;
        self.known[states][usize::from(upper)] = Some(found.clone());
        Ok(found)
    }

    fn new_edge(&self, states: usize, upper: bool) -> Result<Vec<PieceSensitivity>, SolveError> {
        let (ready, raw, meter) = (self.ready, self.raw, self.meter);
        if states == 0 {
            return edge_slopes(ready, raw.bottom.energy, false, meter);
        }
        let gap = raw.gaps[states - 1];
        if self.closed[states - 1] {
            self.spend_doublet(states - 1)?;
            return Ok(self.doublet(states - 1).means);
        }
        let energy = if upper {
            gap.upper.energy
        } else {
            gap.lower.energy
        };
        let size = (gap.upper.energy - gap.lower.energy).leading();
        edge_slopes(
            ready,
            energy,
            size < NARROW_GAP * ready.kinetic_scale(),
            meter,
        )
    }
}

/// −∂D/∂p / ∂D/∂E at an edge or level.
fn edge_slopes(
    ready: &Ready,
    energy: Double,
    narrow: bool,
    meter: &Meter,
) -> Result<Vec<PieceSensitivity>, SolveError> {
    if narrow {
        meter.sweep::<Double>(ready, energy.round(), GRADIENT)?;
        let found = gradient(ready, energy, &FINE);
        return Ok(ratio(&found, |p| -(p / found.energy_slope).leading()));
    }
    meter.sweep::<f64>(ready, energy.round(), GRADIENT)?;
    let found = gradient(ready, energy.round(), &FINE);
    Ok(ratio(&found, |p| -p / found.energy_slope))
}

/// The width of a narrow band about `middle`.
pub(crate) fn width_slopes(
    ready: &Ready,
    middle: f64,
    nodes: &Quadrature,
) -> Vec<PieceSensitivity> {
    let found = gradient(ready, Dual::variable(middle), nodes);
    let slope = found.energy_slope;
    let width = 4.0 / (slope.value.abs() * super::scalar::power_of_two(found.exponent));
    ratio(&found, |p: Dual<f64>| {
        let shift = -p.value / slope.value;
        -width * (p.slope + slope.slope * shift) / slope.value
    })
}

/// Applies `quotient` to every derivative of D; the mass's slope enters as E times its value.
pub(crate) fn ratio<T: Scalar>(
    found: &Gradient<T>,
    quotient: impl Fn(T) -> f64,
) -> Vec<PieceSensitivity> {
    let mass = |m: T| Mass {
        value: quotient(m),
        slope: quotient(m * found.energy),
    };
    let piece = |p: &PieceSlope<T>| PieceSensitivity {
        length: quotient(p.length),
        potential: p.potential.map(&quotient),
        mass: p.mass.map(mass),
        strength: quotient(p.strength),
        samples: p.samples.iter().map(|s| quotient(*s)).collect(),
    };
    found.pieces.iter().map(piece).collect()
}

/// Entry by entry.
pub(crate) fn difference(a: &[PieceSensitivity], b: &[PieceSensitivity]) -> Vec<PieceSensitivity> {
    combined(a, b, |x, y| x - y)
}

/// Entry by entry.
pub(crate) fn sum(a: &[PieceSensitivity], b: &[PieceSensitivity]) -> Vec<PieceSensitivity> {
    combined(a, b, |x, y| x + y)
}

fn combined(
    a: &[PieceSensitivity],
    b: &[PieceSensitivity],
    join: impl Fn(f64, f64) -> f64,
) -> Vec<PieceSensitivity> {
    let mass = |x: Mass, y: Mass| Mass {
        value: join(x.value, y.value),
        slope: join(x.slope, y.slope),
    };
    let piece = |(x, y): (&PieceSensitivity, &PieceSensitivity)| PieceSensitivity {
        length: join(x.length, y.length),
        potential: [0, 1].map(|end| join(x.potential[end], y.potential[end])),
        mass: [0, 1].map(|end| mass(x.mass[end], y.mass[end])),
        strength: join(x.strength, y.strength),
        samples: x
            .samples
            .iter()
            .zip(&y.samples)
            .map(|(p, q)| join(*p, *q))
            .collect(),
    };
    a.iter().zip(b).map(piece).collect()
}
