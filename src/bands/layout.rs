//! How a one-dimensional crystal is cut into stretches on which its potential is smooth.
//!
//! Cell coordinates run from 0, the left face of the first layer, to the period. Cuts stand at every layer face,
//! end of a profile piece, sample of a table, edge of a box and delta.

use crate::model::{Crystal, SiteShape};

/// Cuts closer than this share of the period are one.
const SAME: f64 = 1e-13;

/// What a cut is, so that its position can be had with its derivatives too.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) enum Mark {
    /// The left end of the cell.
    Start,
    /// The right face of a layer.
    Face(usize),
    /// A delta, moved by whole periods.
    Delta(usize, i64),
    /// An end (0 left, 1 right) of a profile piece, moved by whole periods.
    PieceEnd(usize, usize, i64),
    /// A sample of the table.
    Knot(usize),
    /// An edge (−1 left, 1 right) of a box, moved by whole periods.
    BoxEdge(usize, i64, i64),
    /// The right end of the cell.
    End,
}

/// A cut and its position in metre.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Cut {
    pub at: f64,
    pub mark: Mark,
}

/// A stretch between two cuts and what adds up on it.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct Stretch {
    pub from: Cut,
    pub to: Cut,
    /// The layer it lies in.
    pub layer: Option<usize>,
    /// The piece of the profile, and the periods to add to reach its coordinate.
    pub piece: Option<(usize, i64)>,
    /// The table's sample at or before its left end.
    pub knot: Option<usize>,
    /// The boxes that cover it, once for each image that does.
    pub boxes: Vec<usize>,
    /// A place in it, or right of it where it has no length.
    middle: f64,
    /// Whether it is the whole of its layer at the values as they are, though a delta bounds it.
    pub spans_layer: bool,
}

impl Stretch {
    /// The delta at its left end.
    pub fn delta(&self) -> Option<usize> {
        match self.from.mark {
            Mark::Delta(index, _) => Some(index),
            _ => None,
        }
    }

    /// The length of its layer, where it is the whole of it.
    pub fn layer_length(&self, crystal: &Crystal) -> Option<f64> {
        let layer = self.layer.filter(|_| self.spans_layer)?;
        Some(crystal.potential.layers.get(layer)?.length.value)
    }
}

/// The period of a 1D crystal in metre: its layers' sum, else its lattice vector.
pub(super) fn period(crystal: &Crystal) -> Option<f64> {
    let layers: f64 = crystal
        .potential
        .layers
        .iter()
        .map(|layer| layer.length.value)
        .sum();
    let vector = crystal
        .vectors
        .first()
        .and_then(|vector| vector.first())
        .map(|length| length.value);
    let period = if layers > 0.0 { Some(layers) } else { vector };
    period.filter(|period| period.is_finite() && *period > 0.0)
}

/// Cuts a crystal into its stretches. A delta always has a cut of its own, right of any other at its place: between
/// the two lies a stretch of no length, which grows as the delta moves to the right.
pub(super) fn stretches(crystal: &Crystal, period: f64) -> Vec<Stretch> {
    let mut stretches = Vec::new();
    // From the right, so that a stretch of no length takes after its neighbour to the right.
    let mut middle = period;
    for pair in cuts(crystal, period).windows(2).rev() {
        let [from, to] = pair else { continue };
        if to.at > from.at {
            middle = 0.5 * (from.at + to.at);
        }
        stretches.push(stretch(crystal, period, (*from, *to), middle));
    }
    stretches.reverse();
    number_layers(crystal, &mut stretches);
    stretches
}

/// All cuts in order, equal ones once, deltas apart.
fn cuts(crystal: &Crystal, period: f64) -> Vec<Cut> {
    let potential = &crystal.potential;
    let mut cuts = vec![Cut {
        at: 0.0,
        mark: Mark::Start,
    }];
    let mut face = 0.0;
    for (index, layer) in potential.layers.iter().enumerate() {
        face += layer.length.value;
        cuts.push(Cut {
            at: face,
            mark: Mark::Face(index),
        });
    }
    let mut add = |at: f64, mark: &dyn Fn(i64) -> Mark| {
        let (inside, shift) = inside(at, period);
        cuts.push(Cut {
            at: inside,
            mark: mark(shift),
        });
    };
    for (index, piece) in potential
        .profile
        .iter()
        .enumerate()
        .filter(|(_, piece)| !piece.whole)
    {
        for (side, end) in piece.range.iter().enumerate() {
            add(end.value, &|shift| Mark::PieceEnd(index, side, shift));
        }
    }
    if let Some(table) = &potential.table {
        for (index, at) in table.positions.iter().enumerate() {
            add(*at, &|_| Mark::Knot(index));
        }
    }
    for (index, site) in potential.sites.iter().enumerate() {
        if let (SiteShape::Box(sizes), Some(centre)) = (&site.shape, site.at.first()) {
            let half = sizes.first().map_or(0.0, |size| 0.5 * size.value);
            for side in [-1, 1] {
                add(centre.value + side as f64 * half, &|shift| {
                    Mark::BoxEdge(index, side, shift)
                });
            }
        }
    }
    cuts.push(Cut {
        at: period,
        mark: Mark::End,
    });
    let deltas = potential.deltas.iter().enumerate();
    let deltas = deltas.map(|(index, delta)| {
        let (at, shift) = inside(delta.at.value, period);
        Cut {
            at,
            mark: Mark::Delta(index, shift),
        }
    });
    with_deltas(merged(cuts, period), deltas, period)
}

/// A position taken into the cell, and the periods added; what lies at the right end lies at the left one.
fn inside(at: f64, period: f64) -> (f64, i64) {
    let shift = (at / period).floor();
    let inside = at - shift * period;
    if inside >= period * (1.0 - SAME) {
        (0.0, -(shift as i64) - 1)
    } else {
        (inside, -(shift as i64))
    }
}

/// The cuts in order of position; of equal ones the first kept, the cell's ends before all.
fn merged(mut cuts: Vec<Cut>, period: f64) -> Vec<Cut> {
    cuts.retain(|cut| {
        matches!(cut.mark, Mark::Start | Mark::End) || cut.at < period * (1.0 - SAME)
    });
    cuts.sort_by(|a, b| a.at.total_cmp(&b.at));
    cuts.dedup_by(|later, first| {
        let same = later.at - first.at <= SAME * period;
        if same && later.mark == Mark::End {
            first.mark = Mark::End;
            first.at = later.at;
        }
        same
    });
    cuts
}

/// Puts the deltas between the other cuts, each right of the cut that it lies on.
fn with_deltas(mut cuts: Vec<Cut>, deltas: impl Iterator<Item = Cut>, period: f64) -> Vec<Cut> {
    let others = cuts.len();
    for delta in deltas {
        let near = cuts.get(..others).and_then(|cuts| {
            let after = cuts.partition_point(|cut| cut.at <= delta.at + SAME * period);
            cuts.get(after.checked_sub(1)?)
        });
        let on = near.filter(|cut| delta.at - cut.at <= SAME * period);
        cuts.push(Cut {
            at: on.map_or(delta.at, |cut| cut.at),
            ..delta
        });
    }
    cuts.sort_by(|a, b| a.at.total_cmp(&b.at));
    cuts
}

/// The stretch between two cuts, described at a place in it (or right of it, where it has no length).
fn stretch(crystal: &Crystal, period: f64, (from, to): (Cut, Cut), middle: f64) -> Stretch {
    let piece = crystal
        .potential
        .profile
        .iter()
        .enumerate()
        .find_map(|(index, piece)| {
            let [start, end] = &piece.range;
            let shift = if piece.whole {
                0.0
            } else {
                ((start.value - middle) / period).ceil()
            };
            let inside = piece.whole || middle + shift * period <= end.value;
            inside.then_some((index, shift as i64))
        });
    let knot = crystal.potential.table.as_ref().map(|table| {
        let after = table.positions.partition_point(|at| *at <= middle);
        if after == 0 {
            table.positions.len().saturating_sub(1)
        } else {
            after - 1
        }
    });
    let boxes = boxes_over(crystal, period, middle);
    Stretch {
        from,
        to,
        layer: None,
        piece,
        knot,
        boxes,
        middle,
        spans_layer: false,
    }
}

/// The boxes that cover a point, once for each image that does.
fn boxes_over(crystal: &Crystal, period: f64, point: f64) -> Vec<usize> {
    let mut over = Vec::new();
    for (index, site) in crystal.potential.sites.iter().enumerate() {
        if let (SiteShape::Box(sizes), Some(centre)) = (&site.shape, site.at.first()) {
            let half = sizes.first().map_or(0.0, |size| 0.5 * size.value);
            let first = ((point - half - centre.value) / period).ceil();
            let last = ((point + half - centre.value) / period).floor();
            let images = if last >= first {
                (last - first) as usize + 1
            } else {
                0
            };
            over.extend(std::iter::repeat_n(index, images));
        }
    }
    over
}

/// Gives each stretch the layer that it lies in.
fn number_layers(crystal: &Crystal, stretches: &mut [Stretch]) {
    let layers = &crystal.potential.layers;
    let (mut index, mut left) = (0, 0.0);
    let length = |index: usize| layers.get(index).map_or(0.0, |layer| layer.length.value);
    for stretch in stretches {
        let (from, to) = (stretch.from.at, stretch.to.at);
        while index + 1 < layers.len() && stretch.middle > left + length(index) {
            left += length(index);
            index += 1;
        }
        stretch.layer = (index < layers.len()).then_some(index);
        let ends = matches!(stretch.to.mark, Mark::Face(_) | Mark::End);
        stretch.spans_layer = ends && from == left && to > from;
    }
}
