//! The units that a file may write.

use std::f64::consts::PI;

use super::Dimension;
use super::constants::{ATOMIC_MASS, BOHR_RADIUS, ELECTRON_MASS, ELECTRONVOLT, HARTREE, RYDBERG};

/// A unit.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Unit {
    /// Its name, in ASCII.
    pub name: &'static str,
    /// One of it in SI units.
    pub size: f64,
    /// Its dimension.
    pub dimension: Dimension,
    /// What it is, in words.
    pub about: &'static str,
}

const fn unit(name: &'static str, size: f64, dimension: Dimension, about: &'static str) -> Unit {
    Unit {
        name,
        size,
        dimension,
        about,
    }
}

const LENGTH: Dimension = Dimension::LENGTH;
const ENERGY: Dimension = Dimension::ENERGY;
const MASS: Dimension = Dimension::MASS;
const TEMPERATURE: Dimension = Dimension::TEMPERATURE;
const TIME: Dimension = Dimension::TIME;
const FREQUENCY: Dimension = Dimension::FREQUENCY;

/// Every unit but the two that a crystal defines for itself (`Er`, `ML`).
pub const UNITS: [Unit; 41] = [
    unit("nm", 1e-9, LENGTH, "nanometre"),
    unit("meV", 1e-3 * ELECTRONVOLT, ENERGY, "millielectronvolt"),
    unit("eV", ELECTRONVOLT, ENERGY, "electronvolt"),
    unit("me", ELECTRON_MASS, MASS, "mass of the free electron"),
    unit("angstrom", 1e-10, LENGTH, "ångström"),
    unit("um", 1e-6, LENGTH, "micrometre"),
    unit("pm", 1e-12, LENGTH, "picometre"),
    unit("mm", 1e-3, LENGTH, "millimetre"),
    unit("cm", 1e-2, LENGTH, "centimetre"),
    unit("m", 1.0, LENGTH, "metre"),
    unit("bohr", BOHR_RADIUS, LENGTH, "Bohr radius"),
    unit("J", 1.0, ENERGY, "joule"),
    unit("ueV", 1e-6 * ELECTRONVOLT, ENERGY, "microelectronvolt"),
    unit("neV", 1e-9 * ELECTRONVOLT, ENERGY, "nanoelectronvolt"),
    unit("keV", 1e3 * ELECTRONVOLT, ENERGY, "kiloelectronvolt"),
    unit("Ry", RYDBERG, ENERGY, "rydberg"),
    unit("Ha", HARTREE, ENERGY, "hartree"),
    unit("u", ATOMIC_MASS, MASS, "atomic mass constant"),
    unit("kg", 1.0, MASS, "kilogram"),
    unit("g", 1e-3, MASS, "gram"),
    unit("K", 1.0, TEMPERATURE, "kelvin"),
    unit("mK", 1e-3, TEMPERATURE, "millikelvin"),
    unit("uK", 1e-6, TEMPERATURE, "microkelvin"),
    unit("nK", 1e-9, TEMPERATURE, "nanokelvin"),
    unit("s", 1.0, TIME, "second"),
    unit("ms", 1e-3, TIME, "millisecond"),
    unit("us", 1e-6, TIME, "microsecond"),
    unit("ns", 1e-9, TIME, "nanosecond"),
    unit("ps", 1e-12, TIME, "picosecond"),
    unit("fs", 1e-15, TIME, "femtosecond"),
    unit("Hz", 1.0, FREQUENCY, "hertz"),
    unit("kHz", 1e3, FREQUENCY, "kilohertz"),
    unit("MHz", 1e6, FREQUENCY, "megahertz"),
    unit("GHz", 1e9, FREQUENCY, "gigahertz"),
    unit("THz", 1e12, FREQUENCY, "terahertz"),
    unit("rad", 1.0, Dimension::NUMBER, "radian"),
    unit("deg", PI / 180.0, Dimension::NUMBER, "degree"),
    unit("%", 1e-2, Dimension::NUMBER, "per cent"),
    unit("µm", 1e-6, LENGTH, "micrometre"),
    unit("Å", 1e-10, LENGTH, "ångström"),
    unit("µeV", 1e-6 * ELECTRONVOLT, ENERGY, "microelectronvolt"),
];

/// The unit of that name; a micro sign of either code point stands for `u`, an ångström sign of either for `angstrom`.
#[must_use]
pub fn find(name: &str) -> Option<&'static Unit> {
    if name.is_ascii() {
        return UNITS.iter().find(|unit| unit.name == name);
    }
    match name {
        "\u{c5}" | "\u{212b}" | "A\u{30a}" => find("angstrom"),
        _ => {
            let rest = name
                .strip_prefix('\u{b5}')
                .or_else(|| name.strip_prefix('\u{3bc}'))?;
            matches!(rest, "m" | "eV" | "K" | "s")
                .then(|| find(&format!("u{rest}")))
                .flatten()
        }
    }
}

/// The units of one dimension, those of the trade first.
pub fn of_dimension(dimension: Dimension) -> impl Iterator<Item = &'static Unit> {
    UNITS
        .iter()
        .filter(move |unit| unit.dimension == dimension && unit.name.is_ascii())
}

/// Whether `word` is a unit somewhere (`Er` and `ML` included).
#[must_use]
pub fn is_unit(word: &str) -> bool {
    matches!(word, "Er" | "ML") || find(word).is_some()
}
