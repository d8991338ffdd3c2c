//! Materials.

use super::takeover::{Statements, Taken, chain_of, check_chain, mark_taken_over};
use super::{Key, Reference, SectionRef, World, check_lets, checks};
use crate::model::dual::ParameterSort;
use crate::model::evaluate::{Context, Evaluator, Scale};
use crate::model::{
    Dimension, Dual, FileId, Parameter, ParameterId, ParameterKind, Place, Setting, Trouble,
    TroubleKind,
};
use crate::syntax::{SectionId, StatementKind, Value};

/// A material as built. What it does not say is `None`.
#[derive(Clone, Debug, Default)]
pub struct BuiltMaterial {
    /// Its heading's name.
    pub place: Place,
    /// Its name.
    pub name: String,
    /// Its title, if it has one.
    pub title: Option<String>,
    /// Its citation, if it has one.
    pub source: Option<String>,
    /// Mass in kg.
    pub mass: Option<MaterialField>,
    /// Potential in joule.
    pub edge: Option<MaterialField>,
    /// One monolayer in metre.
    pub monolayer: Option<MaterialField>,
    /// The gap of an energy-dependent mass, in joule.
    pub nonparabolic: Option<MaterialField>,
    /// The factor on the thickness of its layers.
    pub rate: Option<MaterialField>,
    /// Everything its numbers depend on, sorted by identity.
    pub parameters: Vec<Parameter>,
    /// What is wrong in its own statements.
    pub troubles: Vec<Trouble>,
    /// The names used in its own statements.
    pub references: Vec<Reference>,
    /// Whether it, or what it takes over, has a mistake.
    pub broken: bool,
    pub(super) key: Key,
}

/// One field of a material.
#[derive(Clone, Debug, PartialEq)]
pub struct MaterialField {
    /// Its value in SI units, with a derivative 1 with respect to the field itself.
    pub value: Dual,
    /// Where the value is written.
    pub place: Place,
}

/// Builds the material of a section; empty where there is none.
#[must_use]
pub fn build_material(
    world: &World,
    file: FileId,
    section: SectionId,
    setting: &Setting,
) -> BuiltMaterial {
    let Some(home) = world.section(file, section) else {
        return BuiltMaterial::default();
    };
    let (chain, end) = chain_of(world, home);
    let mut evaluator = Evaluator::new(world, setting, home);
    check_chain(&mut evaluator, &chain, &end);
    checks::heading(&mut evaluator, home);
    let statements = Statements::gather(&mut evaluator, &chain);
    let mut build = MaterialBuild {
        evaluator,
        chain: &chain,
        statements,
    };
    let mut material = build.fields();
    check_lets(&mut build.evaluator, &Context::of(&chain, home));
    material.place = home.name_place();
    home.name().clone_into(&mut material.name);
    material.key = home.key();
    material.parameters = build.evaluator.sorted_parameters();
    material.broken = build.evaluator.broken;
    material.references = build.evaluator.references;
    material.troubles = build.evaluator.troubles;
    if chain.len() > 1 {
        drop_known(world, &chain, setting, &mut material.troubles);
        mark_taken_over(home, &mut material.troubles);
    }
    material
}

/// What is wrong in taken-over statements by themselves is said by their own build.
fn drop_known(
    world: &World,
    chain: &[SectionRef<'_>],
    setting: &Setting,
    troubles: &mut Vec<Trouble>,
) {
    let Some(own) = chain.first() else { return };
    for base in chain.iter().skip(1) {
        let foreign = |trouble: &Trouble| (trouble.place.file, trouble.place.section) == base.key();
        if base.key() != own.key() && troubles.iter().any(foreign) {
            let known = build_material(world, base.file, base.id, setting).troubles;
            troubles.retain(|trouble| !known.contains(trouble));
        }
    }
}

struct MaterialBuild<'c, 'w> {
    evaluator: Evaluator<'w>,
    chain: &'c [SectionRef<'w>],
    statements: Statements<'w>,
}

impl<'w> MaterialBuild<'_, 'w> {
    fn fields(&mut self) -> BuiltMaterial {
        let monolayer = self.field("monolayer", Dimension::LENGTH);
        self.evaluator.units.monolayer = match (&monolayer, self.statements.single("monolayer")) {
            (Some(field), _) => Scale::Known(field.value.clone()),
            (None, Some(_)) => Scale::Broken,
            (None, None) => Scale::Missing,
        };
        BuiltMaterial {
            monolayer,
            mass: self.field("mass", Dimension::MASS),
            edge: self.field("edge", Dimension::ENERGY),
            nonparabolic: self.field("nonparabolic", Dimension::ENERGY),
            rate: self.field("rate", Dimension::NUMBER),
            title: self.words("title"),
            source: self.words("source"),
            ..BuiltMaterial::default()
        }
    }

    fn words(&self, word: &str) -> Option<String> {
        match &self.statements.single(word)?.statement.kind {
            StatementKind::Title(quoted) | StatementKind::Source(quoted) => {
                Some(quoted.text.clone())
            }
            _ => None,
        }
    }

    fn field(&mut self, word: &'static str, dimension: Dimension) -> Option<MaterialField> {
        let taken = self.statements.single(word)?;
        let value = field_value(&taken)?;
        let context = Context::of(self.chain, taken.home);
        let found = match word {
            "edge" => self.evaluator.quantity_of(value, dimension, &context)?,
            "mass" => checks::mass(&mut self.evaluator, value, &context)?,
            _ => {
                let what = match word {
                    "monolayer" => "a monolayer",
                    "rate" => "a rate",
                    _ => "the gap of an energy-dependent mass",
                };
                self.evaluator.positive(value, dimension, what, &context)?
            }
        };
        Some(self.as_field(word, dimension, found, &taken, value))
    }

    fn as_field(
        &mut self,
        word: &str,
        dimension: Dimension,
        found: Dual,
        taken: &Taken<'w>,
        value: &'w Value,
    ) -> MaterialField {
        let place = taken.home.place(value.span);
        let id = ParameterId::of(ParameterSort::Field, place);
        let found = match self.evaluator.setting.replacement(id) {
            Some(replaced) => Dual::constant(replaced),
            None => found,
        };
        self.evaluator.note_parameter(Parameter {
            id,
            kind: ParameterKind::Field(taken.home.name().to_owned(), word.to_owned()),
            place,
            text: taken.home.text(value.span).to_owned(),
            value: found.value,
            dimension,
            unit: None,
        });
        MaterialField {
            value: found.with_slope(id, 1.0),
            place,
        }
    }
}

fn field_value<'w>(taken: &Taken<'w>) -> Option<&'w Value> {
    match &taken.statement.kind {
        StatementKind::Mass(value)
        | StatementKind::Edge(value)
        | StatementKind::Monolayer(value)
        | StatementKind::Nonparabolic(value)
        | StatementKind::Rate(value) => Some(value),
        _ => None,
    }
}

/// A field that a layer needs and the material lacks.
pub(super) fn lacks(name: &str, field: &str) -> TroubleKind {
    TroubleKind::BadValue {
        what: format!("material `{name}` says no `{field}`"),
    }
}
