//! How numbers and lists are worded in messages: units that a person would pick, and as many digits as tell two
//! numbers apart.

use crate::model::constants::{ATOMIC_MASS, ELECTRON_MASS, ELECTRONVOLT as EV, PLANCK};
use crate::model::{Crystal, Dimension};

/// Digits shown where nothing asks for more.
const DIGITS: usize = 4;
/// Digits past which two numbers are called equal.
const MOST_DIGITS: usize = 12;

/// A unit to show numbers in.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Unit {
    /// Its name, empty for a bare number.
    pub name: &'static str,
    /// One of it in SI.
    pub size: f64,
}

const ENERGIES: [Unit; 5] = [
    unit("eV", EV),
    unit("meV", 1e-3 * EV),
    unit("µeV", 1e-6 * EV),
    unit("neV", 1e-9 * EV),
    unit("Hz", PLANCK),
];
const LENGTHS: [Unit; 6] = [
    unit("m", 1.0),
    unit("mm", 1e-3),
    unit("µm", 1e-6),
    unit("nm", 1e-9),
    unit("pm", 1e-12),
    unit("pm", 1e-12),
];
const TEMPERATURES: [Unit; 4] = [
    unit("K", 1.0),
    unit("mK", 1e-3),
    unit("µK", 1e-6),
    unit("nK", 1e-9),
];

const fn unit(name: &'static str, size: f64) -> Unit {
    Unit { name, size }
}

/// The unit that a person would pick for a value of that dimension; `recoil` is the crystal's `Er` in joule.
#[must_use]
pub fn unit_for(value: f64, dimension: Dimension, recoil: Option<f64>) -> Option<Unit> {
    let size = value.abs();
    match dimension {
        Dimension::NUMBER => Some(unit("", 1.0)),
        Dimension::ENERGY => Some(match recoil {
            Some(joule) if joule > 0.0 => unit("Er", joule),
            _ => energy_unit(size),
        }),
        Dimension::LENGTH => Some(length_unit(size)),
        Dimension::MASS if size < 0.5 * ATOMIC_MASS => Some(unit("me", ELECTRON_MASS)),
        Dimension::MASS => Some(unit("u", ATOMIC_MASS)),
        Dimension::TEMPERATURE => Some(first_at_most(&TEMPERATURES, size)),
        Dimension::ENERGY_LENGTH => Some(unit("eV*nm", 1e-9 * EV)),
        Dimension::INVERSE_LENGTH => Some(unit("nm^-1", 1e9)),
        _ => None,
    }
}

/// Tenths of a millielectronvolt are still told in millielectronvolts.
fn energy_unit(size: f64) -> Unit {
    let milli = ENERGIES[1];
    if size == 0.0 || (size >= 0.0999 * milli.size && size < milli.size) {
        return milli;
    }
    first_at_most(&ENERGIES, size)
}

fn length_unit(size: f64) -> Unit {
    let nanometre = LENGTHS[3];
    if size == 0.0 || (size >= 0.05e-9 && size < 2e-6) {
        return nanometre;
    }
    first_at_most(&LENGTHS, size)
}

fn first_at_most(units: &[Unit], size: f64) -> Unit {
    let fits = units.iter().find(|unit| unit.size <= size * (1.0 + 1e-9));
    fits.or(units.last()).copied().unwrap_or(unit("", 1.0))
}

/// A value in a unit a person would pick.
#[must_use]
pub fn quantity(value: f64, dimension: Dimension, recoil: Option<f64>) -> String {
    in_unit(value, unit_for(value, dimension, recoil), DIGITS)
}

/// An energy in joule.
#[must_use]
pub fn energy(joule: f64) -> String {
    quantity(joule, Dimension::ENERGY, None)
}

/// An energy in joule, in `Er` where the crystal has it.
#[must_use]
pub fn energy_of(crystal: &Crystal, joule: f64) -> String {
    quantity(joule, Dimension::ENERGY, recoil_of(crystal))
}

/// The crystal's `Er` in joule.
#[must_use]
pub fn recoil_of(crystal: &Crystal) -> Option<f64> {
    crystal.recoil.as_ref().map(|recoil| recoil.energy.value)
}

/// A length in metre.
#[must_use]
pub fn length(metre: f64) -> String {
    quantity(metre, Dimension::LENGTH, None)
}

/// A mass in kg.
#[must_use]
pub fn mass(kilogram: f64) -> String {
    quantity(kilogram, Dimension::MASS, None)
}

/// Values in one unit, with digits enough to tell neighbours apart that are not equal.
#[must_use]
pub fn apart<const N: usize>(
    values: [f64; N],
    dimension: Dimension,
    recoil: Option<f64>,
) -> [String; N] {
    let largest = values.iter().fold(0.0_f64, |most, v| most.max(v.abs()));
    let unit = unit_for(largest, dimension, recoil);
    let shown = |digits| values.map(|value| in_unit(value, unit, digits));
    (DIGITS..MOST_DIGITS)
        .map(shown)
        .find(|texts| all_apart(texts, &values))
        .unwrap_or_else(|| shown(MOST_DIGITS))
}

fn all_apart(texts: &[String], values: &[f64]) -> bool {
    let pairs = texts.windows(2).zip(values.windows(2));
    let mut same = pairs.filter(|(texts, _)| texts.first() == texts.last());
    same.all(|(_, values)| values.first() == values.last())
}

/// A value in that unit with so many significant digits; in plain SI where there is no unit for it.
#[must_use]
pub fn in_unit(value: f64, unit: Option<Unit>, digits: usize) -> String {
    match unit {
        Some(unit) if unit.name.is_empty() => number(value, digits),
        Some(unit) => format!("{} {}", number(value / unit.size, digits), unit.name),
        None => format!("{} (SI)", number(value, digits)),
    }
}

/// A number with so many significant digits, trailing zeros left out.
#[must_use]
pub fn number(value: f64, digits: usize) -> String {
    if value == 0.0 || !value.is_finite() {
        return if value == 0.0 {
            "0".into()
        } else {
            format!("{value}")
        };
    }
    let scientific = format!("{:.*e}", digits.max(1) - 1, value);
    let exponent = scientific
        .rsplit('e')
        .next()
        .and_then(|e| e.parse::<i32>().ok());
    match exponent {
        Some(exponent) if (-4..=7).contains(&exponent) => plain(value, digits, exponent),
        _ => without_zeros_before_exponent(&scientific),
    }
}

fn plain(value: f64, digits: usize, exponent: i32) -> String {
    let wanted = i32::try_from(digits).unwrap_or(i32::MAX) - 1 - exponent;
    let text = format!("{value:.*}", usize::try_from(wanted).unwrap_or(0));
    if text.contains('.') {
        return text.trim_end_matches('0').trim_end_matches('.').to_owned();
    }
    text
}

fn without_zeros_before_exponent(scientific: &str) -> String {
    match scientific.split_once('e') {
        Some((mantissa, exponent)) if mantissa.contains('.') => {
            let mantissa = mantissa.trim_end_matches('0').trim_end_matches('.');
            format!("{mantissa}e{exponent}")
        }
        _ => scientific.to_owned(),
    }
}

/// A dimension in words, with a unit as an example.
#[must_use]
pub fn dimension_words(dimension: Dimension) -> Option<(&'static str, &'static str)> {
    Some(match dimension {
        Dimension::LENGTH => ("a length", "nm"),
        Dimension::ENERGY => ("an energy", "meV"),
        Dimension::MASS => ("a mass", "me"),
        Dimension::TEMPERATURE => ("a temperature", "K"),
        Dimension::TIME => ("a time", "ns"),
        Dimension::FREQUENCY => ("a frequency", "kHz"),
        Dimension::ENERGY_LENGTH => ("an energy times a length", "eV*nm"),
        Dimension::INVERSE_LENGTH => ("an inverse length", "nm^-1"),
        Dimension::NUMBER => ("a bare number", ""),
        _ => return None,
    })
}

/// An index as the format writes it.
#[must_use]
pub fn index(entries: &[i64]) -> String {
    let words: Vec<_> = entries.iter().map(i64::to_string).collect();
    match words.as_slice() {
        [only] => only.clone(),
        _ => format!("({})", words.join(", ")),
    }
}

/// A tuple of fractions as the format writes it.
#[must_use]
pub fn fractions(entries: &[f64]) -> String {
    let words: Vec<_> = entries.iter().map(|entry| number(*entry, 9)).collect();
    match words.as_slice() {
        [only] => only.clone(),
        _ => format!("({})", words.join(", ")),
    }
}

/// "a", "a and b", "a, b and c".
#[must_use]
pub fn listed(words: &[String]) -> String {
    match words {
        [] => String::new(),
        [only] => only.clone(),
        [most @ .., last] => format!("{} and {last}", most.join(", ")),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn energies_take_the_unit_a_person_would_pick() {
        assert_eq!(energy(0.1324 * EV), "132.4 meV");
        assert_eq!(energy(1.5 * EV), "1.5 eV");
        assert_eq!(energy(0.0), "0 meV");
        assert_eq!(quantity(2.0, Dimension::ENERGY, Some(100.0)), "0.02 Er");
    }

    #[test]
    fn lengths_stay_in_nanometre_where_people_say_nanometre() {
        assert_eq!(length(5.4e-9), "5.4 nm");
        assert_eq!(length(1.064e-6), "1064 nm");
        assert_eq!(length(0.0), "0 nm");
        assert_eq!(length(5.4e-6), "5.4 µm");
        assert_eq!(length(5.4e-12), "5.4 pm");
    }

    #[test]
    fn masses_know_electrons_and_atoms() {
        assert_eq!(mass(0.067 * ELECTRON_MASS), "0.067 me");
        assert_eq!(mass(86.909 * ATOMIC_MASS), "86.91 u");
    }

    #[test]
    fn close_numbers_get_the_digits_that_tell_them_apart() {
        let texts = apart([59.9996e-3 * EV, 60e-3 * EV], Dimension::ENERGY, None);
        assert_eq!(texts, ["59.9996 meV", "60 meV"].map(str::to_owned));
    }

    #[test]
    fn numbers_lose_trailing_zeros_and_keep_their_size() {
        assert_eq!(number(120.0, 4), "120");
        assert_eq!(number(3.2e-9, 4), "3.2e-9");
        assert_eq!(number(12_345.6, 4), "12346");
        assert_eq!(number(-0.5, 4), "-0.5");
    }

    #[test]
    fn lists_read_as_people_write_them() {
        let words = ["a", "b", "c"].map(str::to_owned);
        assert_eq!(listed(&words), "a, b and c");
    }
}
