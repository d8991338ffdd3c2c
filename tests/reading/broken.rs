//! What is said of broken lines: read the snapshot as a tired user would.

use crenate::syntax::{ProblemKind, read};

/// Each line with a problem, the problem's place marked under it, and what is said of it.
fn rendered(text: &str) -> String {
    let mut rendered = String::new();
    for entry in read(text).entries {
        let section = &entry.section;
        for problem in &section.problems {
            let line = section.line_at(problem.span.start).unwrap();
            let source = line.span.of(&section.text).trim_end();
            let before = &section.text[line.span.start as usize..problem.span.start as usize];
            let before = before.rsplit(['\n', '\r']).next().unwrap();
            let marked = problem.span.of(&section.text).chars().count().max(1);
            rendered += &format!(
                "{source}\n{}{}\n{}\n\n",
                " ".repeat(before.chars().count()),
                "^".repeat(marked),
                said(&problem.kind)
            );
        }
    }
    rendered
}

fn said(kind: &ProblemKind) -> String {
    match kind {
        ProblemKind::Unreadable { expected, found } => {
            format!("expected {expected}, found {found}")
        }
        ProblemKind::StrayCharacter { character, instead } => {
            format!("stray {character:?}, instead {instead:?}")
        }
        other => format!("{other:?}"),
    }
}

#[test]
fn broken_lines_are_told_in_plain_words() {
    let mut settings = insta::Settings::clone_current();
    settings.set_snapshot_path("../data/reading");
    settings.set_prepend_module_to_snapshot(false);
    settings.set_omit_expression(true);
    let text = include_str!("../data/reading/broken.txt");
    settings.bind(|| insta::assert_snapshot!("broken", rendered(text)));
}
