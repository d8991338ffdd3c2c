//! The files that a text names.

use std::path::{Path, PathBuf};

use crate::model::normalise;
use crate::syntax::{StatementKind, Tree};
use crate::text::Span;

/// Each file that a `use` or `table` names: the path within its quotes, and the file.
#[must_use]
pub fn links(tree: &Tree, path: &Path) -> Vec<(Span, PathBuf)> {
    let folder = path.parent().unwrap_or_else(|| Path::new(""));
    let mut found = Vec::new();
    for entry in &tree.entries {
        for statement in &entry.section.statements {
            let (StatementKind::Use(file) | StatementKind::Table { file, .. }) = &statement.kind
            else {
                continue;
            };
            let span = entry.absolute(file.span);
            // The quotes are not part of the link.
            let inside = Span::new(span.start + 1, span.end.saturating_sub(1));
            found.push((inside, normalise(&folder.join(&file.text))));
        }
    }
    found
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::syntax::read;

    #[test]
    fn links_are_the_paths_between_the_quotes() {
        let text = "use \"../b.cren\"\ncrystal a\n  table \"t.csv\" in nm, meV\n";
        let links = links(&read(text), Path::new("/w/x/a.cren"));
        let found: Vec<(&str, &Path)> = links
            .iter()
            .map(|(span, path)| (span.of(text), path.as_path()))
            .collect();
        assert_eq!(
            found,
            [
                ("../b.cren", Path::new("/w/b.cren")),
                ("t.csv", Path::new("/w/x/t.csv"))
            ]
        );
    }
}
