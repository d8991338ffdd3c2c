//! Bands, gaps and masses of a cell.

use super::budget::{BOUND, Budget, Meter};
use super::cell::{Bounded, Cell, Ready, SolveError, prepare};
use super::double::Double;
use super::edges::{RawEdge, RawGap, narrow_pair, settle};
use super::mesh::gauss_legendre;
use super::scalar::Scalar;
use super::search::{Finder, GapPoint, Target, is_positive};
use super::sweep::{Reading, read};
use std::sync::LazyLock;

/// Where in the zone an edge lies.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Wave {
    /// k = 0
    Centre,
    /// k = π/a
    Edge,
}

/// One end of a band.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct BandEdge {
    /// Its energy.
    pub energy: Bounded,
    /// Its place in the zone.
    pub at: Wave,
    /// The signed effective mass, in the unit of the cell's masses; `None` where two bands touch.
    pub mass: Option<Bounded>,
}

/// A band.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Band {
    /// Its lowest energy.
    pub bottom: BandEdge,
    /// Its highest energy.
    pub top: BandEdge,
    /// top − bottom, with relative accuracy also where the band is narrower than the rounding of
    /// its energy.
    pub width: Bounded,
}

/// The gap above a band.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Gap {
    /// Its size; 0 with the bound as error if `closed`.
    pub size: Bounded,
    /// Cannot be told from zero.
    pub closed: bool,
}

/// The lowest bands of a cell.
#[derive(Clone, Debug, PartialEq)]
pub struct Bands {
    /// From the lowest.
    pub bands: Vec<Band>,
    /// `gaps[n]` lies above band n.
    pub gaps: Vec<Gap>,
    /// Sweeps over the cell that were needed.
    pub sweeps: usize,
    /// The work they were, as [`Budget`] counts it.
    pub work: usize,
}

/// Widths below this share of the spacing of bands are taken from D′ where edges are in `f64`.
pub(crate) const NARROW_WIDTH: f64 = 1e-3;

static FOUR_NODES: LazyLock<Vec<(f64, f64)>> = LazyLock::new(|| gauss_legendre(4));

/// Everything found before bounds are put on.
pub(crate) struct Raw {
    pub bottom: RawEdge,
    pub gaps: Vec<RawGap>,
    /// a reading inside each band: energy, D, D′
    pub inside: Vec<(Double, f64, f64)>,
    /// widths taken from D′ inside a band rather than from its edges
    pub widths: Vec<Option<f64>>,
    /// finished in double-double
    pub exact: bool,
}

/// The lowest `bands` bands of a cell, their edges and masses, and the gaps above each.
/// Errors: see [`SolveError`].
pub fn solve(cell: &Cell, bands: usize, budget: &Budget) -> Result<Bands, SolveError> {
    let ready = prepare(cell)?;
    let meter = Meter::new(budget);
    let raw = find(&ready, bands, &meter)?;
    let top = raw.gaps.last().map_or(raw.bottom, |gap| gap.upper);
    let edges = 2 * bands + 1;
    meter.sweep::<f64>(&ready, top.energy.round(), BOUND * edges)?;
    Ok(super::uncertainty::finish(&ready, &raw, &meter))
}

/// Finds all edges, in `f64` and where that cannot separate bands in double-double.
pub(crate) fn find(ready: &Ready, bands: usize, meter: &Meter) -> Result<Raw, SolveError> {
    match find_in::<f64>(ready, bands, meter, &[])? {
        Ok(raw) => Ok(raw),
        Err(seeds) => {
            find_in::<Double>(ready, bands, meter, &seeds)?.map_err(|_| SolveError::NoBracket)
        }
    }
}

/// If a band is narrower than the arithmetic resolves, the energies around each band instead.
fn find_in<T: Scalar>(
    ready: &Ready,
    bands: usize,
    meter: &Meter,
    seeds: &[f64],
) -> Result<Result<Raw, Vec<f64>>, SolveError> {
    let mut finder = Finder::<T>::new(ready, meter);
    finder.sow(seeds)?;
    finder.surround(bands)?;
    let mut inside = Vec::with_capacity(bands + 1);
    for band in 0..=bands {
        if let Some(reading) = finder.inside(band)?.accept()
            && finder.trusts(&reading)?
        {
            inside.push(reading);
        }
    }
    if inside.len() <= bands {
        return Ok(Err(finder.seeds(bands)));
    }
    let polish = ready.layered;
    let (energy, reading) = finder.root(Target::edge(0, true), inside[0].energy)?;
    let bottom = settle(
        ready,
        meter,
        Target::edge(0, true),
        energy,
        &reading,
        polish,
    )?;
    let mut gaps = Vec::with_capacity(bands);
    for band in 0..bands {
        match find_gap(&mut finder, &inside, band, polish)? {
            Some(gap) => gaps.push(gap),
            None => return Ok(Err(finder.seeds(bands))),
        }
    }
    let exact = polish || T::UNIT < f64::UNIT;
    let mut widths = Vec::with_capacity(bands);
    for band in 0..bands {
        let low = if band == 0 {
            None
        } else {
            Some(&gaps[band - 1])
        };
        widths.push(narrow_width(
            &mut finder,
            &inside[band],
            low,
            &gaps[band],
            exact,
        )?);
    }
    let inside = inside
        .iter()
        .map(|r| (r.energy.to_double(), r.discriminant(), r.slope()))
        .collect();
    Ok(Ok(Raw {
        bottom,
        gaps,
        inside,
        widths,
        exact,
    }))
}

/// w = ∫ dE = ∫ dD/|D′| over D from −2 to 2, by four Gauss–Legendre nodes: for a band so narrow that D′ hardly
/// changes inside it, while its edges' difference has lost digits. `None` where the difference serves.
fn narrow_width<T: Scalar>(
    finder: &mut Finder<T>,
    inside: &Reading<T>,
    below: Option<&RawGap>,
    above: &RawGap,
    exact: bool,
) -> Result<Option<f64>, SolveError> {
    let width = 4.0 / inside.slope().abs();
    let limit = if exact {
        1e-22 * inside.energy.leading().abs()
    } else {
        NARROW_WIDTH * finder.ready.kinetic_scale()
    };
    let size = |gap: &RawGap| (gap.upper.energy - gap.lower.energy).leading();
    let isolated = size(above) > 30.0 * width && below.is_none_or(|gap| size(gap) > 30.0 * width);
    if !isolated || width.is_nan() || width > limit {
        return Ok(None);
    }
    let mut sum = 0.0;
    for (node, weight) in FOUR_NODES.iter() {
        let mut reading = *inside;
        for _ in 0..2 {
            let trace = reading.trace();
            let wanted = T::constant(2.0 * node).shifted(-reading.exponent);
            let step = (wanted - trace.value) / trace.slope;
            if step.leading().abs() <= finder.resolution(reading.energy) {
                break;
            }
            reading = read(finder.ready, reading.energy + step, finder.meter)?;
        }
        sum += 2.0 * weight / reading.slope().abs();
    }
    Ok(Some(sum))
}

/// Both edges of the gap above `band`.
fn find_gap<T: Scalar>(
    finder: &mut Finder<T>,
    inside: &[Reading<T>],
    band: usize,
    polish: bool,
) -> Result<Option<RawGap>, SolveError> {
    let gap = band + 1;
    let (ready, meter) = (finder.ready, finder.meter);
    let lower = Target::edge(gap, false);
    let upper = Target::edge(gap, true);
    match finder.gap_point(inside[band], inside[band + 1], is_positive(gap))? {
        GapPoint::Wide(_) => {
            let (energy, reading) = finder.root(lower, inside[band].energy)?;
            let lower = settle(ready, meter, lower, energy, &reading, polish)?;
            let (energy, reading) = finder.root(upper, inside[band + 1].energy)?;
            let upper = settle(ready, meter, upper, energy, &reading, polish)?;
            Ok(Some(RawGap {
                lower,
                upper,
                noise: lower.noise + upper.noise,
                narrow: false,
            }))
        }
        GapPoint::Noisy(_) => Ok(None),
        GapPoint::Narrow(centre) => {
            if polish {
                narrow_pair(ready, meter, centre.to_double(), is_positive(gap)).map(Some)
            } else {
                narrow_pair(ready, meter, centre, is_positive(gap)).map(Some)
            }
        }
    }
}
