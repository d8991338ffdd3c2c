//! Bounds for edges that have none of their own.
//!
//! Behind walls of hundreds of decay lengths D′ at an edge overflows or vanishes in `f64`, and the edge's own bound is
//! infinite. But edges rise,
//!
//! ```text
//! bottom₁ ≤ top₁ ≤ bottom₂ ≤ top₂ ≤ …
//! ```
//!
//! so that an edge lies between the nearest known ones below and above it, which are close where bands are narrow. Widths
//! and gaps are known as well as the edges that they lie between.

use super::cell::Bounded;
use super::solve::{Band, Gap};

/// Puts bounds where there are none but could be.
pub(crate) fn borrow(bands: &mut [Band], gaps: &mut [Gap]) {
    let edges = bands
        .iter()
        .flat_map(|band| [band.bottom.energy, band.top.energy]);
    let edges: Vec<Bounded> = edges.collect();
    if edges.iter().all(|edge| edge.error.is_finite()) {
        return;
    }
    for (index, band) in bands.iter_mut().enumerate() {
        place(&mut band.bottom.energy, &edges, 2 * index);
        place(&mut band.top.energy, &edges, 2 * index + 1);
        let known = apart(&band.width, &band.bottom.energy, &band.top.energy);
        take(&mut band.width, known);
    }
    for (gap, pair) in gaps.iter_mut().zip(bands.windows(2)) {
        let known = apart(&gap.size, &pair[0].top.energy, &pair[1].bottom.energy);
        if take(&mut gap.size, known) && gap.size.value <= known {
            gap.closed = true;
            gap.size.value = 0.0;
        }
    }
}

/// Puts an edge without a bound between the known ones below and above, if it is not there already.
fn place(edge: &mut Bounded, edges: &[Bounded], index: usize) {
    let known = |edge: &&Bounded| edge.error.is_finite();
    let below = edges[..index].iter().rev().find(known);
    let above = edges[index + 1..].iter().find(known);
    let (Some(below), Some(above), false) = (below, above, known(&&*edge)) else {
        return;
    };
    let (lowest, highest) = (below.value - below.error, above.value + above.error);
    if !(lowest..=highest).contains(&edge.value) {
        edge.value = 0.5 * (lowest + highest);
    }
    edge.error = (edge.value - lowest).max(highest - edge.value);
}

/// The bound on a distance by the edges that it lies between.
fn apart(distance: &Bounded, lower: &Bounded, upper: &Bounded) -> f64 {
    lower.error + upper.error + (distance.value - (upper.value - lower.value)).abs()
}

/// Gives a number a bound where it has none; says whether it did.
fn take(number: &mut Bounded, error: f64) -> bool {
    let lacks = number.error == f64::INFINITY && error.is_finite();
    if lacks {
        number.error = error;
    }
    lacks
}
