//! What holds for every text.

use std::fmt::Write as _;
use std::sync::Arc;

use crenate::syntax::{ProblemKind, SectionKind, Tree, read, reread};
use proptest::prelude::*;

use crate::SAMPLES;

/// Sections add up to the text, lines to their section; every place lies in the text at the edge of a character.
fn holds_together(text: &str, tree: &Tree) {
    assert_eq!(&*tree.text, text);
    let mut offset = 0;
    for (number, entry) in tree.entries.iter().enumerate() {
        let section = &entry.section;
        assert_eq!(entry.start as usize, offset);
        assert_eq!(section.kind == SectionKind::Preamble, number == 0);
        assert_eq!(
            text.get(offset..offset + section.text.len()),
            Some(&*section.text)
        );
        offset += section.text.len();
        let mut end = 0;
        for line in &section.lines {
            assert_eq!(line.span.start, end);
            assert!(line.span.end > end, "a line holds a byte");
            end = line.span.end;
            let within = |start, stop| line.span.start <= start && stop <= line.span.end;
            assert!(within(line.content.start, line.content.end));
            assert!(within(line.comment.start, line.comment.end));
            assert!(section.text.is_char_boundary(line.content.start as usize));
            assert!(section.text.is_char_boundary(line.content.end as usize));
        }
        assert_eq!(end as usize, section.text.len());
        for problem in &section.problems {
            assert!(!problem.span.is_empty(), "{problem:?}");
            assert!(!problem.span.of(&section.text).is_empty(), "{problem:?}");
        }
        let lines_with_problems: std::collections::HashSet<_> = section
            .problems
            .iter()
            .map(|problem| section.line_at(problem.span.start).map(|line| line.span))
            .collect();
        assert_eq!(
            lines_with_problems.len(),
            section.problems.len(),
            "one problem a line"
        );
        for statement in &section.statements {
            assert!(
                statement.span.start <= statement.word.start
                    && statement.word.end <= statement.span.end
            );
            statement.walk(&mut |expression| {
                assert!(statement.span.start <= expression.span.start);
                assert!(expression.span.end <= statement.span.end);
                assert!(!expression.span.of(&section.text).is_empty());
            });
        }
    }
    assert_eq!(offset, text.len());
}

/// The whole of a tree as text, to compare by.
fn printed(tree: &Tree) -> String {
    format!("{tree:?}")
}

#[test]
fn every_truncation_reads() {
    for (_, text) in SAMPLES {
        for (end, _) in text.char_indices() {
            holds_together(&text[..end], &read(&text[..end]));
        }
    }
}

#[test]
fn every_deletion_of_a_character_reads() {
    for (_, text) in SAMPLES {
        let whole = read(text);
        for (start, character) in text.char_indices() {
            let mut shorter = String::from(&text[..start]);
            shorter.push_str(&text[start + character.len_utf8()..]);
            let tree = reread(&shorter, &whole);
            holds_together(&shorter, &tree);
            let problems: usize = tree
                .entries
                .iter()
                .map(|entry| entry.section.problems.len())
                .sum();
            // A deleted heading letter misplaces what the heading held; any other deletion spoils at most one line, or joins two.
            let sections = tree.entries.len() == whole.entries.len();
            assert!(
                !sections || problems <= 2,
                "{problems} problems after deleting at {start}"
            );
        }
    }
}

#[test]
fn line_ends_do_not_matter() {
    for (_, text) in SAMPLES {
        let count = |text: &str| {
            let tree = read(text);
            holds_together(text, &tree);
            let statements = |tree: &Tree| {
                tree.entries
                    .iter()
                    .map(|entry| entry.section.statements.len())
                    .sum::<usize>()
            };
            statements(&tree)
        };
        let expected = count(text);
        assert!(expected > 20);
        assert_eq!(count(&text.replace('\n', "\r\n")), expected);
        assert_eq!(count(&text.replace('\n', "\r")), expected);
        assert_eq!(count(&format!("\u{feff}{text}")), expected);
        assert_eq!(count(&text.replace(' ', "\u{2003}")), expected);
    }
}

#[test]
fn nesting_has_a_limit_and_never_ends_the_process() {
    let nested = |depth: usize| format!("let a = {}1{}", "(".repeat(depth), ")".repeat(depth));
    let too_deep = |text: &str| {
        let tree = read(text);
        holds_together(text, &tree);
        matches!(tree.entries[0].section.problems[..], [ref problem] if problem.kind == ProblemKind::TooDeep)
    };
    assert!(!too_deep(&nested(256)));
    assert_eq!(read(&nested(256)).entries[0].section.statements.len(), 1);
    assert!(too_deep(&nested(257)));
    assert!(too_deep(&nested(200_000)));
    assert!(too_deep(&format!("let a = {}", "f(".repeat(100_000))));
    assert!(too_deep(&format!("let a = 1{}", "+1".repeat(100_000))));
    assert!(too_deep(&format!("let a = 1{}", "^1".repeat(100_000))));
    assert!(too_deep(&format!("let a = 1{}", "^-1".repeat(100_000))));
    // Unclosed nests within the limit are refused without trying each level more than a few times.
    for opener in [
        "(",
        "f(",
        "1^(",
        "2*-(",
        "level 1 at (",
        "(1, ",
        "gap 1 of a + (",
    ] {
        let text = format!("crystal a\nmeasure b = {}", opener.repeat(256));
        assert_eq!(read(&text).entries[1].section.problems.len(), 1, "{opener}");
    }
    let terms = format!("let a = 1{}", "+2*x^2".repeat(400));
    assert_eq!(read(&terms).entries[0].section.statements.len(), 1);
    let calls = format!("let a = {}1{}", "f(".repeat(256), ")".repeat(256));
    assert_eq!(read(&calls).entries[0].section.statements.len(), 1);
}

#[test]
fn long_lines_read() {
    for line in [
        format!("let a = {}", "1 ".repeat(500_000)),
        format!("let {} = 1", "é".repeat(500_000)),
        format!("title \"{}", "x".repeat(1_000_000)),
        format!("# {}", "x".repeat(1_000_000)),
        "\\\n".repeat(500_000),
        "🙂".repeat(250_000),
        "\0".repeat(1_000_000),
        format!(
            "crystal a\nstack 2 times {}2 nm of b",
            "1 nm of a, ".repeat(90_000)
        ),
        " ".repeat(1_000_000),
    ] {
        holds_together(&line, &read(&line));
    }
}

#[test]
fn sections_keep_their_names_under_edits_elsewhere() {
    let before = read("material a\ncrystal b\ncrystal b\ncrystal ?\n");
    let after = reread(
        "let x = 1\nmaterial c\nmaterial a\ncrystal b\ncrystal b\ncrystal ?\n",
        &before,
    );
    let ids = |tree: &Tree| {
        tree.entries
            .iter()
            .map(|entry| entry.id)
            .collect::<Vec<_>>()
    };
    let (before_ids, after_ids) = (ids(&before), ids(&after));
    assert_eq!(before_ids[0], after_ids[0]);
    assert_eq!(before_ids[1..], after_ids[2..]);
    let distinct: std::collections::HashSet<_> = after_ids.iter().collect();
    assert_eq!(distinct.len(), after_ids.len());
}

#[test]
fn rereading_shares_what_did_not_change() {
    let text = SAMPLES[0].1;
    let before = read(text);
    let after = reread(
        &text.replacen("5.4 nm of basin", "5.5 nm of basin", 1),
        &before,
    );
    assert_eq!(before.entries.len(), after.entries.len());
    let shared = before
        .entries
        .iter()
        .zip(&after.entries)
        .filter(|(before, after)| Arc::ptr_eq(&before.section, &after.section))
        .count();
    assert_eq!(shared, before.entries.len() - 1);
}

/// Pieces that make trouble when they meet.
fn piece() -> impl Strategy<Value = String> {
    prop::sample::select(vec![
        "\n",
        "\r",
        "\r\n",
        "\\",
        "#",
        "\"",
        " ",
        "crystal ",
        "material ",
        "layer ",
        "5",
        ".",
        "e",
        " nm",
        "(",
        ")",
        "±",
        "+",
        "-",
        "^",
        "*",
        "🙂",
        "\u{feff}",
        "\0",
        "é",
        "\u{301}",
        "of ",
        "let a = ",
        "=",
        ",",
        "require ",
        "gap 1",
        "\u{2028}",
        "\u{85}",
        "×",
        "level 1 at (",
    ])
    .prop_map(str::to_owned)
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(400))]

    #[test]
    fn any_text_holds_together(pieces in prop::collection::vec(piece(), 0..60)) {
        let text = pieces.concat();
        holds_together(&text, &read(&text));
    }

    #[test]
    fn rereading_equals_reading(
        sample in 0..SAMPLES.len(),
        edits in prop::collection::vec((any::<prop::sample::Index>(), 0_usize..12, prop::collection::vec(piece(), 0..4)), 1..6),
    ) {
        let mut text = SAMPLES[sample].1.to_owned();
        let mut tree = read(&text);
        for (place, length, pieces) in edits {
            let starts: Vec<usize> = text.char_indices().map(|(start, _)| start).collect();
            let Some(start) = (!starts.is_empty()).then(|| place.index(starts.len())) else {
                continue;
            };
            let end = starts.get(start + length).copied().unwrap_or(text.len());
            text.replace_range(starts[start]..end, &pieces.concat());
            tree = reread(&text, &tree);
            holds_together(&text, &tree);
            prop_assert_eq!(printed(&tree), printed(&read(&text)));
        }
    }
}

/// Many repeated sections: equal texts are shared, and stay apart by their ids.
#[test]
fn equal_sections_have_ids_of_their_own() {
    let mut text = String::new();
    for _ in 0..50 {
        let _ = writeln!(text, "material a\n  mass 1 me");
    }
    let tree = reread(&text, &read(&text));
    let ids: std::collections::HashSet<_> = tree.entries.iter().map(|entry| entry.id).collect();
    assert_eq!(ids.len(), 51);
}
