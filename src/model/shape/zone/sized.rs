//! Points that move with the lengths of a cell with right angles, and of a rhombohedral one.
//!
//! Formulas and labels as in the paper, in fractions of its primitive reciprocal vectors, for a ≤ b ≤ c.

use super::{Labels, Paper, Runs, slanted};
use crate::model::shape::centring::{Centring, LatticeKind};

/// Ratios this close to where one shape of zone turns into another count as there.
pub(super) const SAME: f64 = 1e-9;

const HALF: f64 = 0.5;
const QUARTER: f64 = 0.25;

/// The points and the path of a kind whose points depend on its sizes; `None` for other kinds, and where the vectors make
/// no cell.
pub(super) fn labels(kind: &LatticeKind, conventional: &[Vec<f64>]) -> Option<Labels> {
    if conventional.len() != kind.dimension {
        return None;
    }
    if kind.angles > 0 {
        return slanted::labels(kind, conventional);
    }
    let lengths: Vec<f64> = conventional.iter().map(|vector| length(vector)).collect();
    // The paper orders the lengths that the centring does not tell apart.
    let ordered = match kind.centring {
        Centring::Base => 2,
        _ if kind.axis => 0,
        _ => kind.dimension,
    };
    let mut order: Vec<usize> = (0..kind.dimension).collect();
    order
        .get_mut(..ordered)?
        .sort_by(|one, other| value(&lengths, *one).total_cmp(&value(&lengths, *other)));
    let sizes: [f64; 3] = std::array::from_fn(|axis| {
        let axis = order.get(axis).copied().unwrap_or(axis);
        value(&lengths, axis)
    });
    let labels = match kind.word {
        "centred-rectangular" => centred_rectangular(sizes),
        "body-tetragonal" => body_tetragonal(sizes),
        "base-orthorhombic" => base_orthorhombic(sizes),
        "body-orthorhombic" => body_orthorhombic(sizes),
        "face-orthorhombic" => face_orthorhombic(sizes),
        _ => return None,
    };
    Some(Labels::placed(labels, |point| {
        on_own_axes(point, kind, &order)
    }))
}

fn value(lengths: &[f64], axis: usize) -> f64 {
    lengths.get(axis).copied().unwrap_or(0.0)
}

pub(super) fn length(vector: &[f64]) -> f64 {
    dot(vector, vector).sqrt()
}

pub(super) fn dot(one: &[f64], other: &[f64]) -> f64 {
    one.iter().zip(other).map(|(one, other)| one * other).sum()
}

/// From the paper's primitive fractions, whose i-th axis is our `order[i]`-th, to our primitive fractions.
fn on_own_axes(point: [f64; 3], kind: &LatticeKind, order: &[usize]) -> Vec<f64> {
    let paper = kind.centring.fractions_to_conventional(&point);
    let mut own = vec![0.0; kind.dimension];
    for (axis, fraction) in order.iter().zip(paper) {
        if let Some(place) = own.get_mut(*axis) {
            *place = fraction;
        }
    }
    kind.centring.fractions_to_primitive(&own)
}

/// The plane k_z = 0 of the base-centred orthorhombic zone.
fn centred_rectangular([a, b, _]: [f64; 3]) -> (Paper, Runs) {
    let zeta = (1.0 + (a / b).powi(2)) / 4.0;
    let points = vec![
        ("S", [0.0, HALF, 0.0]),
        ("Y", [-HALF, HALF, 0.0]),
        ("X", [zeta, zeta, 0.0]),
        ("X1", [-zeta, 1.0 - zeta, 0.0]),
    ];
    (points, &["centre X S", "centre Y X1"])
}

fn base_orthorhombic([a, b, _]: [f64; 3]) -> (Paper, Runs) {
    let zeta = (1.0 + (a / b).powi(2)) / 4.0;
    let points = vec![
        ("R", [0.0, HALF, HALF]),
        ("S", [0.0, HALF, 0.0]),
        ("T", [-HALF, HALF, HALF]),
        ("Y", [-HALF, HALF, 0.0]),
        ("Z", [0.0, 0.0, HALF]),
        ("A", [zeta, zeta, HALF]),
        ("A1", [-zeta, 1.0 - zeta, HALF]),
        ("X", [zeta, zeta, 0.0]),
        ("X1", [-zeta, 1.0 - zeta, 0.0]),
    ];
    (points, &["centre X S R A Z centre Y X1 A1 T Y", "Z T"])
}

fn body_tetragonal([a, _, c]: [f64; 3]) -> (Paper, Runs) {
    let mut points = vec![
        ("N", [0.0, HALF, 0.0]),
        ("P", [QUARTER, QUARTER, QUARTER]),
        ("X", [0.0, 0.0, HALF]),
    ];
    if c < a {
        let eta = (1.0 + (c / a).powi(2)) / 4.0;
        points.extend([
            ("M", [-HALF, HALF, HALF]),
            ("Z", [eta, eta, -eta]),
            ("Z1", [-eta, 1.0 - eta, eta]),
        ]);
        return (points, &["centre X M centre Z P N Z1 M", "X P"]);
    }
    let eta = (1.0 + (a / c).powi(2)) / 4.0;
    let zeta = (a / c).powi(2) / 2.0;
    points.extend([
        ("Z", [HALF, HALF, -HALF]),
        ("Σ", [-eta, eta, eta]),
        ("Σ1", [eta, 1.0 - eta, -eta]),
        ("Y", [-zeta, zeta, HALF]),
        ("Y1", [HALF, HALF, -zeta]),
    ]);
    (points, &["centre X Y Σ centre Z Σ1 N P Y1 Z", "X P"])
}

fn body_orthorhombic([a, b, c]: [f64; 3]) -> (Paper, Runs) {
    let zeta = (1.0 + (a / c).powi(2)) / 4.0;
    let eta = (1.0 + (b / c).powi(2)) / 4.0;
    let delta = (b * b - a * a) / (4.0 * c * c);
    let mu = (a * a + b * b) / (4.0 * c * c);
    let points = vec![
        ("R", [0.0, HALF, 0.0]),
        ("S", [HALF, 0.0, 0.0]),
        ("T", [0.0, 0.0, HALF]),
        ("W", [QUARTER, QUARTER, QUARTER]),
        ("Z", [HALF, HALF, -HALF]),
        ("L", [-mu, mu, HALF - delta]),
        ("L1", [mu, -mu, HALF + delta]),
        ("L2", [HALF - delta, HALF + delta, -mu]),
        ("X", [-zeta, zeta, zeta]),
        ("X1", [zeta, 1.0 - zeta, -zeta]),
        ("Y", [eta, -eta, eta]),
        ("Y1", [1.0 - eta, eta, -eta]),
    ];
    let runs = &["centre X L T W R X1 Z centre Y S W", "L1 Y", "Y1 Z"];
    (points, runs)
}

fn face_orthorhombic([a, b, c]: [f64; 3]) -> (Paper, Runs) {
    let squared = |over: f64, under: f64| (over / under).powi(2);
    // Positive where the hexagonal faces across the shortest vector reach those across the others.
    let balance = 1.0 - squared(a, b) - squared(a, c);
    if balance < -SAME {
        return face_orthorhombic_flat([a, b, c]);
    }
    let zeta = (1.0 + squared(a, b) - squared(a, c)) / 4.0;
    let eta = (1.0 + squared(a, b) + squared(a, c)) / 4.0;
    let mut points = vec![
        ("L", [HALF, HALF, HALF]),
        ("T", [1.0, HALF, HALF]),
        ("Y", [HALF, 0.0, HALF]),
        ("Z", [HALF, HALF, 0.0]),
        ("A", [HALF, HALF + zeta, zeta]),
        ("A1", [HALF, HALF - zeta, 1.0 - zeta]),
        ("X", [0.0, eta, eta]),
    ];
    if balance.abs() <= SAME {
        return (points, &["centre Y T Z centre X A1 Y", "X A Z", "L centre"]);
    }
    points.push(("X1", [1.0, 1.0 - eta, 1.0 - eta]));
    let runs = &["centre Y T Z centre X A1 Y", "T X1", "X A Z", "L centre"];
    (points, runs)
}

/// Where 1/a² < 1/b² + 1/c².
fn face_orthorhombic_flat([a, b, c]: [f64; 3]) -> (Paper, Runs) {
    let squared = |over: f64, under: f64| (over / under).powi(2);
    let eta = (1.0 + squared(a, b) - squared(a, c)) / 4.0;
    let phi = (1.0 + squared(c, b) - squared(c, a)) / 4.0;
    let delta = (1.0 + squared(b, a) - squared(b, c)) / 4.0;
    let points = vec![
        ("L", [HALF, HALF, HALF]),
        ("X", [0.0, HALF, HALF]),
        ("Y", [HALF, 0.0, HALF]),
        ("Z", [HALF, HALF, 0.0]),
        ("C", [HALF, HALF - eta, 1.0 - eta]),
        ("C1", [HALF, HALF + eta, eta]),
        ("D", [HALF - delta, HALF, 1.0 - delta]),
        ("D1", [HALF + delta, HALF, delta]),
        ("H", [1.0 - phi, HALF - phi, HALF]),
        ("H1", [phi, HALF + phi, HALF]),
    ];
    let runs: Runs = &[
        "centre Y C D X centre Z D1 H C",
        "C1 Z",
        "X H1",
        "H Y",
        "L centre",
    ];
    (points, runs)
}
