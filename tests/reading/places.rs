//! Finding what stands at a place.

use crenate::syntax::{StatementKind, read};

const TEXT: &str = "let a = 1\n\n# not of b\n\n# The first line,\n#   and the second.\nmaterial b\n  mass (a + 2)*3 me # heavy\n\ncrystal c\n";

fn at(word: &str) -> u32 {
    u32::try_from(TEXT.find(word).unwrap()).unwrap()
}

#[test]
fn a_description_is_the_comment_directly_above() {
    let tree = read(TEXT);
    assert_eq!(tree.description(1), "The first line,\n  and the second.");
    assert_eq!(tree.description(0), "");
    assert_eq!(tree.description(2), "");
    assert_eq!(tree.description(9), "");
    assert_eq!(read("# only\ncrystal x").description(1), "only");
    assert_eq!(read("\u{feff}# only\r\ncrystal x").description(1), "only");
}

#[test]
fn offsets_find_sections_and_statements() {
    let tree = read(TEXT);
    assert_eq!(tree.entry_at(0).unwrap().0, 0);
    assert_eq!(tree.entry_at(at("material")).unwrap().0, 1);
    assert_eq!(tree.entry_at(9_999).unwrap().0, 2);
    let (entry, statement) = tree.statement_at(at("me #") + 2).unwrap();
    assert!(matches!(statement.kind, StatementKind::Mass(_)));
    assert_eq!(entry.absolute(statement.word).of(TEXT), "mass");
    assert!(tree.statement_at(at("# heavy") + 2).is_none());
    assert!(tree.statement_at(at("crystal")).is_none());
}

#[test]
fn walks_meet_every_expression_once() {
    let tree = read(TEXT);
    let (_, statement) = tree.statement_at(at("mass")).unwrap();
    let section = &tree.entries[1].section;
    let mut seen = Vec::new();
    statement.walk(&mut |expression| seen.push(expression.span.of(&section.text)));
    assert_eq!(seen, ["(a + 2)*3 me", "a + 2", "a", "2", "3 me"]);
    let mut names = Vec::new();
    statement.names(&mut |name, _| names.push(name));
    assert_eq!(names, ["a"]);
    let mut units = Vec::new();
    statement.units(&mut |unit| units.push(unit.name.text.as_str()));
    assert_eq!(units, ["me"]);
}

#[test]
fn a_comment_and_the_content_of_a_line_are_apart() {
    let tree = read(TEXT);
    let section = &tree.entries[1].section;
    let line = section.line_at(at("mass") - tree.entries[1].start).unwrap();
    assert_eq!(line.content.of(&section.text), "mass (a + 2)*3 me");
    assert_eq!(line.comment.of(&section.text), "# heavy");
    assert_eq!(section.heading.of(&section.text), "material b");
}
