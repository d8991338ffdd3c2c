//! Tables as piecewise polynomials.
//!
//! The periodic cubic spline through samples (x_i, y_i): with h_i = x_{i+1} − x_i (the last one
//! back to the first sample, one period on) and second derivatives M_i,
//! h_{i−1} M_{i−1} + 2(h_{i−1} + h_i) M_i + h_i M_{i+1} = 6[(y_{i+1} − y_i)/h_i − (y_i − y_{i−1})/h_{i−1}],
//! cyclic in i. The matrix is diagonally dominant; solved by elimination with the
//! Sherman–Morrison correction for its corners (Press et al., *Numerical Recipes*, 3rd ed., §2.7.2).

use crate::model::Table;

/// c0 + c1·t + c2·t² + c3·t³ with t = x − start, for start ≤ x ≤ end; metres and joules.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct CubicPiece {
    /// Where it starts.
    pub start: f64,
    /// Where it ends.
    pub end: f64,
    /// c0 … c3.
    pub coefficients: [f64; 4],
}

impl CubicPiece {
    /// Its value.
    #[must_use]
    pub fn at(&self, x: f64) -> f64 {
        let t = x - self.start;
        let [c0, c1, c2, c3] = self.coefficients;
        c0 + t * (c1 + t * (c2 + t * c3))
    }

    /// Its slope.
    #[must_use]
    pub fn slope_at(&self, x: f64) -> f64 {
        let t = x - self.start;
        let [_, c1, c2, c3] = self.coefficients;
        c1 + t * (2.0 * c2 + 3.0 * t * c3)
    }
}

impl Table {
    /// The pieces between samples over one period from the first sample on; empty where the samples do not fit in it.
    #[must_use]
    pub fn pieces(&self, period: f64) -> Vec<CubicPiece> {
        let Some(first) = self.positions.first() else {
            return Vec::new();
        };
        let mut ends: Vec<f64> = self.positions.iter().skip(1).copied().collect();
        ends.push(first + period);
        let spacings: Vec<f64> = self
            .positions
            .iter()
            .zip(&ends)
            .map(|(a, b)| b - a)
            .collect();
        if spacings.iter().any(|h| !h.is_finite() || *h <= 0.0) {
            return Vec::new();
        }
        let mut nexts: Vec<f64> = self.energies.iter().skip(1).copied().collect();
        nexts.extend(self.energies.first());
        let curvatures = if self.straight {
            vec![0.0; spacings.len()]
        } else {
            curvatures(&spacings, &self.energies, &nexts)
        };
        let mut next_curvatures: Vec<f64> = curvatures.iter().skip(1).copied().collect();
        next_curvatures.extend(curvatures.first());
        let values = self.energies.iter().zip(&nexts);
        let bends = curvatures.iter().zip(&next_curvatures);
        self.positions
            .iter()
            .zip(&ends)
            .zip(values.zip(bends))
            .map(|((start, end), ((y, next), (m, next_m)))| {
                let h = end - start;
                CubicPiece {
                    start: *start,
                    end: *end,
                    coefficients: [
                        *y,
                        (next - y) / h - h * (2.0 * m + next_m) / 6.0,
                        0.5 * m,
                        (next_m - m) / (6.0 * h),
                    ],
                }
            })
            .collect()
    }
}

/// The second derivatives at the samples.
fn curvatures(spacings: &[f64], values: &[f64], nexts: &[f64]) -> Vec<f64> {
    let slopes: Vec<f64> = values
        .iter()
        .zip(nexts)
        .zip(spacings)
        .map(|((y, next), h)| (next - y) / h)
        .collect();
    let before = |list: &[f64]| {
        let mut turned = list.to_vec();
        turned.rotate_right(1);
        turned
    };
    let (left, left_slopes) = (before(spacings), before(&slopes));
    let diagonal: Vec<f64> = left
        .iter()
        .zip(spacings)
        .map(|(a, b)| 2.0 * (a + b))
        .collect();
    let right_side: Vec<f64> = slopes
        .iter()
        .zip(&left_slopes)
        .map(|(here, there)| 6.0 * (here - there))
        .collect();
    cyclic_solve(&left, &diagonal, spacings, &right_side)
}

/// Solves the cyclic system with `below[0]` and `above[last]` in the corners.
fn cyclic_solve(below: &[f64], diagonal: &[f64], above: &[f64], right: &[f64]) -> Vec<f64> {
    let (Some(corner), Some(other_corner), Some(lead)) =
        (above.last(), below.first(), diagonal.first())
    else {
        return Vec::new();
    };
    let gamma = -lead;
    let last = diagonal.len() - 1;
    let changed: Vec<f64> = diagonal
        .iter()
        .enumerate()
        .map(|(i, d)| match i {
            0 => d - gamma,
            _ if i == last => d - corner * other_corner / gamma,
            _ => *d,
        })
        .collect();
    let mut u = vec![0.0; diagonal.len()];
    if let Some(start) = u.first_mut() {
        *start = gamma;
    }
    if let Some(end) = u.last_mut() {
        *end = *corner;
    }
    let x = solve(below, &changed, above, right);
    let z = solve(below, &changed, above, &u);
    let reach = |list: &[f64]| {
        let start = list.first().copied().unwrap_or(0.0);
        let end = list.last().copied().unwrap_or(0.0);
        start + other_corner * end / gamma
    };
    let factor = reach(&x) / (1.0 + reach(&z));
    x.iter().zip(&z).map(|(x, z)| x - factor * z).collect()
}

/// Tridiagonal elimination.
fn solve(below: &[f64], diagonal: &[f64], above: &[f64], right: &[f64]) -> Vec<f64> {
    let rows = below.iter().zip(diagonal).zip(above.iter().zip(right));
    let mut swept: Vec<(f64, f64)> = Vec::with_capacity(diagonal.len());
    for (index, ((a, b), (c, d))) in rows.enumerate() {
        let (c_before, d_before) = match swept.last() {
            Some(before) if index > 0 => *before,
            _ => (0.0, 0.0),
        };
        let a = if index == 0 { 0.0 } else { *a };
        let pivot = b - a * c_before;
        swept.push((c / pivot, (d - a * d_before) / pivot));
    }
    let mut solution = vec![0.0; swept.len()];
    let mut next = 0.0;
    let count = swept.len();
    for (index, ((c, d), x)) in swept.iter().zip(&mut solution).enumerate().rev() {
        let c = if index + 1 == count { 0.0 } else { *c };
        next = d - c * next;
        *x = next;
    }
    solution
}
