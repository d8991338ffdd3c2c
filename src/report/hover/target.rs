//! Hovers on `require` and `measure`.

use super::View;
use super::card::Card;
use crate::bands::Assessment;
use crate::model::{Crystal, Parameter, ParameterId, ParameterKind};
use crate::report::units::{self, Scale, Trade};
use crate::report::{show_text, words};
use crate::syntax::{Statement, StatementKind};

/// Value, margin, worst corner and driver of a target.
pub fn required(view: &View<'_>, statement: &Statement) -> Option<Card> {
    let crystal = view.crystal()?;
    let trade = view.trade();
    let mut targets = view.section.targets.iter();
    let target = targets.find(|target| {
        view.holds(&target.place) && target.place.span.start == statement.span.start
    })?;
    let mut card = Card::new(format!(
        "{}: {}",
        target.text,
        words::target_state_spoken(target.state)
    ));
    if let Some(reason) = &target.reason {
        card.say(reason.clone());
    }
    if let Some(found) = &target.found {
        card.row(["is".to_owned(), found.clone()]);
    }
    if let Some(value) = target.value {
        card.row([
            "value".to_owned(),
            trade.tell(value, words::target_dimension(target)),
        ]);
    }
    if let Some(margin) = show_text::margin(target, &trade) {
        card.row(["margin".to_owned(), margin]);
    }
    if let Some(worst) = target.worst {
        let mut told = show_text::worst_value(target, worst, &trade);
        if let Some(margin) = show_text::worst_margin(target, worst, &trade) {
            told = format!("{told}, {margin}");
        }
        card.row(["at worst".to_owned(), told]);
        corner(view, crystal, target, &mut card);
    }
    if let Some(driver) = words::driver(&view.locator, crystal, target) {
        card.row(["spent most by".to_owned(), driver]);
    }
    Some(card)
}

/// The values at the worst corner.
fn corner(view: &View<'_>, crystal: &Crystal, target: &Assessment, card: &mut Card) {
    const SHOWN: usize = 5;
    for (id, draw) in target
        .corner
        .iter()
        .filter(|(_, draw)| *draw != 0.0)
        .take(SHOWN)
    {
        if let Some((text, value)) = at_draw(crystal, *id, *draw, &view.trade()) {
            card.row([String::new(), format!("{value}, of {text}")]);
        }
    }
    if target.corner.len() > SHOWN {
        card.row([
            String::new(),
            format!("and {} more", target.corner.len() - SHOWN),
        ]);
    }
}

/// The text of a tolerance, and the value at a draw of it.
fn at_draw(
    crystal: &Crystal,
    id: ParameterId,
    draw: f64,
    trade: &Trade,
) -> Option<(String, String)> {
    let tolerance = words::parameter(crystal, id)?;
    let nominal = nominal(crystal, tolerance);
    let value = match nominal {
        Some(nominal) => {
            let shifted = nominal.value + draw * tolerance.value;
            match &nominal.unit {
                Some((name, factor)) => {
                    let scale = Scale {
                        factor: *factor,
                        name: name.clone(),
                    };
                    units::tell_in(units::exact(shifted), &scale)
                }
                None => trade.tell_exact(shifted, nominal.dimension),
            }
        }
        None => format!("{} of the tolerance", units::signed(draw)),
    };
    Some((tolerance.text.clone(), value))
}

/// The number before the `±`.
fn nominal<'a>(crystal: &'a Crystal, tolerance: &Parameter) -> Option<&'a Parameter> {
    let mut all = crystal.parameters.iter();
    all.find(|parameter| {
        parameter.kind == ParameterKind::Literal
            && parameter.place.file == tolerance.place.file
            && parameter.place.section == tolerance.place.section
            && parameter.place.span.start == tolerance.place.span.start
    })
}

/// The value of a measure.
pub fn measured(view: &View<'_>, statement: &Statement) -> Option<Card> {
    let StatementKind::Measure { name, .. } = &statement.kind else {
        return None;
    };
    let mut measures = view.section.measures.iter();
    let measure = measures.find(|measure| measure.name == name.text)?;
    let mut card = Card::new(format!("measure {}", name.text));
    let told = super::crystal::measure_told(measure, &view.trade());
    card.row(["value".to_owned(), told]);
    Some(card)
}
