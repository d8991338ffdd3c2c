//! Fourier components of single shapes, in closed form.
//!
//! A shape f(r) repeated over a lattice of cell volume Ω has V(G) = (1/Ω) ∫ f(r) e^{−iG·r} d^d r. Every function here
//! gives that for a shape of height one centred at the origin; height E at R multiplies it by E·e^{−iG·R}
//! ([`at`]). Below, g = |G| and Ω is the length, area or volume of the primitive cell.

use nalgebra::Complex;
use std::f64::consts::PI;

/// exp(−r²/2σ²) in `dimension` 1, 2 or 3: (2πσ²)^{d/2} e^{−g²σ²/2}/Ω.
pub fn gaussian(g: f64, sigma: f64, dimension: usize, volume: f64) -> f64 {
    (2.0 * PI * sigma * sigma).powf(0.5 * dimension as f64) * (-0.5 * (g * sigma).powi(2)).exp()
        / volume
}

/// One inside a circle, zero outside: 2πR²·J₁(gR)/(gR)/Ω. Falls like g^(−3/2).
pub fn disk(g: f64, radius: f64, volume: f64) -> f64 {
    let x = g * radius;
    let shape = if x < 1e-4 {
        0.5 - x * x / 16.0
    } else {
        libm::j1(x) / x
    };
    2.0 * PI * radius * radius * shape / volume
}

/// One inside a sphere, zero outside: 4πR³·(sin x − x cos x)/x³/Ω, x = gR. Falls like g⁻².
pub fn sphere(g: f64, radius: f64, volume: f64) -> f64 {
    let x = g * radius;
    // The difference loses digits like 1/x²; the series to x⁸ is exact to rounding below 0.3.
    let shape = if x < 0.3 {
        let s = x * x;
        (1.0 - s / 10.0
            * (1.0 - s / 28.0 * (1.0 - s / 54.0 * (1.0 - s / 88.0 * (1.0 - s / 130.0)))))
            / 3.0
    } else {
        (x.sin() - x * x.cos()) / (x * x * x)
    };
    4.0 * PI * radius.powi(3) * shape / volume
}

/// One inside a box with its edges along the axes: Π sᵢ·sinc(Gᵢsᵢ/2)/Ω, `sides` as many as dimensions.
pub fn block(wave: [f64; 3], sides: &[f64], volume: f64) -> f64 {
    let product: f64 = sides
        .iter()
        .zip(wave)
        .map(|(side, g)| side * sinc(0.5 * g * side))
        .product();
    product / volume
}

/// sin x / x.
fn sinc(x: f64) -> f64 {
    if x.abs() < 1e-4 {
        1.0 - x * x / 6.0
    } else {
        x.sin() / x
    }
}

/// The factor e^{−iG·R} that moves a shape to R, both Cartesian.
pub fn at(wave: [f64; 3], place: [f64; 3]) -> Complex<f64> {
    Complex::cis(-(wave[0] * place[0] + wave[1] * place[1] + wave[2] * place[2]))
}

#[cfg(test)]
mod tests {
    use super::*;

    /// The integrals at 30 digits by mpmath (`tests/reference/lattices_shapes.py`).
    #[test]
    fn transforms_match_their_integrals() {
        let rows = [
            (gaussian(1.3, 0.4, 1, 2.0), 0.437_928_607_165_856_6),
            (gaussian(1.3, 0.4, 2, 2.0), 0.439_089_691_596_683_4),
            (gaussian(1.3, 0.4, 3, 2.0), 0.440_253_854_422_101),
            (disk(1e-4, 0.7, 2.0), 0.769_690_199_658_064_1),
            (disk(1.3, 0.7, 2.0), 0.692_719_739_437_858_5),
            (disk(25.0, 0.7, 2.0), -0.014_375_171_311_138_967),
            (sphere(0.2, 0.7, 2.0), 0.716_970_485_437_725_1),
            (sphere(0.42, 0.7, 2.0), 0.712_187_289_854_786),
            (sphere(1.3, 0.7, 2.0), 0.660_621_332_020_524_2),
            (sphere(25.0, 0.7, 2.0), -0.001_936_558_281_880_292_3),
            (
                block([1.3, 1e-5, 0.0], &[0.7, 0.4], 2.0),
                0.135_219_173_478_633_93,
            ),
        ];
        for (found, wanted) in rows {
            assert!((found - wanted).abs() < 3e-15, "{found} is not {wanted}");
        }
    }

    #[test]
    fn a_moved_shape_turns_its_phase_only() {
        let turned = at([2.0, 0.5, 0.0], [0.25, 1.0, 9.0]);
        assert!((turned - Complex::new(1f64.cos(), -1f64.sin())).norm() < 1e-15);
    }
}
