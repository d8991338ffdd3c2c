//! crenate: a plain-text format for periodic potentials, its linter and its
//! language server.
//!
//! The modules stand in the order in which a text walks through them.

pub mod text;

pub mod syntax;

pub mod model;

pub mod numerics;

pub mod bands;

pub mod rules;

pub mod report;

pub mod server;

pub mod cli;
