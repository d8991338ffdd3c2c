//! `lint --format json`: the schema `crenate-lint-1`. Lines and columns from 1, columns in characters, ends exclusive.

use serde::Serialize;

use super::locate::{Locator, Position};
use super::words;
use crate::rules::{Finding, Fix, Replacement};

/// The name of the schema.
pub const SCHEMA: &str = "crenate-lint-1";

/// One finding.
#[derive(Debug, Serialize)]
pub struct FindingRecord {
    file: String,
    line: usize,
    column: usize,
    end_line: usize,
    end_column: usize,
    rule: &'static str,
    level: &'static str,
    message: String,
    help: Option<String>,
    fixes: Vec<FixRecord>,
    /// Other places that take part.
    related: Vec<RelatedRecord>,
}

#[derive(Debug, Serialize)]
struct FixRecord {
    title: String,
    safe: bool,
    edits: Vec<EditRecord>,
}

#[derive(Debug, Serialize)]
struct EditRecord {
    file: String,
    line: usize,
    column: usize,
    end_line: usize,
    end_column: usize,
    text: String,
}

#[derive(Debug, Serialize)]
struct RelatedRecord {
    file: String,
    line: usize,
    column: usize,
    message: String,
}

const TOP: Position = Position {
    line: 1,
    column: 1,
    end_line: 1,
    end_column: 1,
};

/// The record of one finding.
#[must_use]
pub fn record(locator: &Locator<'_>, finding: &Finding) -> FindingRecord {
    let at = locator.position(&finding.place).unwrap_or(TOP);
    FindingRecord {
        file: locator.file_name(finding.place.file),
        line: at.line,
        column: at.column,
        end_line: at.end_line,
        end_column: at.end_column,
        rule: finding.rule,
        level: words::level(finding.level),
        message: finding.message.clone(),
        help: finding.help.clone(),
        fixes: finding
            .fixes
            .iter()
            .map(|fix| fix_record(locator, fix))
            .collect(),
        related: related(locator, finding),
    }
}

/// The record of one finding as one line.
#[must_use]
pub fn line(locator: &Locator<'_>, finding: &Finding) -> String {
    serde_json::to_string(&record(locator, finding)).unwrap_or_default()
}

fn related(locator: &Locator<'_>, finding: &Finding) -> Vec<RelatedRecord> {
    let places = finding.related.iter();
    places
        .map(|(place, message)| {
            let at = locator.position(place).unwrap_or(TOP);
            RelatedRecord {
                file: locator.file_name(place.file),
                line: at.line,
                column: at.column,
                message: message.clone(),
            }
        })
        .collect()
}

fn fix_record(locator: &Locator<'_>, fix: &Fix) -> FixRecord {
    FixRecord {
        title: fix.title.clone(),
        safe: fix.safe,
        edits: fix
            .edits
            .iter()
            .map(|edit| edit_record(locator, edit))
            .collect(),
    }
}

fn edit_record(locator: &Locator<'_>, edit: &Replacement) -> EditRecord {
    let at = locator.position(&edit.place).unwrap_or(TOP);
    EditRecord {
        file: locator.file_name(edit.place.file),
        line: at.line,
        column: at.column,
        end_line: at.end_line,
        end_column: at.end_column,
        text: edit.text.clone(),
    }
}
