//! The kinds of lattice, and how their primitive vectors sit in the conventional cell.
//!
//! With conventional vectors a_j, the primitive ones are p_i = Σ_j C_ij·a_j.
//! A wave with indices h_j on the conventional reciprocal vectors has the
//! indices m_i = Σ_j C_ij·h_j on the primitive ones; where these are not whole,
//! the centring forbids the wave.

/// How a conventional cell is centred.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub enum Centring {
    /// Not: the cell is primitive.
    #[default]
    Primitive,
    /// On the face of the first two vectors.
    Base,
    /// In its middle.
    Body,
    /// On all faces.
    Face,
}

/// A kind of lattice and what its statement takes.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct LatticeKind {
    /// Its word.
    pub word: &'static str,
    /// Its dimension.
    pub dimension: usize,
    /// Its centring.
    pub centring: Centring,
    /// How many lengths it takes.
    pub lengths: usize,
    /// Whether it takes a length after `axis`.
    pub axis: bool,
    /// How many angles it takes.
    pub angles: usize,
    /// How it is written.
    pub pattern: &'static str,
}

const fn kind(
    word: &'static str,
    dimension: usize,
    centring: Centring,
    sizes: (usize, bool, usize),
    pattern: &'static str,
) -> LatticeKind {
    LatticeKind {
        word,
        dimension,
        centring,
        lengths: sizes.0,
        axis: sizes.1,
        angles: sizes.2,
        pattern,
    }
}

use Centring::{Base, Body, Face, Primitive};

/// Every kind but `vectors`; `hexagonal` stands twice, without and with its axis.
pub const LATTICE_KINDS: [LatticeKind; 21] = [
    kind("chain", 1, Primitive, (1, false, 0), "lattice chain L"),
    kind("square", 2, Primitive, (1, false, 0), "lattice square L"),
    kind(
        "rectangular",
        2,
        Primitive,
        (2, false, 0),
        "lattice rectangular L by L",
    ),
    kind(
        "centred-rectangular",
        2,
        Base,
        (2, false, 0),
        "lattice centred-rectangular L by L",
    ),
    kind(
        "hexagonal",
        2,
        Primitive,
        (1, false, 0),
        "lattice hexagonal L",
    ),
    kind(
        "oblique",
        2,
        Primitive,
        (2, false, 1),
        "lattice oblique L by L angle A",
    ),
    kind("cubic", 3, Primitive, (1, false, 0), "lattice cubic L"),
    kind("fcc", 3, Face, (1, false, 0), "lattice fcc L"),
    kind("bcc", 3, Body, (1, false, 0), "lattice bcc L"),
    kind(
        "tetragonal",
        3,
        Primitive,
        (1, true, 0),
        "lattice tetragonal L axis L",
    ),
    kind(
        "body-tetragonal",
        3,
        Body,
        (1, true, 0),
        "lattice body-tetragonal L axis L",
    ),
    kind(
        "hexagonal",
        3,
        Primitive,
        (1, true, 0),
        "lattice hexagonal L axis L",
    ),
    kind(
        "rhombohedral",
        3,
        Primitive,
        (1, false, 1),
        "lattice rhombohedral L angle A",
    ),
    kind(
        "orthorhombic",
        3,
        Primitive,
        (3, false, 0),
        "lattice orthorhombic L by L by L",
    ),
    kind(
        "base-orthorhombic",
        3,
        Base,
        (3, false, 0),
        "lattice base-orthorhombic L by L by L",
    ),
    kind(
        "body-orthorhombic",
        3,
        Body,
        (3, false, 0),
        "lattice body-orthorhombic L by L by L",
    ),
    kind(
        "face-orthorhombic",
        3,
        Face,
        (3, false, 0),
        "lattice face-orthorhombic L by L by L",
    ),
    kind(
        "monoclinic",
        3,
        Primitive,
        (3, false, 1),
        "lattice monoclinic L by L by L angle A",
    ),
    kind(
        "base-monoclinic",
        3,
        Base,
        (3, false, 1),
        "lattice base-monoclinic L by L by L angle A",
    ),
    kind(
        "triclinic",
        3,
        Primitive,
        (3, false, 3),
        "lattice triclinic L by L by L angles A, A, A",
    ),
    kind(
        "vectors",
        0,
        Primitive,
        (0, false, 0),
        "lattice vectors (…) (…) …",
    ),
];

/// The kind of that word, with or without an axis.
#[must_use]
pub fn lattice_kind(word: &str, axis: bool) -> Option<&'static LatticeKind> {
    let mut named = LATTICE_KINDS.iter().filter(|kind| kind.word == word);
    let first = named.next()?;
    match named.next() {
        Some(second) if axis => Some(second),
        _ => Some(first),
    }
}

impl Centring {
    /// Twice the matrix C, rows as far as the dimension goes.
    #[must_use]
    pub fn doubled(self) -> [[i64; 3]; 3] {
        match self {
            Primitive => [[2, 0, 0], [0, 2, 0], [0, 0, 2]],
            Base => [[1, -1, 0], [1, 1, 0], [0, 0, 2]],
            Body => [[-1, 1, 1], [1, -1, 1], [1, 1, -1]],
            Face => [[0, 1, 1], [1, 0, 1], [1, 1, 0]],
        }
    }

    /// The inverse of C, which is whole.
    #[must_use]
    pub fn inverse(self) -> [[i64; 3]; 3] {
        match self {
            Primitive => [[1, 0, 0], [0, 1, 0], [0, 0, 1]],
            Base => [[1, 1, 0], [-1, 1, 0], [0, 0, 1]],
            Body => [[0, 1, 1], [1, 0, 1], [1, 1, 0]],
            Face => [[-1, 1, 1], [1, -1, 1], [1, 1, -1]],
        }
    }

    /// Conventional indices as primitive ones; `None` where the centring forbids them.
    #[must_use]
    pub fn to_primitive(self, indices: &[i64]) -> Option<Vec<i64>> {
        let doubled = product(self.doubled(), indices);
        let allowed = doubled.iter().all(|index| index % 2 == 0);
        allowed.then(|| doubled.iter().map(|index| index / 2).collect())
    }

    /// Primitive indices as conventional ones.
    #[must_use]
    pub fn to_conventional(self, indices: &[i64]) -> Vec<i64> {
        product(self.inverse(), indices)
    }

    /// Fractions of the conventional reciprocal vectors as fractions of the primitive ones.
    #[must_use]
    pub fn fractions_to_primitive(self, fractions: &[f64]) -> Vec<f64> {
        let rows = self.doubled();
        rows.iter()
            .take(fractions.len())
            .map(|row| {
                row.iter()
                    .zip(fractions)
                    .map(|(factor, fraction)| {
                        f64::from(i32::try_from(*factor).unwrap_or(0)) * fraction / 2.0
                    })
                    .sum()
            })
            .collect()
    }

    /// Fractions of the primitive reciprocal vectors as fractions of the conventional ones, as many as are given.
    #[must_use]
    pub fn fractions_to_conventional(self, fractions: &[f64]) -> Vec<f64> {
        let rows = self.inverse();
        let along = |row: &[i64; 3]| {
            let parts = row.iter().zip(fractions);
            parts
                .map(|(factor, fraction)| f64::from(i32::try_from(*factor).unwrap_or(0)) * fraction)
                .sum()
        };
        rows.iter().take(fractions.len()).map(along).collect()
    }

    /// What indices must fulfil, in words.
    #[must_use]
    pub fn condition(self, dimension: usize) -> &'static str {
        match (self, dimension) {
            (Primitive, _) => "any whole numbers",
            (Base, _) => "h + k must be even",
            (Body, _) => "h + k + l must be even",
            (Face, _) => "h, k, l must be all even or all odd",
        }
    }
}

fn product(rows: [[i64; 3]; 3], indices: &[i64]) -> Vec<i64> {
    rows.iter()
        .take(indices.len())
        .map(|row| {
            row.iter().zip(indices).fold(0_i64, |sum, (factor, index)| {
                sum.saturating_add(factor.saturating_mul(*index))
            })
        })
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn indices_survive_the_way_to_primitive_and_back() {
        for centring in [Primitive, Base, Body, Face] {
            for h in -3..=3 {
                for k in -3..=3 {
                    for l in -3..=3 {
                        let indices = [h, k, l];
                        if let Some(primitive) = centring.to_primitive(&indices) {
                            assert_eq!(centring.to_conventional(&primitive), indices);
                        }
                    }
                }
            }
        }
    }

    /// Reflection conditions of centred lattices: International Tables for
    /// Crystallography A (2016), table 1.6.4.2 (from memory).
    #[test]
    fn centrings_forbid_what_the_tables_say() {
        assert!(Face.to_primitive(&[1, 0, 0]).is_none());
        assert!(Face.to_primitive(&[1, 1, 1]).is_some());
        assert!(Face.to_primitive(&[2, 0, 0]).is_some());
        assert!(Face.to_primitive(&[1, 1, 0]).is_none());
        assert!(Body.to_primitive(&[1, 0, 0]).is_none());
        assert!(Body.to_primitive(&[1, 1, 0]).is_some());
        assert!(Body.to_primitive(&[1, 1, 1]).is_none());
        assert!(Base.to_primitive(&[1, 0, 0]).is_none());
        assert!(Base.to_primitive(&[1, 1, 1]).is_some());
        assert!(Base.to_primitive(&[0, 1]).is_none());
    }
}
