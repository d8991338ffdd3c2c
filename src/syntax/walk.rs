//! Walks over the values, expressions and words of a statement.

use super::{
    BandQuantity, BandQuantityKind, Expression, ExpressionKind, FormfactorForm, LatticeForm,
    LayerContent, LayerPart, Point, Position, Relation, Requirement, Shape, Statement,
    StatementKind, UnitUse, Value, Word,
};
use crate::text::Span;

impl Statement {
    /// Every value of the statement, in the order of the text; those inside a `level N at (…)` are
    /// not among them, as they belong to an expression.
    pub fn values<'t>(&'t self, f: &mut dyn FnMut(&'t Value)) {
        let mut part = |part: Part<'t>| {
            if let Part::Value(value) = part {
                f(value);
            }
        };
        parts(&self.kind, &mut part);
    }

    /// Every outermost expression of the statement, in the order of the text: a value's nominal part
    /// and its tolerance, and those that stand without a tolerance. [`Expression::walk`] goes inside.
    pub fn expressions<'t>(&'t self, f: &mut dyn FnMut(&'t Expression)) {
        let mut part = |part: Part<'t>| match part {
            Part::Expression(expression) => f(expression),
            Part::Value(value) => value.expressions(f),
        };
        parts(&self.kind, &mut part);
    }

    /// Every expression of the statement at every depth, an operator before its sides.
    pub fn walk<'t>(&'t self, f: &mut dyn FnMut(&'t Expression)) {
        self.expressions(&mut |expression| expression.walk(f));
    }

    /// Every word that stands for a value: a name, a constant, a position variable or a unit alone.
    pub fn names<'t>(&'t self, f: &mut dyn FnMut(&'t str, Span)) {
        self.walk(&mut |expression| {
            if let ExpressionKind::Name(name) = &expression.kind {
                f(name, expression.span);
            }
        });
    }

    /// Every unit written after a number.
    pub fn units<'t>(&'t self, f: &mut dyn FnMut(&'t UnitUse)) {
        self.walk(&mut |expression| {
            if let ExpressionKind::Number {
                unit: Some(unit), ..
            } = &expression.kind
            {
                f(unit);
            }
        });
    }

    /// Every quantity of the bands, that of `require gap N direct` among them.
    pub fn quantities<'t>(&'t self, f: &mut dyn FnMut(&'t BandQuantity)) {
        if let StatementKind::Require(Requirement::GapIs { quantity, .. }) = &self.kind {
            f(quantity);
        }
        self.walk(&mut |expression| {
            if let ExpressionKind::Quantity(quantity) = &expression.kind {
                f(quantity);
            }
        });
    }

    /// Every material that a layer is made of.
    pub fn materials<'t>(&'t self, f: &mut dyn FnMut(&'t Word)) {
        let layers = match &self.kind {
            StatementKind::Layer(part) => std::slice::from_ref(part),
            StatementKind::Stack { parts, .. } => parts.as_slice(),
            _ => &[],
        };
        for layer in layers {
            if let LayerContent::Of { from, to } = &layer.content {
                f(from);
                to.iter().for_each(&mut *f);
            }
        }
    }

    /// Every crystal that a quantity speaks of.
    pub fn crystals<'t>(&'t self, f: &mut dyn FnMut(&'t Word)) {
        self.quantities(&mut |quantity| {
            if let Some(crystal) = &quantity.of {
                f(crystal);
            }
        });
    }
}

impl Value {
    /// The nominal expression, then the tolerance, where there is one.
    pub fn expressions<'t>(&'t self, f: &mut dyn FnMut(&'t Expression)) {
        f(&self.expression);
        if let Some(tolerance) = &self.tolerance {
            f(tolerance);
        }
    }

    /// Every expression of the value at every depth.
    pub fn walk<'t>(&'t self, f: &mut dyn FnMut(&'t Expression)) {
        self.expressions(&mut |expression| expression.walk(f));
    }
}

impl Expression {
    /// The expression itself, then all inside it, from left to right.
    pub fn walk<'t>(&'t self, f: &mut dyn FnMut(&'t Expression)) {
        f(self);
        match &self.kind {
            ExpressionKind::Number { .. } | ExpressionKind::Name(_) => {}
            ExpressionKind::Negative(inner) => inner.walk(f),
            ExpressionKind::Binary { left, right, .. } => {
                left.walk(f);
                right.walk(f);
            }
            ExpressionKind::Call { arguments, .. } => {
                for argument in arguments {
                    argument.walk(f);
                }
            }
            ExpressionKind::Quantity(quantity) => {
                if let BandQuantityKind::Level {
                    at: Point::Fractions(position),
                    ..
                } = &quantity.kind
                {
                    for value in &position.entries {
                        value.walk(f);
                    }
                }
            }
        }
    }

    /// The smallest expression whose text a byte of its section touches.
    #[must_use]
    pub fn at(&self, byte: u32) -> Option<&Expression> {
        let mut best = None;
        self.walk(&mut |expression| {
            if expression.span.touches(byte) {
                best = Some(expression);
            }
        });
        best
    }
}

/// A part of a statement that holds expressions.
enum Part<'t> {
    Value(&'t Value),
    Expression(&'t Expression),
}

type Visit<'f, 't> = &'f mut dyn FnMut(Part<'t>);

fn values<'t>(visit: Visit<'_, 't>, values: impl IntoIterator<Item = &'t Value>) {
    for value in values {
        visit(Part::Value(value));
    }
}

fn parts<'t>(kind: &'t StatementKind, visit: Visit<'_, 't>) {
    match kind {
        StatementKind::Use(_)
        | StatementKind::Waive { .. }
        | StatementKind::Source(_)
        | StatementKind::Title(_)
        | StatementKind::Degeneracy(_)
        | StatementKind::Carriers { .. }
        | StatementKind::Bands(_) => {}
        StatementKind::Let { value, .. }
        | StatementKind::Mass(value)
        | StatementKind::Edge(value)
        | StatementKind::Monolayer(value)
        | StatementKind::Nonparabolic(value)
        | StatementKind::Rate(value)
        | StatementKind::Filling(value)
        | StatementKind::Temperature(value)
        | StatementKind::Recoil(value) => visit(Part::Value(value)),
        StatementKind::Measure { expression, .. } => visit(Part::Expression(expression)),
        StatementKind::Require(requirement) => requirement_parts(requirement, visit),
        _ => potential_parts(kind, visit),
    }
}

fn potential_parts<'t>(kind: &'t StatementKind, visit: Visit<'_, 't>) {
    match kind {
        StatementKind::Lattice(form) => lattice_parts(form, visit),
        StatementKind::Layer(part) => layer_parts(part, visit),
        StatementKind::Stack { parts, .. } => {
            for part in parts {
                layer_parts(part, visit);
            }
        }
        StatementKind::Delta { strength, at } => {
            values(visit, [strength]);
            values(visit, &at.entries);
        }
        StatementKind::Profile { range, expression } => {
            values(visit, range.iter().flat_map(|(from, to)| [from, to]));
            visit(Part::Expression(expression));
        }
        StatementKind::Table {
            position_unit,
            energy_unit,
            ..
        } => {
            visit(Part::Expression(position_unit));
            visit(Part::Expression(energy_unit));
        }
        StatementKind::Wave { energy, phase, .. } => {
            values(visit, std::iter::once(energy).chain(phase));
        }
        StatementKind::Site { shape, energy, at } => {
            values(visit, [energy]);
            values(visit, shape.sizes());
            values(visit, &at.entries);
        }
        StatementKind::Atom { at, .. } => values(visit, &at.entries),
        StatementKind::Formfactor { form, .. } => match form {
            FormfactorForm::At { q, energies } => {
                values(visit, std::iter::once(q).chain(energies));
            }
            FormfactorForm::Curve(expression) => visit(Part::Expression(expression)),
        },
        _ => {}
    }
}

fn lattice_parts<'t>(form: &'t LatticeForm, visit: Visit<'_, 't>) {
    values(visit, &form.lengths);
    values(visit, &form.axis);
    values(visit, &form.angles);
    values(visit, form.vectors.iter().flat_map(Position::values));
}

fn layer_parts<'t>(part: &'t LayerPart, visit: Visit<'_, 't>) {
    values(visit, [&part.length]);
    if let LayerContent::At { from, to, mass } = &part.content {
        values(visit, std::iter::once(from).chain(to).chain(mass));
    }
}

fn requirement_parts<'t>(requirement: &'t Requirement, visit: Visit<'_, 't>) {
    let Requirement::Compare {
        expression,
        relation,
    } = requirement
    else {
        return;
    };
    visit(Part::Expression(expression));
    values(visit, relation.values());
}

impl Position {
    /// Its entries, one after another.
    pub fn values(&self) -> impl Iterator<Item = &Value> {
        self.entries.iter()
    }
}

impl Shape {
    /// Its sizes, in the order of the text.
    #[must_use]
    pub fn sizes(&self) -> &[Value] {
        match self {
            Shape::Gaussian { sigma } => std::slice::from_ref(sigma),
            Shape::Sech2 { width } | Shape::Lorentzian { width } => std::slice::from_ref(width),
            Shape::Box { sizes } => sizes,
            Shape::Disk { radius } | Shape::Sphere { radius } => std::slice::from_ref(radius),
        }
    }
}

impl Relation {
    /// Its limits, in the order of the text.
    pub fn values(&self) -> impl Iterator<Item = &Value> {
        let (first, second) = match self {
            Relation::AtLeast(value)
            | Relation::AtMost(value)
            | Relation::Above(value)
            | Relation::Below(value) => (value, None),
            Relation::Near { value, within } => (value, Some(within)),
            Relation::Between(low, high) => (low, Some(high)),
        };
        std::iter::once(first).chain(second)
    }
}
