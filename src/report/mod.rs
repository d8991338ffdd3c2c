//! The pipeline from files to findings and numbers, and the views of it.

pub mod analysis;
