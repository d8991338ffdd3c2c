//! What pictures of lattices are drawn from, against closed forms and published tables.
#![allow(clippy::indexing_slicing, clippy::unwrap_used, missing_docs)]

#[path = "bands/mod.rs"]
mod bench;

use bench::Bench;
use crenate::bands::LatticePicture;
use crenate::model::Setting;

fn picture(text: &str) -> (Bench, LatticePicture) {
    let bench = Bench::new(text);
    let built = bench.build(0, &Setting::default());
    assert!(!built.crystal.broken, "{:#?}", built.troubles);
    let picture = bench
        .solver
        .lattice_picture(&built.crystal, &|| false)
        .unwrap();
    (bench, picture)
}

const EGGS: &str = "crystal eggs\n  carriers bosons\n  mass 10 u\n  lattice square 500 nm\n  recoil 1000 nm\n  \
                    cosine (1,0) = 2.0 Er\n  cosine (0,1) = 2.0 Er\n  bands 2\n";

/// Characteristic values at q = 1 (Abramowitz & Stegun, Handbook of Mathematical Functions, Table 20.1; rows of
/// `mathieu.csv`): a₀ and b₁ of the lowest band, a₁ of the second.
fn mathieu() -> (f64, f64, f64) {
    let rows = include_str!("reference/mathieu.csv");
    let row = |start: &str| -> Vec<f64> {
        let row = rows.lines().find(|row| row.starts_with(start)).unwrap();
        row.split(',')
            .skip(3)
            .take(2)
            .map(|cell| cell.parse().unwrap())
            .collect()
    };
    let (lowest, second) = (row("band,1,0,"), row("band,1,1,"));
    (lowest[0], lowest[1], second[0])
}

#[test]
fn a_separable_lattice_has_sums_of_mathieu_values_at_the_stops() {
    let (bench, picture) = picture(EGGS);
    let crystal = bench.build(0, &Setting::default()).crystal;
    let recoil = crystal.recoil.unwrap().energy.value;
    let (a0, b1, a1) = mathieu();
    let run = &picture.runs[0];
    let at = |band: usize, stop: usize| {
        let (distance, _) = run.stops[stop];
        let point = run.bands[band]
            .iter()
            .find(|(along, _)| *along == distance)
            .unwrap();
        point.1 / recoil
    };
    let names: Vec<&str> = run.stops.iter().map(|(_, name)| name.as_str()).collect();
    assert_eq!(names, ["centre", "X", "M", "centre"]);
    // A picture is as fine as its lines are wide: a thousandth of the window.
    for (band, stop, wanted) in [
        (0, 0, 2.0 * a0),
        (0, 1, a0 + b1),
        (0, 2, 2.0 * b1),
        (1, 1, a0 + a1),
        (1, 2, b1 + a1),
        (0, 3, 2.0 * a0),
    ] {
        let found = at(band, stop);
        assert!(
            (found - wanted).abs() < 4e-3,
            "band {band} at stop {stop}: {found} {wanted}"
        );
    }
}

/// The states of a band that nothing overlaps are one a cell and level (common practice).
#[test]
fn a_band_holds_one_state_a_cell() {
    let cubes = "crystal cubes\n  carriers bosons\n  mass 10 u\n  lattice cubic 500 nm\n  recoil 1000 nm\n  \
                 cosine (1,0,0) = 2 Er\n  cosine (0,1,0) = 2 Er\n  cosine (0,0,1) = 2 Er\n  bands 2\n";
    for text in [EGGS, cubes] {
        let (bench, picture) = picture(text);
        let band = &bench.solve(0).bands[0];
        let margin = 0.2 * band.width.value;
        let (from, to) = (
            band.bottom.energy.value - margin,
            band.top.energy.value + margin,
        );
        let step = picture.density[1].0 - picture.density[0].0;
        let inside = picture
            .density
            .iter()
            .filter(|(energy, _)| (from..to).contains(energy));
        let points = inside.clone().count();
        let states: f64 = inside.map(|(_, density)| density * step).sum();
        // A sum over few points of a density with steps and kinks is off by about one point in its width.
        let fair = 1.5 * step / band.width.value;
        assert!(
            points > 10 && (states - 1.0).abs() < fair,
            "{points} points: {states} states, {fair}"
        );
    }
}

#[test]
fn all_bands_below_the_top_of_the_window_are_there() {
    let (_, picture) = picture(EGGS);
    let highest = picture
        .runs
        .iter()
        .filter_map(|run| run.bands.last())
        .flatten();
    let highest = highest
        .map(|(_, energy)| *energy)
        .fold(f64::INFINITY, f64::min);
    assert!(highest <= picture.complete && picture.complete.is_finite());
}
