//! Hopping amplitudes: E(k) = E₀ − 2 Σ J_r cos(r k a).
//!
//! J_r = −(1/π) ∫₀^π E cos rθ dθ, by parts and with 2 cos θ = D(E), dE/dθ = −2 sin θ / D′:
//!   J_r = −(2/(πr)) ∫₀^π sin θ sin rθ / D′(E(θ)) dθ.
//! No energy is subtracted from another, so J₁ keeps its relative accuracy in a band of any narrowness; J_r with
//! r > 1 lives on the change of D′ over the band, of relative order (width/spacing)^{r−1}, and where `f64` has too few digits
//! for that the band is swept in double-double. The integrand is periodic and analytic: the trapezoidal rule converges
//! exponentially, at the rate of the neighbouring gaps (Trefethen & Weideman, SIAM Rev. 56, 385 (2014)). Beside a gap too
//! small for that the tanh-sinh rule takes over (Takahasi & Mori, Publ. RIMS 9, 721 (1974)), which minds no end.
//!
//! Failure: a change that does not settle stays in the bound.

use super::budget::{Budget, Meter};
use super::cell::{Bounded, Cell, Ready, SolveError, prepare};
use super::double::Double;
use super::interior::Inside;
use super::level::level_target;
use super::scalar::{Scalar, power_of_two};
use super::search::Finder;
use super::sweep::Reading;
use std::f64::consts::PI;

/// Trapezoidal points at the start and at the end.
const POINTS: [usize; 2] = [16, 256];
/// Relative change at which a sum has settled.
const SETTLED: f64 = 1e-14;

/// J_r of a band, r ≥ 1 (r = 0 is refused as `NotFinite`: it has no sense as a hopping).
pub fn hopping(cell: &Cell, band: usize, r: usize, budget: &Budget) -> Result<Bounded, SolveError> {
    if r == 0 {
        return Err(SolveError::NotFinite);
    }
    let ready = prepare(cell)?;
    let meter = Meter::new(budget);
    if let Some((value, size)) = integrate::<f64>(&ready, band, r, &meter)? {
        // rounding of D′ leaves about this much in the sum
        let noise = f64::EPSILON * size * (8.0 + ready.elements.len() as f64);
        if value.error.max(noise) < 1e-13 * value.value.abs() || r == 1 {
            return bounded(&ready, band, r, value, noise, &meter);
        }
    }
    let (value, size) =
        integrate::<Double>(&ready, band, r, &meter)?.ok_or(SolveError::NoBracket)?;
    let noise = Double::UNIT * 1e3 * size * (8.0 + ready.elements.len() as f64);
    bounded(&ready, band, r, value, noise, &meter)
}

/// Adds the effect of inputs known to one unit: ln J_r moves like r times ln of the width.
fn bounded(
    ready: &Ready,
    band: usize,
    r: usize,
    value: Bounded,
    noise: f64,
    meter: &Meter,
) -> Result<Bounded, SolveError> {
    let mut finder = Finder::<f64>::new(ready, meter);
    finder.surround(band)?;
    let middle = match finder.inside(band)? {
        Inside::At(reading) => reading.energy,
        Inside::Unresolved(_) => value_energy(ready, band, meter)?,
    };
    let (relative, rounding) = super::uncertainty::width_spread(ready, middle);
    let own = (r as f64) * relative * value.value.abs() + rounding * value.value.abs();
    Ok(Bounded {
        value: value.value,
        error: value.error + noise + own,
    })
}

/// An energy inside a band too narrow for `f64`.
fn value_energy(ready: &Ready, band: usize, meter: &Meter) -> Result<f64, SolveError> {
    let mut finder = Finder::<Double>::new(ready, meter);
    finder.surround(band)?;
    let (Inside::At(reading) | Inside::Unresolved(reading)) = finder.inside(band)?;
    Ok(reading.energy.round())
}

/// The integral with its unsettled part, and the size of its terms. `None` if the band is narrower than the arithmetic.
fn integrate<T: Scalar>(
    ready: &Ready,
    band: usize,
    r: usize,
    meter: &Meter,
) -> Result<Option<(Bounded, f64)>, SolveError> {
    let mut finder = Finder::<T>::new(ready, meter);
    let start = match finder.isolate(band)? {
        Inside::At(start) => start,
        Inside::Unresolved(_) if T::UNIT == f64::UNIT => return Ok(None),
        Inside::Unresolved(nearest) => return unresolved(&finder, &nearest, r).map(Some),
    };
    let mut curve = Curve {
        finder,
        band,
        r,
        last: start,
        size: 0.0,
    };
    let mut points = POINTS[0].max(2 * r);
    let mut sum = curve.trapezoid(points, false)?;
    let mut value = sum.leading() / points as f64;
    while points < POINTS[1] {
        sum = sum + curve.trapezoid(points, true)?;
        points *= 2;
        let next = sum.leading() / points as f64;
        let change = (next - value).abs();
        value = next;
        if change <= SETTLED * value.abs() + T::UNIT * 64.0 * curve.size {
            let error = change.min(SETTLED * value.abs() + T::UNIT * 64.0 * curve.size);
            return Ok(Some((Bounded { value, error }, curve.size)));
        }
    }
    curve.last = start;
    curve.tanh_sinh().map(|value| Some((value, curve.size)))
}

/// A band narrower than double-double separates: D is linear in it, J₁ = −1/D′; J₂ = D″/(2 D′³) bounds the others.
fn unresolved<T: Scalar>(
    finder: &Finder<T>,
    nearest: &Reading<T>,
    r: usize,
) -> Result<(Bounded, f64), SolveError> {
    let first = -1.0 / nearest.slope();
    let (_, curvature, exponent) = finder.curvature(nearest.energy)?;
    let second = curvature * power_of_two(exponent) * first * first * first;
    if r == 1 {
        return Ok((
            Bounded {
                value: first,
                error: second.abs() + 1e-12 * first.abs(),
            },
            0.0,
        ));
    }
    Ok((
        Bounded {
            value: 0.0,
            error: second.abs(),
        },
        0.0,
    ))
}

/// π to 106 bits.
const PI_DOUBLE: Double = Double {
    high: PI,
    low: 1.224_646_799_147_353_2e-16,
};

/// sin x = x f₁(−x²).
fn sine<T: Scalar>(x: T) -> T {
    let (f, _) = (-(x * x)).entire(2);
    x * f[1]
}

/// A band swept along k.
struct Curve<'a, T> {
    finder: Finder<'a, T>,
    band: usize,
    r: usize,
    last: Reading<T>,
    /// greatest |integrand|
    size: f64,
}

impl<T: Scalar> Curve<'_, T> {
    /// −(2/r) sin θ sin rθ / D′ at θ = ka, given by its distance from the nearer of 0 and π. All in the
    /// arithmetic of the sweep: for r > 1 the terms cancel down to the change of D′ over the band.
    fn integrand(&mut self, near: T, upper_half: bool) -> Result<T, SolveError> {
        let share = near.leading() / PI;
        let share = if upper_half == (self.band % 2 == 0) {
            1.0 - share
        } else {
            share
        };
        let mut target = level_target::<T>(self.band, share);
        let half = sine(near.times(0.5));
        target.depth = -(half * half).times(4.0);
        let (energy, reading) = self.finder.root(target, self.last.energy)?;
        let reading = if energy.leading() == reading.energy.leading() && T::UNIT == f64::UNIT {
            reading
        } else {
            self.finder.read(energy)?
        };
        self.last = reading;
        let slope = reading.trace().slope;
        let multiple = sine(near.times(self.r as f64));
        let sign = if upper_half && self.r % 2 == 0 {
            2.0
        } else {
            -2.0
        };
        let sine = sine(near);
        let value = (sine * multiple).times(sign) / (slope.times(self.r as f64));
        let size =
            2.0 * sine.leading().powi(2) / (slope.leading() * power_of_two(reading.exponent)).abs();
        self.size = self.size.max(size);
        Ok(value.shifted(-reading.exponent))
    }

    /// Sum of the integrand at θ = π j/points, all j (`odd` false) or the points halfway between.
    fn trapezoid(&mut self, points: usize, odd: bool) -> Result<T, SolveError> {
        let pi = T::lift(T::real(PI_DOUBLE));
        let mut sum = T::constant(0.0);
        for j in 1..=points {
            // in half steps
            let steps = 2 * j - usize::from(odd);
            if steps == 2 * points {
                break;
            }
            let upper_half = steps > points;
            let near = if upper_half {
                2 * points - steps
            } else {
                steps
            };
            let near = pi.times(near as f64) / T::constant(2.0 * points as f64);
            sum = sum + self.integrand(near, upper_half)?;
        }
        Ok(sum)
    }

    /// (1/π) ∫₀^π by θ = π/(1 + exp(−π sinh t)), halving the step until settled.
    fn tanh_sinh(&mut self) -> Result<Bounded, SolveError> {
        let mut step = 0.5;
        let mut value = f64::NAN;
        let mut error = f64::INFINITY;
        for _ in 0..5 {
            let count = (3.6 / step) as i64;
            let mut sum = T::constant(0.0);
            for i in -count..=count {
                let t = i as f64 * step;
                let e = (-PI * t.sinh()).exp();
                let share = 1.0 / (1.0 + e);
                // distance from the nearer end keeps the sine's digits
                let near = share.min(e * share);
                if near < 1e-15 {
                    continue;
                }
                let weight = PI * t.cosh() * share * (e * share) * step;
                let term = self.integrand(T::constant(PI * near), share > 0.5)?;
                sum = sum + term.times(weight);
            }
            let next = sum.leading();
            let change = (next - value).abs();
            value = next;
            if change.is_finite() {
                error = change;
                if change <= SETTLED * value.abs() {
                    break;
                }
            }
            step *= 0.5;
        }
        Ok(Bounded { value, error })
    }
}
