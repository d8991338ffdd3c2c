//! Named points of zones against the shape of the zone itself.
#![allow(
    clippy::indexing_slicing,
    clippy::unwrap_used,
    clippy::panic,
    missing_docs
)]

mod model_support;

use crenate::model::TroubleKind;
use model_support::cells::{combine, crystal, dot, reciprocal, values};
use model_support::{Desk, only_trouble};

/// Reciprocal vectors as near to a point as its nearest one, the point's own distances in the shortest vector's.
fn ties(point: &[f64], vectors: &[Vec<f64>]) -> usize {
    let reach = 6_i32;
    let side = 2 * reach + 1;
    let dimension = vectors.len();
    let place = combine(vectors, point);
    let mut far: Vec<f64> = (0..side.pow(dimension as u32))
        .map(|index| {
            let steps: Vec<f64> = (0..dimension)
                .map(|axis| f64::from(index / side.pow(axis as u32) % side - reach))
                .collect();
            let wave = combine(vectors, &steps);
            place.iter().zip(&wave).map(|(k, g)| (k - g).powi(2)).sum()
        })
        .collect();
    far.sort_by(f64::total_cmp);
    let shortest = vectors
        .iter()
        .map(|b| dot(b, b))
        .fold(f64::INFINITY, f64::min);
    far.iter()
        .filter(|one| **one - far[0] < 1e-9 * shortest)
        .count()
}

/// A lattice, and the names that move with its ratios: Setyawan and Curtarolo, Comput. Mater. Sci. 49, 299 (2010), from
/// memory, one row for each of the paper's cases. The second row of a case has the same lattice in another choice of cell.
const LATTICES: &[(&str, &str)] = &[
    ("centred-rectangular 3 nm by 5 nm", "X X1"),
    ("centred-rectangular 5 nm by 3 nm", "X X1"),
    ("oblique 3 nm by 5 nm angle 75 deg", "H H1 H2"),
    ("oblique 5 nm by 3 nm angle 125 deg", "H H1 H2"),
    ("body-tetragonal 3 nm axis 2 nm", "Z Z1"),
    ("body-tetragonal 3 nm axis 5 nm", "Σ Σ1 Y Y1"),
    ("rhombohedral 3 nm angle 50 deg", "B B1 P P1 P2 Q X"),
    ("rhombohedral 3 nm angle 115 deg", "P P1 Q Q1"),
    ("base-orthorhombic 3 nm by 4 nm by 5 nm", "A A1 X X1"),
    ("base-orthorhombic 5 nm by 4 nm by 3 nm", "A A1 X X1"),
    (
        "body-orthorhombic 3 nm by 4 nm by 5 nm",
        "L L1 L2 X X1 Y Y1",
    ),
    (
        "body-orthorhombic 5 nm by 3 nm by 4 nm",
        "L L1 L2 X X1 Y Y1",
    ),
    ("face-orthorhombic 3 nm by 6 nm by 7 nm", "A A1 X X1"),
    ("face-orthorhombic 6 nm by 5 nm by 7 nm", "C C1 D D1 H H1"),
    ("face-orthorhombic 12 nm by 20 nm by 15 nm", "A A1 X"),
    (
        "monoclinic 3 nm by 4 nm by 5 nm angle 75 deg",
        "H H1 H2 M M1 M2",
    ),
    (
        "monoclinic 5 nm by 4 nm by 3 nm angle 110 deg",
        "H H1 H2 M M1 M2",
    ),
    (
        "monoclinic 3 nm by 4 nm by 9 nm angle 40 deg",
        "H H1 H2 M M1 M2",
    ),
    (
        "base-monoclinic 5 nm by 3 nm by 6 nm angle 80 deg",
        "F F1 F2 I I1 X X1 X2",
    ),
    (
        "base-monoclinic 5 nm by 3 nm by 6 nm angle 100 deg",
        "F F1 F2 I I1 X X1 X2",
    ),
    (
        "base-monoclinic 3 nm by 5 nm by 6 nm angle 80 deg",
        "H H1 H2 Y Y1 Y2 Y3 F F1 F2",
    ),
    (
        "base-monoclinic 4 nm by 5 nm by 10 nm angle 40 deg",
        "H H1 H2 Y Y1 Y2 Y3 F F1 F2",
    ),
    (
        "base-monoclinic 4.9 nm by 5 nm by 6 nm angle 65 deg",
        "H H1 H2 Y Y1 Y2 Y3 I I1 F F1 F2",
    ),
];

/// A symmetric point lies on an edge of the zone or in a corner, or is the middle between two reciprocal vectors.
#[test]
fn points_that_move_lie_on_edges_and_in_corners_of_the_zone() {
    for (lattice, moving) in LATTICES {
        let crystal = crystal(lattice);
        let vectors = reciprocal(&values(&crystal.vectors));
        let points = crystal.zone_points();
        for name in moving.split(' ') {
            let found = points.iter().find(|(known, _)| *known == name);
            let (_, point) = found.unwrap_or_else(|| panic!("{lattice} has no {name}"));
            let ties = ties(point, &vectors);
            assert!(ties >= 3, "{lattice} {name} {point:?}: {ties}");
        }
        for (name, point) in &points {
            let halved = point
                .iter()
                .all(|part| (2.0 * part - (2.0 * part).round()).abs() < 1e-12);
            let still = halved || *name == "P" || *name == "W" || *name == "centre";
            let moves = moving.split(' ').any(|known| known == *name);
            assert!(still || moves, "{lattice} {name} {point:?}");
        }
    }
}

/// The direction of a point in the plane, in radians; both zeros count as one.
fn angle(point: &[f64]) -> f64 {
    (point[1] + 0.0).atan2(point[0])
}

/// Every corner of a plane's zone is one of H, H1, H2, X, X1 or their opposites.
#[test]
fn corners_of_planes_are_all_named() {
    for (lattice, names) in &LATTICES[..4] {
        let crystal = crystal(lattice);
        let vectors = reciprocal(&values(&crystal.vectors));
        let mut corners: Vec<Vec<f64>> = Vec::new();
        for name in names.split(' ') {
            let points = crystal.zone_points();
            let (_, point) = points.iter().find(|(known, _)| *known == name).unwrap();
            for sign in [1.0, -1.0] {
                corners.extend(
                    inside(point, &vectors)
                        .iter()
                        .map(|k| k.iter().map(|part| sign * part).collect()),
                );
            }
        }
        corners.sort_by(|a, b| angle(a).total_cmp(&angle(b)));
        corners.dedup_by(|a, b| {
            a.iter()
                .zip(b.iter())
                .map(|(a, b)| (a - b).abs())
                .sum::<f64>()
                < 1e-3
        });
        // The area within the corners (Gauss's formula) is the whole zone's: none is missing, none too many.
        let area: f64 = (0..corners.len())
            .map(|i| (&corners[i], &corners[(i + 1) % corners.len()]))
            .map(|(a, b)| 0.5 * (a[0] * b[1] - a[1] * b[0]))
            .sum();
        let whole = (vectors[0][0] * vectors[1][1] - vectors[0][1] * vectors[1][0]).abs();
        assert_eq!(corners.len(), 6, "{lattice}: {corners:?}");
        assert!(
            (area / whole - 1.0).abs() < 1e-9,
            "{lattice}: {area} of {whole}"
        );
    }
}

/// Where a point lies in the first zone: everywhere that a reciprocal vector moves it without bringing it farther from the origin.
fn inside(point: &[f64], vectors: &[Vec<f64>]) -> Vec<Vec<f64>> {
    let places: Vec<Vec<f64>> = (-6..=6)
        .flat_map(|u| (-6..=6).map(move |v| [f64::from(u), f64::from(v)]))
        .map(|steps| combine(vectors, &[point[0] + steps[0], point[1] + steps[1]]))
        .collect();
    let least = places
        .iter()
        .map(|k| dot(k, k))
        .fold(f64::INFINITY, f64::min);
    places
        .into_iter()
        .filter(|k| dot(k, k) < least * (1.0 + 1e-9))
        .collect()
}

#[test]
fn paths_go_along_named_points_alone() {
    for (lattice, _) in LATTICES {
        let crystal = crystal(lattice);
        let points = crystal.zone_points();
        let path = crystal.zone_path();
        for run in &path {
            assert!(run.len() > 1, "{lattice}: {run:?}");
            for stop in run {
                assert!(
                    points
                        .iter()
                        .any(|(name, point)| *name == stop.0 && *point == stop.1),
                    "{lattice}: {stop:?}"
                );
            }
        }
    }
}

/// The six labels of TRIM points of the two triclinic cases belong to different points: the third axis's middle is Z or M.
#[test]
fn triclinic_names_go_by_the_angles_between_reciprocal_vectors() {
    for (angles, name) in [
        ("80 deg, 75 deg, 70 deg", "Z"),
        ("100 deg, 105 deg, 95 deg", "M"),
    ] {
        let crystal = crystal(&format!("triclinic 3 nm by 4 nm by 5 nm angles {angles}"));
        let points = crystal.zone_points();
        let third = points.iter().find(|(_, point)| *point == [0.0, 0.0, 0.5]);
        assert_eq!(third.map(|(name, _)| *name), Some(name), "{angles}");
    }
}

#[test]
fn names_that_move_can_be_asked_for() {
    let text = "crystal a\n  lattice oblique 3 nm by 5 nm angle 75 deg\n  measure m = level 1 at H\n\
                crystal b\n  lattice body-tetragonal 3 nm axis 5 nm\n  measure m = level 1 at Sigma - level 1 at Σ\n  \
                measure n = level 1 at H1 of a\n";
    let desk = Desk::new(text);
    assert!(desk.troubles().is_empty(), "{:?}", desk.troubles());
}

#[test]
fn a_name_of_another_shape_of_zone_is_unknown() {
    let text =
        "crystal a\n  lattice body-tetragonal 5 nm axis 3 nm\n  measure m = level 1 at Sigma\n";
    let (kind, _) = only_trouble(text);
    assert!(
        matches!(
            kind,
            TroubleKind::UnknownName {
                wanted: "zone point",
                ..
            }
        ),
        "{kind:?}"
    );
}

/// What is wrong with a lattice is said once, and not again by who speaks of its points.
#[test]
fn a_broken_lattice_is_told_where_it_stands() {
    let text =
        "crystal a\n  lattice oblique 3 nm by 5 eV angle 75 deg\n  measure m = level 1 at H\n";
    let (kind, _) = only_trouble(text);
    assert!(!matches!(kind, TroubleKind::UnknownName { .. }), "{kind:?}");
}
