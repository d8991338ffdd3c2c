//! What an editor's documents read as: the reading side of the crate, for rooms that know nothing of syntax.

pub use crate::model::{FileId, Place, normalise};
pub use crate::syntax::{Tree, read, reread};
