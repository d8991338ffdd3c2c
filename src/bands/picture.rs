//! What a picture of a one-dimensional crystal is drawn from: its potential, its bands over the zone, and |ψ|² at the
//! edges.

use crate::model::Crystal;
use crate::numerics::{self, Budget};

use super::chain::{Chain, unsolved};
use super::effort::budget;
use super::field::Field;
use super::{Cancelled, Solution, Unsolved, layout};

/// The lines of a picture. Positions in metre from the left end of the cell, energies in joule.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Picture {
    /// The period.
    pub period: f64,
    /// Points of the potential; two at a step.
    pub potential: Vec<(f64, f64)>,
    /// Deltas: position, and strength in joule metre.
    pub spikes: Vec<(f64, f64)>,
    /// For each band, points (k in fractions of the reciprocal vector, 0 to ½; energy).
    pub dispersion: Vec<Vec<(f64, f64)>>,
    /// |ψ|² at the edges of the bands.
    pub waves: Vec<EdgeWave>,
}

/// |ψ|² of the state at one edge of a band.
#[derive(Clone, Debug, PartialEq)]
pub struct EdgeWave {
    /// The band, from 1.
    pub band: usize,
    /// Whether it is the top, not the bottom.
    pub top: bool,
    /// Its energy.
    pub energy: f64,
    /// Points (position, |ψ|² in units of its mean over the cell).
    pub density: Vec<(f64, f64)>,
}

/// Points of the potential along a 1D crystal's cell, about `points` of them and two at a step; empty where it has no period.
#[must_use]
pub fn potential_line(crystal: &Crystal, points: usize) -> Vec<(f64, f64)> {
    let Some(period) = layout::period(crystal) else {
        return Vec::new();
    };
    let field = Field::new(crystal, period);
    let mut line = Vec::with_capacity(points + 2);
    for stretch in layout::stretches(crystal, period) {
        let (from, length) = (stretch.from.at, stretch.to.at - stretch.from.at);
        let ends = field.ends::<f64>(&stretch);
        line.push((from, ends[0]));
        if field.is_smooth(&stretch) {
            let inner = ((points as f64 * length / period).ceil() as usize).max(2);
            for step in 1..inner {
                let x = from + length * step as f64 / inner as f64;
                line.push((x, field.potential(&stretch, &x)));
            }
        }
        line.push((stretch.to.at, ends[1]));
    }
    line
}

/// All lines of a crystal's picture.
pub(super) fn picture(
    crystal: &Crystal,
    solution: &Solution,
    points: usize,
    cancelled: &Cancelled<'_>,
) -> Result<Picture, Unsolved> {
    let budget = budget(cancelled);
    let chain = Chain::new(crystal, &budget)?;
    let deltas = crystal.potential.deltas.iter();
    let mut picture = Picture {
        period: chain.field.period,
        potential: potential_line(crystal, points),
        spikes: deltas
            .map(|delta| (delta.at.value, delta.strength.value))
            .collect(),
        ..Picture::default()
    };
    for (band, found) in solution.bands.iter().enumerate() {
        let curve = numerics::dispersion(&chain.cell, band, points, &budget).map_err(unsolved)?;
        let turn = 2.0 * std::f64::consts::PI;
        picture.dispersion.push(
            curve
                .iter()
                .map(|[ka, e]| (ka / turn, e * chain.scale.energy))
                .collect(),
        );
        for (top, extremum) in [(false, &found.bottom), (true, &found.top)] {
            let ka = turn * extremum.k.first().copied().unwrap_or(0.0);
            let density = density(&chain, band, ka, points, &budget)?;
            picture.waves.push(EdgeWave {
                band: band + 1,
                top,
                energy: extremum.energy.value,
                density,
            });
        }
    }
    Ok(picture)
}

fn density(
    chain: &Chain<'_>,
    band: usize,
    ka: f64,
    points: usize,
    budget: &Budget<'_>,
) -> Result<Vec<(f64, f64)>, Unsolved> {
    let curve = numerics::wave_function(&chain.cell, band, ka, points, budget).map_err(unsolved)?;
    // The numerics' cell has length one, so that a density that integrates to one has mean one.
    Ok(curve
        .iter()
        .map(|[x, density]| (x * chain.scale.length, *density))
        .collect())
}
