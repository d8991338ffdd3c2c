//! A one-dimensional crystal as the numerics see it, and the way back: energies in joule, derivatives by the chain rule.

use crate::model::Crystal;
use crate::numerics::{Bounded, Budget, Cell, Mass, Mesh, Piece, SolveError};

use super::effort;
use super::field::Field;
use super::layout::{self, Stretch};
use super::scale::Scale;
use super::{Measured, Unsolved};

/// Pieces of one cell past which a crystal is not solved.
const MOST_PIECES: usize = 200_000;

/// The chain: the cell of the numerics, and where each of its pieces comes from.
pub(super) struct Chain<'a> {
    pub field: Field<'a>,
    pub scale: Scale,
    pub cell: Cell,
    pub origins: Vec<Origin>,
    /// The nodes of all smooth stretches as shares of their stretch.
    pub nodes: Vec<f64>,
    pub stretches: Vec<Stretch>,
    /// Samples of the potential that meshes may still take.
    samples_left: usize,
}

/// Where a piece of the cell comes from.
#[derive(Clone, Copy)]
pub(super) enum Origin {
    Delta(usize),
    /// A whole stretch, constant or linear.
    Plain(usize),
    /// One step of a smooth stretch: its ends as shares of the stretch, and the first of its nodes.
    Step {
        stretch: usize,
        from: f64,
        to: f64,
        node: usize,
    },
}

/// Why the numerics gave up, for the user.
pub(super) fn unsolved(error: SolveError) -> Unsolved {
    match error {
        SolveError::Cancelled => Unsolved::Cancelled,
        SolveError::BudgetSpent => effort::spent(),
        SolveError::NoBracket => Unsolved::NotConverged("an edge could not be closed in on".into()),
        SolveError::NotFinite => {
            Unsolved::NotConverged("the potential, a length or a mass is not finite".into())
        }
        SolveError::MassOutOfRange => Unsolved::NotConverged(
            "the energy-dependent mass is not positive at an energy of these bands".into(),
        ),
    }
}

impl<'a> Chain<'a> {
    /// Prepares a crystal of dimension 1; smooth stretches are meshed here, once.
    pub fn new(crystal: &'a Crystal, budget: &Budget<'_>) -> Result<Self, Unsolved> {
        let period = layout::period(crystal).ok_or(Unsolved::BrokenModel)?;
        let scale = Scale::new(period, crystal.mass.value).ok_or(Unsolved::BrokenModel)?;
        let field = Field::new(crystal, period);
        let stretches = layout::stretches(crystal, period);
        let mut chain = Self {
            field,
            scale,
            cell: Cell::default(),
            origins: Vec::new(),
            nodes: Vec::new(),
            stretches: Vec::new(),
            samples_left: budget.max_work / effort::terms(crystal),
        };
        for (index, stretch) in stretches.iter().enumerate() {
            chain.add_stretch(index, stretch, budget)?;
            if chain.cell.pieces.len() > MOST_PIECES {
                return Err(Unsolved::NotConverged(format!(
                    "the cell has more than {MOST_PIECES} pieces"
                )));
            }
        }
        chain.stretches = stretches;
        Ok(chain)
    }

    fn add_stretch(
        &mut self,
        index: usize,
        stretch: &Stretch,
        budget: &Budget<'_>,
    ) -> Result<(), Unsolved> {
        if let Some(delta) = stretch.delta() {
            let deltas = &self.field.crystal.potential.deltas;
            let strength = deltas.get(delta).map_or(0.0, |delta| delta.strength.value);
            let strength = strength / (self.scale.energy * self.scale.length);
            self.push(Piece::Delta { strength }, Origin::Delta(delta));
        }
        let length = self.field.length::<f64>(stretch) / self.scale.length;
        let mass = self
            .field
            .masses::<f64>(stretch)
            .map(|(value, slope)| Mass {
                value: value / self.scale.mass,
                slope: slope * self.scale.energy / self.scale.mass,
            });
        if self.field.is_smooth(stretch) && length > 0.0 {
            return self.add_smooth(index, stretch, mass, budget);
        }
        let potential = self
            .field
            .ends::<f64>(stretch)
            .map(|energy| energy / self.scale.energy);
        let piece = if potential[0] == potential[1] && mass[0] == mass[1] {
            Piece::Flat {
                length,
                potential: potential[0],
                mass: mass[0],
            }
        } else {
            Piece::Ramp {
                length,
                potential,
                mass,
            }
        };
        self.push(piece, Origin::Plain(index));
        Ok(())
    }

    fn add_smooth(
        &mut self,
        index: usize,
        stretch: &Stretch,
        mass: [Mass; 2],
        budget: &Budget<'_>,
    ) -> Result<(), Unsolved> {
        let (from, length) = (stretch.from.at, self.field.length::<f64>(stretch));
        let field = &self.field;
        let energy = self.scale.energy;
        let potential = |at: f64| field.potential(stretch, &(from + at * field.period)) / energy;
        let share = length / self.scale.length;
        let meshing = Budget {
            max_work: self.samples_left,
            ..*budget
        };
        let mesh = Mesh::build(share, &potential, 1.0, &meshing).map_err(unsolved)?;
        self.samples_left = self.samples_left.saturating_sub(mesh.work());
        let samples: Vec<f64> = mesh
            .nodes()
            .iter()
            .map(|node| potential(node * share))
            .collect();
        let pieces = mesh.pieces(&samples, mass);
        let mut node = self.nodes.len();
        self.nodes.extend_from_slice(mesh.nodes());
        for (piece, ends) in pieces.into_iter().zip(mesh.boundaries().windows(2)) {
            if let [from, to] = ends {
                self.push(
                    piece,
                    Origin::Step {
                        stretch: index,
                        from: *from,
                        to: *to,
                        node,
                    },
                );
                node += Mesh::NODES;
            }
        }
        Ok(())
    }

    fn push(&mut self, piece: Piece, origin: Origin) {
        self.cell.pieces.push(piece);
        self.origins.push(origin);
    }

    /// An energy of the numerics in joule.
    pub fn energy(&self, bounded: Bounded) -> Measured {
        Measured {
            value: bounded.value * self.scale.energy,
            uncertainty: bounded.error * self.scale.energy,
        }
    }

    /// A mass of the numerics in kg.
    pub fn mass(&self, bounded: Bounded) -> Measured {
        Measured {
            value: bounded.value * self.scale.mass,
            uncertainty: bounded.error * self.scale.mass,
        }
    }
}
