//! Which rotations leave the bands unchanged, found from numbers alone.
//!
//! A rotation acts on wave vectors, in fractions of the reciprocal vectors, as an integer matrix M that keeps the
//! metric bᵢ·bⱼ. It is a symmetry of the crystal when, with some shift t of the origin (fractions of the cell),
//!
//! ```text
//! V(M n) = V(n)·e^{−2πi (Mn)·t}   for all n,
//! ```
//!
//! and then E(Mk) = E(k). M = −1 with t = 2τ says that τ is a centre of inversion. k → −k is always a symmetry (V is
//! real in space).

use super::lattice::{Frame, dot, real};
use nalgebra::Complex;
use rustc_hash::FxHashMap;
use std::f64::consts::PI;

/// A rotation on wave vectors: (Mk)ᵢ = Σⱼ Mᵢⱼ kⱼ; rows and columns beyond the dimension are zero.
pub(super) type Rotation = [[i32; 3]; 3];

/// Components differ by less than this share of the largest where a symmetry holds.
const SAME: f64 = 1e-10;

/// What leaves the bands unchanged.
#[derive(Clone, Debug)]
pub(super) struct Symmetry {
    /// Rotations with E(Mk) = E(k), k → −k included; the first is the identity.
    pub operations: Vec<Rotation>,
    /// For each of them what it does in space: itself, or its negative where it is that only with time reversed, and the
    /// shift.
    pub in_space: Vec<(Rotation, [f64; 3])>,
    /// A centre of inversion, in fractions of the primitive vectors.
    pub inversion: Option<[f64; 3]>,
}

pub(super) fn rotate(m: &Rotation, n: [i32; 3]) -> [i32; 3] {
    std::array::from_fn(|i| (0..3).map(|j| m[i][j] * n[j]).sum())
}

pub(super) fn rotate_real(m: &Rotation, k: [f64; 3]) -> [f64; 3] {
    std::array::from_fn(|i| (0..3).map(|j| f64::from(m[i][j]) * k[j]).sum())
}

fn identity(dimension: usize) -> Rotation {
    std::array::from_fn(|i| std::array::from_fn(|j| i32::from(i == j && i < dimension)))
}

fn negated(m: &Rotation) -> Rotation {
    m.map(|row| row.map(|x| -x))
}

/// The symmetry of a potential known by its components, in order of rising |G|.
pub(super) fn find_symmetry(frame: &Frame, sample: &[([i32; 3], Complex<f64>)]) -> Symmetry {
    let components = Components::new(sample);
    let identity = identity(frame.dimension);
    let mut operations = vec![identity, negated(&identity)];
    let mut in_space = vec![(identity, [0.0; 3]); 2];
    for m in lattice_rotations(frame) {
        if operations.contains(&m) {
            continue;
        }
        if let Some(shift) = components.shift(&m) {
            operations.extend([m, negated(&m)]);
            in_space.extend([(m, shift); 2]);
        }
    }
    let inversion = components
        .shift(&negated(&identity))
        .map(|t| t.map(|x| 0.5 * x));
    Symmetry {
        operations,
        in_space,
        inversion,
    }
}

/// All integer matrices that keep the reciprocal metric.
fn lattice_rotations(frame: &Frame) -> Vec<Rotation> {
    let d = frame.dimension;
    let unit = |i: usize| std::array::from_fn(|j| i32::from(i == j));
    let metric = |a: [i32; 3], b: [i32; 3]| dot(frame.wave(real(a)), frame.wave(real(b)));
    // The images of each basis vector: all vectors of its length.
    let images: Vec<Vec<[i32; 3]>> = (0..d)
        .map(|i| {
            let square = metric(unit(i), unit(i));
            let mut all = frame.waves([0.0; 3], square);
            all.retain(|n| (metric(*n, *n) - square).abs() <= 1e-9 * square);
            all
        })
        .collect();
    let mut found = Vec::new();
    let mut chosen = Vec::new();
    choose(&images, &mut chosen, &mut |columns| {
        let last = columns.len() - 1;
        let fits = (0..=last).all(|i| {
            let wanted = metric(unit(i), unit(last));
            let scale = (metric(unit(i), unit(i)) * metric(unit(last), unit(last))).sqrt();
            (metric(columns[i], columns[last]) - wanted).abs() <= 1e-9 * scale
        });
        if fits && columns.len() == d {
            let column = |j: usize| if j < d { columns[j] } else { [0; 3] };
            found.push(std::array::from_fn(|i| {
                std::array::from_fn(|j| column(j)[i])
            }));
        }
        fits
    });
    found
}

/// Visits every partial choice of one image an axis; goes deeper where `fits` says so.
fn choose(
    images: &[Vec<[i32; 3]>],
    chosen: &mut Vec<[i32; 3]>,
    fits: &mut dyn FnMut(&[[i32; 3]]) -> bool,
) {
    let Some(next) = images.get(chosen.len()) else {
        return;
    };
    for image in next {
        chosen.push(*image);
        if fits(chosen) {
            choose(images, chosen, fits);
        }
        chosen.pop();
    }
}

/// The components that are not zero.
struct Components {
    values: FxHashMap<[i32; 3], Complex<f64>>,
    /// In order of rising |G|, the strong ones first.
    order: Vec<[i32; 3]>,
    largest: f64,
}

impl Components {
    fn new(sample: &[([i32; 3], Complex<f64>)]) -> Self {
        let largest = sample
            .iter()
            .filter(|(n, _)| *n != [0; 3])
            .map(|(_, v)| v.norm())
            .fold(0.0, f64::max);
        let some = |least: f64, most: f64| {
            sample
                .iter()
                .filter(move |(n, v)| {
                    *n != [0; 3] && v.norm() > least * largest && v.norm() <= most * largest
                })
                .map(|(n, _)| *n)
        };
        let order = some(1e-3, 2.0).chain(some(SAME, 1e-3)).collect();
        Self {
            values: sample.iter().copied().collect(),
            order,
            largest,
        }
    }

    fn get(&self, n: [i32; 3]) -> Complex<f64> {
        self.values.get(&n).copied().unwrap_or_default()
    }

    /// The shift with which M is a symmetry, if there is one.
    fn shift(&self, m: &Rotation) -> Option<[f64; 3]> {
        let sizes = self.order.iter().all(|n| {
            (self.get(rotate(m, *n)).norm() - self.get(*n).norm()).abs() <= SAME * self.largest
        });
        if !sizes {
            return None;
        }
        let rows = self.independent();
        self.candidates(m, &rows)
            .into_iter()
            .find(|t| self.holds(m, *t))
    }

    fn holds(&self, m: &Rotation, t: [f64; 3]) -> bool {
        self.order.iter().all(|n| {
            let image = rotate(m, *n);
            let turned = self.get(*n) * Complex::cis(-2.0 * PI * dot(real(image), t));
            (self.get(image) - turned).norm() <= SAME * self.largest
        })
    }

    /// As many independent indices as there are, early ones first.
    fn independent(&self) -> Vec<[i32; 3]> {
        let mut rows: Vec<[i32; 3]> = Vec::new();
        for n in &self.order {
            let mut more = rows.clone();
            more.push(*n);
            if minor(&more).is_some() {
                rows = more;
            }
            if rows.len() == 3 {
                break;
            }
        }
        rows
    }

    /// All t with (M n)·t ≡ −(arg V(Mn) − arg V(n))/2π modulo 1 for these n. With N the rows Mn and y the right sides,
    /// N t = y + m; the m that matter are a box of |det| a side.
    fn candidates(&self, m: &Rotation, rows: &[[i32; 3]]) -> Vec<[f64; 3]> {
        let images: Vec<[i32; 3]> = rows.iter().map(|n| rotate(m, *n)).collect();
        let Some((axes, det)) = minor(&images) else {
            return vec![[0.0; 3]];
        };
        let sides: Vec<f64> = rows
            .iter()
            .zip(&images)
            .map(|(n, image)| -(self.get(*image).arg() - self.get(*n).arg()) / (2.0 * PI))
            .collect();
        let count = det.abs().min(24);
        let mut found = Vec::new();
        for place in 0..count.pow(rows.len() as u32) {
            let right: Vec<f64> = sides
                .iter()
                .enumerate()
                .map(|(i, y)| y + f64::from(place / count.pow(i as u32) % count))
                .collect();
            found.push(cramer(&images, &axes, f64::from(det), &right));
        }
        found
    }
}

/// Axes on which these rows have a non-zero determinant, and the determinant; `None` where they are dependent.
fn minor(rows: &[[i32; 3]]) -> Option<(Vec<usize>, i32)> {
    let choices: &[&[usize]] = match rows.len() {
        1 => &[&[0], &[1], &[2]],
        2 => &[&[0, 1], &[0, 2], &[1, 2]],
        3 => &[&[0, 1, 2]],
        _ => &[],
    };
    choices
        .iter()
        .map(|axes| (axes.to_vec(), determinant(rows, axes)))
        .filter(|(_, det)| *det != 0)
        .min_by_key(|(_, det)| det.abs())
}

fn determinant(rows: &[[i32; 3]], axes: &[usize]) -> i32 {
    let at = |i: usize, j: usize| rows[i][axes[j]];
    match axes.len() {
        1 => at(0, 0),
        2 => at(0, 0) * at(1, 1) - at(0, 1) * at(1, 0),
        _ => {
            at(0, 0) * (at(1, 1) * at(2, 2) - at(1, 2) * at(2, 1))
                - at(0, 1) * (at(1, 0) * at(2, 2) - at(1, 2) * at(2, 0))
                + at(0, 2) * (at(1, 0) * at(2, 1) - at(1, 1) * at(2, 0))
        }
    }
}

/// Solves N t = right on these axes by Cramer's rule; t is zero on the others.
fn cramer(rows: &[[i32; 3]], axes: &[usize], det: f64, right: &[f64]) -> [f64; 3] {
    let n = axes.len();
    let matrix = nalgebra::DMatrix::from_fn(n, n, |i, j| f64::from(rows[i][axes[j]]));
    let mut t = [0.0; 3];
    for (j, axis) in axes.iter().enumerate() {
        let mut replaced = matrix.clone();
        for i in 0..n {
            replaced[(i, j)] = right[i];
        }
        let value = replaced.determinant() / det;
        t[*axis] = value - value.floor();
    }
    t
}

impl Symmetry {
    /// The operations that keep k up to a reciprocal vector.
    pub fn little_group(&self, k: [f64; 3]) -> Vec<Rotation> {
        let keeps = |m: &&Rotation| {
            let image = rotate_real(m, k);
            (0..3).all(|i| {
                let d = image[i] - k[i];
                (d - d.round()).abs() < 1e-9
            })
        };
        self.operations.iter().filter(keeps).copied().collect()
    }

    /// Whether every way from k is turned by some operation that keeps it: slopes vanish there, where they exist.
    pub fn singles_out(&self, k: [f64; 3]) -> bool {
        let group = self.little_group(k);
        // The mean of the operations takes each way to its part that all of them keep.
        (0..3).all(|i| (0..3).all(|j| group.iter().map(|m| m[i][j]).sum::<i32>() == 0))
    }

    /// The representative of all k that the crystal holds equal: in the first zone, without negative entries where
    /// there is one, then the largest by its entries in turn.
    pub fn canonical(&self, frame: &Frame, k: [f64; 3]) -> [f64; 3] {
        let mut best: Option<[f64; 3]> = None;
        for m in &self.operations {
            for image in frame.nearest(rotate_real(m, k)) {
                if best.is_none_or(|other| precedes(image, other)) {
                    best = Some(image);
                }
            }
        }
        // No negative zero.
        best.unwrap_or(k)
            .map(|x| if x.abs() < 1e-12 { 0.0 } else { x })
    }
}

fn precedes(a: [f64; 3], b: [f64; 3]) -> bool {
    let positive = |k: [f64; 3]| k.iter().all(|x| *x > -1e-7);
    if positive(a) != positive(b) {
        return positive(a);
    }
    (0..3)
        .find(|i| (a[*i] - b[*i]).abs() > 1e-7)
        .is_some_and(|i| a[i] > b[i])
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::numerics::planewaves::Lattice;

    fn frame(vectors: &[[f64; 3]]) -> Frame {
        Frame::new(&Lattice::new(vectors).expect("a lattice")).expect("a frame")
    }

    fn sample(
        frame: &Frame,
        cut: f64,
        v: &dyn Fn([i32; 3]) -> Complex<f64>,
    ) -> Vec<([i32; 3], Complex<f64>)> {
        frame
            .waves([0.0; 3], cut)
            .into_iter()
            .map(|n| (n, v(n)))
            .collect()
    }

    const FCC: [[f64; 3]; 3] = [[0.0, 0.5, 0.5], [0.5, 0.0, 0.5], [0.5, 0.5, 0.0]];

    /// Diamond: 48 operations, centre of inversion between the atoms, wherever the origin is put. With two kinds of
    /// atoms the centre is lost; k → −k still makes 48. Point groups: International Tables A.
    #[test]
    fn diamond_has_a_centre_wherever_its_origin_is() {
        let frame = frame(&FCC);
        for (other, place) in [
            (1.0, [0.0; 3]),
            (1.0, [0.1234, 0.4321, 0.3]),
            (0.5, [0.1, 0.2, 0.0]),
        ] {
            let v = |n: [i32; 3]| {
                let g = frame.square(real(n)).sqrt();
                let atom = |r: [f64; 3]| Complex::cis(-2.0 * PI * dot(real(n), r));
                let second = place.map(|x| x + 0.25);
                (atom(place) + atom(second) * other) * (-0.01 * g * g).exp()
            };
            let found = find_symmetry(&frame, &sample(&frame, 1200.0, &v));
            assert_eq!(found.operations.len(), 48);
            assert_eq!(found.inversion.is_some(), other == 1.0);
            if let Some(origin) = found.inversion {
                for n in frame.waves([0.0; 3], 1200.0) {
                    let turned = v(n) * Complex::cis(2.0 * PI * dot(real(n), origin));
                    assert!(turned.im.abs() < 1e-9, "{n:?}: {turned}");
                }
            }
        }
    }

    #[test]
    fn a_wave_along_one_axis_keeps_the_square_s_mirrors_only() {
        let frame = frame(&[[1.0, 0.0, 0.0], [0.0, 1.0, 0.0]]);
        let v = |n: [i32; 3]| {
            if n == [1, 0, 0] || n == [-1, 0, 0] {
                Complex::new(0.0, f64::from(n[0]))
            } else {
                Complex::default()
            }
        };
        let found = find_symmetry(&frame, &sample(&frame, 500.0, &v));
        assert_eq!(found.operations.len(), 4);
        let origin = found.inversion.expect("a sine has a centre");
        assert!(
            ((origin[0] * 4.0).round() - origin[0] * 4.0).abs() < 1e-12
                && (origin[0] * 4.0).round() as i32 % 2 != 0
        );
    }

    /// An empty lattice keeps the whole holohedry: 48 cubic, 24 hexagonal (3D), 12 hexagonal (2D), 2 triclinic, 2 in 1D.
    #[test]
    fn empty_lattices_have_their_holohedry() {
        let h = 3f64.sqrt() / 2.0;
        let rows: [(&[[f64; 3]], usize); 6] = [
            (&FCC, 48),
            (&[[-0.5, 0.5, 0.5], [0.5, -0.5, 0.5], [0.5, 0.5, -0.5]], 48),
            (&[[1.0, 0.0, 0.0], [-0.5, h, 0.0], [0.0, 0.0, 1.6]], 24),
            (&[[1.0, 0.0, 0.0], [-0.5, h, 0.0]], 12),
            (&[[1.0, 0.0, 0.0], [0.2, 1.1, 0.0], [0.3, 0.35, 0.9]], 2),
            (&[[1.3, 0.0, 0.0]], 2),
        ];
        for (vectors, wanted) in rows {
            let frame = frame(vectors);
            let found = find_symmetry(&frame, &sample(&frame, 500.0, &|_| Complex::default()));
            assert_eq!(found.operations.len(), wanted);
            assert!(found.inversion.is_some());
        }
    }
}
