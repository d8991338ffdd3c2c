//! Numbers as people read them: one place for every view.
//!
//! The convention, used wherever a number is shown:
//!
//! * A number has at most [`USUAL`] significant digits, in the unit that a person
//!   of the trade would pick ([`Trade`]): meV and nm for carriers in solids, recoil
//!   energies where the crystal has a `recoil`, frequencies for other atoms.
//! * No digit is finer than the number's own uncertainty. Where that costs digits,
//!   the uncertainty is said: `12.3 ± 0.2 meV`. Where nothing is said, every digit
//!   shown is certain to within one unit of the last.
//! * A number that its uncertainty does not tell from zero is `0 ± 3e-12 meV`.
//! * Numbers too small or too large for plain digits are written with an exponent:
//!   `3.2e-17 eV`. They keep their digits, as widths are known relative to themselves.
//! * A number without uncertainty is exact as written; its trailing zeros are dropped.

use crate::bands::Measured;
use crate::model::Dimension;
pub use crate::model::constants::{ATOMIC_MASS, BOLTZMANN, ELECTRON_MASS, ELECTRONVOLT, PLANCK};
pub use crate::model::trade::Trade;

/// Significant digits of a number that is known better than anyone wants to read.
pub const USUAL: i32 = 4;

/// A unit to show numbers in.
#[derive(Clone, Debug, PartialEq)]
pub struct Scale {
    /// The SI value of one of it.
    pub factor: f64,
    /// Its name; empty for plain numbers.
    pub name: String,
}

impl Scale {
    fn new(factor: f64, name: &str) -> Self {
        Self {
            factor,
            name: name.to_owned(),
        }
    }
}

impl Trade {
    /// The unit for an energy of this size in joule.
    #[must_use]
    pub fn energy(&self, size: f64) -> Scale {
        if let Some(recoil) = self.recoil {
            return Scale::new(recoil, "Er");
        }
        if self.atoms {
            return frequency(size / PLANCK, PLANCK);
        }
        let steps = [(1.0, "eV"), (1e-3, "meV"), (1e-6, "µeV"), (1e-9, "neV")];
        match size == 0.0 {
            true => Scale::new(1e-3 * ELECTRONVOLT, "meV"),
            false => pick(size, ELECTRONVOLT, &steps, "eV"),
        }
    }

    /// The unit for a mass: electron masses, or atomic units for atoms.
    #[must_use]
    pub fn mass(&self) -> Scale {
        if self.atoms {
            Scale::new(ATOMIC_MASS, "u")
        } else {
            Scale::new(ELECTRON_MASS, "me")
        }
    }

    /// The unit for a quantity of this dimension and size (SI).
    #[must_use]
    pub fn scale(&self, dimension: Dimension, size: f64) -> Scale {
        match dimension {
            Dimension::NUMBER => Scale::new(1.0, ""),
            Dimension::ENERGY => self.energy(size),
            Dimension::MASS => self.mass(),
            Dimension::LENGTH => length(size),
            Dimension::TEMPERATURE => {
                let steps = [(1.0, "K"), (1e-3, "mK"), (1e-6, "µK"), (1e-9, "nK")];
                pick(size, 1.0, &steps, "K")
            }
            Dimension::TIME => {
                let steps = [
                    (1.0, "s"),
                    (1e-3, "ms"),
                    (1e-6, "µs"),
                    (1e-9, "ns"),
                    (1e-12, "ps"),
                    (1e-15, "fs"),
                ];
                pick(size, 1.0, &steps, "s")
            }
            Dimension::FREQUENCY => frequency(size, 1.0),
            Dimension::ENERGY_LENGTH => Scale::new(ELECTRONVOLT * 1e-9, "eV*nm"),
            Dimension::INVERSE_LENGTH => Scale::new(1e9, "nm^-1"),
            other => Scale::new(1.0, &si_name(other)),
        }
    }

    /// A number with its unit, by the convention of this module.
    #[must_use]
    pub fn tell(&self, value: Measured, dimension: Dimension) -> String {
        let size = value.value.abs().max(value.uncertainty);
        tell_in(value, &self.scale(dimension, size))
    }

    /// An energy with its unit.
    #[must_use]
    pub fn tell_energy(&self, value: Measured) -> String {
        self.tell(value, Dimension::ENERGY)
    }

    /// A number that holds only roughly, such as a slope: three digits.
    #[must_use]
    pub fn tell_rough(&self, value: f64, dimension: Dimension) -> String {
        let scale = self.scale(dimension, value.abs());
        let rough: f64 = format!("{:.2e}", value / scale.factor)
            .parse()
            .unwrap_or(0.0);
        let number = exact_digits(rough);
        match scale.name.as_str() {
            "" => number,
            name => format!("{number} {name}"),
        }
    }

    /// An exact number (a value as written) with its unit.
    #[must_use]
    pub fn tell_exact(&self, value: f64, dimension: Dimension) -> String {
        self.tell(exact(value), dimension)
    }
}

/// A number without uncertainty.
#[must_use]
pub fn exact(value: f64) -> Measured {
    Measured {
        value,
        uncertainty: 0.0,
    }
}

/// A number in the given unit, by the convention of this module.
#[must_use]
pub fn tell_in(value: Measured, scale: &Scale) -> String {
    let number = digits(value.value / scale.factor, value.uncertainty / scale.factor);
    match scale.name.as_str() {
        "" => number,
        name => format!("{number} {name}"),
    }
}

/// The unit for a length of this size in metre.
#[must_use]
pub fn length(size: f64) -> Scale {
    let steps = [
        (1.0, "m"),
        (1e-3, "mm"),
        (1e-6, "µm"),
        (1e-9 * 0.01, "nm"),
        (1e-12, "pm"),
    ];
    let mut scale = pick(size, 1.0, &steps, "nm");
    if scale.name == "nm" {
        scale.factor = 1e-9;
    }
    scale
}

/// The unit for a frequency of this size in hertz, `unit` being the SI value that one hertz stands for.
fn frequency(size: f64, unit: f64) -> Scale {
    let steps = [
        (1e12, "THz"),
        (1e9, "GHz"),
        (1e6, "MHz"),
        (1e3, "kHz"),
        (1.0, "Hz"),
    ];
    pick(size * unit, unit, &steps, "Hz")
}

/// The largest step not above `size`; nought, and what is smaller than the last step, is told in the unit `usual`.
fn pick(size: f64, unit: f64, steps: &[(f64, &str)], usual: &str) -> Scale {
    // A value that would round up to the next unit belongs to it: 0.99996 eV is 1.000 eV.
    let reach = size.abs() / unit * (1.0 + 5e-5);
    let found = steps.iter().find(|(factor, _)| reach >= *factor);
    let fallback = steps.iter().find(|(_, name)| *name == usual);
    let (factor, name) = found.or(fallback).copied().unwrap_or((1.0, usual));
    Scale::new(factor * unit, name)
}

/// `m^2 kg s^-2`, with fractional powers as they come from roots.
fn si_name(dimension: Dimension) -> String {
    let parts = [
        ("m", dimension.length),
        ("kg", dimension.mass),
        ("s", dimension.time),
        ("K", dimension.temperature),
    ];
    let named = parts.iter().filter(|(_, power)| *power != 0);
    let words: Vec<String> = named.map(|(unit, power)| powered(unit, *power)).collect();
    words.join("*")
}

fn powered(unit: &str, twelfths: i16) -> String {
    match (twelfths, twelfths % 12) {
        (12, _) => unit.to_owned(),
        (_, 0) => format!("{unit}^{}", twelfths / 12),
        _ => format!("{unit}^({twelfths}/12)"),
    }
}

/// A plain number with the digits that its uncertainty supports, `± u` added where that costs digits.
#[must_use]
pub fn digits(value: f64, uncertainty: f64) -> String {
    if !value.is_finite() {
        return if value.is_nan() {
            "undefined"
        } else {
            "unbounded"
        }
        .to_owned();
    }
    if !uncertainty.is_finite() {
        return "unknown".to_owned();
    }
    if uncertainty <= 0.0 {
        return exact_digits(value);
    }
    if value.abs() <= uncertainty {
        return format!("0 ± {}", one_digit_up(uncertainty + value.abs()));
    }
    let finest = place_when_shown(value) - (USUAL - 1);
    if uncertainty <= 0.5 * 10f64.powi(finest) {
        // Zeros to fill up to the point would pass for digits.
        return match usize::try_from(USUAL - 1) {
            Ok(decimals) if finest > 0 => with_minus(&format!("{value:.decimals$e}")),
            _ => rounded(value, finest),
        };
    }
    let last = finest.max(place(uncertainty));
    let step = 10f64.powi(last);
    let kept = (value / step).round() * step;
    // What the cut costs is part of the bound.
    let bound = uncertainty + (value - kept).abs();
    format!("{} ± {}", rounded(value, last), one_digit_up(bound))
}

/// A number without uncertainty: the usual digits, trailing zeros dropped.
fn exact_digits(value: f64) -> String {
    if value == 0.0 {
        return "0".to_owned();
    }
    let fine = place(value) - (USUAL - 1);
    // Whole units are never rounded away: 12345 nm was written so.
    let whole = (0..6).contains(&place(value));
    let text = rounded(value, if whole { fine.min(0) } else { fine });
    let (mantissa, exponent) = text.split_once('e').unwrap_or((&text, ""));
    let trimmed = match mantissa.contains('.') {
        true => mantissa.trim_end_matches('0').trim_end_matches('.'),
        false => mantissa,
    };
    match exponent {
        "" => trimmed.to_owned(),
        _ => format!("{trimmed}e{exponent}"),
    }
}

/// The power of ten of the leading digit.
fn place(value: f64) -> i32 {
    let text = format!("{:e}", value.abs());
    let exponent = text
        .split_once('e')
        .and_then(|(_, power)| power.parse().ok());
    exponent.unwrap_or(0)
}

/// The same once rounded to the usual digits: 9.99997 counts as 10.00.
fn place_when_shown(value: f64) -> i32 {
    let text = format!(
        "{:.*e}",
        usize::try_from(USUAL - 1).unwrap_or(0),
        value.abs()
    );
    let exponent = text
        .split_once('e')
        .and_then(|(_, power)| power.parse().ok());
    exponent.unwrap_or(0)
}

/// `value` with its last digit at the power of ten `last`, with a proper minus sign.
fn rounded(value: f64, last: i32) -> String {
    let leading = place(value);
    let text = if (-4..6).contains(&leading) {
        let coarse = match last > 0 {
            true => (value / 10f64.powi(last)).round() * 10f64.powi(last),
            false => value,
        };
        format!("{:.*}", usize::try_from(-last).unwrap_or(0), coarse)
    } else {
        format!(
            "{:.*e}",
            usize::try_from(leading - last).unwrap_or(0),
            value
        )
    };
    with_minus(&text)
}

/// An uncertainty to one digit, rounded up so that it stays a bound.
fn one_digit_up(uncertainty: f64) -> String {
    let leading = place(uncertainty);
    let step = 10f64.powi(leading);
    let count = (uncertainty / step - 1e-9).ceil();
    exact_digits(count * step)
}

/// The same text with a true minus in front.
fn with_minus(text: &str) -> String {
    match text.strip_prefix('-') {
        Some(rest) => format!("−{rest}"),
        None => text.to_owned(),
    }
}

/// A change with its sign always shown: `+3.1`, `−12.3`.
#[must_use]
pub fn signed(value: f64) -> String {
    let text = exact_digits((value * 1e12).round() / 1e12);
    match value > 0.0 && text != "0" {
        true => format!("+{text}"),
        false => text,
    }
}

/// A number for a machine: `value` cut at the digit below its uncertainty's first, and the bound widened by
/// what the cut may cost. Without uncertainty, the value as it is.
#[must_use]
pub fn machine(value: Measured) -> Measured {
    let bounded = value.uncertainty > 0.0 && value.uncertainty.is_finite();
    if !bounded || !value.value.is_finite() || value.value == 0.0 {
        return value;
    }
    let last = place(value.uncertainty) - 1;
    let kept = usize::try_from(place(value.value) - last)
        .unwrap_or(0)
        .min(17);
    if kept >= 17 {
        return value;
    }
    let text = format!("{:.*e}", kept, value.value);
    let cut = text.parse().unwrap_or(value.value);
    let cost = value.uncertainty + 0.5 * 10f64.powi(last);
    Measured {
        value: if value.value.abs() < 10f64.powi(last) {
            0.0
        } else {
            cut
        },
        uncertainty: two_digits_up(cost),
    }
}

/// Rounded up to two digits.
fn two_digits_up(value: f64) -> f64 {
    let step = 10f64.powi(place(value) - 1);
    let count = (value / step - 1e-9).ceil();
    format!("{}e{}", count, place(value) - 1)
        .parse()
        .unwrap_or(value)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn measured(value: f64, uncertainty: f64) -> Measured {
        Measured { value, uncertainty }
    }

    #[test]
    fn digits_stop_at_the_uncertainty() {
        assert_eq!(digits(132.418_39, 1e-12), "132.4");
        assert_eq!(digits(132.418_39, 0.23), "132.4 ± 0.3");
        assert_eq!(digits(132.418_39, 3.0), "132 ± 4");
        assert_eq!(digits(132.418_39, 17.0), "130 ± 20");
        assert_eq!(digits(132.418_39, 0.07), "132.4 ± 0.09");
        assert_eq!(digits(132.418_39, 0.04), "132.4");
        assert_eq!(digits(0.2, 0.5), "0 ± 0.7");
        assert_eq!(digits(740_570.6, 1e-8), "7.406e5");
        assert_eq!(digits(740_570.6, 150.0), "740600 ± 200");
        assert_eq!(digits(-12.5, 0.0), "−12.5");
        assert_eq!(digits(60.0, 1e-13), "60.00");
        assert_eq!(digits(8.0, 0.0), "8");
        assert_eq!(digits(3.216e-17, 1e-21), "3.216e-17");
        assert_eq!(digits(9.999_97, 1e-9), "10.00");
    }

    #[test]
    fn units_are_those_of_the_trade() {
        let solid = Trade::default();
        let milli = measured(0.1324 * ELECTRONVOLT, 1e-33);
        assert_eq!(solid.tell_energy(milli), "132.4 meV");
        assert_eq!(
            solid.tell_energy(measured(3.2e-17 * ELECTRONVOLT, 1e-48)),
            "3.200e-17 eV"
        );
        let optical = Trade {
            recoil: Some(2.0e-30),
            atoms: true,
        };
        assert_eq!(optical.tell_energy(measured(3.84e-32, 1e-44)), "0.01920 Er");
        assert_eq!(solid.tell_exact(5.4e-9, Dimension::LENGTH), "5.4 nm");
        assert_eq!(solid.tell_exact(0.283e-9, Dimension::LENGTH), "0.283 nm");
        assert_eq!(solid.tell_exact(850e-9, Dimension::LENGTH), "850 nm");
        assert_eq!(solid.tell_exact(20e-9, Dimension::TEMPERATURE), "20 nK");
    }

    #[test]
    fn a_machine_number_still_contains_the_truth() {
        for (value, uncertainty) in [(0.132_418_391_234, 3.2e-9), (-7.7e-21, 1.9e-30), (5.0, 0.7)] {
            let told = machine(measured(value, uncertainty));
            let reach = (told.value - value).abs() + uncertainty;
            assert!(reach <= told.uncertainty * (1.0 + 1e-12), "{told:?}");
            assert!(told.uncertainty <= 1.2 * uncertainty, "{told:?}");
        }
    }
}
