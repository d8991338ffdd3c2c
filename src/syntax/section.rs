//! Reads one section: its logical lines, statements and problems.

use std::hash::Hasher;
use std::sync::Arc;

use pest::Parser;
use pest::error::{Error, ErrorVariant, InputLocation};
use rustc_hash::FxHasher;

use super::build::{self, Builder, Failure};
use super::grammar::{LineParser, Rule, line_rule};
use super::mentions::mentions;
use super::split::{SplitLine, is_blank, logical_lines, span};
use super::tokens::{
    Token, TokenKind, instead_of, is_name_start, stray_joiner, tokens, word_length,
};
use super::wording::{Stop, found};
use super::{Problem, ProblemKind, Section, SectionKind, Statement, StatementKind, words};
use crate::text::Span;

/// Deepest nesting of brackets.
const BRACKET_LIMIT: usize = 256;
/// Lines with more brackets and powers than this are read on a stack of their own, as deep ones need up to 1.5 MB.
const SHALLOW: usize = 24;
const STACK_FOR_DEEP: usize = 8 << 20;

/// A fast hash of a section's text.
pub(super) fn hash_text(text: &str) -> u64 {
    let mut hasher = FxHasher::default();
    hasher.write(text.as_bytes());
    hasher.finish()
}

/// Reads the text of one section.
pub(super) fn read_section(kind: SectionKind, text: &str, hash: u64) -> Section {
    let mut section = Section {
        kind,
        name: None,
        like: None,
        heading: Span::default(),
        text: Arc::from(text),
        hash,
        statements: Vec::new(),
        lines: Vec::new(),
        problems: Vec::new(),
        mentions: Vec::new(),
    };
    for (number, split) in logical_lines(text).into_iter().enumerate() {
        section.lines.push(split.line);
        let heading = number == 0 && kind != SectionKind::Preamble;
        if let Err(problem) = read_line(&mut section, text, &split, heading) {
            section.problems.push(problem);
        } else if let Some(problem) = leftover(text, &split) {
            section.problems.push(problem);
        }
    }
    section.mentions = mentions(&section);
    section
}

/// Reads one line into the section.
fn read_line(
    section: &mut Section,
    text: &str,
    split: &SplitLine,
    heading: bool,
) -> Result<(), Problem> {
    let place = split.line.content;
    let content = place.of(text);
    if heading {
        section.heading = place;
    }
    if content.is_empty() {
        return Ok(());
    }
    let line = LineText {
        content,
        offset: place.start as usize,
    };
    let (word, rule) = line.opening(section.kind, heading)?;
    if let Some(token) = stray_joiner(content) {
        return Err(stray(line.offset + token.start, token.text));
    }
    line.hold_bracket_limit()?;
    if content
        .bytes()
        .filter(|byte| matches!(byte, b'(' | b'^'))
        .count()
        > SHALLOW
    {
        return stacker::maybe_grow(STACK_FOR_DEEP, STACK_FOR_DEEP, || {
            read_statement(section, text, place, line, (word, rule), heading)
        });
    }
    read_statement(section, text, place, line, (word, rule), heading)
}

/// Reads what the grammar's rule for the line's first word makes of it.
fn read_statement(
    section: &mut Section,
    text: &str,
    place: Span,
    line: LineText<'_>,
    (word, rule): (&str, Rule),
    heading: bool,
) -> Result<(), Problem> {
    let content = line.content;
    let pairs = LineParser::parse(rule, content).map_err(|error| line.refused(word, &error))?;
    let pair = pairs.into_iter().next().ok_or_else(|| line.broken())?;
    let builder = Builder {
        offset: line.offset,
        quantities: matches!(rule, Rule::measure_line | Rule::require_line),
    };
    if heading {
        let (name, like) =
            build::heading(builder, pair).map_err(|failure| line.failed(text, failure))?;
        section.name = Some(name);
        section.like = like;
    } else {
        let kind: StatementKind =
            build::statement(builder, pair).map_err(|failure| line.failed(text, failure))?;
        section.statements.push(Statement {
            span: place,
            word: span(line.offset, line.offset + word.len()),
            kind,
        });
    }
    Ok(())
}

/// What a line that reads may still hold: a `\` that continues nothing, a control character in a string or comment.
fn leftover(text: &str, split: &SplitLine) -> Option<Problem> {
    if let Some(span) = split.dangling {
        return Some(Problem {
            span,
            kind: ProblemKind::DanglingContinuation,
        });
    }
    let line = split.line.span.of(text);
    let (offset, character) = control_character(line)?;
    let start = split.line.span.start as usize + offset;
    Some(stray(start, text.get(start..start + character.len_utf8())?))
}

/// The first control character of a line, its terminators and tabs aside.
fn control_character(line: &str) -> Option<(usize, char)> {
    let suspicious =
        |byte: &u8| (*byte < b' ' && !b"\t\n\r".contains(byte)) || matches!(*byte, 0x7f | 0xc2);
    if !line.as_bytes().iter().any(suspicious) {
        return None;
    }
    line.char_indices()
        .find(|(_, character)| character.is_control() && !matches!(character, '\t' | '\n' | '\r'))
}

fn stray(start: usize, token: &str) -> Problem {
    Problem {
        span: span(start, start + token.len()),
        kind: ProblemKind::StrayCharacter {
            character: token.chars().next().unwrap_or(char::REPLACEMENT_CHARACTER),
            instead: instead_of(token),
        },
    }
}

/// The content of a line and where it starts in its section.
#[derive(Clone, Copy)]
struct LineText<'t> {
    content: &'t str,
    offset: usize,
}

impl<'t> LineText<'t> {
    fn problem(self, start: usize, end: usize, kind: ProblemKind) -> Problem {
        Problem {
            span: span(self.offset + start, self.offset + end),
            kind,
        }
    }

    /// The first word, and the rule that reads what begins with it in this kind of section.
    fn opening(self, section: SectionKind, heading: bool) -> Result<(&'t str, Rule), Problem> {
        if !self.content.starts_with(is_name_start) {
            return Err(self.no_word());
        }
        let length = word_length(self.content);
        let word = self.content.get(..length).unwrap_or("");
        let unknown = || ProblemKind::UnknownStatement {
            word: build::normal(word),
        };
        let Some(rule) = line_rule(word) else {
            return Err(self.problem(0, length, unknown()));
        };
        let fits = words::statement(word).is_some_and(|entry| entry.sections.contains(&section));
        if heading || fits {
            return Ok((word, rule));
        }
        let misplaced = ProblemKind::Misplaced {
            word: word.to_owned(),
            found_in: section,
        };
        Err(self.problem(0, length, misplaced))
    }

    fn no_word(self) -> Problem {
        let Some(token) = tokens(self.content).next() else {
            return self.broken();
        };
        if token.kind == TokenKind::Stray {
            return stray(self.offset + token.start, token.text);
        }
        let kind = ProblemKind::Unreadable {
            expected: "a statement's word such as `layer` or `let`".to_owned(),
            found: found(Some(token)),
        };
        self.problem(token.start, token.end(), kind)
    }

    /// Nesting is bounded before the grammar, which recurses on it, sees the line.
    fn hold_bracket_limit(self) -> Result<(), Problem> {
        if self.content.len() <= BRACKET_LIMIT {
            return Ok(());
        }
        let mut depth = 0_usize;
        for token in tokens(self.content) {
            match token.text {
                "(" => depth += 1,
                ")" => depth = depth.saturating_sub(1),
                _ => {}
            }
            if depth > BRACKET_LIMIT {
                return Err(self.problem(token.start, token.end(), ProblemKind::TooDeep));
            }
        }
        Ok(())
    }

    /// The problem of a line that the grammar refuses.
    fn refused(self, statement: &str, error: &Error<Rule>) -> Problem {
        let stop = match error.location {
            InputLocation::Pos(position) | InputLocation::Span((position, _)) => position,
        };
        let tried = match &error.variant {
            ErrorVariant::ParsingError { positives, .. } => positives.as_slice(),
            // The parser's own guard of the thread's stack.
            ErrorVariant::CustomError { .. } => {
                return self.problem(0, self.content.len(), ProblemKind::TooDeep);
            }
        };
        let mut before = Vec::new();
        let mut offending = None;
        for token in tokens(self.content) {
            if token.kind == TokenKind::Stray && token.start <= stop {
                return stray(self.offset + token.start, token.text);
            }
            if token.end() > stop {
                offending = Some(self.unquoted(token, tried));
                break;
            }
            before.push(token);
        }
        self.unreadable(
            offending,
            &Stop {
                statement,
                before: &before,
                token: offending,
                tried,
            },
        )
    }

    /// Where a text in quotes should stand, all that stands there up to the next blank is one token: a path without its quotes.
    fn unquoted(self, token: Token<'t>, tried: &[Rule]) -> Token<'t> {
        if tried != [Rule::string] || token.kind != TokenKind::Word {
            return token;
        }
        let rest = self.content.get(token.start..).unwrap_or("");
        let length = rest.find(is_blank).unwrap_or(rest.len());
        Token {
            text: rest.get(..length).unwrap_or(token.text),
            ..token
        }
    }

    fn unreadable(self, offending: Option<Token<'_>>, stop: &Stop<'_>) -> Problem {
        let (start, end) = match offending {
            Some(token) => (token.start, token.end()),
            None => self.last_character(),
        };
        let kind = ProblemKind::Unreadable {
            expected: stop.expected(),
            found: found(offending),
        };
        self.problem(start, end, kind)
    }

    fn last_character(self) -> (usize, usize) {
        let last = self.content.char_indices().next_back();
        (last.map_or(0, |(start, _)| start), self.content.len())
    }

    /// The problem of a line that the grammar accepts and the builder does not.
    fn failed(self, text: &str, failure: Failure) -> Problem {
        match failure {
            Failure::TooDeep(span) => Problem {
                span,
                kind: ProblemKind::TooDeep,
            },
            Failure::QuantityOutsideTarget(span) => Problem {
                span,
                kind: ProblemKind::Unreadable {
                    expected: "a value without bands (they stand in `measure` and `require`)"
                        .to_owned(),
                    found: format!("`{}`", span.of(text)),
                },
            },
            Failure::Broken => self.broken(),
        }
    }

    fn broken(self) -> Problem {
        let kind = ProblemKind::Unreadable {
            expected: "a statement".to_owned(),
            found: "something else".to_owned(),
        };
        self.problem(0, self.content.len(), kind)
    }
}
