//! How long it takes to read a file of 5,000 lines, and to read it again after one digit has changed.
#![allow(missing_docs)]

use std::fmt::Write as _;
use std::hint::black_box;

use crenate::syntax::{read, reread};
use crenate::text::LineIndex;
use criterion::{Criterion, criterion_group, criterion_main};

/// 300 sections in about 5,000 lines.
fn long_text() -> String {
    let mut text =
        String::from("let thin = 2.6 nm\n\nmaterial basin\n  mass 0.067 me\n  edge 0 meV\n");
    for number in 0..299 {
        let _ = write!(
            text,
            "\n# Design {number} of a made-up family.\ncrystal tern_{number}\n\
             \x20 title     \"Tern {number}\"\n\
             \x20 lattice   chain 8.0 nm               # checked against the layers\n\
             \x20 monolayer 0.283 nm\n\
             \x20 let swing = 3 meV\n\
             \x20 layer     5.4 nm of basin\n\
             \x20 layer     thin ± 0.14 nm of wall\n\
             \x20 profile   0 nm to 8 nm = swing*cos(2*pi*x/period) + 0.5*swing*cos(4*pi*x/period)^2\n\
             \x20 cosine    2 = 1.5 meV phase 0.3 rad\n\
             \x20 bands     6\n\
             \x20 filling   2\n\
             \x20 require   gap 1 >= 60 meV\n\
             \x20 require   width 1 = 32 meV within 8 meV\n\
             \x20 measure   line = level 2 at centre - level 1 at centre\n\
             \x20 require   line <= 320 meV\n"
        );
    }
    text
}

/// The text with another thickness in the middle of it.
fn one_digit_changed(text: &str) -> String {
    let middle = text.find("crystal tern_150").unwrap_or(0);
    let (before, after) = text.split_at(middle);
    format!("{before}{}", after.replacen("5.4 nm of", "5.5 nm of", 1))
}

fn bench(criterion: &mut Criterion) {
    let text = long_text();
    assert_eq!(text.lines().count() / 100, 50);
    let tree = read(&text);
    assert_eq!(tree.entries.len(), 301);
    assert!(
        tree.entries
            .iter()
            .all(|entry| entry.section.problems.is_empty())
    );
    let edited = one_digit_changed(&text);
    assert_ne!(edited, text);
    criterion.bench_function("read 5,000 lines", |bencher| {
        bencher.iter(|| read(black_box(&text)));
    });
    criterion.bench_function("reread 5,000 lines after an edit", |bencher| {
        bencher.iter(|| reread(black_box(&edited), black_box(&tree)));
    });
    criterion.bench_function("index the lines of 5,000 lines", |bencher| {
        bencher.iter(|| LineIndex::new(black_box(&text)));
    });
}

criterion_group!(benches, bench);
criterion_main!(benches);
