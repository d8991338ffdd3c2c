//! The one standard layout.
//!
//! * Headings and what stands before the first begin at the margin; statements under a heading are indented by
//!   two blanks, their first word padded to nine characters, so that what follows lines up.
//! * One blank between words, two before a comment; comments behind neighbouring lines line up.
//! * One blank line at most between lines, one before a section and the comment above it, none at the ends.
//! * Continued lines keep their breaks and are indented by four more blanks.
//! * A comment on a line of its own stays at the margin if it stood there, and above a heading.
//!
//! Nothing else changes: no word, number or string. A line that cannot be read keeps its content as it is.

use crate::syntax::{Line, Section, SectionKind, Tree, read};

/// What follows a statement's first word stands this many characters behind its first.
const WORD_COLUMN: usize = 10;
/// Of a statement under a heading.
const INDENT: &str = "  ";
/// Of a continued line, in addition.
const CONTINUED: &str = "    ";

/// A physical line of the result.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
struct Row {
    content: String,
    comment: String,
    heading: bool,
    /// Whether a comment on its own may move to the margin of the heading below it.
    loose: bool,
}

impl Row {
    fn blank(&self) -> bool {
        self.content.is_empty() && self.comment.is_empty()
    }

    fn comment_alone(&self) -> bool {
        self.content.is_empty() && !self.comment.is_empty()
    }
}

/// The text of a tree in the standard layout; the same where it has it already.
#[must_use]
pub fn tidy(tree: &Tree) -> String {
    let mut rows = Vec::new();
    for entry in &tree.entries {
        for line in &entry.section.lines {
            let first = rows.is_empty();
            add_line(&entry.section, line, first, &mut rows);
        }
    }
    let mut rows = spaced(rows);
    settle_comments(&mut rows);
    let end = line_end(&tree.text);
    let mut text = String::new();
    for line in lined_up(&rows) {
        text += &line;
        text += end;
    }
    // A stray mark that the layout brings to the very start would be read as a byte-order mark: it goes.
    match text.strip_prefix('\u{feff}') {
        Some(rest) => tidy(&read(rest.trim_start_matches('\u{feff}'))),
        None => text,
    }
}

/// The terminator that the file begins with; a lone CR becomes LF.
fn line_end(text: &str) -> &'static str {
    let first = text.find(['\r', '\n']);
    let crlf = first.is_some_and(|at| text.get(at..at + 2) == Some("\r\n"));
    if crlf { "\r\n" } else { "\n" }
}

fn add_line(section: &Section, line: &Line, first_of_file: bool, rows: &mut Vec<Row>) {
    let whole = line.span.of(&section.text);
    let physical = physical_lines(whole);
    let heading = !section.heading.is_empty()
        && line.span.start <= section.heading.start
        && section.heading.end <= line.span.end;
    let readable = !section.problems.iter().any(|problem| {
        line.span.start <= problem.span.start
            && problem.span.start < line.span.end.max(line.span.start + 1)
    });
    for (number, text) in physical.iter().enumerate() {
        let first = number == 0;
        let margin = section.kind == SectionKind::Preamble || heading;
        // A byte-order mark is one only at the very start.
        let mark = if first_of_file && first {
            text.strip_prefix('\u{feff}')
        } else {
            None
        };
        let text = mark.unwrap_or(text);
        let (content, comment) = split_comment(text);
        let content = match readable {
            true => single_blanks(content),
            false => content.trim().to_owned(),
        };
        let indent = match (margin, first) {
            (true, true) => String::new(),
            (false, true) => INDENT.to_owned(),
            (true, false) => CONTINUED.to_owned(),
            (false, false) => format!("{INDENT}{CONTINUED}"),
        };
        let padded = match first && !margin && readable {
            true => pad_word(&content),
            false => content,
        };
        let indented = text.starts_with(|character: char| character.is_whitespace());
        rows.push(Row {
            content: if padded.is_empty() {
                padded
            } else {
                format!("{indent}{padded}")
            },
            comment: comment.trim_end().to_owned(),
            heading: heading && first,
            loose: margin || !indented,
        });
    }
}

/// The physical lines of a logical one, terminators left out.
fn physical_lines(whole: &str) -> Vec<&str> {
    let body = whole
        .strip_suffix("\r\n")
        .or_else(|| whole.strip_suffix(['\r', '\n']))
        .unwrap_or(whole);
    let mut lines = Vec::new();
    let mut rest = body;
    while let Some(at) = rest.find(['\r', '\n']) {
        let (line, next) = rest.split_at(at);
        lines.push(line);
        let crlf = next.starts_with("\r\n");
        rest = next.get(if crlf { 2 } else { 1 }..).unwrap_or("");
    }
    lines.push(rest);
    lines
}

/// A physical line's content and its comment, `#` in a string not counted.
fn split_comment(line: &str) -> (&str, &str) {
    let mut quoted = false;
    for (at, character) in line.char_indices() {
        match character {
            '"' => quoted = !quoted,
            '#' if !quoted => return line.split_at(at),
            _ => {}
        }
    }
    (line, "")
}

/// The content with one blank for each run of them, strings left as they are.
fn single_blanks(content: &str) -> String {
    let mut text = String::new();
    let mut quoted = false;
    for character in content.trim().chars() {
        if character == '"' {
            quoted = !quoted;
        }
        let blank = !quoted && character.is_whitespace();
        match blank {
            true if text.ends_with(' ') => {}
            true => text.push(' '),
            false => text.push(character),
        }
    }
    text
}

fn pad_word(content: &str) -> String {
    match content.split_once(' ') {
        Some((word, rest)) => {
            let blanks = WORD_COLUMN.saturating_sub(word.chars().count()).max(1);
            format!("{word}{}{rest}", " ".repeat(blanks))
        }
        None => content.to_owned(),
    }
}

/// One blank line at most, none at the ends, one before each heading and the comment above it.
fn spaced(rows: Vec<Row>) -> Vec<Row> {
    let mut spaced: Vec<Row> = Vec::new();
    for row in rows {
        let after_blank = spaced.last().is_none_or(Row::blank);
        if row.blank() && after_blank {
            continue;
        }
        if row.heading {
            let above = spaced
                .iter()
                .rev()
                .take_while(|row| row.comment_alone())
                .count();
            let at = spaced.len() - above;
            let separated = at == 0 || spaced.get(at - 1).is_none_or(Row::blank);
            if !separated {
                spaced.insert(at, Row::default());
            }
        }
        spaced.push(row);
    }
    while spaced.last().is_some_and(Row::blank) {
        spaced.pop();
    }
    spaced
}

/// Comments on lines of their own: at the margin directly above a heading or where they stood there, else indented.
fn settle_comments(rows: &mut [Row]) {
    let mut above_heading = false;
    for row in rows.iter_mut().rev() {
        if row.comment_alone() {
            if !above_heading && !row.loose {
                row.content = String::new();
                row.comment = format!("{INDENT}{}", row.comment);
            }
        } else {
            above_heading = row.heading;
        }
    }
}

/// The lines of the result, comments behind neighbouring contents lined up.
fn lined_up(rows: &[Row]) -> Vec<String> {
    let commented = |row: &Row| !row.content.is_empty() && !row.comment.is_empty();
    let mut lines = Vec::new();
    let mut rest = rows;
    while let Some(row) = rest.first() {
        if !commented(row) {
            lines.push(format!("{}{}", row.content, row.comment));
            rest = rest.get(1..).unwrap_or(&[]);
            continue;
        }
        let run = rest.iter().take_while(|row| commented(row)).count();
        let (neighbours, after) = rest.split_at(run);
        let widths = neighbours.iter().map(|row| row.content.chars().count());
        let column = widths.max().unwrap_or(0) + 2;
        for row in neighbours {
            let blanks = " ".repeat(column - row.content.chars().count());
            lines.push(format!("{}{blanks}{}", row.content, row.comment));
        }
        rest = after;
    }
    lines
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::syntax::read;

    fn tidied(text: &str) -> String {
        tidy(&read(text))
    }

    #[test]
    fn the_layout_of_the_format_itself_is_kept() {
        let text = "material basin\n  mass      0.067 me\n  edge      0 meV\n\n# A wall.\ncrystal tern\n  layer     5.4 nm of basin  # a well\n  layer     2.6 nm at 1 eV   # a wall\n";
        assert_eq!(tidied(text), text);
    }

    #[test]
    fn blanks_and_indents_are_made_regular() {
        let text = "\n\nuse   \"a  b.cren\"\ncrystal  tern   # one\n mass 1   me\n\n\n\n      # inside\nlayer 1 nm   at 0 eV#wall\n   \\\n  mass 2 me\n# of the next\nmaterial m\n\tmass 1 me";
        let wanted = "use \"a  b.cren\"\n\ncrystal tern  # one\n  mass      1 me\n\n  # inside\n  layer     1 nm at 0 eV  #wall\n  \\\n      mass 2 me\n\n# of the next\nmaterial m\n  mass      1 me\n";
        assert_eq!(tidied(text), wanted);
        assert_eq!(tidied(wanted), wanted, "a second time");
    }

    #[test]
    fn a_line_that_cannot_be_read_keeps_its_content() {
        let text = "crystal tern\n    lattice   chain    of   what\n";
        assert_eq!(
            tidied(text),
            "crystal tern\n  lattice   chain    of   what\n"
        );
    }

    #[test]
    fn crlf_stays() {
        assert_eq!(tidied("let a=1\r\n\r\n\r\n"), "let a=1\r\n");
    }
}
