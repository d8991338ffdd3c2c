//! Uses of names.

use super::Place;

/// The sorts of name.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum NameSort {
    /// A `let`, measure or constant.
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

/// A name where it is used.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Reference {
    /// Where it is used.
    pub place: Place,
    /// The name.
    pub name: String,
    /// Its sort.
    pub sort: NameSort,
    /// Where it is defined: the name in its `let` or heading.
    pub definition: Option<Place>,
}
