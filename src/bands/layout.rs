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
    /// A delta.
    Delta(usize),
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
    /// The deltas at its left end.
    pub deltas: Vec<usize>,
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

/// Cuts a crystal into its stretches.
pub(super) fn stretches(crystal: &Crystal, period: f64) -> Vec<Stretch> {
    let (cuts, deltas) = cuts(crystal, period);
    let mut stretches: Vec<Stretch> = cuts
        .windows(2)
        .filter_map(|pair| match pair {
            [from, to] => Some(stretch(crystal, period, *from, *to)),
            _ => None,
        })
        .collect();
    number_layers(crystal, &mut stretches);
    for (delta, at) in deltas {
        let place = stretches.partition_point(|stretch| stretch.from.at < at - SAME * period);
        // A delta at the right end of the cell is the same as one at its left end.
        let place = if place == stretches.len() { 0 } else { place };
        if let Some(stretch) = stretches.get_mut(place) {
            stretch.deltas.push(delta);
        }
    }
    stretches
}

/// All cuts in order, equal ones once, and the deltas with their positions in the cell.
fn cuts(crystal: &Crystal, period: f64) -> (Vec<Cut>, Vec<(usize, f64)>) {
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
        let shift = (at / period).floor();
        let inside = at - shift * period;
        cuts.push(Cut {
            at: inside,
            mark: mark(-(shift as i64)),
        });
        inside
    };
    let mut deltas = Vec::new();
    for (index, delta) in potential.deltas.iter().enumerate() {
        deltas.push((index, add(delta.at.value, &|_| Mark::Delta(index))));
    }
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
    (merged(cuts, period), deltas)
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

fn stretch(crystal: &Crystal, period: f64, from: Cut, to: Cut) -> Stretch {
    let middle = 0.5 * (from.at + to.at);
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
        deltas: Vec::new(),
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
    let (mut index, mut face) = (0, layers.first().map_or(0.0, |layer| layer.length.value));
    for stretch in stretches {
        let middle = 0.5 * (stretch.from.at + stretch.to.at);
        while middle > face && index + 1 < layers.len() {
            index += 1;
            face += layers.get(index).map_or(0.0, |layer| layer.length.value);
        }
        stretch.layer = (index < layers.len()).then_some(index);
    }
}
