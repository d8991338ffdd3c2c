//! A rule's explanation, for the terminal, the hover and machines.

use super::words;
use crate::rules::{self, Rule};

/// All rules with their levels, one a line, in the order of the reference.
#[must_use]
pub fn list() -> String {
    let widest = rules::all()
        .iter()
        .map(|rule| rule.name.len())
        .max()
        .unwrap_or(0);
    let line = |rule: &Rule| {
        let level = words::level(rule.level);
        format!("{:widest$}  {level:7}  {}\n", rule.name, rule.summary())
    };
    rules::all().iter().map(line).collect()
}

/// One rule explained as plain text; `None` where there is none of that name.
#[must_use]
pub fn text(name: &str) -> Option<String> {
    let rule = find(name)?;
    let doc = rule.doc();
    let mut text = format!(
        "{} ({})\n\n{}\n",
        rule.name,
        words::level(rule.level),
        doc.finds.trim()
    );
    for (title, body) in [("Why it matters", &doc.matters), ("Fix", &doc.fix)] {
        if !body.trim().is_empty() {
            text += &format!("\n{title}\n{}\n", indented(body));
        }
    }
    for (title, sample) in [("Example", &doc.example), ("Instead", &doc.instead)] {
        if !sample.marked.trim().is_empty() {
            text += &format!("\n{title}\n{}\n", indented(&sample.marked));
        }
    }
    if rule.waivable {
        text += &format!(
            "\nIn a section or file where it is meant:\n  waive {} because \"the reason\"\n",
            rule.name
        );
    }
    Some(text)
}

/// One rule explained as Markdown.
#[must_use]
pub fn markdown(rule: &Rule) -> String {
    let doc = rule.doc();
    let mut text = format!(
        "**{}** ({})\n\n{}\n",
        rule.name,
        words::level(rule.level),
        doc.finds.trim()
    );
    if !doc.matters.trim().is_empty() {
        text += &format!("\n{}\n", doc.matters.trim());
    }
    for (title, sample) in [("Found in", &doc.example), ("Instead", &doc.instead)] {
        if !sample.text.trim().is_empty() {
            text += &format!("\n{title}:\n```crenate\n{}\n```\n", sample.text.trim_end());
        }
    }
    text
}

/// The rule of that name.
#[must_use]
pub fn find(name: &str) -> Option<&'static Rule> {
    rules::all().iter().find(|rule| rule.name == name)
}

/// The name closest to a wrong one, where one is close.
#[must_use]
pub fn nearest(name: &str) -> Option<&'static str> {
    let scored = rules::all()
        .iter()
        .map(|rule| (strsim::jaro_winkler(rule.name, name), rule.name));
    let best = scored.max_by(|left, right| left.0.total_cmp(&right.0));
    best.filter(|(score, _)| *score > 0.8).map(|(_, name)| name)
}

fn indented(text: &str) -> String {
    let lines: Vec<String> = text
        .trim_end()
        .lines()
        .map(|line| {
            if line.is_empty() {
                String::new()
            } else {
                format!("  {line}")
            }
        })
        .collect();
    lines.join("\n")
}
