//! What the bands of a crystal are, with the error bound of each number. SI units.

use crate::model::{Dimension, ParameterId, Place};

/// A value and a bound on its numerical error (of the model as written, not of the model).
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Measured {
    /// The value.
    pub value: f64,
    /// The true value lies within `value ± uncertainty`.
    pub uncertainty: f64,
}

/// The extremum of a band.
#[derive(Clone, Debug, PartialEq)]
pub struct Extremum {
    /// Energy in joule.
    pub energy: Measured,
    /// Where, in fractions of the primitive reciprocal vectors.
    pub k: Vec<f64>,
    /// The name of that point, where it has one.
    pub point: Option<String>,
    /// Mass in kg, signed: negative at a top; `None` where there is none (a crossing) or its sign is not known. In two
    /// and three dimensions the density-of-states mass of this one extremum.
    pub mass: Option<Measured>,
    /// The masses along the principal axes of the tensor, in two and three dimensions; empty where there is no mass.
    pub axes: Vec<MassAxis>,
}

/// The mass along a principal axis.
#[derive(Clone, Debug, PartialEq)]
pub struct MassAxis {
    /// Mass in kg, signed.
    pub mass: Measured,
    /// The direction, Cartesian, of length one.
    pub along: Vec<f64>,
}

/// One band.
#[derive(Clone, Debug, PartialEq)]
pub struct Band {
    /// Its lowest energy.
    pub bottom: Extremum,
    /// Its highest energy.
    pub top: Extremum,
    /// Its width in joule, with relative accuracy of its own.
    pub width: Measured,
}

/// The kinds of gap.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum GapKind {
    /// Both edges at one k.
    Direct,
    /// Edges at different k.
    Indirect,
    /// No gap, to within the uncertainty.
    Closed,
    /// The bands overlap in energy.
    Overlap,
}

/// The gap above a band.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Gap {
    /// Bottom of the next band minus top of this one, in joule; negative where they overlap.
    pub size: Measured,
    /// Its kind.
    pub kind: GapKind,
}

/// How a crystal's carriers fill its bands.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Class {
    /// The highest occupied band is partly filled.
    Metal,
    /// Whole bands are filled and they overlap or touch.
    Semimetal,
    /// Whole bands are filled, and the gap is at most 4 eV.
    Semiconductor,
    /// Whole bands are filled, and there is a gap.
    Insulator,
}

/// Lowest, mean and highest of the potential in joule; infinite spikes (deltas) count in the mean alone.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct PotentialRange {
    /// The lowest value.
    pub lowest: f64,
    /// The mean over the cell, deltas included.
    pub mean: f64,
    /// The highest value.
    pub highest: f64,
}

/// The solved bands of a crystal.
#[derive(Clone, Debug, PartialEq)]
pub struct Solution {
    /// The bands, lowest first.
    pub bands: Vec<Band>,
    /// The gap above each band; as many as bands.
    pub gaps: Vec<Gap>,
    /// The potential.
    pub potential: PotentialRange,
    /// The Fermi level in joule, where there is a filling.
    pub fermi: Option<Measured>,
    /// The class, where there is a filling.
    pub class: Option<Class>,
    /// Whether this is the fine answer (`false`: a coarse one, to be replaced).
    pub fine: bool,
}

/// Why there are no bands.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Unsolved {
    /// The model has errors.
    BrokenModel,
    /// What was asked for is not made in this dimension (pictures are of one).
    Dimension(usize),
    /// The budget was spent before the numbers settled.
    NotConverged(String),
    /// The work was overtaken by an edit.
    Cancelled,
}

/// A gap, width or edge, for sensitivities; bands count from 1.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum Feature {
    /// Gap above the band.
    Gap(usize),
    /// Width of the band.
    Width(usize),
    /// Bottom of the band.
    Bottom(usize),
    /// Top of the band.
    Top(usize),
}

/// Exact derivatives of one feature, in joule per SI unit of each parameter (per half width for a tolerance).
#[derive(Clone, Debug, PartialEq)]
pub struct Sensitivity {
    /// Of what.
    pub feature: Feature,
    /// With respect to what, sorted by parameter.
    pub slopes: Vec<(ParameterId, f64)>,
}

/// The states of a target.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum TargetState {
    /// Holds at the nominal values and everywhere within the tolerances.
    Met,
    /// Fails at the nominal values.
    Missed,
    /// Holds at the nominal values, fails somewhere within the tolerances.
    AtRisk,
    /// The limit lies inside the value's uncertainty.
    Undecided,
    /// Cannot be tested; the assessment's `reason` says why.
    Untestable,
}

/// What became of a target.
#[derive(Clone, Debug, PartialEq)]
pub struct Assessment {
    /// The `require` statement.
    pub place: Place,
    /// What stands after `require`.
    pub text: String,
    /// The state.
    pub state: TargetState,
    /// Why, where it is not simply met or missed.
    pub reason: Option<String>,
    /// The nominal value, in SI; `None` for a class.
    pub value: Option<Measured>,
    /// The dimension of that value.
    pub dimension: Dimension,
    /// Lower and upper limit, in SI, where there are.
    pub limits: (Option<f64>, Option<f64>),
    /// The worst value over the tolerances, where there are any.
    pub worst: Option<f64>,
    /// The draws (−1 … 1) at the worst value.
    pub corner: Vec<(ParameterId, f64)>,
    /// The tolerance that spends most of the margin.
    pub driver: Option<ParameterId>,
    /// What is (for a class or kind of gap), in words.
    pub found: Option<String>,
}

/// The value of a `measure`.
#[derive(Clone, Debug, PartialEq)]
pub struct MeasureValue {
    /// The statement.
    pub place: Place,
    /// Its name.
    pub name: String,
    /// Its value in SI; the reason where it has none.
    pub value: Result<Measured, String>,
    /// Its dimension.
    pub dimension: Dimension,
}
