//! Lattices and potentials as the solvers need them: symmetry, components, sums over images, splines.

pub mod centring;
pub mod components;
pub mod images;
pub mod sampler;
pub mod spline;
pub mod symmetry;
pub mod zone;
