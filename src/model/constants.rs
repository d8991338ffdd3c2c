//! Physical constants in SI units.
//!
//! Source: CODATA recommended values 2022, Mohr, Newell, Taylor and Tiesinga,
//! Rev. Mod. Phys. 97, 025002 (2025). Where no uncertainty is named, the value
//! is exact since the revision of the SI of 2019.

use super::Dimension;

/// Planck constant in J·s (exact).
pub const PLANCK: f64 = 6.626_070_15e-34;
/// Reduced Planck constant in J·s: the Planck constant over 2π.
pub const REDUCED_PLANCK: f64 = PLANCK / (2.0 * std::f64::consts::PI);
/// Elementary charge in C, so also one electronvolt in J (exact).
pub const ELECTRONVOLT: f64 = 1.602_176_634e-19;
/// Boltzmann constant in J/K (exact).
pub const BOLTZMANN: f64 = 1.380_649e-23;
/// Speed of light in vacuum in m/s (exact).
pub const SPEED_OF_LIGHT: f64 = 299_792_458.0;
/// Electron mass in kg (CODATA 2022, ± 28 in the last two digits).
pub const ELECTRON_MASS: f64 = 9.109_383_713_9e-31;
/// Atomic mass constant in kg (CODATA 2022, ± 52 in the last two digits).
pub const ATOMIC_MASS: f64 = 1.660_539_068_92e-27;
/// Bohr radius in m (CODATA 2022, ± 82 in the last two digits).
pub const BOHR_RADIUS: f64 = 5.291_772_105_44e-11;
/// Hartree energy in J (CODATA 2022, ± 48 in the last two digits).
pub const HARTREE: f64 = 4.359_744_722_206_0e-18;
/// Rydberg energy in J: half of the Hartree energy.
pub const RYDBERG: f64 = HARTREE / 2.0;

/// A constant that a file may name.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Constant {
    /// Its name.
    pub name: &'static str,
    /// Its value in SI units.
    pub value: f64,
    /// Its dimension.
    pub dimension: Dimension,
    /// What it is, in a few words.
    pub about: &'static str,
}

/// The constants that a file may name.
pub const CONSTANTS: [Constant; 5] = [
    Constant {
        name: "pi",
        value: std::f64::consts::PI,
        dimension: Dimension::NUMBER,
        about: "the ratio of a circle's circumference to its diameter",
    },
    Constant {
        name: "hbar",
        value: REDUCED_PLANCK,
        dimension: Dimension::of(2, 1, -1, 0),
        about: "the Planck constant over 2π",
    },
    Constant {
        name: "h",
        value: PLANCK,
        dimension: Dimension::of(2, 1, -1, 0),
        about: "the Planck constant",
    },
    Constant {
        name: "kB",
        value: BOLTZMANN,
        dimension: Dimension::of(2, 1, -2, -1),
        about: "the Boltzmann constant",
    },
    Constant {
        name: "c",
        value: SPEED_OF_LIGHT,
        dimension: Dimension::of(1, 0, -1, 0),
        about: "the speed of light in vacuum",
    },
];

/// The constant of that name.
#[must_use]
pub fn constant(name: &str) -> Option<&'static Constant> {
    CONSTANTS.iter().find(|constant| constant.name == name)
}
