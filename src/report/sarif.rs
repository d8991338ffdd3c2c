//! `lint --format sarif`: the OASIS standard SARIF 2.1.0.
//!
//! Columns are told in Unicode code points (`columnKind`). A result's
//! fingerprint is made of its rule, its section and the text of its line, so that
//! it survives lines moving above it.

use std::collections::HashMap;
use std::path::Path;

use serde_json::{Value, json};

use super::analysis::FileAnalysis;
use super::locate::{Locator, Position};
use super::words;
use crate::model::Place;
use crate::rules::{self, Finding, Fix, Level};
use crate::syntax::SectionKind;

const SCHEMA: &str =
    "https://docs.oasis-open.org/sarif/sarif/v2.1.0/errata01/os/schemas/sarif-schema-2.1.0.json";

/// The whole log of these results.
#[must_use]
pub fn log(results: &[Value]) -> Value {
    json!({
        "$schema": SCHEMA,
        "version": "2.1.0",
        "runs": [{
            "tool": { "driver": {
                "name": "crenate",
                "semanticVersion": env!("CARGO_PKG_VERSION"),
                "rules": rules::all().iter().map(rule).collect::<Vec<_>>(),
            }},
            "columnKind": "unicodeCodePoints",
            "results": results,
        }],
    })
}

fn rule(rule: &rules::Rule) -> Value {
    let doc = rule.doc();
    let help = format!("{}\n\n{}", doc.matters, doc.fix);
    json!({
        "id": rule.name,
        "shortDescription": { "text": rule.summary() },
        "fullDescription": { "text": doc.finds },
        "help": { "text": help.trim(), "markdown": super::rule_page::markdown(rule) },
        "defaultConfiguration": { "level": level(rule.level) },
    })
}

fn level(level: Level) -> &'static str {
    words::level(level)
}

/// The results of one file, in order.
#[must_use]
pub fn results(
    locator: &Locator<'_>,
    analysed: &FileAnalysis,
    findings: &[&Finding],
) -> Vec<Value> {
    let mut seen = HashMap::new();
    findings
        .iter()
        .map(|finding| {
            let print = fingerprint(locator, analysed, finding);
            let before = seen.entry(print.clone()).or_insert(0usize);
            *before += 1;
            result(locator, finding, &format!("{print}:{before}"))
        })
        .collect()
}

fn result(locator: &Locator<'_>, finding: &Finding, print: &str) -> Value {
    let index = rules::all()
        .iter()
        .position(|rule| rule.name == finding.rule);
    let message = match &finding.help {
        Some(help) => format!("{}\n{help}", finding.message),
        None => finding.message.clone(),
    };
    let related = finding
        .related
        .iter()
        .enumerate()
        .map(|(id, (place, what))| {
            let described = json!({ "id": id + 1, "message": { "text": what } });
            merged(location(locator, place), described)
        });
    let result = json!({
        "ruleId": finding.rule,
        "level": level(finding.level),
        "message": { "text": message },
        "locations": [location(locator, &finding.place)],
        "relatedLocations": related.collect::<Vec<_>>(),
        "partialFingerprints": { "crenateLine/v1": print },
        "fixes": finding.fixes.iter().map(|fix| self::fix(locator, fix)).collect::<Vec<_>>(),
    });
    match index {
        Some(index) => merged(result, json!({ "ruleIndex": index })),
        None => result,
    }
}

/// One object with the fields of both.
fn merged(first: Value, second: Value) -> Value {
    match (first, second) {
        (Value::Object(mut fields), Value::Object(more)) => {
            fields.extend(more);
            Value::Object(fields)
        }
        (first, _) => first,
    }
}

fn location(locator: &Locator<'_>, place: &Place) -> Value {
    let artifact = artifact(locator, place);
    match locator.position(place) {
        Some(at) => {
            json!({ "physicalLocation": { "artifactLocation": artifact, "region": region(at) } })
        }
        None => json!({ "physicalLocation": { "artifactLocation": artifact } }),
    }
}

fn artifact(locator: &Locator<'_>, place: &Place) -> Value {
    json!({ "uri": uri(locator.analysis().path(place.file).unwrap_or(Path::new(""))) })
}

fn region(at: Position) -> Value {
    json!({
        "startLine": at.line,
        "startColumn": at.column,
        "endLine": at.end_line,
        "endColumn": at.end_column,
    })
}

fn fix(locator: &Locator<'_>, fix: &Fix) -> Value {
    let mut changes: Vec<(Place, Vec<Value>)> = Vec::new();
    for edit in &fix.edits {
        let Some(at) = locator.position(&edit.place) else {
            continue;
        };
        let replacement = json!({
            "deletedRegion": region(at),
            "insertedContent": { "text": edit.text },
        });
        match changes
            .iter_mut()
            .find(|(place, _)| place.file == edit.place.file)
        {
            Some((_, list)) => list.push(replacement),
            None => changes.push((edit.place, vec![replacement])),
        }
    }
    let changes = changes.iter().map(|(place, replacements)| {
        json!({ "artifactLocation": artifact(locator, place), "replacements": replacements })
    });
    json!({
        "description": { "text": fix.title },
        "artifactChanges": changes.collect::<Vec<_>>(),
    })
}

/// A path as a URI reference: relative stays relative, absolute becomes `file:`.
#[must_use]
pub fn uri(path: &Path) -> String {
    let shown = super::locate::shown_path(path);
    let mut text = String::new();
    for byte in shown.bytes() {
        match byte {
            b'a'..=b'z' | b'A'..=b'Z' | b'0'..=b'9' | b'-' | b'.' | b'_' | b'~' | b'/' => {
                text.push(char::from(byte));
            }
            other => text += &format!("%{other:02X}"),
        }
    }
    match shown.starts_with('/') {
        true => format!("file://{text}"),
        false => text,
    }
}

/// Rule, section and line text, hashed.
fn fingerprint(locator: &Locator<'_>, analysed: &FileAnalysis, finding: &Finding) -> String {
    let entry = analysed
        .tree
        .entries
        .iter()
        .find(|entry| entry.id == finding.place.section);
    let section = entry.map(|entry| &entry.section);
    let kind = match section.map(|section| section.kind) {
        Some(SectionKind::Material) => "material",
        Some(SectionKind::Crystal) => "crystal",
        Some(SectionKind::Preamble) | None => "preamble",
    };
    let name = section.and_then(|section| section.name.as_ref());
    let span = locator
        .analysis()
        .absolute(&finding.place)
        .map(|(_, span)| span);
    let lines = locator.lines(analysed.file);
    let text = lines.as_ref().and_then(|lines| {
        let line = lines.line_of(span?.start);
        lines.text().get(lines.range(line))
    });
    let words: Vec<&str> = text.unwrap_or("").split_whitespace().collect();
    let mut hash = Fnv::default();
    hash.write(finding.rule);
    hash.write(kind);
    hash.write(name.map_or("", |name| &name.text));
    hash.write(&words.join(" "));
    format!("{:016x}", hash.0)
}

/// The 64-bit FNV-1a hash: the same in every version and on every machine, as a fingerprint must be.
struct Fnv(u64);

impl Default for Fnv {
    fn default() -> Self {
        Self(0xcbf2_9ce4_8422_2325)
    }
}

impl Fnv {
    fn write(&mut self, text: &str) {
        for byte in text.bytes().chain([0]) {
            self.0 = (self.0 ^ u64::from(byte)).wrapping_mul(0x0000_0100_0000_01b3);
        }
    }
}
