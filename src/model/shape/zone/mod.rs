//! Names of the points of the zone, and the standard path through them.
//!
//! Three dimensions: Setyawan and Curtarolo, Comput. Mater. Sci. 49, 299 (2010), from memory; checked against the shape
//! of the zone itself (tests/model_zones.rs). Points of a kind that the paper has on several corners which
//! a reciprocal vector joins keep all their names. The paper orders the lengths of a cell; where a file has them in
//! another order, or a slanted cell that is not the shortest, the names go with the paper's cell of the same lattice. The
//! unique axis of `monoclinic` is the second here, the first there.
//!
//! Two dimensions: common practice; `oblique` and `centred-rectangular` are named as the plane across the third axis of
//! the paper's monoclinic and base-centred orthorhombic zones.

mod boundary;
mod fixed;
mod sized;
mod slanted;

use super::centring::LatticeKind;

/// Names with their points, in fractions of the primitive reciprocal vectors.
pub type NamedPoints = Vec<(&'static str, Vec<f64>)>;

/// The named points of a lattice and the path through them.
struct Labels {
    points: NamedPoints,
    runs: Runs,
}

/// Unbroken runs of a path, each the names of its stops.
type Runs = &'static [&'static str];
/// Names with fractions of the paper's primitive reciprocal vectors.
type Paper = Vec<(&'static str, [f64; 3])>;

impl Labels {
    /// Brings points to the fractions of our primitive reciprocal vectors.
    fn placed((points, runs): (Paper, Runs), own: impl Fn([f64; 3]) -> Vec<f64>) -> Self {
        let points = points.into_iter();
        Self {
            points: points.map(|(name, point)| (name, own(point))).collect(),
            runs,
        }
    }
}

/// Whether the points of this kind of lattice, or their names, depend on its lengths and angles.
#[must_use]
pub fn depends_on_sizes(kind: &LatticeKind) -> bool {
    fixed::labels(kind).is_none()
}

fn labels(kind: &LatticeKind, conventional: &[Vec<f64>]) -> Labels {
    let found = fixed::labels(kind).or_else(|| {
        let labels = sized::labels(kind, conventional)?;
        Some(boundary::keep_those_on_it(labels, kind, conventional))
    });
    let Labels { points, runs } = found.unwrap_or(Labels {
        points: Vec::new(),
        runs: &[],
    });
    let centre = ("centre", vec![0.0; kind.dimension]);
    Labels {
        points: std::iter::once(centre).chain(points).collect(),
        runs,
    }
}

/// The named points of a lattice with these conventional vectors, `centre` first, in fractions of its primitive
/// reciprocal vectors. Vectors that make no cell have no points but the centre where [`depends_on_sizes`].
#[must_use]
pub fn zone_points(kind: &LatticeKind, conventional: &[Vec<f64>]) -> NamedPoints {
    labels(kind, conventional).points
}

/// The point of that name; `Σ` is also `Sigma`.
#[must_use]
pub fn zone_point(kind: &LatticeKind, conventional: &[Vec<f64>], name: &str) -> Option<Vec<f64>> {
    let name = match name {
        "Sigma" => "Σ",
        "Sigma1" => "Σ1",
        other => other,
    };
    let points = zone_points(kind, conventional);
    points
        .into_iter()
        .find(|(known, _)| *known == name)
        .map(|(_, point)| point)
}

/// A path through the zone that visits its named points, in unbroken runs of points with their names, in fractions of
/// the primitive reciprocal vectors. Where no points are named, it goes along the reciprocal vectors.
#[must_use]
pub fn zone_path(
    kind: Option<&LatticeKind>,
    conventional: &[Vec<f64>],
    dimension: usize,
) -> Vec<Vec<(String, Vec<f64>)>> {
    let named = kind.map(|kind| labels(kind, conventional));
    let Some(Labels { points, runs }) = named.filter(|labels| !labels.runs.is_empty()) else {
        return vec![unnamed_path(dimension)];
    };
    let stop = |name: &str| {
        let (_, point) = points.iter().find(|(known, _)| *known == name)?;
        Some((name.to_owned(), point.clone()))
    };
    runs.iter()
        .map(|run| run.split(' ').filter_map(stop).collect())
        .collect()
}

/// Out along each reciprocal vector to its middle and back over the middle of all of them.
fn unnamed_path(dimension: usize) -> Vec<(String, Vec<f64>)> {
    let stop = |halves: &[usize]| {
        let point: Vec<f64> = (0..dimension)
            .map(|axis| if halves.contains(&axis) { 0.5 } else { 0.0 })
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

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_lattice_without_names_has_a_path_too() {
        let path = zone_path(None, &[], 2);
        let names: Vec<&str> = path
            .iter()
            .flatten()
            .map(|(name, _)| name.as_str())
            .collect();
        assert_eq!(names, ["centre", "½ 0", "centre", "0 ½", "centre", "½ ½"]);
    }
}
