//! Lattices: volumes, angles, reciprocal vectors, zone points.
#![allow(clippy::unwrap_used, clippy::indexing_slicing, missing_docs)]

mod model_support;

use std::f64::consts::PI;

use crenate::model::{Scalar, Setting, TroubleKind};
use model_support::cells::{combine, cross, crystal, dot, padded, reciprocal, values};
use model_support::{Desk, assert_close, only_trouble};

fn volume(vectors: &[Vec<f64>]) -> f64 {
    let rows = padded(vectors);
    dot(&rows[0], &cross(&rows[1], &rows[2])).abs()
}

#[test]
fn volumes_are_those_of_the_closed_forms() {
    let degrees = |angle: f64| angle.to_radians();
    let triclinic = |a: f64, b: f64, c: f64| {
        let (x, y, z) = (degrees(a).cos(), degrees(b).cos(), degrees(c).cos());
        (1.0 - x * x - y * y - z * z + 2.0 * x * y * z).sqrt()
    };
    // Volume of the primitive cell in nm, nm², nm³: elementary geometry; triclinic: International Tables A (2016), eq. 1.1.2.
    let rows: Vec<(&str, f64)> = vec![
        ("chain 3 nm", 3.0),
        ("square 2 nm", 4.0),
        ("rectangular 2 nm by 3 nm", 6.0),
        ("centred-rectangular 2 nm by 3 nm", 3.0),
        ("hexagonal 2 nm", 4.0 * 0.75_f64.sqrt()),
        (
            "oblique 2 nm by 3 nm angle 70 deg",
            6.0 * degrees(70.0).sin(),
        ),
        ("cubic 2 nm", 8.0),
        ("fcc 2 nm", 2.0),
        ("bcc 2 nm", 4.0),
        ("tetragonal 2 nm axis 3 nm", 12.0),
        ("body-tetragonal 2 nm axis 3 nm", 6.0),
        ("hexagonal 2 nm axis 3 nm", 12.0 * 0.75_f64.sqrt()),
        (
            "rhombohedral 2 nm angle 70 deg",
            8.0 * triclinic(70.0, 70.0, 70.0),
        ),
        ("orthorhombic 2 nm by 3 nm by 4 nm", 24.0),
        ("base-orthorhombic 2 nm by 3 nm by 4 nm", 12.0),
        ("body-orthorhombic 2 nm by 3 nm by 4 nm", 12.0),
        ("face-orthorhombic 2 nm by 3 nm by 4 nm", 6.0),
        (
            "monoclinic 2 nm by 3 nm by 4 nm angle 100 deg",
            24.0 * degrees(100.0).sin(),
        ),
        (
            "base-monoclinic 2 nm by 3 nm by 4 nm angle 100 deg",
            12.0 * degrees(100.0).sin(),
        ),
        (
            "triclinic 2 nm by 3 nm by 4 nm angles 80 deg, 95 deg, 110 deg",
            24.0 * triclinic(80.0, 95.0, 110.0),
        ),
        ("vectors (2 nm, 0) (1 nm, 3 nm)", 6.0),
        ("vectors (2 nm)", 2.0),
    ];
    for (lattice, wanted) in rows {
        let crystal = crystal(lattice);
        let unit = 1e-9_f64.powi(i32::try_from(crystal.dimension).unwrap());
        assert_close(volume(&values(&crystal.vectors)) / unit, wanted, 1e-13);
    }
}

fn angle(a: &[f64], b: &[f64]) -> f64 {
    (dot(a, b) / (dot(a, a) * dot(b, b)).sqrt())
        .acos()
        .to_degrees()
}

#[test]
fn axes_stand_as_the_format_says() {
    let rows = values(
        &crystal("triclinic 2 nm by 3 nm by 4 nm angles 80 deg, 95 deg, 110 deg").conventional,
    );
    assert_eq!(&rows[0][1..], [0.0, 0.0]);
    assert_close(angle(&rows[1], &rows[2]), 80.0, 1e-13);
    assert_close(angle(&rows[0], &rows[2]), 95.0, 1e-13);
    assert_close(angle(&rows[0], &rows[1]), 110.0, 1e-13);
    for (row, length) in rows.iter().zip([2e-9, 3e-9, 4e-9]) {
        assert_close(dot(row, row).sqrt(), length, 1e-14);
    }
    let rows = values(&crystal("monoclinic 2 nm by 3 nm by 4 nm angle 100 deg").conventional);
    assert_close(angle(&rows[0], &rows[2]), 100.0, 1e-13);
    assert_close(angle(&rows[0], &rows[1]), 90.0, 1e-13);
    assert_close(angle(&rows[1], &rows[2]), 90.0, 1e-13);
    let rows = values(&crystal("rhombohedral 2 nm angle 75 deg").vectors);
    for (i, j) in [(0, 1), (0, 2), (1, 2)] {
        assert_close(angle(&rows[i], &rows[j]), 75.0, 1e-13);
    }
    let rows = values(&crystal("oblique 2 nm by 3 nm angle 70 deg").vectors);
    assert_close(angle(&rows[0], &rows[1]), 70.0, 1e-13);
    assert_eq!(rows[0][1], 0.0);
    let rows = values(&crystal("hexagonal 2 nm axis 3 nm").vectors);
    assert_close(angle(&rows[0], &rows[1]), 120.0, 1e-13);
}

#[test]
fn the_shortest_waves_of_a_hexagonal_lattice() {
    for lattice in ["hexagonal 2 nm", "hexagonal 2 nm axis 9 nm"] {
        let crystal = crystal(lattice);
        let b = reciprocal(&values(&crystal.vectors));
        // |G| = 4π/(√3 a).
        let wanted = 4.0 * PI / (3.0_f64.sqrt() * 2e-9);
        for (h, k) in [(1.0, 0.0), (0.0, 1.0), (1.0, -1.0)] {
            let wave = combine(&b, &[h, k, 0.0][..crystal.dimension]);
            assert_close(dot(&wave, &wave).sqrt(), wanted, 1e-14);
        }
        let longer = combine(&b, &[1.0, 1.0, 0.0][..crystal.dimension]);
        assert_close(dot(&longer, &longer).sqrt(), 3.0_f64.sqrt() * wanted, 1e-14);
    }
}

/// |k|² in (2π/a)², a the first length: Setyawan and Curtarolo, Comput. Mater. Sci. 49, 299 (2010); the same values stand
/// as the lowest level of each point in any table of the empty lattice.
#[test]
fn zone_points_have_their_wave_numbers() {
    let rows: [(&str, &[(&str, f64)]); 8] = [
        ("chain 1 nm", &[("centre", 0.0), ("edge", 0.25)]),
        ("square 1 nm", &[("X", 0.25), ("M", 0.5)]),
        ("hexagonal 1 nm", &[("M", 1.0 / 3.0), ("K", 4.0 / 9.0)]),
        ("cubic 1 nm", &[("X", 0.25), ("M", 0.5), ("R", 0.75)]),
        (
            "fcc 1 nm",
            &[
                ("X", 1.0),
                ("L", 0.75),
                ("K", 1.125),
                ("U", 1.125),
                ("W", 1.25),
            ],
        ),
        ("bcc 1 nm", &[("H", 1.0), ("N", 0.5), ("P", 0.75)]),
        (
            "tetragonal 1 nm axis 2 nm",
            &[
                ("X", 0.25),
                ("M", 0.5),
                ("Z", 0.0625),
                ("R", 0.3125),
                ("A", 0.5625),
            ],
        ),
        (
            "hexagonal 1 nm axis 2 nm",
            &[
                ("M", 1.0 / 3.0),
                ("K", 4.0 / 9.0),
                ("A", 0.0625),
                ("H", 4.0 / 9.0 + 0.0625),
            ],
        ),
    ];
    for (lattice, points) in rows {
        let crystal = crystal(lattice);
        let b = reciprocal(&values(&crystal.vectors));
        for (name, wanted) in points {
            let (_, fractions) = crystal
                .zone_points()
                .into_iter()
                .find(|(known, _)| known == name)
                .unwrap();
            let k = combine(&b, &fractions);
            let found = dot(&k, &k) * (1e-9 / (2.0 * PI)).powi(2);
            assert!((found - wanted).abs() < 1e-14, "{lattice} {name}: {found}");
        }
    }
}

#[test]
fn named_points_are_those_of_the_lattice() {
    let desk =
        Desk::new("crystal a\n  lattice fcc 1 nm\n  measure m = level 1 at X - level 1 at Γ\n");
    assert!(desk.troubles().is_empty(), "{:?}", desk.troubles());
    let text = "crystal a\n  lattice fcc 1 nm\n  require level 1 at M >= 0\n";
    assert!(matches!(
        only_trouble(text).0,
        TroubleKind::UnknownName {
            wanted: "zone point",
            ..
        }
    ));
    let text = "crystal a\n  lattice square 1 nm\n  require level 1 at edge >= 0\n";
    assert!(matches!(
        only_trouble(text).0,
        TroubleKind::UnknownName {
            wanted: "zone point",
            ..
        }
    ));
    let text = "crystal a\n  lattice square 1 nm\n  require level 1 at (0.5, 0.5, 0) >= 0\n";
    assert!(matches!(
        only_trouble(text).0,
        TroubleKind::WrongDimension { .. }
    ));
}

#[test]
fn impossible_lattices_are_flat() {
    for lattice in [
        "oblique 2 nm by 3 nm angle 0 deg",
        "oblique 2 nm by 3 nm angle 180 deg",
        "rhombohedral 2 nm angle 120 deg",
        "triclinic 2 nm by 3 nm by 4 nm angles 30 deg, 30 deg, 70 deg",
        "vectors (2 nm, 1 nm) (4 nm, 2 nm)",
        "vectors (1 nm, 0, 0) (0, 1 nm, 0) (1 nm, 1 nm, 0)",
    ] {
        let (kind, _) = only_trouble(&format!("crystal a\n  lattice {lattice}\n"));
        assert!(
            matches!(kind, TroubleKind::FlatLattice { .. }),
            "{lattice}: {kind:?}"
        );
    }
    // Near misses; a bare angle is radians, however large.
    crystal("oblique 2 nm by 3 nm angle 90");
    crystal("oblique 2 nm by 3 nm angle 1 deg");
    crystal("rhombohedral 2 nm angle 119 deg");
    crystal("triclinic 2 nm by 3 nm by 4 nm angles 30 deg, 41 deg, 70 deg");
    crystal("vectors (2 nm, 1 nm) (4 nm, 2.1 nm)");
}

#[test]
fn a_lattice_takes_its_own_lengths() {
    for lattice in [
        "cubic 2 nm by 3 nm",
        "tetragonal 2 nm",
        "rectangular 2 nm",
        "chain 0 nm",
        "chain -2 nm",
    ] {
        let desk = Desk::new(&format!("crystal a\n  lattice {lattice}\n"));
        let troubles = desk.troubles();
        let bad = troubles.len() == 1 && matches!(troubles[0].0, TroubleKind::BadValue { .. });
        assert!(bad || desk.problems() == 1, "{lattice}: {troubles:?}");
    }
}

#[test]
fn fractions_go_along_the_edges_and_lengths_along_the_axes() {
    let desk = Desk::new(
        "crystal a
  lattice hexagonal 2 nm
  site gaussian 10 meV sigma 0.1 nm at (0.5, 0.5)
  site gaussian 10 meV sigma 0.1 nm at (0.3 nm, 0.4 nm)
  site gaussian 10 meV sigma 0.1 nm at (0, 0.25)
",
    );
    assert!(desk.troubles().is_empty(), "{:?}", desk.troubles());
    let sites = desk.crystal("a").crystal.potential.sites;
    let at = |index: usize| -> Vec<f64> { sites[index].at.iter().map(Scalar::value).collect() };
    assert_close(at(0)[0], 0.5e-9, 1e-14);
    assert_close(at(0)[1], 0.75_f64.sqrt() * 1e-9, 1e-14);
    assert_close(at(1)[0], 0.3e-9, 1e-14);
    assert_close(at(2)[0], -0.25e-9, 1e-14);
}

#[test]
fn positions_outside_the_cell_wrap_with_a_note() {
    let desk = Desk::new(
        "crystal a\n  lattice chain 4 nm\n  delta 1 eV*nm at 5 nm\n  delta 1 eV*nm at -0.25\n",
    );
    let troubles = desk.troubles();
    assert_eq!(troubles.len(), 2);
    match &troubles[0].0 {
        TroubleKind::OutsideCell { fractions, inside } => {
            assert_close(fractions[0], 1.25, 1e-14);
            assert_close(inside[0], 0.25, 1e-13);
        }
        other => panic!("{other:?}"),
    }
    let built = desk.crystal("a");
    assert!(!built.crystal.broken);
    assert_close(built.crystal.potential.deltas[0].at.value, 1e-9, 1e-13);
    assert_close(built.crystal.potential.deltas[1].at.value, 3e-9, 1e-13);
    assert!(
        Desk::new("crystal a\n  lattice chain 4 nm\n  delta 1 eV*nm at 0.999\n")
            .troubles()
            .is_empty()
    );
    let desk = Desk::new("crystal a\n  lattice fcc 4 nm\n  atom A at (1.25, 0, 0)\n");
    assert!(matches!(
        desk.troubles()[0].0,
        TroubleKind::OutsideCell { .. }
    ));
    assert_close(
        desk.crystal("a").crystal.potential.atoms[0].at[0].value,
        1e-9,
        1e-13,
    );
}

#[test]
fn in_a_draw_the_period_follows_the_layers() {
    let desk = Desk::new(
        "crystal a\n  lattice chain 8 nm\n  layer 5 nm at 0\n  layer 3 nm ± 0.2 nm at 1 eV\n",
    );
    let nominal = desk.crystal("a").crystal;
    let draw = nominal
        .parameters
        .iter()
        .find(|one| one.kind == crenate::model::ParameterKind::Draw)
        .unwrap();
    let mut setting = Setting::nominal();
    setting.draws.insert(draw.id, 1.0);
    let built = desk.crystal_at("a", &setting);
    assert!(built.troubles.is_empty() && !built.crystal.broken);
    assert_close(built.crystal.period().unwrap().value, 8.2e-9, 1e-14);
}
