//! Extrema where levels cross: a proximal bundle search.
//!
//! Beside a crossing the function `f` to be made least is the larger of several smooth ones, whose slopes are known
//! (Hellmann–Feynman). Every solve gives a plane below `f`: that of the level asked for and those of its neighbours on
//! the side where they may take over. With the planes fᵢ + gᵢ·(k − kᵢ) and the best point c, the next point is
//!
//! ```text
//! c − t G,   G = Σ wᵢ gᵢ,   w ≥ 0, Σ wᵢ = 1 making ½ t |Σ wᵢ gᵢ|² + Σ wᵢ αᵢ least,   αᵢ = f(c) − fᵢ − gᵢ·(c − kᵢ)
//! ```
//!
//! (Kiwiel, Math. Program. 46, 105 (1990)). It is taken where `f` falls as promised; else its planes improve the model.
//! With ε = Σ wᵢ αᵢ the least lies within ε + |G|²/(2µ) where f grows by ½ µ |k − c|² along the crease; µ = 1/20 is assumed
//! (a free particle has 2). Pieces that bend down spoil the planes: their α is kept above a part of the distance's square.

use super::Error;
use super::extrema::{Kind, Search, Seat, Spot, WANDERING};
use super::lattice::{add, dot};

/// Solves in one search.
const EVALUATIONS: usize = 100;
/// Planes kept.
const PLANES: usize = 48;
/// Levels this near, in the natural unit, may take over.
const NEAR: f64 = 0.05;
/// How f is assumed to bend along a crease at the least, the µ above.
const LEAST_BEND: f64 = 0.05;
/// α is at least this much of the square of the distance.
const BENT: f64 = 0.05;
/// Planes of pieces that bend down lie above f between their points: dense searches found up to seven times what is
/// reckoned to be left.
const DOUBT: f64 = 10.0;
/// What is left, in the natural unit, when the search ends.
const LEFT: f64 = 2e-12;

/// A plane below the function, on the axes of the lattice.
struct Plane {
    at: [f64; 3],
    value: f64,
    slope: [f64; 3],
}

impl Search<'_, '_> {
    /// The least value that a start leads to.
    pub(super) fn crease(&self, start: [f64; 3]) -> Result<Spot, Error> {
        let frame = &self.waves.frame;
        let unit = frame.unit();
        let steps = (0..frame.dimension).map(|i| {
            let b = frame.reciprocal[i];
            0.5 * self.spacing[i] * dot(b, b).sqrt()
        });
        let stride = steps.fold(f64::INFINITY, f64::min);
        let place = |parts: [f64; 3]| add(start, frame.off_axes(parts));
        let mut planes: Vec<Plane> = Vec::new();
        let mut centre = [0.0; 3];
        let mut value = self.planes_at(start, centre, &mut planes)?;
        let steepest = planes
            .first()
            .map_or(1.0, |plane| dot(plane.slope, plane.slope).sqrt());
        let mut t = (stride / steepest.max(1e-9 * unit.sqrt())).min(4.0);
        let mut left = unit;
        let mut failures = 0;
        for _ in 0..EVALUATIONS {
            let (slope, gap) = combined(&planes, centre, value, t);
            let square = dot(slope, slope);
            left = gap + square / (2.0 * LEAST_BEND);
            let length = t * square.sqrt();
            if left <= LEFT * unit || length <= 1e-12 * stride {
                break;
            }
            let share = (stride / length).min(1.0);
            let promised = share * (t * square + gap);
            let next: [f64; 3] = std::array::from_fn(|x| centre[x] - share * t * slope[x]);
            if self.drifted(place(next)) {
                left = left.max(WANDERING * unit);
                break;
            }
            let found = self.planes_at(place(next), next, &mut planes)?;
            if found < value - 0.1 * promised {
                if found < value - 0.6 * promised {
                    t = (2.0 * t).min(8.0);
                }
                (centre, value, failures) = (next, found, 0);
            } else {
                failures += 1;
                if failures > 1 {
                    t *= 0.5;
                }
            }
            let spare = planes.len().saturating_sub(PLANES);
            planes.drain(..spare);
        }
        Ok(Spot {
            k: place(centre),
            value,
            seat: Seat::Creased((DOUBT * left).min(unit)),
        })
    }

    /// Adds the planes of a point; gives the function there.
    fn planes_at(&self, k: [f64; 3], at: [f64; 3], planes: &mut Vec<Plane>) -> Result<f64, Error> {
        let levels = self
            .waves
            .solve_on(&self.basis, k, self.count, true, self.budget)?;
        let value = self.target.value(&levels.energies);
        let mut slope = [0.0; 3];
        for (level, sign) in self.target.levels() {
            let velocity = self.waves.velocity(&levels, level);
            slope = std::array::from_fn(|x| slope[x] + sign * velocity[x]);
        }
        if !value.is_finite() {
            return Err(Error::NotFinite);
        }
        let band = self.target.band;
        let near = NEAR * self.unit();
        let others: Vec<(usize, f64)> = match self.target.kind {
            Kind::Bottom => (0..band).map(|level| (level, 1.0)).collect(),
            Kind::Top => (band + 1..levels.energies.len())
                .map(|level| (level, -1.0))
                .collect(),
            Kind::Separation => Vec::new(),
        };
        for (level, sign) in others {
            let other = sign * levels.energies[level];
            if value - other < near {
                planes.push(Plane {
                    at,
                    value: other,
                    slope: self.waves.velocity(&levels, level).map(|x| sign * x),
                });
            }
        }
        planes.push(Plane { at, value, slope });
        Ok(value)
    }
}

/// G and ε of the best weights, found pair by pair.
fn combined(planes: &[Plane], centre: [f64; 3], value: f64, t: f64) -> ([f64; 3], f64) {
    let gaps: Vec<f64> = planes
        .iter()
        .map(|plane| {
            let way: [f64; 3] = std::array::from_fn(|x| centre[x] - plane.at[x]);
            let gap = value - plane.value - dot(plane.slope, way);
            gap.max(BENT * dot(way, way))
        })
        .collect();
    let mut weights = vec![0.0; planes.len()];
    let first = (0..planes.len()).min_by(|a, b| gaps[*a].total_cmp(&gaps[*b]));
    let Some(first) = first else {
        return ([0.0; 3], 0.0);
    };
    weights[first] = 1.0;
    let mut sum = planes[first].slope;
    for _ in 0..600 {
        let rate = |i: usize| t * dot(planes[i].slope, sum) + gaps[i];
        let rates: Vec<f64> = (0..planes.len()).map(rate).collect();
        let down = (0..planes.len()).min_by(|a, b| rates[*a].total_cmp(&rates[*b]));
        let up = (0..planes.len())
            .filter(|i| weights[*i] > 0.0)
            .max_by(|a, b| rates[*a].total_cmp(&rates[*b]));
        let (Some(down), Some(up)) = (down, up) else {
            break;
        };
        let fall = rates[up] - rates[down];
        if fall <= 1e-13 * (rates[up].abs() + t * dot(sum, sum)) || fall <= 0.0 {
            break;
        }
        let way: [f64; 3] = std::array::from_fn(|x| planes[down].slope[x] - planes[up].slope[x]);
        let bend = t * dot(way, way);
        let move_ = if bend > 0.0 {
            (fall / bend).min(weights[up])
        } else {
            weights[up]
        };
        weights[down] += move_;
        weights[up] -= move_;
        sum = std::array::from_fn(|x| sum[x] + move_ * way[x]);
    }
    let gap = gaps.iter().zip(&weights).map(|(gap, w)| gap * w).sum();
    (sum, gap)
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Three planes that meet at a vertex: at the vertex their best combination is flat.
    #[test]
    fn slopes_on_all_sides_of_a_vertex_cancel() {
        let slopes = [[1.0, 0.2, 0.0], [-0.7, 0.9, 0.0], [-0.4, -1.3, 0.0]];
        let planes: Vec<Plane> = slopes
            .iter()
            .map(|slope| Plane {
                at: [0.0; 3],
                value: 2.0,
                slope: *slope,
            })
            .collect();
        let (sum, gap) = combined(&planes, [0.0; 3], 2.0, 0.5);
        assert!(dot(sum, sum) < 1e-18 && gap == 0.0, "{sum:?} {gap}");
        let two = combined(&planes[..2], [0.0; 3], 2.0, 0.5).0;
        // The shortest vector between two slopes stands square on their difference.
        let way = [1.7, -0.7, 0.0];
        assert!(dot(two, way).abs() < 1e-12 && dot(two, two) > 0.1);
    }
}
