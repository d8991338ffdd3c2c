//! Lattices of one, two or three dimensions and their reciprocals.
//!
//! Primitive vectors aᵢ and reciprocal vectors bⱼ obey aᵢ·bⱼ = 2π δᵢⱼ, with the bⱼ in the span of the aᵢ. Wave vectors
//! are written in fractions of the bⱼ, cells and shifts in fractions of the aᵢ; entries beyond the dimension are zero.

use super::Error;
use std::f64::consts::PI;

/// A lattice by its primitive vectors, scaled by the caller so that numbers are of order one.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Lattice {
    /// 1, 2 or 3.
    pub dimension: usize,
    /// The primitive vectors, Cartesian; those beyond the dimension are not read.
    pub vectors: [[f64; 3]; 3],
}

pub(super) fn dot(a: [f64; 3], b: [f64; 3]) -> f64 {
    a[0] * b[0] + a[1] * b[1] + a[2] * b[2]
}

/// Integers as floating-point numbers.
pub(super) fn real(n: [i32; 3]) -> [f64; 3] {
    n.map(f64::from)
}

pub(super) fn add(a: [f64; 3], b: [f64; 3]) -> [f64; 3] {
    [a[0] + b[0], a[1] + b[1], a[2] + b[2]]
}

impl Lattice {
    /// A lattice from its primitive vectors; their number is the dimension.
    ///
    /// # Errors
    /// `FlatLattice` where there are not one to three of them, finite and independent.
    pub fn new(vectors: &[[f64; 3]]) -> Result<Self, Error> {
        let mut lattice = Self {
            dimension: vectors.len(),
            vectors: [[0.0; 3]; 3],
        };
        if vectors.is_empty() || vectors.len() > 3 {
            return Err(Error::FlatLattice);
        }
        lattice.vectors[..vectors.len()].copy_from_slice(vectors);
        lattice.check()?;
        Ok(lattice)
    }

    /// Checks that the vectors are finite and independent.
    pub(super) fn check(&self) -> Result<(), Error> {
        let d = self.dimension;
        if d == 0 || d > 3 || self.vectors[..d].iter().flatten().any(|x| !x.is_finite()) {
            return Err(Error::FlatLattice);
        }
        let lengths: f64 = self.vectors[..d]
            .iter()
            .map(|a| dot(*a, *a).sqrt())
            .product();
        let volume = self.volume();
        // A cell this flat in proportion to its edges has no usable reciprocal.
        if !(volume > 1e-10 * lengths && lengths.is_normal() && volume.is_normal()) {
            return Err(Error::FlatLattice);
        }
        Ok(())
    }

    /// Length, area or volume of the primitive cell.
    pub fn volume(&self) -> f64 {
        let [a, b, c] = self.vectors;
        match self.dimension {
            1 => dot(a, a).sqrt(),
            2 => {
                let n = cross(a, b);
                dot(n, n).sqrt()
            }
            _ => dot(a, cross(b, c)).abs(),
        }
    }

    /// The reciprocal vectors, 2π included; rows beyond the dimension are zero.
    pub fn reciprocal(&self) -> [[f64; 3]; 3] {
        let [a, b, c] = self.vectors;
        let unit = |v: [f64; 3], s: f64| v.map(|x| 2.0 * PI * x / s);
        let zero = [0.0; 3];
        match self.dimension {
            1 => [unit(a, dot(a, a)), zero, zero],
            2 => {
                let n = cross(a, b);
                let s = dot(n, n);
                [unit(cross(b, n), s), unit(cross(n, a), s), zero]
            }
            _ => {
                let s = dot(a, cross(b, c));
                [
                    unit(cross(b, c), s),
                    unit(cross(c, a), s),
                    unit(cross(a, b), s),
                ]
            }
        }
    }
}

pub(super) fn cross(a: [f64; 3], b: [f64; 3]) -> [f64; 3] {
    [
        a[1] * b[2] - a[2] * b[1],
        a[2] * b[0] - a[0] * b[2],
        a[0] * b[1] - a[1] * b[0],
    ]
}

/// Orthonormal vectors in the span of independent ones (Gram–Schmidt, twice for rounding).
fn orthonormal(vectors: &[[f64; 3]]) -> [[f64; 3]; 3] {
    let mut axes = [[0.0; 3]; 3];
    for (i, vector) in vectors.iter().enumerate() {
        let mut left = *vector;
        for _ in 0..2 {
            for axis in &axes[..i] {
                let overlap = dot(left, *axis);
                left = std::array::from_fn(|x| left[x] - overlap * axis[x]);
            }
            let length = dot(left, left).sqrt();
            left = left.map(|x| x / length);
        }
        axes[i] = left;
    }
    axes
}

/// A lattice with its reciprocal at hand.
#[derive(Clone, Copy, Debug)]
pub(super) struct Frame {
    pub dimension: usize,
    /// Primitive vectors; zero rows beyond the dimension.
    pub direct: [[f64; 3]; 3],
    /// Reciprocal vectors; zero rows beyond the dimension.
    pub reciprocal: [[f64; 3]; 3],
    /// Volume of the cell.
    pub volume: f64,
    /// Orthonormal Cartesian axes of the span of the lattice; zero rows beyond the dimension.
    pub axes: [[f64; 3]; 3],
}

impl Frame {
    pub fn new(lattice: &Lattice) -> Result<Self, Error> {
        lattice.check()?;
        let mut direct = lattice.vectors;
        for row in &mut direct[lattice.dimension..] {
            *row = [0.0; 3];
        }
        Ok(Self {
            dimension: lattice.dimension,
            direct,
            reciprocal: lattice.reciprocal(),
            volume: lattice.volume(),
            axes: orthonormal(&direct[..lattice.dimension]),
        })
    }

    /// Σ kᵢ bᵢ, Cartesian.
    pub fn wave(&self, k: [f64; 3]) -> [f64; 3] {
        let b = &self.reciprocal;
        std::array::from_fn(|x| k[0] * b[0][x] + k[1] * b[1][x] + k[2] * b[2][x])
    }

    /// The components of a Cartesian vector on the axes.
    pub fn on_axes(&self, vector: [f64; 3]) -> [f64; 3] {
        self.axes.map(|axis| dot(axis, vector))
    }

    /// Fractions of the bᵢ of a wave vector given on the axes.
    pub fn off_axes(&self, parts: [f64; 3]) -> [f64; 3] {
        let wave = std::array::from_fn(|x| (0..3).map(|i| parts[i] * self.axes[i][x]).sum());
        self.fractions(wave)
    }

    /// The largest |bᵢ|², a natural unit of energy.
    pub fn unit(&self) -> f64 {
        self.reciprocal
            .iter()
            .map(|b| dot(*b, *b))
            .fold(0.0, f64::max)
    }

    /// Fractions of the bᵢ of a Cartesian wave vector: k·aᵢ/2π.
    pub fn fractions(&self, wave: [f64; 3]) -> [f64; 3] {
        std::array::from_fn(|i| dot(wave, self.direct[i]) / (2.0 * PI))
    }

    /// |Σ kᵢ bᵢ|².
    pub fn square(&self, k: [f64; 3]) -> f64 {
        let wave = self.wave(k);
        dot(wave, wave)
    }

    /// All n with |k+G|² ≤ `cut` (rounding forgiven), by rising |k+G|², equal ones by their indices.
    pub fn waves(&self, k: [f64; 3], cut: f64) -> Vec<[i32; 3]> {
        let limit = cut * (1.0 + 1e-9);
        let radius = limit.max(0.0).sqrt();
        let range = |i: usize| {
            let length = dot(self.direct[i], self.direct[i]).sqrt() / (2.0 * PI);
            let (low, high) = (-radius * length - k[i], radius * length - k[i]);
            if i < self.dimension {
                (low - 1e-9).ceil() as i32..=(high + 1e-9).floor() as i32
            } else {
                0..=0
            }
        };
        let mut found = Vec::new();
        for n0 in range(0) {
            for n1 in range(1) {
                for n2 in range(2) {
                    let n = [n0, n1, n2];
                    let square = self.square(add(k, real(n)));
                    if square <= limit {
                        found.push((square, n));
                    }
                }
            }
        }
        found.sort_by(|a, b| a.0.total_cmp(&b.0).then(a.1.cmp(&b.1)));
        found.into_iter().map(|(_, n)| n).collect()
    }

    /// The expected number of waves with |k+G|² ≤ `cut`.
    pub fn expected(&self, cut: f64) -> f64 {
        let r = cut.max(0.0).sqrt() / (2.0 * PI);
        let ball = [2.0 * r, PI * r * r, 4.0 / 3.0 * PI * r * r * r][self.dimension - 1];
        ball * self.volume
    }

    /// The cut that is expected to hold `count` waves: the inverse of [`Frame::expected`].
    pub fn cut_for(&self, count: f64) -> f64 {
        let ball = count / self.volume;
        let r = match self.dimension {
            1 => 0.5 * ball,
            2 => (ball / PI).sqrt(),
            _ => (0.75 * ball / PI).cbrt(),
        };
        (2.0 * PI * r).powi(2)
    }

    /// All k+n with the least |k+n|: one inside the zone, several on its surface.
    pub fn nearest(&self, k: [f64; 3]) -> Vec<[f64; 3]> {
        let start: [f64; 3] = std::array::from_fn(|i| {
            if i < self.dimension {
                k[i] - k[i].round()
            } else {
                0.0
            }
        });
        let bound = self.square(start);
        let all = self.waves(start, bound * (1.0 + 1e-9) + 1e-30);
        let best = all
            .iter()
            .map(|n| self.square(add(start, real(*n))))
            .fold(f64::INFINITY, f64::min);
        let scale = self.square([1.0, 0.0, 0.0]);
        all.iter()
            .map(|n| add(start, real(*n)))
            .filter(|p| self.square(*p) <= best + 1e-9 * scale)
            .collect()
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn reciprocal_vectors_are_dual_in_every_dimension() {
        let all = [[0.3, 1.1, -0.2], [0.9, -0.4, 0.5], [0.1, 0.2, 1.3]];
        for d in 1..=3 {
            let lattice = Lattice::new(&all[..d]).expect("a lattice");
            let b = lattice.reciprocal();
            for i in 0..d {
                for j in 0..d {
                    let want = if i == j { 2.0 * PI } else { 0.0 };
                    assert!((dot(lattice.vectors[i], b[j]) - want).abs() < 1e-13);
                }
            }
            let frame = Frame::new(&lattice).expect("a frame");
            let k = std::array::from_fn(|i| if i < d { 0.17 * (i as f64 + 1.0) } else { 0.0 });
            let back = frame.fractions(frame.wave(k));
            for i in 0..d {
                assert!((back[i] - k[i]).abs() < 1e-14);
            }
            assert!((frame.expected(frame.cut_for(77.0)) - 77.0).abs() < 1e-9);
        }
    }

    #[test]
    fn flat_lattices_are_refused() {
        assert_eq!(Lattice::new(&[]), Err(Error::FlatLattice));
        assert_eq!(
            Lattice::new(&[[1.0, 0.0, 0.0], [2.0, 0.0, 0.0]]),
            Err(Error::FlatLattice)
        );
        assert_eq!(
            Lattice::new(&[[f64::NAN, 0.0, 0.0]]),
            Err(Error::FlatLattice)
        );
        assert_eq!(Lattice::new(&[[0.0; 3]]), Err(Error::FlatLattice));
    }

    #[test]
    fn the_nearest_copies_of_a_zone_corner_are_all_found() {
        let h = 3f64.sqrt() / 2.0;
        let frame =
            Frame::new(&Lattice::new(&[[1.0, 0.0, 0.0], [-0.5, h, 0.0]]).expect("hexagonal"))
                .expect("a frame");
        assert_eq!(frame.nearest([1.0 / 3.0, 1.0 / 3.0, 0.0]).len(), 3);
        assert_eq!(frame.nearest([0.5, 0.0, 0.0]).len(), 2);
        assert_eq!(frame.nearest([2.1, -1.05, 0.0]).len(), 1);
    }
}
