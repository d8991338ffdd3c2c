//! The shape of a text for an editor: its outline, what folds, what a growing selection takes next.

use crate::syntax::{Entry, Expression, Section, SectionKind, Statement, StatementKind, Tree};
use crate::text::Span;

/// The sorts of thing in an outline.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum OutlineSort {
    /// `material`
    Material,
    /// `crystal`
    Crystal,
    /// `let`
    Value,
    /// `measure`
    Measure,
}

/// One thing in an outline. Bytes of the whole text.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Outline {
    /// Its name.
    pub name: String,
    /// More of it: what it is like, its title, its value.
    pub detail: String,
    /// Its sort.
    pub sort: OutlineSort,
    /// All of it, from its first word to the last character that belongs to it.
    pub whole: Span,
    /// Its name in the text.
    pub name_span: Span,
    /// What stands in it.
    pub children: Vec<Outline>,
}

/// What a text holds, in order.
#[must_use]
pub fn outline(tree: &Tree) -> Vec<Outline> {
    let mut found = Vec::new();
    for entry in &tree.entries {
        match section(entry) {
            Some(section) => found.push(section),
            None => found.extend(values(entry)),
        }
    }
    found
}

fn section(entry: &Entry) -> Option<Outline> {
    let section = &entry.section;
    let sort = match section.kind {
        SectionKind::Preamble => return None,
        SectionKind::Material => OutlineSort::Material,
        SectionKind::Crystal => OutlineSort::Crystal,
    };
    let name = section.name.as_ref()?;
    let like = section
        .like
        .as_ref()
        .map(|like| format!("like {}", like.text));
    let detail = [like, title(section)]
        .into_iter()
        .flatten()
        .collect::<Vec<_>>()
        .join(", ");
    Some(Outline {
        name: name.text.clone(),
        detail,
        sort,
        whole: whole(section).shifted(entry.start),
        name_span: entry.absolute(name.span),
        children: values(entry).collect(),
    })
}

fn title(section: &Section) -> Option<String> {
    section
        .statements
        .iter()
        .find_map(|statement| match &statement.kind {
            StatementKind::Title(title) => Some(title.text.clone()),
            _ => None,
        })
}

/// The values and measures that a section names.
fn values(entry: &Entry) -> impl Iterator<Item = Outline> {
    entry.section.statements.iter().filter_map(|statement| {
        let (name, sort, value) = match &statement.kind {
            StatementKind::Let { name, value } => (name, OutlineSort::Value, value.span),
            StatementKind::Measure { name, expression } => {
                (name, OutlineSort::Measure, expression.span)
            }
            _ => return None,
        };
        Some(Outline {
            name: name.text.clone(),
            detail: value.of(&entry.section.text).to_owned(),
            sort,
            whole: entry.absolute(statement.span),
            name_span: entry.absolute(name.span),
            children: Vec::new(),
        })
    })
}

/// A section without the blank lines and comments that end it.
fn whole(section: &Section) -> Span {
    let mut contents = section.lines.iter().map(|line| line.content);
    let last = contents.rfind(|content| !content.is_empty());
    let last = last.unwrap_or(section.heading);
    let start = if section.heading.is_empty() {
        Span::new(last.start, last.start)
    } else {
        section.heading
    };
    start.cover(last)
}

/// What a fold holds.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum FoldSort {
    /// A section.
    Section,
    /// Comment lines.
    Comment,
    /// `use` lines.
    Uses,
}

/// What folds: from the end of its first line to its last byte.
#[must_use]
pub fn folds(tree: &Tree) -> Vec<(Span, FoldSort)> {
    let mut folds = Vec::new();
    for entry in &tree.entries {
        let section = &entry.section;
        if section.kind != SectionKind::Preamble {
            folds.push((whole(section).shifted(entry.start), FoldSort::Section));
        }
        let runs = runs(
            section,
            |line| line.content.is_empty() && !line.comment.is_empty(),
            |line| line.comment,
        );
        folds.extend(
            runs.into_iter()
                .map(|span| (span.shifted(entry.start), FoldSort::Comment)),
        );
        let uses = runs_of_uses(section);
        folds.extend(
            uses.into_iter()
                .map(|span| (span.shifted(entry.start), FoldSort::Uses)),
        );
    }
    folds
}

/// Runs of two or more lines that are alike.
fn runs(
    section: &Section,
    belongs: impl Fn(&crate::syntax::Line) -> bool,
    bytes: impl Fn(&crate::syntax::Line) -> Span,
) -> Vec<Span> {
    let mut found: Vec<(Span, usize)> = Vec::new();
    let mut open = false;
    for line in &section.lines {
        let belongs = belongs(line);
        match found.last_mut() {
            Some((span, count)) if open && belongs => {
                *span = span.cover(bytes(line));
                *count += 1;
            }
            _ if belongs => found.push((bytes(line), 1)),
            _ => {}
        }
        open = belongs;
    }
    found
        .into_iter()
        .filter(|(_, count)| *count > 1)
        .map(|(span, _)| span)
        .collect()
}

fn runs_of_uses(section: &Section) -> Vec<Span> {
    let is_use = |span: Span| {
        let statement = section.statement_at(span.start);
        statement.is_some_and(|statement| matches!(statement.kind, StatementKind::Use(_)))
    };
    runs(
        section,
        |line| !line.content.is_empty() && is_use(line.content),
        |line| line.content,
    )
}

/// Ever larger stretches of text around a byte, the smallest first.
#[must_use]
pub fn selections(tree: &Tree, offset: u32) -> Vec<Span> {
    let Some((_, entry)) = tree.entry_at(offset) else {
        return Vec::new();
    };
    let section = &entry.section;
    let byte = offset.saturating_sub(entry.start);
    let mut inside = vec![word_at(&section.text, byte)];
    if let Some(statement) = section.statement_at(byte) {
        inside.extend(around(statement, byte));
        inside.push(statement.span);
    }
    inside.extend(
        section
            .line_at(byte)
            .map(|line| line.content)
            .filter(|content| content.touches(byte)),
    );
    inside.push(whole(section));
    inside.push(Span::new(
        0,
        u32::try_from(section.text.len()).unwrap_or(u32::MAX),
    ));
    let mut spans: Vec<Span> = inside
        .into_iter()
        .map(|span| span.shifted(entry.start))
        .collect();
    spans.push(Span::new(
        0,
        u32::try_from(tree.text.len()).unwrap_or(u32::MAX),
    ));
    spans.retain(|span| span.touches(offset) && !span.is_empty());
    spans.sort_by_key(|span| span.len());
    // Each must hold the one before it.
    let mut nested: Vec<Span> = Vec::new();
    for span in spans {
        let holds =
            |inner: &Span| span.start <= inner.start && inner.end <= span.end && *inner != span;
        if nested.last().is_none_or(holds) {
            nested.push(span);
        }
    }
    nested
}

/// The expressions and values of a statement that touch a byte.
fn around(statement: &Statement, byte: u32) -> Vec<Span> {
    let mut spans = Vec::new();
    statement.walk(&mut |expression: &Expression| spans.push(expression.span));
    statement.values(&mut |value| spans.push(value.span));
    spans.retain(|span| span.touches(byte));
    spans
}

/// The word or number around a byte; empty where there is none.
pub(crate) fn word_at(text: &str, byte: u32) -> Span {
    let mut byte = (byte as usize).min(text.len());
    while !text.is_char_boundary(byte) {
        byte -= 1;
    }
    let (before, behind) = text.split_at(byte);
    let belongs =
        |character: char| character.is_alphanumeric() || matches!(character, '_' | '%' | '.');
    let start = byte
        - before
            .chars()
            .rev()
            .take_while(|c| belongs(*c))
            .map(char::len_utf8)
            .sum::<usize>();
    let end = byte
        + behind
            .chars()
            .take_while(|c| belongs(*c))
            .map(char::len_utf8)
            .sum::<usize>();
    let narrow = |byte: usize| u32::try_from(byte).unwrap_or(u32::MAX);
    Span::new(narrow(start), narrow(end))
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::syntax::read;

    const TEXT: &str = "use \"a.cren\"\nuse \"b.cren\"\nlet s = 8 nm\n\n# One wall.\n# Two lines.\nmaterial wall like base\n  edge 2 meV * (s + 1)\n\ncrystal tern\n  title \"T\"\n  layer s of wall\n  measure line = gap 1\n\n# end\n";

    fn offset(needle: &str) -> u32 {
        TEXT.find(needle)
            .and_then(|at| u32::try_from(at).ok())
            .expect("in the text")
    }

    #[test]
    fn the_outline_names_sections_and_values() {
        let outline = outline(&read(TEXT));
        let names: Vec<(&str, &str)> = outline
            .iter()
            .map(|item| (item.name.as_str(), item.detail.as_str()))
            .collect();
        assert_eq!(names, [("s", "8 nm"), ("wall", "like base"), ("tern", "T")]);
        let tern = outline.last().expect("a crystal");
        assert!(
            tern.whole.of(TEXT).starts_with("crystal tern")
                && tern.whole.of(TEXT).ends_with("gap 1")
        );
        assert_eq!(tern.name_span.of(TEXT), "tern");
        assert_eq!(
            tern.children
                .iter()
                .map(|child| child.name.as_str())
                .collect::<Vec<_>>(),
            ["line"]
        );
    }

    #[test]
    fn sections_comments_and_uses_fold() {
        let folds = folds(&read(TEXT));
        let of = |sort| {
            folds
                .iter()
                .filter(move |fold| fold.1 == sort)
                .map(|fold| fold.0.of(TEXT))
                .collect::<Vec<_>>()
        };
        assert_eq!(of(FoldSort::Uses), ["use \"a.cren\"\nuse \"b.cren\""]);
        assert_eq!(of(FoldSort::Comment), ["# One wall.\n# Two lines."]);
        assert_eq!(of(FoldSort::Section).len(), 2);
    }

    #[test]
    fn a_selection_grows_by_what_belongs_together() {
        let spans = selections(&read(TEXT), offset("s + 1"));
        let texts: Vec<&str> = spans.iter().map(|span| span.of(TEXT)).collect();
        assert_eq!(texts.first(), Some(&"s"));
        assert!(texts.contains(&"s + 1"), "{texts:?}");
        assert!(texts.contains(&"edge 2 meV * (s + 1)"), "{texts:?}");
        assert_eq!(texts.last(), Some(&TEXT));
        for pair in spans.windows(2) {
            if let [inner, outer] = pair {
                assert!(outer.start <= inner.start && inner.end <= outer.end);
            }
        }
    }
}
