//! Holds the table of which module may use which, and where libraries may appear.

use std::fs;
use std::path::{Path, PathBuf};

/// Each room and the rooms it may use (itself is always allowed).
const MAY_USE: [(&str, &[&str]); 9] = [
    ("text", &[]),
    ("syntax", &["text"]),
    ("model", &["text", "syntax"]),
    ("numerics", &[]),
    ("bands", &["model", "numerics"]),
    ("rules", &["text", "syntax", "model", "bands"]),
    ("report", &["text", "syntax", "model", "bands", "rules"]),
    ("server", &["text", "report"]),
    ("cli", &["text", "report"]),
];

/// Libraries that may appear in one room alone.
const AT_HOME: [(&str, &str); 5] = [
    ("lsp_types", "server"),
    ("tower_lsp", "server"),
    ("clap", "cli"),
    ("pest", "syntax"),
    ("ropey", "text"),
];

fn sources(folder: &Path) -> Vec<PathBuf> {
    let mut found = Vec::new();
    for entry in fs::read_dir(folder).into_iter().flatten().flatten() {
        let path = entry.path();
        if path.is_dir() {
            found.extend(sources(&path));
        } else if path.extension().is_some_and(|extension| extension == "rs") {
            found.push(path);
        }
    }
    found.sort();
    found
}

/// The code of a file without comments and doc lines.
fn code(path: &Path) -> String {
    let text = fs::read_to_string(path).unwrap_or_default();
    text.lines()
        .map(|line| line.split("//").next().unwrap_or(""))
        .collect::<Vec<_>>()
        .join("\n")
}

/// The rooms named in `crate::…` paths, `crate::{a, b}` included.
fn rooms_used(code: &str) -> Vec<String> {
    let mut rooms = Vec::new();
    for piece in code.split("crate::").skip(1) {
        let names = match piece.strip_prefix('{') {
            Some(group) => group.split('}').next().unwrap_or(group).to_string(),
            None => piece.to_string(),
        };
        let grouped = piece.starts_with('{');
        for name in names.split(',') {
            let word: String = name
                .trim()
                .chars()
                .take_while(|c| c.is_alphanumeric() || *c == '_')
                .collect();
            rooms.push(word);
            if !grouped {
                break;
            }
        }
    }
    rooms
}

#[test]
fn rooms_use_only_what_the_table_allows() {
    let root = Path::new(env!("CARGO_MANIFEST_DIR")).join("src");
    let mut seen = 0;
    for (room, allowed) in MAY_USE {
        for path in sources(&root.join(room)) {
            seen += 1;
            for used in rooms_used(&code(&path)) {
                let known = MAY_USE.iter().any(|(name, _)| *name == used);
                assert!(
                    !known || used == room || allowed.contains(&used.as_str()),
                    "{} uses crate::{used}, which the table forbids to {room}",
                    path.display()
                );
            }
        }
    }
    assert!(seen >= MAY_USE.len(), "only {seen} source files were read");
}

#[test]
fn libraries_stay_in_their_rooms() {
    let root = Path::new(env!("CARGO_MANIFEST_DIR")).join("src");
    for path in sources(&root) {
        let inside = path
            .strip_prefix(&root)
            .expect("a source file")
            .to_string_lossy()
            .into_owned();
        let text = code(&path);
        for (library, room) in AT_HOME {
            let named = text.contains(&format!("{library}::"))
                || text.contains(&format!("{library}_derive::"));
            assert!(
                !named || inside.starts_with(room),
                "{inside} names {library}, which belongs in {room} alone"
            );
        }
    }
}

#[test]
fn the_table_is_read_from_real_paths() {
    let used = rooms_used("use crate::{text::Span, model};\nlet a = crate::bands::solve();");
    assert_eq!(used, ["text", "model", "bands"]);
}
