//! Pure numerics: dimensionless, `f64`, no dependency on the rest of the crate.

pub mod planewaves;
