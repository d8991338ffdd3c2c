//! Bands of a one-dimensional periodic cell: pure numerics, dimensionless, `f64`,
//! no dependency on the rest of the crate.
//!
//! **Equation.** H = −d/dx (1/m(x,E)) d/dx + V(x) + Σ S_j δ(x − X_j) with period a and ħ²/2 = 1,
//! so a free particle of mass m has E = k²/m. The state (ψ, ψ′/m) is continuous
//! (BenDaniel & Duke, Phys. Rev. 152, 683 (1966)); at a delta ψ′/m jumps by S ψ.
//! With M(E) the matrix that carries the state over one cell, the discriminant
//! D(E) = tr M = 2 cos ka (Hill's equation; Magnus & Winkler, *Hill's Equation* (1966)).
//!
//! **Conventions.** Bands are counted from 0. Band n has its bottom at D = 2(−1)ⁿ and its top at
//! D = −2(−1)ⁿ; gap n lies above band n. `ka` runs from 0 to π. Masses are signed, in the unit of
//! the cell's masses.
//!
//! **Order of reading.** `scalar` and `double` (the arithmetic), `entire` (the functions), `cell`
//! and `budget` (what a caller hands in), `mesh` (smooth stretches), `element` (one transfer matrix), `sweep`
//! (the product over a cell, and the zero count), `search` and `interior` (brackets and
//! roots), `edges`, `solve`, `level`,
//! `hopping`, `sensitivity`, `wave` (what a caller asks for).
#![allow(clippy::indexing_slicing)]

mod borrow;
mod budget;
mod cell;
mod double;
mod edges;
mod element;
mod entire;
mod gradient;
mod hopping;
mod interior;
mod level;
mod mesh;
mod pair;
mod scalar;
mod search;
mod sensitivity;
mod solve;
mod sweep;
mod uncertainty;
mod wave;

pub mod planewaves;

pub use budget::Budget;
pub use cell::{Bounded, Cell, Mass, Piece, SolveError};
pub use hopping::hopping;
pub use level::{discriminant, dispersion, fermi, integrated_states, level};
pub use mesh::Mesh;
pub use sensitivity::{PieceSensitivity, Quantity, sensitivities};
pub use solve::{Band, BandEdge, Bands, Gap, Wave, solve};
pub use wave::wave_function;
