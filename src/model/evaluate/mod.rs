//! From expressions to values: names, units, dimensions, tolerances.
//!
//! *Invariant*: `None` means that a mistake has been noted (here, or in the
//! build of the section that it is written in) and that the model is broken.

mod expression;
mod name;
mod number;
mod quantity;
mod term;
mod value;

use rustc_hash::{FxHashMap, FxHashSet};

use super::world::Scope;
use super::{
    Dimension, Dual, FileId, NameSort, Parameter, ParameterId, ParameterKind, Place, Reference,
    SectionRef, Setting, Trouble, TroubleKind, World,
};
use crate::syntax::{Expression, SectionId, Word};
use crate::text::Span;

pub(crate) use expression::is_bare;
pub(crate) use quantity::MOST_BANDS;
pub(crate) use term::Term;
pub(crate) use value::{is_relative, past_zero};

/// How deep lets and brackets may nest together.
const DEEPEST: usize = 600;

/// One build's state: what has been found so far.
pub(crate) struct Evaluator<'w> {
    pub(crate) world: &'w World,
    pub(crate) setting: &'w Setting,
    /// The section that is built: mistakes and references elsewhere belong to other builds.
    pub(crate) home: SectionRef<'w>,
    pub(crate) troubles: Vec<Trouble>,
    pub(crate) references: Vec<Reference>,
    pub(crate) parameters: Vec<Parameter>,
    /// Those of them that are tolerances.
    draws: FxHashSet<ParameterId>,
    pub(crate) broken: bool,
    pub(crate) units: LocalUnits,
    pub(crate) measures: Vec<MeasureEntry<'w>>,
    lets: FxHashMap<(FileId, SectionId, u32), Option<(Dual, Dimension)>>,
    open: Vec<(Place, String)>,
    depth: usize,
}

/// The units that a section defines for itself.
#[derive(Clone, Debug, Default)]
pub(crate) struct LocalUnits {
    /// One `Er` in joule.
    pub(crate) recoil: Scale,
    /// One `ML` in metre.
    pub(crate) monolayer: Scale,
}

/// A unit that may be defined.
#[derive(Clone, Debug, Default)]
pub(crate) enum Scale {
    /// Nothing defines it.
    #[default]
    Missing,
    /// Its definition has a mistake.
    Broken,
    /// One of it in SI units.
    Known(Dual),
}

/// A measure, evaluated when first asked for.
pub(crate) struct MeasureEntry<'w> {
    pub(crate) name: &'w Word,
    pub(crate) home: SectionRef<'w>,
    pub(crate) expression: &'w Expression,
    pub(crate) state: MeasureState,
}

/// How far a measure is.
pub(crate) enum MeasureState {
    Waiting,
    Open,
    Done(Option<Typed>),
}

/// Where an expression stands and what it may speak of.
#[derive(Clone, Copy)]
pub(crate) struct Context<'c, 'w> {
    pub(crate) scope: Scope<'c, 'w>,
    /// The section that it is written in.
    pub(crate) spot: SectionRef<'w>,
    /// Whether `Er` and `ML` may be known.
    pub(crate) local_units: bool,
    /// The monolayer of the material that is spoken of, before that of the crystal.
    pub(crate) monolayer: Option<&'c Dual>,
    pub(crate) variables: Variables,
    /// The length of a one-dimensional cell, where `period` is known.
    pub(crate) period: Option<&'c Dual>,
    /// Whether quantities of bands and measures may stand here.
    pub(crate) bands: bool,
}

/// The variables of a formula.
#[derive(Clone, Copy, PartialEq, Eq)]
pub(crate) enum Variables {
    None,
    /// `x`, `y`, `z` as far as the dimension goes.
    Position(usize),
    /// `q` = |G|.
    Magnitude,
}

/// A term with its dimension.
#[derive(Clone, Debug)]
pub(crate) struct Typed {
    pub(crate) term: Term,
    pub(crate) dimension: Dimension,
    /// A literal zero, which takes any dimension.
    pub(crate) zero: bool,
}

impl Typed {
    fn new(term: Term, dimension: Dimension) -> Self {
        Self {
            term,
            dimension,
            zero: false,
        }
    }
}

impl<'c, 'w> Context<'c, 'w> {
    /// For statements of a section, with the `let`s of a chain of sections in sight.
    pub(crate) fn of(chain: &'c [SectionRef<'w>], spot: SectionRef<'w>) -> Self {
        Self {
            scope: Scope {
                chain,
                file: spot.file,
            },
            spot,
            local_units: true,
            monolayer: None,
            variables: Variables::None,
            period: None,
            bands: false,
        }
    }

    /// For the preamble of a file.
    pub(crate) fn preamble(spot: SectionRef<'w>) -> Self {
        Self {
            local_units: false,
            ..Self::of(&[], spot)
        }
    }

    /// With `period` in sight, where the cell has one.
    pub(crate) fn within(self, period: Option<&'c Dual>) -> Self {
        Self { period, ..self }
    }

    pub(crate) fn place(&self, span: Span) -> Place {
        self.spot.place(span)
    }
}

impl<'w> Evaluator<'w> {
    pub(crate) fn new(world: &'w World, setting: &'w Setting, home: SectionRef<'w>) -> Self {
        Self {
            world,
            setting,
            home,
            troubles: Vec::new(),
            references: Vec::new(),
            parameters: Vec::with_capacity(32),
            draws: FxHashSet::default(),
            broken: !home.section.problems.is_empty(),
            units: LocalUnits::default(),
            measures: Vec::new(),
            lets: FxHashMap::default(),
            open: Vec::new(),
            depth: 0,
        }
    }

    /// Notes a mistake.
    pub(crate) fn report(&mut self, trouble: Trouble) {
        self.broken |= trouble.breaks();
        self.troubles.push(trouble);
    }

    /// Notes a mistake and gives nothing.
    pub(crate) fn fail<T>(&mut self, kind: TroubleKind, place: Place) -> Option<T> {
        self.report(Trouble::new(kind, place));
        None
    }

    /// The same for a value that its place does not allow.
    pub(crate) fn bad<T>(&mut self, place: Place, what: impl Into<String>) -> Option<T> {
        self.fail(TroubleKind::BadValue { what: what.into() }, place)
    }

    /// Notes the use of a name, where it is written in the section that is built, or means something defined there.
    pub(crate) fn refer(
        &mut self,
        place: Place,
        name: &str,
        sort: NameSort,
        definition: Option<Place>,
    ) {
        let here = |place: Place| (place.file, place.section) == self.home.key();
        if self.setting.is_nominal() && (here(place) || definition.is_some_and(here)) {
            self.references.push(Reference {
                place,
                name: name.to_owned(),
                sort,
                definition,
            });
        }
    }

    /// Runs a step whose mistakes belong to another build.
    pub(crate) fn elsewhere<T>(&mut self, step: impl FnOnce(&mut Self) -> T) -> T {
        let before = self.troubles.len();
        let result = step(self);
        self.troubles.truncate(before);
        result
    }

    /// The parameters found, each once, sorted by identity.
    pub(crate) fn sorted_parameters(&mut self) -> Vec<Parameter> {
        let mut parameters = std::mem::take(&mut self.parameters);
        parameters.sort_unstable_by_key(|parameter| parameter.id);
        parameters.dedup_by_key(|parameter| parameter.id);
        parameters
    }

    pub(crate) fn note_parameter(&mut self, parameter: Parameter) -> ParameterId {
        let id = parameter.id;
        if parameter.kind == ParameterKind::Draw {
            self.draws.insert(id);
        }
        self.parameters.push(parameter);
        id
    }
}
