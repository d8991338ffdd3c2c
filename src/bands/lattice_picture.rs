//! What a picture of a two- or three-dimensional crystal is drawn from: its bands along a path through the zone, and the
//! density of states.

use crate::model::Crystal;
use crate::numerics::planewaves::States;

use super::solve::MOST_BANDS;
use super::zone_field::ZoneField;
use super::zone_solve::{Effort, Zone, unsolved, with_zone, zone_budget};
use super::{Cancelled, Unsolved};

/// Steps along the longest stretch between two stops, in two and three dimensions.
const STEPS: [usize; 2] = [32, 20];
/// Bands beyond those asked for, so that the window ends well above them.
const FURTHER: [usize; 2] = [2, 4];
/// Energies at which the density is taken.
const ENERGIES: usize = 240;

/// The one for the dimension of a field.
fn of([flat, solid]: [usize; 2], field: &ZoneField<'_>) -> usize {
    if field.dimension == 2 { flat } else { solid }
}

/// The lines of a lattice's picture, energies in joule.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct LatticePicture {
    /// The path, in unbroken runs.
    pub runs: Vec<PathRun>,
    /// Points (energy, states per cell and joule, all of a level's counted).
    pub density: Vec<(f64, f64)>,
    /// All bands below this energy are there.
    pub complete: f64,
}

/// An unbroken run of the path.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct PathRun {
    /// The stops: how far along the run (in units of its own), and the name.
    pub stops: Vec<(f64, String)>,
    /// For each band, points (how far along the run, energy).
    pub bands: Vec<Vec<(f64, f64)>>,
}

/// All lines of a crystal's picture.
pub(super) fn lattice_picture(
    crystal: &Crystal,
    cancelled: &Cancelled<'_>,
) -> Result<LatticePicture, Unsolved> {
    let field = ZoneField::new(crystal)?;
    // The last one only tells up to where no band is missing.
    let count = crystal.bands.clamp(1, MOST_BANDS) + of(FURTHER, &field) + 1;
    with_zone(&field, |zone| {
        let budget = zone_budget(&field, count, Effort::Coarse, cancelled);
        let runs = crystal.zone_path();
        let runs: Result<Vec<PathRun>, Unsolved> = runs
            .iter()
            .map(|stops| run(zone, stops, count, &budget))
            .collect();
        let mut picture = LatticePicture {
            runs: runs?,
            ..LatticePicture::default()
        };
        let states = zone
            .waves
            .sketched_states(count, &budget)
            .map_err(unsolved)?;
        picture.close();
        // Nothing fills the levels of bosons by twos.
        let each = if crystal.bosons {
            1
        } else {
            crystal.degeneracy
        };
        picture.density = density(zone, &states, f64::from(each), picture.window());
        Ok(picture)
    })
}

impl LatticePicture {
    /// Takes the highest band as the limit up to which all are there.
    fn close(&mut self) {
        let highest = self.runs.iter_mut().filter_map(|run| run.bands.pop());
        self.complete = highest
            .flatten()
            .map(|(_, energy)| energy)
            .fold(f64::INFINITY, f64::min);
    }

    /// The lowest energy, and that up to which all bands are there.
    fn window(&self) -> (f64, f64) {
        let lowest = self
            .runs
            .iter()
            .filter_map(|run| run.bands.first())
            .flatten();
        (
            lowest
                .map(|(_, energy)| *energy)
                .fold(f64::INFINITY, f64::min),
            self.complete,
        )
    }
}

fn run(
    zone: &Zone<'_>,
    stops: &[(String, Vec<f64>)],
    count: usize,
    budget: &crate::numerics::planewaves::Budget<'_>,
) -> Result<PathRun, Unsolved> {
    let steps = of(STEPS, zone.field);
    let points: Vec<[f64; 3]> = stops.iter().map(|(_, point)| filled_up(point)).collect();
    let found = zone
        .waves
        .along(&points, steps, count, budget)
        .map_err(unsolved)?;
    let scale = zone.field.scale.energy;
    let bands = (0..count).map(|band| {
        let points = found.iter();
        points
            .filter_map(|point| Some((point.distance, *point.energies.get(band)? * scale)))
            .collect()
    });
    let places = found.iter().step_by(steps).map(|point| point.distance);
    Ok(PathRun {
        stops: places
            .zip(stops.iter().map(|(name, _)| name.clone()))
            .collect(),
        bands: bands.collect(),
    })
}

fn filled_up(point: &[f64]) -> [f64; 3] {
    std::array::from_fn(|axis| point.get(axis).copied().unwrap_or(0.0))
}

fn density(
    zone: &Zone<'_>,
    states: &States,
    degeneracy: f64,
    (from, to): (f64, f64),
) -> Vec<(f64, f64)> {
    let scale = zone.field.scale.energy;
    let energies = (0..=ENERGIES).map(|step| from + (to - from) * step as f64 / ENERGIES as f64);
    let energies: Vec<f64> = energies.collect();
    let scaled: Vec<f64> = energies.iter().map(|energy| energy / scale).collect();
    let densities = states.densities(&scaled).into_iter();
    energies
        .into_iter()
        .zip(densities.map(|density| degeneracy * density / scale))
        .collect()
}
