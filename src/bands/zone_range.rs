//! The lowest, mean and highest value of a potential in two or three dimensions.
//!
//! Waves, profiles and sites (with their images) are taken at points of space; atoms and wide Gaussians by their
//! Fourier sum. A grid finds the neighbourhood of the extremes, the middles of sites and atoms are added to it, and a
//! search that halves its step closes in.

use crate::model::{Site, SiteShape};

use super::zone_cell::{Vector, dot, filled_up};
use super::zone_field::ZoneField;
use super::{Cancelled, PotentialRange, Unsolved};

/// Points of the grid along each vector, in two and three dimensions.
const GRID: [usize; 2] = [40, 14];
/// From how many of the grid's best points the search starts.
const STARTS: usize = 3;
/// Halvings of the search's step.
const HALVINGS: usize = 24;
/// Images of one site beyond which it is not summed in space.
const MOST_IMAGES: f64 = 3000.0;
/// Terms of the Fourier sum.
const MOST_TERMS: f64 = 3000.0;
/// A Gaussian is nothing past this many widths (below 1e-10).
const WIDTHS: f64 = 6.8;

struct Space<'a> {
    field: &'a ZoneField<'a>,
    /// Sites summed over images: the images' places, the site.
    sites: Vec<(Vec<Vector<f64>>, &'a Site)>,
    /// Fourier sum: G and V(G).
    terms: Vec<(Vector<f64>, (f64, f64))>,
}

/// The range of a crystal's potential.
pub(super) fn potential_range(
    field: &ZoneField<'_>,
    cancelled: &Cancelled<'_>,
) -> Result<PotentialRange, Unsolved> {
    let space = Space::new(field);
    let mean = field.dimensionless([0; 3]).re * field.scale.energy;
    let mut samples: Vec<([f64; 3], f64)> = Vec::new();
    for point in space.points() {
        if samples.len() % 64 == 0 && cancelled() {
            return Err(Unsolved::Cancelled);
        }
        samples.push((point, space.value(point)));
    }
    samples.sort_by(|a, b| a.1.total_cmp(&b.1));
    let close = |sign: f64, starts: &mut dyn Iterator<Item = &([f64; 3], f64)>| {
        starts
            .take(STARTS)
            .map(|(point, value)| sign * space.descend(*point, sign * value, sign))
            .fold(sign * f64::INFINITY, |best, value| {
                if sign > 0.0 {
                    best.min(value)
                } else {
                    best.max(value)
                }
            })
    };
    Ok(PotentialRange {
        lowest: close(1.0, &mut samples.iter()).min(mean),
        mean,
        highest: close(-1.0, &mut samples.iter().rev()).max(mean),
    })
}

impl<'a> Space<'a> {
    fn new(field: &'a ZoneField<'a>) -> Self {
        let mut space = Self {
            field,
            sites: Vec::new(),
            terms: Vec::new(),
        };
        let mut by_terms = Vec::new();
        for site in &field.crystal.potential.sites {
            match space.images(site) {
                Some(images) => space.sites.push((images, site)),
                None => by_terms.push(site),
            }
        }
        if by_terms.is_empty() && field.crystal.potential.atoms.is_empty() {
            return space;
        }
        let most = field.cell.radius_for(MOST_TERMS);
        let radius = field.ends.map_or(most, |ends| ends.min(most));
        for n in field.cell.indices(radius) {
            let part = field.part_of(&by_terms, n);
            if part != (0.0, 0.0) {
                space.terms.push((field.cell.wave(n.map(f64::from)), part));
            }
        }
        space
    }

    /// The places of a site's images that may reach into the cell; `None` where they are too many.
    fn images(&self, site: &Site) -> Option<Vec<Vector<f64>>> {
        let radius = match &site.shape {
            SiteShape::Gaussian(sigma) => WIDTHS * sigma.value,
            SiteShape::Disk(radius) | SiteShape::Sphere(radius) => radius.value,
            SiteShape::Box(sizes) => {
                0.5 * sizes
                    .iter()
                    .map(|size| size.value.powi(2))
                    .sum::<f64>()
                    .sqrt()
            }
            SiteShape::Sech2(_) | SiteShape::Lorentzian(_) => return None,
        };
        let cell = &self.field.cell;
        let across: f64 = cell.vectors.iter().map(|row| dot(row, row).sqrt()).sum();
        let [a, b, c] = cell.reach_in_space(radius);
        let count = [a, b, c]
            .iter()
            .map(|n| 2.0 * f64::from(*n) + 5.0)
            .product::<f64>();
        if count > MOST_IMAGES {
            return None;
        }
        let at: Vector<f64> = filled_up(&site.at);
        let home: [f64; 3] = std::array::from_fn(|axis| {
            cell.reciprocal.get(axis).map_or(0.0, |row| {
                (dot(row, &at) / (2.0 * std::f64::consts::PI)).floor()
            })
        });
        let steps = |axis: usize, most: i32| {
            if axis < self.field.dimension {
                -most - 2..=most + 2
            } else {
                0..=0
            }
        };
        let mut places = Vec::new();
        for x in steps(0, a) {
            for y in steps(1, b) {
                for z in steps(2, c) {
                    let shift = cell.place([
                        f64::from(x) - home[0],
                        f64::from(y) - home[1],
                        f64::from(z) - home[2],
                    ]);
                    let place: Vector<f64> = sum(&at, &shift);
                    if dot(&place, &place).sqrt() <= radius + across {
                        places.push(place);
                    }
                }
            }
        }
        Some(places)
    }

    /// The grid's points and the middles of sites and atoms, in fractions of the cell.
    fn points(&self) -> Vec<[f64; 3]> {
        let field = self.field;
        let size = GRID.get(field.dimension - 2).copied().unwrap_or(1);
        let total = size.pow(u32::try_from(field.dimension).unwrap_or(1));
        let grid = (0..total).map(|index| {
            let along = |axis: usize| {
                (index / size.pow(u32::try_from(axis).unwrap_or(0)) % size) as f64 / size as f64
            };
            std::array::from_fn(|axis| {
                if axis < field.dimension {
                    along(axis)
                } else {
                    0.0
                }
            })
        });
        let potential = &field.crystal.potential;
        let sites = potential.sites.iter().map(|site| &site.at);
        let middles = sites.chain(potential.atoms.iter().map(|atom| &atom.at));
        let middles = middles.map(|at| {
            let at: Vector<f64> = filled_up(at);
            std::array::from_fn(|axis| {
                field.cell.reciprocal.get(axis).map_or(0.0, |row| {
                    (dot(row, &at) / (2.0 * std::f64::consts::PI)).rem_euclid(1.0)
                })
            })
        });
        grid.chain(middles).collect()
    }

    /// V at a point given in fractions of the cell, in joule.
    fn value(&self, fractions: [f64; 3]) -> f64 {
        let fractions = fractions.map(|x: f64| x.rem_euclid(1.0));
        let place = self.field.cell.place(fractions);
        let turn = |wave: &Vector<f64>| dot(wave, &place);
        let waves: f64 = self
            .field
            .wave_parts()
            .map(|(wave, (real, imaginary))| {
                let angle = turn(wave);
                real * angle.cos() - imaginary * angle.sin()
            })
            .sum();
        let terms: f64 = self
            .terms
            .iter()
            .map(|(wave, (real, imaginary))| real * turn(wave).cos() - imaginary * turn(wave).sin())
            .sum();
        let profile = self.field.crystal.potential.profile.first();
        let profile = profile.map_or(0.0, |piece| piece.formula.at(&place));
        let sites: f64 = self
            .sites
            .iter()
            .map(|(images, site)| {
                let covered: f64 = images
                    .iter()
                    .map(|image| shape(&site.shape, &difference(&place, image)))
                    .sum();
                site.energy.value * covered
            })
            .sum();
        waves + terms + profile + sites
    }

    /// The least value of sign·V near a point, by steps along the axes and diagonals that are halved.
    fn descend(&self, start: [f64; 3], value: f64, sign: f64) -> f64 {
        let dimension = self.field.dimension;
        let (mut at, mut best) = (start, value);
        let mut step = 0.5 / GRID.get(dimension - 2).copied().unwrap_or(1) as f64;
        for _ in 0..HALVINGS {
            let mut moved = true;
            let mut tries = 0;
            while moved && tries < 8 {
                moved = false;
                tries += 1;
                for direction in DIRECTIONS {
                    if dimension == 2 && direction[2] != 0.0 {
                        continue;
                    }
                    let next: [f64; 3] = [
                        at[0] + step * direction[0],
                        at[1] + step * direction[1],
                        at[2] + step * direction[2],
                    ];
                    let there = sign * self.value(next);
                    if there < best {
                        (at, best, moved) = (next, there, true);
                    }
                }
            }
            step *= 0.5;
        }
        best
    }
}

const DIRECTIONS: [[f64; 3]; 10] = [
    [1.0, 0.0, 0.0],
    [-1.0, 0.0, 0.0],
    [0.0, 1.0, 0.0],
    [0.0, -1.0, 0.0],
    [1.0, 1.0, 0.0],
    [-1.0, -1.0, 0.0],
    [1.0, -1.0, 0.0],
    [-1.0, 1.0, 0.0],
    [0.0, 0.0, 1.0],
    [0.0, 0.0, -1.0],
];

fn sum([a, b, c]: &Vector<f64>, [x, y, z]: &Vector<f64>) -> Vector<f64> {
    [a + x, b + y, c + z]
}

fn difference([a, b, c]: &Vector<f64>, [x, y, z]: &Vector<f64>) -> Vector<f64> {
    [a - x, b - y, c - z]
}

/// A shape's value at a distance from its middle.
fn shape(shape: &SiteShape, from: &Vector<f64>) -> f64 {
    let square = dot(from, from);
    let inside = |is: bool| if is { 1.0 } else { 0.0 };
    match shape {
        SiteShape::Gaussian(sigma) => (-0.5 * square / sigma.value.powi(2)).exp(),
        SiteShape::Disk(radius) | SiteShape::Sphere(radius) => {
            inside(square <= radius.value.powi(2))
        }
        SiteShape::Box(sizes) => inside(
            sizes
                .iter()
                .zip(from)
                .all(|(size, x)| 2.0 * x.abs() <= size.value),
        ),
        SiteShape::Sech2(_) | SiteShape::Lorentzian(_) => 0.0,
    }
}
