//! Layered cells and delta combs against rows computed from the closed form
//! (Kronig & Penney, Proc. R. Soc. A 130, 499 (1931); BenDaniel & Duke, Phys. Rev. 152, 683 (1966)).
use super::reference::{Tally, layered_cell, number, optional, rows};
use crenate::numerics::{Bands, Bounded, Budget, solve};

const LAYERS: &str = include_str!("kronig_penney.csv");
const COMBS: &str = include_str!("delta_combs.csv");

/// Every cell of a file with its solution and its band rows.
fn solved(text: &str) -> Vec<(String, f64, Bands, Vec<Vec<&str>>)> {
    let all = rows(text);
    let cells = all.iter().filter(|r| r[0] == "cell");
    cells
        .map(|cell| {
            let fields: Vec<f64> = cell[2..].iter().map(|f| number(f)).collect();
            let bands: Vec<Vec<&str>> = all
                .iter()
                .filter(|r| r[0] == "band" && r[1] == cell[1])
                .cloned()
                .collect();
            let found = solve(&layered_cell(&fields), bands.len(), &Budget::default())
                .unwrap_or_else(|e| panic!("{}: {e:?}", cell[1]));
            (cell[1].to_string(), fields[6], found, bands)
        })
        .collect()
}

fn check_file(name: &str, text: &str) -> [Tally; 4] {
    let mut edges = Tally::new(&format!("{name} edges"));
    let mut widths = Tally::new(&format!("{name} widths"));
    let mut gaps = Tally::new(&format!("{name} gaps"));
    let mut masses = Tally::new(&format!("{name} masses"));
    for (cell, unit, found, bands) in solved(text) {
        let scale = bands
            .iter()
            .map(|b| number(b[4]).abs())
            .fold(1e-300, f64::max);
        for (n, row) in bands.iter().enumerate() {
            let label = format!("{cell} band {n}");
            let band = &found.bands[n];
            edges.check(&label, band.bottom.energy, number(row[3]), scale);
            edges.check(&label, band.top.energy, number(row[4]), scale);
            widths.check(&label, band.width, number(row[5]), number(row[5]));
            let gap = number(row[6]);
            assert_eq!(
                found.gaps[n].closed,
                gap == 0.0,
                "{label}: {:?}",
                found.gaps[n]
            );
            gaps.check(
                &label,
                found.gaps[n].size,
                gap,
                if gap > 0.0 { gap } else { scale },
            );
            for (edge, field) in [(&band.bottom, row[7]), (&band.top, row[8])] {
                assert_eq!(edge.mass.is_some(), optional(field).is_some(), "{label}");
                if let (Some(mass), Some(truth)) = (edge.mass, optional(field)) {
                    let mass = Bounded {
                        value: mass.value * unit,
                        error: mass.error * unit,
                    };
                    masses.check(&label, mass, truth, truth.abs());
                }
            }
        }
    }
    [
        edges.within(1e-13 / f64::EPSILON),
        widths.within(1e-12 / f64::EPSILON),
        gaps.within(1e-12 / f64::EPSILON),
        masses.within(1e-11 / f64::EPSILON),
    ]
}

/// The tallies of both files.
pub fn tallies() -> Vec<Tally> {
    let mut all = check_file("kronig_penney", LAYERS).to_vec();
    all.extend(check_file("delta_combs", COMBS));
    all
}
