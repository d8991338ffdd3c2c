//! From statements to meaning: quantities, names, materials, crystals.
//!
//! Everything here is plain data in SI units. Mistakes of the user are data
//! too ([`Trouble`]); nothing here returns an error for them.

mod build;
pub mod constants;
mod crystal;
mod dimension;
mod dual;
mod evaluate;
mod formula;
pub mod functions;
mod hash;
mod place;
mod scalar;
mod setting;
pub mod shape;
mod target;
pub mod trade;
mod trouble;
pub mod unit;
pub mod words;
mod world;

pub use build::{
    Built, BuiltMaterial, BuiltPreamble, LatticeSummary, MaterialField, NamedValue, Reference,
    build_crystal, build_material, build_preamble, summarise, values_in_scope,
};
pub use crystal::*;
pub use dimension::Dimension;
pub use dual::{Dual, ParameterId, ParameterSort};
pub use place::{FileId, Place};
pub use scalar::Scalar;
pub use setting::Setting;
pub use target::*;
pub use trouble::{Trouble, TroubleKind};
pub use world::{
    FileSource, LetRef, ReadFailure, SectionRef, TableFile, TableSamples, World, WorldFile,
    normalise,
};

/// The sorts of name that a statement can use.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum NameSort {
    /// A `let`.
    Value,
    /// A material.
    Material,
    /// A crystal.
    Crystal,
    /// An atom.
    Atom,
    /// A measure.
    Measure,
    /// A file.
    File,
}
