//! The derivatives of D by everything in the cell, from one pass forward and one back.
//!
//! With M = S_j M_j P_j, ∂D = tr(S_j ∂M_j P_j) = tr(∂M_j K_j), K_j = P_j S_j: the matrix of the cyclically
//! shifted cell without element j. For a constant layer ∂M_j is closed form (`entire`); for a polynomial part with
//! solutions Φ from its centre and Y = Φ(−1)⁻¹ K Φ(1)
//!   ∂D/∂V(x) =   Y₁₂ u₁² + (Y₂₂ − Y₁₁) u₁u₂ − Y₂₁ u₂²,
//!   ∂D/∂m(x) = −(Y₁₂ v₁² + (Y₂₂ − Y₁₁) v₁v₂ − Y₂₁ v₂²),
//! integrated against the part's shape functions by Gauss–Legendre quadrature. ∂D/∂V(x) is also
//! proportional to the Bloch density |ψ(x)|², with ∂D/∂E = −∫ ∂D/∂V for masses that do not depend on E.
//! Lengths are differentiated at fixed samples. All parts share one power of two.

use super::cell::{Mass, Ready};
use super::element::{
    DEGREE, Element, Matrix, Polynomial, Series, factors, layer, mass_at, part_series,
};
use super::mesh::{gauss_legendre, lagrange};
use super::scalar::Scalar;
use std::sync::LazyLock;

/// Nodes of a quadrature over one part with their weights and the shape functions of a whole step there.
pub(crate) type Quadrature = Vec<(f64, f64, [f64; DEGREE + 1])>;

fn quadrature(count: usize) -> Quadrature {
    gauss_legendre(count)
        .into_iter()
        .map(|(t, weight)| (t, weight, lagrange(t)))
        .collect()
}

/// Exact: a phase of at most 3 and shape functions of degree 12 need no more.
pub(crate) static FINE: LazyLock<Quadrature> = LazyLock::new(|| quadrature(20));
/// For bounds, which need but their first digits.
pub(crate) static COARSE: LazyLock<Quadrature> = LazyLock::new(|| quadrature(8));
/// A matrix and its power of two.
#[derive(Clone, Copy)]
pub(crate) struct Scaled<T> {
    pub matrix: Matrix<T>,
    pub exponent: i64,
}

impl<T: Scalar> Scaled<T> {
    pub fn identity() -> Self {
        Scaled {
            matrix: Matrix::identity(),
            exponent: 0,
        }
    }

    /// self · right
    pub fn product(&self, right: &Scaled<T>) -> Scaled<T> {
        let matrix = self.matrix.product(&right.matrix);
        let exponent = self.exponent + right.exponent;
        let size = matrix.magnitude();
        if size > 1e60 || (size < 1e-60 && size > 0.0) {
            let shift = size.log2().floor() as i64;
            return Scaled {
                matrix: matrix.shifted(-shift),
                exponent: exponent + shift,
            };
        }
        Scaled { matrix, exponent }
    }
}

/// One factor of the product.
pub(crate) struct Factor<T> {
    pub element: usize,
    /// part and number of parts
    pub part: (usize, usize),
    pub scaled: Scaled<T>,
    /// K: the rest of the cell, cyclically
    pub rest: Scaled<T>,
    /// |P||S|: what it is made of without its cancellation
    pub way: Scaled<T>,
}

/// All factors of a cell at an energy, each with the rest of the cell around it.
pub(crate) fn cyclic_factors<T: Scalar>(ready: &Ready, energy: T) -> Vec<Factor<T>> {
    let mut list: Vec<Factor<T>> = Vec::with_capacity(ready.elements.len());
    let mut before = Scaled::identity();
    for (index, element) in ready.elements.iter().enumerate() {
        let parts = match element {
            Element::Polynomial(p) => p.parts(energy.leading()),
            _ => 1,
        };
        let mut part = 0;
        factors(element, energy, |matrix, exponent, _| {
            let scaled = Scaled {
                matrix: *matrix,
                exponent,
            };
            list.push(Factor {
                element: index,
                part: (part, parts),
                scaled,
                rest: before,
                way: magnitudes(&before),
            });
            before = scaled.product(&before);
            part += 1;
        });
    }
    let mut after = Scaled::identity();
    for factor in list.iter_mut().rev() {
        factor.rest = factor.rest.product(&after);
        factor.way = factor.way.product(&magnitudes(&after));
        after = after.product(&factor.scaled);
    }
    list
}

/// Entry by entry, derivatives too: products of such bound what rounding gathers.
fn magnitudes<T: Scalar>(s: &Scaled<T>) -> Scaled<T> {
    Scaled {
        matrix: s.matrix.absolute(),
        exponent: s.exponent,
    }
}

/// tr(X Y)
fn trace_of<T: Scalar>(x: &Matrix<T>, y: &Matrix<T>) -> T {
    x.a * y.a + x.b * y.c + x.c * y.b + x.d * y.d
}

/// Derivatives of a quantity by the numbers of one piece.
#[derive(Clone, Debug)]
pub(crate) struct PieceSlope<T> {
    pub length: T,
    pub potential: [T; 2],
    /// by the mass at the left and right end
    pub mass: [T; 2],
    pub strength: T,
    pub samples: Vec<T>,
}

/// Derivatives of D at fixed energy, without the exponent.
pub(crate) struct Gradient<T> {
    pub pieces: Vec<PieceSlope<T>>,
    pub energy: T,
    /// D′
    pub energy_slope: T,
    /// Σ tr |S_j||M_j||P_j| over factors: change of D by a relative change of one in every entry, of a factor or of
    /// a product on the way; over duals with the same of D′
    pub rounding: T,
    /// Σ tr |K_j||M_j|: the same of factors alone, the least of it
    pub rounding_of_factors: f64,
    pub exponent: i64,
}

fn blank<T: Scalar>() -> PieceSlope<T> {
    let zero = T::constant(0.0);
    PieceSlope {
        length: zero,
        potential: [zero; 2],
        mass: [zero; 2],
        strength: zero,
        samples: Vec::new(),
    }
}

/// The derivatives of D at an energy.
pub(crate) fn gradient<T: Scalar>(ready: &Ready, energy: T, nodes: &Quadrature) -> Gradient<T> {
    let list = cyclic_factors(ready, energy);
    let exponent = list
        .iter()
        .map(|f| f.rest.exponent + f.scaled.exponent)
        .max()
        .unwrap_or(0);
    let zero = T::constant(0.0);
    let mut result = Gradient {
        pieces: Vec::with_capacity(ready.elements.len()),
        energy,
        energy_slope: zero,
        rounding: zero,
        rounding_of_factors: 0.0,
        exponent,
    };
    for factor in &list {
        let shift = factor.rest.exponent + factor.scaled.exponent - exponent;
        let around = factor.rest.matrix.shifted(shift);
        let shift = factor.way.exponent + factor.scaled.exponent - exponent;
        let size = magnitudes(&factor.scaled).matrix;
        result.rounding_of_factors += trace_of(&size, &around.absolute()).leading();
        result.rounding = result.rounding + trace_of(&size, &factor.way.matrix.shifted(shift));
        match &ready.elements[factor.element] {
            Element::Delta { .. } => {
                result.pieces.push(PieceSlope {
                    strength: around.b,
                    ..blank()
                });
            }
            Element::Flat {
                length,
                potential,
                mass,
            } => {
                let slope = flat_slope(*length, *potential, *mass, energy, &around);
                result.energy_slope =
                    result.energy_slope - slope.potential[0] + slope.mass[0].times(mass.slope);
                result.pieces.push(slope);
            }
            Element::Polynomial(p) => {
                if factor.part.0 == 0 {
                    result.pieces.push(PieceSlope {
                        samples: vec![zero; p.shapes()],
                        ..blank()
                    });
                }
                if let Some(slope) = result.pieces.last_mut() {
                    let by_energy = part_slope(p, factor.part, energy, &around, nodes, slope);
                    result.energy_slope = result.energy_slope + by_energy;
                }
            }
        }
    }
    for (slope, element) in result.pieces.iter_mut().zip(&ready.elements) {
        if let Element::Polynomial(p) = element
            && p.is_ramp()
        {
            slope.potential = [slope.samples[0], slope.samples[1]];
            slope.samples.clear();
        }
    }
    result
}

/// Constant layer: ∂M by V, m, l at fixed E.
pub(crate) fn flat_derivatives<T: Scalar>(
    length: f64,
    potential: f64,
    mass: Mass,
    energy: T,
) -> [Matrix<T>; 3] {
    let (z, weight, depth) = layer(length, potential, mass, energy);
    let (f, _) = z.entire(3);
    let first = f[1].times(0.5);
    let second = f[2].scaled(T::reciprocal(6));
    let (by_potential, by_mass) = (weight.times(length), depth.times(length));
    let entry = |rate: T| (first * rate, weight * second * rate, depth * second * rate);
    let (a, b, c) = entry(by_potential);
    let potential_matrix = Matrix {
        a,
        b,
        c: c + f[1].times(length),
        d: a,
    };
    let (a, b, c) = entry(by_mass);
    let mass_matrix = Matrix {
        a,
        b: b + f[1].times(length),
        c,
        d: a,
    };
    let mass = mass_at(mass, energy);
    let wall = T::constant(potential) - energy;
    let a = mass * depth * f[1];
    let length_matrix = Matrix {
        a,
        b: mass * f[0],
        c: wall * f[0],
        d: a,
    };
    [potential_matrix, mass_matrix, length_matrix]
}

fn flat_slope<T: Scalar>(
    length: f64,
    potential: f64,
    mass: Mass,
    energy: T,
    around: &Matrix<T>,
) -> PieceSlope<T> {
    let [by_potential, by_mass, by_length] =
        flat_derivatives(length, potential, mass, energy).map(|m| trace_of(&m, around));
    let zero = T::constant(0.0);
    PieceSlope {
        length: by_length,
        potential: [by_potential, zero],
        mass: [by_mass, zero],
        ..blank()
    }
}

impl Polynomial {
    /// Linear potential: two shape functions, (1 ∓ t)/2.
    pub fn is_ramp(&self) -> bool {
        self.coefficients.len() == 2
    }

    fn shapes(&self) -> usize {
        self.coefficients.len()
    }

    /// The shape functions at t ∈ [−1, 1] of the element: what each sample (or end) weighs; `known` if already at hand.
    pub fn shape_values(&self, t: f64, known: Option<&[f64; DEGREE + 1]>) -> [f64; DEGREE + 1] {
        if self.is_ramp() {
            let mut shapes = [0.0; DEGREE + 1];
            shapes[0] = 0.5 * (1.0 - t);
            shapes[1] = 0.5 * (1.0 + t);
            return shapes;
        }
        known.map_or_else(|| lagrange(t), |shapes| *shapes)
    }

    /// V(t), rounded.
    pub fn potential_at(&self, t: f64) -> f64 {
        self.coefficients
            .iter()
            .rev()
            .fold(0.0, |sum, c| sum * t + c.high)
    }

    /// The mass at t.
    pub fn mass_at(&self, t: f64) -> Mass {
        Mass {
            value: self.mass[0].value + self.mass[1].value * t,
            slope: self.mass[0].slope + self.mass[1].slope * t,
        }
    }
}

/// Φ(t): the values of both solutions.
pub(crate) fn values<T: Scalar>(series: &Series<T>, t: f64) -> Matrix<T> {
    let zero = T::constant(0.0);
    let mut sum = Matrix {
        a: zero,
        b: zero,
        c: zero,
        d: zero,
    };
    for k in (0..series.terms).rev() {
        sum.a = sum.a.times(t) + series.u[k][0];
        sum.b = sum.b.times(t) + series.u[k][1];
        sum.c = sum.c.times(t) + series.v[k][0];
        sum.d = sum.d.times(t) + series.v[k][1];
    }
    sum
}

/// The inverse of a matrix of determinant one.
pub(crate) fn inverse<T: Scalar>(m: &Matrix<T>) -> Matrix<T> {
    Matrix {
        a: m.d,
        b: -m.b,
        c: -m.c,
        d: m.a,
    }
}

/// Adds one part's derivatives to its piece; returns its share of D′.
fn part_slope<T: Scalar>(
    p: &Polynomial,
    part: (usize, usize),
    energy: T,
    around: &Matrix<T>,
    nodes: &Quadrature,
    slope: &mut PieceSlope<T>,
) -> T {
    let (index, count) = part;
    let mut series = Series::blank();
    let half = part_series(p, index, count, energy, &mut series);
    let y = inverse(&values(&series, -1.0))
        .product(around)
        .product(&values(&series, 1.0));
    let difference = y.d - y.a;
    let form = |x: T, z: T| y.b * x * x + difference * x * z - y.c * z * z;
    let mut by_energy = T::constant(0.0);
    let mut by_log_length = T::constant(0.0);
    for (t, weight, shapes) in nodes {
        let shapes = (count == 1).then_some(shapes);
        let phi = values(&series, *t);
        let density = form(phi.a, phi.b).scaled(half).times(*weight);
        let kinetic = -form(phi.c, phi.d).scaled(half).times(*weight);
        // position in the whole element
        let place = (2.0 * index as f64 + 1.0 + t) / count as f64 - 1.0;
        let ends = [0.5 * (1.0 - place), 0.5 * (1.0 + place)];
        for (sum, share) in slope.samples.iter_mut().zip(p.shape_values(place, shapes)) {
            *sum = *sum + density.times(share);
        }
        for (sum, share) in slope.mass.iter_mut().zip(ends) {
            *sum = *sum + kinetic.times(share);
        }
        let mass = p.mass_at(place);
        by_energy = by_energy - density + kinetic.times(mass.slope);
        by_log_length = by_log_length
            + density * (T::constant(p.potential_at(place)) - energy)
            + kinetic * mass_at(mass, energy);
    }
    if p.length > 0.0 {
        slope.length = slope.length + by_log_length / T::constant(p.length);
    }
    by_energy
}
