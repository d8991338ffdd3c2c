//! The cell of a two- or three-dimensional crystal: reciprocal vectors and volume, for numbers with or without
//! derivatives.
//!
//! aᵢ·bⱼ = 2π δᵢⱼ; in two dimensions the third components are zero.

use std::f64::consts::PI;

use crate::model::{Crystal, Dual, Scalar};

/// A vector in space; entries past the dimension are zero.
pub(super) type Vector<S> = [S; 3];

/// Primitive vectors in metre, reciprocal ones in inverse metre, and the volume (area in two dimensions).
pub(super) struct ZoneCell<S> {
    pub vectors: Vec<Vector<S>>,
    pub reciprocal: Vec<Vector<S>>,
    pub volume: S,
}

/// Σ aᵢbᵢ
pub(super) fn dot<S: Scalar>([a, b, c]: &Vector<S>, [x, y, z]: &Vector<S>) -> S {
    a.times(x).plus(&b.times(y)).plus(&c.times(z))
}

fn cross<S: Scalar>([a, b, c]: &Vector<S>, [x, y, z]: &Vector<S>) -> Vector<S> {
    let minor = |p: &S, q: &S, r: &S, s: &S| p.times(s).minus(&q.times(r));
    [minor(b, c, y, z), minor(c, a, z, x), minor(a, b, x, y)]
}

/// A vector of up to three entries, filled up with zeros.
pub(super) fn filled_up<S: Scalar>(entries: &[Dual]) -> Vector<S> {
    std::array::from_fn(|axis| {
        entries
            .get(axis)
            .map_or_else(|| S::number(0.0), |entry| S::lift(entry))
    })
}

impl<S: Scalar> ZoneCell<S> {
    /// The cell of a crystal of dimension 2 or 3; `None` where it is flat or not finite.
    pub fn new(crystal: &Crystal) -> Option<Self> {
        let vectors: Vec<Vector<S>> = crystal.vectors.iter().map(|row| filled_up(row)).collect();
        let zero = || S::number(0.0);
        let (volume, unscaled): (S, Vec<Vector<S>>) = match vectors.as_slice() {
            [a, b] => {
                let out = [zero(), zero(), S::number(1.0)];
                let volume = dot(&out, &cross(a, b));
                (volume, vec![cross(b, &out), cross(&out, a)])
            }
            [a, b, c] => (
                dot(a, &cross(b, c)),
                vec![cross(b, c), cross(c, a), cross(a, b)],
            ),
            _ => return None,
        };
        if !volume.value().is_normal() {
            return None;
        }
        let reciprocal = unscaled
            .into_iter()
            .map(|row| row.map(|entry| entry.over(&volume).scaled(2.0 * PI)))
            .collect();
        let volume = if volume.value() < 0.0 {
            volume.negative()
        } else {
            volume
        };
        Some(Self {
            vectors,
            reciprocal,
            volume,
        })
    }

    /// Σ kᵢbᵢ
    pub fn wave(&self, k: [f64; 3]) -> Vector<S> {
        combine(&self.reciprocal, k)
    }

    /// Σ fᵢaᵢ
    pub fn place(&self, fractions: [f64; 3]) -> Vector<S> {
        combine(&self.vectors, fractions)
    }
}

fn combine<S: Scalar>(rows: &[Vector<S>], factors: [f64; 3]) -> Vector<S> {
    rows.iter().zip(factors).fold(
        std::array::from_fn(|_| S::number(0.0)),
        |[x, y, z], ([a, b, c], factor)| {
            if factor == 0.0 {
                return [x, y, z];
            }
            [
                x.plus(&a.scaled(factor)),
                y.plus(&b.scaled(factor)),
                z.plus(&c.scaled(factor)),
            ]
        },
    )
}

impl ZoneCell<f64> {
    /// How many indices, at least, on each side of zero hold every reciprocal vector up to this length.
    pub fn reach(&self, radius: f64) -> [i32; 3] {
        reach(&self.vectors, radius)
    }

    /// The same for the lattice vectors up to this length.
    pub fn reach_in_space(&self, radius: f64) -> [i32; 3] {
        reach(&self.reciprocal, radius)
    }

    /// The length up to which this many reciprocal vectors are expected.
    pub fn radius_for(&self, count: f64) -> f64 {
        let ball = count / self.volume;
        2.0 * PI
            * if self.vectors.len() == 2 {
                (ball / PI).sqrt()
            } else {
                (0.75 * ball / PI).cbrt()
            }
    }

    /// All indices with |G| up to this length.
    pub fn indices(&self, radius: f64) -> Vec<[i32; 3]> {
        let [a, b, c] = self.reach(radius);
        let limit = radius * radius * (1.0 + 1e-9);
        let mut found = Vec::new();
        for x in -a..=a {
            for y in -b..=b {
                for z in -c..=c {
                    let wave = self.wave([f64::from(x), f64::from(y), f64::from(z)]);
                    if dot(&wave, &wave) <= limit {
                        found.push([x, y, z]);
                    }
                }
            }
        }
        found
    }
}

/// |nᵢ| = |G·aᵢ|/2π ≤ |G||aᵢ|/2π; zero beyond the dimension.
fn reach(rows: &[Vector<f64>], radius: f64) -> [i32; 3] {
    std::array::from_fn(|axis| {
        rows.get(axis).map_or(0, |row| {
            let most = (radius * dot(row, row).sqrt() / (2.0 * PI) + 1e-9)
                .floor()
                .min(1e6);
            #[expect(clippy::cast_possible_truncation, reason = "at most 1e6")]
            let most = most as i32;
            most
        })
    })
}
