//! Checks that several builds share: names that are taken, masses.

use super::SectionRef;
use crate::model::evaluate::{Context, Evaluator, past_zero};
use crate::model::words::holder_of;
use crate::model::world::lets_of;
use crate::model::{Dimension, Dual, Place, Trouble, TroubleKind};
use crate::syntax::{SectionKind, Value};

/// The `let`s of the section that is built: names that may not be given or are given twice, and every value once.
pub(super) fn lets<'w>(evaluator: &mut Evaluator<'w>, context: &Context<'_, 'w>) {
    let home = context.spot;
    let mut seen: Vec<(&str, Place)> = Vec::new();
    for found in lets_of(home) {
        let name = found.name.text.as_str();
        let place = found.name_place();
        if let Some(holder) = holder_of(name) {
            taken(evaluator, name, holder, place, None);
        } else if let Some((_, first)) = seen.iter().find(|(known, _)| *known == name) {
            taken(evaluator, name, "another `let`", place, Some(*first));
        }
        seen.push((name, place));
        evaluator.let_value(found, context);
    }
}

/// Notes that a name may not be given; `first` is where it is given already.
pub(super) fn taken(
    evaluator: &mut Evaluator<'_>,
    name: &str,
    holder: &str,
    place: Place,
    first: Option<Place>,
) {
    let kind = TroubleKind::TakenName {
        name: name.to_owned(),
        holder: holder.to_owned(),
    };
    let mut trouble = Trouble::new(kind, place);
    if let Some(first) = first {
        trouble = trouble.beside(first, "given here already");
    }
    evaluator.report(trouble);
}

/// A section whose name another of its file has, or for materials one of a file that it uses.
pub(super) fn heading<'w>(evaluator: &mut Evaluator<'w>, home: SectionRef<'w>) {
    let Some(name) = &home.section.name else {
        evaluator.broken = true;
        return;
    };
    let world = evaluator.world;
    let material = home.section.kind == SectionKind::Material;
    let first = if material {
        world.material(home.file, &name.text)
    } else {
        world.crystal(home.file, &name.text)
    };
    if let Some(first) = first.filter(|first| first.key() != home.key()) {
        let holder = if material {
            "another material"
        } else {
            "another crystal"
        };
        taken(
            evaluator,
            &name.text,
            holder,
            home.name_place(),
            Some(first.name_place()),
        );
        return;
    }
    if !material {
        return;
    }
    let used = world
        .file(home.file)
        .map_or(&[][..], |file| file.uses.as_slice());
    let clash = used
        .iter()
        .filter(|id| **id != home.file)
        .find_map(|id| world.own_material(*id, &name.text));
    if let Some(clash) = clash {
        let holder = "a material of a file that this one uses";
        taken(
            evaluator,
            &name.text,
            holder,
            home.name_place(),
            Some(clash.name_place()),
        );
    }
}

/// A mass, which must be positive.
pub(super) fn mass<'w>(
    evaluator: &mut Evaluator<'w>,
    value: &'w Value,
    context: &Context<'_, 'w>,
) -> Option<Dual> {
    let mass = evaluator.quantity_of(value, Dimension::MASS, context)?;
    if mass.value <= 0.0 || mass.value.is_nan() {
        let kind = TroubleKind::OddMass { mass: mass.value };
        return evaluator.fail(kind, context.place(value.span));
    }
    if !evaluator.stays_positive(&mass) {
        let text = context.spot.text(value.span);
        return evaluator.bad(context.place(value.span), past_zero("a mass", text));
    }
    Some(mass)
}
