//! Smooth cells: characteristic values of Mathieu's equation (Abramowitz & Stegun, NBS 1964, Table 20.1;
//! DLMF ch. 28), the optical lattice (Bloch, Dalibard & Zwerger, Rev. Mod. Phys. 80, 885 (2008)), Lamé's
//! finite-gap potentials (Ince, Proc. R. Soc. Edinburgh 60, 47 (1940); DLMF ch. 29), chains of wells.
use super::reference::{Tally, number, rows, smooth_cell, sn_squared};
use crenate::numerics::{Bands, Budget, Cell, fermi, solve};
use std::f64::consts::PI;

/// Gaps below this many eps of the scale may be reported closed.
const RESOLVED: f64 = 200.0;

struct Tallies {
    edges: Tally,
    widths: Tally,
    gaps: Tally,
}

impl Tallies {
    fn new(name: &str) -> Self {
        let tally = |what: &str| Tally::new(&format!("{name} {what}"));
        Tallies {
            edges: tally("edges"),
            widths: tally("widths"),
            gaps: tally("gaps"),
        }
    }

    /// Rows: bottom, top, width, gap above.
    fn check(&mut self, label: &str, found: &Bands, bands: &[Vec<&str>], first: usize) {
        let scale = bands
            .iter()
            .map(|b| number(b[first + 1]).abs())
            .fold(1e-300, f64::max);
        for (n, row) in bands.iter().enumerate() {
            let label = format!("{label} band {n}");
            let band = &found.bands[n];
            self.edges
                .check(&label, band.bottom.energy, number(row[first]), scale);
            self.edges
                .check(&label, band.top.energy, number(row[first + 1]), scale);
            self.widths.check(
                &label,
                band.width,
                number(row[first + 2]),
                number(row[first + 2]),
            );
            let gap = number(row[first + 3]);
            self.gaps.check(&label, found.gaps[n].size, gap, scale);
            if gap > RESOLVED * f64::EPSILON * scale {
                assert!(
                    !found.gaps[n].closed,
                    "{label}: {:?} is {gap:e}",
                    found.gaps[n]
                );
            }
        }
    }

    fn finish(self) -> Vec<Tally> {
        vec![
            self.edges.within(1e-12 / f64::EPSILON),
            self.widths.within(1e-11 / f64::EPSILON),
            self.gaps.within(1e-12 / f64::EPSILON),
        ]
    }
}

/// Groups of `band` rows by their second field.
fn groups(text: &str) -> Vec<(String, Vec<Vec<&str>>)> {
    let mut result: Vec<(String, Vec<Vec<&str>>)> = Vec::new();
    for row in rows(text).into_iter().filter(|r| r[0] == "band") {
        match result.last_mut() {
            Some((label, group)) if *label == row[1] => group.push(row),
            _ => result.push((row[1].to_string(), vec![row])),
        }
    }
    result
}

fn solved(cell: &Cell, bands: usize) -> Bands {
    solve(cell, bands, &Budget::default()).unwrap()
}

fn mathieu_characteristic_values() -> Vec<Tally> {
    let mut tallies = Tallies::new("mathieu");
    for (q, bands) in groups(include_str!("mathieu.csv")) {
        let amplitude = 2.0 * number(&q);
        let cell = smooth_cell(PI, &|x| amplitude * (2.0 * x).cos(), amplitude);
        let found = solved(&cell, bands.len());
        tallies.check(&format!("q {q}"), &found, &bands, 3);
    }
    tallies.finish()
}

fn lattice_cell(depth: f64) -> Cell {
    smooth_cell(PI, &|x| depth * x.cos().powi(2), depth)
}

fn optical_lattice_bands() -> Vec<Tally> {
    let mut tallies = Tallies::new("optical lattice");
    for (s, bands) in groups(include_str!("optical_lattice.csv")) {
        let found = solved(&lattice_cell(number(&s)), bands.len());
        tallies.check(&format!("s {s}"), &found, &bands, 3);
    }
    tallies.finish()
}

fn optical_lattice_fillings() -> Vec<Tally> {
    let mut tally = Tally::new("optical lattice fillings");
    for row in rows(include_str!("optical_lattice.csv"))
        .iter()
        .filter(|r| r[0] == "fill")
    {
        let found = fermi(
            &lattice_cell(number(row[1])),
            number(row[2]),
            &Budget::default(),
        )
        .unwrap();
        tally.check(
            &format!("s {} n {}", row[1], row[2]),
            found,
            number(row[3]),
            number(row[3]),
        );
    }
    vec![tally.within(1e-12 / f64::EPSILON)]
}

fn chains_of_wells() -> Vec<Tally> {
    let mut tallies = Tallies::new("smooth wells");
    for (label, bands) in groups(include_str!("smooth_wells.csv")) {
        let parts: Vec<&str> = label.split(':').collect();
        let [v, w, d] = [1, 2, 3].map(|i| number(parts[i]));
        let gauss = parts[0] == "gauss";
        let shape = |x: f64| {
            if gauss {
                (-0.5 * (x / w).powi(2)).exp()
            } else {
                (x / w).cosh().powi(-2)
            }
        };
        // smallest terms first
        let chain = |x: f64| {
            -v * (-40..=40)
                .map(|j: i32| shape(x - f64::from(j) * d))
                .sum::<f64>()
        };
        let found = solved(&smooth_cell(d, &chain, v.abs()), bands.len());
        tallies.check(&label, &found, &bands, 3);
    }
    tallies.finish()
}

fn lame_potentials() -> Vec<Tally> {
    let mut edges = Tally::new("lame edges");
    for row in rows(include_str!("lame.csv")) {
        let (l, m, period) = (number(row[1]), number(row[2]), number(row[3]));
        let strength = l * (l + 1.0) * m;
        let cell = smooth_cell(period, &|x| strength * sn_squared(x, m), strength);
        let open = l as usize;
        let found = solved(&cell, open + 4);
        let scale = number(row[row.len() - 1]);
        let label = format!("l {l} m {m}");
        for n in 0..open {
            edges.check(
                &label,
                found.bands[n].bottom.energy,
                number(row[4 + 2 * n]),
                scale,
            );
            edges.check(
                &label,
                found.bands[n].top.energy,
                number(row[5 + 2 * n]),
                scale,
            );
            assert!(
                !found.gaps[n].closed,
                "{label}: gap {n} {:?}",
                found.gaps[n]
            );
        }
        edges.check(&label, found.bands[open].bottom.energy, scale, scale);
        for n in open..open + 4 {
            assert!(found.gaps[n].closed, "{label}: gap {n} {:?}", found.gaps[n]);
        }
    }
    vec![edges.within(1e-12 / f64::EPSILON)]
}

/// The tallies of all smooth files.
pub fn tallies() -> Vec<Tally> {
    [
        mathieu_characteristic_values,
        optical_lattice_bands,
        optical_lattice_fillings,
        chains_of_wells,
        lame_potentials,
    ]
    .iter()
    .flat_map(|check| check())
    .collect()
}
