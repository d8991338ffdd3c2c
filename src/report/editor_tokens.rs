//! What each word of a text is, for colouring.
//!
//! Lines that do not read are coloured too, as far as their words tell.

use std::collections::HashMap;

use unicode_ident::{is_xid_continue, is_xid_start};

use crate::syntax::{
    Entry, ExpressionKind, Section, SectionKind, Statement, StatementKind, Tree, words,
};
use crate::text::Span;

/// The sorts of token.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum TokenSort {
    /// A statement word or a word that joins its parts.
    Keyword,
    /// A material.
    Material,
    /// A crystal.
    Crystal,
    /// A named value.
    Value,
    /// A measure.
    Measure,
    /// An atom.
    Atom,
    /// A quantity of the bands.
    Quantity,
    /// A unit after a number.
    Unit,
    /// A function.
    Function,
    /// A kind of lattice, a shape, a class, or another word of one statement.
    Choice,
    /// A rule in a waiver.
    Rule,
    /// A number.
    Number,
    /// A string.
    Text,
    /// A comment.
    Comment,
}

/// A token. Bytes of the whole text; never across a line's end.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Token {
    /// Where.
    pub span: Span,
    /// What.
    pub sort: TokenSort,
    /// Whether its name is given here.
    pub defines: bool,
}

/// The tokens of a text in order.
#[must_use]
pub fn tokens(tree: &Tree) -> Vec<Token> {
    tree.entries.iter().flat_map(section).collect()
}

fn section(entry: &Entry) -> Vec<Token> {
    let section = &entry.section;
    let known = known(section);
    let mut found = Vec::new();
    for line in &section.lines {
        let first = if line.content.is_empty() {
            line.span.end
        } else {
            line.content.start
        };
        for (span, raw) in Scan::new(&section.text, line.span) {
            let word = span.of(&section.text);
            let sort = match raw {
                Raw::Comment => Some((TokenSort::Comment, false)),
                Raw::Text => Some((TokenSort::Text, false)),
                Raw::Number => Some((TokenSort::Number, false)),
                Raw::Word if span.start == first => first_word(word),
                Raw::Word => known.get(&span.start).copied().or_else(|| by_word(word)),
            };
            if let Some((sort, defines)) = sort {
                found.push(Token {
                    span: entry.absolute(span),
                    sort,
                    defines,
                });
            }
        }
    }
    found
}

fn first_word(word: &str) -> Option<(TokenSort, bool)> {
    let known = words::statement(word).is_some() || words::HEADINGS.contains(&word);
    known.then_some((TokenSort::Keyword, false))
}

/// What a word is wherever it stands.
fn by_word(word: &str) -> Option<(TokenSort, bool)> {
    let sort = if words::is_clause(word) {
        TokenSort::Keyword
    } else if words::FUNCTIONS.contains(&word) {
        TokenSort::Function
    } else if is_choice(word) {
        TokenSort::Choice
    } else if words::QUANTITIES.contains(&word) {
        TokenSort::Quantity
    } else {
        return None;
    };
    Some((sort, false))
}

fn is_choice(word: &str) -> bool {
    let lists = [words::FIXED, words::CLASSES, words::SHAPES];
    lists.iter().any(|list| list.contains(&word)) || words::lattice(word).is_some()
}

/// What the words of the readable statements are, by their first byte.
fn known(section: &Section) -> HashMap<u32, (TokenSort, bool)> {
    let mut known = HashMap::new();
    let own = match section.kind {
        SectionKind::Material => TokenSort::Material,
        _ => TokenSort::Crystal,
    };
    for (word, defines) in section
        .name
        .iter()
        .map(|name| (name, true))
        .chain(section.like.iter().map(|like| (like, false)))
    {
        known.insert(word.span.start, (own, defines));
    }
    for statement in &section.statements {
        expressions(statement, &mut known);
        names(statement, &mut known);
    }
    known
}

fn expressions(statement: &Statement, known: &mut HashMap<u32, (TokenSort, bool)>) {
    statement.walk(&mut |expression| {
        let (start, sort) = match &expression.kind {
            ExpressionKind::Name(_) => (expression.span.start, TokenSort::Value),
            ExpressionKind::Call { function, .. } => (function.span.start, TokenSort::Function),
            ExpressionKind::Number {
                unit: Some(unit), ..
            } => (unit.name.span.start, TokenSort::Unit),
            _ => return,
        };
        known.insert(start, (sort, false));
    });
    statement.quantities(&mut |quantity| {
        known.insert(quantity.span.start, (TokenSort::Quantity, false));
    });
    statement.materials(&mut |word| {
        known.insert(word.span.start, (TokenSort::Material, false));
    });
    statement.crystals(&mut |word| {
        known.insert(word.span.start, (TokenSort::Crystal, false));
    });
}

fn names(statement: &Statement, known: &mut HashMap<u32, (TokenSort, bool)>) {
    let mut name = |span: Span, sort, defines| {
        known.insert(span.start, (sort, defines));
    };
    match &statement.kind {
        StatementKind::Let { name: word, .. } => name(word.span, TokenSort::Value, true),
        StatementKind::Measure { name: word, .. } => name(word.span, TokenSort::Measure, true),
        StatementKind::Atom { name: word, .. } => name(word.span, TokenSort::Atom, true),
        StatementKind::Formfactor {
            name: word, second, ..
        } => {
            name(word.span, TokenSort::Atom, false);
            second
                .iter()
                .for_each(|second| name(second.span, TokenSort::Atom, false));
        }
        StatementKind::Waive { rule, .. } => name(rule.span, TokenSort::Rule, false),
        _ => {}
    }
}

/// The raw sorts of token.
#[derive(Clone, Copy)]
enum Raw {
    Word,
    Number,
    Text,
    Comment,
}

/// Cuts a stretch of text into words, numbers, strings and comments.
struct Scan<'t> {
    text: &'t str,
    position: usize,
    end: usize,
}

impl<'t> Scan<'t> {
    fn new(text: &'t str, span: Span) -> Self {
        Self {
            text,
            position: span.start as usize,
            end: (span.end as usize).min(text.len()),
        }
    }

    fn rest(&self) -> &'t str {
        self.text.get(self.position..self.end).unwrap_or("")
    }

    /// How much of the rest belongs to a token that starts with `first`.
    fn token(&self, first: char) -> Option<(Raw, usize)> {
        let rest = self.rest();
        let line_end = rest.find(['\n', '\r']).unwrap_or(rest.len());
        let line = rest.get(..line_end).unwrap_or(rest);
        let starts_number = first.is_ascii_digit()
            || first == '.'
                && line
                    .chars()
                    .nth(1)
                    .is_some_and(|next| next.is_ascii_digit());
        if first == '#' {
            Some((Raw::Comment, line_end))
        } else if first == '"' {
            let close = line
                .get(1..)
                .and_then(|tail| tail.find('"'))
                .map_or(line_end, |at| at + 2);
            Some((Raw::Text, close))
        } else if is_xid_start(first) || first == '_' {
            Some((Raw::Word, word_length(line)))
        } else {
            starts_number.then(|| (Raw::Number, number_length(line)))
        }
    }
}

impl Iterator for Scan<'_> {
    type Item = (Span, Raw);

    fn next(&mut self) -> Option<Self::Item> {
        loop {
            let first = self.rest().chars().next()?;
            let Some((raw, length)) = self.token(first) else {
                self.position += first.len_utf8();
                continue;
            };
            let narrow = |byte: usize| u32::try_from(byte).unwrap_or(u32::MAX);
            let span = Span::new(narrow(self.position), narrow(self.position + length));
            self.position += length;
            return Some((span, raw));
        }
    }
}

/// A word; a hyphen joins (`unit-slip`, `centred-rectangular`) where the whole is a word of the format.
fn word_length(line: &str) -> usize {
    let plain: usize = line
        .chars()
        .take_while(|c| is_xid_continue(*c))
        .map(char::len_utf8)
        .sum();
    let joined: usize = line
        .chars()
        .take_while(|c| is_xid_continue(*c) || *c == '-')
        .map(char::len_utf8)
        .sum();
    let whole = line.get(..joined).unwrap_or("");
    if words::lattice(whole).is_some() || crate::rules::all().iter().any(|rule| rule.name == whole)
    {
        joined
    } else {
        plain
    }
}

fn number_length(line: &str) -> usize {
    let bytes = line.as_bytes();
    let digits = |from: usize| {
        from + bytes
            .iter()
            .skip(from)
            .take_while(|byte| byte.is_ascii_digit())
            .count()
    };
    let mut end = digits(0);
    if bytes.get(end) == Some(&b'.') {
        end = digits(end + 1);
    }
    if matches!(bytes.get(end), Some(b'e' | b'E')) {
        let sign = usize::from(matches!(bytes.get(end + 1), Some(b'+' | b'-')));
        let exponent = digits(end + 1 + sign);
        if exponent > end + 1 + sign {
            end = exponent;
        }
    }
    end
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::syntax::read;

    fn sorted(text: &str) -> Vec<(String, TokenSort)> {
        let named = |token: &Token| (token.span.of(text).to_owned(), token.sort);
        tokens(&read(text)).iter().map(named).collect()
    }

    #[test]
    fn words_are_what_their_place_makes_them() {
        use TokenSort::{
            Comment, Crystal, Function, Keyword, Material, Number, Quantity, Text, Unit, Value,
        };
        let text = "crystal tern # a \"b\"\n  layer 5.4e0 nm of basin\n  require gap 1 >= sqrt(s) * 2 meV\n  title \"x # y\"\n";
        let expected = [
            ("crystal", Keyword),
            ("tern", Crystal),
            ("# a \"b\"", Comment),
            ("layer", Keyword),
            ("5.4e0", Number),
            ("nm", Unit),
            ("of", Keyword),
            ("basin", Material),
            ("require", Keyword),
            ("gap", Quantity),
            ("1", Number),
            ("sqrt", Function),
            ("s", Value),
            ("2", Number),
            ("meV", Unit),
            ("title", Keyword),
            ("\"x # y\"", Text),
        ];
        let expected: Vec<_> = expected
            .iter()
            .map(|(text, sort)| ((*text).to_owned(), *sort))
            .collect();
        assert_eq!(sorted(text), expected);
    }

    #[test]
    fn a_line_that_does_not_read_is_coloured_by_its_words() {
        let found = sorted("crystal a\n  layer of of 5\n");
        assert!(found.contains(&("layer".to_owned(), TokenSort::Keyword)));
        assert!(found.contains(&("of".to_owned(), TokenSort::Keyword)));
    }
}
