//! The explanations of the rules as pages of their own.

use super::rule_page;
use crate::rules;

/// Each rule's name and its explanation in Markdown.
pub fn pages() -> impl Iterator<Item = (&'static str, String)> {
    rules::all()
        .iter()
        .map(|rule| (rule.name, rule_page::markdown(rule)))
}

/// A rule's explanation in Markdown; `None` where there is no such rule.
#[must_use]
pub fn page(name: &str) -> Option<String> {
    rule_page::find(name).map(rule_page::markdown)
}
