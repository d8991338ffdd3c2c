//! Measures and requirements.

use super::checks;
use super::crystal::CrystalBuild;
use super::takeover::Taken;
use crate::model::evaluate::{Context, MeasureEntry, MeasureState, is_relative};
use crate::model::formula::binary;
use crate::model::functions::apply;
use crate::model::words::{holder_of, nearest};
use crate::model::{
    ClassWish, CrystalRef, Dimension, GapWish, Limits, Measure, Place, QuantityKind, Target,
    TargetFormula, TroubleKind, Wish,
};
use crate::syntax::{
    BandQuantity, BandQuantityKind, Expression, Operator, Relation, Requirement, StatementKind,
    Value, Word,
};

const CLASSES: [(&str, ClassWish); 4] = [
    ("metal", ClassWish::Metal),
    ("semimetal", ClassWish::Semimetal),
    ("semiconductor", ClassWish::Semiconductor),
    ("insulator", ClassWish::Insulator),
];

const GAP_KINDS: [(&str, GapWish); 3] = [
    ("direct", GapWish::Direct),
    ("indirect", GapWish::Indirect),
    ("closed", GapWish::Closed),
];

impl<'w> CrystalBuild<'_, 'w> {
    /// Reads all measures, then all requirements.
    pub(super) fn targets(&mut self) {
        self.list_measures();
        for (index, taken) in self.statements.measures.clone().into_iter().enumerate() {
            let context = self.context(taken);
            let (StatementKind::Measure { name, .. }, Some(typed)) = (
                &taken.statement.kind,
                self.evaluator.measure(index, &context),
            ) else {
                continue;
            };
            let dimension = typed.dimension;
            if let Some(expression) = typed.term.into_target() {
                self.crystal.measures.push(Measure {
                    place: taken.home.place(taken.statement.span),
                    name: name.text.clone(),
                    expression,
                    dimension,
                });
            }
        }
        for taken in self.statements.requirements.clone() {
            let target = self.requirement(taken);
            self.crystal.targets.extend(target);
        }
    }

    fn list_measures(&mut self) {
        let mut seen: Vec<(&'w str, Place)> = Vec::new();
        for taken in self.statements.measures.clone() {
            let StatementKind::Measure { name, expression } = &taken.statement.kind else {
                continue;
            };
            let place = taken.home.place(name.span);
            if taken.home.key() == self.evaluator.home.key() {
                self.check_measure_name(name, place, &seen, taken);
            }
            seen.push((&name.text, place));
            self.evaluator.measures.push(MeasureEntry {
                name,
                home: taken.home,
                expression,
                state: MeasureState::Waiting,
            });
        }
    }

    fn check_measure_name(
        &mut self,
        name: &'w Word,
        place: Place,
        seen: &[(&'w str, Place)],
        taken: Taken<'w>,
    ) {
        let text = name.text.as_str();
        if let Some(holder) = holder_of(text) {
            checks::taken(&mut self.evaluator, text, holder, place, None);
        } else if let Some((_, first)) = seen.iter().find(|(known, _)| *known == text) {
            checks::taken(
                &mut self.evaluator,
                text,
                "another `measure`",
                place,
                Some(*first),
            );
        } else {
            let context = self.context(taken);
            let value = self.evaluator.world.find_let(context.scope, text);
            if let Some(found) = value {
                let first = Some(found.name_place());
                checks::taken(&mut self.evaluator, text, "a `let`", place, first);
            }
        }
    }

    fn requirement(&mut self, taken: Taken<'w>) -> Option<Target> {
        let StatementKind::Require(requirement) = &taken.statement.kind else {
            return None;
        };
        let context = Context {
            bands: true,
            ..self.context(taken)
        };
        let wish = match requirement {
            Requirement::Compare {
                expression,
                relation,
            } => self.comparison(expression, relation, &context),
            Requirement::Class(word) => self.class(word, &context),
            Requirement::GapIs { quantity, kind } => self.gap_is(quantity, kind, &context),
        };
        let words: Vec<&str> = taken
            .home
            .text(taken.statement.span)
            .split_whitespace()
            .skip(1)
            .collect();
        Some(Target {
            place: taken.home.place(taken.statement.span),
            text: words.join(" "),
            wish: wish?,
        })
    }

    fn class(&mut self, word: &'w Word, context: &Context<'_, 'w>) -> Option<Wish> {
        let wish = self.choice(word, &CLASSES, "class", context)?;
        if self.crystal.bosons {
            return self
                .evaluator
                .bad(context.place(word.span), "bosons have no class");
        }
        Some(Wish::Class(wish))
    }

    fn choice<C: Copy>(
        &mut self,
        word: &'w Word,
        choices: &[(&'static str, C)],
        wanted: &'static str,
        context: &Context<'_, 'w>,
    ) -> Option<C> {
        let found = choices.iter().find(|(name, _)| *name == word.text);
        if let Some((_, choice)) = found {
            return Some(*choice);
        }
        let kind = TroubleKind::UnknownName {
            name: word.text.clone(),
            wanted,
            nearest: nearest(&word.text, choices.iter().map(|(name, _)| *name)),
        };
        self.evaluator.fail(kind, context.place(word.span))
    }

    fn gap_is(
        &mut self,
        quantity: &'w BandQuantity,
        kind: &'w Word,
        context: &Context<'_, 'w>,
    ) -> Option<Wish> {
        let wish = self.choice(kind, &GAP_KINDS, "kind of gap", context);
        let section = self.evaluator.crystal_meant(quantity.of.as_ref(), context);
        let BandQuantityKind::Gap(band) = &quantity.kind else {
            let what = "only a gap is direct, indirect or closed";
            return self.evaluator.bad(context.place(quantity.span), what);
        };
        let band = self.evaluator.band(*band, context)?;
        let section = section?;
        Some(Wish::GapIs {
            of: CrystalRef {
                file: section.file,
                section: section.id,
            },
            band,
            kind: wish?,
        })
    }

    fn comparison(
        &mut self,
        expression: &'w Expression,
        relation: &'w Relation,
        context: &Context<'_, 'w>,
    ) -> Option<Wish> {
        let left = self.evaluator.expression(expression, context);
        let wanted = left
            .as_ref()
            .filter(|left| !left.zero)
            .map(|left| left.dimension);
        let limits = self.limits(relation, wanted, context);
        let left = left?;
        Some(Wish::Compare {
            dimension: left.dimension,
            expression: left.term.into_target()?,
            limits: limits?,
        })
    }

    fn limits(
        &mut self,
        relation: &'w Relation,
        wanted: Option<Dimension>,
        context: &Context<'_, 'w>,
    ) -> Option<Limits> {
        let mut limit = |value: &'w Value| -> Option<TargetFormula> {
            self.evaluator
                .value(value, wanted, context)?
                .term
                .into_target()
        };
        Some(match relation {
            Relation::AtLeast(value) => lower(limit(value)?, true),
            Relation::Above(value) => lower(limit(value)?, false),
            Relation::AtMost(value) => upper(limit(value)?, true),
            Relation::Below(value) => upper(limit(value)?, false),
            Relation::Between(low, high) => {
                let (low, high) = (limit(low), limit(high));
                self.between(low?, high?, relation, context)?
            }
            Relation::Near { value, within } => self.near(value, within, wanted, context)?,
        })
    }

    fn between(
        &mut self,
        low: TargetFormula,
        high: TargetFormula,
        relation: &'w Relation,
        context: &Context<'_, 'w>,
    ) -> Option<Limits> {
        if let (
            TargetFormula::Constant(a),
            TargetFormula::Constant(b),
            Relation::Between(from, to),
        ) = (&low, &high, relation)
        {
            if a.value > b.value {
                let place = context.place(from.span.cover(to.span));
                return self
                    .evaluator
                    .bad(place, "the first limit is above the second");
            }
        }
        Some(Limits {
            lower: Some((low, true)),
            upper: Some((high, true)),
        })
    }

    /// `= V within W`: from V − W to V + W; a literal W in `%` is a share of V.
    fn near(
        &mut self,
        value: &'w Value,
        within: &'w Value,
        wanted: Option<Dimension>,
        context: &Context<'_, 'w>,
    ) -> Option<Limits> {
        let centre = self.evaluator.value(value, wanted, context);
        let relative = is_relative(&value.expression, &within.expression);
        let reach_wanted = match (relative, &centre) {
            (true, _) => Some(Dimension::NUMBER),
            (false, Some(centre)) => wanted.or(Some(centre.dimension)),
            (false, None) => wanted,
        };
        let reach = self.evaluator.value(within, reach_wanted, context);
        let (centre, reach) = (centre?, reach?);
        if reach.term.value().is_some_and(|reach| reach.value < 0.0) {
            let what = "how far a value may be off is not negative";
            return self.evaluator.bad(context.place(within.span), what);
        }
        let (centre, reach) = (centre.term.into_target()?, reach.term.into_target()?);
        let reach = if relative {
            join(Operator::Multiply, reach, magnitude(centre.clone()))
        } else {
            reach
        };
        Some(Limits {
            lower: Some((
                join(Operator::Subtract, centre.clone(), reach.clone()),
                true,
            )),
            upper: Some((join(Operator::Add, centre, reach), true)),
        })
    }
}

fn lower(limit: TargetFormula, itself: bool) -> Limits {
    Limits {
        lower: Some((limit, itself)),
        upper: None,
    }
}

fn upper(limit: TargetFormula, itself: bool) -> Limits {
    Limits {
        lower: None,
        upper: Some((limit, itself)),
    }
}

fn join(operator: Operator, left: TargetFormula, right: TargetFormula) -> TargetFormula {
    match (left, right) {
        (TargetFormula::Constant(left), TargetFormula::Constant(right)) => {
            TargetFormula::Constant(binary(operator, &left, &right))
        }
        (left, right) => TargetFormula::Binary(operator, Box::new(left), Box::new(right)),
    }
}

fn magnitude(formula: TargetFormula) -> TargetFormula {
    match formula {
        TargetFormula::Constant(value) => TargetFormula::Constant(apply("abs", &[value])),
        other => TargetFormula::Call("abs", vec![other]),
    }
}

impl QuantityKind {
    /// How many bands must be worked out for it.
    #[must_use]
    pub fn bands_needed(&self) -> usize {
        match self {
            Self::Gap(band) => band + 1,
            Self::Width(band)
            | Self::Bottom(band)
            | Self::Top(band)
            | Self::Level(band, _)
            | Self::MassBottom(band)
            | Self::MassTop(band)
            | Self::Hopping(band, _) => *band,
            Self::Fermi => 0,
        }
    }
}
