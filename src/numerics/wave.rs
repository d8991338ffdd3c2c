//! |ψ|² of a Bloch state, for pictures.
//!
//! With M_x the matrix of the cell that starts at x, |ψ(x)|² ∝ |(M_x)₁₂| at every energy of a band (Magnus & Winkler,
//! *Hill's Equation*): it is ∂D/∂V(x) of `gradient`, and needs no complex arithmetic. Where two bands touch M_x₁₂ vanishes
//! everywhere, and its derivative by energy takes its place: the limit from inside the band.

use super::budget::{Budget, GRADIENT, Meter};
use super::cell::{Cell, Ready, SolveError, prepare};
use super::double::Double;
use super::element::{Element, Matrix, Series, factors, part_series};
use super::gradient::{cyclic_factors, inverse, values};
use super::level::level_energy;
use super::scalar::{Dual, Scalar};

/// `points` pairs (x, |ψ|²) evenly over the cell, both ends included, for the level of band `band` at `ka`;
/// |ψ|² integrates to 1 over the cell.
pub fn wave_function(
    cell: &Cell,
    band: usize,
    ka: f64,
    points: usize,
    budget: &Budget,
) -> Result<Vec<[f64; 2]>, SolveError> {
    let ready = prepare(cell)?;
    let meter = Meter::new(budget);
    let energy = level_energy(&ready, band, ka, &meter)?;
    meter.sweep::<Double>(&ready, energy.leading(), GRADIENT)?;
    let points = points.max(2);
    let list = cyclic_factors(&ready, Dual::variable(energy));
    let exponent = list
        .iter()
        .map(|f| f.rest.exponent + f.scaled.exponent)
        .max()
        .unwrap_or(0);
    let mut curve: Vec<[f64; 2]> = Vec::with_capacity(points);
    let mut densities: Vec<[f64; 2]> = Vec::with_capacity(points);
    let mut start = 0.0;
    let spacing = ready.period / (points - 1) as f64;
    for factor in &list {
        let shift = factor.rest.exponent + factor.scaled.exponent - exponent;
        let around = factor.rest.matrix.shifted(shift);
        let element = &ready.elements[factor.element];
        let length = part_length(element, factor.part.1);
        let last = factor.element + 1 == ready.elements.len() && factor.part.0 + 1 == factor.part.1;
        while curve.len() < points {
            let x = spacing * curve.len() as f64;
            if x > start + length && !(last && length > 0.0) {
                break;
            }
            if length == 0.0 {
                break;
            }
            let inner = ((x - start) / length).clamp(0.0, 1.0);
            let density = density_at(
                element,
                factor.part,
                Dual::variable(energy),
                &around,
                &factor.scaled.matrix,
                inner,
            );
            curve.push([x, 0.0]);
            densities.push([density.value.leading(), density.slope.leading()]);
        }
        start += length;
    }
    fill(&ready, &mut curve, &densities, spacing);
    Ok(curve)
}

fn part_length(element: &Element, parts: usize) -> f64 {
    match element {
        Element::Flat { length, .. } => *length,
        Element::Polynomial(p) => p.length / parts as f64,
        Element::Delta { .. } => 0.0,
    }
}

/// (M_x)₁₂ at a share of the way through a factor: K M_j seen from inside.
fn density_at<T: Scalar>(
    element: &Element,
    part: (usize, usize),
    energy: T,
    around: &Matrix<T>,
    whole: &Matrix<T>,
    inner: f64,
) -> T {
    match element {
        Element::Flat {
            length,
            potential,
            mass,
        } => {
            let piece = |share: f64| {
                let cut = Element::Flat {
                    length: length * share,
                    potential: *potential,
                    mass: *mass,
                };
                let mut found = (Matrix::identity(), 0);
                factors(&cut, energy, |m, exponent, _| found = (*m, exponent));
                found
            };
            // left · K · right over the same powers of two as the whole layer
            let ((left, e1), (right, e2)) = (piece(inner), piece(1.0 - inner));
            let mut total = 0;
            factors(element, energy, |_, exponent, _| total = exponent);
            left.product(around)
                .product(&right)
                .shifted(e1 + e2 - total)
                .b
        }
        Element::Polynomial(p) => {
            let mut series = Series::blank();
            part_series(p, part.0, part.1, energy, &mut series);
            let y = inverse(&values(&series, -1.0))
                .product(around)
                .product(&values(&series, 1.0));
            let phi = values(&series, 2.0 * inner - 1.0);
            phi.product(&y).product(&inverse(&phi)).b
        }
        Element::Delta { .. } => whole.product(around).b,
    }
}

/// Chooses M_x₁₂ or its derivative, and normalises by the trapezoidal rule: both ends are the same place.
fn fill(ready: &Ready, curve: &mut [[f64; 2]], densities: &[[f64; 2]], spacing: f64) {
    let most = |i: usize| densities.iter().fold(0.0f64, |m, d| m.max(d[i].abs()));
    let degenerate = most(0) <= 1e-12 * most(1) * ready.kinetic_scale();
    let pick = usize::from(degenerate);
    let sum: f64 = densities.iter().map(|d| d[pick]).sum();
    let total: f64 = densities.iter().skip(1).map(|d| d[pick].abs()).sum();
    for (point, density) in curve.iter_mut().zip(densities) {
        let value = density[pick] * sum.signum() / (total * spacing);
        // rounding may turn the sign where the state has all but died out
        point[1] = if value > 0.0 { value } else { 0.0 };
    }
}
