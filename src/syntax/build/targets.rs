//! Quantities of the bands and requirements on them.

use pest::iterators::Pair;

use super::{Builder, Built, Children, Failure};
use crate::syntax::grammar::Rule;
use crate::syntax::{BandQuantity, BandQuantityKind, Point, Relation, Requirement, Word};

impl Builder {
    pub(super) fn quantity(self, pair: Pair<'_, Rule>) -> Built<BandQuantity> {
        let span = self.span(&pair);
        let mut children = Children::of(pair);
        let kind = self.quantity_kind(children.any()?)?;
        let of = self.of_crystal(&mut children)?;
        Ok(BandQuantity { span, kind, of })
    }

    fn of_crystal(self, children: &mut Children<'_>) -> Built<Option<Word>> {
        match children.take_if(Rule::of_crystal) {
            Some(of) => {
                let mut inner = Children::of(of);
                inner.take(Rule::w_of)?;
                Ok(Some(self.word(&inner.take(Rule::name)?)))
            }
            None => Ok(None),
        }
    }

    fn quantity_kind(self, pair: Pair<'_, Rule>) -> Built<BandQuantityKind> {
        let rule = pair.as_rule();
        let mut children = Children::of(pair);
        let first = children.any()?;
        Ok(match rule {
            Rule::quantity_fermi => BandQuantityKind::Fermi,
            Rule::quantity_mass => {
                let end = children.any()?.as_rule();
                let band = self.integer(&children.take(Rule::count)?)?;
                match (first.as_rule(), end) {
                    (Rule::w_mass, Rule::w_bottom) => BandQuantityKind::MassBottom(band),
                    _ => BandQuantityKind::MassTop(band),
                }
            }
            _ => {
                let band = self.integer(&children.take(Rule::count)?)?;
                match rule {
                    Rule::quantity_gap => BandQuantityKind::Gap(band),
                    Rule::quantity_width => BandQuantityKind::Width(band),
                    Rule::quantity_bottom => BandQuantityKind::Bottom(band),
                    Rule::quantity_top => BandQuantityKind::Top(band),
                    Rule::quantity_level => {
                        children.take(Rule::w_at)?;
                        let at = self.point(children.any()?)?;
                        BandQuantityKind::Level { band, at }
                    }
                    Rule::quantity_hopping => {
                        children.take(Rule::w_by)?;
                        let by = self.index(children.take(Rule::index)?)?;
                        BandQuantityKind::Hopping { band, by }
                    }
                    _ => return Err(Failure::Broken),
                }
            }
        })
    }

    fn point(self, pair: Pair<'_, Rule>) -> Built<Point> {
        if pair.as_rule() == Rule::vector {
            self.tuple(pair).map(Point::Fractions)
        } else {
            Ok(Point::Named(self.word(&pair)))
        }
    }

    pub(super) fn requirement(self, children: &mut Children<'_>) -> Built<Requirement> {
        let first = children.any()?;
        match first.as_rule() {
            Rule::class => Ok(Requirement::Class(self.word(&first))),
            Rule::gap_is => self.gap_is(first),
            Rule::expression => Ok(Requirement::Compare {
                expression: self.expression(first)?,
                relation: self.relation(children.take(Rule::relation)?)?,
            }),
            _ => Err(Failure::Broken),
        }
    }

    fn gap_is(self, pair: Pair<'_, Rule>) -> Built<Requirement> {
        let mut children = Children::of(pair);
        let gap = children.take(Rule::quantity_gap)?;
        let mut span = self.span(&gap);
        let kind = self.quantity_kind(gap)?;
        let of = self.of_crystal(&mut children)?;
        if let Some(word) = &of {
            span = span.cover(word.span);
        }
        Ok(Requirement::GapIs {
            quantity: BandQuantity { span, kind, of },
            kind: self.word(&children.take(Rule::gap_kind)?),
        })
    }

    fn relation(self, pair: Pair<'_, Rule>) -> Built<Relation> {
        let mut children = Children::of(pair);
        let first = children.any()?.as_rule();
        let value = self.value(children.take(Rule::value)?)?;
        Ok(match first {
            Rule::at_least => Relation::AtLeast(value),
            Rule::at_most => Relation::AtMost(value),
            Rule::above => Relation::Above(value),
            Rule::below => Relation::Below(value),
            Rule::equals => {
                children.take(Rule::w_within)?;
                let within = self.value(children.take(Rule::value)?)?;
                Relation::Near { value, within }
            }
            Rule::w_between => {
                children.take(Rule::w_and)?;
                Relation::Between(value, self.value(children.take(Rule::value)?)?)
            }
            _ => return Err(Failure::Broken),
        })
    }
}
