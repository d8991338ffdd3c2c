//! The words that several views share.

use super::locate::Locator;
use crate::bands::{Assessment, Class, Feature, GapKind, TargetState, Unsolved};
use crate::model::{Crystal, Dimension, Parameter, ParameterId, ParameterKind};
use crate::rules::Level;

/// A class of conductor.
#[must_use]
pub fn class(class: Class) -> &'static str {
    match class {
        Class::Metal => "metal",
        Class::Semimetal => "semimetal",
        Class::Semiconductor => "semiconductor",
        Class::Insulator => "insulator",
    }
}

/// A kind of gap.
#[must_use]
pub fn gap_kind(kind: GapKind) -> &'static str {
    match kind {
        GapKind::Direct => "direct",
        GapKind::Indirect => "indirect",
        GapKind::Closed => "closed",
        GapKind::Overlap => "overlap",
    }
}

/// The state of a target, as machines are told it.
#[must_use]
pub fn target_state(state: TargetState) -> &'static str {
    match state {
        TargetState::Met => "met",
        TargetState::Missed => "missed",
        TargetState::AtRisk => "at-risk",
        TargetState::Undecided => "undecided",
        TargetState::Untestable => "untestable",
    }
}

/// The state of a target, as people are told it.
#[must_use]
pub fn target_state_spoken(state: TargetState) -> &'static str {
    match state {
        TargetState::AtRisk => "at risk",
        other => target_state(other),
    }
}

/// A level.
#[must_use]
pub fn level(level: Level) -> &'static str {
    match level {
        Level::Note => "note",
        Level::Warning => "warning",
        Level::Error => "error",
    }
}

/// Why there are no bands.
#[must_use]
pub fn unsolved(why: &Unsolved) -> String {
    match why {
        Unsolved::BrokenModel => "its errors keep it from being solved".to_owned(),
        Unsolved::Dimension(dimension) => {
            format!("this is drawn of one dimension, and the crystal has {dimension}")
        }
        Unsolved::NotConverged(how) => format!("its numbers did not settle: {how}"),
        Unsolved::Cancelled => "the work was stopped".to_owned(),
    }
}

/// The dimension of a target's value and worst case: for a class or a kind of gap, that of the gap it stands on.
#[must_use]
pub fn target_dimension(target: &Assessment) -> Dimension {
    match target.found {
        Some(_) => Dimension::ENERGY,
        None => target.dimension,
    }
}

/// A gap, width or edge.
#[must_use]
pub fn feature(feature: Feature) -> String {
    match feature {
        Feature::Gap(band) => format!("gap {band}"),
        Feature::Width(band) => format!("width {band}"),
        Feature::Bottom(band) => format!("bottom {band}"),
        Feature::Top(band) => format!("top {band}"),
    }
}

/// A parameter of a crystal by its identity.
#[must_use]
pub fn parameter(crystal: &Crystal, id: ParameterId) -> Option<&Parameter> {
    let sorted = &crystal.parameters;
    let found = sorted.binary_search_by_key(&id, |parameter| parameter.id);
    found.ok().and_then(|index| sorted.get(index))
}

/// What a parameter is called: its name, or its text.
#[must_use]
pub fn parameter_name(parameter: &Parameter) -> String {
    match &parameter.kind {
        ParameterKind::Name(name) => name.clone(),
        ParameterKind::Field(material, field) => format!("{field} of {material}"),
        ParameterKind::Literal | ParameterKind::Draw => parameter.text.clone(),
    }
}

/// The tolerance that spends most of a target's margin, by line and text.
#[must_use]
pub fn driver(locator: &Locator<'_>, crystal: &Crystal, assessment: &Assessment) -> Option<String> {
    let parameter = parameter(crystal, assessment.driver?)?;
    let line = locator.line(&parameter.place);
    Some(match parameter.place.file == assessment.place.file {
        true => format!("line {line}: {}", parameter.text),
        false => format!(
            "{} line {line}: {}",
            locator.file_name(parameter.place.file),
            parameter.text
        ),
    })
}

/// "1 error", "2 errors".
#[must_use]
pub fn count(number: usize, one: &str) -> String {
    match number {
        1 => format!("1 {one}"),
        _ => format!("{number} {one}s"),
    }
}
