//! # What it finds
//! A sine or cosine in a profile that does not repeat with the cell, and (an error) an index that the lattice's
//! centring forbids. The square of a sine has half its period.
//!
//! # Why it matters
//! The wave is cut off at the end of each cell, so the crystal holds a step or a corner that no one drew.
//!
//! # Example
//! ```cren
//! crystal tern
//!   lattice chain 8.0 nm
//!   mass 0.067 me
//!   profile = 20 meV * cos(2*pi*x / (7.8 nm))
//!                      ^^^^^^^^^^^^^^^^^^^^^^
//! ```
//! Also found: `seam-step`.
//!
//! # Instead
//! ```cren
//! crystal tern
//!   lattice chain 8.0 nm
//!   mass 0.067 me
//!   profile = 20 meV * cos(2*pi*x / period)
//! ```
//!
//! # Fix
//! None: the message names the nearest period that fits. In one dimension `period` always does.

use std::f64::consts::TAU;

use super::stretch::ROUNDING;
use super::words::Trade;
use super::{Finding, Level, Rule, Subject, Tier, words};
use crate::model::{Crystal, Dual, Formula, ParameterId, ProfilePiece, Trouble, TroubleKind};
use crate::syntax::{Expression, ExpressionKind, Operator, StatementKind};
use crate::text::Span;

/// The rule.
pub const RULE: Rule = Rule {
    name: "off-lattice-wave",
    group: "periodicity",
    level: Level::Warning,
    tier: Tier::Model,
    waivable: true,
    source: include_str!("off_lattice_wave.rs"),
    check,
};

/// A wave fits if the number of its periods in a cell is whole to within this.
const FITS: f64 = 1e-6;

fn check(subject: &Subject<'_>, findings: &mut Vec<Finding>) {
    findings.extend(subject.troubles.iter().filter_map(forbidden));
    let Some(crystal) = subject.crystal else {
        return;
    };
    // A wave in one piece of several need not repeat.
    let [piece] = crystal.potential.profile.as_slice() else {
        return;
    };
    if !repeats(crystal, piece) {
        findings.extend(off_lattice(subject, crystal, piece));
    }
}

/// Places at which a formula is compared with itself one cell on; no fractions of any cell.
const PLACES: [f64; 7] = [0.0431, 0.1717, 0.2903, 0.4519, 0.6173, 0.7351, 0.9239];

/// Whether a formula repeats with every vector of the lattice, whatever its waves do one by one.
fn repeats(crystal: &Crystal, piece: &ProfilePiece) -> bool {
    let start = piece.range[0].value;
    PLACES.iter().all(|part| {
        let mut here = [start, 0.0, 0.0];
        for vector in &crystal.vectors {
            for (entry, along) in here.iter_mut().zip(vector) {
                *entry += part * along.value;
            }
        }
        let value = piece.formula.at(&here);
        crystal.vectors.iter().all(|vector| {
            let mut there = here;
            for (entry, along) in there.iter_mut().zip(vector) {
                *entry += along.value;
            }
            let other = piece.formula.at(&there);
            (value - other).abs() <= ROUNDING * value.abs().max(other.abs())
        })
    })
}

fn forbidden(trouble: &Trouble) -> Option<Finding> {
    let TroubleKind::ForbiddenWave { index, condition } = &trouble.kind else {
        return None;
    };
    let message = format!(
        "{} is no reciprocal vector of this lattice",
        words::index(index)
    );
    Some(
        Finding::of_trouble(&RULE, trouble, message)
            .at_level(Level::Error)
            .help(condition.clone()),
    )
}

/// A sine or cosine of a profile whose argument is linear in the position.
struct Wave<'f> {
    /// The call.
    call: &'f Formula,
    /// The change of its argument per metre, along x, y, z.
    vector: [Dual; 3],
    /// 2 where only its square enters, else 1.
    power: f64,
}

fn off_lattice(subject: &Subject<'_>, crystal: &Crystal, piece: &ProfilePiece) -> Vec<Finding> {
    let mut waves = Vec::new();
    gather(&piece.formula, 1.0, &mut waves);
    let spans = call_spans(subject, piece, waves.len());
    let mut findings = Vec::new();
    for (index, wave) in waves.iter().enumerate() {
        let Some(wave) = wave else { continue };
        let span = spans.as_ref().and_then(|spans| spans.get(index)).copied();
        findings.extend(finding(subject, crystal, piece, wave, span));
    }
    findings
}

fn finding(
    subject: &Subject<'_>,
    crystal: &Crystal,
    piece: &ProfilePiece,
    wave: &Wave<'_>,
    span: Option<Span>,
) -> Option<Finding> {
    let misfit = crystal
        .vectors
        .iter()
        .map(|vector| (vector, periods_along(wave, vector)))
        .find(|(_, periods)| (periods - periods.round()).abs() > FITS)?;
    let (vector, periods) = misfit;
    let numbers: Vec<&Dual> = wave.vector.iter().chain(vector).collect();
    let place = subject.where_to_speak(piece.formula_place, &numbers)?;
    let place = match span {
        Some(span) if place == piece.formula_place => subject.place(span),
        _ => place,
    };
    let cell = vector
        .iter()
        .map(|along| along.value.powi(2))
        .sum::<f64>()
        .sqrt();
    let name = match wave.call {
        Formula::Call("sin", _) => "sine",
        _ => "cosine",
    };
    let name = if wave.power > 1.0 {
        format!("squared {name}")
    } else {
        name.to_owned()
    };
    let fitting = cell / periods.abs().round().max(1.0);
    let [own, whole, fits] = words::apart(
        [cell / periods.abs(), cell, fitting],
        crate::model::Dimension::LENGTH,
        Trade::default(),
    );
    let message =
        format!("this {name} repeats every {own}, which does not divide the cell of {whole}");
    Some(
        Finding::new(&RULE, place, message).help(format!("the nearest period that does is {fits}")),
    )
}

/// How many of its periods lie along a lattice vector.
fn periods_along(wave: &Wave<'_>, vector: &[Dual]) -> f64 {
    let phases = wave.vector.iter().zip(vector);
    let phase: f64 = phases
        .map(|(per_metre, along)| per_metre.value * along.value)
        .sum();
    wave.power * phase / TAU
}

/// The sines and cosines of a formula that depend on the position, in the order of the text; `None` for one whose
/// argument is not linear in it.
fn gather<'f>(formula: &'f Formula, power: f64, waves: &mut Vec<Option<Wave<'f>>>) {
    match formula {
        Formula::Constant(_) | Formula::Variable(_) => {}
        Formula::Negative(inner) => gather(inner, power, waves),
        Formula::Binary(Operator::Power, base, exponent) => {
            gather(base, if is_even(exponent) { 2.0 } else { 1.0 }, waves);
            gather(exponent, 1.0, waves);
        }
        Formula::Binary(Operator::Multiply, left, right) if left == right => {
            gather(left, 2.0, waves);
            gather(right, 2.0, waves);
        }
        Formula::Binary(_, left, right) => {
            gather(left, 1.0, waves);
            gather(right, 1.0, waves);
        }
        Formula::Call("sin" | "cos", arguments) if formula.varies() => {
            waves.push(wave(formula, arguments, power));
        }
        Formula::Call("abs", arguments) => {
            arguments.iter().for_each(|part| gather(part, 2.0, waves))
        }
        Formula::Call(_, arguments) => arguments.iter().for_each(|part| gather(part, 1.0, waves)),
    }
}

fn is_even(exponent: &Formula) -> bool {
    matches!(exponent, Formula::Constant(value) if value.value % 2.0 == 0.0)
}

fn wave<'f>(call: &'f Formula, arguments: &'f [Formula], power: f64) -> Option<Wave<'f>> {
    let argument = arguments.first()?;
    let here = gradient(argument, [0.0, 0.0, 0.0]);
    let there = gradient(argument, [3.7e-9, -2.3e-9, 1.9e-9]);
    let linear = here.iter().zip(&there).all(|(one, other)| {
        (one.value - other.value).abs() <= 1e-9 * one.value.abs().max(other.value.abs())
    });
    linear.then_some(Wave {
        call,
        vector: here,
        power,
    })
}

/// The derivatives along x, y, z; each with the parameters that the argument depends on.
fn gradient(argument: &Formula, at: [f64; 3]) -> [Dual; 3] {
    let [x, y, z] = ParameterId::POSITION;
    let [along, across, up] = at;
    let position = [
        Dual::parameter(along, x),
        Dual::parameter(across, y),
        Dual::parameter(up, z),
    ];
    let value = argument.dual_at(&position);
    ParameterId::POSITION.map(|axis| Dual {
        value: value.slope(axis),
        slopes: value.slopes.clone(),
    })
}

/// Where those calls stand in the text, if the formula is written in this section and has as many of them.
fn call_spans(subject: &Subject<'_>, piece: &ProfilePiece, count: usize) -> Option<Vec<Span>> {
    let statement = subject.statement_at(piece.formula_place)?;
    let StatementKind::Profile { expression, .. } = &statement.kind else {
        return None;
    };
    let mut spans = Vec::new();
    calls(expression, &mut spans);
    (spans.len() == count).then_some(spans)
}

fn calls(expression: &Expression, spans: &mut Vec<Span>) {
    match &expression.kind {
        ExpressionKind::Negative(inner) => calls(inner, spans),
        ExpressionKind::Binary { left, right, .. } => {
            calls(left, spans);
            calls(right, spans);
        }
        ExpressionKind::Call {
            function,
            arguments,
        } => {
            let wave = matches!(function.text.as_str(), "sin" | "cos");
            if wave && arguments.iter().any(has_position) {
                spans.push(expression.span);
            } else {
                arguments.iter().for_each(|part| calls(part, spans));
            }
        }
        _ => {}
    }
}

fn has_position(expression: &Expression) -> bool {
    match &expression.kind {
        ExpressionKind::Name(name) => matches!(name.as_str(), "x" | "y" | "z"),
        ExpressionKind::Negative(inner) => has_position(inner),
        ExpressionKind::Binary { left, right, .. } => has_position(left) || has_position(right),
        ExpressionKind::Call { arguments, .. } => arguments.iter().any(has_position),
        _ => false,
    }
}

#[cfg(test)]
mod tests {
    use super::super::fixture::{levels, messages, silent};
    use super::RULE;
    use crate::rules::Level;

    fn chain(formula: &str) -> String {
        format!("crystal a\n  lattice chain 8 nm\n  profile = 9 meV * {formula}\n")
    }

    #[test]
    fn the_period_and_the_cell_are_named() {
        let message = "this cosine repeats every 7.8 nm, which does not divide the cell of 8 nm";
        assert_eq!(messages(&RULE, &chain("cos(2*pi*x/(7.8 nm))")), [message]);
    }

    #[test]
    fn a_square_has_half_the_period() {
        silent(&RULE, &chain("sin(pi*x/period)^2"));
        silent(&RULE, &chain("sin(pi*x/period)*sin(pi*x/period)"));
        silent(&RULE, &chain("sech(3*sin(pi*x/period))"));
        assert_eq!(messages(&RULE, &chain("sin(pi*x/period)^3")).len(), 1);
    }

    #[test]
    fn harmonics_fit_and_shifts_do_not_matter() {
        silent(
            &RULE,
            &chain("(cos(2*pi*(x - 1 nm)/(4 nm)) + sin(2*pi*x/(8 nm)))"),
        );
    }

    #[test]
    fn a_wave_in_one_piece_of_several_need_not_repeat() {
        let text = "crystal a\n  lattice chain 8 nm\n  profile 0 to 3 nm = 9 meV*sin(pi*x/(3 nm))\n  profile 3 nm to 8 nm = 0\n";
        silent(&RULE, text);
    }

    #[test]
    fn an_index_that_the_centring_forbids_is_an_error() {
        let text = "crystal a\n  lattice fcc 0.5 nm\n  cosine (1, 0, 0) = 1 eV\n";
        assert_eq!(levels(&RULE, text), [Level::Error]);
        silent(&RULE, &text.replace("(1, 0, 0)", "(1, 1, 1)"));
    }
}
