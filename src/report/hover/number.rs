//! Hovers on numbers and named values: other units, tolerance, and what moves with them.

use super::View;
use super::card::Card;
use crate::bands::{Feature, Sensitivity};
use crate::model::{Crystal, Dimension, Parameter, ParameterId, ParameterKind, Place, Reference};
use crate::report::units::{self, BOLTZMANN, ELECTRON_MASS, ELECTRONVOLT, PLANCK, Scale, Trade};
use crate::report::words;
use crate::text::Span;

/// Crystals told of, where a number enters several.
const CRYSTALS: usize = 3;
/// Gaps and widths told of.
const BANDS: usize = 2;

/// The number that the view touches.
pub fn card(view: &View<'_>) -> super::Found {
    let parameter = touched(view)?;
    let mut card = Card::new(words::parameter_name(&parameter));
    describe(view, &parameter, &mut card);
    Some((parameter.place.span, card))
}

/// A named value where it is used.
pub fn named(view: &View<'_>, reference: &Reference) -> Option<Card> {
    let definition = reference.definition?;
    let mut card = Card::new(&reference.name);
    let measure = view
        .section
        .measures
        .iter()
        .find(|measure| measure.name == reference.name);
    if let Some(measure) = measure {
        card.say("a measure of this crystal");
        let told = super::crystal::measure_told(measure, &view.trade());
        card.row(["value".to_owned(), told]);
        return Some(card);
    }
    let named = |parameter: &&Parameter| {
        matches!(&parameter.kind, ParameterKind::Name(name) if *name == reference.name)
            && parameter.place.file == definition.file
            && parameter.place.section == definition.section
    };
    let parameter = view.section.parameters.iter().find(named);
    match parameter {
        Some(parameter) => {
            card.say(format!(
                "`{}`, line {}",
                parameter.text,
                view.locator.line(&parameter.place)
            ));
            describe(view, parameter, &mut card);
        }
        None => card.say(format!(
            "defined on line {}",
            view.locator.line(&definition)
        )),
    }
    Some(card)
}

/// What moves with the field of this material that a statement's word gives.
pub fn field(view: &View<'_>, word: &str, card: &mut Card) {
    let is_field = |parameter: &&Parameter| {
        matches!(&parameter.kind, ParameterKind::Field(_, field) if field == word)
            && view.holds(&parameter.place)
    };
    let own = view.section.parameters.iter();
    let others = view
        .file
        .crystals(&[])
        .flat_map(|(_, crystal)| crystal.parameters.iter());
    if let Some(parameter) = own.chain(others).find(is_field) {
        describe(view, parameter, card);
    }
}

/// The smallest parameter at the view's place: the section's own, or one of a crystal that takes it from here.
fn touched(view: &View<'_>) -> Option<Parameter> {
    let near = |parameter: &&Parameter| {
        view.holds(&parameter.place)
            && parameter.place.span.touches(view.at)
            && parameter.kind != ParameterKind::Draw
    };
    let own = view.section.parameters.iter().filter(near);
    // A literal that is all of a named value is told of under its name.
    let rank = |parameter: &&Parameter| {
        (
            parameter.place.span.len(),
            parameter.kind == ParameterKind::Literal,
        )
    };
    if let Some(found) = own.min_by_key(rank) {
        return Some(found.clone());
    }
    let others = view.file.crystals(&[]);
    let all = others.flat_map(|(_, crystal)| crystal.parameters.iter().filter(near));
    all.min_by_key(rank).cloned()
}

fn describe(view: &View<'_>, parameter: &Parameter, card: &mut Card) {
    let trade = view.trade();
    let told = trade.tell_exact(parameter.value, parameter.dimension);
    let mut values = vec![told];
    values.extend(in_other_units(parameter.value, parameter.dimension, &trade));
    values.dedup();
    values.extend(in_monolayers(view, parameter).map(|count| format!("{count} ML")));
    if values.len() > 1 || parameter.text != values.concat() {
        card.row(["value".to_owned(), values.join(" = ")]);
    }
    if let Some(half) = tolerance(view, parameter) {
        let told = trade.tell_exact(half.value, half.dimension);
        let share = units::digits((100.0 * half.value / parameter.value).abs(), 0.0);
        card.row(["tolerance".to_owned(), format!("±{told} (±{share} %)")]);
    }
    moves(view, parameter, card);
}

/// The same value in units that the trade also uses.
fn in_other_units(value: f64, dimension: Dimension, trade: &Trade) -> Vec<String> {
    let told = |factor: f64, name: &str| {
        let scale = Scale {
            factor,
            name: name.to_owned(),
        };
        units::tell_in(units::exact(value), &scale)
    };
    match dimension {
        Dimension::ENERGY if trade.recoil.is_some() || trade.atoms => {
            let plain = Trade {
                recoil: None,
                atoms: true,
            };
            let kelvin = plain.tell_exact(value / BOLTZMANN, Dimension::TEMPERATURE);
            vec![plain.tell_exact(value, dimension), format!("kB × {kelvin}")]
        }
        Dimension::ENERGY => vec![
            told(ELECTRONVOLT, "eV"),
            Trade::default().tell_exact(value / PLANCK, Dimension::FREQUENCY),
            format!(
                "kB × {}",
                trade.tell_exact(value / BOLTZMANN, Dimension::TEMPERATURE)
            ),
        ],
        Dimension::LENGTH => vec![told(1e-10, "Å")],
        Dimension::MASS if trade.atoms => vec![told(1.0, "kg")],
        Dimension::MASS => vec![told(ELECTRON_MASS, "me")],
        _ => Vec::new(),
    }
}

fn in_monolayers(view: &View<'_>, parameter: &Parameter) -> Option<String> {
    let crystal = view.crystal()?;
    let mut layers = crystal.potential.layers.iter();
    let layer = layers.find(|layer| {
        layer.length_place == parameter.place || {
            let (inner, outer) = (parameter.place, layer.length_place);
            inner.file == outer.file
                && inner.section == outer.section
                && outer.span.start == inner.span.start
                && inner.span.end <= outer.span.end
        }
    })?;
    super::crystal::monolayers(layer)
}

/// The tolerance written behind a number: the draw whose `a ± b` begins with it.
fn tolerance(view: &View<'_>, parameter: &Parameter) -> Option<Parameter> {
    let crystals = view
        .file
        .crystals(&[])
        .map(|(_, crystal)| &crystal.parameters);
    let all = std::iter::once(&view.section.parameters)
        .chain(crystals)
        .flatten();
    let mut draws = all.filter(|draw| draw.kind == ParameterKind::Draw);
    draws
        .find(|draw| covers(&draw.place, &parameter.place))
        .cloned()
}

fn covers(outer: &Place, inner: &Place) -> bool {
    let within = |outer: Span, inner: Span| outer.start <= inner.start && inner.end <= outer.end;
    outer.file == inner.file && outer.section == inner.section && within(outer.span, inner.span)
}

/// How the lowest gaps and widths of the crystals here move with it.
fn moves(view: &View<'_>, parameter: &Parameter, card: &mut Card) {
    let draw = tolerance(view, parameter);
    let single = view.crystal().is_some();
    let own = view
        .section
        .crystal
        .as_deref()
        .map(|crystal| (view.section, crystal));
    let crystals: Vec<_> = match own {
        Some(own) => vec![own],
        None => view.file.crystals(&[]).collect(),
    };
    let takers = crystals.into_iter().filter(|(section, crystal)| {
        section.solution().is_some_and(|solution| solution.fine)
            && words::parameter(crystal, parameter.id).is_some()
    });
    for (_, crystal) in takers.take(CRYSTALS) {
        let trade = Trade::of(crystal);
        for sensitivity in view.analyst.sensitivities(crystal) {
            let label = words::feature(sensitivity.feature);
            let label = match single {
                true => label,
                false => format!("{} {label}", crystal.name),
            };
            if let Some(told) = moved(&sensitivity, crystal, parameter, draw.as_ref(), &trade) {
                card.row([label, told]);
            }
        }
    }
}

/// "−12.3 meV per nm, −0.66 meV per %, ±3.4 meV over its tolerance"; nothing for a feature that does not move or is not told of.
fn moved(
    sensitivity: &Sensitivity,
    crystal: &Crystal,
    parameter: &Parameter,
    draw: Option<&Parameter>,
    trade: &Trade,
) -> Option<String> {
    let shown = match sensitivity.feature {
        Feature::Gap(band) | Feature::Width(band) => band <= BANDS,
        Feature::Bottom(_) | Feature::Top(_) => false,
    };
    let slope = slope(sensitivity, parameter.id)
        .filter(|slope| shown && slope.is_finite() && *slope != 0.0)?;
    let unit = own_unit(parameter, trade);
    let mut parts = vec![format!(
        "{} per {}",
        change(slope * unit.factor, trade),
        unit.name
    )];
    let monolayer = crystal
        .monolayer
        .as_ref()
        .filter(|_| parameter.dimension == Dimension::LENGTH);
    if let Some(monolayer) = monolayer {
        parts.push(format!("{} per ML", change(slope * monolayer.value, trade)));
    }
    if parameter.dimension != Dimension::NUMBER {
        let percent = change(slope * parameter.value * 0.01, trade);
        parts.push(format!("{percent} per %"));
    }
    let spread = draw.and_then(|draw| self::slope(sensitivity, draw.id));
    if let Some(spread) = spread.filter(|spread| *spread != 0.0) {
        let told = trade.tell_rough(spread.abs(), Dimension::ENERGY);
        parts.push(format!("±{told} over its tolerance"));
    }
    Some(parts.join(", "))
}

fn slope(sensitivity: &Sensitivity, id: ParameterId) -> Option<f64> {
    let slopes = &sensitivity.slopes;
    let found = slopes.binary_search_by_key(&id, |(parameter, _)| *parameter);
    found
        .ok()
        .and_then(|index| slopes.get(index))
        .map(|(_, slope)| *slope)
}

/// The unit that the number is written in, or the one its size asks for.
fn own_unit(parameter: &Parameter, trade: &Trade) -> Scale {
    match &parameter.unit {
        Some((name, size)) => Scale {
            factor: *size,
            name: name.clone(),
        },
        None => {
            let mut scale = trade.scale(parameter.dimension, parameter.value.abs());
            if scale.name.is_empty() {
                "unit of it".clone_into(&mut scale.name);
            }
            scale
        }
    }
}

/// A change of energy with its sign.
fn change(value: f64, trade: &Trade) -> String {
    let told = trade.tell_rough(value, Dimension::ENERGY);
    match value > 0.0 {
        true => format!("+{told}"),
        false => told,
    }
}
