//! How long an editor waits: one digit typed into a file of 5,000 lines and 300 definitions, on real pipes.
//!
//! `cargo bench --bench server_latency -- [EDITS] [--rush] [--fresh] [--beside] [--server COMMAND]`
//!
//! For each of EDITS edits (200) the clock runs from before the change is written to the last byte of
//! (a) the first findings of that version, (b) findings of that version that hold the new verdict on what the digit
//! moved (for us: on the gap that was solved again), (c) the hover with the new values, asked for together with the
//! change. Then resident memory.
//!
//! * `--rush`: no rest between the edits, and resident memory after 1,000, 10,000, 50,000 and 100,000 of them:
//!   `-- 100000 --rush` shows whether memory stays flat.
//! * `--fresh`: ours is given a number that never stood there with each edit, so that no result that is kept can serve:
//!   `-- 100000 --rush --fresh` shows whether what is kept is bounded.
//! * `--beside`: the same driver on two general-purpose servers and a Python file of as many lines and definitions, one
//!   that lints (`ruff server`) and one that infers types (`basedpyright-langserver`), and how many times longer than
//!   ours each takes. They are installed by pip into the target folder where they are not there yet.
//! * `--server COMMAND`: another build of our server instead of this one.
#![allow(
    clippy::unwrap_used,
    clippy::indexing_slicing,
    clippy::print_stdout,
    missing_docs
)]

mod client;
mod others;
mod samples;

use std::time::Duration;

use client::{Client, Times};
use samples::{DEFINITIONS, Sample};

/// What is measured, in the order of [`Times`].
const NAMES: [&str; 3] = [
    "first findings",
    "findings, new verdict",
    "hover, new values",
];
/// A typist is no machine gun.
const REST: Duration = Duration::from_millis(20);
/// Memory is told after so many edits.
const TELL_MEMORY: [usize; 6] = [1_000, 10_000, 25_000, 50_000, 75_000, 100_000];

fn main() {
    let arguments: Vec<String> = std::env::args().skip(1).collect();
    let given = |flag: &str| arguments.iter().any(|argument| argument == flag);
    let edits = arguments.iter().find_map(|argument| argument.parse().ok());
    let edits: usize = edits.unwrap_or(200);
    let named = arguments.iter().position(|argument| argument == "--server");
    let ours = match named.and_then(|index| arguments.get(index + 1)) {
        Some(command) => command.clone(),
        None => env!("CARGO_BIN_EXE_crenate").to_owned(),
    };
    let rest = if given("--rush") {
        Duration::ZERO
    } else {
        REST
    };
    let ours = [ours, "serve".to_owned()];
    let (sample, mut rows) = (samples::crystals(), Vec::new());
    let pace = Pace {
        edits,
        rest,
        fresh: given("--fresh"),
    };
    rows.extend(measured("crenate", &ours, &sample, pace));
    if given("--beside") {
        for (name, command, sample) in others::servers() {
            let pace = Pace {
                fresh: false,
                ..pace
            };
            rows.extend(measured(name, &command, &sample, pace));
        }
    }
    print_table(&rows);
}

/// How it is typed.
#[derive(Clone, Copy)]
struct Pace {
    edits: usize,
    rest: Duration,
    fresh: bool,
}

/// What came of one measurement of one server.
struct Row {
    server: &'static str,
    what: usize,
    sorted: Vec<Duration>,
}

impl Row {
    fn at(&self, share: f64) -> f64 {
        let index = ((self.sorted.len() - 1) as f64 * share).round() as usize;
        self.sorted[index].as_secs_f64() * 1e3
    }
}

fn measured(server: &'static str, command: &[String], sample: &Sample, pace: Pace) -> Vec<Row> {
    let (mut client, opened) = Client::open(command, sample);
    let lines = sample.text.lines().count();
    println!(
        "{server}: {lines} lines, {DEFINITIONS} definitions, all known {opened:.0?} after the opening"
    );
    let mut times = [const { Vec::new() }; 3];
    for edit in 0..pace.edits {
        // Every definition goes wrong once before the first is mended.
        let (index, wrong) = ((edit * 131) % DEFINITIONS, (edit / DEFINITIONS) % 2 == 0);
        let measured: Times = client.edit(index, wrong, pace.fresh);
        for (all, one) in times.iter_mut().zip(measured) {
            all.extend(one);
        }
        let tell = TELL_MEMORY.contains(&(edit + 1)) || edit + 1 == pace.edits;
        // A launcher's own memory would say nothing, so only ours is told.
        if tell && sample.language == samples::OURS {
            println!("{server}: {} edits, {} kB", edit + 1, client.memory());
        }
        std::thread::sleep(pace.rest);
    }
    let rows = times.into_iter().enumerate().map(|(what, mut sorted)| {
        sorted.sort_unstable();
        Row {
            server,
            what,
            sorted,
        }
    });
    rows.filter(|row| !row.sorted.is_empty()).collect()
}

/// Milliseconds, and how many times longer than the first server's of the same kind.
fn print_table(rows: &[Row]) {
    println!(
        "{:24} {:22} {:>10} {:>10} {:>10} {:>8}",
        "server", "what (ms)", "median", "p99", "worst", "ratio"
    );
    for row in rows {
        let ours = rows.iter().find(|other| other.what == row.what);
        let ratio = row.at(0.5) / ours.unwrap_or(row).at(0.5);
        println!(
            "{:24} {:22} {:>10.2} {:>10.2} {:>10.2} {ratio:>8.1}",
            row.server,
            NAMES[row.what],
            row.at(0.5),
            row.at(0.99),
            row.at(1.0)
        );
    }
}
