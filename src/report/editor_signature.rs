//! How the statement under the cursor is written, and which part of it the cursor is in.

use crate::syntax::{Tree, words};
use crate::text::Span;

/// The forms of a statement.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Signature {
    /// What the statement says.
    pub summary: &'static str,
    /// The ways to write it.
    pub forms: Vec<Form>,
    /// The form that what is written fits best.
    pub active: usize,
}

/// One way to write a statement.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Form {
    /// The whole form.
    pub label: &'static str,
    /// Its parts, in bytes of the label.
    pub parts: Vec<Span>,
    /// The part that the cursor is in.
    pub active: Option<usize>,
}

/// The forms of the statement whose line holds a byte, once its first word is written.
#[must_use]
pub fn signature(tree: &Tree, offset: u32) -> Option<Signature> {
    let (_, entry) = tree.entry_at(offset)?;
    let section = &entry.section;
    let byte = offset.checked_sub(entry.start)?;
    let line = section.line_at(byte)?;
    let before = Span::new(line.span.start, byte).of(&section.text);
    if before.contains('#') {
        return None;
    }
    let mut typed: Vec<&str> = before
        .split_whitespace()
        .filter(|word| *word != "\\")
        .collect();
    // The word that touches the cursor is still being written.
    if !before.ends_with(char::is_whitespace) {
        typed.pop();
    }
    let (first, rest) = typed.split_first()?;
    let word = words::statement(first)?;
    let forms: Vec<(Form, usize)> = word
        .form
        .split(" | ")
        .map(|label| form(label, rest))
        .collect();
    let active = forms
        .iter()
        .enumerate()
        .max_by_key(|(index, (_, fit))| (*fit, usize::MAX - index));
    let active = active.map_or(0, |(index, _)| index);
    let forms = forms.into_iter().map(|(form, _)| form).collect();
    Some(Signature {
        summary: word.summary,
        forms,
        active,
    })
}

/// One form, and how many of its fixed words are written.
fn form(label: &'static str, typed: &[&str]) -> (Form, usize) {
    let mut parts = Vec::new();
    let mut position = 0;
    for part in label.split_whitespace() {
        let start = label
            .get(position..)
            .and_then(|rest| rest.find(part))
            .map_or(position, |at| at + position);
        position = start + part.len();
        parts.push(narrow(start, position));
    }
    let plain = |span: &Span| span.of(label).trim_matches(['[', ']']);
    let mut next = 1;
    let mut fit = 0;
    for word in typed {
        let later = parts
            .iter()
            .enumerate()
            .skip(next)
            .find(|(_, part)| plain(part) == *word);
        if let Some((index, _)) = later {
            next = index + 1;
            fit += 1;
        }
    }
    let active = (next < parts.len()).then_some(next);
    (
        Form {
            label,
            parts,
            active,
        },
        fit,
    )
}

fn narrow(start: usize, end: usize) -> Span {
    let narrow = |byte| u32::try_from(byte).unwrap_or(u32::MAX);
    Span::new(narrow(start), narrow(end))
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::syntax::read;

    /// The active form's active part, for a text with the cursor at `|`.
    fn active(text: &str) -> Option<(String, String)> {
        let offset = u32::try_from(text.find('|').expect("a cursor")).expect("a short text");
        let signature = signature(&read(&text.replace('|', "")), offset)?;
        let form = signature.forms.get(signature.active)?;
        let part = form
            .active
            .and_then(|index| form.parts.get(index))
            .map_or("", |span| span.of(form.label));
        Some((form.label.to_owned(), part.to_owned()))
    }

    #[test]
    fn the_part_follows_the_words_that_are_written() {
        let layer = "layer L of MATERIAL [to MATERIAL]";
        assert_eq!(
            active("crystal a\n  layer |"),
            Some((layer.into(), "L".into()))
        );
        assert_eq!(
            active("crystal a\n  layer 5 nm of |"),
            Some((layer.into(), "MATERIAL".into()))
        );
        let at = "layer L at E [to E] [mass M]";
        assert_eq!(
            active("crystal a\n  layer 5 nm at 3 meV mass |"),
            Some((at.into(), "M]".into()))
        );
    }

    #[test]
    fn other_lines_have_none() {
        assert_eq!(active("crystal a\n  lay|"), None);
        assert_eq!(active("crystal a\n  nonsense |"), None);
        assert_eq!(active("crystal a\n  layer 5 nm # of |"), None);
    }
}
