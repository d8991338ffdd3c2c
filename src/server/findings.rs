//! Findings as the client's diagnostics.

use std::collections::HashMap;
use std::path::Path;

use tower_lsp::lsp_types::{
    CodeDescription, Diagnostic, DiagnosticRelatedInformation, DiagnosticSeverity, DiagnosticTag,
    Location, NumberOrString, Range, Url,
};

use super::abilities::Abilities;
use super::files::{Files, OpenFile};
use super::{explanations, positions};
use crate::report::editor_text::FileId;
use crate::report::{Analysis, Finding, Level};
use crate::text::{LineIndex, Span};

/// What the diagnostics say that they come from.
pub(super) const SOURCE: &str = "crenate";

/// All findings of the file at `path`.
pub(super) fn of_file(
    analysis: &Analysis,
    files: &Files,
    path: &Path,
    abilities: &Abilities,
) -> Vec<Diagnostic> {
    let mut locations = Locations::new(analysis, files, abilities);
    let findings = analysis.file(path).map_or(&[][..], |file| &file.findings);
    findings
        .iter()
        .filter_map(|finding| diagnostic(finding, &mut locations, abilities))
        .collect()
}

/// One finding; `None` where its place is gone.
pub(super) fn diagnostic(
    finding: &Finding,
    locations: &mut Locations<'_>,
    abilities: &Abilities,
) -> Option<Diagnostic> {
    let range = locations.range(&finding.place)?;
    let message = match &finding.help {
        Some(help) => format!("{}\n{help}", finding.message),
        None => finding.message.clone(),
    };
    let told = finding.related.iter().filter(|_| abilities.finding_related);
    let related = told.filter_map(|(place, message)| {
        let location = locations.of(place)?;
        Some(DiagnosticRelatedInformation {
            location,
            message: message.clone(),
        })
    });
    let related: Vec<DiagnosticRelatedInformation> = related.collect();
    Some(Diagnostic {
        range,
        severity: Some(severity(finding.level)),
        code: Some(NumberOrString::String(finding.rule.to_owned())),
        code_description: link(finding.rule, abilities),
        source: Some(SOURCE.to_owned()),
        message,
        related_information: (!related.is_empty()).then_some(related),
        tags: (abilities.finding_unnecessary && finding.unused)
            .then(|| vec![DiagnosticTag::UNNECESSARY]),
        data: None,
    })
}

fn severity(level: Level) -> DiagnosticSeverity {
    match level {
        Level::Error => DiagnosticSeverity::ERROR,
        Level::Warning => DiagnosticSeverity::WARNING,
        Level::Note => DiagnosticSeverity::INFORMATION,
    }
}

fn link(rule: &'static str, abilities: &Abilities) -> Option<CodeDescription> {
    if !abilities.finding_link {
        return None;
    }
    let href = explanations::page(rule)?;
    Some(CodeDescription { href })
}

/// Finds the client's locations of places; each file's lines are counted once.
pub(super) struct Locations<'a> {
    analysis: &'a Analysis,
    files: &'a Files,
    abilities: &'a Abilities,
    lines: HashMap<Url, LineIndex>,
    /// The open document that was asked for last: most places are in one.
    last: Option<(FileId, &'a OpenFile)>,
}

impl<'a> Locations<'a> {
    /// For places of this analysis.
    pub(super) fn new(analysis: &'a Analysis, files: &'a Files, abilities: &'a Abilities) -> Self {
        Self {
            analysis,
            files,
            abilities,
            lines: HashMap::new(),
            last: None,
        }
    }

    /// Where in its file a place is; `None` where it is gone.
    pub(super) fn range(&mut self, place: &crate::report::editor_text::Place) -> Option<Range> {
        let (path, span) = self.analysis.absolute(place)?;
        if self.last.is_none_or(|(id, _)| id != place.file) {
            let open = self.files.open.get(path);
            self.last = open.map(|open| (place.file, open.as_ref()));
        }
        match self.last {
            Some((_, file)) => Some(positions::range(
                file.lines(),
                span,
                self.abilities.encoding(),
            )),
            None => self.span(path, span).map(|location| location.range),
        }
    }

    /// Where a place is; `None` where it is gone.
    pub(super) fn of(&mut self, place: &crate::report::editor_text::Place) -> Option<Location> {
        let (path, span) = self.analysis.absolute(place)?;
        self.span(path, span)
    }

    /// Where some bytes of a file are.
    pub(super) fn span(&mut self, path: &Path, span: Span) -> Option<Location> {
        let encoding = self.abilities.encoding();
        if let Some(file) = self.files.open.get(path) {
            return Some(Location::new(
                file.uri.clone(),
                positions::range(file.lines(), span, encoding),
            ));
        }
        let uri = self.files.uri(path)?;
        let lines = match self.lines.entry(uri.clone()) {
            std::collections::hash_map::Entry::Occupied(known) => known.into_mut(),
            std::collections::hash_map::Entry::Vacant(empty) => {
                let tree = crate::report::FileSource::tree(self.files, path).ok()?;
                empty.insert(LineIndex::new(&tree.text))
            }
        };
        Some(Location::new(uri, positions::range(lines, span, encoding)))
    }
}
