//! The functions of the transfer matrices, entire in z = m(V − E)l².
//!
//! f₀(z) = cosh √z, f₁(z) = sinh √z / √z, in general f_n(z) = ₀F₁(; n + ½; z/4), so that nothing
//! special happens at E = V and E < V, E > V are one formula (DLMF 10.39.9, 16.2).
//!   f_n′      = f_{n+1} / (2(2n+1))
//!   f_{n−1}   = f_n + z f_{n+1} / ((2n+1)(2n−1))           (downward: stable)
//!   f_{n+1}   = (2n+1)(2n−1)(f_{n−1} − f_n)/z              (upward: for |z| not small)
//! For large positive z all are divided by a power of two, given beside them, so a wall of any
//! thickness neither overflows nor loses digits.

use super::double::Double;
use super::scalar::{Scalar, power_of_two};
use std::f64::consts::LN_2;
use std::sync::LazyLock;

/// Below this |z| the Taylor series is summed.
const SMALL: f64 = 1.0;
/// Terms of the series in `f64` for |z| ≤ 1, and in double-double for |z| ≤ 4.
const TERMS: [usize; 2] = [10, 20];

/// coefficients[n][k] = 1 / (4ᵏ (n+½)_k k!).
static COEFFICIENTS: LazyLock<Vec<Vec<Double>>> = LazyLock::new(|| {
    let coefficient_row = |n: usize| {
        let mut row = vec![Double::new(1.0)];
        for k in 1..TERMS[1] {
            // 4 (n + ½ + k − 1) k = 2 (2n + 2k − 1) k
            let ratio = Double::new((2 * (2 * n + 2 * k - 1) * k) as f64);
            row.push(row[k - 1] / ratio);
        }
        row
    };
    (0..6).map(coefficient_row).collect()
});

static COEFFICIENTS_SINGLE: LazyLock<[[f64; 10]; 6]> = LazyLock::new(|| {
    let mut table = [[0.0; 10]; 6];
    for (n, row) in COEFFICIENTS.iter().enumerate() {
        for k in 0..TERMS[0] {
            table[n][k] = row[k].round();
        }
    }
    table
});

/// (2n+1)(2n−1)
fn product(n: usize) -> f64 {
    ((2 * n + 1) * (2 * n - 1)) as f64
}

/// f₀ … f_{count−1} in `f64`.
pub(super) fn entire_single(z: f64, count: usize) -> ([f64; 6], i64) {
    let mut f = [0.0; 6];
    if z.abs() <= SMALL {
        let top = count.max(2) - 1;
        let table = &*COEFFICIENTS_SINGLE;
        let series = |n: usize| table[n].iter().rev().fold(0.0, |sum, c| sum * z + c);
        f[top] = series(top);
        f[top - 1] = series(top - 1);
        for n in (1..top).rev() {
            f[n - 1] = f[n] + z * f[n + 1] / product(n);
        }
        return (f, 0);
    }
    let root = z.abs().sqrt();
    let mut exponent = 0;
    if z < 0.0 {
        let (sine, cosine) = root.sin_cos();
        f[0] = cosine;
        f[1] = sine / root;
    } else {
        // e^r = 2^k e^(r − k ln 2), with ln 2 in two parts
        let k = (root / LN_2).floor().min(4e15);
        const HIGH: f64 = 0.693_147_180_369_123_8;
        const LOW: f64 = 1.908_214_929_270_587_7e-10;
        let growth = ((root - k * HIGH) - k * LOW).exp();
        exponent = k as i64;
        let decay = power_of_two(-2 * exponent) / growth;
        f[0] = 0.5 * (growth + decay);
        f[1] = 0.5 * (growth - decay) / root;
    }
    for n in 1..count.saturating_sub(1) {
        f[n + 1] = product(n) * (f[n - 1] - f[n]) / z;
    }
    (f, exponent)
}

/// f₀ … f_{count−1} in double-double: series for |z| ≤ 4, and from there
/// f₀(4z) = 2 f₀(z)² − 1, f₁(4z) = f₀(z) f₁(z).
pub(super) fn entire_double(z: Double, count: usize) -> ([Double; 6], i64) {
    let mut f = [Double::ZERO; 6];
    let table = &*COEFFICIENTS;
    let series = |n: usize, z: Double, terms: usize| {
        let row = &table[n][..terms];
        row.iter().rev().fold(Double::ZERO, |sum, c| sum * z + *c)
    };
    let size = z.high.abs();
    if size <= SMALL {
        let terms = 3 + (14.0_f64).min(10.0 + 12.0 * size) as usize;
        let top = count.max(2) - 1;
        f[top] = series(top, z, terms);
        f[top - 1] = series(top - 1, z, terms);
        for n in (1..top).rev() {
            f[n - 1] = f[n] + z * f[n + 1] / Double::new(product(n));
        }
        return (f, 0);
    }
    let mut doublings = 0;
    let mut reduced = size;
    while reduced > 4.0 {
        reduced *= 0.25;
        doublings += 1;
    }
    let argument = z.shifted(-2 * doublings);
    let mut c = series(0, argument, TERMS[1]);
    let mut s = series(1, argument, TERMS[1]);
    let mut exponent = 0i64;
    for _ in 0..doublings {
        s = s * c;
        c = (c * c).times(2.0) - Double::new(power_of_two(-2 * exponent));
        exponent *= 2;
        // c is at least s: one shift keeps both in range
        if c.high > 1e60 {
            let shift = c.high.log2().floor() as i64;
            c = c.shifted(-shift);
            s = s.shifted(-shift);
            exponent += shift;
        }
    }
    f[0] = c;
    f[1] = s;
    for n in 1..count.saturating_sub(1) {
        f[n + 1] = (f[n - 1] - f[n]).times(product(n)) / z;
    }
    (f, exponent)
}

#[cfg(test)]
mod tests {
    use super::*;

    /// f₀² − z f₁² = 1 (cosh² − sinh² = 1), f₀ = f₁ + z f₂/3, over all branches; relative to
    /// the terms, which for z > 0 carry a power of two.
    #[test]
    fn identities_hold_in_both_arithmetics() {
        for i in -400i32..400 {
            let z = f64::from(i) * f64::from(i.abs()) * 0.013 + 1e-3;
            let (f, exponent) = entire_single(z, 3);
            let one = power_of_two(-2 * exponent);
            let size = f[0] * f[0] + (z * f[1] * f[1]).abs() + one;
            // in f64 the rounding of √z turns a phase by √|z| units
            let limit = 8.0 * f64::EPSILON;
            assert!(
                (f[0] * f[0] - z * f[1] * f[1] - one).abs() <= limit * size,
                "{z}"
            );
            assert!(
                (f[0] - f[1] - z * f[2] / 3.0).abs() <= limit * (f[0].abs() + f[1].abs()),
                "{z}"
            );
            let argument = Double::new(z);
            let (g, exponent) = entire_double(argument, 3);
            let one = Double::new(power_of_two(-2 * exponent));
            let rest = g[0] * g[0] - argument * g[1] * g[1] - one;
            let size = g[0].high.powi(2) + (z * g[1].high.powi(2)).abs() + one.high;
            // doubling may square the error of a phase: z units at most
            let limit = (64.0 + 16.0 * z.abs()) * Double::UNIT;
            assert!(rest.high.abs() <= limit * size, "{z}: {:e}", rest.high);
            let scale = power_of_two(exponent - entire_single(z, 2).1);
            assert!(
                (g[0].high * scale - f[0]).abs()
                    <= (4.0 + z.abs().sqrt()) * f64::EPSILON * size.sqrt().max(f[0].abs()),
                "{z}"
            );
        }
    }

    /// cosh 1, sinh 1, cos 1, sin 1 to 32 digits (DLMF 4.2, 4.14 at 1; computed with mpmath).
    #[test]
    fn values_are_right_to_thirty_digits() {
        let parts = |high: f64, low: f64| Double { high, low };
        let near = |x: Double, y: Double| assert!((x - y).high.abs() < 1e-30, "{x:?} {y:?}");
        let (f, _) = entire_double(Double::new(1.0), 2);
        near(f[0], parts(COSH.0, COSH.1));
        near(f[1], parts(SINH.0, SINH.1));
        let (f, _) = entire_double(Double::new(-1.0), 2);
        near(f[0], parts(COS.0, COS.1));
        near(f[1], parts(SIN.0, SIN.1));
    }

    const COSH: (f64, f64) = (1.5430806348152437, 6.606796775006833e-17);
    const SINH: (f64, f64) = (1.1752011936438014, 7.849672142285669e-17);
    const COS: (f64, f64) = (0.5403023058681398, -4.760954612604417e-17);
    const SIN: (f64, f64) = (0.8414709848078965, 1.776845092935536e-18);
}
