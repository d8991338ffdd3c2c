//! Potentials: sums over images, splines, waves and stars.
#![allow(clippy::unwrap_used, clippy::indexing_slicing, missing_docs)]

mod model_support;

use std::f64::consts::PI;

use crenate::model::shape::images::sum_of_images;
use crenate::model::{Dual, ParameterId, SiteShape};
use model_support::{Desk, assert_close};

const MEV: f64 = 1.602_176_634e-22;

fn rows(text: &str) -> Vec<Vec<&str>> {
    text.lines()
        .filter(|line| !line.starts_with('#'))
        .map(|line| line.split(',').map(str::trim).collect())
        .collect()
}

fn shape(name: &str, width: f64) -> SiteShape {
    let width = Dual::constant(width);
    match name {
        "gaussian" => SiteShape::Gaussian(width),
        "sech2" => SiteShape::Sech2(width),
        _ => SiteShape::Lorentzian(width),
    }
}

/// Rows by images.py (mpmath, 25 digits).
#[test]
fn sums_over_images_are_exact_to_rounding() {
    let mut worst = (0.0_f64, String::new());
    let rows = rows(include_str!("data/model/images.csv"));
    assert_eq!(rows.len(), 120);
    for row in rows {
        let width: f64 = row[1].parse().unwrap();
        let u: f64 = row[2].parse().unwrap();
        let wanted: f64 = row[3].parse().unwrap();
        let found = sum_of_images(&shape(row[0], width), &u, &1.0).unwrap();
        // The bell itself moves by this share when its argument is rounded.
        let distance = u.min(1.0 - u) / width;
        let steepness = if row[0] == "gaussian" {
            distance * distance
        } else {
            2.0 * distance
        };
        let off = (found - wanted).abs() / wanted / f64::EPSILON / (4.0 + steepness);
        if off > worst.0 {
            worst = (off, row.join(","));
        }
    }
    assert!(worst.0 < 1.0, "{worst:?}");
}

#[test]
fn sums_over_images_have_exact_slopes() {
    let (place, size, cell) = (ParameterId(1), ParameterId(20), ParameterId(30));
    for name in ["gaussian", "sech2", "lorentzian"] {
        for width in [0.1, 0.3, 0.44, 0.46, 0.9] {
            let u = 0.31;
            let at = |u: f64, w: f64, p: f64| sum_of_images(&shape(name, w), &u, &p).unwrap();
            let dual_shape = match name {
                "gaussian" => SiteShape::Gaussian(Dual::parameter(width, size)),
                "sech2" => SiteShape::Sech2(Dual::parameter(width, size)),
                _ => SiteShape::Lorentzian(Dual::parameter(width, size)),
            };
            let dual = sum_of_images(
                &dual_shape,
                &Dual::parameter(u, place),
                &Dual::parameter(1.0, cell),
            )
            .unwrap();
            assert_eq!(dual.value, at(u, width, 1.0));
            let h = 1e-3;
            let slope = |f: &dyn Fn(f64) -> f64| {
                let central = |h: f64| (f(h) - f(-h)) / (2.0 * h);
                (4.0 * central(h / 2.0) - central(h)) / 3.0
            };
            let check = |found: f64, wanted: f64, what: &str| {
                assert!(
                    (found - wanted).abs() < 2e-8,
                    "{name} {width} {what}: {found} {wanted}"
                );
            };
            check(
                dual.slope(place),
                slope(&|d| at(u + d, width, 1.0)),
                "place",
            );
            check(dual.slope(size), slope(&|d| at(u, width + d, 1.0)), "width");
            check(
                dual.slope(cell),
                slope(&|d| at(u, width, 1.0 + d)),
                "period",
            );
        }
    }
}

#[test]
fn boxes_cover_their_inside_and_overlap_their_images() {
    let size = |s: f64| SiteShape::Box(vec![Dual::constant(s)]);
    let at = |s: f64, u: f64| sum_of_images(&size(s), &u, &1.0).unwrap();
    assert_eq!(
        (at(0.4, 0.0), at(0.4, 0.19), at(0.4, 0.21), at(0.4, 0.9)),
        (1.0, 1.0, 0.0, 1.0)
    );
    assert_eq!((at(1.4, 0.5), at(1.4, 0.1)), (2.0, 1.0));
    assert_eq!(
        (at(0.5, 0.25), at(0.5, -0.25), at(3.0, 0.5), at(3.0, 0.2)),
        (0.5, 0.5, 3.0, 3.0)
    );
}

/// Rows by spline.py (scipy.interpolate.CubicSpline, bc_type="periodic").
#[test]
fn a_table_is_its_periodic_spline() {
    let text = "crystal a\n  lattice chain 10 nm\n  table \"samples.csv\" in nm, meV\n";
    let desk = Desk::of(&[
        ("a.cren", text),
        ("samples.csv", include_str!("data/model/samples.csv")),
    ]);
    assert!(desk.troubles().is_empty(), "{:?}", desk.troubles());
    let crystal = desk.crystal("a").crystal;
    let sampler = crystal.sampler().unwrap();
    for row in rows(include_str!("data/model/spline.csv")) {
        let numbers: Vec<f64> = row.iter().map(|text| text.parse().unwrap()).collect();
        let x = numbers[0] * 1e-9;
        assert!((sampler.at(x) / MEV - numbers[1]).abs() < 1e-11, "{row:?}");
        assert!(
            (sampler.slope_at(x) * 1e-9 / MEV - numbers[2]).abs() < 1e-10,
            "{row:?}"
        );
    }
    assert_close(sampler.at(12.1e-9), 1.199_972 * MEV, 1e-12);
}

#[test]
fn a_table_by_line_and_one_with_its_last_sample_equal_to_the_first() {
    let text = "crystal a\n  lattice chain 4 nm\n  table \"t.csv\" in nm, meV by line\n";
    let desk = Desk::of(&[("a.cren", text), ("t.csv", "0,0\n1,10\n2,20\n4,0\n")]);
    assert!(desk.troubles().is_empty(), "{:?}", desk.troubles());
    let crystal = desk.crystal("a").crystal;
    let table = crystal.potential.table.as_ref().unwrap();
    assert_eq!((table.positions.len(), table.closing), (3, Some(0.0)));
    assert_close(crystal.potential_at(0.5e-9), 5.0 * MEV, 1e-13);
    assert_close(crystal.potential_at(3e-9), 10.0 * MEV, 1e-13);
}

/// Each wave's value is the sum of its components.
#[test]
fn components_add_up_to_the_wave() {
    let desk = Desk::new(
        "crystal a
  lattice chain 5 nm
  cosine 2 = 30 meV phase 0.3
  depth 1 = 20 meV phase 0.7
  cosine 0 = 5 meV
  fourier 3 = 4 meV phase 0.2
  fourier -3 = 4 meV phase -0.2
",
    );
    assert!(desk.troubles().is_empty(), "{:?}", desk.troubles());
    let crystal = desk.crystal("a").crystal;
    for x in [0.0, 0.7e-9, 1.9e-9, 4.1e-9] {
        let mut sum = (0.0, 0.0);
        for component in crystal
            .potential
            .waves
            .iter()
            .flat_map(crenate::model::Wave::components)
        {
            let angle = 2.0 * PI * component.index[0] as f64 * x / 5e-9;
            let (c, s) = (angle.cos(), angle.sin());
            sum.0 += component.real.value * c - component.imaginary.value * s;
            sum.1 += component.real.value * s + component.imaginary.value * c;
        }
        let found = crystal.potential_at(x);
        assert!((found - sum.0).abs() < 1e-13 * 30.0 * MEV, "{x}");
        assert!(sum.1.abs() < 1e-13 * 30.0 * MEV);
        let u = 2.0 * PI * x / 5e-9;
        let wanted = 30.0 * (2.0 * u + 0.3).cos()
            + 20.0 * ((u + 0.7) / 2.0).sin().powi(2)
            + 5.0
            + 8.0 * (3.0 * u + 0.2).cos();
        assert!((found / MEV - wanted).abs() < 1e-12 * 30.0, "{x}");
    }
}

#[test]
fn stars_have_all_members_under_the_lattices_symmetry() {
    let members = |lattice: &str, index: &str| {
        let desk = Desk::new(&format!(
            "crystal a\n  lattice {lattice}\n  cosine star {index} = 1 meV\n"
        ));
        assert!(desk.troubles().is_empty(), "{:?}", desk.troubles());
        desk.crystal("a").crystal.potential.waves[0].indices.len()
    };
    // Half of the number of waves in the shell, ±G once: multiplicities of the forms {hkl}, International Tables A (2016),
    // §3.2 (from memory).
    for (lattice, index, count) in [
        ("square 1 nm", "(1, 0)", 2),
        ("square 1 nm", "(1, 1)", 2),
        ("square 1 nm", "(2, 1)", 4),
        ("rectangular 1 nm by 2 nm", "(1, 1)", 2),
        ("oblique 1 nm by 2 nm angle 80 deg", "(1, 1)", 1),
        ("hexagonal 1 nm", "(1, 0)", 3),
        ("hexagonal 1 nm", "(1, 1)", 3),
        ("hexagonal 1 nm", "(2, 1)", 6),
        ("cubic 1 nm", "(1, 0, 0)", 3),
        ("cubic 1 nm", "(1, 1, 0)", 6),
        ("cubic 1 nm", "(1, 2, 3)", 24),
        ("fcc 1 nm", "(1, 1, 1)", 4),
        ("fcc 1 nm", "(2, 0, 0)", 3),
        ("bcc 1 nm", "(1, 1, 0)", 6),
        ("tetragonal 1 nm axis 1.3 nm", "(1, 0, 0)", 2),
        ("tetragonal 1 nm axis 1.3 nm", "(0, 0, 1)", 1),
        ("hexagonal 1 nm axis 1.6 nm", "(1, 0, 1)", 6),
        ("rhombohedral 1 nm angle 80 deg", "(1, 0, 0)", 3),
        ("body-tetragonal 1 nm axis 1.3 nm", "(1, 0, 1)", 4),
        (
            "monoclinic 1 nm by 2 nm by 3 nm angle 100 deg",
            "(1, 1, 0)",
            2,
        ),
        (
            "triclinic 1 nm by 2 nm by 3 nm angles 80 deg, 85 deg, 100 deg",
            "(1, 1, 0)",
            1,
        ),
    ] {
        assert_eq!(members(lattice, index), count, "{lattice} {index}");
    }
}

#[test]
fn a_star_keeps_its_members_within_tolerances() {
    let desk = Desk::new(
        "crystal a\n  lattice vectors (1 nm ± 1 %, 0) (0, 1 nm)\n  cosine star (1, 0) = 1 meV\n",
    );
    let nominal = desk.crystal("a").crystal;
    assert_eq!(nominal.potential.waves[0].indices.len(), 2);
    let draw = nominal
        .parameters
        .iter()
        .find(|one| one.kind == crenate::model::ParameterKind::Draw)
        .unwrap();
    let mut setting = crenate::model::Setting::nominal();
    setting.draws.insert(draw.id, 1.0);
    assert_eq!(
        desk.crystal_at("a", &setting).crystal.potential.waves[0]
            .indices
            .len(),
        2
    );
}

#[test]
fn layers_grade_and_ramp_linearly() {
    let desk = Desk::new(
        "material well
  edge 0
  mass 0.1 me
material wall
  edge 100 meV
  mass 0.2 me
crystal a
  layer 4 nm of well to wall
  layer 2 nm at 100 meV to 20 meV mass 0.3 me
  stack 3 times 1 nm of well, 1 nm of wall
",
    );
    assert!(desk.troubles().is_empty(), "{:?}", desk.troubles());
    let crystal = desk.crystal("a").crystal;
    assert_eq!(crystal.potential.layers.len(), 8);
    assert_close(crystal.period().unwrap().value, 12e-9, 1e-14);
    assert_close(crystal.potential_at(1e-9), 25.0 * MEV, 1e-12);
    assert_close(crystal.potential_at(5e-9), 60.0 * MEV, 1e-12);
    assert_close(crystal.potential_at(7.5e-9), 100.0 * MEV, 1e-12);
    assert_close(crystal.potential_at(-1e-9 + 0.5e-9), 100.0 * MEV, 1e-12);
    let graded = &crystal.potential.layers[0];
    assert_eq!(graded.mass_origin, "of materials well to wall");
    assert_close(
        graded.mass[1].mass.value / graded.mass[0].mass.value,
        2.0,
        1e-14,
    );
    let faces: Vec<f64> = crystal
        .breakpoints()
        .iter()
        .map(|one| (one.value * 1e9).round())
        .collect();
    assert_eq!(faces, [0.0, 4.0, 6.0, 7.0, 8.0, 9.0, 10.0, 11.0]);
}

#[test]
fn pieces_may_start_anywhere() {
    let desk = Desk::new(
        "crystal a
  lattice chain 4 nm
  profile -1 nm to 1 nm = 10 meV/nm * (x + 1 nm)
  profile 1 nm to 3 nm = 10 meV/nm * (3 nm - x)
",
    );
    assert!(desk.troubles().is_empty(), "{:?}", desk.troubles());
    let crystal = desk.crystal("a").crystal;
    assert_close(crystal.potential_at(0.0), 10.0 * MEV, 1e-12);
    assert_close(crystal.potential_at(3.5e-9), 5.0 * MEV, 1e-12);
    assert_close(crystal.potential_at(2.5e-9), 5.0 * MEV, 1e-12);
}

/// The reference page places a delta at `period/2` and a box at `period - 1 nm`.
#[test]
fn the_period_may_place_sites_and_deltas() {
    let layers = "  layer 3 nm at 0 meV\n  layer 5 nm at 90 meV ± 1 meV\n";
    for cell in ["  lattice chain 8 nm\n", layers] {
        let text = format!(
            "crystal a\n{cell}  delta 0.2 eV*nm at period/2\n  \
             site box 30 meV size period/4 at period - 1 nm\n"
        );
        let built = Desk::new(&text).crystal("a");
        assert!(built.troubles.is_empty(), "{:?}", built.troubles);
        let potential = built.crystal.potential;
        assert_close(potential.deltas[0].at.value, 4e-9, 1e-14);
        assert_close(potential.sites[0].at[0].value, 7e-9, 1e-14);
        let SiteShape::Box(sizes) = &potential.sites[0].shape else {
            panic!("a box");
        };
        assert_close(sizes[0].value, 2e-9, 1e-14);
    }
    let square = "crystal a\n  lattice square 5 nm\n  site disk 1 meV radius period/4 at (0, 0)\n";
    assert_eq!(Desk::new(square).crystal("a").troubles.len(), 1);
}
