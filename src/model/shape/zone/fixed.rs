//! Points that stay where they are whatever the lengths of the cell.
//!
//! Written in fractions of the *conventional* reciprocal vectors, so that one table serves each family.

use super::{Labels, Runs};
use crate::model::shape::centring::LatticeKind;

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

/// The points and the path; `None` for kinds whose points depend on their sizes.
pub(super) fn labels(kind: &LatticeKind) -> Option<Labels> {
    let (points, runs): (Points, Runs) = match (kind.word, kind.dimension) {
        ("chain", _) => (CHAIN, &["edge centre edge"]),
        ("square", _) => (SQUARE, &["centre X M centre"]),
        ("rectangular", _) => (RECTANGULAR, &["centre X S Y centre"]),
        ("hexagonal", 2) => (HEXAGONAL_2D, &["centre M K centre"]),
        ("hexagonal", _) => (HEXAGONAL, &["centre M K centre A L H A", "L M", "K H"]),
        ("cubic", _) => (CUBIC, &["centre X M centre R X", "M R"]),
        ("fcc", _) => (FCC, &["centre X W K centre L U W L K", "U X"]),
        ("bcc", _) => (BCC, &["centre H N centre P H", "P N"]),
        ("tetragonal", _) => (TETRAGONAL, &["centre X M centre Z R A Z", "X R", "M A"]),
        ("orthorhombic", _) => {
            let runs = &["centre X S Y centre Z U R T Z", "Y T", "U X", "S R"];
            (ORTHORHOMBIC, runs)
        }
        _ => return None,
    };
    let own = |point: &[f64; 3]| {
        let conventional = point.get(..kind.dimension).unwrap_or_default();
        kind.centring.fractions_to_primitive(conventional)
    };
    let points = points
        .iter()
        .map(|(name, point)| (*name, own(point)))
        .collect();
    Some(Labels { points, runs })
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::model::shape::centring::LATTICE_KINDS;

    #[test]
    fn every_stop_of_every_path_is_a_named_point_and_none_is_left_out() {
        for kind in &LATTICE_KINDS {
            let Some(Labels { points, runs }) = labels(kind) else {
                continue;
            };
            let stops: Vec<&str> = runs.iter().flat_map(|run| run.split(' ')).collect();
            for stop in &stops {
                let named = *stop == "centre" || points.iter().any(|(name, _)| name == stop);
                assert!(named, "{}: {stop}", kind.word);
            }
            for (name, _) in points {
                assert!(stops.contains(&name), "{}: {name}", kind.word);
            }
        }
    }
}
