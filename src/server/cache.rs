//! The user's cache folder, where what an editor is to open as a file is written.

use std::io::Write;
use std::path::{Path, PathBuf};
use std::{env, fs, io};

/// Our part of the cache folder, where the user has one.
pub(super) fn folder() -> Option<PathBuf> {
    let from = |name: &str| {
        env::var_os(name)
            .filter(|value| !value.is_empty())
            .map(PathBuf::from)
    };
    let cache = from("XDG_CACHE_HOME").or_else(|| from("LOCALAPPDATA"));
    let cache = cache.or_else(|| from("HOME").map(|home| home.join(".cache")))?;
    cache.is_absolute().then(|| cache.join("crenate"))
}

/// Writes a file whole or not at all, as another request or server may write the same one at the same time.
pub(super) fn write(path: &Path, text: &str) -> io::Result<()> {
    let folder = path.parent().ok_or(io::ErrorKind::InvalidInput)?;
    fs::create_dir_all(folder)?;
    let mut draft = tempfile::NamedTempFile::new_in(folder)?;
    draft.write_all(text.as_bytes())?;
    draft.persist(path).map_err(|error| error.error)?;
    Ok(())
}
