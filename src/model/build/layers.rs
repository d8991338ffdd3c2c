//! Layers, stacks and the period they make.

use std::rc::Rc;

use super::crystal::CrystalBuild;
use super::material::{BuiltMaterial, build_material, lacks};
use super::takeover::Taken;
use crate::model::evaluate::Context;
use crate::model::words::nearest;
use crate::model::{Dimension, Dual, Layer, MassLaw, NameSort, Scalar, Trouble, TroubleKind};
use crate::syntax::{
    Expression, ExpressionKind, Integer, LayerContent, LayerPart, SectionKind, StatementKind,
    Value, Word,
};

/// A cell of more layers than this is a slip of the keyboard.
const MOST_LAYERS: usize = 20_000;
/// Layers and lattice agree within this share of the period.
pub(super) const SAME_LENGTH: f64 = 1e-9;

impl<'w> CrystalBuild<'_, 'w> {
    /// Two kinds of description of the whole cell exclude each other.
    pub(super) fn cell_descriptions(&mut self) {
        let first_of = |list: &[Taken<'w>]| list.first().copied();
        let mut kinds: Vec<(&'static str, Taken<'w>)> = Vec::new();
        kinds.extend(first_of(&self.statements.layers).map(|taken| ("layers", taken)));
        kinds.extend(first_of(&self.statements.profiles).map(|taken| ("a profile", taken)));
        kinds.extend(
            self.statements
                .single("table")
                .map(|taken| ("a table", taken)),
        );
        let order = |taken: &Taken<'w>| {
            let own = taken.home.key() == self.evaluator.home.key();
            (own, taken.statement.span.start)
        };
        kinds.sort_by_key(|(_, taken)| order(taken));
        let mut kinds = kinds.into_iter();
        let Some((first, start)) = kinds.next() else {
            return;
        };
        for (second, taken) in kinds {
            let kind = TroubleKind::TwoDescriptions { first, second };
            let trouble = Trouble::new(kind, taken.home.place(taken.statement.span));
            let start = start.home.place(start.statement.span);
            self.evaluator
                .report(trouble.beside(start, "the first description of the cell"));
        }
    }

    /// Reads all layers; afterwards the list is complete or the crystal broken.
    pub(super) fn layers(&mut self) {
        for taken in self.statements.layers.clone() {
            if !self.allowed(taken, &[1], "a lattice of one dimension") {
                continue;
            }
            match &taken.statement.kind {
                StatementKind::Layer(part) => {
                    let layer = self.layer(taken, part);
                    self.layers_complete &= layer.is_some();
                    self.crystal.potential.layers.extend(layer);
                }
                StatementKind::Stack { times, parts } => self.stack(taken, *times, parts),
                _ => {}
            }
        }
    }

    fn stack(&mut self, taken: Taken<'w>, times: Integer, parts: &'w [LayerPart]) {
        let layers: Vec<Layer> = parts
            .iter()
            .filter_map(|part| self.layer(taken, part))
            .collect();
        self.layers_complete &= layers.len() == parts.len();
        let place = taken.home.place(times.span);
        let repeats = match usize::try_from(times.value) {
            Ok(repeats) if repeats > 0 => repeats,
            _ => {
                let what = format!("a stack stands at least once, not {} times", times.value);
                self.evaluator.bad::<()>(place, what);
                return;
            }
        };
        let known = self.crystal.potential.layers.len();
        let total = repeats.saturating_mul(parts.len()).saturating_add(known);
        if total > MOST_LAYERS {
            let what =
                format!("the cell would have {total} layers, and {MOST_LAYERS} is the limit");
            self.evaluator.bad::<()>(place, what);
            return;
        }
        for _ in 0..repeats {
            self.crystal.potential.layers.extend(layers.iter().cloned());
        }
    }

    fn layer(&mut self, taken: Taken<'w>, part: &'w LayerPart) -> Option<Layer> {
        let context = self.context(taken);
        match &part.content {
            LayerContent::Of { from, to } => self.layer_of(part, from, to.as_ref(), &context),
            LayerContent::At { from, to, mass } => {
                self.layer_at(part, from, to.as_ref(), mass.as_ref(), &context)
            }
        }
    }

    fn layer_at(
        &mut self,
        part: &'w LayerPart,
        from: &'w Value,
        to: Option<&'w Value>,
        mass: Option<&'w Value>,
        context: &Context<'_, 'w>,
    ) -> Option<Layer> {
        let length =
            self.evaluator
                .positive(&part.length, Dimension::LENGTH, "a thickness", context);
        let left = self.evaluator.quantity_of(from, Dimension::ENERGY, context);
        let right = match to {
            Some(to) => self.evaluator.quantity_of(to, Dimension::ENERGY, context),
            None => left.clone(),
        };
        let (mass, origin) = match mass {
            Some(value) => {
                let said = super::checks::mass(&mut self.evaluator, value, context);
                (said, "said here".to_owned())
            }
            None => (Some(self.crystal.mass.clone()), self.own_mass_origin()),
        };
        let law = MassLaw {
            mass: mass?,
            nonparabolic: None,
        };
        Some(Layer {
            place: context.place(part.span),
            length_place: context.place(part.length.span),
            length: length?,
            edge: [left?, right?],
            mass: [law.clone(), law],
            materials: None,
            monolayer: self.crystal.monolayer.clone(),
            mass_origin: origin,
            in_monolayers: uses_monolayers(&part.length.expression),
        })
    }

    fn own_mass_origin(&self) -> String {
        match self.crystal.mass_place {
            Some(_) => "the crystal's".to_owned(),
            None => "the default".to_owned(),
        }
    }

    fn layer_of(
        &mut self,
        part: &'w LayerPart,
        from: &'w Word,
        to: Option<&'w Word>,
        context: &Context<'_, 'w>,
    ) -> Option<Layer> {
        let left = self.material(from, context);
        let right = match to {
            Some(to) => self.material(to, context),
            None => left.clone(),
        };
        // A graded stretch counts in monolayers of the material it starts with.
        let monolayer = [&left, &right]
            .into_iter()
            .flatten()
            .find_map(|material| material.monolayer.as_ref())
            .map(|field| field.value.clone());
        let inner = Context {
            monolayer: monolayer.as_ref(),
            ..*context
        };
        let length =
            self.evaluator
                .positive(&part.length, Dimension::LENGTH, "a thickness", &inner);
        let (left, right) = (left?, right?);
        let left_edge = self.edge_of(&left, from, context);
        let right_edge = match to {
            Some(to) => self.edge_of(&right, to, context),
            None => left_edge.clone(),
        };
        let (left_edge, right_edge) = (left_edge?, right_edge?);
        let masses = [
            self.mass_law(&left, &left_edge),
            self.mass_law(&right, &right_edge),
        ];
        let edge = [left_edge, right_edge];
        let monolayer = monolayer.or_else(|| self.crystal.monolayer.clone());
        Some(Layer {
            place: context.place(part.span),
            length_place: context.place(part.length.span),
            length: grown(length?, &left, &right),
            edge,
            mass: masses,
            mass_origin: self.mass_origin(&left, &right),
            materials: Some([left.name.clone(), right.name.clone()]),
            monolayer,
            in_monolayers: uses_monolayers(&part.length.expression),
        })
    }

    /// The material of a name, built once a crystal.
    fn material(&mut self, word: &'w Word, context: &Context<'_, 'w>) -> Option<Rc<BuiltMaterial>> {
        let world = self.evaluator.world;
        let place = context.place(word.span);
        let found = world.material(context.spot.file, &word.text);
        let definition = found.map(|found| found.name_place());
        self.evaluator
            .refer(place, &word.text, NameSort::Material, definition);
        let Some(found) = found else {
            let names = world.section_names(context.spot.file, SectionKind::Material);
            let kind = TroubleKind::UnknownName {
                name: word.text.clone(),
                wanted: "material",
                nearest: nearest(&word.text, names),
            };
            return self.evaluator.fail(kind, place);
        };
        if let Some(known) = self.materials.get(&found.key()) {
            return Some(Rc::clone(known));
        }
        let mut built = build_material(world, found.file, found.id, self.evaluator.setting);
        let file = world.file(found.file);
        let ambiguous = file.is_some_and(|file| file.repeats(SectionKind::Material, &word.text));
        self.evaluator.broken |= built.broken || ambiguous;
        for parameter in built.parameters.drain(..) {
            self.evaluator.note_parameter(parameter);
        }
        let built = Rc::new(built);
        self.materials.insert(found.key(), Rc::clone(&built));
        Some(built)
    }

    fn edge_of(
        &mut self,
        material: &BuiltMaterial,
        word: &'w Word,
        context: &Context<'_, 'w>,
    ) -> Option<Dual> {
        if let Some(edge) = &material.edge {
            return Some(edge.value.clone());
        }
        // A broken edge is the material's own affair.
        if !material.broken {
            let kind = lacks(&material.name, "edge");
            // Once is enough, however many layers there are of it.
            if !self.evaluator.troubles.iter().any(|one| one.kind == kind) {
                let trouble = Trouble::new(kind, context.place(word.span));
                self.evaluator
                    .report(trouble.beside(material.place, "the material"));
            }
        }
        None
    }

    fn mass_law(&self, material: &BuiltMaterial, edge: &Dual) -> MassLaw {
        let stated = material.mass.as_ref().map(|field| field.value.clone());
        let gap = material
            .nonparabolic
            .as_ref()
            .map(|field| field.value.clone());
        MassLaw {
            mass: stated.unwrap_or_else(|| self.crystal.mass.clone()),
            nonparabolic: gap.map(|gap| (edge.clone(), gap)),
        }
    }

    fn mass_origin(&self, left: &BuiltMaterial, right: &BuiltMaterial) -> String {
        match (&left.mass, &right.mass) {
            (Some(_), _) if left.key == right.key => format!("of material {}", left.name),
            (Some(_), Some(_)) => format!("of materials {} to {}", left.name, right.name),
            (Some(_), None) => format!("of material {} to {}", left.name, self.own_mass_origin()),
            (None, Some(_)) => format!(
                "{} to that of material {}",
                self.own_mass_origin(),
                right.name
            ),
            (None, None) => self.own_mass_origin(),
        }
    }

    /// The period: what the layers add up to, else the lattice's.
    pub(super) fn period(&mut self) {
        let layers = &self.crystal.potential.layers;
        if layers.is_empty() {
            self.check_lattice_stated();
            return;
        }
        if self.crystal.dimension != 1 || !self.layers_complete {
            return;
        }
        let sum = Dual::sum(layers.iter().map(|layer| &layer.length));
        let stated = self.crystal.vectors.first().and_then(|row| row.first());
        let period = stated.map(|stated| stated.value);
        if let Some(period) = period.filter(|_| self.evaluator.setting.is_nominal()) {
            self.compare_period(sum.value, period);
        }
        self.crystal.vectors = vec![vec![sum.clone()]];
        self.crystal.conventional = vec![vec![sum]];
    }

    fn compare_period(&mut self, sum: f64, period: f64) {
        if (sum - period).abs() <= SAME_LENGTH * period {
            return;
        }
        let Some(lattice) = self.statements.single("lattice") else {
            return;
        };
        let Some(last) = self.statements.layers.last() else {
            return;
        };
        let kind = TroubleKind::OpenCell {
            sum,
            period,
            parts: "layers",
        };
        let lattice_place = lattice.home.place(lattice.statement.span);
        let last_place = last.home.place(last.statement.span);
        // Of the two, the one that this crystal itself says.
        let trouble = if lattice.home.key() == self.evaluator.home.key() {
            Trouble::new(kind, lattice_place).beside(last_place, "the last layer")
        } else {
            Trouble::new(kind, last_place).beside(lattice_place, "the lattice")
        };
        self.evaluator.report(trouble);
    }

    fn check_lattice_stated(&mut self) {
        let stated = self.statements.single("lattice").is_some();
        let layered = !self.statements.layers.is_empty();
        // An unreadable line may be the lattice: one finding is enough.
        let unreadable = self
            .chain
            .iter()
            .any(|section| !section.section.problems.is_empty());
        if stated || layered || unreadable {
            return;
        }
        let place = self.evaluator.home.name_place();
        self.evaluator
            .report(Trouble::new(TroubleKind::MissingLattice, place));
    }
}

/// The thickness with the growth rate; a graded stretch grows at the mean of both rates.
fn grown(length: Dual, left: &BuiltMaterial, right: &BuiltMaterial) -> Dual {
    if left.key == right.key {
        return match &left.rate {
            Some(rate) => length.times(&rate.value),
            None => length,
        };
    }
    if left.rate.is_none() && right.rate.is_none() {
        return length;
    }
    let one = |material: &BuiltMaterial| match &material.rate {
        Some(rate) => rate.value.clone(),
        None => Dual::constant(1.0),
    };
    length.times(&one(left).plus(&one(right)).scaled(0.5))
}

fn uses_monolayers(expression: &Expression) -> bool {
    match &expression.kind {
        ExpressionKind::Number { unit, .. } => {
            unit.as_ref().is_some_and(|unit| unit.name.text == "ML")
        }
        ExpressionKind::Name(name) => name == "ML",
        ExpressionKind::Negative(inner) => uses_monolayers(inner),
        ExpressionKind::Binary { left, right, .. } => {
            uses_monolayers(left) || uses_monolayers(right)
        }
        ExpressionKind::Call { arguments, .. } => arguments.iter().any(uses_monolayers),
        ExpressionKind::Quantity(_) => false,
    }
}
