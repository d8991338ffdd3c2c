//! Parts of the larger statements: lattices, layers, sites, form factors.

use pest::iterators::Pair;

use super::{Builder, Built, Children, Failure};
use crate::syntax::grammar::Rule;
use crate::syntax::{
    FormfactorForm, LatticeForm, LayerContent, LayerPart, Shape, StatementKind, Value, WaveKind,
};

impl Builder {
    /// The value that must come next.
    pub(super) fn next_value(self, children: &mut Children<'_>) -> Built<Value> {
        self.value(children.take(Rule::value)?)
    }

    /// The value after a word, where that word comes next.
    pub(super) fn value_after(
        self,
        children: &mut Children<'_>,
        word: Rule,
    ) -> Built<Option<Value>> {
        match children.take_if(word) {
            Some(_) => self.next_value(children).map(Some),
            None => Ok(None),
        }
    }

    pub(super) fn lattice(self, pair: Pair<'_, Rule>) -> Built<LatticeForm> {
        let mut children = Children::of(pair);
        let mut form = LatticeForm {
            kind: self.word(&children.any()?),
            lengths: Vec::new(),
            axis: None,
            angles: Vec::new(),
            vectors: Vec::new(),
        };
        let mut behind = Rule::w_by;
        for pair in children.pairs {
            match (pair.as_rule(), behind) {
                (Rule::value, Rule::w_axis) => form.axis = Some(self.value(pair)?),
                (Rule::value, Rule::w_angle | Rule::w_angles) => {
                    form.angles.push(self.value(pair)?)
                }
                (Rule::value, _) => form.lengths.push(self.value(pair)?),
                (Rule::vector, _) => form.vectors.push(self.tuple(pair)?),
                (Rule::comma, _) => {}
                (word, _) => behind = word,
            }
        }
        Ok(form)
    }

    pub(super) fn layer(self, pair: Pair<'_, Rule>) -> Built<LayerPart> {
        let span = self.span(&pair);
        let mut children = Children::of(pair);
        let length = self.next_value(&mut children)?;
        let content = children.any()?;
        let rule = content.as_rule();
        let mut inner = Children::of(content);
        inner.any()?;
        let content = if rule == Rule::layer_of {
            let from = self.word(&inner.take(Rule::name)?);
            let to = match inner.take_if(Rule::w_to) {
                Some(_) => Some(self.word(&inner.take(Rule::name)?)),
                None => None,
            };
            LayerContent::Of { from, to }
        } else {
            LayerContent::At {
                from: self.next_value(&mut inner)?,
                to: self.value_after(&mut inner, Rule::w_to)?,
                mass: self.value_after(&mut inner, Rule::w_mass)?,
            }
        };
        Ok(LayerPart {
            span,
            length,
            content,
        })
    }

    pub(super) fn wave(self, word: Rule, children: &mut Children<'_>) -> Built<StatementKind> {
        let kind = match word {
            Rule::w_cosine => WaveKind::Cosine,
            Rule::w_depth => WaveKind::Depth,
            Rule::w_fourier => WaveKind::Fourier,
            _ => return Err(Failure::Broken),
        };
        let star = children.take_if(Rule::w_star).map(|star| self.span(&star));
        let index = self.index(children.take(Rule::index)?)?;
        children.take(Rule::equals)?;
        Ok(StatementKind::Wave {
            kind,
            star,
            index,
            energy: self.next_value(children)?,
            phase: self.value_after(children, Rule::w_phase)?,
        })
    }

    pub(super) fn site(self, children: &mut Children<'_>) -> Built<StatementKind> {
        let shape = children.any()?;
        let rule = shape.as_rule();
        let mut inner = Children::of(shape);
        inner.any()?;
        let energy = self.next_value(&mut inner)?;
        inner.any()?;
        let size = self.next_value(&mut inner)?;
        let shape = match rule {
            Rule::gaussian => Shape::Gaussian { sigma: size },
            Rule::sech2 => Shape::Sech2 { width: size },
            Rule::lorentzian => Shape::Lorentzian { width: size },
            Rule::disk => Shape::Disk { radius: size },
            Rule::sphere => Shape::Sphere { radius: size },
            Rule::box_site => {
                let mut sizes = vec![size];
                while let Some(more) = self.value_after(&mut inner, Rule::w_by)? {
                    sizes.push(more);
                }
                Shape::Box { sizes }
            }
            _ => return Err(Failure::Broken),
        };
        children.take(Rule::w_at)?;
        let at = self.position(children.take(Rule::position)?)?;
        Ok(StatementKind::Site { shape, energy, at })
    }

    pub(super) fn formfactor(self, children: &mut Children<'_>) -> Built<StatementKind> {
        let name = self.word(&children.take(Rule::name)?);
        let form = children.any()?;
        let rule = form.as_rule();
        let mut inner = Children::of(form);
        let mut second = None;
        let form = match rule {
            Rule::formfactor_curve => {
                inner.take(Rule::w_curve)?;
                inner.take(Rule::equals)?;
                FormfactorForm::Curve(self.expression(inner.take(Rule::expression)?)?)
            }
            Rule::formfactor_one => {
                let q = self.next_value(&mut inner)?;
                inner.take(Rule::equals)?;
                let energies = vec![self.next_value(&mut inner)?];
                FormfactorForm::At { q, energies }
            }
            Rule::formfactor_pair => {
                inner.take(Rule::w_and)?;
                second = Some(self.word(&inner.take(Rule::name)?));
                let q = self.next_value(&mut inner)?;
                inner.take(Rule::equals)?;
                let symmetric = self.next_value(&mut inner)?;
                inner.take(Rule::comma)?;
                let energies = vec![symmetric, self.next_value(&mut inner)?];
                FormfactorForm::At { q, energies }
            }
            _ => return Err(Failure::Broken),
        };
        Ok(StatementKind::Formfactor { name, second, form })
    }
}
