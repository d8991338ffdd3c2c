//! Tokens of a logical line, cut only to word a problem and to place it.

use super::split::is_blank;

/// What a token is.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum TokenKind {
    /// A name or a word of the format.
    Word,
    /// A number without its unit.
    Number,
    /// A string, its closing quote included where it has one.
    Text {
        /// Whether it has one.
        closed: bool,
    },
    /// A punctuation mark or an operator.
    Sign,
    /// Something that the format does not use.
    Stray,
}

/// A token, its place in bytes of the line's content.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) struct Token<'t> {
    /// What it is.
    pub(super) kind: TokenKind,
    /// First byte.
    pub(super) start: usize,
    /// Its characters.
    pub(super) text: &'t str,
}

impl Token<'_> {
    /// First byte past it.
    pub(super) fn end(&self) -> usize {
        self.start + self.text.len()
    }
}

/// The tokens of a line's content, one after another.
pub(super) fn tokens(content: &str) -> impl Iterator<Item = Token<'_>> {
    let mut position = 0;
    std::iter::from_fn(move || {
        let rest = skip_blanks(content.get(position..)?);
        let start = content.len() - rest.len();
        let (kind, length) = next_token(rest)?;
        position = start + length;
        Some(Token {
            kind,
            start,
            text: rest.get(..length)?,
        })
    })
}

fn skip_blanks(mut rest: &str) -> &str {
    loop {
        rest = rest.trim_start_matches(is_blank);
        let Some(behind) = rest.strip_prefix('\\') else {
            return rest;
        };
        let line = behind.find(['\n', '\r']).map(|end| behind.split_at(end));
        match line {
            Some((line, next)) if blank_or_comment(line) => {
                rest = next.trim_start_matches(['\n', '\r']);
            }
            _ => return rest,
        }
    }
}

fn blank_or_comment(line: &str) -> bool {
    let line = line.trim_start_matches(is_blank);
    line.is_empty() || line.starts_with('#')
}

/// Signs of more than one character, longest first.
const LONG_SIGNS: &[&str] = &["+/-", "+/−", ">=", "<="];

/// Signs of one character.
const SIGNS: &str = "=,()%+-−*/^±<>≥≤";

fn next_token(rest: &str) -> Option<(TokenKind, usize)> {
    let first = rest.chars().next()?;
    if first == '"' {
        return Some(text_token(rest));
    }
    if let Some(length) = number_length(rest) {
        return Some((TokenKind::Number, length));
    }
    if is_name_start(first) {
        return Some((TokenKind::Word, word_length(rest)));
    }
    if let Some(length) = mistaken_plus_minus(rest) {
        return Some((TokenKind::Stray, length));
    }
    if let Some(sign) = LONG_SIGNS.iter().find(|sign| rest.starts_with(**sign)) {
        return Some((TokenKind::Sign, sign.len()));
    }
    if SIGNS.contains(first) {
        return Some((TokenKind::Sign, first.len_utf8()));
    }
    let superscripts = rest
        .find(|character| !is_superscript(character))
        .unwrap_or(rest.len());
    Some((TokenKind::Stray, superscripts.max(first.len_utf8())))
}

fn text_token(rest: &str) -> (TokenKind, usize) {
    let inside = rest.get(1..).unwrap_or("");
    match inside.find('"') {
        Some(end) => (TokenKind::Text { closed: true }, end + 2),
        None => (TokenKind::Text { closed: false }, rest.len()),
    }
}

/// The length of `+-`, which is likely meant as `±`.
fn mistaken_plus_minus(rest: &str) -> Option<usize> {
    ["+-", "+−"]
        .iter()
        .find(|sign| rest.starts_with(**sign))
        .map(|sign| sign.len())
}

/// Whether a name may begin with `character`.
pub(super) fn is_name_start(character: char) -> bool {
    character == '_' || unicode_ident::is_xid_start(character)
}

/// Middle dots and invisible joiners, which Unicode lets continue a name: here the first are signs for `*`, and the
/// second would make two names that look the same.
const NOT_IN_NAMES: [char; 6] = [
    '·', '\u{387}', '\u{30fb}', '\u{ff65}', '\u{200c}', '\u{200d}',
];

/// Whether a name may go on with `character`.
pub(super) fn is_name_character(character: char) -> bool {
    unicode_ident::is_xid_continue(character) && !NOT_IN_NAMES.contains(&character)
}

/// The first token that the grammar alone would take for a part of a name.
pub(super) fn stray_joiner(content: &str) -> Option<Token<'_>> {
    if content.is_ascii() || !content.contains(NOT_IN_NAMES) {
        return None;
    }
    tokens(content)
        .find(|token| token.kind == TokenKind::Stray && token.text.starts_with(NOT_IN_NAMES))
}

/// The length of the name that `rest` begins with.
pub(super) fn word_length(rest: &str) -> usize {
    rest.find(|character| !is_name_character(character))
        .unwrap_or(rest.len())
}

fn number_length(rest: &str) -> Option<usize> {
    let whole = digits(rest);
    let mut length = whole;
    if let Some(behind) = rest.get(whole..).and_then(|rest| rest.strip_prefix('.')) {
        let part = digits(behind);
        if whole == 0 && part == 0 {
            return None;
        }
        length += 1 + part;
    }
    if length == 0 {
        return None;
    }
    Some(length + exponent_length(rest.get(length..).unwrap_or("")))
}

fn exponent_length(rest: &str) -> usize {
    let Some(behind) = rest.strip_prefix(['e', 'E']) else {
        return 0;
    };
    let unsigned = behind.strip_prefix(['+', '-', '−']).unwrap_or(behind);
    match digits(unsigned) {
        0 => 0,
        count => rest.len() - unsigned.len() + count,
    }
}

fn digits(rest: &str) -> usize {
    rest.bytes().take_while(u8::is_ascii_digit).count()
}

/// The superscripts and what they stand for.
const SUPERSCRIPTS: &[(char, char)] = &[
    ('⁰', '0'),
    ('¹', '1'),
    ('²', '2'),
    ('³', '3'),
    ('⁴', '4'),
    ('⁵', '5'),
    ('⁶', '6'),
    ('⁷', '7'),
    ('⁸', '8'),
    ('⁹', '9'),
    ('⁺', '+'),
    ('⁻', '-'),
];

fn is_superscript(character: char) -> bool {
    plain_superscript(character).is_some()
}

fn plain_superscript(character: char) -> Option<char> {
    SUPERSCRIPTS
        .iter()
        .find(|(superscript, _)| *superscript == character)
        .map(|(_, plain)| *plain)
}

/// Characters that are often pasted or typed for one that the format reads.
const INSTEAD: &[(&str, &str)] = &[
    ("×·\u{387}⋅∙•∗✕✖", "*"),
    ("÷∕⁄", "/"),
    ("–—‐‑‒﹣－", "-"),
    ("＋", "+"),
    ("＝", "="),
    ("“”„‟«»″＂'’‘", "\""),
    ("[{（［｛", "("),
    ("]}）］｝", ")"),
    ("，、", ","),
    ("°˚", "deg"),
    ("√", "sqrt"),
    ("½", "0.5"),
    ("¼", "0.25"),
    ("¾", "0.75"),
    ("≧⩾", ">="),
    ("≦⩽", "<="),
    ("＊", "*"),
    ("％", "%"),
    ("\u{b}\u{c}\u{85}", " "),
];

/// What to write for a stray token: an empty text where it is best left out, nothing where the intent is not plain.
pub(super) fn instead_of(token: &str) -> Option<String> {
    let first = token.chars().next()?;
    if mistaken_plus_minus(token).is_some() {
        return Some("±".to_owned());
    }
    if is_superscript(first) {
        let plain = token.chars().filter_map(plain_superscript);
        return Some(std::iter::once('^').chain(plain).collect());
    }
    if let Some((_, instead)) = INSTEAD.iter().find(|(from, _)| from.contains(first)) {
        return Some((*instead).to_owned());
    }
    (first.is_control() || is_invisible(first)).then(String::new)
}

/// Characters without a shape that come with pasted text.
fn is_invisible(character: char) -> bool {
    matches!(character, '\u{ad}' | '\u{200b}'..='\u{200f}' | '\u{202a}'..='\u{202e}' | '\u{2060}'..='\u{2064}' | '\u{feff}')
}

#[cfg(test)]
mod tests {
    use super::*;

    fn texts(content: &str) -> Vec<&str> {
        tokens(content).map(|token| token.text).collect()
    }

    #[test]
    fn tokens_are_those_of_the_grammar() {
        assert_eq!(
            texts("layer 5.4nm ± .2e-3 nm^-1 of b \\ # c\n +/- \"a # b\""),
            [
                "layer",
                "5.4",
                "nm",
                "±",
                ".2e-3",
                "nm",
                "^",
                "-",
                "1",
                "of",
                "b",
                "+/-",
                "\"a # b\""
            ]
        );
        assert_eq!(texts("1eV 1e3nm 1.e"), ["1", "eV", "1e3", "nm", "1.", "e"]);
    }

    #[test]
    fn strays_say_what_to_write() {
        let strays = |content: &str| {
            tokens(content)
                .filter(|token| token.kind == TokenKind::Stray)
                .map(|token| instead_of(token.text))
                .collect::<Vec<_>>()
        };
        assert_eq!(strays("2 × 3"), [Some("*".to_owned())]);
        assert_eq!(
            strays("nm⁻¹ m²"),
            [Some("^-1".to_owned()), Some("^2".to_owned())]
        );
        assert_eq!(strays("a +- b"), [Some("±".to_owned())]);
        assert_eq!(
            strays("a\u{200b}; \0"),
            [Some(String::new()), None, Some(String::new())]
        );
    }
}
