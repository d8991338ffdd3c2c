//! The transfer matrix of one element: (ψ, ψ′/m) from its left to its right end.
//!
//! Constant layer of length l, z = m(V − E)l², f_n of [`entire`](super::entire):
//!   [ f₀   m l f₁ ; (V − E) l f₁   f₀ ].
//! Delta: [ 1 0 ; S 1 ].
//! Polynomial potential V(t) = Σ c_i tⁱ, linear mass m(t) = μ₀ + μ₁ t over t ∈ [−1, 1], x = (l/2) t:
//! both solutions from the centre by their power series, u′ = m v, v′ = (V − E) u,
//!   (k+1) u_{k+1} = (l/2)(μ₀ v_k + μ₁ v_{k−1}),  (k+1) v_{k+1} = (l/2)((c₀ − E) u_k + Σ c_i u_{k−i}),
//! and M = Φ(1) Φ(−1)⁻¹ where Φ(±1) are the even part plus or minus the odd part, det Φ = 1.
//! The series is entire and exact for the polynomial: no error depends on E. An element is cut into
//! parts of phase (or decay) at most [`PHASE`], by re-centring the polynomial, so that the series
//! stays short and each part holds at most one zero of a solution.

use super::cell::Mass;
use super::double::Double;
use super::scalar::Scalar;

/// Greatest phase √(m|V − E|) l of one part of a polynomial element; below π.
const PHASE: f64 = 3.0;
/// Most terms of the series.
const TERMS: usize = 64;
/// Greatest degree of a polynomial potential.
pub(crate) const DEGREE: usize = 12;

/// A 2×2 matrix [a b; c d].
#[derive(Clone, Copy, Debug)]
pub(crate) struct Matrix<T> {
    pub a: T,
    pub b: T,
    pub c: T,
    pub d: T,
}

impl<T: Scalar> Matrix<T> {
    pub fn identity() -> Self {
        let (one, zero) = (T::constant(1.0), T::constant(0.0));
        Matrix {
            a: one,
            b: zero,
            c: zero,
            d: one,
        }
    }

    /// self · right
    pub fn product(&self, right: &Matrix<T>) -> Matrix<T> {
        Matrix {
            a: self.a * right.a + self.b * right.c,
            b: self.a * right.b + self.b * right.d,
            c: self.c * right.a + self.d * right.c,
            d: self.c * right.b + self.d * right.d,
        }
    }

    pub fn shifted(&self, power: i64) -> Matrix<T> {
        Matrix {
            a: self.a.shifted(power),
            b: self.b.shifted(power),
            c: self.c.shifted(power),
            d: self.d.shifted(power),
        }
    }

    /// Entry by entry, derivatives too.
    pub fn absolute(&self) -> Matrix<T> {
        Matrix {
            a: self.a.absolute(),
            b: self.b.absolute(),
            c: self.c.absolute(),
            d: self.d.absolute(),
        }
    }

    pub fn magnitude(&self) -> f64 {
        self.a
            .magnitude()
            .max(self.b.magnitude())
            .max(self.c.magnitude())
            .max(self.d.magnitude())
    }
}

/// A polynomial element, checked and expanded.
#[derive(Clone, Debug)]
pub(crate) struct Polynomial {
    pub length: f64,
    /// V(t) = Σ c_i tⁱ, t ∈ [−1, 1]
    pub coefficients: Vec<Double>,
    /// μ₀, μ₁: the mass at t is μ₀ + μ₁ t
    pub mass: [Mass; 2],
    /// least and greatest potential
    pub range: [f64; 2],
    /// Σ |c_i| over i ≥ 1
    pub swing: f64,
    /// |δV| of the mesh to expect
    pub remainder: f64,
}

impl Polynomial {
    pub fn new(
        length: f64,
        coefficients: Vec<Double>,
        ends: [Mass; 2],
        potentials: [f64; 2],
    ) -> Self {
        let [left, right] = ends;
        let half = |x: f64, y: f64| 0.5 * x + 0.5 * y;
        let mass = [
            Mass {
                value: half(left.value, right.value),
                slope: half(left.slope, right.slope),
            },
            Mass {
                value: half(right.value, -left.value),
                slope: half(right.slope, -left.slope),
            },
        ];
        let range = [
            potentials[0].min(potentials[1]),
            potentials[0].max(potentials[1]),
        ];
        let swing = coefficients[1..].iter().map(|c| c.high.abs()).sum();
        Polynomial {
            length,
            coefficients,
            mass,
            range,
            swing,
            remainder: 0.0,
        }
    }

    /// Parts needed at an energy.
    pub fn parts(&self, energy: f64) -> usize {
        let mass = self.mass[0].value.abs()
            + self.mass[1].value.abs()
            + (self.mass[0].slope.abs() + self.mass[1].slope.abs()) * energy.abs();
        // |V(t) − E| on the whole disk |t| ≤ 1, so that the series converges fast whatever the samples
        let depth = (self.coefficients[0].high - energy).abs() + self.swing;
        let phase = self.length * (mass * depth).sqrt();
        (phase / PHASE).ceil().clamp(1.0, 1e7) as usize
    }

    /// Coefficients on part `index` of `count`, in that part's own t ∈ [−1, 1]. All sums are bounded by Σ |c_i|.
    fn part<T: Scalar>(&self, index: usize, count: usize) -> [T::Real; DEGREE + 1] {
        let mut shifted = [T::real(Double::ZERO); DEGREE + 1];
        for (c, exact) in shifted.iter_mut().zip(&self.coefficients) {
            *c = T::real(*exact);
        }
        if count == 1 {
            return shifted;
        }
        let width = reciprocal(count);
        let centre = T::real(width.times((2 * index + 1) as f64) - Double::new(1.0));
        let width = T::real(width);
        let degree = self.coefficients.len() - 1;
        // Taylor shift by repeated synthetic division
        for start in 0..degree {
            for i in (start..degree).rev() {
                shifted[i] = T::real_plus(shifted[i], T::real_times(centre, shifted[i + 1]));
            }
        }
        let mut power = width;
        for c in &mut shifted[1..=degree] {
            *c = T::real_times(*c, power);
            power = T::real_times(power, width);
        }
        shifted
    }

    /// Mass (μ₀, μ₁) on a part, at an energy.
    pub fn part_mass<T: Scalar>(&self, index: usize, count: usize, energy: T) -> [T; 2] {
        let at = |m: Mass| T::constant(m.value) + energy.times(m.slope);
        let [middle, half] = self.mass.map(at);
        if count == 1 {
            return [middle, half];
        }
        let width = T::lift(T::real(reciprocal(count)));
        let centre = width.times((2 * index + 1) as f64) - T::constant(1.0);
        [middle + half * centre, half * width]
    }
}

/// The two solutions from the centre of a part: power series in t of u and v for each.
/// Solution 0 starts as (1, 0), solution 1 as (0, 1).
pub(crate) struct Series<T> {
    /// `u[k][s]`: the k-th coefficient of solution s
    pub u: [[T; 2]; TERMS],
    pub v: [[T; 2]; TERMS],
    pub terms: usize,
}

impl<T: Scalar> Series<T> {
    /// Room for a series.
    pub fn blank() -> Series<T> {
        let zero = T::constant(0.0);
        Series {
            u: [[zero; 2]; TERMS],
            v: [[zero; 2]; TERMS],
            terms: 0,
        }
    }

    /// Solves the recurrences until three terms running are below the rounding unit.
    pub fn solve(&mut self, half: T::Real, coefficients: &[T::Real], mass: [T; 2], energy: T) {
        let zero = T::constant(0.0);
        let one = T::constant(1.0);
        (self.u[0], self.v[0], self.terms) = ([one, zero], [zero, one], TERMS);
        let depth = (T::lift(coefficients[0]) - energy).scaled(half);
        let [mass, tilt] = mass.map(|m| m.scaled(half));
        let tilted = tilt.magnitude() != 0.0;
        let mut scaled = [T::real(Double::ZERO); DEGREE + 1];
        let rest = coefficients.len() - 1;
        for i in 0..rest {
            scaled[i] = T::real_times(coefficients[i + 1], half);
        }
        let mut greatest = [[1.0f64, 0.0], [0.0, 1.0]];
        let mut quiet = 0;
        for k in 0..TERMS - 1 {
            let inverse = T::reciprocal(k + 1);
            let [u0, u1] = self.u[k];
            let [v0, v1] = self.v[k];
            let mut u = [mass * v0, mass * v1];
            if tilted && k > 0 {
                let [w0, w1] = self.v[k - 1];
                u = [u[0] + tilt * w0, u[1] + tilt * w1];
            }
            let mut v = [depth * u0, depth * u1];
            let past = rest.min(k);
            // two sums: each addition need not wait for the one before
            let mut other = [zero; 2];
            let history = &self.u[k - past..k];
            let mut pairs = history.rchunks_exact(2);
            for (c, x) in scaled[..past].chunks_exact(2).zip(&mut pairs) {
                v = [v[0] + x[1][0].scaled(c[0]), v[1] + x[1][1].scaled(c[0])];
                other = [
                    other[0] + x[0][0].scaled(c[1]),
                    other[1] + x[0][1].scaled(c[1]),
                ];
            }
            if let [x] = pairs.remainder() {
                let c = scaled[past - 1];
                other = [other[0] + x[0].scaled(c), other[1] + x[1].scaled(c)];
            }
            let u = u.map(|x| x.scaled(inverse));
            let v = [0, 1].map(|s| (v[s] + other[s]).scaled(inverse));
            (self.u[k + 1], self.v[k + 1]) = (u, v);
            let mut small = true;
            for s in 0..2 {
                for (size, term) in greatest[s].iter_mut().zip([u[s], v[s]]) {
                    let term = term.leading().abs();
                    small &= term <= T::UNIT * *size;
                    *size = size.max(term);
                }
            }
            quiet = if small { quiet + 1 } else { 0 };
            if quiet >= 3 {
                self.terms = k + 2;
                break;
            }
        }
    }

    /// The transfer matrix across the part, t = −1 to 1.
    pub fn transfer(&self) -> Matrix<T> {
        let zero = T::constant(0.0);
        let mut even = [[zero; 2]; 2];
        let mut odd = [[zero; 2]; 2];
        for k in (0..self.terms).rev() {
            let sums = if k % 2 == 0 { &mut even } else { &mut odd };
            for (sum, (u, v)) in sums.iter_mut().zip(self.u[k].into_iter().zip(self.v[k])) {
                *sum = [sum[0] + u, sum[1] + v];
            }
        }
        let side = |s: usize, i: usize| (even[s][i] + odd[s][i], even[s][i] - odd[s][i]);
        let ((ap, am), (bp, bm)) = (side(0, 0), side(1, 0));
        let ((cp, cm), (dp, dm)) = (side(0, 1), side(1, 1));
        let right = Matrix {
            a: ap,
            b: bp,
            c: cp,
            d: dp,
        };
        // the inverse of Φ(−1), whose determinant is one
        right.product(&Matrix {
            a: dm,
            b: -bm,
            c: -cm,
            d: am,
        })
    }
}

/// An element of a cell made ready.
#[derive(Clone, Debug)]
pub(crate) enum Element {
    Flat {
        length: f64,
        potential: f64,
        mass: Mass,
    },
    Polynomial(Polynomial),
    Delta {
        strength: f64,
    },
}

/// Mass at an energy.
pub(crate) fn mass_at<T: Scalar>(mass: Mass, energy: T) -> T {
    if mass.slope == 0.0 {
        T::constant(mass.value)
    } else {
        T::constant(mass.value) + energy.times(mass.slope)
    }
}

/// z of a constant layer, and m l, (V − E) l.
pub(crate) fn layer<T: Scalar>(length: f64, potential: f64, mass: Mass, energy: T) -> (T, T, T) {
    let weight = mass_at(mass, energy).times(length);
    let depth = (T::constant(potential) - energy).times(length);
    (weight * depth, weight, depth)
}

/// Calls `visit` with every factor of the element's matrix from left to right, its power of two,
/// and its z (0 for a delta and for a part of a polynomial, whose phase is below π).
pub(crate) fn factors<T: Scalar>(
    element: &Element,
    energy: T,
    mut visit: impl FnMut(&Matrix<T>, i64, f64),
) {
    match element {
        Element::Delta { strength } => {
            let mut matrix = Matrix::identity();
            matrix.c = T::constant(*strength);
            visit(&matrix, 0, 0.0);
        }
        Element::Flat {
            length,
            potential,
            mass,
        } => {
            let (z, weight, depth) = layer(*length, *potential, *mass, energy);
            let (f, exponent) = z.entire(2);
            let matrix = Matrix {
                a: f[0],
                b: weight * f[1],
                c: depth * f[1],
                d: f[0],
            };
            visit(&matrix, exponent, z.leading());
        }
        Element::Polynomial(p) => {
            let count = p.parts(energy.leading());
            let mut series = Series::blank();
            for index in 0..count {
                part_series(p, index, count, energy, &mut series);
                visit(&series.transfer(), 0, 0.0);
            }
        }
    }
}

/// 1/n in double-double, from the table where it has it.
fn reciprocal(n: usize) -> Double {
    if n < 128 {
        <Double as Scalar>::reciprocal(n)
    } else {
        Double::new(1.0) / Double::new(n as f64)
    }
}

/// The series on one part; returns half of the part's length.
pub(crate) fn part_series<T: Scalar>(
    p: &Polynomial,
    index: usize,
    count: usize,
    energy: T,
    series: &mut Series<T>,
) -> T::Real {
    let half = T::real(reciprocal(count).times(0.5 * p.length));
    let mass = p.part_mass(index, count, energy);
    let coefficients = p.part::<T>(index, count);
    series.solve(half, &coefficients[..p.coefficients.len()], mass, energy);
    half
}
