//! Names of the points of the zone.
//!
//! Three dimensions: Setyawan and Curtarolo, Comput. Mater. Sci. 49, 299 (2010),
//! from memory; checked by the length of their wave vectors, and by what twice or four
//! times they are. They are written here in fractions of the *conventional* reciprocal
//! vectors, so that one table serves each family. Points that move with the ratios of a
//! cell are left out; `Z` of `body-tetragonal` is the paper's where c > a, and its `M`
//! elsewhere. The unique axis of `monoclinic` is the second here, the first there.
//! Two dimensions: common practice; `oblique` and `centred-rectangular` have no names.

use super::centring::LatticeKind;

/// The standard paths through the named points, each an unbroken run. Three dimensions: Setyawan and Curtarolo (from
/// memory); two: common practice.
fn runs(kind: &LatticeKind) -> &'static [&'static str] {
    match (kind.word, kind.dimension) {
        ("chain", _) => &["edge centre edge"],
        ("square", _) => &["centre X M centre"],
        ("rectangular", _) => &["centre X S Y centre"],
        ("hexagonal", 2) => &["centre M K centre"],
        ("hexagonal", _) => &["centre M K centre A L H A", "L M", "K H"],
        ("cubic", _) => &["centre X M centre R X", "M R"],
        ("fcc", _) => &["centre X W K centre L U W L K", "U X"],
        ("bcc", _) => &["centre H N centre P H", "P N"],
        ("tetragonal", _) => &["centre X M centre Z R A Z", "X R", "M A"],
        ("orthorhombic", _) => &["centre X S Y centre Z U R T Z", "Y T", "U X", "S R"],
        ("body-tetragonal", _) => &["centre X P N centre Z"],
        ("rhombohedral", _) => &["L centre Z F centre"],
        ("base-orthorhombic", _) => &["centre S R Z centre Y T"],
        ("body-orthorhombic", _) => &["Z centre S W R centre T W"],
        ("face-orthorhombic", _) => &["centre Y T Z centre L"],
        ("monoclinic", _) => &["centre X A Z centre Y C E D"],
        ("triclinic", _) => &["X centre Y", "L centre Z", "N centre M", "R centre"],
        _ => &[],
    }
}

/// A path through the zone that visits its named points, in unbroken runs of points with their names, in fractions of
/// the primitive reciprocal vectors. Where no points are named, it goes along the reciprocal vectors.
#[must_use]
pub fn zone_path(kind: Option<&LatticeKind>, dimension: usize) -> Vec<Vec<(String, Vec<f64>)>> {
    let named = kind
        .map(|kind| (kind, runs(kind)))
        .filter(|(_, runs)| !runs.is_empty());
    let Some((kind, runs)) = named else {
        return vec![unnamed_path(dimension)];
    };
    let stop = |name: &str| Some((name.to_owned(), zone_point(kind, name)?));
    runs.iter()
        .map(|run| run.split(' ').filter_map(stop).collect())
        .collect()
}

/// Out along each reciprocal vector to its middle and back over the middle of all of them.
fn unnamed_path(dimension: usize) -> Vec<(String, Vec<f64>)> {
    let stop = |halves: &[usize]| {
        let point: Vec<f64> = (0..dimension)
            .map(|axis| if halves.contains(&axis) { HALF } else { 0.0 })
            .collect();
        let name = point.iter().map(|part| if *part > 0.0 { "½" } else { "0" });
        (name.collect::<Vec<_>>().join(" "), point)
    };
    let centre = ("centre".to_owned(), vec![0.0; dimension]);
    let mut path = vec![centre.clone()];
    for axis in 0..dimension {
        path.extend([stop(&[axis]), centre.clone()]);
    }
    path.push(stop(&(0..dimension).collect::<Vec<_>>()));
    path
}

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

const BODY_TETRAGONAL: Points = &[
    ("N", [HALF, 0.0, HALF]),
    ("P", [HALF, HALF, HALF]),
    ("X", [HALF, HALF, 0.0]),
    ("Z", [0.0, 0.0, 1.0]),
];
const RHOMBOHEDRAL: Points = &[
    ("F", [HALF, HALF, 0.0]),
    ("L", [HALF, 0.0, 0.0]),
    ("Z", [HALF, HALF, HALF]),
];
const BASE_ORTHORHOMBIC: Points = &[
    ("R", [HALF, HALF, HALF]),
    ("S", [HALF, HALF, 0.0]),
    ("T", [0.0, 1.0, HALF]),
    ("Y", [0.0, 1.0, 0.0]),
    ("Z", [0.0, 0.0, HALF]),
];
const BODY_ORTHORHOMBIC: Points = &[
    ("R", [HALF, 0.0, HALF]),
    ("S", [0.0, HALF, HALF]),
    ("T", [HALF, HALF, 0.0]),
    ("W", [HALF, HALF, HALF]),
    ("Z", [0.0, 0.0, 1.0]),
];
const FACE_ORTHORHOMBIC: Points = &[
    ("L", [HALF, HALF, HALF]),
    ("T", [1.0, 0.0, 0.0]),
    ("Y", [0.0, 1.0, 0.0]),
    ("Z", [0.0, 0.0, 1.0]),
];
const MONOCLINIC: Points = &[
    ("A", [HALF, HALF, 0.0]),
    ("C", [HALF, 0.0, HALF]),
    ("D", [0.0, HALF, HALF]),
    ("E", [HALF, HALF, HALF]),
    ("X", [HALF, 0.0, 0.0]),
    ("Y", [0.0, 0.0, HALF]),
    ("Z", [0.0, HALF, 0.0]),
];
const TRICLINIC: Points = &[
    ("X", [HALF, 0.0, 0.0]),
    ("Y", [0.0, HALF, 0.0]),
    ("Z", [0.0, 0.0, HALF]),
    ("L", [HALF, HALF, 0.0]),
    ("M", [0.0, HALF, HALF]),
    ("N", [HALF, 0.0, HALF]),
    ("R", [HALF, HALF, HALF]),
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
        ("body-tetragonal", _) => BODY_TETRAGONAL,
        ("rhombohedral", _) => RHOMBOHEDRAL,
        ("base-orthorhombic", _) => BASE_ORTHORHOMBIC,
        ("body-orthorhombic", _) => BODY_ORTHORHOMBIC,
        ("face-orthorhombic", _) => FACE_ORTHORHOMBIC,
        ("monoclinic", _) => MONOCLINIC,
        ("triclinic", _) => TRICLINIC,
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

#[cfg(test)]
mod tests {
    use super::*;
    use crate::model::shape::centring::lattice_kind;

    #[test]
    fn every_stop_of_every_path_is_a_named_point_and_none_is_left_out() {
        for (word, solid) in [
            ("square", false),
            ("rectangular", false),
            ("hexagonal", false),
            ("hexagonal", true),
            ("cubic", true),
            ("fcc", true),
            ("bcc", true),
            ("tetragonal", true),
            ("orthorhombic", true),
            ("body-tetragonal", true),
            ("rhombohedral", true),
            ("base-orthorhombic", true),
            ("body-orthorhombic", true),
            ("face-orthorhombic", true),
            ("monoclinic", true),
            ("triclinic", true),
        ] {
            let kind = lattice_kind(word, solid).expect("a kind of lattice");
            let path = zone_path(Some(kind), kind.dimension);
            let stops: usize = runs(kind).iter().map(|run| run.split(' ').count()).sum();
            assert_eq!(path.iter().map(Vec::len).sum::<usize>(), stops, "{word}");
            for (name, point) in zone_points(kind) {
                let visited = path
                    .iter()
                    .flatten()
                    .any(|(stop, at)| stop == name && *at == point);
                assert!(visited, "{word}: {name}");
            }
        }
    }

    #[test]
    fn a_lattice_without_names_has_a_path_too() {
        let path = zone_path(None, 2);
        let names: Vec<&str> = path
            .iter()
            .flatten()
            .map(|(name, _)| name.as_str())
            .collect();
        assert_eq!(names, ["centre", "½ 0", "centre", "0 ½", "centre", "½ ½"]);
    }

    /// Time reversal leaves these points in place: twice each is a reciprocal vector. P and W are corners, four times.
    #[test]
    fn points_that_do_not_move_with_the_ratios_are_middles_or_corners() {
        for word in [
            "body-tetragonal",
            "rhombohedral",
            "base-orthorhombic",
            "body-orthorhombic",
            "face-orthorhombic",
            "monoclinic",
            "triclinic",
        ] {
            let points = zone_points(lattice_kind(word, true).expect("a kind of lattice"));
            for (index, (name, point)) in points.iter().enumerate() {
                let times = if matches!(*name, "P" | "W") { 4.0 } else { 2.0 };
                let whole = |part: &f64| (times * part - (times * part).round()).abs() < 1e-12;
                assert!(point.iter().all(whole), "{word} {name}: {point:?}");
                let same = |other: &Vec<f64>| {
                    point.iter().zip(other).all(|(one, other)| {
                        let apart = one - other;
                        (apart - apart.round()).abs() < 1e-12
                    })
                };
                let twin = points.iter().skip(index + 1).find(|(_, other)| same(other));
                assert_eq!(twin, None, "{word} {name}");
            }
        }
    }
}
