//! What a caller hands in: a cell made of pieces; and the common answers: a value with its bound, an
//! error.
//!
//! Lengths, energies and masses are in the caller's units with ħ²/2 = 1; results scale exactly.
//! Best with numbers of order one, valid while squares of wave numbers times lengths stay in range.

use super::budget::PART;
use super::double::Double;
use super::element::{Element, Polynomial};
use super::mesh::{remainder, samples_to_polynomial};
use super::scalar::Scalar;

/// A mass that may depend on energy: `value + slope * E` at energy E; slope 0 for the ordinary.
/// The slope must not be negative (the count of levels below E would lose its order).
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Mass {
    /// The mass at energy 0.
    pub value: f64,
    /// Its derivative by energy.
    pub slope: f64,
}

impl Mass {
    /// A mass that does not depend on energy.
    pub fn constant(value: f64) -> Self {
        Mass { value, slope: 0.0 }
    }
}

/// One piece of a cell, left to right.
#[derive(Clone, Debug, PartialEq)]
pub enum Piece {
    /// Constant potential and mass.
    Flat {
        /// Its length, ≥ 0.
        length: f64,
        /// Its potential.
        potential: f64,
        /// Its mass.
        mass: Mass,
    },
    /// Potential and mass linear across it, given at its left and right end.
    Ramp {
        /// Its length, ≥ 0.
        length: f64,
        /// Potential at the left and right end.
        potential: [f64; 2],
        /// Mass at the left and right end.
        mass: [Mass; 2],
    },
    /// One step of a smooth stretch: the polynomial through `samples` at the
    /// [`Mesh::NODES`](super::Mesh::NODES) nodes of the step, mass linear. Made by
    /// [`Mesh::pieces`](super::Mesh::pieces).
    Smooth {
        /// Length of the step, ≥ 0.
        length: f64,
        /// The potential at the step's nodes, exactly `Mesh::NODES` of them.
        samples: Vec<f64>,
        /// Mass at the left and right end.
        mass: [Mass; 2],
    },
    /// strength · δ(x): ψ′/m jumps by strength · ψ.
    Delta {
        /// Energy times length.
        strength: f64,
    },
}

/// The pieces of one period, in order; the lengths add up to the period.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Cell {
    /// In order from left to right.
    pub pieces: Vec<Piece>,
}

/// Why no number could be given.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum SolveError {
    /// The work allowed was spent first.
    BudgetSpent,
    /// The caller's hook asked to stop.
    Cancelled,
    /// No bracket was found, or a bracket could not be closed.
    NoBracket,
    /// A number handed in is not finite, a length is negative, the period is zero, or a smooth
    /// step has the wrong number of samples.
    NotFinite,
    /// A mass is not positive at an energy of interest, or falls with energy.
    MassOutOfRange,
}

/// A value and a bound on its error: numerical (mesh, rounding carried through the conditioning)
/// and that of inputs known to one unit in the last place.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Bounded {
    /// The value.
    pub value: f64,
    /// The true value lies within `value ± error`.
    pub error: f64,
}

/// A cell checked and made ready for sweeps.
pub(crate) struct Ready {
    pub elements: Vec<Element>,
    /// index of the piece each element came from
    pub origin: Vec<usize>,
    /// sum of lengths
    pub period: f64,
    /// least and greatest potential
    pub floor: f64,
    pub ceiling: f64,
    /// ∫√m dx at the floor energy (or at zero slope)
    pub optical_length: f64,
    /// greatest lowering of a level by attractive deltas, and size of the deltas' energies
    pub delta_depth: f64,
    pub delta_size: f64,
    /// every mass is positive above this energy
    pub least_energy: f64,
    /// only constant layers and deltas
    pub layered: bool,
}

impl Ready {
    /// An energy of the order of the spacing of bands.
    pub fn kinetic_scale(&self) -> f64 {
        (std::f64::consts::PI / self.optical_length).powi(2)
    }

    /// Parts into which the polynomial elements are cut at an energy.
    pub fn parts(&self, energy: f64) -> usize {
        let parts = |element: &Element| match element {
            Element::Polynomial(p) => p.parts(energy),
            _ => 0,
        };
        if self.layered {
            0
        } else {
            self.elements.iter().map(parts).sum()
        }
    }

    /// Decay lengths of all walls together, ln of how far a product over the cell may grow on the way.
    pub fn decay(&self, energy: f64) -> f64 {
        let lengths = |element: &Element| match element {
            Element::Delta { .. } => 0.0,
            Element::Flat {
                length,
                potential,
                mass,
            } => {
                let mass = mass.value + mass.slope * energy;
                length * (mass * (potential - energy)).max(0.0).sqrt()
            }
            Element::Polynomial(p) => {
                let mass = p.mass[0].value + p.mass[0].slope * energy;
                p.length * (mass * (p.range[1] - energy)).max(0.0).sqrt()
            }
        };
        self.elements.iter().map(lengths).sum()
    }

    /// The work of a sweep at an energy, in the unit of [`budget`](super::budget).
    pub fn work(&self, energy: f64) -> usize {
        self.elements.len() + PART * self.parts(energy)
    }

    /// The scale of the potential.
    pub fn potential_size(&self) -> f64 {
        self.floor.abs().max(self.ceiling.abs())
    }
}

/// Checks a cell and makes it ready for sweeps.
pub(crate) fn prepare(cell: &Cell) -> Result<Ready, SolveError> {
    let mut ready = Ready {
        elements: Vec::with_capacity(cell.pieces.len()),
        origin: Vec::with_capacity(cell.pieces.len()),
        period: 0.0,
        floor: f64::INFINITY,
        ceiling: f64::NEG_INFINITY,
        optical_length: 0.0,
        delta_depth: 0.0,
        delta_size: 0.0,
        least_energy: f64::NEG_INFINITY,
        layered: true,
    };
    let mut attraction = 0.0;
    let mut greatest_mass: f64 = 0.0;
    for (index, piece) in cell.pieces.iter().enumerate() {
        let element = ready.element(piece)?;
        match &element {
            Element::Delta { strength } => {
                attraction += (-strength).max(0.0);
                ready.delta_size += strength.abs();
            }
            Element::Flat { mass, .. } => greatest_mass = greatest_mass.max(mass.value),
            Element::Polynomial(p) => {
                greatest_mass = greatest_mass.max(p.mass[0].value + p.mass[1].value.abs())
            }
        }
        ready.elements.push(element);
        ready.origin.push(index);
    }
    let sound = ready.period > 0.0 && ready.period.is_finite() && ready.floor.is_finite();
    if !sound {
        return Err(SolveError::NotFinite);
    }
    // −S δ alone binds by m S²/4; many together at most like their sum, plus their mean
    ready.delta_depth = attraction * attraction * greatest_mass + attraction / ready.period;
    ready.delta_size /= ready.period;
    if ready.optical_length <= 0.0 {
        return Err(SolveError::MassOutOfRange);
    }
    Ok(ready)
}

impl Ready {
    fn element(&mut self, piece: &Piece) -> Result<Element, SolveError> {
        let finite = |numbers: &[f64]| numbers.iter().all(|x| x.is_finite());
        match piece {
            Piece::Delta { strength } => {
                if !strength.is_finite() {
                    return Err(SolveError::NotFinite);
                }
                Ok(Element::Delta {
                    strength: *strength,
                })
            }
            Piece::Flat {
                length,
                potential,
                mass,
            } => {
                if !finite(&[*length, *potential, mass.value, mass.slope]) {
                    return Err(SolveError::NotFinite);
                }
                self.stretch(*length, &[*potential], [*mass, *mass])?;
                Ok(Element::Flat {
                    length: *length,
                    potential: *potential,
                    mass: *mass,
                })
            }
            Piece::Ramp {
                length,
                potential,
                mass,
            } => {
                if !finite(potential) {
                    return Err(SolveError::NotFinite);
                }
                self.layered = false;
                self.stretch(*length, potential, *mass)?;
                let [left, right] = potential.map(Double::new);
                let coefficients = vec![(left + right).times(0.5), (right - left).times(0.5)];
                Ok(Element::Polynomial(Polynomial::new(
                    *length,
                    coefficients,
                    *mass,
                    [potential[0], potential[1]],
                )))
            }
            Piece::Smooth {
                length,
                samples,
                mass,
            } => {
                if samples.len() != super::Mesh::NODES || !finite(samples) {
                    return Err(SolveError::NotFinite);
                }
                self.layered = false;
                self.stretch(*length, samples, *mass)?;
                let least = samples.iter().copied().fold(f64::INFINITY, f64::min);
                let greatest = samples.iter().copied().fold(f64::NEG_INFINITY, f64::max);
                let coefficients = samples_to_polynomial(samples);
                let mut step = Polynomial::new(*length, coefficients, *mass, [least, greatest]);
                step.remainder = remainder(samples);
                Ok(Element::Polynomial(step))
            }
        }
    }

    /// Books a stretch of length > 0 into the bounds.
    fn stretch(
        &mut self,
        length: f64,
        potentials: &[f64],
        mass: [Mass; 2],
    ) -> Result<(), SolveError> {
        if !length.is_finite() || length < 0.0 {
            return Err(SolveError::NotFinite);
        }
        for m in mass {
            if !(m.value.is_finite() && m.slope.is_finite()) {
                return Err(SolveError::NotFinite);
            }
            if m.slope < 0.0 || (m.slope == 0.0 && m.value <= 0.0) {
                return Err(SolveError::MassOutOfRange);
            }
            if m.slope > 0.0 && length > 0.0 {
                self.least_energy = self.least_energy.max(-m.value / m.slope);
            }
        }
        if length == 0.0 {
            return Ok(());
        }
        self.period += length;
        let mut mean_potential = 0.0;
        for v in potentials {
            self.floor = self.floor.min(*v);
            self.ceiling = self.ceiling.max(*v);
            mean_potential += v / potentials.len() as f64;
        }
        let mean_mass = 0.5 * (mass[0].value + mass[1].value)
            + 0.5 * (mass[0].slope + mass[1].slope) * mean_potential;
        self.optical_length += length * mean_mass.max(0.0).sqrt();
        Ok(())
    }
}
