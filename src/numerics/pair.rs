//! Two bands that touch, or nearly: first-order perturbation of the doublet.
//!
//! Where a gap closes M = ±1. To first order M⁻¹ M(E + x, p + δp) = 1 + x N_E + δp N_p with traceless N = M⁻¹ ∂M,
//! and edges lie where q(N) = N₁₁² + N₁₂N₂₁ = −det N vanishes (from D² − 4 det = (M₁₁−M₂₂)² + 4M₁₂M₂₁). With q_E < 0
//! in bands and b the polar form of q,
//!   q_E x² + 2 b x δp + q_p δp² = 0:  mean dE*/dp = −b/q_E,  opening |dgap/dp| = 2 √(b² − q_E q_p)/|q_E|.
//! The states need not be chosen, so nothing is singular at the touching.
//! With P the product up to a place, δV(x) adds P⁻¹ [0 0; 1 0] P and δm(x) adds P⁻¹ [0 1; 0 0] P to N.

use super::cell::{Mass, Ready};
use super::element::{Element, Matrix, factors, part_series};
use super::gradient::{Scaled, flat_derivatives, inverse, quadrature, values};
use super::sensitivity::PieceSensitivity;

/// N₁₁, N₁₂, N₂₁ of a traceless matrix.
#[derive(Clone, Copy, Default)]
struct Form([f64; 3]);

impl Form {
    fn of(m: &Matrix<f64>) -> Form {
        Form([0.5 * (m.a - m.d), m.b, m.c])
    }

    fn add(&mut self, other: Form, factor: f64) {
        for (sum, term) in self.0.iter_mut().zip(other.0) {
            *sum += factor * term;
        }
    }

    fn polar(&self, other: &Form) -> f64 {
        self.0[0] * other.0[0] + 0.5 * (self.0[1] * other.0[2] + self.0[2] * other.0[1])
    }
}

/// The forms of one piece.
#[derive(Clone, Default)]
struct PieceForms {
    length: Form,
    potential: [Form; 2],
    mass: [Form; 2],
    strength: Form,
    samples: Vec<Form>,
}

/// A doublet's response.
pub(crate) struct Pair {
    /// dE*/dp of the mean
    pub means: Vec<PieceSensitivity>,
    /// |dgap/dp|
    pub rates: Vec<PieceSensitivity>,
    /// greatest change of gap (and of the mean) by a relative change of one in every entry of every factor
    pub rounding: f64,
}

/// The response of the doublet near `energy`.
pub(crate) fn pair(ready: &Ready, energy: f64) -> Pair {
    let mut forms: Vec<PieceForms> = Vec::with_capacity(ready.elements.len());
    let mut by_energy = Form::default();
    let mut rounding = Form::default();
    let mut before = Scaled::<f64>::identity();
    for element in &ready.elements {
        let start = unscaled(&before);
        let mut piece = PieceForms::default();
        match element {
            Element::Delta { .. } => piece.strength = below(&start),
            Element::Flat {
                length,
                potential,
                mass,
            } => {
                let [v, m, l] = flat_derivatives(*length, *potential, *mass, energy);
                let mut whole = Matrix::identity();
                let mut exponent = 0;
                factors(element, energy, |x, shift, _| {
                    (whole, exponent) = (*x, shift)
                });
                // M_j⁻¹ ∂M_j: both carry the element's power of two
                let local = |d: &Matrix<f64>| {
                    let n = inverse(&whole).product(d).shifted(2 * exponent);
                    Form::of(&inverse(&start).product(&n).product(&start))
                };
                piece.potential[0] = local(&v);
                piece.mass[0] = local(&m);
                piece.length = local(&l);
                by_energy.add(piece.potential[0], -1.0);
                by_energy.add(piece.mass[0], mass.slope);
            }
            Element::Polynomial(_) => {
                polynomial_forms(element, energy, &before, &mut piece, &mut by_energy)
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
    let mean = |f: Form| -by_energy.polar(&f) / q_energy;
    let rate = |f: Form| {
        let b = by_energy.polar(&f);
        2.0 * (b * b - q_energy * f.polar(&f)).max(0.0).sqrt() / q_energy.abs()
    };
    let greatest = Form(by_energy.0.map(f64::abs)).polar(&rounding);
    let rounding = 2.0 * (greatest * greatest + q_energy.abs() * rounding.polar(&rounding)).sqrt()
        / q_energy.abs();
    Pair {
        means: forms.iter().map(|f| f.map(energy, mean)).collect(),
        rates: forms.iter().map(|f| f.map(energy, rate)).collect(),
        rounding,
    }
}

fn unscaled(s: &Scaled<f64>) -> Matrix<f64> {
    s.matrix.shifted(s.exponent)
}

fn absolute(m: &Matrix<f64>) -> Matrix<f64> {
    Matrix {
        a: m.a.abs(),
        b: m.b.abs(),
        c: m.c.abs(),
        d: m.d.abs(),
    }
}

/// P⁻¹ [0 0; 1 0] P
fn below(p: &Matrix<f64>) -> Form {
    Form([-p.a * p.b, -p.b * p.b, p.a * p.a])
}

/// P⁻¹ [0 1; 0 0] P
fn above(p: &Matrix<f64>) -> Form {
    Form([p.c * p.d, p.d * p.d, -p.c * p.c])
}

/// Integrates the forms over a polynomial element that starts after `before`.
fn polynomial_forms(
    element: &Element,
    energy: f64,
    before: &Scaled<f64>,
    piece: &mut PieceForms,
    by_energy: &mut Form,
) {
    let Element::Polynomial(p) = element else {
        return;
    };
    piece.samples = vec![Form::default(); p.coefficients.len()];
    let mut before = *before;
    let count = p.parts(energy);
    for index in 0..count {
        let (series, half) = part_series(p, index, count, energy);
        let start = inverse(&values(&series, -1.0)).product(&unscaled(&before));
        for (node, (t, weight)) in quadrature().iter().enumerate() {
            let node = (count == 1).then_some(node);
            let phi = values(&series, *t).product(&start);
            let place = (2.0 * index as f64 + 1.0 + t) / count as f64 - 1.0;
            let [potential, mass] = [below(&phi), above(&phi)];
            let weight = weight * half;
            for (sum, share) in piece.samples.iter_mut().zip(p.shape_values(place, node)) {
                sum.add(potential, weight * share);
            }
            let ends = [0.5 * (1.0 - place), 0.5 * (1.0 + place)];
            for (sum, share) in piece.mass.iter_mut().zip(ends) {
                sum.add(mass, weight * share);
            }
            let local = p.mass_at(place);
            by_energy.add(potential, -weight);
            by_energy.add(mass, weight * local.slope);
            piece.length.add(
                potential,
                weight * (p.potential_at(place) - energy) / p.length,
            );
            piece.length.add(
                mass,
                weight * (local.value + local.slope * energy) / p.length,
            );
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

impl PieceForms {
    fn map(&self, energy: f64, answer: impl Fn(Form) -> f64) -> PieceSensitivity {
        let mass = |f: Form| {
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
