//! From statements to meaning: quantities, names, materials, crystals.
//!
//! Everything here is plain data in SI units. Mistakes of the user are data
//! too ([`Trouble`]); nothing here returns an error for them.

mod crystal;
mod dimension;
mod dual;
mod place;
mod reference;
mod target;
mod trouble;
mod world;

pub use crystal::*;
pub use dimension::Dimension;
pub use dual::{Dual, ParameterId};
pub use place::{FileId, Place};
pub use reference::{NameSort, Reference};
pub use target::*;
pub use trouble::{Trouble, TroubleKind};
pub use world::World;
