//! Dimensions of quantities: powers of length, mass, time and temperature.

/// Exponents in twelfths, so that square, cube and fourth roots stay exact.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, Hash)]
pub struct Dimension {
    /// Of length.
    pub length: i16,
    /// Of mass.
    pub mass: i16,
    /// Of time.
    pub time: i16,
    /// Of temperature.
    pub temperature: i16,
}

impl Dimension {
    /// A bare number, an angle, a fraction.
    pub const NUMBER: Self = Self::of(0, 0, 0, 0);
    /// A length.
    pub const LENGTH: Self = Self::of(1, 0, 0, 0);
    /// A mass.
    pub const MASS: Self = Self::of(0, 1, 0, 0);
    /// A time.
    pub const TIME: Self = Self::of(0, 0, 1, 0);
    /// A temperature.
    pub const TEMPERATURE: Self = Self::of(0, 0, 0, 1);
    /// An energy.
    pub const ENERGY: Self = Self::of(2, 1, -2, 0);
    /// A frequency.
    pub const FREQUENCY: Self = Self::of(0, 0, -1, 0);
    /// An energy times a length.
    pub const ENERGY_LENGTH: Self = Self::of(3, 1, -2, 0);
    /// An inverse length.
    pub const INVERSE_LENGTH: Self = Self::of(-1, 0, 0, 0);

    /// Whole powers of length, mass, time, temperature.
    #[must_use]
    pub const fn of(length: i16, mass: i16, time: i16, temperature: i16) -> Self {
        Self {
            length: 12 * length,
            mass: 12 * mass,
            time: 12 * time,
            temperature: 12 * temperature,
        }
    }
}
