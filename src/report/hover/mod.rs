//! What an editor shows beside the pointer. Neutral: bytes and text, no protocol.
//!
//! *Invariant*: every number here comes from the analysis given, so it belongs to
//! its text; where the bands are not known yet, no number of theirs is shown.

mod card;
mod crystal;
mod material;
mod number;
mod target;
mod term;
mod wave;

use std::path::Path;

use super::analysis::{Analysis, FileAnalysis, SectionAnalysis};
use super::analyst::Analyst;
use super::locate::Locator;
use super::units::Trade;
use crate::bands::Solution;
use crate::model::{Crystal, NameSort, Place, Reference};
use crate::rules::Tier;
use crate::syntax::{Entry, SectionKind, Statement, StatementKind};
use crate::text::Span;
use card::Card;
pub use crystal::monolayers;

/// A hover.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Hover {
    /// What it is about, in absolute bytes of the file.
    pub span: Span,
    /// The text as Markdown.
    pub markdown: String,
    /// The same as plain text.
    pub plain: String,
}

/// What is to be said at a byte of a file, if anything.
#[must_use]
pub fn hover(analyst: &Analyst, analysis: &Analysis, path: &Path, offset: u32) -> Option<Hover> {
    let file = analysis.file(path)?;
    let (entry, section) = file.section_at(offset)?;
    let view = View {
        analyst,
        analysis,
        file,
        entry,
        section,
        locator: Locator::new(analysis),
        at: offset.checked_sub(entry.start)?,
    };
    let (span, card) = view.card()?;
    Some(Hover {
        span: span.shifted(entry.start),
        markdown: card.markdown(),
        plain: card.plain(),
    })
}

/// Whether more is to be said at a byte of a file once its bands are fully known: everywhere in a crystal but on its
/// heading, which tells first values with their error bounds.
#[must_use]
pub fn waits(analysis: &Analysis, path: &Path, offset: u32) -> bool {
    let found = analysis.file(path).and_then(|file| file.section_at(offset));
    found.is_some_and(|(entry, section)| {
        let on_heading = entry.section.heading.touches(offset - entry.start);
        section.crystal.is_some() && !section.settled(Tier::Bands) && !on_heading
    })
}

/// One place in one section, with all that is known of it.
struct View<'a> {
    analyst: &'a Analyst,
    analysis: &'a Analysis,
    file: &'a FileAnalysis,
    entry: &'a Entry,
    section: &'a SectionAnalysis,
    locator: Locator<'a>,
    /// Bytes from the section's first.
    at: u32,
}

type Found = Option<(Span, Card)>;

impl<'a> View<'a> {
    fn card(&self) -> Found {
        let heading = self.entry.section.heading;
        if !heading.is_empty() && heading.touches(self.at) {
            return self.named().or_else(|| self.heading());
        }
        let mut statements = self.entry.section.statements.iter();
        let statement = statements.find(|statement| statement.span.touches(self.at))?;
        self.in_statement(statement)
    }

    fn heading(&self) -> Found {
        let section = &self.entry.section;
        let name = section.name.as_ref()?;
        let span = Span::new(section.heading.start, name.span.end);
        let card = match section.kind {
            SectionKind::Crystal => crystal::card(self)?,
            SectionKind::Material => material::card(self, self.file.file, self.entry.id)?,
            SectionKind::Preamble => return None,
        };
        Some((span, card))
    }

    fn in_statement(&self, statement: &Statement) -> Found {
        if let StatementKind::Waive { rule, .. } = &statement.kind {
            if rule.span.touches(self.at) {
                return term::rule(&rule.text).map(|card| (rule.span, card));
            }
        }
        if let Some(named) = self.named() {
            return Some(named);
        }
        if matches!(statement.kind, StatementKind::Require(_)) {
            if let Some(card) = target::required(self, statement) {
                return Some((statement.span, card));
            }
        }
        if statement.word.touches(self.at) {
            return self.statement(statement);
        }
        number::card(self)
            .or_else(|| self.term())
            .or_else(|| self.statement(statement))
    }

    /// What a statement does, and what came of this one.
    fn statement(&self, statement: &Statement) -> Found {
        let card = match &statement.kind {
            StatementKind::Layer(_) | StatementKind::Stack { .. } => {
                crystal::layer(self, statement)
            }
            StatementKind::Wave { .. } => wave::card(self, statement),
            StatementKind::Recoil(_) => crystal::recoil(self),
            StatementKind::Measure { .. } => target::measured(self, statement),
            StatementKind::Temperature(_) => crystal::temperature(self),
            _ => None,
        };
        let word = statement.word.of(&self.entry.section.text);
        let mut card = card.or_else(|| term::statement(word))?;
        if self.entry.section.kind == SectionKind::Material {
            number::field(self, word, &mut card);
        }
        Some((statement.span, card))
    }

    /// A name that is used here.
    fn named(&self) -> Found {
        let reference = self.reference()?;
        let span = reference.place.span;
        let definition = reference.definition;
        let card = match reference.sort {
            NameSort::Material => {
                definition.and_then(|at| material::card(self, at.file, at.section))
            }
            NameSort::Crystal => definition.and_then(|at| crystal::other(self, at)),
            NameSort::Value | NameSort::Measure => number::named(self, reference),
            NameSort::Atom | NameSort::File => None,
        };
        card.map(|card| (span, card))
    }

    fn reference(&self) -> Option<&'a Reference> {
        let here = self.section.references.iter();
        here.filter(|reference| self.holds(&reference.place))
            .filter(|reference| reference.place.span.touches(self.at))
            .min_by_key(|reference| reference.place.span.len())
    }

    /// A unit or constant.
    fn term(&self) -> Found {
        let (span, word) = self.word()?;
        term::unit(self, word)
            .or_else(|| term::constant(word))
            .map(|card| (span, card))
    }

    /// The word that the place touches.
    fn word(&self) -> Option<(Span, &'a str)> {
        let text: &'a str = &self.entry.section.text;
        let at = self.at as usize;
        let part =
            |character: &char| character.is_alphabetic() || *character == '_' || *character == '%';
        let before = text
            .get(..at)?
            .chars()
            .rev()
            .take_while(part)
            .map(char::len_utf8)
            .sum::<usize>();
        let after = text
            .get(at..)?
            .chars()
            .take_while(part)
            .map(char::len_utf8)
            .sum::<usize>();
        let word = text.get(at - before..at + after)?;
        let span = Span::new(
            u32::try_from(at - before).ok()?,
            u32::try_from(at + after).ok()?,
        );
        (!word.is_empty()).then_some((span, word))
    }

    fn holds(&self, place: &Place) -> bool {
        place.file == self.file.file && place.section == self.entry.id
    }

    fn crystal(&self) -> Option<&'a Crystal> {
        self.section.crystal.as_deref()
    }

    fn solution(&self) -> Option<&'a Solution> {
        self.section.solution()
    }

    fn trade(&self) -> Trade {
        self.crystal().map(Trade::of).unwrap_or_default()
    }
}
