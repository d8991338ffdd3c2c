//! Fourier transforms of sites over two or three dimensions, for numbers with or without derivatives.
//!
//! ∫ f(r) e^{−iG·r} dr of a shape of height one at the origin; the values are those of `numerics::planewaves::shapes`.

use std::f64::consts::PI;

use crate::model::{Scalar, SiteShape};
use crate::numerics::planewaves::shapes;

use super::zone_cell::{Vector, dot};

/// The transform at a wave; `None` for shapes that only a chain has.
pub(super) fn transform<S: Scalar>(
    shape: &SiteShape,
    wave: &Vector<S>,
    dimension: usize,
) -> Option<S> {
    let square = dot(wave, wave);
    // |G|·R; the root has no derivative at zero, where no shape has a slope.
    let turns = |radius: &S| {
        if square.value() > 0.0 {
            square.root().times(radius)
        } else {
            S::number(0.0)
        }
    };
    Some(match shape {
        SiteShape::Gaussian(sigma) => {
            let square_width = S::lift(sigma).squared();
            let height = square_width.scaled(2.0 * PI);
            let height = if dimension == 2 {
                height
            } else {
                height.times(&height.root())
            };
            height.times(&square_width.times(&square).scaled(-0.5).exponential())
        }
        SiteShape::Disk(radius) => {
            let radius = S::lift(radius);
            radius
                .squared()
                .scaled(2.0 * PI)
                .times(&round(&turns(&radius)))
        }
        SiteShape::Sphere(radius) => {
            let radius = S::lift(radius);
            let cube = radius.squared().times(&radius);
            cube.scaled(4.0 * PI).times(&ball(&turns(&radius)))
        }
        SiteShape::Box(sizes) => {
            sizes
                .iter()
                .zip(wave)
                .fold(S::number(1.0), |product, (size, g)| {
                    let size = S::lift(size);
                    let half = size.times(g).scaled(0.5);
                    product.times(&size).times(&sinc(&half))
                })
        }
        SiteShape::Sech2(_) | SiteShape::Lorentzian(_) => return None,
    })
}

/// J₁(x)/x; its slope is −J₂(x)/x.
fn round<S: Scalar>(turns: &S) -> S {
    let x = turns.value();
    turns.chain(shapes::disk(x, 1.0, 2.0 * PI), || {
        if x < 1e-4 {
            -x / 8.0
        } else {
            -libm::jn(2, x) / x
        }
    })
}

/// (sin x − x cos x)/x³; its slope is (x² sin x + 3x cos x − 3 sin x)/x⁴.
fn ball<S: Scalar>(turns: &S) -> S {
    let x = turns.value();
    turns.chain(shapes::sphere(x, 1.0, 4.0 * PI), || {
        // The difference loses digits like 1/x⁴; the series is exact to rounding below 0.3.
        if x < 0.3 {
            let s = x * x;
            -x / 15.0 * (1.0 - s / 14.0 * (1.0 - s / 36.0 * (1.0 - s / 66.0 * (1.0 - s / 104.0))))
        } else {
            ((x * x - 3.0) * x.sin() + 3.0 * x * x.cos()) / x.powi(4)
        }
    })
}

/// sin x / x.
fn sinc<S: Scalar>(x: &S) -> S {
    let u = x.value();
    x.chain(shapes::block([2.0 * u, 0.0, 0.0], &[1.0], 1.0), || {
        if u.abs() < 1e-3 {
            -u / 3.0 * (1.0 - u * u / 10.0)
        } else {
            (u * u.cos() - u.sin()) / (u * u)
        }
    })
}

/// An envelope of the transform that does not rise with |G|.
pub(super) fn envelope(shape: &SiteShape, g: f64, dimension: usize) -> f64 {
    match shape {
        SiteShape::Gaussian(sigma) => {
            let exponent = (-0.5 * (g * sigma.value).powi(2)).exp();
            (2.0 * PI * sigma.value.powi(2)).powf(0.5 * if dimension == 2 { 2.0 } else { 3.0 })
                * exponent
        }
        SiteShape::Disk(radius) => {
            // |J₁(x)| ≤ √(2/πx) but for the last per cent (Abramowitz & Stegun 9.2.1).
            let x = g * radius.value;
            2.0 * PI * radius.value.powi(2) * 0.5_f64.min(0.8 * x.powf(-1.5))
        }
        SiteShape::Sphere(radius) => {
            let x = g * radius.value;
            4.0 * PI * radius.value.powi(3) * (1.0_f64 / 3.0).min(1.1 / (x * x))
        }
        SiteShape::Box(sizes) => {
            // The slowest fall is along one edge, where the others' factors stay one.
            let least = sizes
                .iter()
                .map(|size| size.value)
                .fold(f64::INFINITY, f64::min);
            let volume: f64 = sizes.iter().map(|size| size.value).product();
            volume * 1.0_f64.min(2.0 / (g * least))
        }
        SiteShape::Sech2(_) | SiteShape::Lorentzian(_) => 0.0,
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::model::{Dual, ParameterId};

    /// Derivatives by the size and by the wave against differences of the values.
    #[test]
    fn slopes_of_transforms_are_those_of_their_values() {
        let id = ParameterId(77);
        for g in [0.0, 0.05, 0.4, 1.7, 9.0] {
            let shapes = |s: Dual| {
                [
                    (SiteShape::Gaussian(s.clone()), 2),
                    (SiteShape::Gaussian(s.clone()), 3),
                    (SiteShape::Disk(s.clone()), 2),
                    (SiteShape::Sphere(s.clone()), 3),
                    (SiteShape::Box(vec![s.clone(), s]), 2),
                ]
            };
            let wave = |t: &Dual| [t.scaled(g), t.scaled(0.3 * g), Dual::constant(0.0)];
            let value = |index: usize, t: f64| {
                let t = Dual::constant(t);
                let (shape, dimension) = shapes(t.scaled(0.8))
                    .into_iter()
                    .nth(index)
                    .expect("a shape");
                transform(&shape, &wave(&t), dimension)
                    .expect("a value")
                    .value
            };
            for index in 0..5 {
                let t = Dual::parameter(1.0, id);
                let (shape, dimension) = shapes(t.scaled(0.8))
                    .into_iter()
                    .nth(index)
                    .expect("a shape");
                let exact = transform(&shape, &wave(&t), dimension)
                    .expect("a value")
                    .slope(id);
                let step = 1e-5;
                let rough = (value(index, 1.0 + step) - value(index, 1.0 - step)) / (2.0 * step);
                assert!(
                    (exact - rough).abs() < 2e-8 * (1.0 + exact.abs()),
                    "shape {index} at {g}: {exact}, {rough}"
                );
            }
        }
    }
}
