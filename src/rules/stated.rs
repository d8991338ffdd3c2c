//! The quantities that a section states, each with the number in the text that it comes from.

use rustc_hash::FxHashSet;

use super::Subject;
use super::plausible::{Kind, Setting, THINNEST};
use crate::model::{
    Crystal, Dimension, Dual, FormfactorValues, Formula, Parameter, ParameterKind, Place,
    SiteShape, TargetFormula, Wish, build_material,
};
use crate::syntax::SectionKind;

/// A stated quantity.
#[derive(Clone, Debug)]
pub struct Stated {
    /// What it is.
    pub kind: Kind,
    /// Its value in SI.
    pub value: f64,
    /// Where to speak of it: the number, if it stands in this section, else the statement.
    pub place: Place,
    /// The number that it is proportional to, where there is one with a unit.
    pub number: Option<Parameter>,
}

/// The quantities stated in a section.
#[must_use]
pub fn quantities(subject: &Subject<'_>) -> Vec<Stated> {
    match subject.entry.section.kind {
        SectionKind::Preamble => Vec::new(),
        SectionKind::Material => of_material(subject),
        SectionKind::Crystal => subject
            .crystal
            .map(|crystal| of_crystal(subject, crystal))
            .unwrap_or_default(),
    }
}

/// Who moves in a crystal, and how far.
#[must_use]
pub fn setting(crystal: &Crystal) -> Setting {
    let layers = &crystal.potential.layers;
    let masses = layers
        .iter()
        .flat_map(|layer| &layer.mass)
        .map(|law| law.mass.value);
    let lightest = masses.fold(f64::INFINITY, f64::min);
    let vector = crystal.conventional.first();
    let period = vector.map(|vector| {
        vector
            .iter()
            .map(|along| along.value.powi(2))
            .sum::<f64>()
            .sqrt()
    });
    Setting {
        mass: if lightest.is_finite() {
            lightest
        } else {
            crystal.mass.value
        },
        period: period.filter(|period| period.is_finite() && *period > 0.0),
        atoms: !crystal.potential.formfactors.is_empty(),
        recoil: crystal.recoil.is_some(),
        staircase: is_staircase(crystal),
    }
}

/// The number with a unit that an energy of a crystal is proportional to.
#[must_use]
pub fn number_behind<'c>(crystal: &'c Crystal, energy: &Dual) -> Option<&'c Parameter> {
    number_of(&crystal.parameters, energy, Dimension::ENERGY)
}

/// So many thin layers are no slip, but the steps of a smooth potential.
const STEPS: usize = 4;

fn is_staircase(crystal: &Crystal) -> bool {
    let layers = crystal.potential.layers.iter();
    let mut thin: Vec<Place> = layers
        .filter(|layer| layer.length.value < THINNEST)
        .map(|layer| layer.length_place)
        .collect();
    thin.sort_unstable();
    thin.dedup();
    thin.len() >= STEPS
}

/// Collects quantities against the parameters that they depend on.
struct Collector<'s, 'a> {
    subject: &'s Subject<'a>,
    parameters: &'s [Parameter],
    found: Vec<Stated>,
    /// What is in `found`: a crystal may have twenty thousand layers.
    known: FxHashSet<(Place, Kind)>,
}

impl Collector<'_, '_> {
    fn add(&mut self, kind: Kind, dual: &Dual, statement: Place) {
        let number = number_of(self.parameters, dual, dimension_of(kind)).cloned();
        let own = number
            .as_ref()
            .map(|number| number.place)
            .filter(|place| self.subject.holds(*place));
        let Some(place) = own.or(self.subject.holds(statement).then_some(statement)) else {
            return;
        };
        if self.known.insert((place, kind)) {
            self.found.push(Stated {
                kind,
                value: dual.value,
                place,
                number,
            });
        }
    }
}

/// The number with a unit that a quantity is proportional to; `parameters` are sorted.
fn number_of<'p>(
    parameters: &'p [Parameter],
    dual: &Dual,
    dimension: Dimension,
) -> Option<&'p Parameter> {
    dual.slopes.iter().find_map(|(id, slope)| {
        let index = parameters.binary_search_by_key(id, |parameter| parameter.id);
        let found = index.ok().and_then(|index| parameters.get(index))?;
        let proportional = (slope * found.value - dual.value).abs() <= 1e-9 * dual.value.abs();
        let literal = found.kind == ParameterKind::Literal && found.dimension == dimension;
        (literal && proportional).then_some(found)
    })
}

fn dimension_of(kind: Kind) -> Dimension {
    match kind {
        Kind::Mass => Dimension::MASS,
        Kind::Thickness | Kind::LatticeLength | Kind::Recoil | Kind::Monolayer | Kind::SiteSize => {
            Dimension::LENGTH
        }
        Kind::Temperature => Dimension::TEMPERATURE,
        Kind::Energy | Kind::TargetEnergy | Kind::NonparabolicGap => Dimension::ENERGY,
        Kind::Rate => Dimension::NUMBER,
    }
}

fn of_material(subject: &Subject<'_>) -> Vec<Stated> {
    let nominal = crate::model::Setting::nominal();
    let material = build_material(subject.world, subject.file, subject.entry.id, &nominal);
    let mut collector = Collector {
        subject,
        parameters: &material.parameters,
        found: Vec::new(),
        known: FxHashSet::default(),
    };
    let fields = [
        (Kind::Mass, &material.mass),
        (Kind::Energy, &material.edge),
        (Kind::Monolayer, &material.monolayer),
        (Kind::NonparabolicGap, &material.nonparabolic),
        (Kind::Rate, &material.rate),
    ];
    for (kind, field) in fields {
        if let Some(field) = field {
            collector.add(kind, &field.value, field.place);
        }
    }
    collector.found
}

fn of_crystal(subject: &Subject<'_>, crystal: &Crystal) -> Vec<Stated> {
    let mut collector = Collector {
        subject,
        parameters: &crystal.parameters,
        found: Vec::new(),
        known: FxHashSet::default(),
    };
    scales(&mut collector, crystal);
    cell(&mut collector, crystal);
    potential(&mut collector, crystal);
    targets(&mut collector, crystal);
    collector.found
}

fn scales(collector: &mut Collector<'_, '_>, crystal: &Crystal) {
    let heading = collector.subject.heading();
    if let Some(place) = crystal.mass_place {
        collector.add(Kind::Mass, &crystal.mass, place);
    }
    if let Some(recoil) = &crystal.recoil {
        collector.add(Kind::Recoil, &recoil.wavelength, recoil.place);
    }
    if let Some(monolayer) = &crystal.monolayer {
        collector.add(Kind::Monolayer, monolayer, heading);
    }
    if let Some(temperature) = &crystal.temperature {
        collector.add(Kind::Temperature, temperature, heading);
    }
}

fn cell(collector: &mut Collector<'_, '_>, crystal: &Crystal) {
    let heading = collector.subject.heading();
    for vector in &crystal.conventional {
        collector.add(Kind::LatticeLength, &norm(vector), heading);
    }
    for layer in &crystal.potential.layers {
        collector.add(Kind::Thickness, &layer.length, layer.length_place);
        if layer.materials.is_none() {
            for edge in &layer.edge {
                collector.add(Kind::Energy, edge, layer.place);
            }
            if layer.mass_origin == "said here" {
                collector.add(Kind::Mass, &layer.mass[0].mass, layer.place);
            }
        }
    }
}

/// The length of a vector, with its derivatives.
fn norm(vector: &[Dual]) -> Dual {
    let length = vector
        .iter()
        .map(|along| along.value.powi(2))
        .sum::<f64>()
        .sqrt();
    let mut norm = Dual::constant(length);
    for along in vector {
        for (id, slope) in &along.slopes {
            norm = norm.with_slope(*id, slope * along.value / length);
        }
    }
    norm
}

fn potential(collector: &mut Collector<'_, '_>, crystal: &Crystal) {
    let potential = &crystal.potential;
    for wave in &potential.waves {
        collector.add(Kind::Energy, &wave.energy, wave.place);
    }
    for site in &potential.sites {
        collector.add(Kind::Energy, &site.energy, site.place);
        for size in sizes(&site.shape) {
            collector.add(Kind::SiteSize, size, site.place);
        }
    }
    for formfactor in &potential.formfactors {
        if let FormfactorValues::At { energies, .. } = &formfactor.form {
            for energy in energies {
                collector.add(Kind::Energy, energy, formfactor.place);
            }
        }
    }
    for piece in &potential.profile {
        let mut energies = Vec::new();
        constants(&piece.formula, &mut energies);
        for energy in energies {
            if number_of(collector.parameters, energy, Dimension::ENERGY).is_some() {
                collector.add(Kind::Energy, energy, piece.formula_place);
            }
        }
    }
}

fn sizes(shape: &SiteShape) -> Vec<&Dual> {
    match shape {
        SiteShape::Gaussian(size)
        | SiteShape::Sech2(size)
        | SiteShape::Lorentzian(size)
        | SiteShape::Disk(size)
        | SiteShape::Sphere(size) => vec![size],
        SiteShape::Box(sizes) => sizes.iter().collect(),
    }
}

fn constants<'f>(formula: &'f Formula, found: &mut Vec<&'f Dual>) {
    match formula {
        Formula::Constant(dual) => found.push(dual),
        Formula::Variable(_) => {}
        Formula::Negative(inner) => constants(inner, found),
        Formula::Binary(_, left, right) => {
            constants(left, found);
            constants(right, found);
        }
        Formula::Call(_, arguments) => arguments.iter().for_each(|part| constants(part, found)),
    }
}

fn targets(collector: &mut Collector<'_, '_>, crystal: &Crystal) {
    for target in &crystal.targets {
        let Wish::Compare {
            limits, dimension, ..
        } = &target.wish
        else {
            continue;
        };
        if *dimension != Dimension::ENERGY {
            continue;
        }
        let both = [&limits.lower, &limits.upper];
        for (limit, _) in both.into_iter().flatten() {
            if let TargetFormula::Constant(dual) = limit {
                collector.add(Kind::TargetEnergy, dual, target.place);
            }
        }
    }
}
