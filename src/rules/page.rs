//! The reference page of the rules.

use std::fmt::Write as _;

use super::{Level, Rule, Sample, Tier, all};

/// What stands above the rules.
const HEAD: &str = "\
# The rules

What crenate finds, why it matters, and what to write instead. This page is made from the rules themselves.

A finding has a level: an **error** is wrong, a **warning** is probably not meant, a **note** is worth knowing.
`waive RULE because \"reason\"` silences a rule in its section, or from the preamble in its file. Errors cannot be
waived, except `target-missed`.
";

/// The reference of all rules, as Markdown.
#[must_use]
pub fn reference_page() -> String {
    let mut page = HEAD.to_owned();
    contents(&mut page);
    let mut group = "";
    for rule in all() {
        if rule.group != group {
            group = rule.group;
            let _ = write!(page, "\n## {}\n", capitalised(group));
        }
        entry(&mut page, rule);
    }
    page
}

fn contents(page: &mut String) {
    page.push_str("\n| rule | level | group |\n| --- | --- | --- |\n");
    for rule in all() {
        let _ = writeln!(
            page,
            "| [`{0}`](#{0}) | {1} | {2} |",
            rule.name,
            rule.level.word(),
            rule.group
        );
    }
}

fn entry(page: &mut String, rule: &Rule) {
    let doc = rule.doc();
    let _ = write!(page, "\n### {}\n\n", rule.name);
    let _ = write!(
        page,
        "*{}*\n\n{}\n\n{}\n",
        facts(rule),
        doc.finds,
        doc.matters
    );
    sample(page, "Example", &doc.example);
    if !doc.also_found.is_empty() {
        let names: Vec<_> = doc
            .also_found
            .iter()
            .map(|name| format!("[`{name}`](#{name})"))
            .collect();
        let _ = write!(page, "\nAlso found here: {}.\n", names.join(", "));
    }
    sample(page, "Instead", &doc.instead);
    let _ = write!(page, "\n**Fix.** {}\n", doc.fix);
}

fn facts(rule: &Rule) -> String {
    let needs = match rule.tier {
        Tier::Read | Tier::Model => "found as you type",
        Tier::Bands => "found once the bands are known",
    };
    let waivable = match rule.waivable {
        true => "can be waived",
        false => "cannot be waived",
    };
    let level = match rule.level {
        Level::Note => "Note",
        Level::Warning => "Warning",
        Level::Error => "Error",
    };
    format!("{level}, {needs}, {waivable}")
}

fn sample(page: &mut String, title: &str, sample: &Sample) {
    if sample.marked.is_empty() {
        return;
    }
    let _ = write!(page, "\n**{title}**\n\n```cren\n{}```\n", sample.marked);
    for (name, text) in &sample.files {
        let _ = write!(page, "\nwith `{name}`:\n\n```\n{text}```\n");
    }
}

fn capitalised(word: &str) -> String {
    let mut letters = word.chars();
    letters.next().map_or_else(String::new, |first| {
        first.to_uppercase().chain(letters).collect()
    })
}
