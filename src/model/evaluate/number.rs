//! Literals and their units.

use super::{Context, Evaluator, Scale, Term, Typed};
use crate::model::constants::constant;
use crate::model::dual::ParameterSort;
use crate::model::unit::{self, UNITS};
use crate::model::words::nearest;
use crate::model::{Dimension, Dual, Parameter, ParameterId, ParameterKind, Scalar, TroubleKind};
use crate::syntax::{SectionKind, UnitUse};
use crate::text::Span;

impl<'w> Evaluator<'w> {
    /// A number with or without a unit, as a parameter of the model.
    pub(super) fn number(
        &mut self,
        span: Span,
        value: f64,
        digits: Span,
        unit: Option<&'w UnitUse>,
        context: &Context<'_, 'w>,
    ) -> Option<Typed> {
        let (size, dimension) = match unit {
            Some(unit) => self.unit_size(unit, digits, context)?,
            None => (Dual::constant(1.0), Dimension::NUMBER),
        };
        let place = context.place(span);
        let id = ParameterId::of(ParameterSort::Literal, place);
        let replaced = self.setting.replacement(id);
        let si = replaced.unwrap_or(value * size.value);
        if !si.is_finite() {
            let what = format!("`{}` is too large for a number", context.spot.text(span));
            return self.fail(TroubleKind::NotFinite { what }, place);
        }
        let scaled = size.chain(si, || if replaced.is_some() { 0.0 } else { value });
        self.note_parameter(Parameter {
            id,
            kind: ParameterKind::Literal,
            place,
            text: context.spot.text(span).to_owned(),
            value: si,
            dimension,
            unit: unit.map(|unit| (context.spot.text(unit.span).to_owned(), size.value)),
        });
        Some(Typed {
            term: Term::Constant(scaled.with_slope(id, 1.0)),
            dimension,
            zero: unit.is_none() && value == 0.0,
        })
    }

    /// One of a unit in SI units, with its power.
    fn unit_size(
        &mut self,
        unit: &'w UnitUse,
        digits: Span,
        context: &Context<'_, 'w>,
    ) -> Option<(Dual, Dimension)> {
        let name = &unit.name.text;
        let Some(found) = self.find_unit(name, context) else {
            return self.unknown_unit(unit, digits, context);
        };
        let (size, dimension) = match found {
            Some(known) => known,
            None => return self.no_scale(name, context.place(unit.name.span), context),
        };
        if unit.power == 1 {
            return Some((size, dimension));
        }
        let raised = dimension.power(f64::from(unit.power));
        let value = size.value.powi(unit.power);
        let slope = f64::from(unit.power) * size.value.powi(unit.power.saturating_sub(1));
        match raised {
            Some(raised) if value.is_finite() && value != 0.0 => {
                Some((size.chain(value, || slope), raised))
            }
            _ => {
                let what = format!("`{}` is out of range", context.spot.text(unit.span));
                self.fail(TroubleKind::NotFinite { what }, context.place(unit.span))
            }
        }
    }

    /// A unit: `None` where there is none of that name, `Some(None)` where it is one that nothing here defines.
    pub(super) fn find_unit(
        &self,
        name: &str,
        context: &Context<'_, 'w>,
    ) -> Option<Option<(Dual, Dimension)>> {
        match name {
            "ML" => {
                if let Some(nearer) = context.monolayer {
                    return Some(Some((nearer.clone(), Dimension::LENGTH)));
                }
                Some(self.scale(&self.units.monolayer, Dimension::LENGTH, context))
            }
            "Er" => Some(self.scale(&self.units.recoil, Dimension::ENERGY, context)),
            _ => unit::find(name).map(|unit| Some((Dual::constant(unit.size), unit.dimension))),
        }
    }

    fn scale(
        &self,
        scale: &Scale,
        dimension: Dimension,
        context: &Context<'_, 'w>,
    ) -> Option<(Dual, Dimension)> {
        match scale {
            Scale::Known(size) if context.local_units => Some((size.clone(), dimension)),
            _ => None,
        }
    }

    /// `Er` or `ML` where nothing defines it.
    pub(super) fn no_scale<T>(
        &mut self,
        name: &str,
        place: crate::model::Place,
        context: &Context<'_, 'w>,
    ) -> Option<T> {
        let scale = match name {
            "Er" => &self.units.recoil,
            _ => &self.units.monolayer,
        };
        if context.local_units && matches!(scale, Scale::Broken) {
            self.broken = true;
            return None;
        }
        let in_crystal = context.spot.section.kind == SectionKind::Crystal;
        let why = match (name, in_crystal) {
            ("Er", true) => {
                "`Er` needs a `recoil` in this crystal, and a mass that does not itself use `Er`"
            }
            ("Er", false) => "`Er` is known only in a crystal that says `recoil`",
            (_, true) => "`ML` needs a `monolayer` in the material or in this crystal",
            (_, false) => "`ML` is known only where a `monolayer` is",
        };
        let kind = TroubleKind::UnknownUnit {
            unit: name.to_owned(),
            why: Some(why.to_owned()),
            instead: None,
        };
        self.fail(kind, place)
    }

    fn unknown_unit<T>(
        &mut self,
        unit: &'w UnitUse,
        digits: Span,
        context: &Context<'_, 'w>,
    ) -> Option<T> {
        let name = &unit.name.text;
        let is_value = constant(name).is_some()
            || self.world.find_let(context.scope, name).is_some()
            || is_variable(name, context);
        let instead = if is_value {
            Some(format!("* {}", context.spot.text(unit.span)))
        } else {
            nearest_unit(name)
        };
        let why = is_value.then(|| {
            let number = context.spot.text(digits);
            format!("`{name}` is a value, and `{number}` must be multiplied by it")
        });
        let kind = TroubleKind::UnknownUnit {
            unit: name.clone(),
            why,
            instead,
        };
        self.fail(kind, context.place(unit.name.span))
    }
}

fn is_variable(name: &str, context: &Context<'_, '_>) -> bool {
    if name == "period" && context.period.is_some() {
        return true;
    }
    match context.variables {
        super::Variables::None => false,
        super::Variables::Position(_) => matches!(name, "x" | "y" | "z"),
        super::Variables::Magnitude => name == "q",
    }
}

/// The unit that was likely meant: another case first, a plural or full name, then one letter off.
fn nearest_unit(word: &str) -> Option<String> {
    let names = || {
        UNITS
            .iter()
            .map(|unit| unit.name)
            .filter(|name| *name != "%")
    };
    let same_letters = names().find(|name| name.eq_ignore_ascii_case(word));
    let spelled_out = UNITS.iter().find(|unit| {
        unit.about.eq_ignore_ascii_case(word.trim_end_matches('s'))
            || unit
                .about
                .replace("metre", "meter")
                .eq_ignore_ascii_case(word.trim_end_matches('s'))
    });
    same_letters
        .or(spelled_out.map(|unit| unit.name))
        .map(str::to_owned)
        .or_else(|| {
            nearest(
                word,
                names().chain(["Er", "ML"]).filter(|name| name.len() > 1),
            )
        })
}
