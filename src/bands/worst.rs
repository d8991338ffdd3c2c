//! The least value of a function over the box of tolerances, −1 … 1 in each.
//!
//! The sign of each slope names a corner; where the slopes there, and at the corner across, still have these signs,
//! the corner is the answer. Where they have not, the least value may lie inside: a gap that closes and reopens between two good
//! corners has a kink, |a·t − b|, or the narrow hyperbola beside it. So the search goes along lines, closing in
//! on the change of sign of the slope (tangents from both sides meet at the kink of a |…|), and on along the
//! valley: the direction of steepest descent at a kink is minus the shortest vector between the slopes of its
//! two sides (the subdifferential of a maximum of two smooth functions; see Clarke, *Optimization and Nonsmooth
//! Analysis*, 1983).

use super::lines::{
    Sample, apart, dot, downhill, edge_of_box, meeting, meeting_height, same_seats, standstill,
};

/// What is found: the values at the centre, and the least.
pub(super) struct Least {
    /// At the nominal values.
    pub centre: Sample,
    /// At the worst ones found.
    pub worst: Sample,
    /// Whether the search came to its end.
    pub complete: bool,
}

/// What the search needs: the value and slopes at a point; `None` ends the search (cancelled, or not solvable there).
pub(super) type Evaluate<'a> = dyn FnMut(&[f64]) -> Option<Sample> + 'a;

/// Corners are tried one by one in boxes of up to this many tolerances.
const MOST_FOR_ALL_CORNERS: usize = 8;
/// Steps of one search along a line: bisection alone would narrow it to 1e-12 of the box.
const LINE_STEPS: usize = 44;
/// Lines followed from one start.
const DESCENTS: usize = 24;
/// Starts for the search inside the box.
const STARTS: usize = 4;
/// Halvings that close in on a jump, and the lines on which that is done.
const HALVINGS: usize = 24;
const JUMPS: usize = 2;
/// After so many, values that differ by no more than the slopes on the way are taken to be even.
const EVEN: usize = 8;

/// Finds the least value over the box. A value at or below `floor` (zero for a gap, with its uncertainty) cannot be
/// undercut. Where the function is `smooth` at the nominal values, slopes there are trusted to name the corner.
pub(super) fn least(
    dimensions: usize,
    floor: f64,
    smooth: bool,
    evaluate: &mut Evaluate<'_>,
) -> Option<Least> {
    let mut search = Search {
        evaluate,
        floor,
        jumps: false,
    };
    let centre = search.at(vec![0.0; dimensions])?;
    let corner = search.at(corner_below(&centre.slopes))?;
    let agree = |other: &Sample| {
        same_signs(&centre.slopes, &other.slopes) && same_seats(&centre.seats, &other.seats)
    };
    let complete = |centre: &Sample, worst: Sample| {
        Some(Least {
            centre: centre.clone(),
            worst,
            complete: true,
        })
    };
    if dimensions == 0 {
        return complete(&centre, corner);
    }
    if smooth && agree(&corner) && corner.value <= centre.value {
        // A roof beyond the centre would show here: an edge that two levels take turns to be.
        let across = search.at(corner.point.iter().map(|at| -at).collect())?;
        if agree(&across) && centre.value <= across.value {
            return complete(&centre, corner);
        }
    }
    let worst = search.inside(&centre, corner)?;
    let complete = dimensions == 1 || !search.jumps;
    Some(Least {
        centre,
        worst,
        complete,
    })
}

/// The corner to which all slopes fall.
fn corner_below(slopes: &[f64]) -> Vec<f64> {
    slopes
        .iter()
        .map(|slope| if *slope > 0.0 { -1.0 } else { 1.0 })
        .collect()
}

fn same_signs(a: &[f64], b: &[f64]) -> bool {
    a.iter().zip(b).all(|(a, b)| a * b >= 0.0)
}

struct Search<'a, 'b> {
    evaluate: &'a mut Evaluate<'b>,
    floor: f64,
    /// Whether the value jumps somewhere in the box.
    jumps: bool,
}

impl Search<'_, '_> {
    fn at(&mut self, point: Vec<f64>) -> Option<Sample> {
        (self.evaluate)(&point).filter(|sample| sample.value.is_finite())
    }

    /// The least value where signs differ: every corner, then descents from the best starts.
    fn inside(&mut self, centre: &Sample, first: Sample) -> Option<Sample> {
        let mut starts = vec![centre.clone(), first];
        self.add_corners(centre, &mut starts)?;
        starts.sort_by(|a, b| a.value.total_cmp(&b.value));
        let mut best = starts.first()?.clone();
        for pair in crossings(&starts) {
            let (end, _) = self.along(&pair.0, &pair.1)?;
            if end.value < best.value {
                best = end;
            }
            if best.value <= self.floor {
                return Some(best);
            }
        }
        let leaps = neighbours(&starts).filter(|(a, b)| !same_seats(&a.seats, &b.seats));
        let leaps: Vec<(Sample, Sample)> = leaps.map(|(a, b)| (a.clone(), b.clone())).collect();
        for (a, b) in leaps.into_iter().take(JUMPS) {
            let side = self.leap(a, b)?;
            if side.value < best.value {
                best = side;
            }
        }
        if centre.point.len() == 1 {
            return Some(best);
        }
        starts.truncate(STARTS);
        starts.push(best.clone());
        for start in starts {
            let end = self.descend(start)?;
            if end.value < best.value {
                best = end;
            }
            if best.value <= self.floor {
                break;
            }
        }
        Some(best)
    }

    fn add_corners(&mut self, centre: &Sample, starts: &mut Vec<Sample>) -> Option<()> {
        let dimensions = centre.point.len();
        if dimensions <= MOST_FOR_ALL_CORNERS {
            for bits in 0..1_u32 << dimensions {
                let point: Vec<f64> = (0..dimensions)
                    .map(|axis| if bits >> axis & 1 == 1 { 1.0 } else { -1.0 })
                    .collect();
                if starts.iter().all(|start| start.point != point) {
                    starts.push(self.at(point)?);
                }
            }
            return Some(());
        }
        for _ in 0..MOST_FOR_ALL_CORNERS {
            let point = corner_below(&starts.last()?.slopes);
            if starts.iter().any(|start| start.point == point) {
                break;
            }
            starts.push(self.at(point)?);
        }
        Some(())
    }

    /// The lower side of a jump between two points.
    fn leap(&mut self, mut left: Sample, mut right: Sample) -> Option<Sample> {
        for step in 0..HALVINGS {
            let ends = right.point.iter().zip(&left.point);
            let way: Vec<f64> = ends.map(|(right, left)| right - left).collect();
            let change = |side: &Sample| dot(&side.slopes, &way).abs();
            let lower = if left.value < right.value {
                &left
            } else {
                &right
            };
            if change(lower) <= lower.doubt.max(1e-7 * lower.value.abs()) {
                break;
            }
            // Valleys that symmetry makes equal take over from one another at one value.
            let even = (left.value - right.value).abs() <= change(&left) + change(&right);
            if same_seats(&left.seats, &right.seats) || step >= EVEN && even {
                return Some(lower.clone());
            }
            let place = left.point.iter().zip(&way);
            let middle = self.at(place.map(|(at, way)| at + 0.5 * way).collect())?;
            if apart(&middle.seats, &left.seats) <= apart(&middle.seats, &right.seats) {
                left = middle;
            } else {
                right = middle;
            }
        }
        self.jumps = true;
        Some(if left.value < right.value {
            left
        } else {
            right
        })
    }

    /// Steepest descent over lines, at kinks along the valley.
    fn descend(&mut self, start: Sample) -> Option<Sample> {
        let mut here = start;
        let mut other: Option<Vec<f64>> = None;
        for _ in 0..DESCENTS {
            let Some(direction) = downhill(&here, other.as_deref()) else {
                break;
            };
            let end = self.at(edge_of_box(&here.point, &direction))?;
            let (next, far_slopes) = self.along(&here, &end)?;
            let gained = here.value - next.value;
            let moved = next.value < here.value;
            other = Some(far_slopes);
            if moved {
                here = next;
            }
            if here.value <= self.floor || gained <= here.doubt.max(1e-12 * here.value.abs()) {
                break;
            }
        }
        Some(here)
    }

    /// The least value between two points, and the slopes on the far side of it.
    fn along(&mut self, from: &Sample, to: &Sample) -> Option<(Sample, Vec<f64>)> {
        let direction: Vec<f64> = to
            .point
            .iter()
            .zip(&from.point)
            .map(|(to, from)| to - from)
            .collect();
        let (mut low, mut high) = (0.0_f64, 1.0_f64);
        let (mut left, mut right) = (from.clone(), to.clone());
        if dot(&left.slopes, &direction) >= 0.0 {
            return Some((from.clone(), right.slopes));
        }
        if dot(&right.slopes, &direction) <= 0.0 && right.value <= left.value {
            return Some((right.clone(), left.slopes));
        }
        let slope = |sample: &Sample| dot(&sample.slopes, &direction);
        // The last two places with the slopes there.
        let mut recent = [(low, slope(&left)), (high, slope(&right))];
        for step in 0..LINE_STEPS {
            let middle = 0.5 * (low + high);
            let try_at = match step % 6 {
                1 | 2 | 4 => standstill(recent, low, high),
                5 => middle,
                _ => meeting(&left, &right, &direction, low, high),
            };
            let point = from
                .point
                .iter()
                .zip(&direction)
                .map(|(p, d)| (p + try_at * d).clamp(-1.0, 1.0))
                .collect();
            let sample = self.at(point)?;
            recent = [recent[1], (try_at, slope(&sample))];
            if slope(&sample) < 0.0 && sample.value <= from.value {
                (low, left) = (try_at, sample);
            } else {
                (high, right) = (try_at, sample);
            }
            let best = if left.value <= right.value {
                &left
            } else {
                &right
            };
            // Between convex sides the value cannot fall below where the tangents meet; where they meet above it, the
            // sides are not convex.
            let possible = meeting_height(&left, &right, &direction, low, high);
            let near = best.doubt.max(1e-11 * best.value.abs());
            if best.value <= self.floor
                || high - low < 1e-13
                || (best.value - possible).abs() <= near
            {
                break;
            }
        }
        let (best, far) = if left.value <= right.value {
            (left, right)
        } else {
            (right, left)
        };
        Some((best, far.slopes))
    }
}

/// Pairs of points next to each other, or of one and the centre.
fn neighbours(samples: &[Sample]) -> impl Iterator<Item = (&Sample, &Sample)> {
    let central = |sample: &Sample| sample.point.iter().all(|t| *t == 0.0);
    let pairs = samples.iter().enumerate().flat_map(|(index, a)| {
        let later = samples.iter().skip(index + 1);
        later.map(move |b| (a, b))
    });
    pairs.filter(move |(a, b)| {
        let differ = a.point.iter().zip(&b.point).filter(|(a, b)| a != b).count();
        differ <= 1 || central(a) || central(b)
    })
}

/// Those of points by rising value between which the function falls from the lower one.
fn crossings(samples: &[Sample]) -> Vec<(Sample, Sample)> {
    let falls = |(a, b): &(&Sample, &Sample)| {
        let direction: Vec<f64> = { b.point.iter().zip(&a.point) }
            .map(|(b, a)| b - a)
            .collect();
        -dot(&a.slopes, &direction) > a.doubt.max(1e-9 * a.value.abs())
    };
    let pairs = neighbours(samples).filter(falls);
    pairs.map(|(a, b)| (a.clone(), b.clone())).collect()
}

#[cfg(test)]
#[allow(clippy::indexing_slicing)]
mod tests {
    use super::*;

    fn sample(point: &[f64], (value, slopes): (f64, Vec<f64>), seats: Vec<f64>) -> Sample {
        Sample {
            point: point.to_vec(),
            value,
            slopes,
            doubt: 0.0,
            seats,
        }
    }

    fn search(dimensions: usize, f: impl Fn(&[f64]) -> (f64, Vec<f64>)) -> (f64, usize) {
        let mut count = 0;
        let mut evaluate = |point: &[f64]| {
            count += 1;
            Some(sample(point, f(point), Vec::new()))
        };
        let value = least(dimensions, f64::NEG_INFINITY, true, &mut evaluate)
            .map(|found| found.worst.value);
        (value.expect("a least value"), count)
    }

    /// A grid over the box, as fine as its dimension allows.
    fn brute(dimensions: usize, f: impl Fn(&[f64]) -> f64) -> f64 {
        let n: i32 = [1, 4001, 161, 41, 15][dimensions];
        let mut least = f64::INFINITY;
        for index in 0..n.pow(dimensions as u32) {
            let point: Vec<f64> = (0..dimensions)
                .map(|axis| {
                    -1.0 + 2.0 * f64::from(index / n.pow(axis as u32) % n) / f64::from(n - 1)
                })
                .collect();
            least = least.min(f(&point));
        }
        least
    }

    #[test]
    fn a_monotone_function_takes_three_evaluations() {
        let (value, count) = search(3, |t| {
            (t[0] + 2.0 * t[1] - 0.5 * t[2], vec![1.0, 2.0, -0.5])
        });
        assert_eq!((value, count), (-3.5, 3));
    }

    #[test]
    fn a_kink_between_good_corners_is_found() {
        let f = |t: &[f64]| (3.0 * t[0] - 0.7).abs() + 0.1 * t[0];
        let slopes = |t: &[f64]| vec![3.0 * (3.0 * t[0] - 0.7).signum() + 0.1];
        let (value, count) = search(1, |t| (f(t), slopes(t)));
        assert!((value - 0.1 * 0.7 / 3.0).abs() < 1e-9, "{value}");
        assert!(count < 60, "{count} evaluations");
    }

    /// At a kink the mean slope names one corner, and its own slope agrees, though the other corner lies lower.
    #[test]
    fn a_kink_at_the_nominal_values_is_not_trusted() {
        let f = |t: &[f64]| if t[0] > 0.0 { -t[0] } else { 4.0 * t[0] };
        let slopes = |t: &[f64]| match t[0].partial_cmp(&0.0) {
            Some(std::cmp::Ordering::Greater) => vec![-1.0],
            Some(std::cmp::Ordering::Less) => vec![4.0],
            _ => vec![-0.1],
        };
        let least_by = |smooth: bool| {
            let mut evaluate = |t: &[f64]| Some(sample(t, (f(t), slopes(t)), Vec::new()));
            let found = least(1, f64::NEG_INFINITY, smooth, &mut evaluate);
            found.expect("a least value").worst.value
        };
        assert_eq!([true, false].map(least_by), [-4.0, -4.0]);
    }

    /// Sides that bend towards the axis: their tangents meet above the value already found.
    #[test]
    fn a_kink_between_hollow_sides_is_found() {
        let way = |t: &[f64]| t[0] - 0.3317;
        let f = |t: &[f64]| 1.0 - (-3.0 * way(t).abs()).exp();
        let slopes = |t: &[f64]| vec![3.0 * way(t).signum() * (-3.0 * way(t).abs()).exp()];
        let (value, count) = search(1, |t| (f(t), slopes(t)));
        assert!(value < 1e-9, "{value}");
        assert!(count < 100, "{count} evaluations");
    }

    /// Where another valley takes over the value jumps up: the last before it is the least, though every slope says go on.
    #[test]
    fn the_edge_of_a_jump_is_found() {
        let first = |t: &[f64]| t[0] + 0.2 * t[1] < 0.37;
        let at = |t: &[f64]| match first(t) {
            true => sample(t, (1.0 - t[0], vec![-1.0, 0.0]), vec![0.5]),
            false => sample(t, (1.9 - t[0], vec![-1.0, 0.0]), vec![0.0]),
        };
        let mut along = |t: &[f64]| Some(at(&[t[0], 0.0]));
        let found = least(1, f64::NEG_INFINITY, true, &mut along).expect("a least value");
        let error = found.worst.value - 0.63;
        assert!((0.0..1e-6).contains(&error) && found.complete, "{error}");
        // Across more tolerances it is not known whether the edge was met at its lowest.
        let mut both = |t: &[f64]| Some(at(t));
        let found = least(2, f64::NEG_INFINITY, true, &mut both).expect("a least value");
        assert!(found.worst.value < 0.7 && !found.complete);
    }

    #[test]
    fn the_least_of_a_smooth_bowl_is_found() {
        let f = |t: &[f64]| (t[0] - 0.3).powi(2) + 0.1 * (t[0] - 0.3).powi(3) + 1.0 - 0.1 * t[1];
        let slopes = |t: &[f64]| {
            let way = t[0] - 0.3;
            vec![2.0 * way + 0.3 * way * way, -0.1]
        };
        let (value, count) = search(2, |t| (f(t), slopes(t)));
        assert!((value - 0.9).abs() < 1e-9, "{value}");
        assert!(count < 120, "{count} evaluations");
    }

    #[test]
    fn a_lower_corner_behind_a_roof_is_found() {
        let f = |t: &[f64]| (1.0 + t[0]).min(2.6 - 3.0 * t[0]) + 0.1 * t[1];
        let slopes = |t: &[f64]| {
            vec![
                if 1.0 + t[0] < 2.6 - 3.0 * t[0] {
                    1.0
                } else {
                    -3.0
                },
                0.1,
            ]
        };
        let (value, _) = search(2, |t| (f(t), slopes(t)));
        assert!((value + 0.5).abs() < 1e-12, "{value}");
    }

    #[test]
    fn a_narrow_hyperbola_is_found() {
        let f = |t: &[f64]| ((t[0] - 0.3).powi(2) + 1e-10).sqrt();
        let (value, _) = search(1, |t| (f(t), vec![(t[0] - 0.3) / f(t)]));
        assert!((value - 1e-5).abs() < 1e-9, "{value}");
    }

    #[test]
    fn a_sloping_valley_is_followed_to_its_end() {
        for (a, b) in [
            ([1.0, 0.8, -0.5], [0.1, -0.05, 0.12]),
            ([0.4, -1.0, 0.9], [-0.2, 0.1, 0.03]),
        ] {
            let f = |t: &[f64]| (dot(&a, t) - 0.2).abs() + dot(&b, t);
            let slopes = |t: &[f64]| {
                let sign = (dot(&a, t) - 0.2).signum();
                a.iter().zip(&b).map(|(a, b)| sign * a + b).collect()
            };
            let (value, _) = search(3, |t| (f(t), slopes(t)));
            let grid = brute(3, f);
            assert!(value <= grid + 1e-6, "{value} is above the grid's {grid}");
        }
    }

    #[test]
    fn a_bowl_is_found_in_four_tolerances() {
        let f = |t: &[f64]| {
            t.iter()
                .enumerate()
                .map(|(i, t)| (1.0 + i as f64) * (t - 0.2).powi(2))
                .sum::<f64>()
        };
        let slopes = |t: &[f64]| {
            t.iter()
                .enumerate()
                .map(|(i, t)| 2.0 * (1.0 + i as f64) * (t - 0.2))
                .collect()
        };
        let (value, _) = search(4, |t| (f(t), slopes(t)));
        assert!(value < 1e-6 && value <= brute(4, f), "{value}");
    }
}
