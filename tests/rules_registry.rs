//! Runs the documentation of every rule through the whole pipeline: its example is found exactly where it is marked,
//! its *instead* is silent, its safe fixes come to rest and add nothing; and the reference page is up to date.

#![allow(missing_docs, clippy::unwrap_used, clippy::indexing_slicing)]

mod memory;

use std::fmt::Write as _;
use std::path::{Path, PathBuf};
use std::sync::Arc;

use crenate::model::{Place, normalise};
use crenate::report::analysis::FileAnalysis;
use crenate::report::analyst::{Analyst, Request};
use crenate::rules::{self, Finding, Fix, Level, Mark, Rule, Sample, Tier};
use crenate::text::Span;
use memory::Memory;

/// The name under which an example stands.
const EXAMPLE: &str = "/example.cren";
/// Fixes come to rest within so many rounds.
const ROUNDS: usize = 8;

/// A text beside the files of its rule's documentation.
fn files(text: &str, sample: &Sample) -> Memory {
    let path = |name: &str| normalise(&Path::new("/").join(name));
    let others = sample.files.iter();
    let others = others.map(|(name, text)| (path(name), text.clone()));
    Memory::of([(path(EXAMPLE), text.to_owned())].into_iter().chain(others))
}

/// What the whole pipeline makes of a text.
fn analysed(text: &str, sample: &Sample) -> Arc<FileAnalysis> {
    let source = files(text, sample);
    let roots = [PathBuf::from(EXAMPLE)];
    let analysis = Analyst::default().analyse(&Request {
        source: &source,
        roots: &roots,
        depth: Tier::Bands,
        cancel: &|| false,
    });
    Arc::clone(analysis.file(Path::new(EXAMPLE)).unwrap())
}

/// A place as bytes of the whole text.
fn absolute(file: &FileAnalysis, place: Place) -> Span {
    let entry = file
        .tree
        .entries
        .iter()
        .find(|entry| entry.id == place.section)
        .unwrap();
    place.span.shifted(entry.start)
}

/// A place as the mark that would stand under it.
fn mark(file: &FileAnalysis, place: Place) -> Mark {
    let span = absolute(file, place);
    let text: &str = &file.tree.text;
    let before = &text[..span.start as usize];
    let start = before.rfind('\n').map_or(0, |at| at + 1);
    let column = text[start..span.start as usize].chars().count() + 1;
    Mark {
        line: before.matches('\n').count() + 1,
        column,
        end_column: column + span.of(text).chars().count(),
    }
}

fn apply(file: &FileAnalysis, fix: &Fix) -> String {
    let mut text = file.tree.text.to_string();
    let mut edits: Vec<(Span, &str)> = fix
        .edits
        .iter()
        .map(|edit| (absolute(file, edit.place), edit.text.as_str()))
        .collect();
    edits.sort();
    for (span, new) in edits.into_iter().rev() {
        text.replace_range(span.start as usize..span.end as usize, new);
    }
    text
}

fn of_rule<'f>(file: &'f FileAnalysis, rule: &Rule) -> Vec<&'f Finding> {
    file.findings
        .iter()
        .map(AsRef::as_ref)
        .filter(|finding: &&Finding| finding.rule == rule.name)
        .collect()
}

fn told(findings: &[Arc<Finding>]) -> String {
    findings.iter().fold(String::new(), |mut text, finding| {
        let _ = writeln!(
            text,
            "  {} {}: {}",
            finding.level.word(),
            finding.rule,
            finding.message
        );
        text
    })
}

#[test]
fn every_rule_is_documented() {
    for rule in rules::all() {
        let doc = rule.doc();
        for (heading, body) in [
            ("finds", &doc.finds),
            ("matters", &doc.matters),
            ("fix", &doc.fix),
        ] {
            assert!(!body.is_empty(), "{}: nothing under `{heading}`", rule.name);
        }
        assert!(
            !doc.instead.text.is_empty(),
            "{} says nothing to write instead",
            rule.name
        );
        assert!(rule.summary().ends_with('.'), "{}", rule.summary());
    }
}

#[test]
fn names_are_unique_and_as_the_format_lists_them() {
    let names: Vec<_> = rules::all().iter().map(|rule| rule.name).collect();
    let mut unique = names.clone();
    unique.sort_unstable();
    unique.dedup();
    assert_eq!(unique.len(), names.len());
    assert_eq!(names.len(), 49);
    assert!(rules::find("seam-step").is_some() && rules::find("seam").is_none());
}

#[test]
fn examples_are_found_exactly_at_their_marks() {
    let mut wrong = String::new();
    for rule in rules::all() {
        let doc = rule.doc();
        if doc.example.text.is_empty() {
            assert_eq!(rule.name, "not-converged", "only that rule has no example");
            continue;
        }
        let file = analysed(&doc.example.text, &doc.example);
        let mut found: Vec<Mark> = of_rule(&file, rule)
            .iter()
            .map(|finding| mark(&file, finding.place))
            .collect();
        found.sort();
        let all = told(&file.findings);
        if found != doc.example.marks {
            let _ = writeln!(
                wrong,
                "{}: found at {found:?}, marked are {:?}\n{all}",
                rule.name, doc.example.marks
            );
        }
        let others = file
            .findings
            .iter()
            .filter(|finding| finding.rule != rule.name);
        let loud: Vec<_> = others
            .filter(|finding| finding.level >= Level::Warning)
            .map(|finding| finding.rule)
            .collect();
        for name in &loud {
            if !doc.also_found.iter().any(|also| also == name) {
                let _ = writeln!(wrong, "{}: {name} is found too\n{all}", rule.name);
            }
        }
        for name in &doc.also_found {
            if file.findings.iter().all(|finding| finding.rule != name) {
                let _ = writeln!(wrong, "{}: {name} is not found\n{all}", rule.name);
            }
        }
    }
    assert!(wrong.is_empty(), "{wrong}");
}

#[test]
fn what_to_write_instead_is_silent() {
    let mut wrong = String::new();
    for rule in rules::all() {
        let instead = rule.doc().instead;
        let file = analysed(&instead.text, &instead);
        let loud = file
            .findings
            .iter()
            .filter(|finding| finding.level >= Level::Warning || finding.rule == rule.name);
        let loud: Vec<Arc<Finding>> = loud.cloned().collect();
        if !loud.is_empty() {
            let _ = writeln!(
                wrong,
                "{} on its instead\n{}{}",
                rule.name,
                instead.marked,
                told(&loud)
            );
        }
    }
    assert!(wrong.is_empty(), "{wrong}");
}

#[test]
fn safe_fixes_come_to_rest_and_add_nothing() {
    for rule in rules::all() {
        let example = rule.doc().example;
        let mut text = example.text.clone();
        let mut known: Vec<String> = names(&analysed(&text, &example));
        for round in 0.. {
            assert!(round < ROUNDS, "{}: fixes do not come to rest", rule.name);
            let file = analysed(&text, &example);
            let now = names(&file);
            let new: Vec<_> = now.iter().filter(|name| !known.contains(name)).collect();
            assert!(
                new.is_empty(),
                "{}: a fix adds {new:?} to\n{text}",
                rule.name
            );
            known = now;
            let fixes = file.findings.iter().flat_map(|finding| &finding.fixes);
            let Some(fix) = fixes.into_iter().find(|fix| fix.safe) else {
                break;
            };
            text = apply(&file, fix);
        }
    }
}

fn names(file: &FileAnalysis) -> Vec<String> {
    file.findings
        .iter()
        .map(|finding| finding.rule.to_owned())
        .collect()
}

/// Every fix of an example, safe or not, takes the finding away that it belongs to.
#[test]
fn every_fix_mends_what_it_belongs_to() {
    for rule in rules::all() {
        let example = rule.doc().example;
        let file = analysed(&example.text, &example);
        for finding in of_rule(&file, rule) {
            for fix in &finding.fixes {
                let mended = apply(&file, fix);
                let after = analysed(&mended, &example);
                let left = of_rule(&after, rule).len();
                let before = of_rule(&file, rule).len();
                assert!(
                    left < before,
                    "{}: `{}` leaves it in\n{mended}",
                    rule.name,
                    fix.title
                );
            }
        }
    }
}

#[test]
fn messages_read_well() {
    for rule in rules::all() {
        let doc = rule.doc();
        if doc.example.text.is_empty() {
            continue;
        }
        let file = analysed(&doc.example.text, &doc.example);
        for finding in of_rule(&file, rule) {
            assert!(!finding.message.ends_with('.'), "{}", finding.message);
            let first = finding.message.chars().next().unwrap();
            assert!(!first.is_uppercase(), "{}", finding.message);
        }
        let told = without_bounds(&rendered(rule, &doc.example, &file));
        insta::assert_snapshot!(rule.name, told);
    }
}

/// Bounds of rounding are some ulp of what they belong to, not always the same: their digits are left out.
fn without_bounds(text: &str) -> String {
    let words = text.split(' ').map(|word| match word.split_once("e-1") {
        Some((digits, _)) if digits.parse::<f64>().is_ok() => "…e-1…",
        _ => word,
    });
    words.collect::<Vec<_>>().join(" ")
}

fn rendered(rule: &Rule, example: &Sample, file: &FileAnalysis) -> String {
    let mut text = example.marked.clone();
    for finding in of_rule(file, rule) {
        let _ = writeln!(text, "\n{}: {}", finding.level.word(), finding.message);
        if let Some(help) = &finding.help {
            let _ = writeln!(text, "  help: {help}");
        }
        for (place, what) in &finding.related {
            let at = mark(file, *place);
            let _ = writeln!(text, "  related, {}:{}: {what}", at.line, at.column);
        }
        for fix in &finding.fixes {
            let sort = if fix.safe { "safe" } else { "to be looked at" };
            let _ = writeln!(text, "  fix ({sort}): {}", fix.title);
        }
    }
    text
}

#[test]
fn the_reference_page_is_up_to_date() {
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join("grammar/RULES.md");
    let page = rules::reference_page();
    if std::env::var_os("CRENATE_WRITE_PAGES").is_some() {
        std::fs::write(&path, &page).unwrap();
    }
    let committed = std::fs::read_to_string(&path).unwrap_or_default();
    assert!(
        committed == page,
        "grammar/RULES.md is stale: run this test with CRENATE_WRITE_PAGES=1"
    );
}
