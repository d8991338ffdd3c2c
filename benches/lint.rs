//! How many files a second are checked: 1,000 files of about 15 lines, through the same code as `crenate lint`.
#![allow(missing_docs, clippy::print_stdout)]

use std::fmt::Write as _;
use std::path::{Path, PathBuf};
use std::time::{Duration, Instant};

use crenate::report::Tier;
use crenate::report::analyst::{Analyst, Request};
use crenate::report::disk::{self, Disk};
use crenate::report::lint_text;
use crenate::report::locate::Locator;
use crenate::report::paint::Paint;
use criterion::{Criterion, Throughput, criterion_group, criterion_main};
use rayon::prelude::*;

const FILES: usize = 1000;

/// A file of one or two crystals; no two files say the same, so that no result is found twice.
fn text(number: usize) -> String {
    let (tenth, third) = (number % 100, number / 100);
    let mut text = format!(
        "# Design {number} of a made-up family.\n\
         material basin\n  mass      0.0{}7 me\n  edge      0 meV\n\n\
         material wall\n  mass      0.092 me\n  edge      {} meV ± 5 meV\n\n\
         crystal tern_{number}\n  layer     5.{tenth:02} nm of basin\n  layer     2.{third} nm of wall\n\
         \x20 require   gap 1 >= 40 meV\n",
        5 + number % 3,
        220 + number % 37,
    );
    if number % 2 == 0 {
        let _ = write!(
            text,
            "\ncrystal wave_{number}\n  mass      0.5 me\n  lattice   chain 1.{tenth:02} nm\n  cosine    1 = {} meV\n",
            300 + third
        );
    }
    text
}

fn write(folder: &Path) -> Vec<PathBuf> {
    (0..FILES)
        .map(|number| {
            let path = folder.join(format!("design_{number:04}.cren"));
            std::fs::write(&path, text(number)).expect("the scratch folder takes a file");
            path
        })
        .collect()
}

/// What the command does with each file, but for the printing; the length of what it would print.
fn lint(folder: &Path, files: &[PathBuf]) -> usize {
    let disk = Disk::within(&[folder.to_owned()]);
    let used = files.par_iter().flat_map_iter(|file| disk::uses(file));
    let analyst = Analyst::knowing_used(used.collect());
    files
        .par_iter()
        .map(|path| {
            let analysis = analyst.analyse(&Request {
                source: &disk,
                roots: std::slice::from_ref(path),
                depth: Tier::Bands,
                cancel: &|| false,
            });
            let Some(file) = analysis.files.first() else {
                return 0;
            };
            let findings = file.chosen_findings(&[]);
            let plain = Paint { colour: false };
            lint_text::file(&Locator::new(&analysis), file, &findings, plain).len()
        })
        .sum()
}

fn bench(criterion: &mut Criterion) {
    let folder = tempfile::tempdir().expect("there is room for a scratch folder");
    let files = write(folder.path());
    let start = Instant::now();
    let told = lint(folder.path(), &files);
    let seconds = start.elapsed().as_secs_f64();
    let threads = rayon::current_num_threads();
    println!(
        "lint: {:.0} files a second on {threads} threads at the first go ({told} bytes of findings)",
        FILES as f64 / seconds
    );
    let mut group = criterion.benchmark_group("lint");
    group
        .sample_size(10)
        .measurement_time(Duration::from_secs(8));
    group.throughput(Throughput::Elements(FILES as u64));
    group.bench_function("1000 files", |bencher| {
        bencher.iter(|| lint(folder.path(), &files));
    });
    group.finish();
}

criterion_group!(benches, bench);
criterion_main!(benches);
