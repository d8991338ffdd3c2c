//! The one bridge from a [`crate::model::Crystal`] to numbers with uncertainties.
//!
//! Everything that leaves this room is in SI units.

mod filling;
mod scale;
mod types;
mod worst;

pub use types::*;
