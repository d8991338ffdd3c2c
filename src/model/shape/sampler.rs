//! The potential of a one-dimensional crystal at a place, everything but its deltas.

use std::f64::consts::PI;

use super::images::sum_of_images;
use super::spline::CubicPiece;
use crate::model::{Crystal, Dual, ParameterId, Scalar, SiteShape};

/// A crystal's potential, prepared for many places.
#[derive(Clone, Debug)]
pub struct Sampler<'c> {
    crystal: &'c Crystal,
    period: Dual,
    /// Where each layer ends.
    layer_ends: Vec<Dual>,
    table: Vec<CubicPiece>,
}

impl Crystal {
    /// The period of a one-dimensional crystal, in metre.
    #[must_use]
    pub fn period(&self) -> Option<&Dual> {
        match self.vectors.as_slice() {
            [vector] => vector.first(),
            _ => None,
        }
    }

    /// The potential in joule at a place in metre, deltas left out; 0 where the crystal is not of one dimension.
    /// For many places use [`Crystal::sampler`].
    #[must_use]
    pub fn potential_at(&self, x: f64) -> f64 {
        self.sampler().map_or(0.0, |sampler| sampler.at(x))
    }

    /// The same with derivatives, those of `x` included.
    #[must_use]
    pub fn potential_dual_at(&self, x: &Dual) -> Dual {
        self.sampler()
            .map_or_else(Dual::default, |sampler| sampler.dual_at(x))
    }

    /// The potential prepared for many places; `None` where the crystal is not of one dimension.
    #[must_use]
    pub fn sampler(&self) -> Option<Sampler<'_>> {
        let period = self.period().filter(|period| period.value > 0.0)?.clone();
        let mut end = Dual::constant(0.0);
        let layers = self.potential.layers.iter();
        let layer_ends = layers
            .map(|layer| {
                end = &end + &layer.length;
                end.clone()
            })
            .collect();
        let table = self.potential.table.as_ref();
        Some(Sampler {
            crystal: self,
            layer_ends,
            table: table.map_or_else(Vec::new, |table| table.pieces(period.value)),
            period,
        })
    }

    /// Places in the cell, in metre from its start and sorted, where the potential may jump or bend: layer faces,
    /// joins of pieces, samples of a table, faces of boxes. Deltas are listed by themselves.
    #[must_use]
    pub fn breakpoints(&self) -> Vec<Dual> {
        let Some(sampler) = self.sampler() else {
            return Vec::new();
        };
        let mut places = sampler.layer_ends.clone();
        for piece in &self.potential.profile {
            places.extend(piece.range.iter().cloned());
        }
        if let Some(table) = &self.potential.table {
            places.extend(table.positions.iter().map(|x| Dual::constant(*x)));
        }
        for site in &self.potential.sites {
            if let (SiteShape::Box(sizes), Some(at)) = (&site.shape, site.at.first()) {
                if let Some(size) = sizes.first() {
                    let half = size.scaled(0.5);
                    places.extend([at - &half, at + &half]);
                }
            }
        }
        let mut places: Vec<Dual> = places
            .iter()
            .map(|place| into_cell(place, &sampler.period))
            .collect();
        places.sort_by(|a, b| a.value.total_cmp(&b.value));
        places.dedup_by(|a, b| (a.value - b.value).abs() <= 1e-12 * sampler.period.value);
        places
    }
}

/// The same place in [0, P); what lies on the far face to rounding lies on the near one.
fn into_cell<S: Scalar>(place: &S, period: &S) -> S {
    let turns = (place.value() / period.value() + 1e-12).floor();
    if turns == 0.0 {
        return place.clone();
    }
    place.minus(&period.scaled(turns))
}

/// The same place in [start, start + P).
fn from_start<S: Scalar>(place: &S, start: f64, period: &S) -> S {
    let turns = ((place.value() - start) / period.value()).floor();
    if turns == 0.0 {
        return place.clone();
    }
    place.minus(&period.scaled(turns))
}

impl Sampler<'_> {
    /// The potential in joule at a place in metre.
    #[must_use]
    pub fn at(&self, x: f64) -> f64 {
        self.evaluate(&x)
    }

    /// The same with derivatives.
    #[must_use]
    pub fn dual_at(&self, x: &Dual) -> Dual {
        self.evaluate(x)
    }

    fn evaluate<S: Scalar>(&self, x: &S) -> S {
        let period = S::lift(&self.period);
        let mut sum = self.smooth_sum(x, &period);
        sum = sum.plus(&self.layers_at(x, &period));
        sum = sum.plus(&self.profile_at(x, &period));
        sum.plus(&self.table_at(x, &period))
    }

    /// Waves and sites.
    fn smooth_sum<S: Scalar>(&self, x: &S, period: &S) -> S {
        let potential = &self.crystal.potential;
        let angle = x.over(period).scaled(2.0 * PI);
        let mut sum = S::number(0.0);
        for wave in &potential.waves {
            let angles: Vec<S> = wave
                .indices
                .iter()
                .filter_map(|index| index.first())
                .map(|index| {
                    #[expect(clippy::cast_precision_loss, reason = "indices are small")]
                    let factor = *index as f64;
                    angle.scaled(factor)
                })
                .collect();
            sum = sum.plus(&wave.value_at(&angles));
        }
        for site in &potential.sites {
            let Some(at) = site.at.first() else { continue };
            let from = x.minus(&S::lift(at));
            if let Some(shape) = sum_of_images(&site.shape, &from, period) {
                sum = sum.plus(&shape.times(&S::lift(&site.energy)));
            }
        }
        sum
    }

    fn layers_at<S: Scalar>(&self, x: &S, period: &S) -> S {
        let inside = from_start(x, 0.0, period);
        let index = self
            .layer_ends
            .partition_point(|end| end.value <= inside.value());
        let layers = &self.crystal.potential.layers;
        let Some(layer) = layers.get(index).or(layers.last()) else {
            return S::number(0.0);
        };
        let [left, right] = &layer.edge;
        if left == right {
            return S::lift(left);
        }
        let start = match index
            .checked_sub(1)
            .and_then(|before| self.layer_ends.get(before))
        {
            Some(end) => S::lift(end),
            None => S::number(0.0),
        };
        let share = inside.minus(&start).over(&S::lift(&layer.length));
        let (left, right) = (S::lift(left), S::lift(right));
        left.plus(&right.minus(&left).times(&share))
    }

    fn profile_at<S: Scalar>(&self, x: &S, period: &S) -> S {
        let pieces = &self.crystal.potential.profile;
        let Some(first) = pieces.first() else {
            return S::number(0.0);
        };
        let inside = from_start(x, first.range[0].value, period);
        let index = pieces.partition_point(|piece| piece.range[1].value <= inside.value());
        let Some(piece) = pieces.get(index).or(pieces.last()) else {
            return S::number(0.0);
        };
        let nowhere = || S::number(0.0);
        piece.formula.evaluate(&[inside, nowhere(), nowhere()])
    }

    fn table_at<S: Scalar>(&self, x: &S, period: &S) -> S {
        let Some(first) = self.table.first() else {
            return S::number(0.0);
        };
        let inside = from_start(x, first.start, period);
        let u = inside.value();
        let index = self.table.partition_point(|piece| piece.end <= u);
        match self.table.get(index).or(self.table.last()) {
            Some(piece) => inside.chain(piece.at(u), || piece.slope_at(u)),
            None => S::number(0.0),
        }
    }

    /// The slope of the potential at a place, in joule per metre.
    #[must_use]
    pub fn slope_at(&self, x: f64) -> f64 {
        let id = ParameterId::POSITION[0];
        self.dual_at(&Dual::parameter(x, id)).slope(id)
    }
}
