//! Preambles, and the values in sight of a section.

use super::takeover::chain_of;
use super::{Reference, World, check_lets, checks};
use crate::model::evaluate::{Context, Evaluator};
use crate::model::world::lets_of;
use crate::model::{Dimension, Dual, FileId, NameSort, Parameter, Place, Setting, Trouble};
use crate::syntax::{SectionId, SectionKind};
use crate::text::Span;

/// A file's preamble as built.
#[derive(Clone, Debug, Default)]
pub struct BuiltPreamble {
    /// Its named values, in order.
    pub values: Vec<NamedValue>,
    /// Everything they depend on, sorted by identity.
    pub parameters: Vec<Parameter>,
    /// What is wrong in it, its `use` statements included.
    pub troubles: Vec<Trouble>,
    /// The names and files used in it.
    pub references: Vec<Reference>,
}

/// A named value.
#[derive(Clone, Debug, PartialEq)]
pub struct NamedValue {
    /// Its name.
    pub name: String,
    /// In SI units, with derivatives.
    pub value: Dual,
    /// Its dimension.
    pub dimension: Dimension,
    /// Where the name is given.
    pub place: Place,
}

/// Builds a file's preamble: `use`, `let`.
#[must_use]
pub fn build_preamble(world: &World, file: FileId, setting: &Setting) -> BuiltPreamble {
    let found = world.file(file);
    let entry = found.and_then(|file| file.preamble());
    let (Some(found), Some(entry)) = (found, entry) else {
        return BuiltPreamble::default();
    };
    let Some(home) = world.section(file, entry.id) else {
        return BuiltPreamble::default();
    };
    let mut evaluator = Evaluator::new(world, setting, home);
    for trouble in &found.use_troubles {
        evaluator.report(trouble.clone());
    }
    for (place, target) in &found.use_places {
        let definition = target.and_then(|target| start_of(world, target));
        let text = home.text(place.span).trim_matches('"');
        evaluator.refer(*place, text, NameSort::File, definition);
    }
    let context = Context::preamble(home);
    check_lets(&mut evaluator, &context);
    used_names(&mut evaluator, file);
    let values = lets_of(home)
        .filter_map(|one| {
            let (value, dimension) = evaluator.let_value(one, &context)?;
            Some(NamedValue {
                name: one.name.text.clone(),
                value,
                dimension,
                place: one.name_place(),
            })
        })
        .collect();
    BuiltPreamble {
        values,
        parameters: evaluator.sorted_parameters(),
        troubles: evaluator.troubles,
        references: evaluator.references,
    }
}

/// Values of this preamble whose name a used file gives too.
fn used_names(evaluator: &mut Evaluator<'_>, file: FileId) {
    let world = evaluator.world;
    let Some(own) = world.file(file) else { return };
    let names = lets_of(evaluator.home).map(|one| (one.name.text.as_str(), one.name_place()));
    for (name, place) in names.collect::<Vec<_>>() {
        let clash = own
            .uses
            .iter()
            .filter(|id| **id != file)
            .find_map(|id| world.own_preamble_let(*id, name));
        if let Some(clash) = clash {
            let holder = "a value of a file that this one uses";
            checks::taken(evaluator, name, holder, place, Some(clash.name_place()));
        }
    }
}

fn start_of(world: &World, file: FileId) -> Option<Place> {
    let entry = world.file(file)?.preamble()?;
    Some(Place {
        file,
        section: entry.id,
        span: Span::default(),
    })
}

/// The named values in sight of a section (its own, taken over, its file's, those of used files), nearest first;
/// hidden and broken ones left out.
#[must_use]
pub fn values_in_scope(world: &World, file: FileId, section: SectionId) -> Vec<NamedValue> {
    let Some(home) = world.section(file, section) else {
        return Vec::new();
    };
    let setting = Setting::nominal();
    let (chain, _) = match home.section.kind {
        SectionKind::Preamble => (Vec::new(), super::takeover::ChainEnd::Whole),
        _ => chain_of(world, home),
    };
    let mut evaluator = Evaluator::new(world, &setting, home);
    if home.section.kind != SectionKind::Preamble {
        super::scales::local_units(&mut evaluator, &chain);
    }
    let context = Context::of(&chain, home);
    let found = world.lets_in_sight(context.scope);
    found
        .into_iter()
        .filter_map(|one| {
            let (value, dimension) = evaluator.let_value(one, &context)?;
            Some(NamedValue {
                name: one.name.text.clone(),
                value,
                dimension,
                place: one.name_place(),
            })
        })
        .collect()
}
