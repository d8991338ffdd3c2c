//! What an editor can do at a place: the rules' fixes, a waiver, and small rewrites. Neutral: bytes and text.

use std::path::{Path, PathBuf};

use super::analysis::{Analysis, FileAnalysis, SectionAnalysis};
use super::analyst::Analyst;
use super::units::Trade;
use super::{meet, rule_page, trial};
use crate::bands::{Assessment, GapKind, TargetState};
use crate::model::{FileSource, Layer, ParameterKind, Place};
use crate::rules::{Finding, Fix};
use crate::syntax::{Entry, SectionKind};
use crate::text::Span;

/// The kinds of action, as editors group them.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum ActionKind {
    /// Mends a finding.
    Mend,
    /// Takes a value out into a name.
    Extract,
    /// Writes the same, or nearly, in another way.
    Rewrite,
}

/// Something to do.
#[derive(Clone, Debug, PartialEq)]
pub struct Action {
    /// What it does, as an imperative.
    pub title: String,
    /// Its kind.
    pub kind: ActionKind,
    /// Replacements in absolute bytes, by file; none overlapping another.
    pub edits: Vec<(PathBuf, Span, String)>,
    /// Whether it is the one to take where only one may be.
    pub preferred: bool,
    /// The rule whose finding it mends.
    pub rule: Option<&'static str>,
}

/// What actions are made from.
#[derive(Clone, Copy)]
pub struct Asked<'a> {
    /// Solves what an action needs.
    pub analyst: &'a Analyst,
    /// Where files come from.
    pub source: &'a dyn FileSource,
    /// What is known of them.
    pub analysis: &'a Analysis,
    /// Whether the actions are not wanted any more.
    pub cancel: &'a (dyn Fn() -> bool + Sync),
}

/// What can be done within a range of bytes of a file. On the line of a target that is not met this solves for what
/// would meet it.
#[must_use]
pub fn actions(asked: &Asked<'_>, path: &Path, range: Span) -> Vec<Action> {
    let analysis = asked.analysis;
    let Some(file) = analysis.file(path) else {
        return Vec::new();
    };
    let mut actions = Vec::new();
    for finding in touched(analysis, file, range) {
        for fix in &finding.fixes {
            actions.extend(mend(analysis, finding, fix));
        }
    }
    for finding in touched(analysis, file, range) {
        let waiver = waive(file, finding);
        actions.extend(waiver.filter(|waiver| !actions.contains(waiver)));
    }
    if let Some((entry, section)) = file.section_at(range.start) {
        let desk = Desk {
            asked,
            file,
            entry,
            section,
            at: range.start - entry.start,
        };
        actions.extend(desk.meet_target());
        actions.extend(desk.whole_monolayers());
        actions.extend(desk.name_number());
        actions.extend(desk.require_today());
    }
    actions
}

fn touched<'a>(
    analysis: &'a Analysis,
    file: &'a FileAnalysis,
    range: Span,
) -> impl Iterator<Item = &'a Finding> {
    let findings = file.findings.iter().map(AsRef::as_ref);
    findings.filter(move |finding: &&Finding| {
        let span = analysis.absolute(&finding.place);
        span.is_some_and(|(_, span)| span.start <= range.end && range.start <= span.end)
    })
}

fn mend(analysis: &Analysis, finding: &Finding, fix: &Fix) -> Option<Action> {
    let edits: Option<Vec<_>> = fix
        .edits
        .iter()
        .map(|edit| {
            let (path, span) = analysis.absolute(&edit.place)?;
            Some((path.to_owned(), span, edit.text.clone()))
        })
        .collect();
    Some(Action {
        title: fix.title.clone(),
        kind: ActionKind::Mend,
        edits: edits?,
        preferred: fix.safe,
        rule: Some(finding.rule),
    })
}

/// A waiver as the first statement of the finding's section, or a line of the preamble; the reason is the writer's to give.
fn waive(file: &FileAnalysis, finding: &Finding) -> Option<Action> {
    if !rule_page::find(finding.rule)?.waivable || finding.place.file != file.file {
        return None;
    }
    let entry = file
        .tree
        .entries
        .iter()
        .find(|entry| entry.id == finding.place.section)?;
    let statement = format!("waive {} because \"say why\"", finding.rule);
    let (at, text) = match entry.section.kind {
        SectionKind::Preamble => (entry.start, format!("{statement}{}", line_end(entry))),
        _ => below_heading(entry, &statement)?,
    };
    Some(Action {
        title: format!("waive {} here, with a reason", finding.rule),
        kind: ActionKind::Mend,
        edits: vec![(file.path.clone(), Span::new(at, at), text)],
        preferred: false,
        rule: Some(finding.rule),
    })
}

/// Where a statement goes to be the first below the heading, and the text to put there.
fn below_heading(entry: &Entry, statement: &str) -> Option<(u32, String)> {
    let line = entry
        .section
        .lines
        .iter()
        .find(|line| line.span.touches(entry.section.heading.start))?;
    let text = line.span.of(&entry.section.text);
    let body = u32::try_from(text.trim_end_matches(['\r', '\n']).len()).ok()?;
    let indent = indent(entry);
    Some((
        entry.start + line.span.start + body,
        format!("{}{indent}{statement}", line_end(entry)),
    ))
}

/// The indent of the section's first statement, or two blanks.
fn indent(entry: &Entry) -> String {
    let first = entry.section.statements.first();
    let text = &entry.section.text;
    let before = first.and_then(|statement| text.get(..statement.span.start as usize));
    let line = before.and_then(|before| before.rsplit(['\n', '\r']).next());
    match line {
        Some(line)
            if line
                .chars()
                .all(|character| character == ' ' || character == '\t') =>
        {
            line.to_owned()
        }
        _ => "  ".to_owned(),
    }
}

/// The line terminator that the section uses.
fn line_end(entry: &Entry) -> &'static str {
    let text = &entry.section.text;
    match (text.contains("\r\n"), text.contains('\n')) {
        (true, _) => "\r\n",
        (false, false) if text.contains('\r') => "\r",
        _ => "\n",
    }
}

/// A place in a section, and what is known there.
struct Desk<'a> {
    asked: &'a Asked<'a>,
    file: &'a FileAnalysis,
    entry: &'a Entry,
    section: &'a SectionAnalysis,
    at: u32,
}

impl Desk<'_> {
    fn holds(&self, place: &Place) -> bool {
        place.file == self.file.file && place.section == self.entry.id
    }

    fn rewrite(&self, title: String, kind: ActionKind, edits: Vec<(u32, u32, String)>) -> Action {
        let edits = edits.into_iter().map(|(start, end, text)| {
            (
                self.file.path.clone(),
                Span::new(start, end).shifted(self.entry.start),
                text,
            )
        });
        Action {
            title,
            kind,
            edits: edits.collect(),
            preferred: false,
            rule: None,
        }
    }

    /// Rounds a layer's thickness to whole monolayers.
    fn whole_monolayers(&self) -> Option<Action> {
        let crystal = self.section.crystal.as_deref()?;
        let mut layers = crystal.potential.layers.iter();
        let layer: &Layer =
            layers.find(|layer| self.holds(&layer.place) && layer.place.span.touches(self.at))?;
        let count = layer.length.value / layer.monolayer.as_ref()?.value;
        let whole = count.round();
        if !count.is_finite() || whole < 1.0 || (count - whole).abs() < 1e-9 {
            return None;
        }
        let span = layer.length_place.span;
        let written = span.of(&self.entry.section.text);
        // A tolerance behind the thickness stays as it is.
        let kept = written
            .find(['±', '+'])
            .map_or("", |from| written.get(from..).unwrap_or(""));
        let text = match kept {
            "" => format!("{whole} ML"),
            kept => format!("{whole} ML {kept}"),
        };
        let title = format!("make it {whole} ML");
        Some(self.rewrite(
            title,
            ActionKind::Rewrite,
            vec![(span.start, span.end, text)],
        ))
    }

    /// Gives a number a name.
    fn name_number(&self) -> Option<Action> {
        let parameters = self.section.parameters.iter();
        let number = parameters
            .filter(|parameter| parameter.kind == ParameterKind::Literal)
            .filter(|parameter| self.holds(&parameter.place))
            .find(|parameter| parameter.place.span.touches(self.at))?;
        if self.entry.section.kind == SectionKind::Preamble || self.inside_let(number.place.span) {
            return None;
        }
        let name = self.free_name();
        let (at, text) = below_heading(self.entry, &format!("let {name} = {}", number.text))?;
        let at = at - self.entry.start;
        let span = number.place.span;
        let edits = vec![(at, at, text), (span.start, span.end, name.clone())];
        Some(self.rewrite(format!("name it `{name}`"), ActionKind::Extract, edits))
    }

    fn inside_let(&self, span: Span) -> bool {
        let mut statements = self.entry.section.statements.iter();
        statements.any(|statement| {
            let is_let = matches!(statement.kind, crate::syntax::StatementKind::Let { .. });
            is_let && statement.span.start <= span.start && span.end <= statement.span.end
        })
    }

    fn free_name(&self) -> String {
        let text = &self.file.tree.text;
        let mut number = 1;
        while text.contains(&format!("value_{number}")) {
            number += 1;
        }
        format!("value_{number}")
    }

    /// The changes of one number that meet the target on this line.
    fn meet_target(&self) -> Vec<Action> {
        let lines = &self.entry.section.lines;
        let Some(line) = lines.iter().find(|line| line.span.touches(self.at)) else {
            return Vec::new();
        };
        let here = |target: &Assessment| {
            let start = target.place.span.start;
            self.holds(&target.place) && line.span.start <= start && start < line.span.end
        };
        match self.section.targets.iter().position(here) {
            Some(index) => meet::meet(self.asked, self.file, self.section, index),
            None => Vec::new(),
        }
    }

    /// Requires what today's lowest open gap keeps, tolerances included, in two digits.
    fn require_today(&self) -> Option<Action> {
        if !self.entry.section.heading.touches(self.at) {
            return None;
        }
        let solution = self.section.solution().filter(|solution| solution.fine)?;
        let open = |kind: GapKind| matches!(kind, GapKind::Direct | GapKind::Indirect);
        let band = solution.gaps.iter().position(|gap| open(gap.kind))?;
        let size = solution.gaps.get(band)?.size;
        let (action, outcome) = self.require_gap(band + 1, size.value - size.uncertainty)?;
        if outcome.state == TargetState::Met {
            return Some(action);
        }
        let (action, outcome) = self.require_gap(band + 1, outcome.worst?)?;
        (outcome.state == TargetState::Met).then_some(action)
    }

    /// A requirement that a gap be as large as a size (J), rounded down, and what becomes of it.
    fn require_gap(&self, band: usize, size: f64) -> Option<(Action, Assessment)> {
        if size <= 0.0 {
            return None;
        }
        let crystal = self.section.crystal.as_deref()?;
        let scale = Trade::of(crystal).energy(size);
        let told = rounded_down(size / scale.factor);
        let statement = format!("require gap {band} >= {told} {}", scale.name);
        let (at, text) = self.at_end(&statement)?;
        let action = self.rewrite(
            format!("add `{statement}`"),
            ActionKind::Rewrite,
            vec![(at, at, text)],
        );
        let section = self.section.section;
        let mut after = trial::targets(self.asked, self.file, section, &action.edits)?;
        Some((action, after.pop()?))
    }

    /// Where a statement goes to be the section's last, and the text to put there.
    fn at_end(&self, statement: &str) -> Option<(u32, String)> {
        let Some(last) = self.entry.section.statements.last() else {
            let (at, text) = below_heading(self.entry, statement)?;
            return Some((at - self.entry.start, text));
        };
        // A comment behind the last statement stays on its line.
        let end = last.span.end;
        let mut lines = self.entry.section.lines.iter();
        let line = lines.find(|line| line.span.touches(end));
        let at = line.map_or(end, |line| line.comment.end.max(end));
        let text = format!("{}{}{statement}", line_end(self.entry), indent(self.entry));
        Some((at, text))
    }
}

/// A positive number in two significant digits, not above it.
fn rounded_down(value: f64) -> f64 {
    let places = 1 - value.log10().floor() as i32;
    let size = 10_f64.powi(places.abs());
    match places >= 0 {
        true => (value * size).floor() / size,
        false => (value / size).floor() * size,
    }
}
