//! Bands of H = −∇² + V(r) on a lattice of one, two or three dimensions by plane waves.
//!
//! Units ħ²/2m = 1: a free particle has E = k². With ψ = Σ c_G e^{i(k+G)·r} and V(r) = Σ V(G) e^{iG·r},
//!
//! ```text
//! Σ_G' [ |k+G|² δ_GG' + V(G−G') ] c_G' = E c_G,     |k+G|² ≤ C
//! ```
//!
//! The basis is cut by |k+G|², never by |G|², which would split levels that symmetry holds together. Wave vectors are
//! in fractions of the primitive reciprocal vectors, G are integer triples on them. V is real in space, V(−G) = V(G)*;
//! the caller checks that.
//!
//! What the cut leaves out lowers a level by, to second order in the coupling (Löwdin, J. Chem. Phys. 19, 1396 (1951)),
//!
//! ```text
//! δ = Σ_{|k+G|² > C} |Σ_G' V(G−G') c_G'|² / (|k+G|² + V(0) − E)
//! ```
//!
//! which is summed where V is known and continued by the potential's decay beyond. Settled levels are E − δ; how well
//! that prediction held from one cut to the next is what scales the stated error.
//!
//! Fails, with a typed error: flat lattices, components that are not finite, a spent budget, cancellation.

// Kernels index by plane wave, level and axis, often several arrays at once.
#![allow(clippy::indexing_slicing, clippy::needless_range_loop)]

mod basis;
mod closing;
mod crease;
mod density;
mod edges;
mod eigen;
mod extrema;
mod fermi;
mod fermi_density;
mod hopping;
mod iterate;
mod lattice;
mod levels;
mod mass_density;
mod mesh;
mod nearby;
mod path;
mod plan;
mod potential;
mod response;
mod samples;
mod settle;
pub mod shapes;
mod sketch;
mod slopes;
mod states;
mod surface;
mod surroundings;
mod swept;
mod symmetry;
mod tridiagonal;
mod zone;

pub use basis::Waves;
pub use density::Density;
pub use fermi::Fermi;
pub use lattice::Lattice;
pub use levels::Levels;
pub use path::PathPoint;
pub use potential::{Budget, Decay, Potential};
pub use samples::Samples;
pub use settle::SettledLevels;
pub use states::States;
pub use zone::{Accuracy, Band, Extremum, Gap, GapKind, Separation, Zone, solve};

/// Why there is no answer.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Error {
    /// The lattice vectors are not finite, not one to three, or dependent.
    FlatLattice,
    /// A component of the potential, a wave vector or a tolerance is not finite, or a count is zero.
    NotFinite,
    /// The basis or the number of eigenproblems wanted exceeds the budget.
    BudgetSpent,
    /// The work was overtaken.
    Cancelled,
    /// The band touches another, so what was asked of it alone does not exist.
    Touching,
}

/// A number and a bound on its error.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Estimate {
    /// The value.
    pub value: f64,
    /// The true value lies within `value ± error`.
    pub error: f64,
}
