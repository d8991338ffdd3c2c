//! # What it finds
//! A character that the format does not use: a typographic sign for multiplication, a raised two, a control character.
//!
//! # Why it matters
//! Signs that look alike are not read alike, and a character that nobody sees can hide what is written.
//!
//! # Example
//! ```cren
//! crystal tern
//!   lattice chain 2 × 4.0 nm
//!                   ^
//!   cosine 1 = 20 meV
//! ```
//!
//! # Instead
//! ```cren
//! crystal tern
//!   lattice chain 2 * 4.0 nm
//!   cosine 1 = 20 meV
//! ```
//!
//! # Fix
//! The sign that the format writes for it, where there is one.

use super::{Finding, Fix, Level, Replacement, Rule, Subject, Tier};
use crate::syntax::ProblemKind;

/// The rule.
pub const RULE: Rule = Rule {
    name: "stray-character",
    group: "reading",
    level: Level::Error,
    tier: Tier::Read,
    waivable: false,
    source: include_str!("stray_character.rs"),
    check,
};

fn check(subject: &Subject<'_>, findings: &mut Vec<Finding>) {
    for problem in &subject.entry.section.problems {
        let ProblemKind::StrayCharacter { character, instead } = &problem.kind else {
            continue;
        };
        let place = subject.place(problem.span);
        let written = problem.span.of(&subject.entry.section.text);
        let message = match written.chars().count() {
            1 => format!("{} is not used in this format", shown(*character)),
            _ => format!("`{written}` is not used in this format"),
        };
        let help = instead.as_ref().map(|text| format!("write `{text}`"));
        let fix = instead.as_ref().map(|text| {
            Fix::safe(
                format!("write `{text}`"),
                Replacement::new(place, text.clone()),
            )
        });
        findings.push(Finding::new(&RULE, place, message).help_if(help).fix(fix));
    }
}

/// The character itself where it can be seen, else its code point.
fn shown(character: char) -> String {
    if character.is_control() || character.is_whitespace() || is_invisible(character) {
        return format!("the invisible character U+{:04X}", u32::from(character));
    }
    format!("`{character}`")
}

/// Zero-width and direction marks.
fn is_invisible(character: char) -> bool {
    matches!(character, '\u{ad}' | '\u{200b}'..='\u{200f}' | '\u{202a}'..='\u{202e}' | '\u{2060}'..='\u{206f}' | '\u{feff}')
}

#[cfg(test)]
mod tests {
    use super::super::fixture::{fixed, messages, silent};
    use super::{RULE, shown};

    #[test]
    fn a_typographic_sign_is_replaced() {
        let text = "let a = 2 × 3 nm\n";
        assert_eq!(messages(&RULE, text), ["`×` is not used in this format"]);
        assert_eq!(fixed(&RULE, text), "let a = 2 * 3 nm\n");
    }

    #[test]
    fn plus_and_minus_run_together_are_a_tolerance() {
        let text = "let a = 3 nm +- 1 nm\n";
        assert_eq!(messages(&RULE, text), ["`+-` is not used in this format"]);
        assert_eq!(fixed(&RULE, text), "let a = 3 nm ± 1 nm\n");
    }

    #[test]
    fn what_cannot_be_seen_is_named() {
        assert_eq!(shown('\0'), "the invisible character U+0000");
        assert_eq!(shown('\u{200b}'), "the invisible character U+200B");
    }

    #[test]
    fn signs_that_are_read_are_fine() {
        silent(&RULE, "let a = −3 nm ± 1 nm\nlet b = 5 µm\n");
    }
}
