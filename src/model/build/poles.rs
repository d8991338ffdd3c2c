//! Where a formula blows up.
//!
//! Bounds of the formula over boxes of positions (interval arithmetic: Moore,
//! Kearfott and Cloud, *Introduction to Interval Analysis*, SIAM 2009). A box over which the
//! bounds are finite holds no pole; the others are halved. What stays unbounded down to
//! [`FINEST`] is looked at by value. The search is bounded, and gives up in favour of the formula.

use crate::model::Formula;
use crate::syntax::Operator;

/// The smallest box, as a share of the region.
const FINEST: f64 = 1e-9;
/// The number of boxes looked at.
const BUDGET: usize = 4000;
/// How much larger than elsewhere a value is that counts as blowing up.
const BLOWN_UP: f64 = 1e6;

/// A range of values; unbounded where it may not be finite.
#[derive(Clone, Copy, Debug, PartialEq)]
struct Range {
    low: f64,
    high: f64,
}

const UNBOUNDED: Range = Range {
    low: f64::NEG_INFINITY,
    high: f64::INFINITY,
};

/// The first coordinate of a place in the region where the formula is not finite, if one is found.
pub(super) fn find_pole(formula: &Formula, region: &[[f64; 2]; 3]) -> Option<f64> {
    if !formula.varies() {
        return None;
    }
    let mut waiting = vec![*region];
    for _ in 0..BUDGET {
        let cell = waiting.pop()?;
        if bounds(formula, &cell).is_finite() {
            continue;
        }
        match halves(&cell, region) {
            Some([left, right]) => waiting.extend([right, left]),
            None => {
                if blows_up(formula, &cell, usual_size(formula, region)) {
                    return Some(middle(&cell)[0]);
                }
            }
        }
    }
    None
}

/// The median magnitude at places scattered evenly (multiples of irrational shares) over the region.
fn usual_size(formula: &Formula, region: &[[f64; 2]; 3]) -> f64 {
    const SHARES: [f64; 3] = [
        0.618_033_988_749_895,
        0.754_877_666_246_693,
        0.569_840_290_998_053,
    ];
    let mut sizes: Vec<f64> = (1..64)
        .map(|count| {
            let mut place = [0.0; 3];
            for ((at, share), [low, high]) in place.iter_mut().zip(SHARES).zip(region) {
                *at = low + (high - low) * (f64::from(count) * share).fract();
            }
            formula.at(&place).abs()
        })
        .filter(|size| size.is_finite())
        .collect();
    sizes.sort_by(f64::total_cmp);
    sizes.get(sizes.len() / 2).copied().unwrap_or(0.0)
}

fn middle(cell: &[[f64; 2]; 3]) -> [f64; 3] {
    cell.map(|[low, high]| low + 0.5 * (high - low))
}

/// Halves along the side that is longest as a share of the region; `None` where the box is fine enough.
fn halves(cell: &[[f64; 2]; 3], region: &[[f64; 2]; 3]) -> Option<[[[f64; 2]; 3]; 2]> {
    let share = |axis: usize| -> f64 {
        match (cell.get(axis), region.get(axis)) {
            (Some([low, high]), Some([from, to])) if to > from => (high - low) / (to - from),
            _ => 0.0,
        }
    };
    let axis = (0..3).max_by(|a, b| share(*a).total_cmp(&share(*b)))?;
    if share(axis) < FINEST {
        return None;
    }
    let cut = *middle(cell).get(axis)?;
    let (mut left, mut right) = (*cell, *cell);
    left.get_mut(axis)?[1] = cut;
    right.get_mut(axis)?[0] = cut;
    Some([left, right])
}

/// Whether the values in a tiny box are not finite, or far beyond the usual.
fn blows_up(formula: &Formula, cell: &[[f64; 2]; 3], usual: f64) -> bool {
    let ends = [
        cell.map(|side| side[0]),
        middle(cell),
        cell.map(|side| side[1]),
    ];
    ends.iter().any(|place| {
        let value = formula.at(place);
        !value.is_finite() || value.abs() > BLOWN_UP * usual.max(f64::MIN_POSITIVE)
    })
}

impl Range {
    fn of(a: f64, b: f64) -> Self {
        if a.is_nan() || b.is_nan() {
            return UNBOUNDED;
        }
        Self {
            low: a.min(b),
            high: a.max(b),
        }
    }

    fn is_finite(self) -> bool {
        self.low.is_finite() && self.high.is_finite()
    }

    fn holds(self, value: f64) -> bool {
        self.low <= value && value <= self.high
    }

    fn corners(self, other: Self, combine: fn(f64, f64) -> f64) -> Self {
        let values = [
            combine(self.low, other.low),
            combine(self.low, other.high),
            combine(self.high, other.low),
            combine(self.high, other.high),
        ];
        if !self.is_finite() || !other.is_finite() || values.iter().any(|value| value.is_nan()) {
            return UNBOUNDED;
        }
        Self {
            low: values.iter().copied().fold(f64::INFINITY, f64::min),
            high: values.iter().copied().fold(f64::NEG_INFINITY, f64::max),
        }
    }

    fn map(self, function: fn(f64) -> f64) -> Self {
        if !self.is_finite() {
            return UNBOUNDED;
        }
        Self::of(function(self.low), function(self.high))
    }
}

fn bounds(formula: &Formula, cell: &[[f64; 2]; 3]) -> Range {
    match formula {
        Formula::Constant(value) => Range::of(value.value, value.value),
        Formula::Variable(index) => cell
            .get(*index)
            .map_or(UNBOUNDED, |side| Range::of(side[0], side[1])),
        Formula::Negative(inner) => {
            let inner = bounds(inner, cell);
            Range::of(-inner.high, -inner.low)
        }
        Formula::Binary(Operator::Power, base, exponent) => {
            power(bounds(base, cell), bounds(exponent, cell))
        }
        Formula::Binary(operator, left, right) => {
            let (a, b) = (bounds(left, cell), bounds(right, cell));
            match operator {
                Operator::Add => a.corners(b, |x, y| x + y),
                Operator::Subtract => a.corners(b, |x, y| x - y),
                Operator::Multiply => a.corners(b, |x, y| x * y),
                _ if b.holds(0.0) => UNBOUNDED,
                _ => a.corners(b, |x, y| x / y),
            }
        }
        Formula::Call(name, arguments) => {
            let ranges: Vec<Range> = arguments.iter().map(|one| bounds(one, cell)).collect();
            call(name, &ranges)
        }
    }
}

fn power(base: Range, exponent: Range) -> Range {
    if !base.is_finite() || !exponent.is_finite() {
        return UNBOUNDED;
    }
    let fixed = exponent.low == exponent.high;
    let whole = fixed && exponent.low.fract() == 0.0;
    let n = exponent.low;
    if whole && n >= 0.0 {
        let ends = Range::of(base.low.powf(n), base.high.powf(n));
        let dips = n % 2.0 == 0.0 && n > 0.0 && base.holds(0.0);
        return Range {
            low: if dips { 0.0 } else { ends.low },
            ..ends
        };
    }
    if whole && !base.holds(0.0) {
        return Range::of(base.low.powf(n), base.high.powf(n));
    }
    if base.low > 0.0 || (base.low >= 0.0 && exponent.low > 0.0) {
        return base.corners(exponent, f64::powf);
    }
    UNBOUNDED
}

/// A sine or cosine whose first crest stands at `crest`.
fn wave(u: Range, crest: f64, function: fn(f64) -> f64) -> Range {
    use std::f64::consts::{PI, TAU};
    let passes = |at: f64| ((u.low - at) / TAU).ceil() * TAU + at <= u.high;
    let ends = Range::of(function(u.low), function(u.high));
    Range {
        low: if passes(crest + PI) { -1.0 } else { ends.low },
        high: if passes(crest) { 1.0 } else { ends.high },
    }
}

fn call(name: &str, ranges: &[Range]) -> Range {
    let Some(u) = ranges.first().copied() else {
        return UNBOUNDED;
    };
    if ranges.iter().any(|range| !range.is_finite()) {
        // Bounded whatever they are given, yet what is not finite stays so.
        return UNBOUNDED;
    }
    match name {
        "min" => ranges
            .iter()
            .skip(1)
            .fold(u, |a, b| Range::of(a.low.min(b.low), a.high.min(b.high))),
        "max" => ranges
            .iter()
            .skip(1)
            .fold(u, |a, b| Range::of(a.low.max(b.low), a.high.max(b.high))),
        "sin" => wave(u, std::f64::consts::FRAC_PI_2, f64::sin),
        "cos" => wave(u, 0.0, f64::cos),
        "tan" => {
            let branch = |x: f64| (x / std::f64::consts::PI + 0.5).floor();
            if branch(u.low) == branch(u.high) {
                u.map(f64::tan)
            } else {
                UNBOUNDED
            }
        }
        "sqrt" if u.low >= 0.0 => u.map(f64::sqrt),
        "log" if u.low > 0.0 => u.map(f64::ln),
        "log10" if u.low > 0.0 => u.map(f64::log10),
        "asin" if u.low >= -1.0 && u.high <= 1.0 => u.map(f64::asin),
        "acos" if u.low >= -1.0 && u.high <= 1.0 => u.map(f64::acos),
        "sqrt" | "log" | "log10" | "asin" | "acos" => UNBOUNDED,
        "exp" => u.map(f64::exp),
        "atan" => u.map(f64::atan),
        "sinh" => u.map(f64::sinh),
        "cosh" => Range::of(
            if u.holds(0.0) {
                1.0
            } else {
                u.low.cosh().min(u.high.cosh())
            },
            u.low.cosh().max(u.high.cosh()),
        ),
        "tanh" => u.map(f64::tanh),
        "sech" => Range::of(0.0, 1.0),
        "abs" => Range::of(
            if u.holds(0.0) {
                0.0
            } else {
                u.low.abs().min(u.high.abs())
            },
            u.low.abs().max(u.high.abs()),
        ),
        "floor" => u.map(f64::floor),
        "ceil" => u.map(f64::ceil),
        "round" => u.map(f64::round),
        _ => UNBOUNDED,
    }
}
