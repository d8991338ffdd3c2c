//! Every kind of mistake once, each beside a near miss that stays silent.
#![allow(clippy::unwrap_used, clippy::indexing_slicing, missing_docs)]

mod model_support;

use crenate::model::TroubleKind;
use model_support::{Desk, assert_close, assert_silent, only_trouble};

/// A crystal with a chain of 4 nm and more statements.
fn chain(more: &str) -> String {
    format!("crystal a\n  mass 0.1 me\n  lattice chain 4 nm\n{more}\n")
}

#[test]
fn repeated_statements() {
    let (kind, at) = only_trouble(&chain("  mass 0.2 me"));
    assert_eq!(
        kind,
        TroubleKind::Repeated {
            word: "mass".into()
        }
    );
    assert_eq!(at, "mass 0.2 me");
    let (kind, _) = only_trouble(&chain("  profile = 0 * x * eV/nm\n  profile = 1 eV"));
    assert_eq!(
        kind,
        TroubleKind::Repeated {
            word: "profile".into()
        }
    );
    let text = "crystal a\n  lattice fcc 1 nm\n  atom A at (0, 0, 0)\n  formfactor A 3 = 1 eV\n  formfactor A 3 = 2 eV\n";
    assert_eq!(
        only_trouble(text).0,
        TroubleKind::Repeated {
            word: "formfactor".into()
        }
    );
    assert_silent(&chain(
        "  cosine 1 = 1 meV\n  cosine 1 = 2 meV\n  delta 1 eV*nm at 0\n  delta 1 eV*nm at 0",
    ));
    assert_silent(
        "crystal a\n  lattice fcc 1 nm\n  atom A at (0, 0, 0)\n  formfactor A 3 = 1 eV\n  formfactor A 8 = 2 eV\n",
    );
}

#[test]
fn unknown_names() {
    let wanted = |text: &str, sort: &str, near: Option<&str>| match only_trouble(text).0 {
        TroubleKind::UnknownName {
            wanted, nearest, ..
        } => assert_eq!((wanted, nearest.as_deref()), (sort, near), "{text}"),
        other => panic!("{text}: {other:?}"),
    };
    wanted(
        "material basin\n  edge 0\n  mass 1 me\ncrystal a\n  layer 4 nm of basni\n",
        "material",
        Some("basin"),
    );
    wanted(&chain("  require gap 1 of b >= 0"), "crystal", None);
    wanted(
        "crystal a\n  lattice fcc 1 nm\n  atom Ga at (0, 0, 0)\n  formfactor As 3 = 1 eV\n",
        "atom",
        None,
    );
    wanted(&chain("  require widht >= 1 meV"), "value", None);
    wanted(
        &chain("  carriers bosons\n  require level 1 at edg >= 0"),
        "zone point",
        Some("edge"),
    );
    assert_silent("material basin\n  edge 0\n  mass 1 me\ncrystal a\n  layer 4 nm of basin\n");
    assert_silent(&chain("  require gap 1 of a >= 0"));
    assert_silent(
        "crystal a\n  lattice fcc 1 nm\n  atom Ga at (0, 0, 0)\n  formfactor Ga 3 = 1 eV\n",
    );
    assert_silent(&chain(
        "  measure width_1 = width 1\n  require width_1 >= 1 meV\n  require level 1 at edge >= 0",
    ));
}

#[test]
fn taken_names() {
    let holder = |text: &str| match only_trouble(text) {
        (TroubleKind::TakenName { holder, .. }, _) => holder,
        other => panic!("{other:?}"),
    };
    assert_eq!(
        holder("material a\n  edge 0\nmaterial a\n  edge 0\n"),
        "another material"
    );
    assert_eq!(holder(&(chain("") + &chain(""))), "another crystal");
    assert_eq!(
        holder(&chain("  measure m = gap 1\n  measure m = gap 2")),
        "another `measure`"
    );
    assert_eq!(
        holder(&chain("  let m = 1\n  measure m = gap 1")),
        "a `let`"
    );
    let text = "let x = 1\n".to_owned()
        + &chain("  profile = 1 eV * cos(2*pi*x/period)^2 * (1 + x/period)");
    assert_eq!(holder(&text), "the position in a `profile`");
    // The variable's name is free where no profile uses it; materials, crystals and values keep apart.
    assert_silent(&("let x = 1\n".to_owned() + &chain("  cosine 1 = x * 1 eV")));
    assert_silent("let a = 1\nmaterial a\n  edge 0\n  mass 1 me\ncrystal a\n  layer 2 nm of a\n");
}

#[test]
fn a_let_named_as_the_variable_is_said_at_the_let_where_it_is_near() {
    let (_, at) = only_trouble(&chain("  let x = 2 nm\n  profile = 1 eV * x / nm"));
    assert_eq!(at, "x");
    let desk = Desk::new(&chain("  let x = 2 nm\n  profile = 1 eV * x / nm"));
    let trouble = &desk.crystal("a").troubles[0];
    let (_, span) = desk.world.place_to_absolute(trouble.place).unwrap();
    let (_, used) = desk.world.place_to_absolute(trouble.related[0].0).unwrap();
    assert!(span.start < used.start);
}

#[test]
fn circular_names_of_measures() {
    assert!(matches!(
        only_trouble(&chain("  measure a = b\n  measure b = 2*a")).0,
        TroubleKind::CircularName { .. }
    ));
    assert_silent(&chain("  measure a = b\n  measure b = gap 1"));
}

#[test]
fn units() {
    let monolayers = only_trouble("crystal a\n  layer 4 ML at 0\n").0;
    assert!(matches!(
        monolayers,
        TroubleKind::UnknownUnit { why: Some(_), .. }
    ));
    assert_silent("crystal a\n  monolayer 0.3 nm\n  layer 4 ML at 0\n");
    assert_silent(
        "material m\n  edge 0\n  mass 1 me\n  monolayer 0.3 nm\ncrystal a\n  layer 4 ML of m\n",
    );
    assert!(matches!(
        only_trouble(&chain("  depth 1 = 4 Er")).0,
        TroubleKind::UnknownUnit { .. }
    ));
    assert_silent(&chain(
        "  recoil 8 nm\n  depth 1 = 4 Er\n  require gap 1 >= 0.1 Er",
    ));
    assert!(matches!(
        only_trouble(&chain("  depth 1 = 4")).0,
        TroubleKind::MissingUnit { .. }
    ));
    assert!(matches!(
        only_trouble(&chain("  depth 1 = 4 kHz")).0,
        TroubleKind::WrongUnit { .. }
    ));
    assert_silent(&chain("  depth 1 = 4 kHz * h"));
    assert!(matches!(
        only_trouble(&chain("  delta 1 eV at 0")).0,
        TroubleKind::WrongUnit { .. }
    ));
    assert!(matches!(
        only_trouble(&chain("  temperature 5 meV")).0,
        TroubleKind::WrongUnit { .. }
    ));
    assert_silent(&chain("  temperature 5 meV / kB"));
    assert!(matches!(
        only_trouble(&chain("  require gap 1 >= 3 nm")).0,
        TroubleKind::WrongUnit { .. }
    ));
    assert!(matches!(
        only_trouble(&chain("  require mass bottom 1 >= 3 meV")).0,
        TroubleKind::WrongUnit { .. }
    ));
    assert_silent(&chain(
        "  require mass bottom 1 >= 0.03 me\n  require hopping 1 by 2 <= 3 meV\n  require gap 1/width 1 > 2",
    ));
    assert!(matches!(
        only_trouble(&chain("  profile = 3 nm * x")).0,
        TroubleKind::WrongUnit { .. }
    ));
}

#[test]
fn monolayers_are_the_materials_own_first() {
    let desk = Desk::new(
        "material m\n  edge 0\n  mass 1 me\n  monolayer 0.3 nm\nmaterial n\n  edge 0\n  mass 1 me
crystal a\n  monolayer 0.2 nm\n  let w = 10 ML\n  layer 10 ML of m\n  layer 10 ML of n\n  layer w of m\n",
    );
    assert!(desk.troubles().is_empty(), "{:?}", desk.troubles());
    let layers = desk.crystal("a").crystal.potential.layers;
    for (layer, wanted) in layers.iter().zip([3e-9, 2e-9, 2e-9]) {
        assert_close(layer.length.value, wanted, 1e-14);
    }
    assert!(layers[0].in_monolayers && !layers[2].in_monolayers);
    assert_close(layers[0].monolayer.as_ref().unwrap().value, 0.3e-9, 1e-14);
}

#[test]
fn values_that_their_place_does_not_allow() {
    for (more, words) in [
        ("  degeneracy 0", "at least one state"),
        ("  bands 0", "bands count from 1"),
        ("  require gap 0 >= 1 meV", "bands count from 1"),
        ("  filling -1", "not negative"),
        ("  temperature 0 K - 3 K", "not negative"),
        ("  carriers bosons\n  filling 2", "no filling"),
        ("  carriers bosons\n  require metal", "no class"),
        ("  recoil -1 nm", "positive"),
        ("  monolayer 0 nm", "positive"),
        ("  site gaussian 1 eV sigma 0 nm at 0", "positive"),
        (
            "  require gap 1 between 3 meV and 2 meV",
            "above the second",
        ),
        ("  require gap 1 = 3 meV within -2 meV", "not negative"),
    ] {
        match only_trouble(&chain(more)).0 {
            TroubleKind::BadValue { what } => assert!(what.contains(words), "{more}: {what}"),
            other => panic!("{more}: {other:?}"),
        }
    }
    assert_silent(&chain(
        "  degeneracy 1\n  bands 1\n  filling 0\n  temperature 0 K\n  require gap 1 between 2 meV and 2 meV",
    ));
    let stack = |times: &str| format!("crystal a\n  stack {times} times 1 nm at 0, 1 nm at 1 eV\n");
    assert!(matches!(
        only_trouble(&stack("0")).0,
        TroubleKind::BadValue { .. }
    ));
    assert!(matches!(
        only_trouble(&stack("1000000000000")).0,
        TroubleKind::BadValue { .. }
    ));
    assert_silent(&stack("500"));
    assert!(matches!(
        only_trouble("crystal a\n  layer 0 nm at 0\n").0,
        TroubleKind::BadValue { .. }
    ));
    assert!(matches!(
        only_trouble("material m\n  mass 1 me\ncrystal a\n  layer 1 nm of m\n").0,
        TroubleKind::BadValue { .. }
    ));
    assert_silent(
        "material m\n  mass 1 me\nmaterial n like m\n  edge 0\ncrystal a\n  layer 1 nm of n\n",
    );
}

#[test]
fn open_cells() {
    let wanted = |text: &str, parts: &str, sum: f64| match only_trouble(text).0 {
        TroubleKind::OpenCell {
            sum: found,
            period,
            parts: of,
        } => {
            assert_eq!(of, parts);
            assert_close(found, sum, 1e-12);
            assert_close(period, 4e-9, 1e-12);
        }
        other => panic!("{other:?}"),
    };
    wanted(
        &chain("  layer 1 nm at 0\n  layer 2 nm at 1 eV"),
        "layers",
        3e-9,
    );
    assert_silent(&chain("  layer 1.7 nm at 0\n  layer 2.3 nm at 1 eV"));
    wanted(
        &chain("  profile 0 to 1 nm = 1 eV\n  profile 2 nm to 4 nm = 1 eV"),
        "pieces",
        3e-9,
    );
    assert_silent(&chain(
        "  profile 0 to 1 nm = 1 eV\n  profile 1 nm to 4 nm = 1 eV",
    ));
    assert_silent(&chain(
        "  profile -1 nm to 1/4 = 1 eV\n  profile 1/4 to 3 nm = 1 eV",
    ));
}

#[test]
fn overlapping_pieces() {
    match only_trouble(&chain(
        "  profile 0 to 2 nm = 1 eV\n  profile 1.5 nm to 4 nm = 1 eV",
    )) {
        (TroubleKind::OverlappingPieces { by }, at) => {
            assert_close(by, 0.5e-9, 1e-12);
            assert!(at.contains("1.5 nm"));
        }
        other => panic!("{other:?}"),
    }
    assert!(matches!(
        only_trouble(&chain(
            "  profile 0 to 2 nm = 1 eV\n  profile 2 nm to 5 nm = 1 eV"
        ))
        .0,
        TroubleKind::OverlappingPieces { .. }
    ));
    assert_silent(&chain(
        "  profile 2 nm to 4 nm = 1 eV\n  profile 0 nm to 2 nm = 1 eV",
    ));
}

#[test]
fn missing_lattices() {
    let (kind, at) = only_trouble("crystal a\n  mass 1 me\n");
    assert_eq!((kind, at.as_str()), (TroubleKind::MissingLattice, "a"));
    assert_silent("crystal a\n  layer 1 nm at 0\n");
    // A line that cannot be read may have been the lattice.
    let desk = Desk::new("crystal a\n  lattice chain of 4\n  mass 1 me\n");
    assert!(
        desk.problems() > 0 && desk.troubles().is_empty(),
        "{:?}",
        desk.troubles()
    );
    assert!(desk.crystal("a").crystal.broken);
}

#[test]
fn clashing_atoms() {
    let atoms = |second: &str| {
        format!("crystal a\n  lattice fcc 1 nm\n  atom A at (0, 0, 0)\n  atom B at {second}\n")
    };
    match only_trouble(&atoms("(0.5, 0.5, 0)")) {
        (TroubleKind::ClashingAtoms { distance }, at) => {
            assert!(distance < 1e-15);
            assert!(at.contains('B'));
        }
        other => panic!("{other:?}"),
    }
    assert!(matches!(
        only_trouble(&atoms("(0.9999, 0, 0)")).0,
        TroubleKind::ClashingAtoms { .. }
    ));
    assert_silent(&atoms("(0.25, 0.25, 0.25)"));
    assert_silent(&atoms("(0.5, 0, 0)"));
}

#[test]
fn lone_components() {
    let partner = |more: &str| match only_trouble(&chain(more)).0 {
        TroubleKind::LoneComponent { partner, .. } => partner,
        other => panic!("{other:?}"),
    };
    assert_eq!(partner("  fourier 1 = 3 meV"), "fourier -1 = 3 meV");
    assert_eq!(
        partner("  fourier -2 = 3 meV phase 0.3"),
        "fourier 2 = 3 meV phase -0.3"
    );
    assert_eq!(
        partner("  fourier -2 = 3 meV phase -pi/4"),
        "fourier 2 = 3 meV phase pi/4"
    );
    assert_eq!(
        partner("  fourier -2 = 3 meV phase 1 + pi/4"),
        "fourier 2 = 3 meV phase -(1 + pi/4)"
    );
    let desk = Desk::new(&chain("  fourier 1 = 3 meV\n  fourier -1 = 4 meV"));
    assert_eq!(desk.troubles().len(), 2);
    assert_silent(&chain(
        "  fourier 1 = 3 meV phase 0.2\n  fourier -1 = 3 meV phase -0.2\n  fourier 0 = 2 meV",
    ));
    // The partner that is offered mends it.
    for more in [
        "  fourier 1 = 3 meV phase 0.3",
        "  fourier 1 = 3 meV phase 1 - pi/4",
        "  fourier 3 = -2 meV phase -(1 + 2)",
    ] {
        let offered = partner(more);
        assert_silent(&chain(&format!("{more}\n  {offered}")));
    }
    let square = "crystal a\n  lattice square 1 nm\n  fourier (1, -2) = 3 meV\n";
    match only_trouble(square).0 {
        TroubleKind::LoneComponent { partner, .. } => {
            assert_eq!(partner, "fourier (-1, 2) = 3 meV")
        }
        other => panic!("{other:?}"),
    }
}

#[test]
fn forbidden_waves() {
    let wave = |lattice: &str, index: &str| {
        format!("crystal a\n  lattice {lattice}\n  cosine {index} = 1 eV\n")
    };
    match only_trouble(&wave("fcc 1 nm", "(1, 0, 0)")).0 {
        TroubleKind::ForbiddenWave { index, condition } => {
            assert_eq!(index, [1, 0, 0]);
            assert_eq!(condition, "h, k, l must be all even or all odd");
        }
        other => panic!("{other:?}"),
    }
    for (lattice, index) in [
        ("bcc 1 nm", "(1, 0, 0)"),
        ("centred-rectangular 1 nm by 2 nm", "(1, 0)"),
    ] {
        assert!(matches!(
            only_trouble(&wave(lattice, index)).0,
            TroubleKind::ForbiddenWave { .. }
        ));
    }
    assert_silent(&wave("fcc 1 nm", "(1, 1, 1)"));
    assert_silent(&wave("bcc 1 nm", "(1, 1, 0)"));
    assert_silent(&wave("cubic 1 nm", "(1, 0, 0)"));
}

#[test]
fn odd_masses() {
    for mass in ["0 me", "-0.1 me"] {
        let (kind, at) = only_trouble(&format!("material m\n  edge 0\n  mass {mass}\n"));
        assert!(matches!(kind, TroubleKind::OddMass { .. }));
        assert_eq!(at, mass);
    }
    assert!(matches!(
        only_trouble("crystal a\n  layer 1 nm at 0 mass 0 me\n").0,
        TroubleKind::OddMass { .. }
    ));
    assert_silent("material m\n  edge 0\n  mass 0.001 me\n");
}

#[test]
fn poles() {
    for (formula, at) in [
        ("1 eV * nm/(x - 1 nm)", 1.0),
        ("1 eV * nm^2/(x - 1 nm)^2", 1.0),
        ("1 eV * tan(2*pi*x/period)", 1.0),
        ("1 eV * log(abs(x - 3 nm)/nm)", 3.0),
        ("1 eV / sin(pi*x/period)^2", 0.0),
        ("1 eV * ((x - 2 nm)/nm)^-1", 2.0),
    ] {
        match only_trouble(&chain(&format!("  profile = {formula}"))).0 {
            TroubleKind::Pole { at: found } => {
                assert!((found * 1e9 - at).abs() < 1e-6, "{formula}: {found}")
            }
            other => panic!("{formula}: {other:?}"),
        }
    }
    let root = only_trouble(&chain("  profile = 1 eV * sqrt(x/nm - 2)"));
    assert!(matches!(root.0, TroubleKind::Pole { .. }));
    for formula in [
        "1 eV * nm^2/(x^2 + 0.01 nm^2)",
        "1 eV/(1.001 - cos(2*pi*x/period))",
        "1 eV * sqrt(abs(x - 1 nm)/nm)",
        "1 eV * exp(-(x/nm)^2)",
        "1 eV * log(1 + (x/nm)^2)",
        "1 eV * tan(pi*x/period/2.5)",
        "1 eV * sqrt(1 - cos(2*pi*x/period)^2)",
        "1 eV * (x/nm)^0.5",
        "1 eV / (2 - cos(2*pi*x/period) - sin(2*pi*x/period))",
        "1 eV / (1.0001 - cos(2*pi*x/period)*sin(2*pi*x/period)*2)",
    ] {
        assert_silent(&chain(&format!("  profile = {formula}")));
    }
    let square =
        |formula: &str| format!("crystal a\n  lattice square 1 nm\n  profile = {formula}\n");
    assert!(matches!(
        only_trouble(&square("1 eV * nm^2/((x - 0.3 nm)^2 + (y - 0.4 nm)^2)")).0,
        TroubleKind::Pole { .. }
    ));
    assert_silent(&square("1 eV * (cos(2*pi*x/(1 nm)) + cos(2*pi*y/(1 nm)))"));
    assert_silent(&square(
        "1 eV / (3 + cos(2*pi*x/(1 nm)) + cos(2*pi*y/(1 nm)))",
    ));
}

#[test]
fn wrong_dimensions() {
    let square = |more: &str| format!("crystal a\n  lattice square 1 nm\n  {more}\n");
    for more in [
        "layer 1 nm at 0",
        "delta 1 eV*nm at 0",
        "site sech2 1 eV width 1 nm at (0, 0)",
        "site sphere 1 eV radius 0.1 nm at (0, 0)",
        "cosine 1 = 1 eV",
        "cosine (1, 0, 0) = 1 eV",
        "site gaussian 1 eV sigma 0.1 nm at 0",
        "site box 1 eV size 0.1 nm by 0.1 nm by 0.1 nm at (0, 0)",
        "profile 0 nm to 1 nm = 1 eV",
        "profile = 1 eV * z/nm",
        "require hopping 1 by 1 >= 0",
    ] {
        let (kind, _) = only_trouble(&square(more));
        assert!(
            matches!(kind, TroubleKind::WrongDimension { .. }),
            "{more}: {kind:?}"
        );
    }
    for more in [
        "cosine star 1 = 1 eV",
        "atom A at 0",
        "site disk 1 eV radius 1 nm at 0",
        "profile = 1 eV * y/nm",
    ] {
        let (kind, _) = only_trouble(&chain(&format!("  {more}")));
        assert!(
            matches!(kind, TroubleKind::WrongDimension { .. }),
            "{more}: {kind:?}"
        );
    }
    assert_silent(&square(
        "site disk 1 eV radius 0.1 nm at (0, 0)\n  cosine (1, 0) = 1 eV\n  profile = 1 eV * y/nm\n  require hopping 1 by (1, 0) >= 0",
    ));
    assert_silent(&chain(
        "  site sech2 1 eV width 1 nm at 0\n  cosine 1 = 1 eV\n  require hopping 1 by 1 >= 0",
    ));
}

#[test]
fn two_descriptions() {
    match only_trouble(&chain(
        "  layer 4 nm at 0\n  profile = 1 eV * cos(2*pi*x/period)",
    )) {
        (TroubleKind::TwoDescriptions { first, second }, at) => {
            assert_eq!((first, second), ("layers", "a profile"));
            assert!(at.starts_with("profile"));
        }
        other => panic!("{other:?}"),
    }
    assert_silent(&chain(
        "  layer 4 nm at 0\n  cosine 1 = 1 eV\n  delta 1 eV*nm at 0",
    ));
}

fn table(csv: &str) -> Vec<(TroubleKind, String)> {
    let text = chain("  table \"t.csv\" in nm, meV");
    Desk::of(&[("a.cren", &text), ("t.csv", csv)]).troubles()
}

#[test]
fn bad_tables() {
    for (csv, words) in [
        ("0,1\n1,2\n0.5,3\n3,1\n", "line 3 goes back"),
        ("0,1\n1,2\n1,3\n3,1\n", "line 3 repeats"),
        (
            "0,1\n1,nan\n2,3\n3,1\n",
            "line 2: `nan` is not a finite number",
        ),
        ("0,1\n1,abc\n2,3\n", "line 2: `abc` is no number"),
        ("x,v\n0,1\n1,\n2,3\n", "line 3: column 2 is empty"),
        ("0\n1\n2\n", "column 2 is empty"),
        ("", "no samples"),
        ("0,1\n2,3\n4,1\n", "too few"),
    ] {
        match table(csv).as_slice() {
            [(TroubleKind::BadTable { what }, _)] => assert!(what.contains(words), "{csv}: {what}"),
            other => panic!("{csv}: {other:?}"),
        }
    }
    match table("0,1\n1,2\n2,3\n2.4,1\n").as_slice() {
        [(TroubleKind::OpenCell { parts, .. }, _)] => assert_eq!(*parts, "samples"),
        other => panic!("{other:?}"),
    }
    assert!(matches!(
        table("0,1\n1,2\n3,3\n5,1\n").as_slice(),
        [(TroubleKind::OpenCell { .. }, _)]
    ));
    for silent in [
        "0,1\n1,2\n2,3\n3,1\n",
        "x, v\n0, 1\n1, 2\n2, 3\n4, 1\n",
        "\u{feff}0,1\r\n1,2\r\n2,3\r\n3,1\r\n",
        "-1,1\n0,2,7\n1,3\n2,0\n",
    ] {
        assert!(table(silent).is_empty(), "{silent}: {:?}", table(silent));
    }
    let text = chain("  table \"u.csv\" in nm, meV");
    match Desk::new(&text).troubles().as_slice() {
        [(TroubleKind::MissingFile { path, .. }, at)] => {
            assert_eq!((path.as_str(), at.as_str()), ("u.csv", "\"u.csv\""))
        }
        other => panic!("{other:?}"),
    }
    let outside = chain("  table \"../../u.csv\" in nm, meV");
    match Desk::new(&outside).troubles().as_slice() {
        [(TroubleKind::MissingFile { why, .. }, _)] => assert!(why.contains("outside")),
        other => panic!("{other:?}"),
    }
}

#[test]
fn mistakes_in_a_material_or_preamble_are_said_once_and_break_their_users() {
    let text = "let e = 1 eV + 2 nm\nmaterial m\n  edge 3 nm\n  mass 1 me\ncrystal a\n  layer 1 nm of m\ncrystal b\n  layer 1 nm at e\ncrystal c\n  layer 1 nm at 0\n";
    let desk = Desk::new(text);
    assert_eq!(desk.troubles().len(), 2, "{:?}", desk.troubles());
    assert!(desk.crystal("a").crystal.broken && desk.crystal("b").crystal.broken);
    assert!(!desk.crystal("c").crystal.broken);
}

#[test]
fn names_that_are_ambiguous_break_their_users() {
    let text = "let d = 1 nm\nlet d = 2 nm\ncrystal a\n  layer d at 0\n";
    assert!(Desk::new(text).crystal("a").crystal.broken);
    // A `let` that may not have its name means nothing.
    let desk = Desk::new("let eV = 2\ncrystal a\n  layer 1 nm at 3*eV\n");
    assert_eq!(desk.troubles().len(), 1);
    assert_close(
        desk.crystal("a").crystal.potential.layers[0].edge[0].value,
        3.0 * 1.602_176_634e-19,
        1e-14,
    );
}

#[test]
fn tolerances_that_reach_zero() {
    let reason = |text: &str| match only_trouble(text) {
        (TroubleKind::BadValue { what }, at) => (what, at),
        (other, _) => panic!("{text}: {other:?}"),
    };
    let (what, at) =
        reason("crystal a\n  mass 0.1 me\n  layer 5 nm ± 6 nm at 0\n  layer 2 nm at 1 eV\n");
    assert_eq!(at, "5 nm ± 6 nm");
    assert_eq!(
        what,
        "a thickness is positive, and `5 nm ± 6 nm` reaches zero within its tolerance"
    );
    // A percentage without its sign.
    let (what, _) = reason("material basin\n  mass 0.1 me\n  edge 0\n  rate 1 ± 1.5\n");
    assert!(what.starts_with("a rate is positive"), "{what}");
    let (what, _) = reason(&chain("  cosine 1 = 1 meV").replace("0.1 me", "0.1 me ± 0.1 me"));
    assert!(what.starts_with("a mass is positive"), "{what}");
    // Two tolerances that reach it together.
    let (what, _) = reason(
        "let well = 2 nm ± 60 %\ncrystal a\n  mass 0.1 me\n  layer well - 0.5 nm ± 0.4 nm at 0\n  layer 2 nm at 1 eV\n",
    );
    assert!(what.starts_with("a thickness is positive"), "{what}");
    assert_silent(
        "crystal a\n  mass 0.1 me ± 99 %\n  layer 5 nm ± 4.9 nm at 0 ± 1 eV\n  layer 2 nm at 1 eV\n",
    );
}
