//! Units, constants, dimensions, functions.
#![allow(clippy::unwrap_used, clippy::indexing_slicing, missing_docs)]

mod model_support;

use crenate::model::constants::{CONSTANTS, constant};
use crenate::model::functions::{FUNCTIONS, apply};
use crenate::model::unit::{UNITS, find, of_dimension};
use crenate::model::{Dimension, Dual, ParameterId, Scalar};
use model_support::assert_close;

/// CODATA 2022 by name, from tests/data/model/constants.csv (made by constants.py beside it).
fn codata(name: &str) -> f64 {
    let rows = include_str!("data/model/constants.csv").lines();
    let row = rows
        .into_iter()
        .find_map(|row| row.strip_prefix(&format!("{name},")));
    row.unwrap().split(',').next().unwrap().parse().unwrap()
}

fn size(unit: &str) -> f64 {
    find(unit).unwrap().size
}

#[test]
fn constants_are_codata_2022() {
    assert_close(constant("h").unwrap().value, codata("Planck constant"), 0.0);
    assert_close(
        constant("hbar").unwrap().value,
        codata("reduced Planck constant"),
        2e-16,
    );
    assert_close(
        constant("kB").unwrap().value,
        codata("Boltzmann constant"),
        0.0,
    );
    assert_close(
        constant("c").unwrap().value,
        codata("speed of light in vacuum"),
        0.0,
    );
    assert_close(constant("pi").unwrap().value, std::f64::consts::PI, 0.0);
    assert_eq!(CONSTANTS.len(), 5);
}

#[test]
fn units_that_rest_on_constants_are_codata_2022() {
    assert_close(size("eV"), codata("elementary charge"), 0.0);
    assert_close(size("me"), codata("electron mass"), 0.0);
    assert_close(size("u"), codata("atomic mass constant"), 0.0);
    assert_close(size("bohr"), codata("Bohr radius"), 0.0);
    assert_close(size("Ha"), codata("Hartree energy"), 0.0);
    assert_close(size("Ry"), codata("Rydberg constant times hc in J"), 1e-12);
}

#[test]
fn every_unit_of_the_format_is_there_with_its_prefix() {
    let rows = "m 1 cm 1e-2 mm 1e-3 um 1e-6 µm 1e-6 μm 1e-6 nm 1e-9 pm 1e-12 angstrom 1e-10 Å 1e-10 \u{212b} 1e-10 \
                J 1 kg 1 g 1e-3 K 1 mK 1e-3 uK 1e-6 nK 1e-9 s 1 ms 1e-3 us 1e-6 ns 1e-9 ps 1e-12 fs 1e-15 \
                Hz 1 kHz 1e3 MHz 1e6 GHz 1e9 THz 1e12 rad 1 % 1e-2";
    let words: Vec<&str> = rows.split_whitespace().collect();
    for pair in words.chunks(2) {
        assert_close(size(pair[0]), pair[1].parse().unwrap(), 0.0);
    }
    for (unit, factor) in [
        ("meV", 1e-3),
        ("ueV", 1e-6),
        ("µeV", 1e-6),
        ("neV", 1e-9),
        ("keV", 1e3),
    ] {
        assert_close(size(unit), factor * codata("elementary charge"), 1e-15);
    }
    assert_close(size("deg"), std::f64::consts::PI / 180.0, 0.0);
    for wrong in ["Nm", "mev", "ft", "Er", "ML", "hbar", ""] {
        assert!(find(wrong).is_none(), "{wrong}");
    }
    let energies: Vec<&str> = of_dimension(Dimension::ENERGY)
        .map(|unit| unit.name)
        .collect();
    assert_eq!(
        energies,
        ["meV", "eV", "J", "ueV", "neV", "keV", "Ry", "Ha"]
    );
    assert!(UNITS.iter().all(|unit| unit.size > 0.0));
}

#[test]
fn dimensions_have_words() {
    let energy = Dimension::ENERGY;
    let length = Dimension::LENGTH;
    let rows = [
        (Dimension::NUMBER, "a number"),
        (energy, "an energy"),
        (length, "a length"),
        (Dimension::MASS, "a mass"),
        (Dimension::ENERGY_LENGTH, "an energy times a length"),
        (Dimension::INVERSE_LENGTH, "an inverse length"),
        (length * length, "an area"),
        (Dimension::NUMBER / energy, "an inverse energy"),
        (energy / length, "an energy per length"),
        (energy * Dimension::TIME, "an energy times a time"),
        (Dimension::FREQUENCY, "a frequency"),
        (Dimension::MASS * length, "a quantity in length·mass"),
        (length.power(0.5).unwrap(), "a quantity in length^(1/2)"),
    ];
    for (dimension, words) in rows {
        assert_eq!(dimension.words(), words);
    }
    assert_eq!(length.power(0.1), None);
    assert_eq!(
        energy.power(0.5).unwrap() * energy.power(0.5).unwrap(),
        energy
    );
}

/// The slope by Richardson's extrapolation of central differences (Press et al., *Numerical Recipes*, 3rd ed., §5.7).
fn richardson(function: impl Fn(f64) -> f64, at: f64, step: f64) -> f64 {
    let central = |h: f64| (function(at + h) - function(at - h)) / (2.0 * h);
    let (a, b, c) = (central(step), central(step / 2.0), central(step / 4.0));
    let (d, e) = ((4.0 * b - a) / 3.0, (4.0 * c - b) / 3.0);
    (16.0 * e - d) / 15.0
}

#[test]
fn functions_have_their_values_and_exact_slopes() {
    // Values by mpmath at 25 digits: `mp.dps = 25; nstr(tan(mpf(0.37)), 17)` and so on.
    let at = 0.37;
    let rows = [
        ("sqrt", 0.608_276_253_029_822),
        ("exp", 1.447_734_614_663_324_5),
        ("log", -0.994_252_273_343_866_9),
        ("log10", -0.431_798_275_933_005),
        ("sin", 0.361_615_431_964_962),
        ("cos", 0.932_327_345_606_034_4),
        ("tan", 0.387_863_161_655_849_05),
        ("asin", 0.379_009_020_695_950_8),
        ("acos", 1.191_787_306_098_946),
        ("atan", 0.354_379_919_123_437_8),
        ("sinh", 0.378_500_142_012_984_9),
        ("cosh", 1.069_234_472_650_339_6),
        ("tanh", 0.353_991_712_477_046),
        ("sech", 0.935_248_559_206_357_9),
        ("abs", 0.37),
        ("min", 0.37),
        ("max", 0.37),
        ("floor", 0.0),
        ("ceil", 1.0),
        ("round", 0.0),
    ];
    assert_eq!(rows.len(), FUNCTIONS.len());
    let id = ParameterId(7);
    for (name, wanted) in rows {
        let dual = apply(name, &[Dual::parameter(at, id)]);
        assert!(
            (dual.value - wanted).abs() < 2e-16 * 2.0_f64.max(wanted.abs()),
            "{name}: {}",
            dual.value
        );
        assert_eq!(dual.value, apply(name, &[at]), "{name}");
        let slope = richardson(|u| apply(name, &[u]), at, 0.008);
        assert!(
            (dual.slope(id) - slope).abs() < 1e-10,
            "{name}: {} {slope}",
            dual.slope(id)
        );
    }
    assert!(apply("sech", &[800.0]) >= 0.0);
    assert!(apply("tanh", &[Dual::parameter(800.0, id)]).slope(id) == 0.0);
}

#[test]
fn arithmetic_keeps_sparse_exact_slopes() {
    let (one, two) = (ParameterId(10), ParameterId(5));
    let (a, b) = (Dual::parameter(3.0, one), Dual::parameter(-2.0, two));
    let product = &(&a * &b) + &a;
    assert_eq!(
        (product.value, product.slope(one), product.slope(two)),
        (-3.0, -1.0, 3.0)
    );
    assert!(product.slopes.is_sorted());
    let quotient = &a / &b;
    assert_eq!((quotient.slope(one), quotient.slope(two)), (-0.5, -0.75));
    let power = a.power(&Dual::constant(4.0));
    assert_eq!((power.value, power.slope(one)), (81.0, 108.0));
    let sum = Dual::sum([&a, &b, &a, &product]);
    assert_eq!((sum.value, sum.slope(one), sum.slope(two)), (1.0, 1.0, 4.0));
    assert_eq!(sum.slope(ParameterId(99)), 0.0);
}
