//! Fourteen local form-factor models and nearly-free aluminium against dense LAPACK solves.
#![allow(
    clippy::indexing_slicing,
    clippy::unwrap_used,
    missing_docs,
    clippy::print_stdout
)]

use crenate::numerics::planewaves::{Budget, Decay, Lattice, Potential, Waves};
use nalgebra::Complex;
use serde_json::Value;
use std::f64::consts::PI;

/// fcc with the conventional edge 2π, so that energies are in (2π/a)².
fn fcc() -> Lattice {
    Lattice::new(&[[0.0, PI, PI], [PI, 0.0, PI], [PI, PI, 0.0]]).unwrap()
}

fn cubic(n: [i32; 3]) -> [i32; 3] {
    [-n[0] + n[1] + n[2], n[0] - n[1] + n[2], n[0] + n[1] - n[2]]
}

fn fraction(cubic: [f64; 3]) -> [f64; 3] {
    let [x, y, z] = cubic;
    [0.5 * (y + z), 0.5 * (x + z), 0.5 * (x + y)]
}

fn point(name: &str) -> [f64; 3] {
    fraction(match name {
        "G" => [0.0; 3],
        "X" => [1.0, 0.0, 0.0],
        "L" => [0.5; 3],
        "K" => [0.75, 0.75, 0.0],
        "U" => [1.0, 0.25, 0.25],
        _ => [1.0, 0.5, 0.0],
    })
}

const BOHR: f64 = 0.529177210544;

/// (2π/a)² in Ry, a in ångström.
fn unit(a: f64) -> f64 {
    (2.0 * PI / (a / BOHR)).powi(2)
}

fn reference(text: &str) -> Value {
    serde_json::from_str(text).unwrap()
}

fn numbers(value: &Value) -> Vec<f64> {
    value
        .as_array()
        .unwrap()
        .iter()
        .map(|x| x.as_f64().unwrap())
        .collect()
}

/// V(G) of two atoms at 0 and a/4(111) seen from half-way: symmetric and antisymmetric parts.
fn zincblende(form: &[f64], a: f64) -> impl Fn([i32; 3]) -> Complex<f64> + Sync + use<> {
    let form: Vec<f64> = form.iter().map(|v| v / unit(a)).collect();
    move |n| {
        let g = cubic(n);
        let (s, v) = match g.iter().map(|x| x * x).sum::<i32>() {
            3 => (form[0], form[3]),
            4 => (0.0, form[4]),
            8 => (form[1], 0.0),
            11 => (form[2], form[5]),
            _ => (0.0, 0.0),
        };
        let turn = PI / 4.0 * f64::from(g.iter().sum::<i32>());
        Complex::new(s * turn.cos(), -v * turn.sin())
    }
}

const RADIUS: Decay = Decay::Finite {
    radius: 3.3166247903554,
};

fn endless<'a>() -> Budget<'a> {
    Budget::new(&|| false, 4000, 1_000_000)
}

/// Form factors of Cohen & Bergstresser, Phys. Rev. 141, 789 (1966), Table II; levels computed by
/// `tests/reference/epm_generate.py` at the same cut-offs.
#[test]
fn form_factor_models_agree_with_lapack_at_equal_cut_off() {
    let rows = reference(include_str!("reference/epm_levels.json"));
    let mut worst = (0.0_f64, String::new());
    for (name, row) in rows.as_object().unwrap() {
        let a = row["a"].as_f64().unwrap();
        let form = numbers(&row["form"]);
        let components = zincblende(&form, a);
        let waves = Waves::new(
            &fcc(),
            Potential {
                components: &components,
                decay: RADIUS,
            },
        )
        .unwrap();
        assert_eq!(waves.operations(), 48, "{name}");
        assert_eq!(
            waves.is_real(),
            form[3..].iter().all(|v| *v == 0.0),
            "{name}"
        );
        let budget = endless();
        for (cut, points) in row["cuts"].as_object().unwrap() {
            // The largest matrices for two materials alone: they take a minute otherwise.
            if cut == "80" && name != "Si" && name != "GaAs" {
                continue;
            }
            for (label, levels) in points.as_object().unwrap() {
                let found = waves
                    .levels_at(point(label), 10, cut.parse().unwrap(), &budget)
                    .unwrap();
                assert_eq!(found.waves.len() as u64, levels[0].as_u64().unwrap());
                for (found, wanted) in found.energies.iter().zip(numbers(&levels[1])) {
                    let error = (found - wanted).abs();
                    if error > worst.0 {
                        worst = (
                            error,
                            format!("{name} {label} cut {cut}: {found} for {wanted}"),
                        );
                    }
                }
            }
        }
    }
    println!("worst of all levels: {:.1e} (2π/a)², {}", worst.0, worst.1);
    assert!(worst.0 < 1e-10);
}
