//! Shapes summed over all their images on a chain.
//!
//! Σ_n f(u − nP), by whichever of two series converges faster, both to rounding:
//! the images themselves, or (Poisson's formula) the Fourier series
//! (1/P) Σ_k F(2πk/P)·cos(2πku/P) with F(q) = ∫ f(u)·e^{−iqu} du:
//!
//! * exp(−u²/2σ²): F = σ√(2π)·exp(−q²σ²/2)
//! * sech²(u/w): F = πqw²/sinh(πqw/2), and 2w at q = 0
//! * 1/(1 + (u/w)²): both sum in closed form to b·coth b/(1 + sin²(πu/P)/sinh²b), b = πw/P
//!
//! The bells are positive everywhere, so the images add up without cancellation; the Fourier
//! series is used only where the sum stays within a factor of about ten of its mean.

use std::f64::consts::PI;

use crate::model::{Scalar, SiteShape};

/// Widths above this share of the period are summed as Fourier series.
const WIDE: f64 = 0.45;
/// e^{−39} is below half of a double's rounding.
const NEGLIGIBLE: f64 = 39.0;

/// The sum over all images of a shape of height one, at the distance `from` of its centre; `None` for shapes
/// that a chain does not have.
#[must_use]
pub fn sum_of_images<S: Scalar>(shape: &SiteShape, from: &S, period: &S) -> Option<S> {
    let u = nearest_image(from, period);
    Some(match shape {
        SiteShape::Gaussian(sigma) => gaussian(&u, &S::lift(sigma), period),
        SiteShape::Sech2(width) => sech2(&u, &S::lift(width), period),
        SiteShape::Lorentzian(width) => lorentzian(&u, &S::lift(width), period),
        SiteShape::Box(sizes) => S::number(cover(u.value(), sizes.first()?.value, period.value())),
        SiteShape::Disk(_) | SiteShape::Sphere(_) => return None,
    })
}

/// The distance from the nearest image.
fn nearest_image<S: Scalar>(from: &S, period: &S) -> S {
    let turns = (from.value() / period.value()).round();
    from.minus(&period.scaled(turns))
}

/// How many images of a box cover a place: the whole numbers n with |u − nP| < size/2; half of one on its face.
fn cover(u: f64, size: f64, period: f64) -> f64 {
    let (low, high) = ((u - 0.5 * size) / period, (u + 0.5 * size) / period);
    let faces = [low, high].iter().filter(|end| end.fract() == 0.0).count();
    let count = high.floor() - low.ceil() + 1.0;
    count
        - if faces == 2 {
            1.0
        } else if faces == 1 {
            0.5
        } else {
            0.0
        }
}

/// Σ over images: the nearest, then pairs on both sides until they no longer count.
fn over_images<S: Scalar>(u: &S, period: &S, bell: impl Fn(&S) -> S) -> S {
    let mut sum = bell(u);
    for n in 1..64 {
        let shift = period.scaled(f64::from(n));
        let pair = bell(&u.minus(&shift)).plus(&bell(&u.plus(&shift)));
        let done = pair.value() <= 1e-18 * sum.value();
        sum = sum.plus(&pair);
        if done {
            break;
        }
    }
    sum
}

fn gaussian<S: Scalar>(u: &S, sigma: &S, period: &S) -> S {
    if sigma.value() < WIDE * period.value() {
        return over_images(u, period, |x| {
            x.over(sigma).squared().scaled(-0.5).exponential()
        });
    }
    let share = sigma.over(period);
    let angle = u.over(period).scaled(2.0 * PI);
    let mut sum = S::number(1.0);
    for k in 1..64 {
        let q = share.scaled(2.0 * PI * f64::from(k));
        let exponent = q.squared().scaled(-0.5);
        let term = exponent
            .exponential()
            .times(&angle.scaled(f64::from(k)).cosine());
        sum = sum.plus(&term.scaled(2.0));
        if exponent.value() < -NEGLIGIBLE {
            break;
        }
    }
    share.scaled((2.0 * PI).sqrt()).times(&sum)
}

/// 1/cosh², without overflow and with its derivative.
fn sech2_bell<S: Scalar>(x: &S) -> S {
    let u = x.value();
    let small = (-2.0 * u.abs()).exp();
    let value = 4.0 * small / (1.0 + small).powi(2);
    x.chain(value, || -2.0 * value * u.tanh())
}

fn sech2<S: Scalar>(u: &S, width: &S, period: &S) -> S {
    if width.value() < WIDE * period.value() {
        return over_images(u, period, |x| sech2_bell(&x.over(width)));
    }
    let share = width.over(period);
    let angle = u.over(period).scaled(2.0 * PI);
    let mut sum = S::number(1.0);
    for k in 1..64 {
        // z = πqw/2 with q = 2πk/P; F(q)/2w = z/sinh z.
        let z = share.scaled(PI * PI * f64::from(k));
        let term = over_sinh(&z).times(&angle.scaled(f64::from(k)).cosine());
        sum = sum.plus(&term.scaled(2.0));
        if z.value() > NEGLIGIBLE + 5.0 {
            break;
        }
    }
    share.scaled(2.0).times(&sum)
}

/// z/sinh z for z > 0.
fn over_sinh<S: Scalar>(z: &S) -> S {
    let u = z.value();
    let value = u / u.sinh();
    z.chain(value, || value * (1.0 / u - 1.0 / u.tanh()))
}

fn lorentzian<S: Scalar>(u: &S, width: &S, period: &S) -> S {
    let b = width.over(period).scaled(PI);
    let sine = u.over(period).scaled(PI).sine();
    let coth = b.chain(1.0 / b.value().tanh(), || -1.0 / b.value().sinh().powi(2));
    let sinh = b.chain(b.value().sinh(), || b.value().cosh());
    let ratio = sine.over(&sinh).squared();
    b.times(&coth).over(&ratio.shifted(1.0))
}
