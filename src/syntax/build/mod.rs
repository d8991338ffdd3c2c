//! From the pairs of one logical line to its statement.
//!
//! All places that come out count from the section's first byte. The grammar
//! promises the order of the pairs; where a promise does not hold, building
//! gives [`Failure::Broken`] instead of a panic.

mod expressions;
mod parts;
mod statements;
mod targets;

use pest::iterators::{Pair, Pairs};
use unicode_normalization::{UnicodeNormalization, is_nfc};

use crate::syntax::grammar::{Rule, extent};
use crate::syntax::split::span;
use crate::syntax::{Integer, Quoted, Word};
use crate::text::Span;

pub(super) use statements::{heading, statement};

/// Why a line that the grammar accepts gives no statement.
#[derive(Clone, Debug, PartialEq)]
pub(super) enum Failure {
    /// A quantity of the bands outside `measure` and `require`.
    QuantityOutsideTarget(Span),
    /// Operators nested past the limit.
    TooDeep(Span),
    /// The pairs are not those of the grammar.
    Broken,
}

/// What building gives.
pub(super) type Built<T> = Result<T, Failure>;

/// What the builders of one line share.
#[derive(Clone, Copy)]
pub(super) struct Builder {
    /// Where the line's content starts in its section.
    pub(super) offset: usize,
    /// Whether quantities of the bands may stand in its expressions.
    pub(super) quantities: bool,
}

impl Builder {
    /// The place of a pair in its section.
    fn span(self, pair: &Pair<'_, Rule>) -> Span {
        let (start, end) = extent(pair);
        self.place(start, end)
    }

    fn place(self, start: usize, end: usize) -> Span {
        span(self.offset + start, self.offset + end)
    }

    fn word(self, pair: &Pair<'_, Rule>) -> Word {
        Word {
            text: normal(pair.as_str()),
            span: self.span(pair),
        }
    }

    fn quoted(self, pair: &Pair<'_, Rule>) -> Quoted {
        Quoted {
            text: pair.as_str().trim_matches('"').to_owned(),
            span: self.span(pair),
        }
    }

    fn integer(self, pair: &Pair<'_, Rule>) -> Built<Integer> {
        let value = plain_digits(pair.as_str())
            .parse()
            .map_err(|_| Failure::Broken)?;
        Ok(Integer {
            value,
            span: self.span(pair),
        })
    }
}

/// A word in NFC.
pub(super) fn normal(word: &str) -> String {
    if word.is_ascii() || is_nfc(word) {
        word.to_owned()
    } else {
        word.nfc().collect()
    }
}

/// Digits with the typographic minus as the plain one.
fn plain_digits(digits: &str) -> String {
    digits.replace('−', "-")
}

/// The pairs inside a pair, taken one after another.
struct Children<'t> {
    pairs: Pairs<'t, Rule>,
}

impl<'t> Children<'t> {
    fn of(pair: Pair<'t, Rule>) -> Self {
        Self {
            pairs: pair.into_inner(),
        }
    }

    /// The next pair, whatever it is.
    fn any(&mut self) -> Built<Pair<'t, Rule>> {
        self.pairs.next().ok_or(Failure::Broken)
    }

    /// The next pair if it is of `rule`.
    fn take_if(&mut self, rule: Rule) -> Option<Pair<'t, Rule>> {
        let next = self.pairs.peek()?;
        if next.as_rule() == rule {
            self.pairs.next()
        } else {
            None
        }
    }

    /// The next pair, which must be of `rule`.
    fn take(&mut self, rule: Rule) -> Built<Pair<'t, Rule>> {
        self.take_if(rule).ok_or(Failure::Broken)
    }
}
