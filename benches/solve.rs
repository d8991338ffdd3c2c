//! Speed of the one-dimensional kernel: `cargo bench --bench solve`.
#![allow(missing_docs, clippy::unwrap_used)]

use crenate::numerics::{Budget, Cell, Mass, Mesh, Piece, Quantity, hopping, sensitivities, solve};
use criterion::{Criterion, criterion_group, criterion_main};
use std::f64::consts::PI;
use std::hint::black_box;

fn flat(length: f64, potential: f64, mass: f64) -> Piece {
    Piece::Flat {
        length,
        potential,
        mass: Mass::constant(mass),
    }
}

/// V = 10 cos² x over π: mesh and samples included.
fn cosine() -> Cell {
    let potential = |x: f64| 10.0 * x.cos().powi(2);
    let mesh = Mesh::build(PI, &potential, 10.0, &Budget::default()).unwrap();
    let samples: Vec<f64> = mesh.nodes().iter().map(|x| potential(x * PI)).collect();
    Cell {
        pieces: mesh.pieces(&samples, [Mass::constant(1.0); 2]),
    }
}

fn run(c: &mut Criterion) {
    let budget = Budget::default();
    let layers = Cell {
        pieces: vec![flat(1.0, 0.0, 1.0), flat(0.6, 10.0, 1.4)],
    };
    c.bench_function("two layers, 4 bands", |b| {
        b.iter(|| solve(black_box(&layers), 4, &budget).unwrap())
    });
    c.bench_function("cosine with its mesh, 4 bands", |b| {
        b.iter(|| solve(black_box(&cosine()), 4, &budget).unwrap())
    });
    c.bench_function("cosine mesh alone", |b| b.iter(cosine));
    let cell = cosine();
    let quantities: Vec<Quantity> = (0..4)
        .flat_map(|n| {
            [
                Quantity::Bottom(n),
                Quantity::Top(n),
                Quantity::Gap(n),
                Quantity::Width(n),
            ]
        })
        .collect();
    c.bench_function("two layers, all sensitivities of 4 bands", |b| {
        b.iter(|| sensitivities(black_box(&layers), &quantities, &budget).unwrap())
    });
    c.bench_function("cosine, all sensitivities of 4 bands", |b| {
        b.iter(|| sensitivities(black_box(&cell), &quantities, &budget).unwrap())
    });
    c.bench_function("cosine, J1", |b| {
        b.iter(|| hopping(black_box(&cell), 0, 1, &budget).unwrap())
    });
    let thousand: Vec<Piece> = (0..1000)
        .map(|i| {
            flat(
                0.01 + 0.005 * f64::from(i * 37 % 11),
                f64::from(i * 61 % 17),
                0.5 + 0.05 * f64::from(i * 13 % 7),
            )
        })
        .collect();
    let thousand = Cell { pieces: thousand };
    let mut group = c.benchmark_group("long");
    group.sample_size(10);
    group.bench_function("1,000 layers, 4 bands", |b| {
        b.iter(|| solve(black_box(&thousand), 4, &budget).unwrap())
    });
}

criterion_group!(benches, run);
criterion_main!(benches);
