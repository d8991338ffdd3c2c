//! The reference suite in one table: `cargo test --test numerics_reference -- --nocapture`.
//!
//! Each line is one kind of number of one reference file: how many rows, how many true values lie inside their
//! bound, the worst error in eps of the scale (of the number itself for widths, gaps of layers, masses and hoppings) beside
//! what is allowed, the median bound stated in the same eps, and the median of stated over true error over those rows
//! whose true error is above 1e-15 of the scale.
#![allow(
    clippy::indexing_slicing,
    clippy::print_stdout,
    clippy::unwrap_used,
    missing_docs
)]

#[path = "reference/layers.rs"]
mod layers;
#[path = "reference/levels.rs"]
mod levels;
#[path = "reference/mod.rs"]
mod reference;
#[path = "reference/smooth.rs"]
mod smooth;

use reference::{Tally, headings};

#[test]
fn every_row_lies_within_its_bound() {
    let tallies: Vec<Tally> = [layers::tallies(), smooth::tallies(), levels::tallies()].concat();
    println!("\n{}", headings());
    for tally in &tallies {
        println!("{}", tally.line());
    }
    let rows: usize = tallies.iter().map(|tally| tally.checked).sum();
    let covered: usize = tallies.iter().map(|tally| tally.covered).sum();
    println!("{rows} rows, {covered} inside their bound");
    let faults: Vec<String> = tallies.iter().flat_map(Tally::faults).collect();
    assert!(faults.is_empty(), "{faults:#?}");
    assert!(rows > 2500 && covered == rows, "{covered} of {rows}");
    assert!(tallies.iter().all(|tally| tally.median_padding() < 1000.0));
}
