//! The lowest, mean and highest value of a one-dimensional potential.

use crate::numerics::Budget;

use super::field::Field;
use super::layout::{self, Stretch};
use super::{PotentialRange, Unsolved};

/// Most panels that a smooth stretch is cut into, each with eight Gauss–Legendre nodes and a search for its extrema,
/// and most in all: a cell of many stretches needs few in each.
const PANELS: usize = 64;
const PANELS_IN_ALL: usize = 8192;
/// Steps of the golden-section search: the square root of rounding is reached, the value is then exact to rounding;
/// and with few panels.
const STEPS: usize = 40;
const FEWER_STEPS: usize = 20;

/// Nodes and weights of the eight-point Gauss–Legendre rule on −1 … 1 (Abramowitz & Stegun, Table 25.4).
const GAUSS: [(f64, f64); 4] = [
    (0.183_434_642_495_649_8, 0.362_683_783_378_362),
    (0.525_532_409_916_329, 0.313_706_645_877_887_3),
    (0.796_666_477_413_626_7, 0.222_381_034_453_374_48),
    (0.960_289_856_497_536_2, 0.101_228_536_290_376_26),
];

/// The range of a crystal's potential; deltas count in the mean alone.
pub(super) fn potential_range(
    field: &Field<'_>,
    budget: &Budget<'_>,
) -> Result<PotentialRange, Unsolved> {
    let stretches = layout::stretches(field.crystal, field.period);
    let mut range = PotentialRange {
        lowest: f64::INFINITY,
        mean: 0.0,
        highest: f64::NEG_INFINITY,
    };
    let panels = (PANELS_IN_ALL / stretches.len().max(1)).clamp(4, PANELS);
    for stretch in &stretches {
        if (budget.cancelled)() {
            return Err(Unsolved::Cancelled);
        }
        let ends = field.ends::<f64>(stretch);
        ends.iter().for_each(|end| widen(&mut range, *end));
        let share = field.length::<f64>(stretch) / field.period;
        if field.is_smooth(stretch) && share > 0.0 {
            range.mean += share * smooth_mean(field, stretch, panels, &mut range);
        } else {
            range.mean += share * 0.5 * (ends[0] + ends[1]);
        }
    }
    for delta in &field.crystal.potential.deltas {
        range.mean += delta.strength.value / field.period;
    }
    Ok(range)
}

fn widen(range: &mut PotentialRange, value: f64) {
    range.lowest = range.lowest.min(value);
    range.highest = range.highest.max(value);
}

/// The mean over a smooth stretch; its extrema widen the range.
fn smooth_mean(
    field: &Field<'_>,
    stretch: &Stretch,
    panels: usize,
    range: &mut PotentialRange,
) -> f64 {
    let (from, length) = (stretch.from.at, field.length::<f64>(stretch));
    let value = |share: f64| field.potential(stretch, &(from + share * length));
    let width = 1.0 / panels as f64;
    let steps = if panels < PANELS { FEWER_STEPS } else { STEPS };
    let mut mean = 0.0;
    let mut samples = Vec::with_capacity(panels + 1);
    samples.push(value(0.0));
    for panel in 0..panels {
        let middle = (panel as f64 + 0.5) * width;
        for (node, weight) in GAUSS {
            let step = 0.5 * width * node;
            mean += 0.5 * width * weight * (value(middle - step) + value(middle + step));
        }
        samples.push(value((panel as f64 + 1.0) * width));
    }
    for (index, triple) in samples.windows(3).enumerate() {
        if let [left, middle, right] = triple {
            let (low, high) = (index as f64 * width, (index as f64 + 2.0) * width);
            if middle <= left && middle <= right {
                widen(
                    range,
                    -highest_between(low, high, steps, &|share| -value(share)),
                );
            }
            if middle >= left && middle >= right {
                widen(range, highest_between(low, high, steps, &value));
            }
        }
    }
    for end in [(0.0, width), (1.0 - width, 1.0)] {
        widen(range, highest_between(end.0, end.1, steps, &value));
        widen(
            range,
            -highest_between(end.0, end.1, steps, &|share| -value(share)),
        );
    }
    mean
}

/// The highest value between two points, by golden section.
fn highest_between(mut low: f64, mut high: f64, steps: usize, value: &dyn Fn(f64) -> f64) -> f64 {
    let golden = 0.5 * (5.0_f64.sqrt() - 1.0);
    let (mut left, mut right) = (high - golden * (high - low), low + golden * (high - low));
    let (mut at_left, mut at_right) = (value(left), value(right));
    for _ in 0..steps {
        if at_left >= at_right {
            high = right;
            (right, at_right) = (left, at_left);
            left = high - golden * (high - low);
            at_left = value(left);
        } else {
            low = left;
            (left, at_left) = (right, at_right);
            right = low + golden * (high - low);
            at_right = value(right);
        }
    }
    at_left.max(at_right)
}
