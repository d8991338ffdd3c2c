//! From sections to crystals, materials and preambles.
//!
//! *Invariant*: a build never fails; what is wrong is in its troubles, and a
//! crystal with an error anywhere in what it needs is `broken`. A mistake is
//! reported by the build of the section that it is written in: one inside a
//! material by that material's build, one in a preamble by the preamble's.

mod atoms;
mod carriers;
mod checks;
mod crystal;
mod lattice;
mod layers;
mod material;
mod poles;
mod position;
mod preamble;
mod profile;
mod scales;
mod sites;
mod summary;
mod table;
mod takeover;
mod targets;
mod waves;

use super::{Crystal, NameSort, Place, SectionRef, Trouble, World};
use crate::syntax::SectionId;

use super::FileId;

pub use crystal::build_crystal;
pub(crate) use crystal::nominal_lattice;
pub use material::{BuiltMaterial, MaterialField, build_material};
pub use preamble::{BuiltPreamble, NamedValue, build_preamble, values_in_scope};
pub use summary::{LatticeSummary, summarise};

/// A crystal as built, with what was found on the way.
#[derive(Clone, Debug, Default)]
pub struct Built {
    /// The crystal.
    pub crystal: Crystal,
    /// What is wrong in its own statements (and in those it takes over, where only it makes them wrong).
    pub troubles: Vec<Trouble>,
    /// The names used in its own statements.
    pub references: Vec<Reference>,
}

/// One use of a name.
#[derive(Clone, Debug, PartialEq)]
pub struct Reference {
    /// Where it stands.
    pub place: Place,
    /// The name.
    pub name: String,
    /// What sort of name.
    pub sort: NameSort,
    /// Where it is defined (the name's own place there); `None` where nothing defines it.
    pub definition: Option<Place>,
}

/// The `let`s of a section as its own build checks them: names that may not be given, and values.
fn check_lets<'w>(
    evaluator: &mut super::evaluate::Evaluator<'w>,
    context: &super::evaluate::Context<'_, 'w>,
) {
    checks::lets(evaluator, context);
}

/// The key of a section.
type Key = (FileId, SectionId);
