//! The rules of values: format section 2, one test a rule.
#![allow(clippy::unwrap_used, clippy::indexing_slicing, missing_docs)]

mod model_support;

use crenate::model::{Dimension, Dual, ParameterKind, Setting, TroubleKind, build_preamble};
use model_support::{Desk, assert_close, assert_silent, only_trouble};

const EV: f64 = 1.602_176_634e-19;
const MEV: f64 = 1e-3 * EV;

/// The value of `v` in a preamble, in SI units, with its dimension.
#[track_caller]
fn value_after(text: &str) -> (Dual, Dimension) {
    let desk = Desk::new(text);
    let preamble = desk.preamble();
    assert_eq!(desk.problems(), 0, "{text}");
    assert!(
        preamble.troubles.is_empty(),
        "{text}: {:?}",
        preamble.troubles
    );
    let found = preamble.values.iter().find(|one| one.name == "v").unwrap();
    (found.value.clone(), found.dimension)
}

#[track_caller]
fn value(expression: &str) -> f64 {
    value_after(&format!("let v = {expression}\n")).0.value
}

#[track_caller]
fn trouble(expression: &str) -> TroubleKind {
    only_trouble(&format!("let v = {expression}\n")).0
}

#[test]
fn numbers_are_written_in_every_form() {
    for (text, wanted) in [
        ("6", 6.0),
        ("6.0", 6.0),
        (".5", 0.5),
        ("1e-3", 1e-3),
        ("1e3", 1e3),
        ("2.5E+2", 250.0),
    ] {
        assert_close(value(text), wanted, 0.0);
    }
}

#[test]
fn a_number_takes_one_unit_with_an_optional_power() {
    assert_close(value("5.4 nm"), 5.4e-9, 1e-15);
    assert_close(value("1e3nm"), 1e-6, 1e-15);
    assert_close(value("0.2 nm^-1"), 2e8, 1e-15);
    assert_close(value("2 nm^2"), 2e-18, 1e-15);
    assert_close(value("2 eV*nm"), 2e-9 * EV, 1e-15);
    assert_close(value("1/nm"), 1e9, 1e-15);
    assert_close(value("eV"), EV, 0.0);
    assert_close(value("3 µm"), 3e-6, 1e-15);
    assert_close(value("3 \u{3bc}m"), 3e-6, 1e-15);
    assert_close(value("2 Å + 1 \u{212b}"), 3e-10, 1e-15);
}

#[test]
fn a_number_binds_its_unit_first() {
    let (found, dimension) = value_after("let v = 1/2 nm\n");
    assert_close(found.value, 0.5e9, 1e-15);
    assert_eq!(dimension, Dimension::INVERSE_LENGTH);
    assert_close(value("(5 nm)^2"), 25e-18, 1e-15);
}

#[test]
fn operators_bind_as_in_writing() {
    assert_eq!(value("-2^2"), -4.0);
    assert_eq!(value("2^3^2"), 512.0);
    assert_eq!(value("2^-1"), 0.5);
    assert_eq!(value("1 - 2 - 3"), -4.0);
    assert_eq!(value("12/2*3"), 18.0);
    assert_eq!(value("2 + 3*4"), 14.0);
    assert_eq!(value("-3 + 5"), 2.0);
    assert_eq!(value("(-2)^3"), -8.0);
    assert_eq!(value("2*-3"), -6.0);
}

#[test]
fn a_single_letter_may_hide_a_unit_but_not_after_a_number() {
    let text = "let s = 8\nlet v = 3 s * s\n";
    let (found, dimension) = value_after(text);
    assert_eq!((found.value, dimension), (24.0, Dimension::TIME));
}

#[test]
fn a_name_or_constant_after_a_number_wants_a_star() {
    let wanted = |kind: TroubleKind, star: &str| match kind {
        TroubleKind::UnknownUnit { instead, why, .. } => {
            assert_eq!(instead.as_deref(), Some(star));
            assert!(why.is_some());
        }
        other => panic!("{other:?}"),
    };
    wanted(trouble("2 pi"), "* pi");
    wanted(only_trouble("let a = 2 nm\nlet v = 3 a\n").0, "* a");
}

#[test]
fn unknown_units_name_the_nearest() {
    for (word, near) in [
        ("mev", "meV"),
        ("Nm", "nm"),
        ("angstroms", "angstrom"),
        ("nanometers", "nm"),
        ("eVs", "eV"),
    ] {
        match trouble(&format!("2 {word}")) {
            TroubleKind::UnknownUnit { unit, instead, .. } => {
                assert_eq!(unit, word);
                assert_eq!(instead.as_deref(), Some(near), "{word}");
            }
            other => panic!("{other:?}"),
        }
    }
    match trouble("2 furlong") {
        TroubleKind::UnknownUnit { instead, .. } => assert_eq!(instead, None),
        other => panic!("{other:?}"),
    }
}

#[test]
fn recoils_and_monolayers_are_not_known_in_the_preamble() {
    for unit in ["2 Er", "2 ML", "ML"] {
        match trouble(unit) {
            TroubleKind::UnknownUnit { why: Some(why), .. } => assert!(why.contains("known only")),
            other => panic!("{other:?}"),
        }
    }
}

#[test]
fn angles_are_numbers() {
    assert_close(value("180 deg"), std::f64::consts::PI, 1e-15);
    assert_eq!(
        value_after("let v = 2 rad + 1\n"),
        value_after("let v = 2 rad + 1\n")
    );
    assert_close(value("sin(30 deg)"), 0.5, 1e-15);
    assert_close(value("25 %"), 0.25, 1e-15);
}

#[test]
fn functions_take_numbers() {
    assert_close(value("exp(1 nm / 1 angstrom)"), 10.0_f64.exp(), 1e-14);
    match trouble("sin(2 nm)") {
        TroubleKind::WrongUnit { wanted, found } => {
            assert_eq!((wanted.as_str(), found.as_str()), ("a number", "a length"));
        }
        other => panic!("{other:?}"),
    }
}

#[test]
fn root_magnitude_and_extremes_keep_dimensions() {
    let (found, dimension) = value_after("let v = sqrt(4 nm^2)\n");
    assert_close(found.value, 2e-9, 1e-15);
    assert_eq!(dimension, Dimension::LENGTH);
    assert_close(value("abs(-3 meV)"), 3.0 * MEV, 1e-15);
    assert_close(value("min(3 meV, 2 meV, 4 meV)"), 2.0 * MEV, 1e-15);
    assert_close(value("max(0, -2 meV)"), 0.0, 0.0);
    assert!(matches!(
        trouble("max(1 nm, 2 meV)"),
        TroubleKind::WrongUnit { .. }
    ));
    assert!(matches!(trouble("sin(1, 2)"), TroubleKind::BadValue { .. }));
}

#[test]
fn unknown_functions_name_the_nearest() {
    match trouble("sinn(1)") {
        TroubleKind::UnknownName {
            wanted, nearest, ..
        } => {
            assert_eq!((wanted, nearest.as_deref()), ("function", Some("sin")));
        }
        other => panic!("{other:?}"),
    }
}

#[test]
fn a_bare_zero_takes_the_dimension_wanted() {
    assert_silent(
        "let v = 0 + 3 meV
let w = 3 meV - 0
let u = 0 ± 5 meV
let m = min(0, 3 meV)
crystal a
  lattice chain 4 nm
  layer 4 nm at 0
  delta 0 at 0
  require gap 1 >= 0
",
    );
    assert_silent("crystal b\n  lattice vectors (4 nm, 0) (0, 3 nm)\n");
}

#[test]
fn any_other_bare_number_lacks_its_unit() {
    match trouble("3 meV + 2") {
        TroubleKind::MissingUnit { wanted, number } => {
            assert_eq!((wanted, number.as_str()), (Dimension::ENERGY, "2"));
        }
        other => panic!("{other:?}"),
    }
    match trouble("2 + 3 meV") {
        TroubleKind::MissingUnit { number, .. } => assert_eq!(number, "2"),
        other => panic!("{other:?}"),
    }
    // A zero inside a product is no zero alone.
    match only_trouble("crystal a\n  layer 4 nm at 2*0\n").0 {
        TroubleKind::MissingUnit { wanted, number } => {
            assert_eq!((wanted, number.as_str()), (Dimension::ENERGY, "2*0"));
        }
        other => panic!("{other:?}"),
    }
    // A named number is not bare: it has a dimension, the wrong one.
    match only_trouble("let n = 0\ncrystal a\n  layer 4 nm at n\n").0 {
        TroubleKind::WrongUnit { wanted, found } => {
            assert_eq!((wanted.as_str(), found.as_str()), ("an energy", "a number"));
        }
        other => panic!("{other:?}"),
    }
}

#[test]
fn a_quantity_of_another_dimension_is_named_with_both() {
    let (kind, at) = only_trouble("crystal a\n  layer 4 nm at 3 nm\n");
    match kind {
        TroubleKind::WrongUnit { wanted, found } => {
            assert_eq!(
                (wanted.as_str(), found.as_str(), at.as_str()),
                ("an energy", "a length", "3 nm")
            );
        }
        other => panic!("{other:?}"),
    }
}

#[test]
fn results_that_are_not_finite_are_named() {
    for (text, words) in [
        ("1/0", "divides by zero"),
        ("3 nm/(2 - 2)", "divides by zero"),
        ("sqrt(-2)", "root of a negative"),
        ("log(0)", "logarithm of zero"),
        ("log(-1)", "logarithm of a negative"),
        ("asin(1.5)", "above 1"),
        ("(-2)^0.5", "not whole"),
        ("0^-1", "divides by zero"),
        ("exp(1000)", "too large"),
        ("1e308*10", "too large"),
        ("1e999", "too large"),
        ("10^400", "too large"),
    ] {
        match trouble(text) {
            TroubleKind::NotFinite { what } => assert!(what.contains(words), "{text}: {what}"),
            other => panic!("{text}: {other:?}"),
        }
    }
    assert_eq!(value("0/1"), 0.0);
    assert_eq!(value("(-2)^2"), 4.0);
    assert_eq!(value("0^0"), 1.0);
}

#[test]
fn powers_need_a_dimension() {
    assert_close(value("(4 nm^2)^0.5"), 2e-9, 1e-15);
    assert!(matches!(
        trouble("(4 nm)^0.3"),
        TroubleKind::BadValue { .. }
    ));
    assert!(matches!(trouble("2^(1 nm)"), TroubleKind::WrongUnit { .. }));
}

fn draws_of(text: &str) -> Vec<(f64, Dimension, String)> {
    let preamble = Desk::new(text).preamble();
    assert!(preamble.troubles.is_empty(), "{:?}", preamble.troubles);
    let draws = preamble
        .parameters
        .iter()
        .filter(|one| one.kind == ParameterKind::Draw);
    draws
        .map(|one| (one.value, one.dimension, one.text.clone()))
        .collect()
}

#[test]
fn a_tolerance_is_absolute_or_in_percent_of_its_value() {
    for (text, half) in [
        ("2.6 nm ± 0.14 nm", 0.14e-9),
        ("2.6 nm +/- 0.14 nm", 0.14e-9),
        ("100 meV ± 2 %", 2.0 * MEV),
        ("-100 meV ± 2 %", 2.0 * MEV),
        ("1 ± 1.5 %", 0.015),
        ("100 % ± 2 %", 0.02),
        ("50 % ± 2 %", 0.02),
        ("100 meV ± 2*1 %", 2.0 * MEV),
        ("10 meV ± 2*0.5 meV", MEV),
        ("2 nm ± 0", 0.0),
        ("0 ± 5 meV", 5.0 * MEV),
        ("3 nm + 2 nm ± 1 nm", 1e-9),
        ("3 nm + 2 nm ± 10 %", 0.5e-9),
    ] {
        let draws = draws_of(&format!("let v = {text}\n"));
        assert_eq!(draws.len(), 1, "{text}");
        assert!(
            (draws[0].0 - half).abs() <= 1e-14 * half,
            "{text}: {} is not {half}",
            draws[0].0
        );
        assert_eq!(draws[0].2, text);
    }
}

#[test]
fn tolerances_have_the_dimension_of_their_value_and_are_not_negative() {
    assert!(matches!(
        trouble("2 nm ± 3 meV"),
        TroubleKind::WrongUnit { .. }
    ));
    assert!(matches!(
        trouble("2 nm ± 3"),
        TroubleKind::MissingUnit { .. }
    ));
    match trouble("2 nm ± (1 nm - 2 nm)") {
        TroubleKind::BadValue { what } => assert!(what.contains("not negative")),
        other => panic!("{other:?}"),
    }
    // A named share is no literal in per cent.
    assert!(matches!(
        only_trouble("let t = 2 %\nlet v = 3 nm ± t\n").0,
        TroubleKind::WrongUnit { .. }
    ));
}

#[test]
fn a_value_at_a_draw_lies_in_its_interval() {
    let desk = Desk::new("let v = 2.6 nm ± 0.14 nm\nlet w = 2*v\n");
    let draw = desk
        .preamble()
        .parameters
        .iter()
        .find(|one| one.kind == ParameterKind::Draw)
        .unwrap()
        .id;
    for (t, wanted) in [
        (-1.0, 2.46e-9),
        (0.0, 2.6e-9),
        (0.5, 2.67e-9),
        (1.0, 2.74e-9),
    ] {
        let mut setting = Setting::nominal();
        setting.draws.insert(draw, t);
        let built = build_preamble(&desk.world, desk.file(), &setting);
        assert_close(built.values[0].value.value, wanted, 1e-15);
        assert_close(built.values[1].value.value, 2.0 * wanted, 1e-15);
        assert_close(built.values[1].value.slope(draw), 0.28e-9, 1e-14);
    }
}

#[test]
fn one_tolerance_is_one_draw_for_all_that_use_it_and_two_are_two() {
    let text = "let d = 2 nm ± 0.1 nm
material well
  edge 0
  mass 0.1 me
  rate 1 ± 2 %
material wall
  edge 0.2 eV ± 1 %
  mass 0.1 me
crystal a
  layer d of well
  layer d of wall
  layer 3 nm ± 0.1 nm of wall
  layer 3 nm ± 0.1 nm of well
";
    let crystal = Desk::new(text).crystal("a").crystal;
    let draws: Vec<_> = crystal
        .parameters
        .iter()
        .filter(|one| one.kind == ParameterKind::Draw)
        .collect();
    assert_eq!(draws.len(), 5, "{draws:#?}");
    let layers = &crystal.potential.layers;
    let shared = |text: &str| draws.iter().find(|one| one.text == text).unwrap().id;
    let d = shared("2 nm ± 0.1 nm");
    assert_close(layers[0].length.slope(d), 0.1e-9, 1e-14);
    assert_close(layers[1].length.slope(d), 0.1e-9, 1e-14);
    let rate = shared("1 ± 2 %");
    assert_close(layers[0].length.slope(rate), 0.02 * 2e-9, 1e-14);
    assert_close(layers[3].length.slope(rate), 0.02 * 3e-9, 1e-14);
    assert_eq!(layers[1].length.slope(rate), 0.0);
    let edge = shared("0.2 eV ± 1 %");
    assert_close(layers[1].edge[0].slope(edge), 2.0 * MEV, 1e-14);
    assert_close(layers[2].edge[0].slope(edge), 2.0 * MEV, 1e-14);
    let own: Vec<_> = draws
        .iter()
        .filter(|one| one.text == "3 nm ± 0.1 nm")
        .collect();
    assert_eq!(own.len(), 2);
    assert!(layers[2].length.slope(own[0].id) * layers[2].length.slope(own[1].id) == 0.0);
}

#[test]
fn lets_stand_in_any_order_and_circles_are_named() {
    let (found, _) = value_after("let v = 2*a\nlet a = 3 nm\n");
    assert_close(found.value, 6e-9, 1e-15);
    match only_trouble("let v = 2*a\nlet a = b + 1 nm\nlet b = v\n").0 {
        TroubleKind::CircularName { circle } => assert_eq!(circle, ["v", "a", "b", "v"]),
        other => panic!("{other:?}"),
    }
    match only_trouble("let v = v\n").0 {
        TroubleKind::CircularName { circle } => assert_eq!(circle, ["v", "v"]),
        other => panic!("{other:?}"),
    }
}

#[test]
fn a_sections_let_hides_the_preambles_there_alone() {
    let text = "let d = 2 nm
let twice = 2*d
crystal a
  let d = 3 nm
  layer d at 0
  layer twice at 10 meV
crystal b
  layer d at 0
";
    let desk = Desk::new(text);
    assert!(desk.troubles().is_empty(), "{:?}", desk.troubles());
    let layers = desk.crystal("a").crystal.potential.layers;
    assert_close(layers[0].length.value, 3e-9, 1e-15);
    assert_close(layers[1].length.value, 4e-9, 1e-15);
    assert_close(
        desk.crystal("b").crystal.potential.layers[0].length.value,
        2e-9,
        1e-15,
    );
}

#[test]
fn names_that_are_taken() {
    for name in [
        "eV", "nm", "Er", "ML", "hbar", "pi", "kB", "sin", "max", "period", "sigma", "within",
        "mass", "because",
    ] {
        match Desk::new(&format!("let {name} = 2\n"))
            .troubles()
            .as_slice()
        {
            [(TroubleKind::TakenName { name: found, .. }, at)] => {
                assert_eq!((found.as_str(), at.as_str()), (name, name));
            }
            // The reader may stop at a clause word already.
            other => assert!(
                other.is_empty() && Desk::new(&format!("let {name} = 2\n")).problems() == 1,
                "{name}: {other:?}"
            ),
        }
    }
    for name in [
        "s", "h", "c", "m", "fcc", "gaussian", "layer", "line", "ev", "µ",
    ] {
        assert_silent(&format!("let {name} = 2\n"));
    }
    match only_trouble("let a = 1\nlet a = 2\n").0 {
        TroubleKind::TakenName { holder, .. } => assert_eq!(holder, "another `let`"),
        other => panic!("{other:?}"),
    }
}

#[test]
fn unknown_names_offer_the_nearest() {
    match only_trouble("let width_a = 2 nm\nlet v = widht_a\n").0 {
        TroubleKind::UnknownName {
            nearest, wanted, ..
        } => {
            assert_eq!((nearest.as_deref(), wanted), (Some("width_a"), "value"));
        }
        other => panic!("{other:?}"),
    }
}

#[test]
fn names_compare_after_normalisation() {
    assert_close(
        value_after("let \u{e9}t\u{e9} = 2 nm\nlet v = e\u{301}te\u{301}\n")
            .0
            .value,
        2e-9,
        1e-15,
    );
}

#[test]
fn deep_nesting_ends_in_a_finding_or_a_value() {
    let deep = format!("let v = {}1{}\n", "(".repeat(250), ")".repeat(250));
    assert!(Desk::new(&deep).troubles().is_empty());
    let mut chain = String::from("let a0 = 1\n");
    for index in 1..3000 {
        chain += &format!("let a{index} = a{}\n", index - 1);
    }
    assert!(Desk::new(&chain).troubles().is_empty());
    let backwards: String = (0..3000)
        .map(|index| format!("let a{index} = a{}\n", index + 1))
        .collect();
    let troubles = Desk::new(&(backwards + "let a3000 = 1\n")).troubles();
    assert!(
        troubles
            .iter()
            .all(|(kind, _)| matches!(kind, TroubleKind::BadValue { .. })),
        "{:?}",
        troubles.first()
    );
    let long = format!("let v = 1{}\n", " + 1".repeat(5000));
    let _ = Desk::new(&long).troubles();
}
