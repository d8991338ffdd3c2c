//! Worst cases over tolerances, from text, against brute force: every point of a grid over the box.
//!
//! A worst value must be no better than the grid's, must be had at the point of the box that is named for it, and cannot
//! lie below the grid's by more than a grid can miss: on each axis a point is at most half a step from one of the grid,
//! and twice the steepest change seen between neighbours leaves room for curvature between them.
#![allow(
    clippy::indexing_slicing,
    clippy::print_stdout,
    clippy::unwrap_used,
    missing_docs
)]

#[path = "bands/mod.rs"]
mod bench;

use bench::{Bench, EV};
use crenate::bands::{Assessment, Measured, Solution, TargetState};
use crenate::model::{ParameterId, ParameterKind, Setting};
use rayon::prelude::*;

/// The quantity that a target's text begins with.
fn quantity(solution: &Solution, text: &str) -> Measured {
    let words: Vec<&str> = text.split_whitespace().collect();
    let band = words[1].parse::<usize>().unwrap() - 1;
    match words[0] {
        "gap" => solution.gaps[band].size,
        "width" => solution.bands[band].width,
        "bottom" => solution.bands[band].bottom.energy,
        "top" => solution.bands[band].top.energy,
        word => panic!("no quantity {word}"),
    }
}

fn draws(bench: &Bench) -> Vec<ParameterId> {
    let parameters = bench.build(0, &Setting::default()).crystal.parameters;
    let own = parameters
        .iter()
        .filter(|one| one.kind == ParameterKind::Draw);
    own.map(|one| one.id).collect()
}

fn setting(draws: &[ParameterId], point: &[f64]) -> Setting {
    let mut setting = Setting::default();
    for (draw, at) in draws.iter().zip(point) {
        setting.draws.insert(*draw, *at);
    }
    setting
}

/// Values of all targets on a grid of `n` points on each axis, the first axis fastest.
fn grid(bench: &Bench, draws: &[ParameterId], targets: &[Assessment], n: usize) -> Vec<Vec<f64>> {
    let points: Vec<usize> = (0..n.pow(draws.len() as u32)).collect();
    let solved = points.par_iter().map(|index| {
        let point: Vec<f64> = (0..draws.len())
            .map(|axis| -1.0 + 2.0 * (index / n.pow(axis as u32) % n) as f64 / (n - 1) as f64)
            .collect();
        let solution = bench.solve_at(0, &setting(draws, &point));
        targets
            .iter()
            .map(|target| quantity(&solution, &target.text).value)
            .collect()
    });
    solved.collect()
}

/// Twice half the steepest change between neighbours, over all axes.
fn missed(values: &[f64], axes: usize, n: usize) -> f64 {
    let steepest = |axis: usize| {
        let stride = n.pow(axis as u32);
        let inner = (0..values.len()).filter(|index| index / stride % n + 1 < n);
        inner
            .map(|index| (values[index + stride] - values[index]).abs())
            .fold(0.0, f64::max)
    };
    (0..axes).map(steepest).sum()
}

/// Checks every target of a crystal with this many tolerances against a grid of `n` points an axis.
fn check(name: &str, text: &str, tolerances: usize, n: usize) -> Vec<Assessment> {
    let bench = Bench::new(text);
    let draws = draws(&bench);
    assert_eq!(draws.len(), tolerances, "{name}");
    let (targets, _) = bench.assess(0);
    let all = grid(&bench, &draws, &targets, n);
    for (index, target) in targets.iter().enumerate() {
        // turned so that the worst is the least
        let sign = if target.limits.0.is_some() { 1.0 } else { -1.0 };
        let values: Vec<f64> = all.iter().map(|point| sign * point[index]).collect();
        let least = values.iter().copied().fold(f64::INFINITY, f64::min);
        let worst = sign * target.worst.expect("a worst value");
        let mut point = vec![0.0; draws.len()];
        for (id, at) in &target.corner {
            assert!(at.abs() <= 1.0, "{name}: {target:?}");
            point[draws.iter().position(|draw| draw == id).unwrap()] = *at;
        }
        let there = quantity(&bench.solve_at(0, &setting(&draws, &point)), &target.text);
        println!(
            "{name:<34} {:<22} worst {:>12.9} eV, grid of {} {:>12.9} eV",
            target.text,
            worst / EV,
            values.len(),
            least / EV
        );
        let allowed = 2.0 * there.uncertainty;
        assert!(
            worst <= least + allowed,
            "{name}: `{}`: {worst:e} is above the grid's {least:e}",
            target.text
        );
        assert!(
            (worst - sign * there.value).abs() <= allowed,
            "{name}: `{}`: {worst:e} is told, and {there:?} is there",
            target.text
        );
        let missed = missed(&values, draws.len(), n);
        assert!(
            worst >= least - missed - allowed,
            "{name}: `{}`: {worst:e} is more than {missed:e} below the grid's {least:e}",
            target.text
        );
    }
    targets
}

const MATERIALS: &str = "material basin\n  mass 0.067 me\n  edge 0 meV\n  rate 1 ± 1.5 %\n\
                         material wall\n  mass 0.092 me\n  edge 235 meV ± 5 meV\n";

/// Layer 4.5 nm ± 0.2 nm at 0, wall 11.56 nm at 235 meV: gap 2 is about 5.5 meV at both ends and closes between.
#[test]
fn one_tolerance_between_whose_ends_a_gap_closes() {
    let text = "crystal c\n  mass 0.067 me\n  bands 3\n  layer 4.5 nm ± 0.2 nm at 0 meV\n  layer 11.56 nm at 235 meV\n  \
                require gap 2 >= 0.01 meV\n  require gap 1 >= 1 meV\n  require top 1 <= 1 eV\n  require width 2 >= 0 meV\n";
    let targets = check("a gap that closes and reopens", text, 1, 401);
    assert_eq!(targets[0].state, TargetState::AtRisk, "{:?}", targets[0]);
    assert!(targets[0].worst.unwrap() / EV < 1e-9);
    assert!(targets[0].corner[0].1.abs() < 0.9, "{:?}", targets[0]);
    assert_eq!(targets[0].driver, Some(targets[0].corner[0].0));
}

#[test]
fn two_tolerances_of_materials() {
    let text = format!(
        "{MATERIALS}crystal c\n  bands 3\n  layer 5.4 nm of basin\n  layer 2.6 nm of wall\n  require gap 1 >= 60 meV\n  \
         require width 1 <= 40 meV\n  require bottom 1 >= 0 meV\n"
    );
    check("a rate and an edge", &text, 2, 15);
    let text = "crystal c\n  mass 0.067 me\n  bands 3\n  layer 4.5 nm ± 0.2 nm at 0 meV\n  layer 11.56 nm ± 0.1 nm at 235 meV\n  \
                require gap 2 >= 0.1 meV\n  require width 1 <= 1 eV\n";
    let targets = check("a gap that closes along a line", text, 2, 21);
    assert!(targets[0].worst.unwrap() / EV < 1e-9, "{:?}", targets[0]);
}

#[test]
fn three_tolerances_with_a_shared_name() {
    let text = "crystal c\n  let w = 2.4 nm ± 3 %\n  bands 3\n  layer 2*w at 0 meV mass 0.067 me ± 4 %\n  \
                layer w at 240 meV ± 10 meV mass 0.09 me\n  require gap 1 >= 40 meV\n  require gap 2 >= 0 meV\n  \
                require width 1 <= 80 meV\n  require top 2 <= 1 eV\n";
    check("a shared name, a mass, an edge", text, 3, 7);
    let text = "crystal c\n  mass 1 me\n  bands 3\n  lattice chain 1 nm\n  cosine 1 = 0.4 eV ± 0.2 eV\n  \
                cosine 2 = 0.3 eV ± 0.25 eV\n  cosine 3 = 0.2 eV ± 5 % phase 0.3\n  require gap 2 >= 0 eV\n";
    check("waves", text, 3, 5);
}

#[test]
fn four_tolerances() {
    let text = format!(
        "{MATERIALS}crystal c\n  bands 2\n  layer 5.4 nm of basin\n  layer 2.6 nm ± 0.14 nm of wall\n  \
         delta 0.02 eV*nm ± 30 % at 2.7 nm\n  require gap 1 >= 60 meV\n  require width 1 <= 40 meV\n"
    );
    check("a rate, an edge, a width, a spike", &text, 4, 5);
}

#[test]
fn six_tolerances() {
    let text = "crystal c\n  bands 2\n  layer 4 nm ± 2 % at 0 meV ± 3 meV mass 0.067 me ± 3 %\n  \
                layer 3 nm ± 4 % at 180 meV ± 6 meV mass 0.09 me ± 3 %\n  require gap 1 >= 10 meV\n  \
                require width 1 <= 100 meV\n  require top 1 <= 1 eV\n";
    check("all of two layers", text, 6, 3);
    // gap 2 closes along a surface that crosses the box, while at its middle and corners it is open
    let text = "crystal c\n  bands 2\n  layer 4.5 nm ± 0.2 nm at 0 meV ± 0.2 meV mass 0.067 me ± 0.1 %\n  \
                layer 11.56 nm ± 0.02 nm at 235 meV ± 0.5 meV mass 0.067 me ± 0.1 %\n  require gap 2 >= 0.1 meV\n";
    let targets = check("a gap that closes on a surface", text, 6, 3);
    assert!(targets[0].worst.unwrap() / EV < 1e-9, "{:?}", targets[0]);
}

#[test]
fn eight_tolerances() {
    let text = "material basin\n  mass 0.067 me ± 2 %\n  edge 0 meV ± 2 meV\n  rate 1 ± 1.5 %\n\
                material wall\n  mass 0.092 me ± 2 %\n  edge 235 meV ± 5 meV\n  rate 1 ± 1 %\n\
                crystal c\n  bands 2\n  layer 5.4 nm ± 0.1 nm of basin\n  layer 2.6 nm ± 0.14 nm of wall\n  \
                require gap 1 >= 60 meV\n  require width 1 <= 40 meV\n  require gap 2 >= 1 meV\n";
    check("two materials and two widths", text, 8, 3);
}
