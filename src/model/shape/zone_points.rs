//! Names of the points of the zone.
//!
//! Three dimensions: Setyawan and Curtarolo, Comput. Mater. Sci. 49, 299 (2010),
//! tables 2 to 7 and 11 (from memory; checked by the length of their wave vectors),
//! written here in fractions of the *conventional* reciprocal vectors, so that one
//! table serves each family. Two dimensions: common practice. Kinds whose points depend
//! on their ratios have only their centre here.

use super::centring::LatticeKind;

type Points = &'static [(&'static str, [f64; 3])];

const HALF: f64 = 0.5;
const THIRD: f64 = 1.0 / 3.0;

const CHAIN: Points = &[("edge", [HALF, 0.0, 0.0])];
const SQUARE: Points = &[("X", [HALF, 0.0, 0.0]), ("M", [HALF, HALF, 0.0])];
const RECTANGULAR: Points = &[
    ("X", [HALF, 0.0, 0.0]),
    ("Y", [0.0, HALF, 0.0]),
    ("S", [HALF, HALF, 0.0]),
];
const HEXAGONAL_2D: Points = &[("M", [HALF, 0.0, 0.0]), ("K", [THIRD, THIRD, 0.0])];
const CUBIC: Points = &[
    ("X", [0.0, HALF, 0.0]),
    ("M", [HALF, HALF, 0.0]),
    ("R", [HALF, HALF, HALF]),
];
const FCC: Points = &[
    ("X", [0.0, 1.0, 0.0]),
    ("L", [HALF, HALF, HALF]),
    ("W", [HALF, 1.0, 0.0]),
    ("K", [0.75, 0.75, 0.0]),
    ("U", [0.25, 1.0, 0.25]),
];
const BCC: Points = &[
    ("H", [0.0, 1.0, 0.0]),
    ("N", [HALF, HALF, 0.0]),
    ("P", [HALF, HALF, HALF]),
];
const TETRAGONAL: Points = &[
    ("X", [0.0, HALF, 0.0]),
    ("M", [HALF, HALF, 0.0]),
    ("Z", [0.0, 0.0, HALF]),
    ("R", [0.0, HALF, HALF]),
    ("A", [HALF, HALF, HALF]),
];
const ORTHORHOMBIC: Points = &[
    ("X", [HALF, 0.0, 0.0]),
    ("Y", [0.0, HALF, 0.0]),
    ("Z", [0.0, 0.0, HALF]),
    ("S", [HALF, HALF, 0.0]),
    ("T", [0.0, HALF, HALF]),
    ("U", [HALF, 0.0, HALF]),
    ("R", [HALF, HALF, HALF]),
];
const HEXAGONAL: Points = &[
    ("M", [HALF, 0.0, 0.0]),
    ("K", [THIRD, THIRD, 0.0]),
    ("A", [0.0, 0.0, HALF]),
    ("L", [HALF, 0.0, HALF]),
    ("H", [THIRD, THIRD, HALF]),
];

fn table(kind: &LatticeKind) -> Points {
    match (kind.word, kind.dimension) {
        ("chain", _) => CHAIN,
        ("square", _) => SQUARE,
        ("rectangular", _) => RECTANGULAR,
        ("hexagonal", 2) => HEXAGONAL_2D,
        ("hexagonal", _) => HEXAGONAL,
        ("cubic", _) => CUBIC,
        ("fcc", _) => FCC,
        ("bcc", _) => BCC,
        ("tetragonal", _) => TETRAGONAL,
        ("orthorhombic", _) => ORTHORHOMBIC,
        _ => &[],
    }
}

/// The named points of a kind of lattice, `centre` first, in fractions of its primitive reciprocal vectors.
#[must_use]
pub fn zone_points(kind: &LatticeKind) -> Vec<(&'static str, Vec<f64>)> {
    let centre = ("centre", vec![0.0; kind.dimension]);
    let named = table(kind)
        .iter()
        .map(|(name, conventional)| (*name, to_primitive(kind, conventional)));
    std::iter::once(centre).chain(named).collect()
}

fn to_primitive(kind: &LatticeKind, conventional: &[f64; 3]) -> Vec<f64> {
    let own = conventional.get(..kind.dimension).unwrap_or_default();
    kind.centring.fractions_to_primitive(own)
}

/// The point of that name; the zone centre is also `Γ` or `gamma`.
#[must_use]
pub fn zone_point(kind: &LatticeKind, name: &str) -> Option<Vec<f64>> {
    if matches!(name, "centre" | "Γ" | "gamma") {
        return Some(vec![0.0; kind.dimension]);
    }
    let (_, conventional) = table(kind).iter().find(|(known, _)| *known == name)?;
    Some(to_primitive(kind, conventional))
}
