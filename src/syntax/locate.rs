//! Finds what stands at a place of a text.

use super::{Entry, Line, Section, SectionKind, Statement, Tree, Word};
use crate::text::Span;

impl Tree {
    /// The section at an absolute byte offset, with its number; the last one for an offset past the end.
    /// None only in a tree without a preamble, which reading never gives.
    #[must_use]
    pub fn entry_at(&self, offset: u32) -> Option<(usize, &Entry)> {
        let after = self.entries.partition_point(|entry| entry.start <= offset);
        let number = after.checked_sub(1)?;
        self.entries.get(number).map(|entry| (number, entry))
    }

    /// The statement whose text an absolute byte offset touches, with its section.
    #[must_use]
    pub fn statement_at(&self, offset: u32) -> Option<(&Entry, &Statement)> {
        let (_, entry) = self.entry_at(offset)?;
        let statement = entry.section.statement_at(offset - entry.start)?;
        Some((entry, statement))
    }

    /// The comment lines directly above the heading of a section, without their `#`, joined by LF; empty
    /// when there are none. They belong to the text of the section before it.
    #[must_use]
    pub fn description(&self, entry_index: usize) -> String {
        let headed = self
            .entries
            .get(entry_index)
            .is_some_and(|entry| entry.section.kind != SectionKind::Preamble);
        let before = entry_index
            .checked_sub(1)
            .and_then(|index| self.entries.get(index));
        match before {
            Some(before) if headed => trailing_comment(&before.section),
            _ => String::new(),
        }
    }
}

impl Entry {
    /// A span of its section as a span of the whole text.
    #[must_use]
    pub fn absolute(&self, span: Span) -> Span {
        span.shifted(self.start)
    }
}

impl Section {
    /// The statement whose text a byte of the section touches.
    #[must_use]
    pub fn statement_at(&self, byte: u32) -> Option<&Statement> {
        let after = self
            .statements
            .partition_point(|statement| statement.span.start <= byte);
        let statement = self.statements.get(after.checked_sub(1)?)?;
        statement.span.touches(byte).then_some(statement)
    }

    /// The logical line that holds a byte of the section; the last one for a byte at or past its end.
    #[must_use]
    pub fn line_at(&self, byte: u32) -> Option<&Line> {
        let after = self.lines.partition_point(|line| line.span.start <= byte);
        self.lines.get(after.checked_sub(1)?)
    }

    /// The words of its heading: its name and what it is like.
    pub fn heading_words(&self) -> impl Iterator<Item = &Word> {
        self.name.iter().chain(&self.like)
    }
}

/// The comment lines that end a section, in order, without their `#`.
fn trailing_comment(section: &Section) -> String {
    let mut lines: Vec<&str> = section
        .lines
        .iter()
        .rev()
        .map_while(|line| comment_line(section, line))
        .collect();
    lines.reverse();
    lines.join("\n")
}

/// The text of a line that is nothing but a comment.
fn comment_line<'t>(section: &'t Section, line: &Line) -> Option<&'t str> {
    let comment = line.comment.of(&section.text).strip_prefix('#')?;
    // A joined line may hold more than its last comment.
    let alone = line.content.is_empty() && line.content.start == line.comment.start;
    alone.then(|| comment.strip_prefix(' ').unwrap_or(comment).trim_end())
}
