//! Plane-wave solves: 8 bands at 100 wave vectors of about 150 waves (see `eigh_ratio.py` for the same matrices by
//! LAPACK), and whole zones.
#![allow(
    missing_docs,
    clippy::unwrap_used,
    clippy::print_stdout,
    clippy::indexing_slicing
)]

use crenate::numerics::planewaves::{
    Accuracy, Budget, Decay, Lattice, Potential, Waves, shapes, solve,
};
use crenate::report::analyst::Effort;
use crenate::report::hover::hover;
use crenate::report::{Analyst, Request, Tier};
use criterion::Criterion;
use nalgebra::Complex;
use rayon::prelude::*;
use std::f64::consts::PI;
use std::hint::black_box;
use std::path::{Path, PathBuf};

#[path = "../tests/memory/mod.rs"]
mod memory;

use memory::Memory;

fn fcc() -> Lattice {
    Lattice::new(&[[0.0, PI, PI], [PI, 0.0, PI], [PI, PI, 0.0]]).unwrap()
}

/// The model of two atoms with these form factors in Ry at 3, 8, 11 and 3, 4, 11, lattice constant in ångström.
fn zincblende(form: [f64; 6], a: f64) -> impl Fn([i32; 3]) -> Complex<f64> + Sync {
    let unit = (2.0 * PI / (a / 0.529177210544)).powi(2);
    move |n| {
        let g = [-n[0] + n[1] + n[2], n[0] - n[1] + n[2], n[0] + n[1] - n[2]];
        let (s, v) = match g.iter().map(|x| x * x).sum::<i32>() {
            3 => (form[0], form[3]),
            4 => (0.0, form[4]),
            8 => (form[1], 0.0),
            11 => (form[2], form[5]),
            _ => (0.0, 0.0),
        };
        let turn = PI / 4.0 * f64::from(g.iter().sum::<i32>());
        Complex::new(s * turn.cos(), -v * turn.sin()) / unit
    }
}

const SILICON: ([f64; 6], f64) = ([-0.21, 0.04, 0.08, 0.0, 0.0, 0.0], 5.43);
const GALLIUM_ARSENIDE: ([f64; 6], f64) = ([-0.23, 0.01, 0.06, 0.07, 0.05, 0.01], 5.64);

/// A hundred wave vectors spread over the zone; the same formula is in `eigh_ratio.py`.
fn hundred() -> Vec<[f64; 3]> {
    (0..100)
        .map(|i| {
            [0.618033988, 0.754877666, 0.569840291]
                .map(|x: f64| (x * f64::from(i + 1)).fract() - 0.5)
        })
        .collect()
}

fn zone(
    bench: &mut Criterion,
    name: &str,
    lattice: &Lattice,
    potential: Potential,
    accuracy: Accuracy,
) {
    bench.bench_function(name, |b| {
        b.iter(|| {
            let budget = Budget::new(&|| false, 3000, 1_000_000);
            black_box(solve(lattice, potential, 4, accuracy, &budget).unwrap())
        })
    });
}

/// `--repeat real 20`: only solves the hundred wave vectors so many times and prints the sum, for `eigh_ratio.py` to
/// take the processor time of.
fn repeat() -> bool {
    let arguments: Vec<String> = std::env::args().collect();
    let Some(at) = arguments.iter().position(|a| a == "--repeat") else {
        return false;
    };
    let (form, a) = if arguments[at + 1] == "real" {
        SILICON
    } else {
        GALLIUM_ARSENIDE
    };
    let components = zincblende(form, a);
    let potential = Potential {
        components: &components,
        decay: Decay::Finite {
            radius: 3.3166247903554,
        },
    };
    let waves = Waves::new(&fcc(), potential).unwrap();
    let budget = Budget::new(&|| false, 3000, 10_000_000);
    for _ in 0..arguments[at + 2].parse::<usize>().unwrap() {
        let sum: f64 = hundred()
            .iter()
            .map(|k| waves.levels_at(*k, 8, 27.3, &budget).unwrap().energies[7])
            .sum();
        println!("{sum:.12}");
    }
    true
}

fn main() {
    if repeat() {
        return;
    }
    let mut bench = Criterion::default().sample_size(10).configure_from_args();
    for (name, (form, a)) in [("real", SILICON), ("complex", GALLIUM_ARSENIDE)] {
        let components = zincblende(form, a);
        let potential = Potential {
            components: &components,
            decay: Decay::Finite {
                radius: 3.3166247903554,
            },
        };
        let waves = Waves::new(&fcc(), potential).unwrap();
        let points = hundred();
        let run = || {
            let budget = Budget::new(&|| false, 3000, 1_000_000);
            points
                .par_iter()
                .map(|k| waves.levels_at(*k, 8, 27.3, &budget).unwrap().energies[7])
                .sum::<f64>()
        };
        let budget = Budget::new(&|| false, 3000, 1_000_000);
        let sizes: usize = points
            .iter()
            .map(|k| waves.levels_at(*k, 8, 27.3, &budget).unwrap().waves.len())
            .sum();
        println!(
            "{name}: {} waves on average, sum of eighth levels {}",
            sizes as f64 / 100.0,
            run()
        );
        bench.bench_function(&format!("8 bands at 100 k, {name}"), |b| {
            b.iter(|| black_box(run()))
        });
        zone(
            &mut bench,
            &format!("zone 3D coarse, {name}"),
            &fcc(),
            potential,
            Accuracy::Coarse,
        );
        zone(
            &mut bench,
            &format!("zone 3D settled to 1e-5, {name}"),
            &fcc(),
            potential,
            Accuracy::Settled(1e-5),
        );
    }
    let square = Lattice::new(&[[1.0, 0.0, 0.0], [0.0, 1.0, 0.0]]).unwrap();
    let wells = |n: [i32; 3]| {
        let g = 2.0 * PI * f64::from(n[0] * n[0] + n[1] * n[1]).sqrt();
        Complex::new(-60.0 * shapes::gaussian(g, 0.15, 2, 1.0), 0.0)
            * Complex::cis(-0.7 * f64::from(n[0] + 2 * n[1]))
            - 20.0 * shapes::gaussian(g, 0.1, 2, 1.0)
    };
    let bound = |g: f64| (-0.5 * (0.1 * g).powi(2)).exp();
    let potential = Potential {
        components: &wells,
        decay: Decay::Bounded(&bound),
    };
    zone(
        &mut bench,
        "zone 2D coarse, two wells",
        &square,
        potential,
        Accuracy::Coarse,
    );
    zone(
        &mut bench,
        "zone 2D settled to 1e-6, two wells",
        &square,
        potential,
        Accuracy::Settled(1e-6),
    );
    hover_cold(&mut bench);
    bench.final_summary();
}

const SHEET: &str = "crystal comb\n  mass 0.067 me\n  lattice hexagonal 20 nm\n  \
    site gaussian -60 meV sigma 2.8 nm at (1/3, 2/3)\n  site gaussian -66 meV sigma 2.8 nm at (2/3, 1/3)\n  filling 2\n";
const TUBES: &str = "crystal box\n  mass 87 u\n  carriers bosons\n  lattice square 532 nm\n  recoil 1064 nm\n  \
    depth (1,0) = 6 Er\n  depth (0,1) = 6 Er\n";
const PROFILE: &str = "crystal waves\n  mass 0.1 me\n  lattice square 4 nm\n  \
    profile = 50 meV*cos(2*pi*x/4 nm)*cos(2*pi*y/4 nm)\n";
const SOLID_PROFILE: &str = "crystal lattice_of_waves\n  mass 0.1 me\n  lattice cubic 4 nm\n  \
    profile = 50 meV*cos(2*pi*x/4 nm)*cos(2*pi*y/4 nm) + 30 meV*cos(2*pi*z/4 nm)\n";
const DISKS: &str = "crystal disks\n  mass 0.067 me\n  lattice hexagonal 30 nm\n  \
    site disk -80 meV radius 6 nm at (0, 0)\n  filling 1\n";
const DIAMOND: &str = "crystal stone\n  lattice fcc 5.5 Å\n  atom A at (0.125, 0.125, 0.125)\n  \
    atom A at (0.875, 0.875, 0.875)\n  formfactor A 3 = -0.22 Ry\n  formfactor A 8 = 0.05 Ry\n  \
    formfactor A 11 = 0.07 Ry\n  filling 8\n  bands 5\n";
const METAL: &str = "crystal foil\n  lattice fcc 4.1 Å\n  atom B at (0, 0, 0)\n  formfactor B 3 = 0.02 Ry\n  \
    formfactor B 4 = 0.05 Ry\n  filling 3\n";

/// A crystal's heading hovered over with nothing known yet: the first answer, and the fine one.
fn hover_cold(bench: &mut Criterion) {
    let rows = [
        ("2D dots", SHEET),
        ("2D tubes", TUBES),
        ("2D profile", PROFILE),
        ("3D profile", SOLID_PROFILE),
        ("2D disks", DISKS),
        ("3D semiconductor", DIAMOND),
        ("3D metal", METAL),
    ];
    for (name, text) in rows {
        let source = Memory::of([("a.cren", text)]);
        let roots = [PathBuf::from("a.cren")];
        for (kind, quick) in [("first", true), ("fine", false)] {
            bench.bench_function(&format!("cold hover {kind}, {name}"), |b| {
                b.iter(|| {
                    let analyst = Analyst::default();
                    let request = Request {
                        source: &source,
                        roots: &roots,
                        depth: Tier::Bands,
                        cancel: &|| false,
                    };
                    let analysis = if quick {
                        analyst.analyse_with(&request, Effort::Quick)
                    } else {
                        analyst.analyse(&request)
                    };
                    let shown = hover(&analyst, &analysis, Path::new("a.cren"), 10).unwrap();
                    assert!(shown.plain.contains("gap 1"), "{}", shown.plain);
                    shown
                })
            });
        }
    }
}
