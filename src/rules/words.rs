//! How numbers and lists are worded in messages: units that a person would pick, and as many digits as tell two
//! numbers apart.

use super::Subject;
use crate::model::constants::{ATOMIC_MASS, ELECTRON_MASS, ELECTRONVOLT as EV, PLANCK};
use crate::model::trade::LIGHTEST_ATOM;
pub use crate::model::trade::Trade;
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

const ENERGIES: [Unit; 4] = [
    unit("eV", EV),
    unit("meV", 1e-3 * EV),
    unit("µeV", 1e-6 * EV),
    unit("neV", 1e-9 * EV),
];
/// Energies of atoms are told as frequencies.
const FREQUENCIES: [Unit; 4] = [
    unit("GHz", 1e9 * PLANCK),
    unit("MHz", 1e6 * PLANCK),
    unit("kHz", 1e3 * PLANCK),
    unit("Hz", PLANCK),
];
const LENGTHS: [Unit; 5] = [
    unit("m", 1.0),
    unit("mm", 1e-3),
    unit("µm", 1e-6),
    unit("nm", 1e-9),
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

impl Trade {
    /// The trade of the crystal that a rule looks at; the usual one where there is none.
    #[must_use]
    pub fn here(subject: &Subject<'_>) -> Self {
        subject.crystal.map(Self::of).unwrap_or_default()
    }
}

/// The unit that a person would pick for a value of that dimension.
#[must_use]
pub fn unit_for(value: f64, dimension: Dimension, trade: Trade) -> Option<Unit> {
    let size = value.abs();
    match dimension {
        Dimension::NUMBER => Some(unit("", 1.0)),
        Dimension::ENERGY => Some(energy_unit(size, trade)),
        Dimension::LENGTH => Some(length_unit(size)),
        Dimension::MASS if size < LIGHTEST_ATOM => Some(unit("me", ELECTRON_MASS)),
        Dimension::MASS => Some(unit("u", ATOMIC_MASS)),
        Dimension::TEMPERATURE => Some(first_at_most(&TEMPERATURES, size)),
        Dimension::ENERGY_LENGTH => Some(unit("eV*nm", 1e-9 * EV)),
        Dimension::INVERSE_LENGTH => Some(unit("nm^-1", 1e9)),
        _ => None,
    }
}

/// Tenths of a millielectronvolt are still told in millielectronvolts; what is too small for any unit in electronvolts
/// with an exponent.
fn energy_unit(size: f64, trade: Trade) -> Unit {
    let [whole, milli, .., nano] = ENERGIES;
    if let Some(joule) = trade.recoil {
        return unit("Er", joule);
    }
    if trade.atoms && size < milli.size {
        return first_at_most(&FREQUENCIES, size);
    }
    if size == 0.0 || (size >= 0.0999 * milli.size && size < milli.size) {
        return milli;
    }
    if size < 0.0999 * nano.size {
        return whole;
    }
    first_at_most(&ENERGIES, size)
}

fn length_unit(size: f64) -> Unit {
    let nanometre = LENGTHS[3];
    if size == 0.0 || (0.05e-9..2e-6).contains(&size) {
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
pub fn quantity(value: f64, dimension: Dimension, trade: Trade) -> String {
    in_unit(value, unit_for(value, dimension, trade), DIGITS)
}

/// A bound, which one digit tells.
#[must_use]
pub fn bound(value: f64, dimension: Dimension, trade: Trade) -> String {
    in_unit(value, unit_for(value, dimension, trade), 1)
}

/// An energy in joule, in the unit of the crystal's people.
#[must_use]
pub fn energy(crystal: &Crystal, joule: f64) -> String {
    quantity(joule, Dimension::ENERGY, Trade::of(crystal))
}

/// A length in metre.
#[must_use]
pub fn length(metre: f64) -> String {
    quantity(metre, Dimension::LENGTH, Trade::default())
}

/// A mass in kg.
#[must_use]
pub fn mass(kilogram: f64) -> String {
    quantity(kilogram, Dimension::MASS, Trade::default())
}

/// Values in one unit, with digits enough to tell neighbours apart that are not equal.
#[must_use]
pub fn apart<const N: usize>(values: [f64; N], dimension: Dimension, trade: Trade) -> [String; N] {
    let largest = values.iter().fold(0.0_f64, |most, v| most.max(v.abs()));
    let unit = unit_for(largest, dimension, trade);
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
        let solid = |joule| quantity(joule, Dimension::ENERGY, Trade::default());
        assert_eq!(solid(0.1324 * EV), "132.4 meV");
        assert_eq!(solid(1.5 * EV), "1.5 eV");
        assert_eq!(solid(5e-4 * EV), "0.5 meV");
        assert_eq!(solid(0.0), "0 meV");
        assert_eq!(solid(9.5e-14 * EV), "9.5e-14 eV");
        let light = Trade {
            recoil: Some(100.0),
            atoms: true,
        };
        assert_eq!(quantity(2.0, Dimension::ENERGY, light), "0.02 Er");
        let atoms = Trade {
            recoil: None,
            ..light
        };
        assert_eq!(
            quantity(2.5e3 * PLANCK, Dimension::ENERGY, atoms),
            "2.5 kHz"
        );
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
        let texts = apart(
            [59.9996e-3 * EV, 60e-3 * EV],
            Dimension::ENERGY,
            Trade::default(),
        );
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
