//! Pages that explain rules, for the link beside a diagnostic.
//!
//! Editors open such links as they open any other; what they all can open
//! without a network is a file. So the explanations are written, once a
//! session, into the user's cache folder, and the link names a file there.

use std::collections::HashMap;
use std::path::PathBuf;
use std::sync::{Mutex, OnceLock, PoisonError};
use std::{fs, io};

use tower_lsp::lsp_types::Url;

use super::cache;
use super::log::log;
use crate::report::editor_rules;

/// The page of a rule, where the pages could be written.
pub(super) fn page(rule: &'static str) -> Option<Url> {
    static FOLDER: OnceLock<Option<PathBuf>> = OnceLock::new();
    let folder = FOLDER.get_or_init(|| {
        let written = folder().map(|folder| write(&folder).map(|()| folder));
        written.and_then(|written| {
            written
                .inspect_err(|error| log!("no pages about rules: {error}"))
                .ok()
        })
    });
    let folder = folder.as_ref()?;
    static PAGES: Mutex<Option<HashMap<&'static str, Option<Url>>>> = Mutex::new(None);
    let mut pages = PAGES.lock().unwrap_or_else(PoisonError::into_inner);
    let page = || Url::from_file_path(folder.join(format!("{rule}.md"))).ok();
    let known = pages.get_or_insert_default().entry(rule);
    known.or_insert_with(page).clone()
}

fn folder() -> Option<PathBuf> {
    let version = env!("CARGO_PKG_VERSION");
    cache::folder().map(|cache| cache.join(format!("rules-{version}")))
}

/// Writes the pages that are not there yet, or not as they should be.
fn write(folder: &std::path::Path) -> io::Result<()> {
    fs::create_dir_all(folder)?;
    for (name, text) in editor_rules::pages() {
        let page = folder.join(format!("{name}.md"));
        if fs::read_to_string(&page).is_ok_and(|there| there == text) {
            continue;
        }
        cache::write(&page, &text)?;
    }
    Ok(())
}
