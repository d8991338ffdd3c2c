//! Derivatives of edges, gaps, widths and levels by everything a chain depends on: the numerics' derivatives by the
//! numbers of each piece, continued by the chain rule through the model's own.

use crate::model::{Dual, ParameterId, Scalar};
use crate::numerics::{self, Budget, PieceSensitivity, Quantity};
use rustc_hash::FxHashMap;

use super::chain::{Chain, Origin, unsolved};
use super::effort;
use super::{Feature, Sensitivity, Unsolved};

impl Chain<'_> {
    /// Of the gaps, widths, bottoms and tops of the lowest `bands` bands.
    pub fn sensitivities(
        &self,
        bands: usize,
        budget: &Budget<'_>,
    ) -> Result<Vec<Sensitivity>, Unsolved> {
        let features: Vec<Feature> = (1..=bands)
            .flat_map(|band| {
                [
                    Feature::Gap(band),
                    Feature::Width(band),
                    Feature::Bottom(band),
                    Feature::Top(band),
                ]
            })
            .collect();
        let quantities: Vec<Quantity> = features.iter().map(|feature| quantity(*feature)).collect();
        let slopes = self.slopes(&quantities, budget)?;
        let pairs = features.into_iter().zip(slopes);
        Ok(pairs
            .map(|(feature, slopes)| Sensitivity { feature, slopes })
            .collect())
    }

    /// Of one feature, in joule per SI unit of each parameter.
    pub fn feature_slopes(
        &self,
        feature: Feature,
        budget: &Budget<'_>,
    ) -> Result<Vec<(ParameterId, f64)>, Unsolved> {
        Ok(self
            .slopes(&[quantity(feature)], budget)?
            .pop()
            .unwrap_or_default())
    }

    /// Of the level of a band (counted from 1) at ka.
    pub fn level_slopes(
        &self,
        band: usize,
        ka: f64,
        budget: &Budget<'_>,
    ) -> Result<Vec<(ParameterId, f64)>, Unsolved> {
        let quantity = Quantity::Level(band.saturating_sub(1), ka);
        Ok(self.slopes(&[quantity], budget)?.pop().unwrap_or_default())
    }

    fn slopes(
        &self,
        quantities: &[Quantity],
        budget: &Budget<'_>,
    ) -> Result<Vec<Vec<(ParameterId, f64)>>, Unsolved> {
        if !self.field.follow_faces() {
            return Err(Unsolved::NotConverged(
                "the cell has too many layers of its own for derivatives".into(),
            ));
        }
        let terms = effort::terms(self.field.crystal);
        if self.nodes.len().saturating_mul(terms * terms) > effort::MOST_PRODUCTS {
            return Err(effort::spent());
        }
        let by_piece = numerics::sensitivities(&self.cell, quantities, budget).map_err(unsolved)?;
        let mut sums: Vec<FxHashMap<ParameterId, f64>> =
            vec![FxHashMap::default(); quantities.len()];
        for (index, origin) in self.origins.iter().enumerate() {
            let numbers = self.numbers(*origin);
            for (sum, pieces) in sums.iter_mut().zip(&by_piece) {
                if let Some(piece) = pieces.get(index) {
                    numbers.add(piece, self.scale.energy, sum);
                }
            }
        }
        Ok(sums.into_iter().map(sorted).collect())
    }

    /// The numbers of one piece as the numerics see them, with their derivatives.
    fn numbers(&self, origin: Origin) -> Numbers {
        match origin {
            Origin::Delta(index) => {
                let unit = 1.0 / (self.scale.energy * self.scale.length);
                let delta = self.field.crystal.potential.deltas.get(index);
                let strength =
                    delta.map_or_else(Dual::default, |delta| delta.strength.scaled(unit));
                Numbers {
                    strength,
                    ..Numbers::default()
                }
            }
            Origin::Plain(index) => self.plain(index),
            Origin::Step {
                stretch,
                from,
                to,
                node,
            } => self.step(stretch, from, to, node),
        }
    }

    fn plain(&self, index: usize) -> Numbers {
        let Some(stretch) = self.stretches.get(index) else {
            return Numbers::default();
        };
        let length = self
            .field
            .length::<Dual>(stretch)
            .scaled(1.0 / self.scale.length);
        let potential = self
            .field
            .ends::<Dual>(stretch)
            .map(|energy| energy.scaled(1.0 / self.scale.energy));
        Numbers {
            length,
            potential,
            mass: self.masses(index),
            ..Numbers::default()
        }
    }

    fn masses(&self, index: usize) -> [(Dual, Dual); 2] {
        let Some(stretch) = self.stretches.get(index) else {
            return Default::default();
        };
        self.field.masses::<Dual>(stretch).map(|(value, slope)| {
            (
                value.scaled(1.0 / self.scale.mass),
                slope.scaled(self.scale.energy / self.scale.mass),
            )
        })
    }

    fn step(&self, index: usize, from: f64, to: f64, node: usize) -> Numbers {
        let Some(stretch) = self.stretches.get(index) else {
            return Numbers::default();
        };
        let start: Dual = self.field.position(&stretch.from);
        let length: Dual = self.field.length(stretch);
        let nodes = self.nodes.iter().skip(node).take(numerics::Mesh::NODES);
        let samples = nodes
            .map(|share| {
                let x = start.plus(&length.scaled(*share));
                self.field
                    .potential(stretch, &x)
                    .scaled(1.0 / self.scale.energy)
            })
            .collect();
        let [left, right] = self.masses(index);
        let between = |share: f64| {
            let mix = |a: &Dual, b: &Dual| a.scaled(1.0 - share).plus(&b.scaled(share));
            (mix(&left.0, &right.0), mix(&left.1, &right.1))
        };
        Numbers {
            length: length.scaled((to - from) / self.scale.length),
            mass: [between(from), between(to)],
            samples,
            ..Numbers::default()
        }
    }
}

fn quantity(feature: Feature) -> Quantity {
    match feature {
        Feature::Gap(band) => Quantity::Gap(band.saturating_sub(1)),
        Feature::Width(band) => Quantity::Width(band.saturating_sub(1)),
        Feature::Bottom(band) => Quantity::Bottom(band.saturating_sub(1)),
        Feature::Top(band) => Quantity::Top(band.saturating_sub(1)),
    }
}

/// The numbers of one piece, dimensionless.
#[derive(Default)]
struct Numbers {
    length: Dual,
    potential: [Dual; 2],
    mass: [(Dual, Dual); 2],
    strength: Dual,
    samples: Vec<Dual>,
}

impl Numbers {
    /// Adds what a quantity owes to this piece; `energy` is the joule of one unit.
    fn add(&self, piece: &PieceSensitivity, energy: f64, sum: &mut FxHashMap<ParameterId, f64>) {
        let mut owe = |number: &Dual, rate: f64| {
            if rate != 0.0 {
                for (id, slope) in &number.slopes {
                    *sum.entry(*id).or_insert(0.0) += energy * rate * slope;
                }
            }
        };
        owe(&self.length, piece.length);
        owe(&self.strength, piece.strength);
        for end in 0..2 {
            if let (Some(number), Some(rate)) = (self.potential.get(end), piece.potential.get(end))
            {
                owe(number, *rate);
            }
            if let (Some((value, slope)), Some(rate)) = (self.mass.get(end), piece.mass.get(end)) {
                owe(value, rate.value);
                owe(slope, rate.slope);
            }
        }
        for (number, rate) in self.samples.iter().zip(&piece.samples) {
            owe(number, *rate);
        }
    }
}

fn sorted(sum: FxHashMap<ParameterId, f64>) -> Vec<(ParameterId, f64)> {
    let mut slopes: Vec<_> = sum.into_iter().collect();
    slopes.sort_by_key(|(id, _)| *id);
    slopes
}
