//! Measures and targets, with names resolved.

use super::{Dimension, Dual, Place};
use crate::syntax::{Operator, SectionId};

use super::FileId;

/// A named expression over quantities.
#[derive(Clone, Debug)]
pub struct Measure {
    /// The statement.
    pub place: Place,
    /// Its name.
    pub name: String,
    /// The expression.
    pub expression: TargetFormula,
    /// Its dimension.
    pub dimension: Dimension,
}

/// A requirement.
#[derive(Clone, Debug)]
pub struct Target {
    /// The statement.
    pub place: Place,
    /// What stands after `require`, blanks folded.
    pub text: String,
    /// What is wanted.
    pub wish: Wish,
}

/// What a target wants.
#[derive(Clone, Debug)]
#[allow(
    clippy::large_enum_variant,
    reason = "nearly all wishes are comparisons: boxing them would save nothing"
)]
pub enum Wish {
    /// The value of an expression between limits.
    Compare {
        /// The expression.
        expression: TargetFormula,
        /// Its dimension.
        dimension: Dimension,
        /// The limits.
        limits: Limits,
    },
    /// A class of conductor.
    Class(ClassWish),
    /// A kind of gap.
    GapIs {
        /// The crystal meant.
        of: CrystalRef,
        /// The gap above this band, from 1.
        band: usize,
        /// The wanted kind.
        kind: GapWish,
    },
}

/// Limits, which may depend on parameters too.
#[derive(Clone, Debug)]
pub struct Limits {
    /// Lower limit, and whether it is itself allowed.
    pub lower: Option<(TargetFormula, bool)>,
    /// Upper limit, and whether it is itself allowed.
    pub upper: Option<(TargetFormula, bool)>,
}

/// The classes that can be required.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum ClassWish {
    /// The highest occupied band partly filled.
    Metal,
    /// Whole bands filled, and they overlap or touch.
    Semimetal,
    /// An insulator with a gap of at most 4 eV.
    Semiconductor,
    /// Whole bands filled, and a gap.
    Insulator,
}

/// The kinds of gap that can be required.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum GapWish {
    /// Both edges at one k.
    Direct,
    /// At different k.
    Indirect,
    /// None.
    Closed,
}

/// A crystal that a quantity speaks of.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub struct CrystalRef {
    /// Its file.
    pub file: FileId,
    /// Its section.
    pub section: SectionId,
}

/// An expression over quantities of bands and values.
#[derive(Clone, Debug)]
pub enum TargetFormula {
    /// A value (SI).
    Constant(Dual),
    /// A quantity of a crystal's bands.
    Quantity(Quantity),
    /// −f
    Negative(Box<TargetFormula>),
    /// f ∘ g
    Binary(Operator, Box<TargetFormula>, Box<TargetFormula>),
    /// A function by its name.
    Call(&'static str, Vec<TargetFormula>),
}

/// A quantity of a crystal's bands.
#[derive(Clone, Debug, PartialEq)]
pub struct Quantity {
    /// The crystal.
    pub of: CrystalRef,
    /// Where the quantity stands.
    pub place: Place,
    /// Which.
    pub kind: QuantityKind,
}

/// The quantities; bands count from 1.
#[derive(Clone, Debug, PartialEq)]
pub enum QuantityKind {
    /// Bottom of band N+1 minus top of band N.
    Gap(usize),
    /// Top minus bottom.
    Width(usize),
    /// The lowest energy of a band.
    Bottom(usize),
    /// The highest energy of a band.
    Top(usize),
    /// A band's energy at k (fractions of the primitive reciprocal vectors).
    Level(usize, Vec<f64>),
    /// Magnitude of the mass at a band's bottom.
    MassBottom(usize),
    /// Magnitude of the mass at a band's top.
    MassTop(usize),
    /// J in E = E₀ − 2ΣJ_R cos(R·k).
    Hopping(usize, Vec<i64>),
    /// The Fermi level.
    Fermi,
}
