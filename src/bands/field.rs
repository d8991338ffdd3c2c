//! Positions, potential and mass on the stretches of a one-dimensional crystal, as plain numbers or with their
//! derivatives.

use std::sync::OnceLock;

use crate::model::shape::images::sum_of_images;
use crate::model::shape::spline::CubicPiece;
use crate::model::{Crystal, Dual, MassLaw, Scalar, SiteShape};

use super::layout::{Cut, Mark, Stretch};

/// Derivatives of faces kept: a few thousand layers each written on a line of its own.
const MOST_SLOPES: usize = 10_000_000;

/// A 1D crystal and its period in metre.
pub(super) struct Field<'a> {
    pub crystal: &'a Crystal,
    pub period: f64,
    /// The table between its samples.
    table: Vec<CubicPiece>,
    /// The left face of each layer, then the right face of the last.
    faces: Vec<f64>,
    /// The same with their derivatives, from when derivatives are wanted.
    moving_faces: OnceLock<Vec<Dual>>,
}

impl<'a> Field<'a> {
    /// Of a crystal with this period.
    pub fn new(crystal: &'a Crystal, period: f64) -> Self {
        let table = crystal
            .potential
            .table
            .as_ref()
            .map_or_else(Vec::new, |table| table.pieces(period));
        let layers = &crystal.potential.layers;
        let mut faces = vec![0.0];
        for layer in layers {
            faces.push(faces.last().copied().unwrap_or(0.0) + layer.length.value);
        }
        Self {
            crystal,
            period,
            table,
            faces,
            moving_faces: OnceLock::new(),
        }
    }

    /// From now on faces carry their derivatives; `false` where these are too many to keep.
    pub fn follow_faces(&self) -> bool {
        if self.moving_faces.get().is_some() {
            return true;
        }
        let mut faces = vec![Dual::default()];
        let mut kept = 0;
        for layer in &self.crystal.potential.layers {
            let next = faces
                .last()
                .map_or_else(Dual::default, |face| Scalar::plus(face, &layer.length));
            kept += next.slopes.len();
            if kept > MOST_SLOPES {
                return false;
            }
            faces.push(next);
        }
        self.moving_faces.set(faces).is_ok()
    }

    /// The period.
    pub fn period<S: Scalar>(&self) -> S {
        let layers = &self.crystal.potential.layers;
        if layers.is_empty() {
            return match self
                .crystal
                .vectors
                .first()
                .and_then(|vector| vector.first())
            {
                Some(length) => S::lift(length),
                None => S::number(self.period),
            };
        }
        self.face(layers.len())
    }

    /// The left face of a layer: the sum of the lengths before it.
    fn face<S: Scalar>(&self, layers: usize) -> S {
        let fixed = || S::number(self.faces.get(layers).copied().unwrap_or(self.period));
        match self.moving_faces.get() {
            Some(faces) => faces.get(layers).map_or_else(fixed, S::lift),
            None => fixed(),
        }
    }

    /// The position of a cut.
    pub fn position<S: Scalar>(&self, cut: &Cut) -> S {
        let potential = &self.crystal.potential;
        let at = match cut.mark {
            Mark::Start => return S::number(0.0),
            Mark::End => return self.period(),
            Mark::Face(layer) => return self.face(layer + 1),
            Mark::Knot(_) => return S::number(cut.at),
            Mark::Delta(index, shift) => potential
                .deltas
                .get(index)
                .map(|delta| (S::lift(&delta.at), shift)),
            Mark::PieceEnd(index, side, shift) => potential
                .profile
                .get(index)
                .and_then(|piece| piece.range.get(side))
                .map(|end| (S::lift(end), shift)),
            Mark::BoxEdge(index, side, shift) => {
                self.box_edge(index, side).map(|edge| (edge, shift))
            }
        };
        match at {
            Some((at, 0)) => at,
            Some((at, shift)) => at.plus(&self.period::<S>().scaled(shift as f64)),
            None => S::number(cut.at),
        }
    }

    fn box_edge<S: Scalar>(&self, index: usize, side: i64) -> Option<S> {
        let site = self.crystal.potential.sites.get(index)?;
        let SiteShape::Box(sizes) = &site.shape else {
            return None;
        };
        let half = S::lift(sizes.first()?).scaled(0.5 * side as f64);
        Some(S::lift(site.at.first()?).plus(&half))
    }

    /// The length of a stretch; that of its layer where it is the whole layer.
    pub fn length<S: Scalar>(&self, stretch: &Stretch) -> S {
        if let Some(layer) = self.whole_layer(stretch) {
            return S::lift(&layer.length);
        }
        let length = self
            .position::<S>(&stretch.to)
            .minus(&self.position(&stretch.from));
        // A layer with a delta on its left face keeps its length to the last digit.
        let value = stretch.layer_length(self.crystal);
        length.chain(value.unwrap_or(length.value()), || 1.0)
    }

    fn whole_layer(&self, stretch: &Stretch) -> Option<&crate::model::Layer> {
        let layers = &self.crystal.potential.layers;
        let index = stretch.layer?;
        let starts = match stretch.from.mark {
            Mark::Start => index == 0,
            Mark::Face(before) => before + 1 == index,
            _ => false,
        };
        let ends = match stretch.to.mark {
            Mark::End => index + 1 == layers.len(),
            Mark::Face(face) => face == index,
            _ => false,
        };
        if starts && ends {
            layers.get(index)
        } else {
            None
        }
    }

    /// Whether the potential on a stretch is neither constant nor linear.
    pub fn is_smooth(&self, stretch: &Stretch) -> bool {
        let potential = &self.crystal.potential;
        let formula = stretch
            .piece
            .and_then(|(index, _)| potential.profile.get(index));
        formula.is_some_and(|piece| piece.formula.varies())
            || potential
                .table
                .as_ref()
                .is_some_and(|table| !table.straight)
            || potential
                .waves
                .iter()
                .any(|wave| wave.indices.iter().flatten().any(|index| *index != 0))
            || potential
                .sites
                .iter()
                .any(|site| !matches!(site.shape, SiteShape::Box(_)))
    }

    /// Everything but the layer, at a cell coordinate on a stretch.
    fn added<S: Scalar>(&self, stretch: &Stretch, x: &S) -> S {
        let potential = &self.crystal.potential;
        let mut sum = S::number(0.0);
        if let Some(piece) = stretch
            .piece
            .and_then(|(index, _)| potential.profile.get(index))
        {
            let shift = stretch.piece.map_or(0, |(_, shift)| shift);
            let inside = if shift == 0 {
                x.clone()
            } else {
                x.plus(&self.period::<S>().scaled(shift as f64))
            };
            sum = sum.plus(
                &piece
                    .formula
                    .evaluate(&[inside, S::number(0.0), S::number(0.0)]),
            );
        }
        if let Some(piece) = stretch.knot.and_then(|knot| self.table.get(knot)) {
            // The last piece reaches past the cell's end to the first sample, one period on.
            let turns = if x.value() < piece.start - 1e-9 * self.period {
                1.0
            } else {
                0.0
            };
            let at = x.value() + turns * self.period;
            sum = sum.plus(&x.chain(piece.at(at), || piece.slope_at(at)));
        }
        sum.plus(&self.waves_and_sites(x))
            .plus(&self.boxes(stretch))
    }

    fn boxes<S: Scalar>(&self, stretch: &Stretch) -> S {
        let sites = stretch
            .boxes
            .iter()
            .filter_map(|index| self.crystal.potential.sites.get(*index));
        sites.fold(S::number(0.0), |sum, site| sum.plus(&S::lift(&site.energy)))
    }

    fn waves_and_sites<S: Scalar>(&self, x: &S) -> S {
        let potential = &self.crystal.potential;
        let mut sum = S::number(0.0);
        if potential.waves.is_empty() && potential.sites.is_empty() {
            return sum;
        }
        let period = self.period::<S>();
        let turn = x.over(&period).scaled(2.0 * std::f64::consts::PI);
        for wave in &potential.waves {
            let indices = wave.indices.iter().filter_map(|index| index.first());
            let angles: Vec<S> = indices.map(|index| turn.scaled(*index as f64)).collect();
            sum = sum.plus(&wave.value_at(&angles));
        }
        for site in potential
            .sites
            .iter()
            .filter(|site| !matches!(site.shape, SiteShape::Box(_)))
        {
            let Some(at) = site.at.first() else { continue };
            if let Some(shape) = sum_of_images(&site.shape, &x.minus(&S::lift(at)), &period) {
                sum = sum.plus(&shape.times(&S::lift(&site.energy)));
            }
        }
        sum
    }

    /// The share of its layer that lies left of a position on a stretch.
    fn share<S: Scalar>(&self, layer: usize, x: &S) -> S {
        let left: S = self.face(layer);
        let length = self
            .crystal
            .potential
            .layers
            .get(layer)
            .map_or(S::number(1.0), |layer| S::lift(&layer.length));
        x.minus(&left).over(&length)
    }

    /// The layer's own potential at a position on a stretch.
    fn layered<S: Scalar>(&self, stretch: &Stretch, x: &S) -> S {
        let layer = stretch
            .layer
            .and_then(|index| Some((index, self.crystal.potential.layers.get(index)?)));
        let Some((index, layer)) = layer else {
            return S::number(0.0);
        };
        let [left, right] = &layer.edge;
        if left == right {
            return S::lift(left);
        }
        let (left, right) = (S::lift(left), S::lift(right));
        left.plus(&right.minus(&left).times(&self.share(index, x)))
    }

    /// The potential at a cell coordinate on a stretch, deltas left out.
    pub fn potential<S: Scalar>(&self, stretch: &Stretch, x: &S) -> S {
        self.layered(stretch, x).plus(&self.added(stretch, x))
    }

    /// The potential at both ends of a stretch.
    pub fn ends<S: Scalar>(&self, stretch: &Stretch) -> [S; 2] {
        if let Some(layer) = self.whole_layer(stretch) {
            let [left, right] = &layer.edge;
            let varies = self.crystal.potential.table.is_some();
            let at = |edge: &Dual, cut: &Cut| {
                let x = if varies {
                    self.position(cut)
                } else {
                    S::number(cut.at)
                };
                S::lift(edge).plus(&self.added(stretch, &x))
            };
            return [at(left, &stretch.from), at(right, &stretch.to)];
        }
        [
            self.potential(stretch, &self.position(&stretch.from)),
            self.potential(stretch, &self.position(&stretch.to)),
        ]
    }

    /// The mass at both ends of a stretch, as (value, slope with energy) in kg and kg/J.
    pub fn masses<S: Scalar>(&self, stretch: &Stretch) -> [(S, S); 2] {
        let Some((index, layer)) = stretch
            .layer
            .and_then(|index| Some((index, self.crystal.potential.layers.get(index)?)))
        else {
            let mass = (S::lift(&self.crystal.mass), S::number(0.0));
            return [mass.clone(), mass];
        };
        let [left, right] = [law(&layer.mass[0]), law(&layer.mass[1])];
        if layer.mass[0] == layer.mass[1] || self.whole_layer(stretch).is_some() {
            return [left, right];
        }
        let at = |cut: &Cut| {
            let share: S = self.share(index, &self.position(cut));
            let between = |a: &S, b: &S| a.plus(&b.minus(a).times(&share));
            (between(&left.0, &right.0), between(&left.1, &right.1))
        };
        [at(&stretch.from), at(&stretch.to)]
    }
}

/// m(E) = mass·(1 + (E − edge)/gap) as a value at E = 0 and a slope.
fn law<S: Scalar>(law: &MassLaw) -> (S, S) {
    let mass = S::lift(&law.mass);
    match &law.nonparabolic {
        None => (mass, S::number(0.0)),
        Some((edge, gap)) => {
            let slope = mass.over(&S::lift(gap));
            (mass.minus(&slope.times(&S::lift(edge))), slope)
        }
    }
}
