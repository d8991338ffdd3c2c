//! Paths without detours.

use std::path::{Component, Path, PathBuf};

/// A path without `.` and, as far as it can be told from the path alone, without `..`.
#[must_use]
pub fn normalise(path: &Path) -> PathBuf {
    let mut plain = PathBuf::new();
    for component in path.components() {
        match component {
            Component::CurDir => {}
            Component::ParentDir => match plain.components().next_back() {
                Some(Component::Normal(_)) => {
                    plain.pop();
                }
                Some(Component::RootDir | Component::Prefix(_)) => {}
                _ => plain.push(".."),
            },
            other => plain.push(other),
        }
    }
    plain
}

/// A path as written in a file, from that file's folder.
#[must_use]
pub fn beside(file: &Path, written: &str) -> PathBuf {
    let folder = file.parent().unwrap_or_else(|| Path::new(""));
    normalise(&folder.join(written))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn dots_are_resolved_as_far_as_the_path_tells() {
        assert_eq!(
            normalise(Path::new("/a/./b/../c.cren")),
            Path::new("/a/c.cren")
        );
        assert_eq!(normalise(Path::new("../a/../../c")), Path::new("../../c"));
        assert_eq!(normalise(Path::new("/../a")), Path::new("/a"));
        assert_eq!(
            beside(Path::new("/w/one/a.cren"), "../two/b.cren"),
            Path::new("/w/two/b.cren")
        );
    }
}
