//! Lengths of reciprocal vectors, for rules.

use crate::model::Crystal;

/// More reciprocal vectors than this along one axis are not looked at.
const MOST: i64 = 40;

/// All |G|² of the lattice up to a little past `q`, in units of (2π/a)², a the length of the first conventional vector;
/// sorted. Nothing where the lattice has no cell, or `q` is past all use.
#[must_use]
pub fn shells(crystal: &Crystal, q: f64) -> Option<Vec<f64>> {
    let vectors: Vec<[f64; 3]> = crystal
        .vectors
        .iter()
        .map(|vector| padded(vector.iter().map(|along| along.value)))
        .collect();
    let first = padded(
        crystal
            .conventional
            .first()?
            .iter()
            .map(|along| along.value),
    );
    let scale = dot(first, first);
    let [b1, b2, b3] = reciprocal(&vectors)?;
    let reach = reach(&vectors, q, scale)?;
    let mut found = Vec::new();
    for n1 in -reach[0]..=reach[0] {
        for n2 in -reach[1]..=reach[1] {
            for n3 in -reach[2]..=reach[2] {
                let g = add(add(times(b1, n1), times(b2, n2)), times(b3, n3));
                found.push(dot(g, g) * scale);
            }
        }
    }
    found.retain(|shell| *shell <= past(q));
    found.sort_by(f64::total_cmp);
    found.dedup_by(|one, other| (*one - *other).abs() < 1e-9);
    Some(found)
}

/// How far past `q` shells are looked for, so that the next one is among them.
fn past(q: f64) -> f64 {
    2.0 * q.abs() + 8.0
}

/// The largest index that a reciprocal vector of that length can have along each axis: |n_i| ≤ |G|·|a_i|/2π.
fn reach(vectors: &[[f64; 3]], q: f64, scale: f64) -> Option<[i64; 3]> {
    let mut reach = [0; 3];
    for (entry, vector) in reach.iter_mut().zip(vectors) {
        let most = (past(q) * dot(*vector, *vector) / scale).sqrt().floor();
        if !most.is_finite() || most > MOST as f64 {
            return None;
        }
        #[expect(clippy::cast_possible_truncation, reason = "at most MOST")]
        let most = most as i64;
        *entry = most;
    }
    Some(reach)
}

/// Reciprocal vectors without the factor 2π; zero past the dimension.
fn reciprocal(vectors: &[[f64; 3]]) -> Option<[[f64; 3]; 3]> {
    let up = [0.0, 0.0, 1.0];
    let [a, b, c] = match vectors {
        [a, b] => [*a, *b, up],
        [a, b, c] => [*a, *b, *c],
        _ => return None,
    };
    let volume = dot(a, cross(b, c));
    if volume == 0.0 || !volume.is_finite() {
        return None;
    }
    let over = |v: [f64; 3]| v.map(|entry| entry / volume);
    let third = if vectors.len() == 2 {
        [0.0; 3]
    } else {
        over(cross(a, b))
    };
    Some([over(cross(b, c)), over(cross(c, a)), third])
}

fn padded(entries: impl Iterator<Item = f64>) -> [f64; 3] {
    let mut all = [0.0; 3];
    for (entry, value) in all.iter_mut().zip(entries) {
        *entry = value;
    }
    all
}

fn dot([a, b, c]: [f64; 3], [d, e, f]: [f64; 3]) -> f64 {
    a * d + b * e + c * f
}

fn cross([a, b, c]: [f64; 3], [d, e, f]: [f64; 3]) -> [f64; 3] {
    [b * f - c * e, c * d - a * f, a * e - b * d]
}

fn add([a, b, c]: [f64; 3], [d, e, f]: [f64; 3]) -> [f64; 3] {
    [a + d, b + e, c + f]
}

fn times(vector: [f64; 3], by: i64) -> [f64; 3] {
    #[expect(clippy::cast_precision_loss, reason = "at most MOST")]
    let by = by as f64;
    vector.map(|entry| entry * by)
}
