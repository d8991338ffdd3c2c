//! Geometry of the search for a worst case: points of the box with their slopes, and lines between them.

/// A point of the box, the value there and the slopes.
#[derive(Clone, Debug)]
pub(super) struct Sample {
    pub point: Vec<f64>,
    pub value: f64,
    pub slopes: Vec<f64>,
    /// The numerical error of the value.
    pub doubt: f64,
    /// Where in k the extrema lie that the value hangs on: it jumps where these do.
    pub seats: Vec<f64>,
}

/// Seats farther apart than this (fractions of the reciprocal vectors) are different extrema.
const SAME_SEAT: f64 = 0.05;

pub(super) fn same_seats(a: &[f64], b: &[f64]) -> bool {
    apart(a, b) <= SAME_SEAT
}

pub(super) fn apart(a: &[f64], b: &[f64]) -> f64 {
    let pairs = a.iter().zip(b);
    pairs.map(|(a, b)| (a - b).abs()).fold(0.0, f64::max)
}

pub(super) fn dot(a: &[f64], b: &[f64]) -> f64 {
    a.iter().zip(b).map(|(a, b)| a * b).sum()
}

/// Where the tangents from both ends meet; the middle where they do not meet between.
pub(super) fn meeting(
    left: &Sample,
    right: &Sample,
    direction: &[f64],
    low: f64,
    high: f64,
) -> f64 {
    between(tangents(left, right, direction, low, high).place, low, high)
}

/// Two tangents and the place where they meet.
struct Tangents {
    down: f64,
    up: f64,
    place: f64,
}

fn tangents(left: &Sample, right: &Sample, direction: &[f64], low: f64, high: f64) -> Tangents {
    let (down, up) = (dot(&left.slopes, direction), dot(&right.slopes, direction));
    Tangents {
        down,
        up,
        place: (right.value - left.value + down * low - up * high) / (down - up),
    }
}

/// Where a slope that changes evenly between two places is zero; the middle where that is not between.
pub(super) fn standstill(recent: [(f64, f64); 2], low: f64, high: f64) -> f64 {
    let [(one, down), (other, up)] = recent;
    let place = one + (other - one) * down / (down - up);
    if place > low && place < high {
        place
    } else {
        0.5 * (low + high)
    }
}

/// A place well inside an interval, or else its middle.
fn between(place: f64, low: f64, high: f64) -> f64 {
    let margin = 1e-3 * (high - low);
    if place > low + margin && place < high - margin {
        place
    } else {
        0.5 * (low + high)
    }
}

/// The value at which the tangents from both ends meet; without bound where the far one does not rise.
pub(super) fn meeting_height(
    left: &Sample,
    right: &Sample,
    direction: &[f64],
    low: f64,
    high: f64,
) -> f64 {
    let Tangents { down, up, place } = tangents(left, right, direction, low, high);
    if up <= 0.0 {
        return f64::NEG_INFINITY;
    }
    left.value + down * (place - low)
}

/// Minus the shortest vector between the slopes of both sides, kept inside the box.
pub(super) fn downhill(here: &Sample, other: Option<&[f64]>) -> Option<Vec<f64>> {
    let mut slopes = here.slopes.clone();
    if let Some(other) = other {
        let difference: Vec<f64> = other.iter().zip(&slopes).map(|(b, a)| b - a).collect();
        let size = dot(&difference, &difference);
        if size > 0.0 {
            let share = (-dot(&slopes, &difference) / size).clamp(0.0, 1.0);
            slopes
                .iter_mut()
                .zip(&difference)
                .for_each(|(slope, step)| *slope += share * step);
        }
    }
    let steepest = here
        .slopes
        .iter()
        .fold(0.0_f64, |most, slope| most.max(slope.abs()));
    let direction: Vec<f64> = slopes
        .iter()
        .zip(&here.point)
        .map(|(slope, at)| {
            if (*at >= 1.0 && *slope < 0.0) || (*at <= -1.0 && *slope > 0.0) {
                0.0
            } else {
                -slope
            }
        })
        .collect();
    let length = dot(&direction, &direction).sqrt();
    (length > 1e-9 * steepest).then(|| direction.iter().map(|step| step / length).collect())
}

/// The last point of the box in a direction.
pub(super) fn edge_of_box(point: &[f64], direction: &[f64]) -> Vec<f64> {
    let reach = point
        .iter()
        .zip(direction)
        .filter(|(_, step)| **step != 0.0)
        .map(|(at, step)| (step.signum() - at) / step)
        .fold(f64::INFINITY, f64::min);
    let reach = if reach.is_finite() {
        reach.max(0.0)
    } else {
        0.0
    };
    point
        .iter()
        .zip(direction)
        .map(|(at, step)| (at + reach * step).clamp(-1.0, 1.0))
        .collect()
}
