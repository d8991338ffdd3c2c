//! Two bands that touch, or nearly: first-order perturbation of the doublet.
//!
//! Where a gap closes M = ±1. To first order M⁻¹ M(E + x, p + δp) = 1 + x N_E + δp N_p with traceless N = M⁻¹ ∂M,
//! and edges lie where q(N) = N₁₁² + N₁₂N₂₁ = −det N vanishes (from D² − 4 det = (M₁₁−M₂₂)² + 4M₁₂M₂₁). With q_E < 0
//! in bands and b the polar form of q,
//!   q_E x² + 2 b x δp + q_p δp² = 0:  mean dE*/dp = −b/q_E,  opening |dgap/dp| = 2 √(b² − q_E q_p)/|q_E|.
//! The states need not be chosen, so nothing is singular at the touching.
//! With P the product up to a place, δV(x) adds P⁻¹ [0 0; 1 0] P and δm(x) adds P⁻¹ [0 1; 0 0] P to N.

use super::cell::{Mass, Ready};
use super::element::{Element, Matrix, Polynomial, Series, factors, mass_at, part_series};
use super::gradient::{Quadrature, Scaled, flat_derivatives, inverse, values};
use super::scalar::Scalar;
use super::sensitivity::PieceSensitivity;

/// N₁₁, N₁₂, N₂₁ of a traceless matrix.
#[derive(Clone, Copy)]
struct Form<T>([T; 3]);

impl<T: Scalar> Form<T> {
    fn zero() -> Self {
        Form([T::constant(0.0); 3])
    }

    fn of(m: &Matrix<T>) -> Self {
        Form([(m.a - m.d).times(0.5), m.b, m.c])
    }

    fn add(&mut self, other: Form<T>, factor: T) {
        for (sum, term) in self.0.iter_mut().zip(other.0) {
            *sum = *sum + factor * term;
        }
    }

    fn polar(&self, other: &Form<T>) -> f64 {
        let cross = self.0[1] * other.0[2] + self.0[2] * other.0[1];
        (self.0[0] * other.0[0] + cross.times(0.5)).leading()
    }
}

/// The forms of one piece.
struct PieceForms<T> {
    length: Form<T>,
    potential: [Form<T>; 2],
    mass: [Form<T>; 2],
    strength: Form<T>,
    samples: Vec<Form<T>>,
}

impl<T: Scalar> PieceForms<T> {
    fn blank() -> Self {
        let zero = Form::zero();
        PieceForms {
            length: zero,
            potential: [zero; 2],
            mass: [zero; 2],
            strength: zero,
            samples: Vec::new(),
        }
    }
}

/// A doublet's response.
pub(crate) struct Pair {
    /// dE*/dp of the mean
    pub means: Vec<PieceSensitivity>,
    /// |dgap/dp|
    pub rates: Vec<PieceSensitivity>,
    /// greatest change of gap (and of the mean) by a relative change of one in every entry of every factor
    pub rounding: f64,
    /// the only bound that holds: both edges are one energy in `f64`
    pub alone: bool,
}

/// The response of the doublet near `energy`. Behind thick walls P⁻¹ … P cancels: then take `T` in double-double.
pub(crate) fn pair<T: Scalar>(ready: &Ready, energy: T, nodes: &Quadrature) -> Pair {
    let mut forms: Vec<PieceForms<T>> = Vec::with_capacity(ready.elements.len());
    let mut by_energy = Form::zero();
    let mut rounding = Form::<f64>::zero();
    let mut before = Scaled::<T>::identity();
    for element in &ready.elements {
        let start = unscaled(&before);
        let mut piece = PieceForms::blank();
        match element {
            Element::Delta { .. } => piece.strength = below(&start),
            Element::Flat {
                length,
                potential,
                mass,
            } => {
                let derivatives = flat_derivatives(*length, *potential, *mass, energy);
                let mut whole = Matrix::identity();
                let mut exponent = 0;
                factors(element, energy, |x, shift, _| {
                    (whole, exponent) = (*x, shift)
                });
                // M_j⁻¹ ∂M_j: both carry the element's power of two
                let local = |d: &Matrix<T>| {
                    let n = inverse(&whole).product(d).shifted(2 * exponent);
                    Form::of(&inverse(&start).product(&n).product(&start))
                };
                [piece.potential[0], piece.mass[0], piece.length] =
                    [0, 1, 2].map(|i| local(&derivatives[i]));
                by_energy.add(piece.potential[0], T::constant(-1.0));
                by_energy.add(piece.mass[0], T::constant(mass.slope));
            }
            Element::Polynomial(p) => {
                polynomial_forms(p, energy, &before, nodes, &mut piece, &mut by_energy)
            }
        }
        factors(element, energy, |x, shift, _| {
            let scaled = Scaled {
                matrix: *x,
                exponent: shift,
            };
            let after = scaled.product(&before);
            let size = absolute(&inverse(&unscaled(&after)))
                .product(&absolute(&unscaled(&scaled)))
                .product(&absolute(&unscaled(&before)));
            rounding.add(Form([0.5 * (size.a + size.d), size.b, size.c]), 1.0);
            before = after;
        });
        forms.push(piece);
    }
    let q_energy = by_energy.polar(&by_energy);
    let mean = |f: Form<T>| -by_energy.polar(&f) / q_energy;
    let rate = |f: Form<T>| {
        let b = by_energy.polar(&f);
        2.0 * (b * b - q_energy * f.polar(&f)).max(0.0).sqrt() / q_energy.abs()
    };
    let greatest = Form(by_energy.0.map(|x| x.leading().abs())).polar(&rounding);
    let rounding = 2.0 * (greatest * greatest + q_energy.abs() * rounding.polar(&rounding)).sqrt()
        / q_energy.abs();
    let energy = energy.leading();
    Pair {
        means: forms.iter().map(|f| f.map(energy, mean)).collect(),
        rates: forms.iter().map(|f| f.map(energy, rate)).collect(),
        rounding,
        alone: false,
    }
}

fn unscaled<T: Scalar>(s: &Scaled<T>) -> Matrix<T> {
    s.matrix.shifted(s.exponent)
}

fn absolute<T: Scalar>(m: &Matrix<T>) -> Matrix<f64> {
    let size = |x: T| x.leading().abs();
    Matrix {
        a: size(m.a),
        b: size(m.b),
        c: size(m.c),
        d: size(m.d),
    }
}

/// P⁻¹ [0 0; 1 0] P
fn below<T: Scalar>(p: &Matrix<T>) -> Form<T> {
    Form([-(p.a * p.b), -(p.b * p.b), p.a * p.a])
}

/// P⁻¹ [0 1; 0 0] P
fn above<T: Scalar>(p: &Matrix<T>) -> Form<T> {
    Form([p.c * p.d, p.d * p.d, -(p.c * p.c)])
}

/// Integrates the forms over a polynomial element that starts after `before`.
fn polynomial_forms<T: Scalar>(
    p: &Polynomial,
    energy: T,
    before: &Scaled<T>,
    nodes: &Quadrature,
    piece: &mut PieceForms<T>,
    by_energy: &mut Form<T>,
) {
    piece.samples = vec![Form::zero(); p.coefficients.len()];
    let mut before = *before;
    let count = p.parts(energy.leading());
    let mut series = Series::blank();
    for index in 0..count {
        let half = T::lift(part_series(p, index, count, energy, &mut series));
        let start = inverse(&values(&series, -1.0)).product(&unscaled(&before));
        for (t, weight, shapes) in nodes {
            let shapes = (count == 1).then_some(shapes);
            let phi = values(&series, *t).product(&start);
            let place = (2.0 * index as f64 + 1.0 + t) / count as f64 - 1.0;
            let [potential, mass] = [below(&phi), above(&phi)];
            let weight = half.times(*weight);
            for (sum, share) in piece.samples.iter_mut().zip(p.shape_values(place, shapes)) {
                sum.add(potential, weight.times(share));
            }
            let ends = [0.5 * (1.0 - place), 0.5 * (1.0 + place)];
            for (sum, share) in piece.mass.iter_mut().zip(ends) {
                sum.add(mass, weight.times(share));
            }
            let local = p.mass_at(place);
            by_energy.add(potential, -weight);
            by_energy.add(mass, weight.times(local.slope));
            let wall = T::constant(p.potential_at(place)) - energy;
            piece
                .length
                .add(potential, weight * wall.times(1.0 / p.length));
            piece
                .length
                .add(mass, weight * mass_at(local, energy).times(1.0 / p.length));
        }
        before = Scaled {
            matrix: series.transfer(),
            exponent: 0,
        }
        .product(&before);
    }
    if p.is_ramp() {
        piece.potential = [piece.samples[0], piece.samples[1]];
        piece.samples.clear();
    }
}

impl<T: Scalar> PieceForms<T> {
    fn map(&self, energy: f64, answer: impl Fn(Form<T>) -> f64) -> PieceSensitivity {
        let mass = |f: Form<T>| {
            let value = answer(f);
            Mass {
                value,
                slope: value * energy,
            }
        };
        PieceSensitivity {
            length: answer(self.length),
            potential: self.potential.map(&answer),
            mass: self.mass.map(mass),
            strength: answer(self.strength),
            samples: self.samples.iter().map(|f| answer(*f)).collect(),
        }
    }
}
