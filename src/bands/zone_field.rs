//! The potential of a two- or three-dimensional crystal by its Fourier components, V(r) = Σ V(G) e^{iG·r} in joule, with
//! G by integers on the primitive reciprocal vectors.

use nalgebra::Complex;
use rustc_hash::FxHashMap;

use crate::model::{Crystal, Dual, Formfactor, FormfactorValues, Scalar, Site};
use crate::numerics::planewaves::{Error, Samples};

use super::Unsolved;
use super::scale::Scale;
use super::zone_cell::{Vector, ZoneCell, dot, filled_up};
use super::zone_shapes::{envelope, transform};

/// |G|² belongs to a form factor's shell within this, in (2π/a)².
const SAME_SHELL: f64 = 1e-6;
/// Grid points of a profile in two and three dimensions.
const GRID: [usize; 2] = [512 * 512, 64 * 64 * 64];
/// Components of a profile below this share of its swing are rounding.
const ROUNDING: f64 = 1e-13;

/// A component with its derivatives: real and imaginary part.
pub(super) type Part<S> = (S, S);

/// The potential, made ready.
pub(super) struct ZoneField<'a> {
    pub crystal: &'a Crystal,
    pub dimension: usize,
    pub scale: Scale,
    pub cell: ZoneCell<f64>,
    /// Components of the waves, by primitive indices.
    waves: FxHashMap<[i32; 3], Vec<(Dual, Dual)>>,
    /// Their G and V(G) as plain numbers.
    plain_waves: Vec<(Vector<f64>, (f64, f64))>,
    /// The profile's components, in the scale's energy.
    pub samples: Option<Samples>,
    /// What the profile's grid may have missed, in joule.
    pub missed: f64,
    /// The largest |G| of components that end; `None` where some do not.
    pub ends: Option<f64>,
    /// Running maxima of the form factors' curves from large |G| downwards: (|G|, height).
    curves: Vec<(f64, f64)>,
}

impl<'a> ZoneField<'a> {
    /// Prepares a crystal of dimension 2 or 3.
    pub fn new(crystal: &'a Crystal) -> Result<Self, Unsolved> {
        let dimension = crystal.dimension;
        let cell = ZoneCell::<f64>::new(crystal).ok_or(Unsolved::BrokenModel)?;
        let length = if dimension == 2 {
            cell.volume.sqrt()
        } else {
            cell.volume.cbrt()
        };
        let scale = Scale::new(length, crystal.mass.value).ok_or(Unsolved::BrokenModel)?;
        let mut field = Self {
            crystal,
            dimension,
            scale,
            cell,
            waves: waves(crystal),
            plain_waves: Vec::new(),
            samples: None,
            missed: 0.0,
            ends: None,
            curves: Vec::new(),
        };
        if !field.is_real() {
            return Err(Unsolved::BrokenModel);
        }
        field.plain_waves = field.plain();
        let profile_ends = field.sample()?;
        field.curves = field.curve_heights();
        field.ends = field.end(profile_ends);
        Ok(field)
    }

    /// Whether every wave's component has its partner at −G.
    fn is_real(&self) -> bool {
        let sum = |n: &[i32; 3]| {
            let parts = self.waves.get(n).into_iter().flatten();
            parts.fold((0.0, 0.0, 0.0), |(a, b, size), (real, imaginary)| {
                let (x, y) = (real.value, imaginary.value);
                (a + x, b + y, size + x.abs() + y.abs())
            })
        };
        self.waves.keys().all(|n| {
            let (here, there) = (sum(n), sum(&n.map(|index| index.saturating_neg())));
            let slack = 1e-12 * (here.2 + there.2);
            (here.0 - there.0).abs() <= slack && (here.1 + there.1).abs() <= slack
        })
    }

    fn plain(&self) -> Vec<(Vector<f64>, (f64, f64))> {
        let waves = self.waves.iter().map(|(n, parts)| {
            let real = parts.iter().map(|(real, _)| real.value).sum();
            let imaginary = parts.iter().map(|(_, imaginary)| imaginary.value).sum();
            (*n, (real, imaginary))
        });
        let mut sorted: Vec<_> = waves.collect();
        sorted.sort_by_key(|(n, _)| *n);
        let wave = |n: [i32; 3]| self.cell.wave(n.map(f64::from));
        sorted
            .into_iter()
            .map(|(n, part)| (wave(n), part))
            .collect()
    }

    /// Samples the profile; gives the largest |G| of its components where they end.
    fn sample(&mut self) -> Result<Option<f64>, Unsolved> {
        let Some(piece) = self.crystal.potential.profile.first() else {
            return Ok(Some(0.0));
        };
        let (cell, energy) = (&self.cell, self.scale.energy);
        let value = |fractions: [f64; 3]| piece.formula.at(&cell.place(fractions)) / energy;
        let points = GRID.get(self.dimension - 2).copied().unwrap_or(1);
        let samples = Samples::new(self.dimension, &value, 1e-11, points).map_err(not_finite)?;
        let largest = samples.largest_index();
        let range = |axis: usize| {
            if axis < self.dimension {
                -largest..=largest
            } else {
                0..=0
            }
        };
        let (mut swing, mut outer) = (0.0_f64, 0.0);
        let mut sizes = Vec::new();
        for x in range(0) {
            for y in range(1) {
                for z in range(2) {
                    let n = [x, y, z];
                    let size = samples.component(n).norm();
                    if n != [0; 3] {
                        swing = swing.max(size);
                    }
                    if n.iter().any(|one| one.abs() > largest / 2) {
                        outer += size;
                    }
                    sizes.push((n, size));
                }
            }
        }
        let ends = samples.settled.then(|| {
            let told = sizes
                .iter()
                .filter(|(_, size)| *size > ROUNDING * swing.max(1e-3));
            told.map(|(n, _)| self.length_of(*n)).fold(0.0, f64::max)
        });
        if !samples.settled {
            self.missed = outer * energy;
        }
        self.samples = Some(samples);
        Ok(ends)
    }

    /// |G| in inverse metre.
    pub fn length_of(&self, n: [i32; 3]) -> f64 {
        let wave = self.cell.wave(n.map(f64::from));
        dot(&wave, &wave).sqrt()
    }

    /// 2π/a, a the length of the first vector of the lattice.
    fn shell_unit<S: Scalar>(&self) -> Option<S> {
        let first = filled_up::<S>(self.crystal.conventional.first()?);
        Some(S::number(2.0 * std::f64::consts::PI).over(&dot(&first, &first).root()))
    }

    fn end(&self, profile: Option<f64>) -> Option<f64> {
        let potential = &self.crystal.potential;
        let mut ends = profile?;
        if !potential.sites.is_empty() {
            return None;
        }
        for n in self.waves.keys() {
            ends = ends.max(self.length_of(*n));
        }
        for formfactor in &potential.formfactors {
            match &formfactor.form {
                FormfactorValues::At { q, .. } => {
                    let unit: f64 = self.shell_unit()?;
                    ends = ends.max((q.value + 2.0 * SAME_SHELL).max(0.0).sqrt() * unit);
                }
                FormfactorValues::Curve(_) => return None,
            }
        }
        Some(ends)
    }

    /// V(G), real and imaginary, in joule; `cell` is this crystal's, with or without derivatives.
    pub fn component<S: Scalar>(&self, cell: &ZoneCell<S>, n: [i32; 3]) -> Part<S> {
        let mut sum = (S::number(0.0), S::number(0.0));
        for (real, imaginary) in self.waves.get(&n).into_iter().flatten() {
            sum.0 = sum.0.plus(&S::lift(real));
            sum.1 = sum.1.plus(&S::lift(imaginary));
        }
        self.add_sites(cell, n, &self.crystal.potential.sites, &mut sum);
        self.add_atoms(cell, n, &mut sum);
        sum
    }

    fn add_sites<'s, S: Scalar>(
        &self,
        cell: &ZoneCell<S>,
        n: [i32; 3],
        sites: impl IntoIterator<Item = &'s Site>,
        sum: &mut Part<S>,
    ) {
        let wave = cell.wave(n.map(f64::from));
        for site in sites {
            if let Some(shape) = transform(&site.shape, &wave, self.dimension) {
                let height = S::lift(&site.energy).times(&shape).over(&cell.volume);
                add_at(&wave, &height, &site.at, sum);
            }
        }
    }

    fn add_atoms<S: Scalar>(&self, cell: &ZoneCell<S>, n: [i32; 3], sum: &mut Part<S>) {
        let potential = &self.crystal.potential;
        if potential.formfactors.is_empty() || potential.atoms.is_empty() {
            return;
        }
        let wave = cell.wave(n.map(f64::from));
        let square = dot(&wave, &wave);
        let share = 1.0 / potential.atoms.len() as f64;
        for formfactor in &potential.formfactors {
            let Some(heights) = self.heights::<S>(formfactor, &square) else {
                continue;
            };
            let second = formfactor.second.as_ref();
            for atom in &potential.atoms {
                if atom.name == formfactor.name {
                    add_at(&wave, &heights.0.scaled(share), &atom.at, sum);
                } else if second.is_some_and(|name| *name == atom.name) {
                    add_at(&wave, &heights.1.scaled(share), &atom.at, sum);
                }
            }
        }
    }

    /// The waves' G in inverse metre and V(G) in joule.
    pub fn wave_parts(&self) -> impl Iterator<Item = (&Vector<f64>, (f64, f64))> {
        self.plain_waves.iter().map(|(wave, part)| (wave, *part))
    }

    /// V(G) of the atoms and of these sites alone, in joule.
    pub fn part_of(&self, sites: &[&Site], n: [i32; 3]) -> Part<f64> {
        let mut sum = (0.0, 0.0);
        self.add_sites(&self.cell, n, sites.iter().copied(), &mut sum);
        self.add_atoms(&self.cell, n, &mut sum);
        sum
    }

    /// What a form factor gives its first and its second atom at |G|²; `None` for zero.
    fn heights<S: Scalar>(&self, formfactor: &Formfactor, square: &S) -> Option<(S, S)> {
        match &formfactor.form {
            FormfactorValues::At { q, energies } => {
                let unit: f64 = self.shell_unit()?;
                if (square.value() / (unit * unit) - q.value).abs() > SAME_SHELL {
                    return None;
                }
                let even = S::lift(energies.first()?);
                let odd = energies.get(1).map_or_else(|| S::number(0.0), S::lift);
                Some((even.plus(&odd), even.minus(&odd)))
            }
            FormfactorValues::Curve(formula) => {
                let zero = S::number(0.0);
                let q = if square.value() > 0.0 {
                    square.root()
                } else {
                    zero.clone()
                };
                let value = formula.evaluate(&[q, zero.clone(), zero]);
                Some((value.clone(), value))
            }
        }
    }

    /// V(G) in the scale's energy, the profile's part included.
    pub fn dimensionless(&self, n: [i32; 3]) -> Complex<f64> {
        let (real, imaginary) = self.component(&self.cell, n);
        let plain = Complex::new(real, imaginary) / self.scale.energy;
        match &self.samples {
            Some(samples) => plain + samples.component(n),
            None => plain,
        }
    }

    fn curve_heights(&self) -> Vec<(f64, f64)> {
        let curves: Vec<_> = self
            .crystal
            .potential
            .formfactors
            .iter()
            .filter(|formfactor| matches!(formfactor.form, FormfactorValues::Curve(_)))
            .collect();
        if curves.is_empty() {
            return Vec::new();
        }
        // Lengths of G up to some hundred thousand waves.
        let step = self.cell.radius_for(1e6) / 1024.0;
        let mut heights: Vec<(f64, f64)> = (0..=1024)
            .map(|index| {
                let g = step * f64::from(index);
                let height = curves
                    .iter()
                    .filter_map(|formfactor| self.heights::<f64>(formfactor, &(g * g)))
                    .map(|(height, _)| height.abs())
                    .filter(|height| height.is_finite())
                    .sum();
                (g, height)
            })
            .collect();
        let mut most = 0.0_f64;
        for (_, height) in heights.iter_mut().rev() {
            most = most.max(*height);
            *height = most;
        }
        heights
    }

    /// How large components of this |G| (inverse metre) may be, in joule; not rising.
    pub fn bound(&self, g: f64) -> f64 {
        let sites: f64 = self
            .crystal
            .potential
            .sites
            .iter()
            .map(|site| site.energy.value.abs() * envelope(&site.shape, g, self.dimension))
            .sum();
        let place = self.curves.partition_point(|(from, _)| *from < g);
        let curves = match (self.curves.get(place), self.curves.last()) {
            (Some((_, height)), _) => *height,
            // Nothing is known there: as a step in the potential's slope falls.
            (None, Some((last, height))) => height * (last / g).powi(2),
            (None, None) => 0.0,
        };
        let kinks = if self.samples.is_some() && self.missed > 0.0 {
            self.missed / (1.0 + g * self.scale.length).powi(2)
        } else {
            0.0
        };
        (sites / self.cell.volume + curves + kinks).max(f64::MIN_POSITIVE)
    }
}

/// Adds height·e^{−iG·R}.
fn add_at<S: Scalar>(wave: &Vector<S>, height: &S, at: &[Dual], sum: &mut Part<S>) {
    let turn = dot(wave, &filled_up(at));
    sum.0 = sum.0.plus(&height.times(&turn.cosine()));
    sum.1 = sum.1.minus(&height.times(&turn.sine()));
}

/// Components of the waves by primitive indices; those that the centring forbids are errors of the model.
fn waves(crystal: &Crystal) -> FxHashMap<[i32; 3], Vec<(Dual, Dual)>> {
    let centring = crystal.centring();
    let mut found: FxHashMap<[i32; 3], Vec<(Dual, Dual)>> = FxHashMap::default();
    let waves = crystal.potential.waves.iter();
    for component in waves.flat_map(crate::model::Wave::components) {
        let Some(primitive) = centring.to_primitive(&component.index) else {
            continue;
        };
        let n = std::array::from_fn(|axis| {
            let index = primitive.get(axis).copied().unwrap_or(0);
            i32::try_from(index).unwrap_or(i32::MAX)
        });
        let parts = (component.real, component.imaginary);
        found.entry(n).or_default().push(parts);
    }
    found
}

fn not_finite(_: Error) -> Unsolved {
    Unsolved::NotConverged("the potential is not finite everywhere".into())
}
