//! A rule's explanation, for the terminal, the hover and machines.

use super::words;
use crate::rules::{self, Rule};

/// Columns that text is wrapped to.
const WIDTH: usize = 100;

/// All rules with their levels under the names of their groups, in the order of the reference.
#[must_use]
pub fn list() -> String {
    let names = rules::all().iter().map(|rule| rule.name.len());
    let widest = names.max().unwrap_or(0);
    let mut text = String::new();
    let mut group = "";
    for rule in rules::all() {
        if rule.group != group {
            let gap = if group.is_empty() { "" } else { "\n" };
            group = rule.group;
            text += &format!("{gap}{group}\n");
        }
        let head = format!("  {:widest$}  {:7}  ", rule.name, words::level(rule.level));
        let hang = " ".repeat(head.len());
        text += &wrapped(&rule.summary(), &head, &hang);
        text.push('\n');
    }
    text
}

fn wrapped(text: &str, first: &str, others: &str) -> String {
    let options = textwrap::Options::new(WIDTH)
        .initial_indent(first)
        .subsequent_indent(others);
    textwrap::fill(text, options)
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
        wrapped(doc.finds.trim(), "", "")
    );
    for (title, body) in [("Why it matters", &doc.matters), ("Fix", &doc.fix)] {
        if !body.trim().is_empty() {
            text += &format!("\n{title}\n{}\n", wrapped(body.trim(), "  ", "  "));
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
