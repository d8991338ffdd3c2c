//! Sites and deltas.

use super::crystal::CrystalBuild;
use super::takeover::Taken;
use crate::model::evaluate::Context;
use crate::model::{Delta, Dimension, Dual, Site, SiteShape};
use crate::syntax::{Shape, StatementKind, Value};

impl<'w> CrystalBuild<'_, 'w> {
    /// Reads all deltas.
    pub(super) fn deltas(&mut self) {
        for taken in self.statements.deltas.clone() {
            let StatementKind::Delta { strength, at } = &taken.statement.kind else {
                continue;
            };
            if !self.allowed(taken, &[1], "a lattice of one dimension") {
                continue;
            }
            let period = self.one_period();
            let context = self.context(taken).within(period.as_ref());
            let strength = self
                .evaluator
                .quantity_of(strength, Dimension::ENERGY_LENGTH, &context);
            let at = self.position("delta", at, &context);
            if let (Some(strength), Some(mut at)) = (strength, at) {
                self.crystal
                    .potential
                    .deltas
                    .extend(at.pop().map(|at| Delta {
                        place: taken.home.place(taken.statement.span),
                        strength,
                        at,
                    }));
            }
        }
    }

    /// Reads all sites.
    pub(super) fn sites(&mut self) {
        for taken in self.statements.sites.clone() {
            let StatementKind::Site { shape, energy, at } = &taken.statement.kind else {
                continue;
            };
            let (dimensions, needs) = where_shape_stands(shape);
            if !self.allowed(taken, dimensions, needs) {
                continue;
            }
            let period = self.one_period();
            let context = self.context(taken).within(period.as_ref());
            let energy = self
                .evaluator
                .quantity_of(energy, Dimension::ENERGY, &context);
            let shape = self.shape(shape, taken, &context);
            let at = self.position("site", at, &context);
            if let (Some(energy), Some(shape), Some(at)) = (energy, shape, at) {
                self.crystal.potential.sites.push(Site {
                    place: taken.home.place(taken.statement.span),
                    shape,
                    energy,
                    at,
                });
            }
        }
    }

    fn shape(
        &mut self,
        shape: &'w Shape,
        taken: Taken<'w>,
        context: &Context<'_, 'w>,
    ) -> Option<SiteShape> {
        let mut size = |value: &'w Value, what: &str| -> Option<Dual> {
            self.evaluator
                .positive(value, Dimension::LENGTH, what, context)
        };
        Some(match shape {
            Shape::Gaussian { sigma } => SiteShape::Gaussian(size(sigma, "sigma")?),
            Shape::Sech2 { width } => SiteShape::Sech2(size(width, "a width")?),
            Shape::Lorentzian { width } => SiteShape::Lorentzian(size(width, "a width")?),
            Shape::Disk { radius } => SiteShape::Disk(size(radius, "a radius")?),
            Shape::Sphere { radius } => SiteShape::Sphere(size(radius, "a radius")?),
            Shape::Box { sizes } => {
                let edges: Vec<Option<Dual>> =
                    sizes.iter().map(|value| size(value, "a size")).collect();
                let edges: Vec<Dual> = edges.into_iter().collect::<Option<_>>()?;
                SiteShape::Box(self.box_edges(edges, taken)?)
            }
        })
    }

    /// One size a direction; one alone is that of all.
    fn box_edges(&mut self, edges: Vec<Dual>, taken: Taken<'w>) -> Option<Vec<Dual>> {
        let dimension = self.crystal.dimension;
        match (edges.len(), edges.first()) {
            (1, Some(edge)) => Some(vec![edge.clone(); dimension.max(1)]),
            (given, _) if given == dimension || dimension == 0 => Some(edges),
            _ => {
                let place = taken.home.place(taken.statement.span);
                let needs = match dimension {
                    1 => "one size".to_owned(),
                    several => format!("one size or {several} of them"),
                };
                self.evaluator.wrong_dimension("site box", needs, place)
            }
        }
    }
}

fn where_shape_stands(shape: &Shape) -> (&'static [usize], &'static str) {
    match shape {
        Shape::Gaussian { .. } | Shape::Box { .. } => (&[1, 2, 3], ""),
        Shape::Sech2 { .. } | Shape::Lorentzian { .. } => {
            (&[1], "a lattice of one dimension for this shape")
        }
        Shape::Disk { .. } => (&[2], "a lattice of two dimensions for a `disk`"),
        Shape::Sphere { .. } => (&[3], "a lattice of three dimensions for a `sphere`"),
    }
}
