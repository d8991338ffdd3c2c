//! The documentation of a rule, taken from the leading `//!` lines of its file.
//!
//! The headings are fixed: *What it finds*, *Why it matters*, *Example*,
//! *Instead*, *Fix*. An example is a fenced text in which lines of blanks and
//! `^` mark what is found on the line above; a second fence whose first line
//! ends in a file's name is that file. A line `Also found:` names the other
//! rules that speak on the same example.

use super::{Level, Rule};

/// What a rule says of itself.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct RuleDoc {
    /// What it finds.
    pub finds: String,
    /// Why that matters.
    pub matters: String,
    /// A text in which it is found.
    pub example: Sample,
    /// A text in which it is not.
    pub instead: Sample,
    /// How it is mended.
    pub fix: String,
    /// Other rules that speak on the example.
    pub also_found: Vec<String>,
}

/// A text of a rule's documentation.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct Sample {
    /// The text, mark lines left out.
    pub text: String,
    /// The text with its mark lines.
    pub marked: String,
    /// What the mark lines mark.
    pub marks: Vec<Mark>,
    /// Other files that it needs: name and text.
    pub files: Vec<(String, String)>,
}

/// A marked stretch of one line.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub struct Mark {
    /// The line, from 1.
    pub line: usize,
    /// The first column, in characters from 1.
    pub column: usize,
    /// The column past the last.
    pub end_column: usize,
}

impl Rule {
    /// What the rule says of itself.
    #[must_use]
    pub fn doc(&self) -> RuleDoc {
        let text = leading_doc(self.source);
        let sample = |title| Sample::read(&heading(&text, title));
        RuleDoc {
            finds: prose(&heading(&text, "What it finds")),
            matters: prose(&heading(&text, "Why it matters")),
            example: sample("Example"),
            instead: sample("Instead"),
            fix: prose(&heading(&text, "Fix")),
            also_found: also_found(&heading(&text, "Example")),
        }
    }

    /// One line on what the rule finds.
    #[must_use]
    pub fn summary(&self) -> String {
        let finds = heading(&leading_doc(self.source), "What it finds");
        let first = finds.trim().split("\n\n").next().unwrap_or("");
        let line = first.split_whitespace().collect::<Vec<_>>().join(" ");
        match line.find(". ") {
            Some(end) => line.get(..=end).unwrap_or(&line).to_owned(),
            None => line,
        }
    }
}

impl Level {
    /// The level as a word.
    #[must_use]
    pub fn word(self) -> &'static str {
        match self {
            Self::Note => "note",
            Self::Warning => "warning",
            Self::Error => "error",
        }
    }
}

impl Sample {
    fn read(text: &str) -> Self {
        let mut sample = Self::default();
        for (index, (info, body)) in fences(text).into_iter().enumerate() {
            if index == 0 {
                sample.take_marked(&body);
            } else if let Some(name) = info.split_whitespace().last() {
                sample.files.push((name.to_owned(), body));
            }
        }
        sample
    }

    fn take_marked(&mut self, body: &str) {
        self.marked = body.to_owned();
        let mut line_number = 0;
        for line in body.lines() {
            if is_mark_line(line) {
                self.marks.extend(marks_of(line, line_number));
            } else {
                line_number += 1;
                self.text.push_str(line);
                self.text.push('\n');
            }
        }
    }
}

fn is_mark_line(line: &str) -> bool {
    line.contains('^') && line.chars().all(|c| c == '^' || c == ' ')
}

fn marks_of(line: &str, line_number: usize) -> Vec<Mark> {
    let mut marks: Vec<Mark> = Vec::new();
    for (index, character) in line.chars().enumerate() {
        let column = index + 1;
        match marks.last_mut() {
            _ if character != '^' => {}
            Some(mark) if mark.end_column == column => mark.end_column += 1,
            _ => marks.push(Mark {
                line: line_number,
                column,
                end_column: column + 1,
            }),
        }
    }
    marks
}

/// The leading `//!` lines without their prefix.
fn leading_doc(source: &str) -> String {
    let lines = source.lines().map_while(|line| line.strip_prefix("//!"));
    let stripped = lines.map(|line| line.strip_prefix(' ').unwrap_or(line));
    stripped.collect::<Vec<_>>().join("\n")
}

/// What stands under `# title`, up to the next such heading outside a fence.
fn heading(text: &str, title: &str) -> String {
    let mut inside = false;
    let mut fenced = false;
    let mut found = String::new();
    for line in text.lines() {
        fenced ^= line.starts_with("```");
        match line.strip_prefix("# ") {
            Some(name) if !fenced => inside = name.trim() == title,
            _ if inside => {
                found.push_str(line);
                found.push('\n');
            }
            _ => {}
        }
    }
    found
}

/// The paragraphs of a stretch of documentation, one line each.
fn prose(text: &str) -> String {
    let paragraphs = text.trim().split("\n\n");
    let joined = paragraphs.map(|part| part.split_whitespace().collect::<Vec<_>>().join(" "));
    joined.collect::<Vec<_>>().join("\n\n")
}

/// The fenced texts of a stretch, each with the words behind its opening fence.
fn fences(text: &str) -> Vec<(String, String)> {
    let mut all = Vec::new();
    let mut open: Option<(String, String)> = None;
    for line in text.lines() {
        match (line.strip_prefix("```"), open.take()) {
            (Some(info), None) => open = Some((info.trim().to_owned(), String::new())),
            (Some(_), Some(done)) => all.push(done),
            (None, Some((info, mut body))) => {
                body.push_str(line);
                body.push('\n');
                open = Some((info, body));
            }
            (None, None) => {}
        }
    }
    all
}

fn also_found(text: &str) -> Vec<String> {
    let lines = text
        .lines()
        .filter_map(|line| line.strip_prefix("Also found:"));
    let parts = lines.flat_map(|line| line.split('`').skip(1).step_by(2));
    parts.map(str::to_owned).collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    const TEXT: &str = "# What it finds\nA thing. More\nof it.\n\n# Example\n```cren\nlet a = 1\n    ^   ^\n# comment\n```\nAlso found: `b-c`.\n```csv x.csv\n1,2\n```\n# Fix\nNone.\n";

    #[test]
    fn headings_end_at_the_next_one_and_not_at_a_comment_in_a_fence() {
        assert_eq!(heading(TEXT, "Fix"), "None.\n");
        assert!(heading(TEXT, "Example").contains("# comment"));
    }

    #[test]
    fn marks_are_taken_out_and_located() {
        let sample = Sample::read(&heading(TEXT, "Example"));
        assert_eq!(sample.text, "let a = 1\n# comment\n");
        let mark = |column| Mark {
            line: 1,
            column,
            end_column: column + 1,
        };
        assert_eq!(sample.marks, vec![mark(5), mark(9)]);
        assert_eq!(sample.files, vec![("x.csv".to_owned(), "1,2\n".to_owned())]);
    }

    #[test]
    fn other_rules_on_an_example_are_listed() {
        assert_eq!(also_found(&heading(TEXT, "Example")), vec!["b-c"]);
    }
}
