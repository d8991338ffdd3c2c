//! The cells of a mesh: all wave vectors that have one mesh point as their nearest, cut into simplices.
//!
//! A vector of the mesh's lattice L bounds the cell of the origin where it and its negative are the only shortest of
//! their class modulo 2L (Voronoi, J. reine angew. Math. 134, 198 (1908)). Every facet is cut from its centre, so that the
//! simplices go over into one another under all operations that keep the mesh.

use super::Error;
use super::lattice::{Frame, Lattice, dot};
use super::symmetry::{Rotation, rotate_real};
use rustc_hash::FxHashMap;

/// Corners of a simplex on the axes of the lattice, and its part of the cell.
#[derive(Clone, Copy, Debug)]
pub(super) struct Piece {
    pub corners: [[f64; 3]; 4],
    pub share: f64,
}

/// The simplices of the cell around a point of a mesh with `size` points along the reciprocal vectors; two or three
/// dimensions.
pub(super) fn cell(frame: &Frame, size: [usize; 3]) -> Result<Vec<Piece>, Error> {
    let d = frame.dimension;
    let vectors: Vec<[f64; 3]> = (0..d)
        .map(|i| frame.direct[i].map(|x| x * size[i] as f64))
        .collect();
    let mesh = Frame::new(&Lattice::new(&vectors)?)?;
    let facets: Vec<[f64; 3]> = facets(&mesh)
        .into_iter()
        .map(|v| frame.on_axes(v))
        .collect();
    let corners = corners(&facets, d);
    let mut pieces = Vec::new();
    for facet in &facets {
        pieces.extend(cut(*facet, &corners, d));
    }
    let total: f64 = pieces.iter().map(|piece| piece.share).sum();
    for piece in &mut pieces {
        piece.share /= total;
    }
    // The cell fills space: its volume is that of the mesh's own cell.
    let whole = (2.0 * std::f64::consts::PI).powi(d as i32) / mesh.volume;
    let factorial = if d == 2 { 2.0 } else { 6.0 };
    if ((total / factorial) - whole).abs() <= 1e-6 * whole {
        Ok(pieces)
    } else {
        Err(Error::FlatLattice)
    }
}

/// The pieces that the operations of a group do not make equal, each with the part of the cell that it stands for.
pub(super) fn distinct(frame: &Frame, pieces: &[Piece], group: &[Rotation]) -> Vec<Piece> {
    let d = frame.dimension;
    let reach = pieces
        .iter()
        .map(|piece| dot(middle(piece, d), middle(piece, d)).sqrt())
        .fold(0.0, f64::max);
    // The offset keeps symmetric places off the borders of rounding; a pair missed is only worked through twice.
    let key = |at: [f64; 3]| at.map(|x| (x / reach * 1e5 + 0.3819).round() as i64);
    let mut found: Vec<Piece> = Vec::new();
    let mut seen: FxHashMap<[i64; 3], usize> = FxHashMap::default();
    for piece in pieces {
        let at = middle(piece, d);
        if let Some(index) = seen.get(&key(at)) {
            found[*index].share += piece.share;
            continue;
        }
        for m in group {
            let image = frame.on_axes(frame.wave(rotate_real(m, frame.off_axes(at))));
            seen.entry(key(image)).or_insert(found.len());
        }
        found.push(*piece);
    }
    found
}

fn middle(piece: &Piece, d: usize) -> [f64; 3] {
    std::array::from_fn(|x| piece.corners[..=d].iter().map(|c| c[x]).sum::<f64>() / (d + 1) as f64)
}

/// The vectors whose midplanes bound the cell, Cartesian.
fn facets(mesh: &Frame) -> Vec<[f64; 3]> {
    let d = mesh.dimension;
    let length = |n: [i32; 3]| mesh.square(n.map(f64::from));
    // A class's shortest vector is no longer than one with entries of 0 and 1.
    let longest: f64 = (0..d)
        .map(|i| dot(mesh.reciprocal[i], mesh.reciprocal[i]).sqrt())
        .sum();
    let mut classes: FxHashMap<[i32; 3], (f64, Vec<[i32; 3]>)> = FxHashMap::default();
    for n in mesh.waves([0.0; 3], longest * longest) {
        let class = n.map(|x| x.rem_euclid(2));
        if class == [0; 3] {
            continue;
        }
        let entry = classes.entry(class).or_insert((f64::INFINITY, Vec::new()));
        let square = length(n);
        if square < entry.0 * (1.0 - 1e-9) {
            *entry = (square, vec![n]);
        } else if square <= entry.0 * (1.0 + 1e-9) {
            entry.1.push(n);
        }
    }
    let mut found: Vec<[i32; 3]> = classes
        .into_values()
        .filter(|(_, shortest)| shortest.len() == 2)
        .flat_map(|(_, shortest)| shortest)
        .collect();
    found.sort_unstable();
    found.iter().map(|n| mesh.wave(n.map(f64::from))).collect()
}

/// The points that lie on d midplanes and beyond none.
fn corners(facets: &[[f64; 3]], d: usize) -> Vec<[f64; 3]> {
    let scale = facets.iter().map(|v| dot(*v, *v)).fold(0.0, f64::max);
    let mut found: Vec<[f64; 3]> = Vec::new();
    let mut take = |rows: &[[f64; 3]]| {
        let matrix = nalgebra::DMatrix::from_fn(d, d, |i, j| rows[i][j]);
        let right = nalgebra::DVector::from_fn(d, |i, _| 0.5 * dot(rows[i], rows[i]));
        if matrix.determinant().abs() < 1e-9 * scale.powf(0.5 * d as f64) {
            return;
        }
        let Some(solved) = matrix.lu().solve(&right) else {
            return;
        };
        let at: [f64; 3] = std::array::from_fn(|i| if i < d { solved[i] } else { 0.0 });
        let inside = facets
            .iter()
            .all(|v| dot(*v, at) <= 0.5 * dot(*v, *v) + 1e-8 * scale);
        let known = found.iter().any(|other| apart(*other, at) < 1e-10 * scale);
        if inside && !known {
            found.push(at);
        }
    };
    for (i, a) in facets.iter().enumerate() {
        for (j, b) in facets.iter().enumerate().skip(i + 1) {
            if d == 2 {
                take(&[*a, *b]);
            } else {
                for c in &facets[j + 1..] {
                    take(&[*a, *b, *c]);
                }
            }
        }
    }
    found
}

fn apart(a: [f64; 3], b: [f64; 3]) -> f64 {
    (0..3).map(|x| (a[x] - b[x]).powi(2)).sum()
}

/// The simplices between the origin and one facet; shares are d! volumes.
fn cut(facet: [f64; 3], corners: &[[f64; 3]], d: usize) -> Vec<Piece> {
    let half = 0.5 * dot(facet, facet);
    let mut on: Vec<[f64; 3]> = corners
        .iter()
        .copied()
        .filter(|at| (dot(facet, *at) - half).abs() < 1e-6 * half)
        .collect();
    let Some(first) = on.first().copied() else {
        return Vec::new();
    };
    let count = on.len() as f64;
    let centre: [f64; 3] = std::array::from_fn(|x| on.iter().map(|at| at[x]).sum::<f64>() / count);
    let edges: Vec<([f64; 3], [f64; 3])> = if d == 2 {
        on.iter().map(|at| (*at, [0.0; 3])).collect()
    } else {
        let across: [f64; 3] = std::array::from_fn(|x| first[x] - centre[x]);
        let along = super::lattice::cross(facet, across);
        let turn = |at: &[f64; 3]| {
            let way: [f64; 3] = std::array::from_fn(|x| at[x] - centre[x]);
            (dot(way, along) / dot(facet, facet).sqrt()).atan2(dot(way, across))
        };
        on.sort_by(|a, b| turn(a).total_cmp(&turn(b)));
        (0..on.len())
            .map(|i| (on[i], on[(i + 1) % on.len()]))
            .collect()
    };
    edges
        .into_iter()
        .map(|(one, other)| {
            let share = if d == 2 {
                (centre[0] * one[1] - centre[1] * one[0]).abs()
            } else {
                dot(centre, super::lattice::cross(one, other)).abs()
            };
            Piece {
                corners: [[0.0; 3], centre, one, other],
                share,
            }
        })
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Cells of meshes as fine along every vector: a square and a hexagon, edges cut in two; a cube, each face in four;
    /// the truncated octahedron around a bcc point, six squares in four and eight hexagons in six. The whole point
    /// group leaves one piece of each kind of edge: hexagons border squares and hexagons in turn.
    #[test]
    fn cells_have_the_faces_of_their_lattice() {
        let h = 3f64.sqrt() / 2.0;
        let rows: [(&[[f64; 3]], usize, usize); 5] = [
            (&[[1.0, 0.0, 0.0], [0.0, 1.0, 0.0]], 8, 1),
            (&[[1.0, 0.0, 0.0], [-0.5, h, 0.0]], 12, 1),
            (&[[1.0, 0.0, 0.0], [0.0, 1.0, 0.0], [0.0, 0.0, 1.0]], 24, 1),
            (&[[0.0, 0.5, 0.5], [0.5, 0.0, 0.5], [0.5, 0.5, 0.0]], 72, 3),
            // The same lattice by skew vectors.
            (&[[0.0, 0.5, 0.5], [0.5, 0.5, 1.0], [1.0, 1.5, 1.5]], 72, 3),
        ];
        for (vectors, wanted, kinds) in rows {
            let frame = Frame::new(&Lattice::new(vectors).expect("a lattice")).expect("a frame");
            let size = std::array::from_fn(|i| if i < vectors.len() { 6 } else { 1 });
            let pieces = cell(&frame, size).expect("a cell");
            assert_eq!(pieces.len(), wanted);
            let zero = [([0; 3], nalgebra::Complex::new(0.0, 0.0))];
            let group = super::super::symmetry::find_symmetry(&frame, &zero).operations;
            let own = distinct(&frame, &pieces, &group);
            assert_eq!(own.len(), kinds);
            let total: f64 = own.iter().map(|piece| piece.share).sum();
            assert!((total - 1.0).abs() < 1e-12);
        }
    }

    /// A general lattice: no facet is lost, whatever the sizes along the vectors.
    #[test]
    fn cells_of_skew_lattices_fill_space() {
        let vectors = [[1.0, 0.0, 0.0], [0.4, 1.1, 0.0], [0.3, 0.7, 0.9]];
        let frame = Frame::new(&Lattice::new(&vectors).expect("a lattice")).expect("a frame");
        for size in [[4, 4, 4], [4, 6, 12], [8, 2, 6]] {
            assert!(cell(&frame, size).is_ok_and(|pieces| pieces.len() >= 24));
        }
    }
}
