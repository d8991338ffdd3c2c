//! Findings for people: a header with line and column, the message, the lines it is about.

use std::fmt;
use std::ops::Range;
use std::sync::Arc;

use miette::{
    Diagnostic, GraphicalReportHandler, GraphicalTheme, LabeledSpan, MietteError,
    MietteSpanContents, Severity, SourceCode, SourceSpan, SpanContents, ThemeCharacters,
    ThemeStyles,
};

use super::analysis::FileAnalysis;
use super::lines::Lines;
use super::locate::Locator;
use super::paint::Paint;
use super::words;
use crate::rules::{Finding, Level};
use crate::text::Span;

/// Messages are wrapped to this many columns.
const WIDTH: usize = 100;

/// How many findings of each level there are.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub struct Tally {
    /// Errors.
    pub errors: usize,
    /// Warnings.
    pub warnings: usize,
    /// Notes.
    pub notes: usize,
}

impl Tally {
    /// Counts one more.
    pub fn add(&mut self, level: Level) {
        match level {
            Level::Error => self.errors += 1,
            Level::Warning => self.warnings += 1,
            Level::Note => self.notes += 1,
        }
    }

    /// Adds another's counts.
    pub fn join(&mut self, other: Self) {
        self.errors += other.errors;
        self.warnings += other.warnings;
        self.notes += other.notes;
    }

    /// How many at this level or above.
    #[must_use]
    pub fn at_least(&self, level: Level) -> usize {
        match level {
            Level::Error => self.errors,
            Level::Warning => self.errors + self.warnings,
            Level::Note => self.errors + self.warnings + self.notes,
        }
    }
}

/// "2 errors, 1 note", empty where there is nothing.
#[must_use]
pub fn counts(tally: Tally, paint: Paint) -> String {
    let parts = [
        (Level::Error, tally.errors, "error"),
        (Level::Warning, tally.warnings, "warning"),
        (Level::Note, tally.notes, "note"),
    ];
    let told: Vec<String> = parts
        .iter()
        .filter(|(_, number, _)| *number > 0)
        .map(|(level, number, one)| paint.level(*level, &words::count(*number, one)))
        .collect();
    told.join(", ")
}

/// The closing line: what was found in how many files.
#[must_use]
pub fn summary(tally: Tally, files: usize, paint: Paint) -> String {
    let files = words::count(files, "file");
    match tally.at_least(Level::Note) {
        0 => format!("{files}, nothing to report\n"),
        _ => format!("{files}: {}\n", counts(tally, paint)),
    }
}

/// The findings of one file; empty where there are none.
#[must_use]
pub fn file(
    locator: &Locator<'_>,
    analysed: &FileAnalysis,
    findings: &[&Finding],
    paint: Paint,
) -> String {
    let Some(lines) = locator.lines(analysed.file) else {
        return String::new();
    };
    let snippet = Snippet::new(&lines);
    let handler = handler(paint);
    let mut text = String::new();
    for finding in findings {
        text += &header(locator, finding, paint);
        let shown = Shown::new(locator, finding, &snippet);
        if handler.render_report(&mut text, &shown).is_err() {
            text += &finding.message;
            text.push('\n');
        }
        text += &footer(locator, finding, paint);
        text.push('\n');
    }
    text
}

fn handler(paint: Paint) -> GraphicalReportHandler {
    let styles = match paint.colour {
        true => ThemeStyles::ansi(),
        false => ThemeStyles::none(),
    };
    let mut characters = ThemeCharacters::unicode();
    characters.error = "×".to_owned();
    characters.warning = "!".to_owned();
    characters.advice = "·".to_owned();
    GraphicalReportHandler::new_themed(GraphicalTheme { characters, styles })
        .with_context_lines(0)
        .with_width(WIDTH)
        .with_links(false)
        .without_cause_chain()
        .without_primary_span_start()
}

/// `path:line:column level rule`, which terminals and editors can follow.
fn header(locator: &Locator<'_>, finding: &Finding, paint: Paint) -> String {
    let (line, column) = locator
        .position(&finding.place)
        .map_or((1, 1), |at| (at.line, at.column));
    let file = locator.file_name(finding.place.file);
    format!(
        "{} {} {}\n",
        paint.strong(&format!("{file}:{line}:{column}")),
        paint.level(finding.level, words::level(finding.level)),
        finding.rule
    )
}

/// What follows the lines: places in other files, and the fixes.
fn footer(locator: &Locator<'_>, finding: &Finding, paint: Paint) -> String {
    let mut text = String::new();
    let elsewhere = finding.related.iter();
    for (place, what) in elsewhere.filter(|(place, _)| place.file != finding.place.file) {
        let line = locator.line(place);
        let file = locator.file_name(place.file);
        text += &format!("  {} {file}:{line}: {what}\n", paint.faint("see:"));
    }
    for fix in &finding.fixes {
        text += &format!("  {} {}\n", paint.faint("fix:"), fix.title);
    }
    text
}

/// Lines longer than this, in bytes, are shown in part.
const LONGEST: usize = 400;
/// How much of them is shown on either side of what is found, and how much of that at most.
const AROUND: usize = 60;
const WIDEST: usize = 200;

/// A finding as miette wants it.
struct Shown<'a> {
    finding: &'a Finding,
    labels: Vec<LabeledSpan>,
    snippet: &'a Snippet,
}

impl<'a> Shown<'a> {
    fn new(locator: &Locator<'_>, finding: &'a Finding, snippet: &'a Snippet) -> Self {
        let mut labels = Vec::new();
        let place = locator.analysis().absolute(&finding.place);
        if let Some(span) = place.and_then(|(_, span)| snippet.visible(span)) {
            labels.push(LabeledSpan::new_primary_with_span(None, span));
        }
        for (place, what) in &finding.related {
            if place.file != finding.place.file || labels.is_empty() {
                continue;
            }
            let span = locator.analysis().absolute(place);
            let near = |span: &SourceSpan| {
                labels
                    .first()
                    .is_some_and(|first: &LabeledSpan| snippet.together(*first.inner(), *span))
            };
            let span = span.and_then(|(_, span)| snippet.visible(span));
            if let Some(span) = span.filter(near) {
                labels.push(LabeledSpan::new_with_span(Some(what.clone()), span));
            }
        }
        Self {
            finding,
            labels,
            snippet,
        }
    }
}

impl fmt::Display for Shown<'_> {
    fn fmt(&self, formatter: &mut fmt::Formatter<'_>) -> fmt::Result {
        formatter.write_str(&self.finding.message)
    }
}

impl fmt::Debug for Shown<'_> {
    fn fmt(&self, formatter: &mut fmt::Formatter<'_>) -> fmt::Result {
        formatter.write_str(&self.finding.message)
    }
}

impl std::error::Error for Shown<'_> {}

impl Diagnostic for Shown<'_> {
    fn severity(&self) -> Option<Severity> {
        Some(match self.finding.level {
            Level::Error => Severity::Error,
            Level::Warning => Severity::Warning,
            Level::Note => Severity::Advice,
        })
    }

    fn help<'b>(&'b self) -> Option<Box<dyn fmt::Display + 'b>> {
        let help = self.finding.help.as_ref()?;
        Some(Box::new(help))
    }

    fn source_code(&self) -> Option<&dyn SourceCode> {
        (!self.labels.is_empty()).then_some(self.snippet as &dyn SourceCode)
    }

    fn labels(&self) -> Option<Box<dyn Iterator<Item = LabeledSpan> + '_>> {
        (!self.labels.is_empty()).then(|| Box::new(self.labels.iter().cloned()) as Box<_>)
    }
}

/// A file's text for display. Reading a span costs the lines it touches, not the file.
struct Snippet {
    lines: Arc<Lines>,
    /// The text with each lone CR as LF and each other control character as a blank, byte for byte,
    /// so that nothing in a file can steer the terminal.
    shown: String,
}

impl Snippet {
    fn new(lines: &Arc<Lines>) -> Self {
        let text = lines.text();
        let mut shown = String::with_capacity(text.len());
        let mut rest = text.chars().peekable();
        while let Some(character) = rest.next() {
            match character {
                '\r' if rest.peek() == Some(&'\n') => shown.push('\r'),
                '\r' => shown.push('\n'),
                '\n' | '\t' => shown.push(character),
                '\u{80}'..='\u{9f}' => shown.push_str("  "),
                // A mark of three bytes that shows nothing; direction marks could reorder the line.
                '\u{feff}' | '\u{202a}'..='\u{202e}' | '\u{2066}'..='\u{2069}' => {
                    shown.push_str("   ")
                }
                other if other.is_control() => shown.push(' '),
                other => shown.push(other),
            }
        }
        Self {
            lines: Arc::clone(lines),
            shown,
        }
    }

    /// A span that can be drawn: within the text, without line ends at its own end, at least one
    /// character where the line has one. `None` in an empty text.
    fn visible(&self, span: Span) -> Option<SourceSpan> {
        let length = self.shown.len();
        let start = self.boundary((span.start as usize).min(length));
        let end = self.boundary((span.end as usize).min(length)).max(start);
        let end = end.min(self.boundary((start + WIDEST).min(length)));
        let marked = self.shown.get(start..end)?.trim_end().len();
        if marked > 0 {
            return Some((start, marked).into());
        }
        let line = self
            .lines
            .range(self.lines.line_of(u32::try_from(start).ok()?));
        let content = self.shown.get(line.clone())?.trim_end().len();
        let after = self.shown.get(start..line.start + content).unwrap_or("");
        if let Some(character) = after.chars().next() {
            return Some((start, character.len_utf8()).into());
        }
        let before = self.shown.get(line.start..line.start + content)?;
        match before.chars().next_back() {
            Some(last) => Some((line.start + content - last.len_utf8(), last.len_utf8()).into()),
            None => (line.start < length).then(|| (line.start, 0).into()),
        }
    }

    /// What is shown of the lines around a span: of a very long line, a stretch about the span.
    fn window(&self, first: Range<usize>, last: Range<usize>, span: Range<usize>) -> Range<usize> {
        let mut shown = first.start..last.end;
        if first.len() > LONGEST {
            shown.start = self.boundary(span.start.saturating_sub(AROUND).max(first.start));
        }
        if last.len() > LONGEST {
            shown.end = self.boundary((span.end + AROUND).min(last.end));
        }
        shown
    }

    /// Whether two spans can be shown in one picture: not at the ends of a very long line.
    fn together(&self, one: SourceSpan, other: SourceSpan) -> bool {
        let start = one.offset().min(other.offset());
        let end = (one.offset() + one.len()).max(other.offset() + other.len());
        let of = |byte: usize| self.lines.line_of(u32::try_from(byte).unwrap_or(u32::MAX));
        end - start <= LONGEST || of(one.offset()) != of(other.offset())
    }

    fn boundary(&self, byte: usize) -> usize {
        let mut byte = byte;
        while !self.shown.is_char_boundary(byte) {
            byte -= 1;
        }
        byte
    }
}

impl SourceCode for Snippet {
    fn read_span<'a>(
        &'a self,
        span: &SourceSpan,
        lines_before: usize,
        lines_after: usize,
    ) -> Result<Box<dyn SpanContents<'a> + 'a>, MietteError> {
        let line_of = |byte: usize| self.lines.line_of(u32::try_from(byte).unwrap_or(u32::MAX));
        let count = |lines: usize| u32::try_from(lines).unwrap_or(u32::MAX);
        let (before, after) = (count(lines_before), count(lines_after));
        let first = line_of(span.offset()).saturating_sub(before);
        let end = span.offset() + span.len().max(1) - 1;
        let last = (line_of(end) + after).min(self.lines.last());
        let (top, bottom) = (self.lines.range(first), self.lines.range(last));
        let spanned = span.offset()..span.offset() + span.len();
        let bytes = self.window(top, bottom, spanned);
        let data = self
            .shown
            .get(bytes.clone())
            .ok_or(MietteError::OutOfBounds)?;
        let covered = SourceSpan::from((bytes.start, bytes.len()));
        Ok(Box::new(MietteSpanContents::new(
            data.as_bytes(),
            covered,
            first as usize,
            0,
            (last - first) as usize + 1,
        )))
    }
}
