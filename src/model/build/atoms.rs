//! Atoms and form factors.

use std::sync::Arc;

use super::crystal::CrystalBuild;
use super::position::fractions_of;
use super::takeover::Taken;
use crate::model::evaluate::{Context, Variables};
use crate::model::words::nearest;
use crate::model::{
    Atom, Dimension, Dual, Formfactor, FormfactorValues, NameSort, Place, Trouble, TroubleKind,
};
use crate::syntax::{Expression, FormfactorForm, StatementKind, Value, Word};

/// Atoms closer than this share of the first lattice length sit on each other.
const CLASH: f64 = 1e-3;
/// Two form factors are of the same |G|² within this much, in (2π/a)².
const SAME_SHELL: f64 = 1e-6;

impl<'w> CrystalBuild<'_, 'w> {
    /// Reads all atoms and checks that no two sit on each other.
    pub(super) fn atoms(&mut self) {
        for taken in self.statements.atoms.clone() {
            let StatementKind::Atom { name, at } = &taken.statement.kind else {
                continue;
            };
            if !self.allowed(taken, &[2, 3], "a lattice of two or three dimensions") {
                continue;
            }
            let context = self.context(taken);
            if let Some(at) = self.position("atom", at, &context) {
                self.crystal.potential.atoms.push(Atom {
                    place: taken.home.place(taken.statement.span),
                    name: name.text.clone(),
                    at,
                });
            }
        }
        self.clashes();
    }

    fn clashes(&mut self) {
        let atoms = self.crystal.potential.atoms.clone();
        let Some(first) = self.crystal.conventional.first() else {
            return;
        };
        let scale = first
            .iter()
            .map(|entry| entry.value.powi(2))
            .sum::<f64>()
            .sqrt();
        for (index, atom) in atoms.iter().enumerate() {
            for earlier in atoms.iter().take(index) {
                let distance = self.periodic_distance(atom, earlier);
                if distance < CLASH * scale {
                    let kind = TroubleKind::ClashingAtoms { distance };
                    let trouble = Trouble::new(kind, atom.place);
                    self.evaluator
                        .report(trouble.beside(earlier.place, "the other atom"));
                }
            }
        }
    }

    /// Distance of nearest images. Only distances that are small against the cell need be right.
    fn periodic_distance(&self, one: &Atom, other: &Atom) -> f64 {
        let vectors = &self.crystal.vectors;
        let apart: Vec<f64> = one
            .at
            .iter()
            .zip(&other.at)
            .map(|(a, b)| a.value - b.value)
            .collect();
        let Some(fractions) = fractions_of(vectors, &apart) else {
            return f64::INFINITY;
        };
        let mut nearest = apart;
        for (fraction, vector) in fractions.iter().zip(vectors) {
            for (part, along) in nearest.iter_mut().zip(vector) {
                *part -= fraction.round() * along.value;
            }
        }
        nearest.iter().map(|part| part * part).sum::<f64>().sqrt()
    }

    /// Reads all form factors; of one atom and shell, the section's own replaces one that is taken over.
    pub(super) fn formfactors(&mut self) {
        let mut read: Vec<(Taken<'w>, Formfactor)> = Vec::new();
        for taken in self.statements.formfactors.clone() {
            let StatementKind::Formfactor { name, second, form } = &taken.statement.kind else {
                continue;
            };
            if !self.allowed(taken, &[2, 3], "a lattice of two or three dimensions") {
                continue;
            }
            let Some(new) = self.formfactor(taken, name, second.as_ref(), form) else {
                continue;
            };
            let same = read.iter().position(|(_, old)| says_the_same(old, &new));
            match same.and_then(|index| read.get_mut(index)) {
                None => read.push((taken, new)),
                Some((old, place)) if old.home.key() != taken.home.key() => {
                    *old = taken;
                    *place = new;
                }
                Some((old, _)) => {
                    let first = old.home.place(old.statement.span);
                    self.repeated_formfactor(taken, first);
                }
            }
        }
        self.crystal.potential.formfactors = read.into_iter().map(|(_, one)| one).collect();
    }

    fn repeated_formfactor(&mut self, taken: Taken<'w>, first: Place) {
        let kind = TroubleKind::Repeated {
            word: "formfactor".to_owned(),
        };
        let trouble = Trouble::new(kind, taken.home.place(taken.statement.span));
        self.evaluator
            .report(trouble.beside(first, "the first of this atom and Q"));
    }

    fn formfactor(
        &mut self,
        taken: Taken<'w>,
        name: &'w Word,
        second: Option<&'w Word>,
        form: &'w FormfactorForm,
    ) -> Option<Formfactor> {
        let context = self.context(taken);
        let mut known = self.atom_known(name, &context);
        if let Some(second) = second {
            known &= self.atom_known(second, &context);
        }
        let form = match form {
            FormfactorForm::At { q, energies } => self.shell(taken, q, energies, second.is_some()),
            FormfactorForm::Curve(expression) => self.curve(expression, &context),
        };
        let form = form.filter(|_| known)?;
        Some(Formfactor {
            place: taken.home.place(taken.statement.span),
            name: name.text.clone(),
            second: second.map(|word| word.text.clone()),
            form,
        })
    }

    fn atom_known(&mut self, word: &'w Word, context: &Context<'_, 'w>) -> bool {
        let place = context.place(word.span);
        let atoms = self.statements.atoms.clone();
        let names = atoms
            .iter()
            .filter_map(|taken| match &taken.statement.kind {
                StatementKind::Atom { name, .. } => Some((name, taken.home.place(name.span))),
                _ => None,
            });
        let names: Vec<(&Word, Place)> = names.collect();
        let found = names.iter().find(|(name, _)| name.text == word.text);
        let definition = found.map(|(_, place)| *place);
        self.evaluator
            .refer(place, &word.text, NameSort::Atom, definition);
        if definition.is_none() {
            let kind = TroubleKind::UnknownName {
                name: word.text.clone(),
                wanted: "atom",
                nearest: nearest(&word.text, names.iter().map(|(name, _)| name.text.as_str())),
            };
            self.evaluator.fail::<()>(kind, place);
        }
        definition.is_some()
    }

    fn shell(
        &mut self,
        taken: Taken<'w>,
        q: &'w Value,
        energies: &'w [Value],
        paired: bool,
    ) -> Option<FormfactorValues> {
        let context = self.context(taken);
        let shell = self.not_negative(q, Dimension::NUMBER, "|G|²", &context);
        let values: Vec<Option<Dual>> = energies
            .iter()
            .map(|value| {
                self.evaluator
                    .quantity_of(value, Dimension::ENERGY, &context)
            })
            .collect();
        let wanted = if paired { 2 } else { 1 };
        if values.len() != wanted {
            let what = match paired {
                true => "two atoms need two energies, the symmetric and the antisymmetric part",
                false => "one atom has one energy",
            };
            let place = taken.home.place(taken.statement.span);
            return self.evaluator.bad(place, what);
        }
        Some(FormfactorValues::At {
            q: shell?,
            energies: values.into_iter().collect::<Option<_>>()?,
        })
    }

    fn curve(
        &mut self,
        expression: &'w Expression,
        context: &Context<'_, 'w>,
    ) -> Option<FormfactorValues> {
        let inner = Context {
            variables: Variables::Magnitude,
            ..*context
        };
        let typed = self.evaluator.expression(expression, &inner)?;
        let typed = self
            .evaluator
            .settle(typed, expression, Some(Dimension::ENERGY), &inner)?;
        Some(FormfactorValues::Curve(Arc::new(
            typed.term.into_formula()?,
        )))
    }
}

fn says_the_same(old: &Formfactor, new: &Formfactor) -> bool {
    if old.name != new.name || old.second != new.second {
        return false;
    }
    match (&old.form, &new.form) {
        (FormfactorValues::At { q: a, .. }, FormfactorValues::At { q: b, .. }) => {
            (a.value - b.value).abs() < SAME_SHELL
        }
        (FormfactorValues::Curve(_), FormfactorValues::Curve(_)) => true,
        _ => false,
    }
}
