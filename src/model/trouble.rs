//! What is wrong with a model, as data; the rules word it.

use super::{Dimension, Place};

/// One mistake found while a model was built.
#[derive(Clone, Debug, PartialEq)]
pub struct Trouble {
    /// What it is.
    pub kind: TroubleKind,
    /// Where.
    pub place: Place,
    /// Other places that take part, each with what it is.
    pub related: Vec<(Place, String)>,
}

impl Trouble {
    /// A mistake at one place.
    #[must_use]
    pub fn new(kind: TroubleKind, place: Place) -> Self {
        Self {
            kind,
            place,
            related: Vec::new(),
        }
    }

    /// The same with another place that takes part.
    #[must_use]
    pub fn beside(mut self, place: Place, what: &str) -> Self {
        self.related.push((place, what.to_owned()));
        self
    }

    /// Whether the model cannot be solved with it.
    #[must_use]
    pub fn breaks(&self) -> bool {
        !matches!(self.kind, TroubleKind::OutsideCell { .. })
    }
}

/// The kinds of mistake. Energies in joule, lengths in metre.
#[derive(Clone, Debug, PartialEq)]
pub enum TroubleKind {
    /// A statement that may stand once stands twice (`related` has the first).
    Repeated {
        /// The statement word.
        word: String,
    },
    /// A name that nothing defines.
    UnknownName {
        /// The name.
        name: String,
        /// What was looked for: "value", "material", "crystal", "atom", "function", "rule", "zone point", "lattice" …
        wanted: &'static str,
        /// The closest name of that sort, if one is close.
        nearest: Option<String>,
    },
    /// A name that may not be given, or is given twice.
    TakenName {
        /// The name.
        name: String,
        /// What holds it: "a unit", "a function", "the name of another material" …
        holder: String,
    },
    /// Names, materials or crystals defined through each other.
    CircularName {
        /// The circle, the first name repeated at the end.
        circle: Vec<String>,
    },
    /// A file that cannot be read, or is outside the workspace.
    MissingFile {
        /// The path as written.
        path: String,
        /// Why: "there is no such file", "it is outside the workspace" …
        why: String,
    },
    /// Files that use each other.
    CircularUse {
        /// The circle of paths as written.
        circle: Vec<String>,
    },
    /// A word after a number that is no unit.
    UnknownUnit {
        /// The word.
        unit: String,
        /// Why it is none here, where there is more to say ("`Er` needs a `recoil`").
        why: Option<String>,
        /// What to write instead of the unit, where plain (another unit; `* name`).
        instead: Option<String>,
    },
    /// A bare number where a dimension is wanted.
    MissingUnit {
        /// What is wanted.
        wanted: Dimension,
        /// The number as written.
        number: String,
    },
    /// A quantity of another dimension.
    WrongUnit {
        /// What is wanted, in words ("an energy", "a length", "the same dimension on both sides", "a number").
        wanted: String,
        /// What is there, in words.
        found: String,
    },
    /// Overflow, 0/0, root of a negative number: `what` names the operation.
    NotFinite {
        /// The operation, in words with its numbers.
        what: String,
    },
    /// A tolerance, or another value, that its place does not allow.
    BadValue {
        /// What is wrong, in words with numbers.
        what: String,
    },
    /// Layers, pieces or samples that do not add up to the period.
    OpenCell {
        /// What they add up to.
        sum: f64,
        /// The period.
        period: f64,
        /// What adds up: "layers", "pieces", "samples".
        parts: &'static str,
    },
    /// Pieces of a profile that overlap.
    OverlappingPieces {
        /// By how much.
        by: f64,
    },
    /// Lattice vectors that are (nearly) dependent, or lengths or angles that give no cell.
    FlatLattice {
        /// What is wrong, in words.
        what: String,
    },
    /// Nothing says what repeats.
    MissingLattice,
    /// Two atoms at one position.
    ClashingAtoms {
        /// Their distance.
        distance: f64,
    },
    /// A position outside the cell.
    OutsideCell {
        /// The position as written, in fractions of the cell.
        fractions: Vec<f64>,
        /// The same inside the cell.
        inside: Vec<f64>,
    },
    /// A `fourier` without its partner at −G, or with another than its complex conjugate.
    LoneComponent {
        /// G.
        index: Vec<i64>,
        /// The statement that would mend it.
        partner: String,
    },
    /// An index that the lattice's centring forbids.
    ForbiddenWave {
        /// G.
        index: Vec<i64>,
        /// The condition it breaks, in words.
        condition: String,
    },
    /// A mass that is not positive.
    OddMass {
        /// The mass in kg.
        mass: f64,
    },
    /// A profile that is not finite somewhere.
    Pole {
        /// Where, in metre.
        at: f64,
    },
    /// A statement that the crystal's dimension does not allow.
    WrongDimension {
        /// The statement.
        word: String,
        /// What it needs.
        needs: String,
    },
    /// Two whole-cell descriptions in one crystal.
    TwoDescriptions {
        /// The first kind ("layers").
        first: &'static str,
        /// The second.
        second: &'static str,
    },
    /// A table that cannot be used; `related` has the rows.
    BadTable {
        /// What is wrong, in words with the row.
        what: String,
    },
}
