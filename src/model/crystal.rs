//! A crystal as plain data, in SI units.

use std::sync::Arc;

use super::shape::centring::{Centring, LatticeKind, lattice_kind};
use super::shape::zone::{NamedPoints, zone_path, zone_points};
use super::{Dimension, Dual, Measure, ParameterId, Place, Target};

/// A crystal with all its names resolved.
#[derive(Clone, Debug, Default)]
pub struct Crystal {
    /// Its heading.
    pub place: Place,
    /// Its name.
    pub name: String,
    /// The name to show.
    pub title: String,
    /// 1, 2 or 3; 0 where nothing says it.
    pub dimension: usize,
    /// Everything its numbers depend on, sorted by identity.
    pub parameters: Vec<Parameter>,
    /// The lattice kind's word, where a lattice is stated.
    pub lattice_kind: Option<String>,
    /// Primitive vectors in metre, `dimension` of them with `dimension` components.
    pub vectors: Vec<Vec<Dual>>,
    /// Conventional vectors in metre, the same shape.
    pub conventional: Vec<Vec<Dual>>,
    /// The mass where nothing else gives one, in kg.
    pub mass: Dual,
    /// Where that mass is stated, if it is.
    pub mass_place: Option<Place>,
    /// The potential.
    pub potential: Potential,
    /// States per level.
    pub degeneracy: u32,
    /// Bosons have no filling, Fermi level or class.
    pub bosons: bool,
    /// Particles per primitive cell.
    pub filling: Option<Dual>,
    /// Temperature in kelvin.
    pub temperature: Option<Dual>,
    /// The recoil scale.
    pub recoil: Option<Recoil>,
    /// One monolayer in metre.
    pub monolayer: Option<Dual>,
    /// How many bands to solve for (stated, or as many as filling and targets need, at least 4).
    pub bands: usize,
    /// The named measures, in order.
    pub measures: Vec<Measure>,
    /// The targets, in order.
    pub targets: Vec<Target>,
    /// Whether the model has errors that keep it from being solved.
    pub broken: bool,
}

impl Crystal {
    /// The kind of its lattice; `None` for `vectors` and where none is stated. Every cell of one dimension is a chain.
    #[must_use]
    pub fn kind(&self) -> Option<&'static LatticeKind> {
        match self.lattice_kind.as_deref() {
            _ if self.dimension == 1 => lattice_kind("chain", false),
            Some(word) => lattice_kind(word, self.dimension == 3).filter(|kind| kind.dimension > 0),
            None => None,
        }
    }

    /// How its conventional cell is centred.
    #[must_use]
    pub fn centring(&self) -> Centring {
        self.kind()
            .map_or(Centring::Primitive, |kind| kind.centring)
    }

    /// The primitive vectors without derivatives, in metre.
    #[must_use]
    pub fn primitive_values(&self) -> Vec<Vec<f64>> {
        values(&self.vectors)
    }

    /// The conventional vectors without derivatives, in metre.
    #[must_use]
    pub fn conventional_values(&self) -> Vec<Vec<f64>> {
        values(&self.conventional)
    }

    /// The named points of its zone, in fractions of the primitive reciprocal vectors.
    #[must_use]
    pub fn zone_points(&self) -> NamedPoints {
        match self.kind() {
            Some(kind) => zone_points(kind, &self.conventional_values()),
            None => vec![("centre", vec![0.0; self.dimension])],
        }
    }

    /// A path through its zone for pictures: unbroken runs of named points, in fractions of the primitive reciprocal
    /// vectors.
    #[must_use]
    pub fn zone_path(&self) -> Vec<Vec<(String, Vec<f64>)>> {
        zone_path(self.kind(), &self.conventional_values(), self.dimension)
    }
}

fn values(vectors: &[Vec<Dual>]) -> Vec<Vec<f64>> {
    let rows = vectors.iter();
    rows.map(|row| row.iter().map(|entry| entry.value).collect())
        .collect()
}

/// Something that the crystal's numbers depend on.
#[derive(Clone, Debug, PartialEq)]
pub struct Parameter {
    /// Its identity in every [`Dual`].
    pub id: ParameterId,
    /// What it is.
    pub kind: ParameterKind,
    /// Where it is written: the literal with its unit, the value of a `let` or field, the whole `a ± b`.
    pub place: Place,
    /// The text there.
    pub text: String,
    /// Its nominal value in SI (for a draw: the half width in SI).
    pub value: f64,
    /// Its dimension.
    pub dimension: Dimension,
    /// The SI value of one of the unit it is written in, with the unit's name, where it is a literal.
    pub unit: Option<(String, f64)>,
}

/// The sorts of parameter.
#[derive(Clone, Debug, PartialEq, Eq, Hash)]
pub enum ParameterKind {
    /// A number in the text, its unit included; derivative per SI unit of the quantity.
    Literal,
    /// A named value.
    Name(String),
    /// A field of a material, as (material, field).
    Field(String, String),
    /// A tolerance: a number in −1 … 1 that stretches over the interval; derivative per half width.
    Draw,
}

/// The scale of a `recoil` statement.
#[derive(Clone, Debug, PartialEq)]
pub struct Recoil {
    /// The wavelength L in metre.
    pub wavelength: Dual,
    /// h²/(2·mass·L²) in joule.
    pub energy: Dual,
    /// The statement.
    pub place: Place,
}

/// What the statements of the potential add up to.
#[derive(Clone, Debug, Default)]
pub struct Potential {
    /// Layers in order (stacks unrolled); 1D.
    pub layers: Vec<Layer>,
    /// Pieces of a profile, in order of position; a whole-cell profile is one piece.
    pub profile: Vec<ProfilePiece>,
    /// Samples.
    pub table: Option<Table>,
    /// Delta spikes; 1D.
    pub deltas: Vec<Delta>,
    /// Cosines, depths and Fourier components, stars not yet spread.
    pub waves: Vec<Wave>,
    /// Sites.
    pub sites: Vec<Site>,
    /// Atoms.
    pub atoms: Vec<Atom>,
    /// Form factors.
    pub formfactors: Vec<Formfactor>,
}

/// One stretch of a layered cell.
#[derive(Clone, Debug)]
pub struct Layer {
    /// The part that says it (within its `layer` or `stack` statement).
    pub place: Place,
    /// The thickness as written.
    pub length_place: Place,
    /// Thickness in metre, the material's rate included.
    pub length: Dual,
    /// Potential at its left and right end, in joule.
    pub edge: [Dual; 2],
    /// Mass at its left and right end.
    pub mass: [MassLaw; 2],
    /// The materials at its ends, where it is `of` a material.
    pub materials: Option<[String; 2]>,
    /// One monolayer of it in metre, where known.
    pub monolayer: Option<Dual>,
    /// Where its mass comes from, in words ("of material basin", "said here", "the crystal's", "the default").
    pub mass_origin: String,
    /// Whether its thickness is written in `ML`.
    pub in_monolayers: bool,
}

/// m(E) = mass·(1 + (E − edge)/gap), or the plain mass.
#[derive(Clone, Debug, PartialEq)]
pub struct MassLaw {
    /// The mass at the edge, in kg.
    pub mass: Dual,
    /// The edge and the gap in joule of an energy-dependent mass.
    pub nonparabolic: Option<(Dual, Dual)>,
}

/// A formula over a stretch of the cell.
#[derive(Clone, Debug)]
pub struct ProfilePiece {
    /// The statement.
    pub place: Place,
    /// The expression.
    pub formula_place: Place,
    /// Its ends in metre (the whole cell: 0 and the period); 1D.
    pub range: [Dual; 2],
    /// Whether it is the whole cell.
    pub whole: bool,
    /// The potential in joule as a function of position in metre.
    pub formula: Arc<Formula>,
}

/// A formula with its names resolved: numbers are SI, dimensions have been checked.
#[derive(Clone, Debug, PartialEq)]
pub enum Formula {
    /// A number.
    Constant(Dual),
    /// A position variable, by its place in `x y z` (or `q`).
    Variable(usize),
    /// −f
    Negative(Box<Formula>),
    /// f ∘ g
    Binary(crate::syntax::Operator, Box<Formula>, Box<Formula>),
    /// A function by its name.
    Call(&'static str, Vec<Formula>),
}

/// Samples over one cell.
#[derive(Clone, Debug, PartialEq)]
pub struct Table {
    /// The statement.
    pub place: Place,
    /// The file's path as written.
    pub path: String,
    /// Positions in metre, ascending, the first repeated one period on not among them.
    pub positions: Vec<f64>,
    /// Potential in joule at each.
    pub energies: Vec<f64>,
    /// The last sample's potential in joule, where it stands one period after the first and so is not among `energies`.
    pub closing: Option<f64>,
    /// Whether straight lines, not a periodic cubic spline, join them.
    pub straight: bool,
}

/// S·δ(x − X)
#[derive(Clone, Debug)]
pub struct Delta {
    /// The statement.
    pub place: Place,
    /// S in joule metre.
    pub strength: Dual,
    /// X in metre, within the cell.
    pub at: Dual,
}

/// A cosine, depth or Fourier component.
#[derive(Clone, Debug)]
pub struct Wave {
    /// The statement.
    pub place: Place,
    /// Which.
    pub kind: crate::syntax::WaveKind,
    /// Whether it stands for all its equivalents.
    pub star: bool,
    /// Indices on the reciprocal vectors of the conventional cell; with `star`, all members, ±G once; else one.
    pub indices: Vec<Vec<i64>>,
    /// E in joule.
    pub energy: Dual,
    /// A in radian.
    pub phase: Dual,
}

/// A site at a position and all its images.
#[derive(Clone, Debug)]
pub struct Site {
    /// The statement.
    pub place: Place,
    /// Its shape, sizes in metre.
    pub shape: SiteShape,
    /// E in joule.
    pub energy: Dual,
    /// Cartesian position in metre.
    pub at: Vec<Dual>,
}

/// The shapes of a site.
#[derive(Clone, Debug)]
pub enum SiteShape {
    /// exp(−r²/2σ²)
    Gaussian(Dual),
    /// sech²(r/w)
    Sech2(Dual),
    /// 1/(1 + (r/w)²)
    Lorentzian(Dual),
    /// 1 inside the edges.
    Box(Vec<Dual>),
    /// 1 inside the radius; 2D.
    Disk(Dual),
    /// 1 inside the radius; 3D.
    Sphere(Dual),
}

/// An atom.
#[derive(Clone, Debug)]
pub struct Atom {
    /// The statement.
    pub place: Place,
    /// Its name.
    pub name: String,
    /// Cartesian position in metre.
    pub at: Vec<Dual>,
}

/// A local form factor.
#[derive(Clone, Debug)]
pub struct Formfactor {
    /// The statement.
    pub place: Place,
    /// The atom it is of.
    pub name: String,
    /// The second atom of the symmetric and antisymmetric form.
    pub second: Option<String>,
    /// Its values.
    pub form: FormfactorValues,
}

/// The values of a form factor.
#[derive(Clone, Debug)]
pub enum FormfactorValues {
    /// |G|² in (2π/a)², and the energies in joule: one, or symmetric and antisymmetric.
    At {
        /// |G|² in (2π/a)².
        q: Dual,
        /// In joule.
        energies: Vec<Dual>,
    },
    /// A function of |G|, an inverse metre, giving joule.
    Curve(Arc<Formula>),
}
