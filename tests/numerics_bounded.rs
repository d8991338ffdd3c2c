//! Nothing that a file can say runs away: every crystal is solved or ends in `NotConverged`, within work that is
//! counted, not timed.
#![allow(
    clippy::indexing_slicing,
    clippy::print_stdout,
    clippy::unwrap_used,
    missing_docs
)]

#[path = "bands/mod.rs"]
mod bench;

use bench::Bench;
use crenate::bands::{TargetState, Unsolved};
use crenate::model::Setting;
use std::sync::atomic::{AtomicUsize, Ordering};
use std::time::Instant;

/// Work to each question that the hook is asked (`numerics::Budget`).
const WORK: usize = 64;
/// What one call may cost: the bands, and mesh and Fermi level beside them.
const MOST_WORK: usize = 10_000_000;

fn head(rest: &str) -> String {
    format!("crystal c\n{rest}")
}

/// Name, text, and whether its bands are within reach (`None`: either will do).
fn texts() -> Vec<(&'static str, String, Option<bool>)> {
    let layers = |times: usize| {
        format!(
            "  mass 0.067 me\n  stack {times} times 3 nm at 0 meV, 2 nm at 300 meV mass 0.1 me\n"
        )
    };
    let mut bells = String::from("  mass 1 me\n  lattice chain 4000 nm\n");
    for i in 0..2000 {
        bells += &format!("  site gaussian -1 eV sigma 0.3 nm at {i}.7 nm\n");
    }
    let mut doubled = String::from("  mass 1 me\n  lattice chain 1 nm\n  let a0 = 1 meV\n");
    for i in 1..=24 {
        doubled += &format!("  let a{i} = a{j} + a{j}\n", j = i - 1);
    }
    doubled += "  profile = a24 * 1e-6 * cos(2*pi*x/period)\n";
    let mut waves = String::from("  mass 1 me\n  lattice chain 10 nm\n");
    for i in 1..=1000 {
        waves += &format!("  cosine {i} = 10 meV phase {i}\n");
    }
    let narrow = "  mass 1 me\n  layer 1 nm at 0 meV\n  layer 40 nm at 5 eV\n".repeat(2);
    let narrow = narrow.replacen("  mass 1 me\n", "", 1);
    vec![
        (
            "a deep cosine over half a micrometre",
            head("  mass 1 me\n  lattice chain 500 nm\n  cosine 1 = 1.2 eV\n"),
            Some(true),
        ),
        ("20,000 layers", head(&layers(10_000)), None),
        (
            "20,000 layers, 20 bands, a cosine over them",
            head(&(layers(10_000) + "  bands 20\n  cosine 1 = 10 meV\n")),
            Some(false),
        ),
        (
            "1,000 layers, 20 bands",
            head(&(layers(500) + "  bands 20\n")),
            Some(true),
        ),
        (
            "2,000 layers, 400 bands",
            head(&(layers(1000) + "  bands 400\n")),
            None,
        ),
        (
            "two layers, 400 bands",
            head(&(layers(1) + "  bands 400\n")),
            Some(true),
        ),
        (
            "a cosine of a thousand oscillations",
            head("  mass 1 me\n  lattice chain 300 nm\n  cosine 1000 = 1 eV\n"),
            None,
        ),
        (
            "a cosine of ten thousand oscillations",
            head("  mass 1 me\n  lattice chain 3000 nm\n  cosine 10000 = 1 eV\n  bands 20\n"),
            None,
        ),
        (
            "a thousand cosines",
            head(&waves),
            None,
        ),
        (
            "a lattice of light a million recoils deep",
            head("  mass 86.9 u\n  lattice chain 532 nm\n  recoil 1064 nm\n  carriers bosons\n  depth 1 = 1e6 Er\n  bands 20\n"),
            None,
        ),
        (
            "a lattice of light of 1e12 recoils",
            head("  mass 86.9 u\n  lattice chain 532 nm\n  recoil 1064 nm\n  carriers bosons\n  depth 1 = 1e12 Er\n"),
            None,
        ),
        (
            "an oscillation that no mesh follows",
            head("  mass 1 me\n  lattice chain 100 nm\n  profile = 1 eV * sin(2*pi*1e7*x/period)\n"),
            Some(false),
        ),
        (
            "two thousand steps in a formula",
            head("  mass 1 me\n  lattice chain 100 nm\n  profile = 1 meV * floor(2000*x/period)\n"),
            None,
        ),
        (
            "a cell of a millimetre",
            head("  mass 1 me\n  layer 1 mm at 0 eV\n  layer 1 mm at 1 eV\n  bands 20\n"),
            None,
        ),
        (
            "a ramp of a metre",
            head("  mass 1 me\n  layer 1 m at 0 eV to 1 eV\n  layer 1 nm at 0 eV\n"),
            Some(false),
        ),
        (
            "a heavy particle",
            head("  mass 1e9 me\n  layer 5 nm at 0 eV\n  layer 5 nm at 1 eV\n  bands 20\n"),
            None,
        ),
        (
            "a heavy particle on a cosine",
            head("  mass 1e9 me\n  lattice chain 5 nm\n  cosine 1 = 1 eV\n  bands 20\n"),
            None,
        ),
        (
            "a light particle",
            head("  mass 1e-9 me\n  lattice chain 5 nm\n  cosine 1 = 1 eV\n  bands 20\n"),
            Some(true),
        ),
        (
            "masses a hundred million apart",
            head("  layer 5 nm at 0 eV mass 1e-4 me\n  layer 5 nm at 1 eV mass 1e4 me\n  bands 20\n"),
            None,
        ),
        (
            "a mass that vanishes among the levels",
            "material w\n  mass 0.1 me\n  edge 5 eV\n  nonparabolic 0.5 eV\ncrystal c\n  layer 50 nm of w\n  layer 5 nm at 0 eV mass 0.1 me\n  bands 20\n".into(),
            Some(false),
        ),
        (
            "spikes beyond all measure",
            head("  mass 1 me\n  lattice chain 1 nm\n  delta 1e9 eV*nm at 0.2\n  delta -1e6 eV*nm at 0.6\n  bands 20\n"),
            None,
        ),
        ("two thousand bells", head(&bells), Some(false)),
        ("a formula doubled 24 times", head(&doubled), None),
        (
            "doubled wells behind walls of hundreds of decay lengths",
            head(&narrow),
            Some(true),
        ),
        (
            "a filling deep in many bands",
            head(&(layers(200) + "  bands 300\n  filling 401\n")),
            None,
        ),
    ]
}

/// What spends all that is allowed, and so takes minutes without optimisation.
const LONG: [&str; 15] = [
    "a deep cosine over half a micrometre",
    "20,000 layers",
    "20,000 layers, 20 bands, a cosine over them",
    "1,000 layers, 20 bands",
    "2,000 layers, 400 bands",
    "a cosine of a thousand oscillations",
    "a cosine of ten thousand oscillations",
    "a thousand cosines",
    "a lattice of light a million recoils deep",
    "a lattice of light of 1e12 recoils",
    "an oscillation that no mesh follows",
    "two thousand steps in a formula",
    "a heavy particle on a cosine",
    "two thousand bells",
    "a filling deep in many bands",
];

#[test]
fn what_is_quickly_solved_or_refused_is() {
    check(false);
}

#[test]
fn what_takes_long_ends_in_time() {
    check(true);
}

fn check(long: bool) {
    let mut failures = Vec::new();
    let mut checked = 0;
    for (name, text, within_reach) in texts() {
        if LONG.contains(&name) != long {
            continue;
        }
        checked += 1;
        let begun = Instant::now();
        let bench = Bench::new(&text);
        let built = bench.build(0, &Setting::default());
        assert!(!built.crystal.broken, "{name}: {:?}", built.troubles);
        let built_in = begun.elapsed();
        let asked = AtomicUsize::new(0);
        let count = || {
            asked.fetch_add(1, Ordering::Relaxed);
            false
        };
        let found = bench.solver.solve(&built.crystal, &count);
        let work = WORK * asked.swap(0, Ordering::Relaxed);
        let solved_in = begun.elapsed() - built_in;
        let word = match &found {
            Ok(_) => "solved",
            Err(Unsolved::NotConverged(_)) => "not converged",
            Err(_) => "refused",
        };
        let why = match &found {
            Err(Unsolved::NotConverged(why)) => why.as_str(),
            _ => "",
        };
        let slopes = bench.solver.sensitivities(&built.crystal, 4, &count);
        let more = WORK * asked.swap(0, Ordering::Relaxed);
        println!(
            "{name:<58} {word:<14} work {work:>9}  slopes {more:>9}  ({:.2} s to build, {:.2} s, {:.2} s) {why}",
            built_in.as_secs_f64(),
            solved_in.as_secs_f64(),
            (begun.elapsed() - built_in - solved_in).as_secs_f64()
        );
        let settled = matches!(found, Ok(_) | Err(Unsolved::NotConverged(_)));
        let as_wanted = within_reach.is_none_or(|reach| found.is_ok() == reach);
        let slopes_settled = matches!(slopes, Ok(_) | Err(Unsolved::NotConverged(_)));
        if !(settled && as_wanted && slopes_settled) {
            failures.push(format!("{name}: {found:?}"));
        }
        if work > 3 * MOST_WORK || more > 3 * MOST_WORK {
            failures.push(format!("{name}: {work} and {more} of work"));
        }
    }
    assert!(failures.is_empty(), "{failures:#?}");
    assert_eq!(
        checked,
        if long {
            LONG.len()
        } else {
            texts().len() - LONG.len()
        }
    );
}

/// Targets too: far hops, and tolerances on cells so large that few corners can be solved.
#[test]
fn no_target_runs_away() {
    let mut many = String::from("  mass 0.067 me\n");
    for i in 0..12 {
        many += &format!("  let w{i} = 3 nm ± {}.5 %\n", i % 4);
    }
    for i in 0..600 {
        many += &format!("  layer w{} at {} meV\n", i % 12, i * 7 % 13 * 20);
    }
    many += "  require gap 2 >= 0.001 meV\n  require width 1 <= 1 meV\n";
    let cases = [
        (
            "far hops",
            head(
                "  mass 1 me\n  lattice chain 1 nm\n  cosine 1 = 0.3 eV\n  require hopping 1 by 10000 <= 1 eV\n  \
                 require hopping 1 by 60 <= 1 eV\n  require hopping 4 by 3 <= 1 eV\n",
            ),
        ),
        ("twelve tolerances on 600 layers", head(&many)),
        (
            "a tolerance on a cell that takes long",
            head(
                "  mass 1 me\n  lattice chain 500 nm ± 1 %\n  cosine 1 = 1.2 eV ± 3 %\n  require gap 1 >= 1 meV\n  \
                 require mass bottom 1 >= 1e-3 me\n",
            ),
        ),
    ];
    for (name, text) in cases {
        let begun = Instant::now();
        let bench = Bench::new(&text);
        let asked = AtomicUsize::new(0);
        let (targets, _) = bench.assess_with(0, &|| {
            asked.fetch_add(1, Ordering::Relaxed);
            false
        });
        let work = WORK * asked.load(Ordering::Relaxed);
        println!(
            "{name}: work {work}, {:.2} s: {:?}",
            begun.elapsed().as_secs_f64(),
            targets
                .iter()
                .map(|t| (t.state, t.reason.clone()))
                .collect::<Vec<_>>()
        );
        assert!(
            work < targets.len() * 60_000_000,
            "{name}: {work} for {} targets",
            targets.len()
        );
        for target in &targets {
            assert!(
                target.state != TargetState::Untestable || target.reason.is_some(),
                "{name}: {target:?}"
            );
        }
    }
}
