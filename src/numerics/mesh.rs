//! Meshes for smooth stretches, made once per potential and independent of energy.
//!
//! A stretch is halved until on every step the polynomial through 13 Gauss–Legendre nodes follows
//! the potential to the tolerance. The sweep then solves that polynomial exactly, so the only
//! error of the mesh is δV = V − p, and by Weyl's inequality no level, at whatever energy, moves by
//! more than sup |δV|. At moderate energies it is far less: with these nodes δV is orthogonal to
//! polynomials of degree 12, and an error of first order in ∫|ψ|² δV vanishes.
//!
//! Failure: a feature narrower than a fiftieth of the stretch that no node meets is not seen; cut
//! the stretch there. A kink or jump inside is followed by halving down to its place, which costs
//! some 20 to 45 steps; cut there instead.
//!
//! Legendre nodes and discrete orthogonality: DLMF 3.5(v), 18.3.

use super::budget::{Budget, Meter};
use super::cell::{Mass, Piece, SolveError};
use super::double::Double;
use super::scalar::Scalar;
use std::sync::LazyLock;

const NODES: usize = 13;
/// Steps to begin with.
const FIRST_STEPS: usize = 4;
/// Tolerance of a step, relative to the scale.
const TOLERANCE: f64 = 1e-14;
/// Rounding of sampled values that cannot be told from δV, relative to their size.
const NOISE: f64 = 1e-15;
/// Narrowest step, as a fraction of the stretch.
const NARROWEST: f64 = 1e-13;
/// Where each step is checked, t ∈ [−1, 1]: the ends and places between nodes.
const CHECKS: [f64; 6] = [-1.0, -0.72, -0.115, 0.34, 0.87, 1.0];

/// Gauss–Legendre nodes in [−1, 1], and the matrices from samples to Legendre coefficients and
/// to powers of t.
struct Basis {
    nodes: [Double; NODES],
    legendre: [[f64; NODES]; NODES],
    powers: [[Double; NODES]; NODES],
}

/// P₀(x) … P₁₃(x).
fn legendre_values(x: Double) -> [Double; NODES + 1] {
    let mut p = [Double::new(1.0); NODES + 1];
    p[1] = x;
    for k in 1..NODES {
        let next = (x * p[k]).times((2 * k + 1) as f64) - p[k - 1].times(k as f64);
        p[k + 1] = next / Double::new((k + 1) as f64);
    }
    p
}

/// P′_13 from (1 − x²) P′_n = n (P_{n−1} − x P_n).
fn legendre_derivative(x: Double, p: &[Double; NODES + 1]) -> Double {
    let n = NODES as f64;
    (p[NODES - 1] - x * p[NODES]).times(n) / (Double::new(1.0) - x * x)
}

static BASIS: LazyLock<Basis> = LazyLock::new(|| {
    let n = NODES;
    let mut nodes = [Double::ZERO; NODES];
    let mut weights = [Double::ZERO; NODES];
    for i in 0..n {
        let angle = std::f64::consts::PI * (i as f64 + 0.75) / (n as f64 + 0.5);
        let mut x = Double::new(-angle.cos());
        for _ in 0..6 {
            let p = legendre_values(x);
            x = x - p[n] / legendre_derivative(x, &p);
        }
        let slope = legendre_derivative(x, &legendre_values(x));
        nodes[i] = x;
        weights[i] = Double::new(2.0) / ((Double::new(1.0) - x * x) * slope * slope);
    }
    // monomials[k][i]: coefficient of tⁱ in P_k
    let mut monomials = [[Double::ZERO; NODES]; NODES];
    monomials[0][0] = Double::new(1.0);
    monomials[1][1] = Double::new(1.0);
    for k in 1..n - 1 {
        for i in 0..n {
            let raised = if i > 0 {
                monomials[k][i - 1]
            } else {
                Double::ZERO
            };
            let next = raised.times((2 * k + 1) as f64) - monomials[k - 1][i].times(k as f64);
            monomials[k + 1][i] = next / Double::new((k + 1) as f64);
        }
    }
    let mut legendre = [[0.0; NODES]; NODES];
    let mut powers = [[Double::ZERO; NODES]; NODES];
    for j in 0..n {
        let p = legendre_values(nodes[j]);
        for k in 0..n {
            // a_k = (2k+1)/2 Σ_j w_j P_k(x_j) s_j
            let share = (weights[j] * p[k]).times(k as f64 + 0.5);
            legendre[k][j] = share.round();
            for i in 0..n {
                powers[i][j] = powers[i][j] + share * monomials[k][i];
            }
        }
    }
    Basis {
        nodes,
        legendre,
        powers,
    }
});

/// Nodes and weights of Gauss–Legendre quadrature over [−1, 1], exact for degree 2`count` − 1.
pub(crate) fn gauss_legendre(count: usize) -> Vec<(f64, f64)> {
    let n = count as f64;
    let node = |i: usize| {
        let mut x = Double::new(-(std::f64::consts::PI * (i as f64 + 0.75) / (n + 0.5)).cos());
        let mut slope = Double::ZERO;
        for _ in 0..5 {
            let (mut before, mut p) = (Double::new(1.0), x);
            for k in 1..count {
                let next = (x * p).times((2 * k + 1) as f64) - before.times(k as f64);
                (before, p) = (p, next / Double::new((k + 1) as f64));
            }
            slope = (before - x * p).times(n) / (Double::new(1.0) - x * x);
            x = x - p / slope;
        }
        let weight = Double::new(2.0) / ((Double::new(1.0) - x * x) * slope * slope);
        (x.round(), weight.round())
    };
    (0..count).map(node).collect()
}

/// Coefficients of tⁱ of the polynomial through the samples, in double-double: the powers' basis is
/// ill conditioned (about 1e4), and that must not reach the sums.
pub(crate) fn samples_to_polynomial(samples: &[f64]) -> Vec<Double> {
    let row_sum = |row: &[Double; NODES]| {
        row.iter()
            .zip(samples)
            .fold(Double::ZERO, |sum, (weight, s)| sum + weight.times(*s))
    };
    BASIS.powers.iter().map(row_sum).collect()
}

/// All ℓ_j(t): the value at t of the polynomial through samples s_j is Σ ℓ_j(t) s_j.
pub(crate) fn lagrange(t: f64) -> [f64; NODES] {
    let mut result = [0.0; NODES];
    let (mut before, mut p) = (0.0, 1.0);
    for (k, row) in BASIS.legendre.iter().enumerate() {
        for (value, share) in result.iter_mut().zip(row) {
            *value += share * p;
        }
        let k = k as f64;
        (before, p) = (p, ((2.0 * k + 1.0) * t * p - k * before) / (k + 1.0));
    }
    result
}

/// What the next coefficient of a step is likely to be: the size of δV.
pub(crate) fn remainder(samples: &[f64]) -> f64 {
    let coefficient = |k: usize| {
        let row = BASIS.legendre[k].iter().zip(samples);
        row.map(|(share, s)| share * s).sum::<f64>().abs()
    };
    let last = coefficient(NODES - 1).max(coefficient(NODES - 2));
    let before = coefficient(NODES - 3).max(coefficient(NODES - 4));
    if before > 0.0 {
        last * (last / before).min(1.0)
    } else {
        last
    }
}

/// The steps of a smooth stretch.
#[derive(Clone, Debug, PartialEq)]
pub struct Mesh {
    length: f64,
    /// boundaries of the steps as fractions, 0 to 1
    boundaries: Vec<f64>,
    nodes: Vec<f64>,
    work: usize,
}

impl Mesh {
    /// Nodes in each step.
    pub const NODES: usize = NODES;

    /// Cuts a stretch of `length` (same unit as the cell's lengths) into steps on which
    /// `potential` (argument: position from 0 to `length`) is a polynomial to 1e-14 of `scale`, or to
    /// the rounding of its own values. `scale` is the energy in units of which accuracy is wanted,
    /// such as the height of the potential. Errors: `NotFinite` for a value that is not finite,
    /// `BudgetSpent`, `Cancelled`.
    pub fn build(
        length: f64,
        potential: &dyn Fn(f64) -> f64,
        scale: f64,
        budget: &Budget,
    ) -> Result<Mesh, SolveError> {
        if !(length.is_finite() && length > 0.0 && scale.is_finite()) {
            return Err(SolveError::NotFinite);
        }
        let meter = Meter::new(budget);
        let mut boundaries = vec![0.0];
        let first = 1.0 / FIRST_STEPS as f64;
        // intervals still to do, the leftmost last
        let mut open: Vec<(f64, f64)> = (0..FIRST_STEPS)
            .rev()
            .map(|i| (i as f64 * first, first))
            .collect();
        while let Some((start, width)) = open.pop() {
            meter.spend(NODES + CHECKS.len())?;
            if width <= NARROWEST || fits(length, start, width, potential, scale.abs())? {
                boundaries.push(start + width);
            } else {
                let half = 0.5 * width;
                open.push((start + half, half));
                open.push((start, half));
            }
        }
        let nodes = boundaries
            .windows(2)
            .flat_map(|step| step_nodes(step[0], step[1] - step[0]))
            .collect();
        Ok(Mesh {
            length,
            boundaries,
            nodes,
            work: meter.work(),
        })
    }

    /// Samples of the potential that were taken to build it.
    pub fn work(&self) -> usize {
        self.work
    }

    /// Positions of all nodes as fractions of the length, ascending.
    pub fn nodes(&self) -> &[f64] {
        &self.nodes
    }

    /// Boundaries of the steps as fractions of the length, from 0 to 1: one more than the pieces.
    pub fn boundaries(&self) -> &[f64] {
        &self.boundaries
    }

    /// The pieces of the stretch, one a step, from the potential at [`Mesh::nodes`] and the mass at
    /// the stretch's two ends. `samples` has one value a node; missing ones give pieces
    /// that [`solve`](super::solve) refuses.
    pub fn pieces(&self, samples: &[f64], mass: [Mass; 2]) -> Vec<Piece> {
        let at = |x: f64| Mass {
            value: mass[0].value * (1.0 - x) + mass[1].value * x,
            slope: mass[0].slope * (1.0 - x) + mass[1].slope * x,
        };
        let step_samples = samples.chunks(NODES).map(<[f64]>::to_vec);
        let padded = step_samples.chain(std::iter::repeat(Vec::new()));
        self.boundaries
            .windows(2)
            .zip(padded)
            .map(|(step, samples)| Piece::Smooth {
                length: self.length * (step[1] - step[0]),
                samples,
                mass: [at(step[0]), at(step[1])],
            })
            .collect()
    }
}

/// Nodes of a step, as fractions of the stretch.
fn step_nodes(start: f64, width: f64) -> impl Iterator<Item = f64> {
    BASIS
        .nodes
        .iter()
        .map(move |t| start + 0.5 * width * (1.0 + t.high))
}

/// Does the polynomial through a step's nodes follow the potential?
fn fits(
    length: f64,
    start: f64,
    width: f64,
    potential: &dyn Fn(f64) -> f64,
    scale: f64,
) -> Result<bool, SolveError> {
    let mut samples = [0.0; NODES];
    for (sample, x) in samples.iter_mut().zip(step_nodes(start, width)) {
        *sample = potential(x * length);
    }
    let size = samples.iter().fold(0.0f64, |most, s| most.max(s.abs()));
    if !samples.iter().all(|s| s.is_finite()) {
        return Err(SolveError::NotFinite);
    }
    // a narrow step bears little of any |ψ|²
    let weight = (16.0 * width).min(1.0);
    let tolerance = (TOLERANCE * scale / weight).max(NOISE * size);
    if remainder(&samples) > tolerance {
        return Ok(false);
    }
    for (t, row) in CHECKS.iter().zip(CHECK_ROWS.iter()) {
        let exact = potential((start + 0.5 * width * (1.0 + t)) * length);
        if !exact.is_finite() {
            return Err(SolveError::NotFinite);
        }
        let value: f64 = row.iter().zip(&samples).map(|(l, s)| l * s).sum();
        if (value - exact).abs() > 2.0 * tolerance + 8.0 * NOISE * size {
            return Ok(false);
        }
    }
    Ok(true)
}

static CHECK_ROWS: LazyLock<[[f64; NODES]; CHECKS.len()]> = LazyLock::new(|| CHECKS.map(lagrange));
