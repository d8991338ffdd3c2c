//! Names in expressions: variables, named values, measures, constants, units alone.

use super::{Context, Evaluator, MeasureState, Scope, Term, Typed, Variables};
use crate::model::constants::{CONSTANTS, constant};
use crate::model::dual::ParameterSort;
use crate::model::unit::UNITS;
use crate::model::words::nearest;
use crate::model::world::{LetRef, lets_of};
use crate::model::{
    Dimension, Dual, NameSort, Parameter, ParameterId, ParameterKind, Trouble, TroubleKind,
};
use crate::syntax::SectionKind;
use crate::text::Span;

impl<'w> Evaluator<'w> {
    pub(super) fn name(
        &mut self,
        name: &'w str,
        span: Span,
        context: &Context<'_, 'w>,
    ) -> Option<Typed> {
        if let Some(variable) = variable(name, context.variables) {
            return self.variable(name, variable, span, context);
        }
        if let Some(found) = self.world.find_let(context.scope, name) {
            self.refer(
                context.place(span),
                name,
                NameSort::Value,
                Some(found.name_place()),
            );
            let (value, dimension) = self.let_value(found, context)?;
            return Some(Typed::new(Term::Constant(value), dimension));
        }
        if context.bands {
            if let Some(index) = self.measures.iter().position(|one| one.name.text == name) {
                return self.measure_use(index, span, context);
            }
        }
        if let Some(constant) = constant(name) {
            let value = Term::Constant(Dual::constant(constant.value));
            return Some(Typed::new(value, constant.dimension));
        }
        if let Some(period) = context.period.filter(|_| name == "period") {
            let value = Term::Constant(period.clone());
            return Some(Typed::new(value, Dimension::LENGTH));
        }
        match self.find_unit(name, context) {
            Some(Some((size, dimension))) => Some(Typed::new(Term::Constant(size), dimension)),
            Some(None) => self.no_scale(name, context.place(span), context),
            None => self.unknown_value(name, span, context),
        }
    }

    fn variable(
        &mut self,
        name: &str,
        index: usize,
        span: Span,
        context: &Context<'_, 'w>,
    ) -> Option<Typed> {
        let place = context.place(span);
        if let Some(hidden) = self.world.find_let(context.scope, name) {
            return self.taken_variable(name, place, hidden);
        }
        match context.variables {
            Variables::Position(dimension) if index >= dimension => {
                let kind = TroubleKind::WrongDimension {
                    word: name.to_owned(),
                    needs: format!("a lattice of {} dimensions", index + 1),
                };
                self.fail(kind, place)
            }
            Variables::Magnitude => {
                Some(Typed::new(Term::Variable(index), Dimension::INVERSE_LENGTH))
            }
            _ => Some(Typed::new(Term::Variable(index), Dimension::LENGTH)),
        }
    }

    /// A `let` that a formula cannot see, since its name is the variable's: said at the `let`, where that is part of this build.
    fn taken_variable<T>(
        &mut self,
        name: &str,
        used: crate::model::Place,
        hidden: LetRef<'w>,
    ) -> Option<T> {
        let holder = match name {
            "q" => "the magnitude of a wave vector in a `curve`",
            _ => "the position in a `profile`",
        };
        let kind = TroubleKind::TakenName {
            name: name.to_owned(),
            holder: holder.to_owned(),
        };
        let trouble = if hidden.home.key() == self.home.key() {
            Trouble::new(kind, hidden.name_place()).beside(used, "used as the variable here")
        } else {
            Trouble::new(kind, used).beside(hidden.name_place(), "the value of that name")
        };
        // One is enough, however often the variable stands there.
        if self.troubles.contains(&trouble)
            || self.troubles.iter().any(|one| one.kind == trouble.kind)
        {
            return None;
        }
        self.report(trouble);
        None
    }

    /// The value of a `let`, with a derivative 1 with respect to its name besides the chain from what it is made of.
    pub(crate) fn let_value(
        &mut self,
        found: LetRef<'w>,
        context: &Context<'_, 'w>,
    ) -> Option<(Dual, Dimension)> {
        let place = found.name_place();
        let key = (place.file, place.section, place.span.start);
        if let Some(known) = self.lets.get(&key) {
            return known.clone();
        }
        if let Some(start) = self.open.iter().position(|(open, _)| *open == place) {
            return self.circle(start, found);
        }
        self.open.push((place, found.name.text.clone()));
        let own = found.home.key() == self.home.key()
            || context
                .scope
                .chain
                .iter()
                .any(|section| section.key() == found.home.key());
        let value = if own {
            self.evaluate_let(found, context)
        } else {
            self.elsewhere(|evaluator| evaluator.evaluate_let(found, context))
        };
        self.open.pop();
        self.lets.insert(key, value.clone());
        value
    }

    fn evaluate_let(
        &mut self,
        found: LetRef<'w>,
        user: &Context<'_, 'w>,
    ) -> Option<(Dual, Dimension)> {
        let in_chain = user
            .scope
            .chain
            .iter()
            .any(|section| section.key() == found.home.key());
        let context = if in_chain {
            Context {
                scope: Scope {
                    chain: user.scope.chain,
                    file: found.home.file,
                },
                ..Context::of(user.scope.chain, found.home)
            }
        } else {
            Context::preamble(found.home)
        };
        // Which of two is meant is not known.
        self.broken |= self.is_repeated(found);
        let typed = self.value(found.value, None, &context)?;
        let Some(value) = typed.term.value() else {
            return self.bad(found.value_place(), "a `let` names a value, not a formula");
        };
        let place = found.value_place();
        let id = ParameterId::of(ParameterSort::Name, place);
        let value = match self.setting.replacement(id) {
            Some(replaced) => Dual::constant(replaced),
            None => value.clone(),
        };
        self.note_parameter(Parameter {
            id,
            kind: ParameterKind::Name(found.name.text.clone()),
            place,
            text: found.home.text(found.value.span).to_owned(),
            value: value.value,
            dimension: typed.dimension,
            unit: None,
        });
        Some((value.with_slope(id, 1.0), typed.dimension))
    }

    fn is_repeated(&self, found: LetRef<'w>) -> bool {
        let home = found.home;
        if home.section.kind == SectionKind::Preamble {
            let file = self.world.file(home.file);
            return file.is_some_and(|file| file.repeats(SectionKind::Preamble, &found.name.text));
        }
        lets_of(home)
            .filter(|one| one.name.text == found.name.text)
            .count()
            > 1
    }

    fn circle<T>(&mut self, start: usize, found: LetRef<'w>) -> Option<T> {
        let members = self.open.get(start..).unwrap_or_default();
        let mut circle: Vec<String> = members.iter().map(|(_, name)| name.clone()).collect();
        circle.push(found.name.text.clone());
        let mut trouble = Trouble::new(TroubleKind::CircularName { circle }, found.name_place());
        trouble.related = members
            .iter()
            .skip(1)
            .map(|(place, _)| (*place, "part of the circle".to_owned()))
            .collect();
        self.report(trouble);
        None
    }

    fn measure_use(
        &mut self,
        index: usize,
        span: Span,
        context: &Context<'_, 'w>,
    ) -> Option<Typed> {
        let entry = self.measures.get(index)?;
        let (name, definition) = (entry.name, entry.home.place(entry.name.span));
        self.refer(
            context.place(span),
            &name.text,
            NameSort::Measure,
            Some(definition),
        );
        self.measure(index, context)
    }

    /// A measure's expression, evaluated once.
    pub(crate) fn measure(&mut self, index: usize, context: &Context<'_, 'w>) -> Option<Typed> {
        let entry = self.measures.get_mut(index)?;
        let (name, home, expression) = (entry.name, entry.home, entry.expression);
        match &entry.state {
            MeasureState::Done(done) => return done.clone(),
            MeasureState::Open => {
                let circle = vec![name.text.clone(), name.text.clone()];
                return self.fail(TroubleKind::CircularName { circle }, home.place(name.span));
            }
            MeasureState::Waiting => entry.state = MeasureState::Open,
        }
        let own = Context {
            bands: true,
            ..Context::of(context.scope.chain, home)
        };
        let done = self.expression(expression, &own);
        if let Some(entry) = self.measures.get_mut(index) {
            entry.state = MeasureState::Done(done.clone());
        }
        done
    }

    fn unknown_value<T>(&mut self, name: &str, span: Span, context: &Context<'_, 'w>) -> Option<T> {
        let lets = self.world.lets_in_sight(context.scope);
        let known = lets.iter().map(|found| found.name.text.as_str());
        let measures = self
            .measures
            .iter()
            .map(|measure| measure.name.text.as_str());
        let measures = measures.filter(|_| context.bands);
        let constants = CONSTANTS.iter().map(|constant| constant.name);
        let units = UNITS
            .iter()
            .map(|unit| unit.name)
            .filter(|name| name.len() > 1);
        let nearest = nearest(name, known.chain(measures).chain(constants).chain(units));
        let kind = TroubleKind::UnknownName {
            name: name.to_owned(),
            wanted: "value",
            nearest,
        };
        self.fail(kind, context.place(span))
    }
}

fn variable(name: &str, variables: Variables) -> Option<usize> {
    match variables {
        Variables::None => None,
        Variables::Position(_) => ["x", "y", "z"].iter().position(|axis| *axis == name),
        Variables::Magnitude => (name == "q").then_some(0),
    }
}
