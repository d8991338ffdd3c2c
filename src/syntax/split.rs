//! Cuts a text into sections and a section into logical lines.
//!
//! A line whose first word is `material` or `crystal` never continues another,
//! so that headings are found by the first words of physical lines alone, whatever
//! strings, comments and continuations stand around them.

use crate::text::Span;

use super::Line;
use super::SectionKind;
use super::tokens::is_name_character;

/// The byte-order mark, skipped at the start of a text.
pub(super) const BYTE_ORDER_MARK: char = '\u{feff}';

/// Whether the format reads `character` as a blank.
pub(super) fn is_blank(character: char) -> bool {
    matches!(character, ' ' | '\t') || (character.is_whitespace() && !character.is_control())
}

/// The part of a text that one section takes, and the kind that its first word gives it.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) struct Cut {
    /// The kind of the section.
    pub(super) kind: SectionKind,
    /// First byte.
    pub(super) start: usize,
    /// First byte past it.
    pub(super) end: usize,
}

/// Cuts `text` at its headings; the preamble comes first, possibly empty.
pub(super) fn cut(text: &str) -> Vec<Cut> {
    let mut cuts = Vec::new();
    let mut current = (SectionKind::Preamble, 0);
    let mut start = 0;
    while start < text.len() {
        if let Some(kind) = heading_kind(text.get(start..).unwrap_or(""), start == 0) {
            cuts.push(Cut {
                kind: current.0,
                start: current.1,
                end: start,
            });
            current = (kind, start);
        }
        start = physical_end(text.as_bytes(), start).1;
    }
    cuts.push(Cut {
        kind: current.0,
        start: current.1,
        end: text.len(),
    });
    cuts
}

/// The kind of section that a physical line opens, if its first word is `material` or `crystal`.
fn heading_kind(rest: &str, first_of_text: bool) -> Option<SectionKind> {
    let line = if first_of_text {
        rest.strip_prefix(BYTE_ORDER_MARK).unwrap_or(rest)
    } else {
        rest
    };
    let line = line.trim_start_matches(is_blank);
    let (kind, behind) = match line.as_bytes().first() {
        Some(b'm') => (SectionKind::Material, line.strip_prefix("material")?),
        Some(b'c') => (SectionKind::Crystal, line.strip_prefix("crystal")?),
        _ => return None,
    };
    let goes_on = behind.chars().next().is_some_and(is_name_character);
    (!goes_on).then_some(kind)
}

/// Where the physical line from `start` ends: before and behind its terminator (LF, CRLF or CR).
fn physical_end(bytes: &[u8], start: usize) -> (usize, usize) {
    let rest = bytes.get(start..).unwrap_or_default();
    let Some(length) = memchr::memchr2(b'\n', b'\r', rest) else {
        return (bytes.len(), bytes.len());
    };
    let end = start + length;
    let pair = bytes.get(end) == Some(&b'\r') && bytes.get(end + 1) == Some(&b'\n');
    (end, end + if pair { 2 } else { 1 })
}

/// A logical line, and the `\` in it that has nothing to continue with.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) struct SplitLine {
    /// The line.
    pub(super) line: Line,
    /// The place of a dangling `\`.
    pub(super) dangling: Option<Span>,
}

/// Cuts the text of one section into its logical lines; a byte-order mark at its start is skipped.
pub(super) fn logical_lines(text: &str) -> Vec<SplitLine> {
    let mut lines = Vec::new();
    let mut start = 0;
    while start < text.len() {
        let line = logical_line(text, start);
        start = line.line.span.end as usize;
        lines.push(line);
    }
    lines
}

/// What one physical line holds, in bytes of its section.
struct Physical {
    /// From its first to behind its last byte that is no blank, comment or continuation.
    content: Option<(usize, usize)>,
    /// Its comment.
    comment: Option<(usize, usize)>,
    /// Its continuation mark.
    backslash: Option<usize>,
}

fn logical_line(text: &str, start: usize) -> SplitLine {
    let mut content: Option<(usize, usize)> = None;
    let mut comment = None;
    let mut dangling = None;
    let mut position = start;
    loop {
        let (end, next) = physical_end(text.as_bytes(), position);
        let physical = scan_physical(text, position, end);
        content = match (content, physical.content) {
            (Some((first, _)), Some((_, last))) => Some((first, last)),
            (before, now) => now.or(before),
        };
        comment = physical.comment.or(comment);
        position = next;
        let Some(backslash) = physical.backslash else {
            break;
        };
        // A section's text ends at the next heading or with the file: in both cases nothing continues.
        if position >= text.len() {
            dangling = Some(span(backslash, backslash + 1));
            break;
        }
    }
    let content = content.map_or_else(|| empty_at(text, start), |(from, to)| span(from, to));
    SplitLine {
        line: Line {
            span: span(start, position),
            content,
            comment: comment.map_or_else(
                || span(content.end as usize, content.end as usize),
                |(from, to)| span(from, to),
            ),
        },
        dangling,
    }
}

/// The empty content of a line without a statement: behind its indent.
fn empty_at(text: &str, start: usize) -> Span {
    let rest = text.get(start..).unwrap_or("");
    let skipped = rest.len() - skip_indent(rest, start).len();
    span(start + skipped, start + skipped)
}

fn skip_indent(rest: &str, start: usize) -> &str {
    let rest = if start == 0 {
        rest.strip_prefix(BYTE_ORDER_MARK).unwrap_or(rest)
    } else {
        rest
    };
    rest.trim_start_matches(is_blank)
}

fn scan_physical(text: &str, start: usize, end: usize) -> Physical {
    let line = text.get(start..end).unwrap_or("");
    let indent = line.len() - skip_indent(line, start).len();
    let mut physical = Physical {
        content: None,
        comment: None,
        backslash: None,
    };
    let mut in_string = false;
    for (offset, character) in line
        .char_indices()
        .skip_while(|(offset, _)| *offset < indent)
    {
        let at = start + offset;
        match character {
            '"' => in_string = !in_string,
            '#' if !in_string => {
                physical.comment = Some((at, end));
                break;
            }
            '\\' if !in_string && continues(line.get(offset + 1..).unwrap_or("")) => {
                physical.backslash = Some(at);
                continue;
            }
            _ if is_blank(character) && !in_string => continue,
            _ => {}
        }
        let first = physical.content.map_or(at, |(first, _)| first);
        physical.content = Some((first, at + character.len_utf8()));
    }
    physical
}

/// Whether only blanks or a comment follow a `\`.
fn continues(behind: &str) -> bool {
    let behind = behind.trim_start_matches(is_blank);
    behind.is_empty() || behind.starts_with('#')
}

/// A span from byte offsets; texts past 4 GiB are cut off at the limit.
pub(super) fn span(start: usize, end: usize) -> Span {
    let clamp = |offset: usize| u32::try_from(offset).unwrap_or(u32::MAX);
    Span::new(clamp(start), clamp(end))
}

#[cfg(test)]
mod tests {
    use super::*;

    fn contents(text: &str) -> Vec<&str> {
        logical_lines(text)
            .iter()
            .map(|split| split.line.content.of(text))
            .collect()
    }

    #[test]
    fn a_line_ends_at_lf_crlf_and_cr() {
        assert_eq!(contents("a\nb\r\nc\rd"), ["a", "b", "c", "d"]);
    }

    #[test]
    fn a_backslash_joins_the_next_line_even_a_blank_one() {
        assert_eq!(contents("a \\ # why\n b\nc"), ["a \\ # why\n b", "c"]);
        assert_eq!(contents("a \\\n\nb"), ["a", "b"]);
        assert_eq!(contents("a \\ b\nc"), ["a \\ b", "c"]);
    }

    #[test]
    fn strings_hide_comments_and_continuations() {
        assert_eq!(contents("title \"a # b\" # c\n"), ["title \"a # b\""]);
        assert_eq!(contents("title \"a \\\nb"), ["title \"a \\", "b"]);
    }

    #[test]
    fn a_dangling_backslash_is_told() {
        let lines = logical_lines("a \\\n");
        assert_eq!(lines.len(), 1);
        assert_eq!(
            lines.first().and_then(|line| line.dangling),
            Some(Span::new(2, 3))
        );
        assert!(
            logical_lines("a \\\n\n")
                .iter()
                .all(|line| line.dangling.is_none())
        );
    }

    #[test]
    fn headings_are_found_by_their_first_word_alone() {
        let kinds = |text: &str| cut(text).iter().map(|cut| cut.kind).collect::<Vec<_>>();
        use SectionKind::{Crystal, Material, Preamble};
        assert_eq!(kinds(""), [Preamble]);
        assert_eq!(kinds("\u{feff}crystal a"), [Preamble, Crystal]);
        assert_eq!(
            kinds("use \\\nmaterial !?\ncrystals\ncrystal\n"),
            [Preamble, Material, Crystal]
        );
        assert_eq!(kinds("title \"a\ncrystal b\""), [Preamble, Crystal]);
        assert_eq!(kinds("x\r\u{a0}\tcrystal=\r\n"), [Preamble, Crystal]);
    }
}
