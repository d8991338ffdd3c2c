//! New texts for files.

use std::fs;
use std::io::{self, Write};
use std::path::Path;

/// Puts a new text in a file's place at once, so that no reader ever sees half of it; a link stays a link.
///
/// # Errors
/// Where the folder does not take the new file; the old one then stands as it was.
pub fn replace(path: &Path, text: &str) -> io::Result<()> {
    let real = fs::canonicalize(path)?;
    let folder = real.parent().unwrap_or(Path::new("."));
    let mut fresh = tempfile::Builder::new()
        .prefix(".crenate-")
        .tempfile_in(folder)?;
    fresh.write_all(text.as_bytes())?;
    fresh
        .as_file()
        .set_permissions(fs::metadata(&real)?.permissions())?;
    fresh.persist(&real).map_err(|error| error.error)?;
    Ok(())
}
