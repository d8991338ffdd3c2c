//! Whole statements and headings.

use pest::iterators::Pair;

use super::{Builder, Built, Children, Failure};
use crate::syntax::grammar::Rule;
use crate::syntax::{StatementKind, Word};

/// The name and the `like` of a heading.
pub(in crate::syntax) fn heading(
    builder: Builder,
    line: Pair<'_, Rule>,
) -> Built<(Word, Option<Word>)> {
    let mut children = Children::of(line);
    children.any()?;
    let name = builder.word(&children.take(Rule::name)?);
    let like = match children.take_if(Rule::w_like) {
        Some(_) => Some(builder.word(&children.take(Rule::name)?)),
        None => None,
    };
    Ok((name, like))
}

/// What a line says.
pub(in crate::syntax) fn statement(builder: Builder, line: Pair<'_, Rule>) -> Built<StatementKind> {
    let rule = line.as_rule();
    let mut children = Children::of(line);
    let word = children.any()?.as_rule();
    let children = &mut children;
    match rule {
        Rule::use_line => Ok(StatementKind::Use(builder.quoted(&children.any()?))),
        Rule::let_line => builder.let_statement(children),
        Rule::waive_line => builder.waive(children),
        Rule::value_line => builder.value_statement(word, children),
        Rule::text_line => {
            let text = builder.quoted(&children.take(Rule::string)?);
            Ok(match word {
                Rule::w_source => StatementKind::Source(text),
                _ => StatementKind::Title(text),
            })
        }
        Rule::count_line => {
            let count = builder.integer(&children.take(Rule::count)?)?;
            Ok(match word {
                Rule::w_degeneracy => StatementKind::Degeneracy(count),
                _ => StatementKind::Bands(count),
            })
        }
        Rule::carriers_line => Ok(StatementKind::Carriers {
            word: builder.word(&children.take(Rule::carrier)?),
        }),
        Rule::lattice_line => builder
            .lattice(children.take(Rule::lattice_form)?)
            .map(StatementKind::Lattice),
        Rule::measure_line => {
            let name = builder.word(&children.take(Rule::name)?);
            children.take(Rule::equals)?;
            let expression = builder.expression(children.take(Rule::expression)?)?;
            Ok(StatementKind::Measure { name, expression })
        }
        Rule::require_line => builder.requirement(children).map(StatementKind::Require),
        Rule::wave_line => builder.wave(word, children),
        Rule::site_line => builder.site(children),
        Rule::formfactor_line => builder.formfactor(children),
        Rule::atom_line => {
            let name = builder.word(&children.take(Rule::name)?);
            children.take(Rule::w_at)?;
            let at = builder.position(children.take(Rule::position)?)?;
            Ok(StatementKind::Atom { name, at })
        }
        _ => builder.one_dimensional(rule, children),
    }
}

impl Builder {
    fn let_statement(self, children: &mut Children<'_>) -> Built<StatementKind> {
        let name = self.word(&children.take(Rule::name)?);
        children.take(Rule::equals)?;
        let value = self.next_value(children)?;
        Ok(StatementKind::Let { name, value })
    }

    fn waive(self, children: &mut Children<'_>) -> Built<StatementKind> {
        let rule = self.word(&children.take(Rule::rule_name)?);
        let reason = match children.take_if(Rule::w_because) {
            Some(_) => Some(self.quoted(&children.take(Rule::string)?)),
            None => None,
        };
        Ok(StatementKind::Waive { rule, reason })
    }

    fn value_statement(self, word: Rule, children: &mut Children<'_>) -> Built<StatementKind> {
        let value = self.next_value(children)?;
        Ok(match word {
            Rule::w_mass => StatementKind::Mass(value),
            Rule::w_edge => StatementKind::Edge(value),
            Rule::w_monolayer => StatementKind::Monolayer(value),
            Rule::w_nonparabolic => StatementKind::Nonparabolic(value),
            Rule::w_rate => StatementKind::Rate(value),
            Rule::w_filling => StatementKind::Filling(value),
            Rule::w_temperature => StatementKind::Temperature(value),
            Rule::w_recoil => StatementKind::Recoil(value),
            _ => return Err(Failure::Broken),
        })
    }

    fn one_dimensional(self, rule: Rule, children: &mut Children<'_>) -> Built<StatementKind> {
        match rule {
            Rule::layer_line => self
                .layer(children.take(Rule::layer_part)?)
                .map(StatementKind::Layer),
            Rule::stack_line => {
                let times = self.integer(&children.take(Rule::count)?)?;
                let mut parts = Vec::new();
                for pair in &mut children.pairs {
                    if pair.as_rule() == Rule::layer_part {
                        parts.push(self.layer(pair)?);
                    }
                }
                Ok(StatementKind::Stack { times, parts })
            }
            Rule::delta_line => {
                let strength = self.next_value(children)?;
                children.take(Rule::w_at)?;
                let at = self.position(children.take(Rule::position)?)?;
                Ok(StatementKind::Delta { strength, at })
            }
            Rule::profile_line => self.profile(children),
            Rule::table_line => self.table(children),
            _ => Err(Failure::Broken),
        }
    }

    fn profile(self, children: &mut Children<'_>) -> Built<StatementKind> {
        let range = match children.take_if(Rule::profile_range) {
            Some(range) => {
                let mut inner = Children::of(range);
                let from = self.next_value(&mut inner)?;
                inner.take(Rule::w_to)?;
                Some((from, self.next_value(&mut inner)?))
            }
            None => None,
        };
        children.take(Rule::equals)?;
        let expression = self.expression(children.take(Rule::expression)?)?;
        Ok(StatementKind::Profile { range, expression })
    }

    fn table(self, children: &mut Children<'_>) -> Built<StatementKind> {
        let file = self.quoted(&children.take(Rule::string)?);
        children.take(Rule::w_in)?;
        let position_unit = self.expression(children.take(Rule::expression)?)?;
        children.take(Rule::comma)?;
        let energy_unit = self.expression(children.take(Rule::expression)?)?;
        let by = match children.take_if(Rule::w_by) {
            Some(_) => Some(self.word(&children.take(Rule::interpolation)?)),
            None => None,
        };
        Ok(StatementKind::Table {
            file,
            position_unit,
            energy_unit,
            by,
        })
    }
}
