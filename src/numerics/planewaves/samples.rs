//! Fourier components of a potential given by its values, by fast Fourier transforms on grids doubled until they agree.
//!
//! A grid of N points folds V(n + N) onto V(n). Components of N and 2N points are compared where both have them; the
//! largest difference bounds the folding at N, and by the fall of V at 2N too, which is what is kept.

use super::Error;
use nalgebra::Complex;
use rustfft::FftPlanner;

/// Components of a sampled potential.
#[derive(Clone, Debug)]
pub struct Samples {
    dimension: usize,
    size: usize,
    values: Vec<Complex<f64>>,
    /// The largest change of a component at the last doubling: what folding may have added to any.
    pub folded: f64,
    /// Whether that is within the tolerance asked for.
    pub settled: bool,
}

/// The largest grid.
const LARGEST: usize = 1 << 22;

impl Samples {
    /// Samples `value` over the cell (its argument in fractions of the primitive vectors, in [0, 1), zero beyond the
    /// dimension) until no component changes by more than `tolerance`, or the grid would exceed `points` in all.
    ///
    /// # Errors
    /// `NotFinite` for a value that is not finite, a dimension other than 1, 2, 3 or a tolerance that is not positive.
    pub fn new(
        dimension: usize,
        value: &(dyn Fn([f64; 3]) -> f64 + Sync),
        tolerance: f64,
        points: usize,
    ) -> Result<Self, Error> {
        if !(1..=3).contains(&dimension) || tolerance.is_nan() || tolerance <= 0.0 {
            return Err(Error::NotFinite);
        }
        let points = points.min(LARGEST);
        let mut size = 8;
        let mut coarse = transform(dimension, size, value)?;
        loop {
            let double = transform(dimension, 2 * size, value)?;
            let folded = difference(dimension, size, &coarse, &double);
            size *= 2;
            if folded <= tolerance || (2 * size).pow(dimension as u32) > points {
                return Ok(Self {
                    dimension,
                    size,
                    values: double,
                    folded,
                    settled: folded <= tolerance,
                });
            }
            coarse = double;
        }
    }

    /// V(n); zero for indices that the grid does not resolve.
    pub fn component(&self, n: [i32; 3]) -> Complex<f64> {
        let half = self.size as i32 / 2;
        if (0..3).any(|i| {
            if i < self.dimension {
                n[i].abs() >= half
            } else {
                n[i] != 0
            }
        }) {
            return Complex::new(0.0, 0.0);
        }
        self.values[place(self.dimension, self.size, n)]
    }

    /// The largest index that the grid resolves, the same along every vector.
    pub fn largest_index(&self) -> i32 {
        self.size as i32 / 2 - 1
    }
}

fn place(dimension: usize, size: usize, n: [i32; 3]) -> usize {
    (0..dimension).fold(0, |sum, i| {
        sum * size + n[i].rem_euclid(size as i32) as usize
    })
}

fn transform(
    dimension: usize,
    size: usize,
    value: &(dyn Fn([f64; 3]) -> f64 + Sync),
) -> Result<Vec<Complex<f64>>, Error> {
    let total = size.pow(dimension as u32);
    let scale = 1.0 / total as f64;
    let mut values = Vec::with_capacity(total);
    for index in 0..total {
        let at = std::array::from_fn(|i| {
            if i < dimension {
                (index / size.pow((dimension - 1 - i) as u32) % size) as f64 / size as f64
            } else {
                0.0
            }
        });
        let sample = value(at);
        if !sample.is_finite() {
            return Err(Error::NotFinite);
        }
        values.push(Complex::new(sample * scale, 0.0));
    }
    Ok(fourier(values, dimension, size))
}

/// Σ_m x_m e^{−2πi n·m/size} on a grid of `size` points along each vector, the last index running fastest.
pub(super) fn fourier(
    mut values: Vec<Complex<f64>>,
    dimension: usize,
    size: usize,
) -> Vec<Complex<f64>> {
    let fft = FftPlanner::new().plan_fft_forward(size);
    let total = values.len();
    // Along the last axis rows are whole; turning the axes round brings each to that place.
    for _ in 0..dimension {
        fft.process(&mut values);
        let rows = total / size;
        values = (0..total)
            .map(|index| values[index % rows * size + index / rows])
            .collect();
    }
    values
}

/// The largest difference of the components that both grids have.
fn difference(
    dimension: usize,
    size: usize,
    coarse: &[Complex<f64>],
    double: &[Complex<f64>],
) -> f64 {
    let half = size as i32 / 2;
    let mut worst: f64 = 0.0;
    for index in 0..coarse.len() {
        let n: [i32; 3] = std::array::from_fn(|i| {
            if i < dimension {
                let m = (index / size.pow((dimension - 1 - i) as u32) % size) as i32;
                if m > half { m - size as i32 } else { m }
            } else {
                0
            }
        });
        if n.contains(&half) {
            // The coarse grid cannot tell ±N/2 apart: what lies there was folded.
            worst = worst.max(double[place(dimension, 2 * size, n)].norm());
            continue;
        }
        worst = worst.max((coarse[index] - double[place(dimension, 2 * size, n)]).norm());
    }
    worst
}

#[cfg(test)]
mod tests {
    use super::super::shapes;
    use super::*;
    use std::f64::consts::PI;

    /// Waves along every axis come back where they belong.
    #[test]
    fn single_waves_keep_their_places() {
        let wave = |r: [f64; 3]| {
            (2.0 * PI * (r[0] - 2.0 * r[1] + 3.0 * r[2])).cos() + 0.5 * (2.0 * PI * r[1]).sin()
        };
        let samples = Samples::new(3, &wave, 1e-13, 1 << 20).expect("samples");
        assert!(samples.settled);
        let close = |n: [i32; 3], re: f64, im: f64| {
            assert!(
                (samples.component(n) - Complex::new(re, im)).norm() < 1e-14,
                "{n:?}"
            )
        };
        close([1, -2, 3], 0.5, 0.0);
        close([-1, 2, -3], 0.5, 0.0);
        close([0, 1, 0], 0.0, -0.25);
        close([0, -1, 0], 0.0, 0.25);
        close([3, -2, 1], 0.0, 0.0);
    }

    /// A periodic sum of Gaussians against its transform in closed form; a step does not settle and says so.
    #[test]
    fn grids_double_until_they_agree() {
        let sigma = 0.09;
        let wells = |r: [f64; 3]| {
            (-3..=3)
                .flat_map(|i| (-3..=3).map(move |j| (f64::from(i), f64::from(j))))
                .map(|(x, y)| {
                    (-((r[0] - x).powi(2) + (r[1] - y).powi(2)) / (2.0 * sigma * sigma)).exp()
                })
                .sum()
        };
        let samples = Samples::new(2, &wells, 1e-13, 1 << 20).expect("samples");
        assert!(samples.settled);
        for n in [[0, 0, 0], [1, 0, 0], [2, -3, 0], [6, 5, 0]] {
            let g = 2.0 * PI * f64::from(n[0] * n[0] + n[1] * n[1]).sqrt();
            assert!((samples.component(n).re - shapes::gaussian(g, sigma, 2, 1.0)).abs() < 1e-15);
        }
        let step = |r: [f64; 3]| if r[0] < 0.37 { 1.0 } else { 0.0 };
        let rough = Samples::new(1, &step, 1e-9, 1024).expect("samples");
        assert!(!rough.settled && rough.folded > 1e-6);
        assert_eq!(
            Samples::new(1, &|_| f64::NAN, 1e-9, 64).err(),
            Some(Error::NotFinite)
        );
    }
}
