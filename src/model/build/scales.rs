//! The units that a crystal (or material) defines for itself: `ML` and `Er`.

use super::SectionRef;
use super::checks;
use super::takeover::{Statements, Taken};
use crate::model::constants::{ELECTRON_MASS, PLANCK};
use crate::model::evaluate::{Context, Evaluator, Scale};
use crate::model::{Dimension, Dual, Place, Recoil, Scalar};
use crate::syntax::{StatementKind, Value};

/// What the statements `monolayer`, `mass` and `recoil` say.
pub(super) struct Scales {
    pub(super) monolayer: Option<Dual>,
    pub(super) mass: Dual,
    pub(super) mass_place: Option<Place>,
    pub(super) recoil: Option<Recoil>,
}

impl Scales {
    /// Works them out in the order in which they need each other, and gives the evaluator its units.
    pub(super) fn read<'w>(
        evaluator: &mut Evaluator<'w>,
        chain: &[SectionRef<'w>],
        statements: &Statements<'w>,
    ) -> Self {
        let monolayer = single(statements, "monolayer").map(|(taken, value)| {
            let context = Context::of(chain, taken.home);
            evaluator.positive(value, Dimension::LENGTH, "a monolayer", &context)
        });
        evaluator.units.monolayer = as_scale(monolayer.as_ref());
        let mass = single(statements, "mass").map(|(taken, value)| {
            let context = Context::of(chain, taken.home);
            let mass = checks::mass(evaluator, value, &context);
            (mass, taken.home.place(value.span))
        });
        let mass_value = match &mass {
            Some((mass, _)) => mass.clone(),
            None => Some(Dual::constant(ELECTRON_MASS)),
        };
        let recoil = single(statements, "recoil")
            .map(|(taken, value)| recoil(evaluator, chain, taken, value, mass_value.as_ref()));
        evaluator.units.recoil = match &recoil {
            None => Scale::Missing,
            Some(None) => Scale::Broken,
            Some(Some(recoil)) => Scale::Known(recoil.energy.clone()),
        };
        Self {
            monolayer: monolayer.flatten(),
            mass_place: mass.map(|(_, place)| place),
            mass: mass_value.unwrap_or_else(|| Dual::constant(ELECTRON_MASS)),
            recoil: recoil.flatten(),
        }
    }
}

/// `Er` = h²/(2·mass·L²), the energy that an atom takes from one photon of wavelength L.
fn recoil<'w>(
    evaluator: &mut Evaluator<'w>,
    chain: &[SectionRef<'w>],
    taken: Taken<'w>,
    value: &'w Value,
    mass: Option<&Dual>,
) -> Option<Recoil> {
    let context = Context::of(chain, taken.home);
    let wavelength = evaluator.positive(value, Dimension::LENGTH, "a wavelength", &context)?;
    // Divided twice: the square of a wavelength alone could underflow.
    let momentum = Dual::constant(PLANCK).over(&wavelength);
    let energy = momentum.times(&momentum.over(&mass?.scaled(2.0)));
    Some(Recoil {
        wavelength,
        energy,
        place: taken.home.place(taken.statement.span),
    })
}

fn as_scale(found: Option<&Option<Dual>>) -> Scale {
    match found {
        None => Scale::Missing,
        Some(None) => Scale::Broken,
        Some(Some(size)) => Scale::Known(size.clone()),
    }
}

fn single<'w>(statements: &Statements<'w>, word: &str) -> Option<(Taken<'w>, &'w Value)> {
    let taken = statements.single(word)?;
    match &taken.statement.kind {
        StatementKind::Mass(value)
        | StatementKind::Monolayer(value)
        | StatementKind::Recoil(value) => Some((taken, value)),
        _ => None,
    }
}

/// Gives an evaluator the units that a crystal or material defines.
pub(super) fn local_units<'w>(evaluator: &mut Evaluator<'w>, chain: &[SectionRef<'w>]) {
    let statements = Statements::gather(evaluator, chain);
    let _ = Scales::read(evaluator, chain, &statements);
}
