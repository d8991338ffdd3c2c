//! Natural units of a cell: lengths in periods, masses in a typical mass, energies in ħ²/(2·mass·length²).

/// ħ in J s: h / 2π with h exact (CODATA 2022).
const HBAR: f64 = 6.626_070_15e-34 / (2.0 * std::f64::consts::PI);

/// The units in which the numerics see a crystal; SI per unit.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Scale {
    /// Metre.
    pub length: f64,
    /// Kilogram.
    pub mass: f64,
    /// Joule.
    pub energy: f64,
}

impl Scale {
    /// The scale of a cell of this period and typical mass; `None` where they are not positive and finite,
    /// or give no usable energy.
    pub fn new(length: f64, mass: f64) -> Option<Self> {
        let energy = HBAR * HBAR / (2.0 * mass * length * length);
        let usable = length > 0.0
            && mass > 0.0
            && energy.is_normal()
            && length.is_finite()
            && mass.is_finite();
        usable.then_some(Self {
            length,
            mass,
            energy,
        })
    }
}
